//! Verification: exact and manufactured solutions and the grids on which they are compared.

use std::collections::BTreeMap;

use super::Checker;
use super::formula::Place;
use crate::diagnostic::{Diagnostic, codes_check};
use crate::model::{Expression, FieldId, Verification};
use crate::source::Span;
use crate::syntax::tree::{self, Section, VerificationKind};

/// Nodes along an axis of a verification's grid.
const MOST_NODES: usize = 1 << 20;

impl Checker<'_> {
    /// The outer nothing is a fault, the inner one an absent section.
    pub(super) fn verification(&mut self) -> Option<Option<Verification>> {
        let file = self.file;
        if file.verification.is_empty() {
            return (!self.has_faulty(Section::Verification)).then_some(None);
        }
        let mut result = Verification { solutions: Vec::new(), manufactured: false, grids: Vec::new() };
        let mut sound = !self.has_faulty(Section::Verification);
        let mut first: BTreeMap<FieldId, Span> = BTreeMap::new();
        let mut grids_at: Option<Span> = None;
        for line in &file.verification {
            match &line.kind {
                VerificationKind::Exact { field, value }
                | VerificationKind::Manufactured { field, value } => {
                    result.manufactured |= matches!(line.kind, VerificationKind::Manufactured { .. });
                    match self.solution(field, value) {
                        Some((id, value)) => match first.get(&id) {
                            Some(first) => {
                                let what = format!("the solution of `{}`", field.text);
                                self.stated_twice(line.span, *first, &what);
                                sound = false;
                            }
                            None => {
                                first.insert(id, line.span);
                                result.solutions.push((id, value));
                            }
                        },
                        None => sound = false,
                    }
                }
                VerificationKind::Grids(grids) => {
                    if let Some(first) = grids_at {
                        self.stated_twice(line.span, first, "the list of grids");
                        sound = false;
                        continue;
                    }
                    grids_at = Some(line.span);
                    match self.grids(grids, line.span) {
                        Some(grids) => result.grids = grids,
                        None => sound = false,
                    }
                }
            }
        }
        sound.then_some(())?;
        self.complete(&result)?;
        Some(Some(result))
    }

    /// Node counts that grow; an order is seen from two grids on.
    fn grids(&mut self, grids: &[tree::Whole], span: Span) -> Option<Vec<usize>> {
        let counts: Vec<usize> = grids.iter().map(|grid| grid.value as usize).collect();
        let enough = counts.len() >= 2 && counts.iter().all(|count| (2..=MOST_NODES).contains(count));
        if enough && counts.is_sorted_by(|a, b| a < b) {
            return Some(counts);
        }
        self.diagnostics.push(
            Diagnostic::error(
                codes_check::GRIDS_ORDER,
                span,
                "these grids cannot show an order of convergence",
            )
            .with_text(format!("expected two or more node counts that increase, from 2 to {MOST_NODES}"))
            .with_remedy("write `grids 17, 33, 65`, say"),
        );
        None
    }

    /// A verification has grids and something to compare with: exact solutions, or a manufactured one of every field.
    fn complete(&mut self, result: &Verification) -> Option<()> {
        let file = self.file;
        let exact = file.verification.iter().any(|line| matches!(line.kind, VerificationKind::Exact { .. }));
        let lacking: Vec<String> = (file.fields.iter().enumerate())
            .filter(|(index, _)| !result.solutions.iter().any(|(id, _)| id.0 == *index))
            .map(|(_, field)| format!("`manufactured {} = …`", field.name.text))
            .collect();
        let (message, remedy) = if result.solutions.is_empty() {
            ("there is no solution to compare with", "add a line like `exact T = …`".to_owned())
        } else if result.grids.is_empty() {
            ("the grids are not stated", "add a line like `grids 17, 33, 65`".to_owned())
        } else if exact && result.manufactured {
            (
                "solutions are exact or manufactured, not both",
                "write all lines with `manufactured`: sources are then derived for every field".to_owned(),
            )
        } else if result.manufactured && !lacking.is_empty() {
            (
                "a manufactured solution needs a formula for every field",
                format!("add {}", lacking.join(" and ")),
            )
        } else {
            return Some(());
        };
        let span = self.section_span(Section::Verification);
        self.diagnostics
            .push(Diagnostic::error(codes_check::VERIFICATION_INCOMPLETE, span, message).with_remedy(remedy));
        None
    }

    fn solution(&mut self, field: &tree::Name, value: &tree::Expression) -> Option<(FieldId, Expression)> {
        let found = self.scope.field(&field.text);
        let id = self.scope.expect(field, "a field", found, &mut self.diagnostics)?;
        let typed = self.formula(value, Place::Data)?;
        let wanted = self.scope.fields.get(id.0).cloned().flatten();
        if let (Some(own), Some(wanted)) = (typed.dimension.clone(), wanted)
            && own != wanted
        {
            self.mismatch(value.span, &own, field.span, &wanted, "a solution and its field");
            return None;
        }
        Some((id, typed.value))
    }
}
