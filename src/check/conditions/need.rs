//! What a face needs: one condition for each field that diffuses through it, one for each characteristic that enters.

use crate::diagnostic::{Diagnostic, Diagnostics, codes_conditions as codes};
use crate::model::calculus::dependence;
use crate::model::characteristics::{Block, Entering, blocks, entering, mean_and_root, own_second_terms};
use crate::model::formula::formula;
use crate::model::{AxisId, Expression, Face, FieldId, Model, Side};

/// One need of a face.
pub(super) struct Need {
    pub(super) kind: NeedKind,
    /// How many conditions it takes.
    pub(super) count: usize,
    /// Why, in words: `because …`.
    pub(super) why: String,
    /// The count could not be had and this was said; conditions on its fields are not counted.
    pub(super) refused: bool,
}

pub(super) enum NeedKind {
    /// The field's equation has a second derivative of it normal to the face.
    Diffusive(FieldId),
    /// First-order transport through the face.
    Transport(Block),
    /// Second order in time without a second derivative normal to the face: nothing happens at this face.
    Nothing(FieldId),
}

impl Need {
    pub(super) fn concerns(&self, field: FieldId) -> bool {
        match &self.kind {
            NeedKind::Diffusive(own) | NeedKind::Nothing(own) => *own == field,
            NeedKind::Transport(block) => block.fields.contains(&field),
        }
    }

    /// The names of its fields.
    pub(super) fn names(&self, model: &Model) -> String {
        match &self.kind {
            NeedKind::Diffusive(field) | NeedKind::Nothing(field) => name(model, *field).to_owned(),
            NeedKind::Transport(block) => {
                block.fields.iter().map(|field| name(model, *field)).collect::<Vec<_>>().join(", ")
            }
        }
    }

    /// No derivative of its fields acts through the face at all.
    pub(super) fn is_idle(&self) -> bool {
        match &self.kind {
            NeedKind::Diffusive(_) => false,
            NeedKind::Nothing(_) => true,
            NeedKind::Transport(block) => block.matrix.iter().flatten().all(Expression::is_zero),
        }
    }
}

pub(super) fn name(model: &Model, field: FieldId) -> &str {
    model.fields.get(field.0).map_or("?", |field| field.name.as_str())
}

/// `x = low`.
pub(super) fn place(model: &Model, face: Face) -> String {
    let axis = model.axes.get(face.axis.0).map_or("?", |axis| axis.name.as_str());
    format!("{axis} = {}", if face.side == Side::Low { "low" } else { "high" })
}

/// Whether the field diffuses along the axis.
pub(super) fn is_diffusive(model: &Model, field: FieldId, axis: AxisId) -> bool {
    field.0 < model.equations.len() && !own_second_terms(model, field, axis).is_empty()
}

/// All needs of a face; `None` where characteristics cannot be found (said once).
pub(super) fn of_face(model: &Model, face: Face, diagnostics: &mut Diagnostics) -> Option<Vec<Need>> {
    let mut needs = Vec::new();
    let Some(all) = blocks(model, face.axis) else {
        diagnostics.push(not_found(model, face));
        return None;
    };
    for field in (0..model.fields.len()).map(FieldId) {
        if is_diffusive(model, field, face.axis) {
            let axis = &model.axes[face.axis.0].name;
            let why = format!(
                "the equation of {} has a second derivative along {axis}, so each face of {axis} needs its value or its flux",
                name(model, field)
            );
            needs.push(Need { kind: NeedKind::Diffusive(field), count: 1, why, refused: false });
        } else if !all.iter().any(|block| block.fields.contains(&field)) {
            let why = nothing_acts(model, face, name(model, field));
            needs.push(Need { kind: NeedKind::Nothing(field), count: 0, why, refused: false });
        }
    }
    needs.extend(all.into_iter().map(|block| transport(model, face, block, diagnostics)));
    Some(needs)
}

fn nothing_acts(model: &Model, face: Face, names: &str) -> String {
    format!(
        "no derivative along {} in the equation of {names} needs a condition",
        model.axes[face.axis.0].name
    )
}

fn transport(model: &Model, face: Face, block: Block, diagnostics: &mut Diagnostics) -> Need {
    let names: Vec<&str> = block.fields.iter().map(|field| name(model, *field)).collect();
    let names = names.join(", ");
    let (count, why, refused) = match entering(model, &block, face.side) {
        Entering::Count(count) if block.matrix.iter().flatten().all(Expression::is_zero) => {
            (count, nothing_acts(model, face, &names), false)
        }
        Entering::Count(count) => (count, reason(model, face, &block, count), false),
        Entering::UnknownSign(speed) => {
            diagnostics.push(unknown(model, face, &block, &speed));
            (0, String::new(), true)
        }
        Entering::TooLarge(size) => {
            diagnostics.push(too_large(model, face, &block, size));
            (0, String::new(), true)
        }
    };
    Need { kind: NeedKind::Transport(block), count, why, refused }
}

/// Why so many characteristics enter, with their speeds.
fn reason(model: &Model, face: Face, block: &Block, count: usize) -> String {
    let place = place(model, face);
    let axis = &model.axes[face.axis.0].name;
    let Some((mean, root)) = mean_and_root(&block.matrix) else {
        return format!("{count} of the characteristics enter at {place}");
    };
    let speeds: Vec<String> = if root.is_zero() {
        vec![formula(&mean, model)]
    } else {
        vec![
            formula(&mean.clone().minus(root.clone()), model),
            formula(&Expression::sum([mean, root]), model),
        ]
    };
    // Increasing speeds: at the low face the last ones enter, at the high face the first ones.
    let (entering, words): (Vec<String>, &str) = match (count, face.side) {
        (0, _) => (speeds, "leave"),
        (1, Side::Low) => (speeds.into_iter().rev().take(1).collect(), "enters"),
        (1, Side::High) => (speeds.into_iter().take(1).collect(), "enters"),
        _ => (speeds, "enter"),
    };
    let noun =
        if entering.len() == 1 { "the characteristic with speed" } else { "the characteristics with speeds" };
    let verb = if words == "leave" && entering.len() == 1 { "leaves" } else { words };
    format!("{noun} {} along {axis} {verb} at {place}", entering.join(" and "))
}

fn equation_span(model: &Model, fields: &[FieldId]) -> crate::source::Span {
    fields
        .first()
        .and_then(|field| model.equations.get(field.0))
        .map_or_else(Default::default, |found| found.span)
}

fn unknown(model: &Model, face: Face, block: &Block, speed: &Expression) -> Diagnostic {
    let (place, shown) = (place(model, face), formula(speed, model));
    let found = dependence(speed, &model.coefficients);
    let what = if block.fields.len() == 1 { "the outward speed" } else { "what decides the directions" };
    let remedy = match found.fields.iter().next() {
        Some(field) => format!(
            "state bounds for {} in the fields section: `{} … between A and B`, both of one sign",
            name(model, *field),
            name(model, *field)
        ),
        None if !found.coordinates.is_empty() => {
            "the speed changes sign along the face or its bounds are too wide; choose a domain or a speed with one direction there, or make the axis periodic".to_owned()
        }
        None => "give the free constants in it a range of one sign: `between A and B`".to_owned(),
    };
    Diagnostic::error(
        codes::UNKNOWN_SPEED_SIGN,
        equation_span(model, &block.fields),
        format!("how many conditions {place} needs depends on the sign of {shown}, which is not known"),
    )
    .with_text(format!("{what} at {place} is {shown}"))
    .with_label(model.axes[face.axis.0].span, format!("the face {place} belongs to this axis"))
    .with_remedy(remedy)
}

fn too_large(model: &Model, face: Face, block: &Block, size: usize) -> Diagnostic {
    let names: Vec<&str> = block.fields.iter().map(|field| name(model, *field)).collect();
    Diagnostic::error(
        codes::THREE_FIELDS_COUPLED,
        equation_span(model, &block.fields),
        format!(
            "{size} fields ({}) are coupled by first derivatives at {}; more than two are not available yet",
            names.join(", "),
            place(model, face)
        ),
    )
    .with_remedy(format!("make {} periodic, or decouple the fields along it", model.axes[face.axis.0].name))
}

fn not_found(model: &Model, face: Face) -> Diagnostic {
    let fields: Vec<FieldId> = (0..model.fields.len())
        .map(FieldId)
        .filter(|field| crate::model::characteristics::matrix(model, &[*field], face.axis).is_none())
        .collect();
    Diagnostic::error(
        codes::CHARACTERISTICS_NOT_FOUND,
        equation_span(model, &fields),
        format!("the characteristics along {} cannot be found", model.axes[face.axis.0].name),
    )
    .with_text("expected derivatives that stand linearly, of expressions that can be differentiated by the fields")
    .with_remedy("take derivatives out of functions and products of derivatives, and replace abs, min, max and sign in fluxes by smooth functions")
}
