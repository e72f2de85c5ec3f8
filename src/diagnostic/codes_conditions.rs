//! Codes of conditions at faces (E0501–E0539), of methods and coefficients that no answer can follow from
//! (E0541–E0549), of what faces cannot have yet (E0951, E0952) and of traps in well-formed models (W05xx).

use crate::code_table;

code_table! {
    FACE_LACKS_CONDITION = "E0501", "a face lacks a condition",
        "Each face needs as many conditions as information enters through it: one for each field whose equation has a second derivative normal to the face, and one for each characteristic of a first-order system that enters. The message says which and why.",
        wrong "conditions\n  at x = low: T = 281 K",
        right "conditions\n  at x = low:  T = 281 K\n  at x = high: ∂T/∂n = 0";
    TOO_MANY_CONDITIONS = "E0502", "a face has too many conditions",
        "More conditions than information enters through a face over-determine the solution: the surplus one contradicts what comes from inside.",
        wrong "  at x = low: T = 281 K\n  at x = low: T = 283 K",
        right "  at x = low: T = 281 K";
    CONDITION_AT_OUTFLOW = "E0503", "a condition stands where nothing enters",
        "All characteristics of these fields leave through the face, so their values there follow from the inside; a condition would contradict them. The eigenvalues of any discretization hide the fault, so it is counted instead.",
        wrong "  ∂q/∂t = -∂q/∂x\n  at x = high: q = 0",
        right "  ∂q/∂t = -∂q/∂x\n  at x = low: q = 0";
    NO_NORMAL_DERIVATIVE = "E0504", "the equation has no derivative that this condition could serve",
        "A condition serves a derivative normal to its face. Where the equation of the field has none (or no second one, for a condition on ∂/∂n), the face needs nothing of the kind.",
        wrong "  ∂q/∂t = -∂q/∂x\n  at x = low: ∂q/∂n = 0",
        right "  ∂q/∂t = -∂q/∂x\n  at x = low: q = 0";
    PERIODIC_AXIS = "E0505", "a periodic axis has no faces",
        "The two ends of a periodic axis are the same place, so that no condition can hold there.",
        wrong "axes\n  x: 0 to 1, 64 nodes periodic\nconditions\n  at x = low: q = 0",
        right "axes\n  x: 0 to 1, 64 nodes periodic";
    UNKNOWN_SPEED_SIGN = "E0506", "the direction of a characteristic is not known",
        "How many conditions a face needs depends on the signs of the characteristic speeds there. They must follow from constants, from the bounds of fields or from the ranges of free constants; a guess would be stable in one case and wrong in the other.",
        wrong "fields\n  u on x\nequations\n  ∂u/∂t = -u * ∂u/∂x",
        right "fields\n  u on x between 0.1 and 2\nequations\n  ∂u/∂t = -u * ∂u/∂x";
    CONTRADICTING_CONDITIONS = "E0507", "two kinds of condition contradict each other",
        "The value of a field and its flux cannot both be given at the same place of a face: either one determines the other.",
        wrong "  at x = low: T = 281 K\n  at x = low: ∂T/∂n = 0",
        right "  at x = low: T = 281 K";
    PATCHES_DO_NOT_FIT = "E0508", "the patches of a face leave a gap or overlap",
        "Patches must cover their face exactly once. A condition of the whole face beside patches is the rest: it holds wherever no patch does.",
        wrong "  at x = low and y < 0.3 m: T = 281 K\n  at x = low and y > 0.3 m: ∂T/∂n = 0",
        right "  at x = low and y < 0.3 m:  T = 281 K\n  at x = low and y >= 0.3 m: ∂T/∂n = 0";
    PATCH_NOT_COMPARABLE = "E0509", "a patch is not a comparison of a tangential coordinate with a constant",
        "Patches are cut by comparisons of coordinates along the face with constants, so that it can be seen whether they cover it exactly once.",
        wrong "  at x = low and y < x: T = 281 K",
        right "  at x = low and y < 0.3 m: T = 281 K";
    DATA_DEPEND_ON_STATE = "E0510", "given data depend on an unknown",
        "A given value may depend on time, on position and on constants. A value that depends on another unknown would couple two fields at the face in a way that no energy estimate covers.",
        wrong "  at x = low: T = C",
        right "  at x = low: T = 281 K";
    NOT_SOLVABLE = "E0511", "the condition cannot be solved for what it gives",
        "A condition is solved for the value or the normal derivative of its field. The factor in front must be free of unknowns and must not vanish anywhere on the face.",
        wrong "  at x = low: (y - 0.5) * ∂T/∂n = 1",
        right "  at x = low: ∂T/∂n = 1";
    RELATION_NOT_LINEAR = "E0512", "a relation between fields is not linear",
        "Relations at the face of a first-order system are linear in its fields: Σ coefficient·field = data.",
        wrong "  at x = low: p * v = 1",
        right "  at x = low: p = 400 * v";
    RELATION_SETS_OUTGOING = "E0513", "a relation says nothing about what enters",
        "A relation must determine the entering characteristics from the outgoing ones and the data. One that gives only an outgoing characteristic contradicts the inside and leaves the entering one free.",
        wrong "  ∂p/∂t = -∂v/∂x; ∂v/∂t = -∂p/∂x\n  at x = high: p = -v",
        right "  at x = high: p = v";
    RATE_IN_CONDITION = "E0514", "a rate of change stands where it cannot",
        "∂u/∂t may stand in a condition together with ∂u/∂n when the equation of u is second order in time (one-way wave conditions). Conditions that are evolution equations of their own are not offered.",
        wrong "  at x = low: ∂T/∂t = 1 K/s",
        right "  at x = low: T = 281 K + 1 K/s * t";
    DERIVATIVE_IN_CONDITION = "E0515", "a derivative in a condition is not the normal derivative of one field",
        "A condition may hold the outward normal derivative ∂u/∂n of one field. Tangential and higher derivatives, and normal derivatives of two fields, are not offered.",
        wrong "  at x = low: ∂T/∂y = 0",
        right "  at x = low: ∂T/∂n = 0";
    FLUX_OF_FIXED_FIELD = "E0516", "an equation needs a flux of a field whose value is given",
        "The equation of one field holds the second derivative of another. At the face it needs the normal derivative of that other field, which is not known where its value is given.",
        wrong "  ∂u/∂t = ∂²u/∂x² + ∂²w/∂x²\n  at x = low: ∂u/∂n = 0; w = 0",
        right "  at x = low: u = 0; w = 0";
    NAMES_NO_FIELD = "E0517", "a condition names no field",
        "A condition is an equality that holds at a face for one of the model's fields.",
        wrong "  at x = low: 1 = 1",
        right "  at x = low: T = 281 K";
    ABSORBING_WRONG_SIGN = "E0518", "a one-way condition feeds the wave",
        "∂u/∂n = −(1/c) ∂u/∂t lets waves leave. With the other sign the face adds energy at every step and the solution grows without bound.",
        wrong "  at x = high: ∂u/∂t - c * ∂u/∂n = 0",
        right "  at x = high: ∂u/∂t + c * ∂u/∂n = 0";
    CHARACTERISTICS_NOT_FOUND = "E0519", "the characteristics at a face cannot be found",
        "The equations must be linear in their spatial derivatives, and fluxes must be differentiable by the fields, for the entering characteristics to be counted.",
        wrong "  ∂q/∂t = -abs(∂q/∂x)",
        right "  ∂q/∂t = -∂q/∂x";

    NEGATIVE_DIFFUSION = "E0541", "a diffusion coefficient is negative",
        "Diffusion with a negative coefficient runs backwards: short waves grow without bound at once, on every grid, with every method. With second derivatives in time the equation is elliptic and not a wave equation.",
        wrong "  ∂T/∂t = -k * ∂²T/∂x²",
        right "  ∂T/∂t = k * ∂²T/∂x²";
    EULER_UNSTABLE = "E0542", "forward Euler is unstable for this model",
        "The stability region of forward Euler touches the imaginary axis only at zero. Central first derivatives without diffusion, and wave equations, have imaginary spectra: every step amplifies them.",
        wrong "  ∂q/∂t = -∂q/∂x\ntime\n  method euler",
        right "time\n  method rk4";
    LEAPFROG_NEEDS_SECOND_ORDER = "E0543", "leapfrog needs equations of second order in time",
        "Leapfrog here is the two-step method for ∂²u/∂t² = …, which needs every field second order in time. A first-order field with losses would grow.",
        wrong "  ∂T/∂t = k * ∂²T/∂x²\ntime\n  method leapfrog",
        right "time\n  method rk4";
    LEAPFROG_RATE = "E0544", "leapfrog cannot take this rate of change",
        "With leapfrog ∂u/∂t is half a step off; it can be centred only where it stands linearly, in the equation of its own field and outside of spatial derivatives.",
        wrong "  ∂²u/∂t² = ∂²u/∂x² - (∂u/∂t)^2",
        right "  ∂²u/∂t² = ∂²u/∂x² - 2 * ∂u/∂t";

    THREE_FIELDS_COUPLED = "E0951", "three or more fields are coupled at a face (not available yet)",
        "Entering characteristics are found for one field and for pairs. Blocks of three or more fields coupled by first derivatives along a bounded axis are not available yet.",
        wrong "(three fields, each with ∂/∂x of the next, on a bounded axis)",
        right "(the same on a periodic axis)";
    MIXED_WITH_FLUX = "E0952", "a mixed derivative meets a flux condition (not available yet)",
        "A mixed derivative has a flux through the faces of both its axes that a condition on ∂/∂n alone does not determine. Flux conditions there are not available yet; values are.",
        wrong "  ∂u/∂t = ∂²u/∂x² + ∂²u/∂x∂y + ∂²u/∂y²\n  at x = low: ∂u/∂n = 0",
        right "  at x = low: u = 0";

    START_MISMATCH = "W0501", "initial data disagree with a condition at the start",
        "Where the initial field differs from the value given at a face, the solution jumps at the start. The jump smooths out with diffusion but travels with waves, and the order asked for is not reached near it.",
        wrong "  at x = low: T = 300 K\n  at t = start: T = 281 K",
        right "  at x = low: T = 300 K - 19 K * exp(-t / 60 s)\n  at t = start: T = 281 K";
    EDGE_MISMATCH = "W0502", "two faces give different values where they meet",
        "At an edge or corner the later face sets the value; the solution has a singularity there that lowers the order nearby.",
        wrong "  at x = low: T = 281 K\n  at y = low: T = 300 K",
        right "  at x = low: T = 281 K + 19 K * x / 1 m";
    ROBIN_WRONG_SIGN = "W0503", "a film coefficient has the wrong sign",
        "k ∂u/∂n = a u with a > 0 feeds the field in proportion to itself: the energy grows. A film loses: −k ∂u/∂n = h (u − u_outside).",
        wrong "  at x = high: k * ∂T/∂n = h * (T - T_room)",
        right "  at x = high: -k * ∂T/∂n = h * (T - T_room)";
    OVER_REFLECTING = "W0504", "a face reflects more than it receives",
        "The relation returns an entering wave larger than the outgoing one. This is a property of the model, not of its discretization: the energy grows at each reflection.",
        wrong "  at x = high: p = -0.2 * v",
        right "  at x = high: p = 0.2 * v";
    DIFFUSION_SIGN_UNKNOWN = "W0505", "the sign of a diffusion coefficient is not known",
        "Stability needs a coefficient that is nowhere negative. It could not be shown from constants, bounds and ranges.",
        wrong "coefficients\n  k(T) = 1 + T",
        right "fields\n  T on x between 0 and 10";
    STEP_ABOVE_LIMIT = "W0506", "the step is above the stability limit",
        "A step larger than the limit amplifies the shortest waves at every step.",
        wrong "  step 1.2 of limit",
        right "  step 0.9 of limit";
    LEAPFROG_AT_LIMIT = "W0507", "leapfrog is run at its limit",
        "At the limit itself leapfrog lets the shortest wave grow linearly with time; rounding feeds it. At most 0.98 of the limit is safe.",
        wrong "  method leapfrog\n  step 1 of limit",
        right "  method leapfrog\n  step 0.9 of limit";
    METHOD_LIMITS_ORDER = "W0508", "the time method is of lower order than was asked for",
        "The order asked for is that of the solution; where the step is tied to the spacing, the method's own order limits it.",
        wrong "accuracy\n  order 6\ntime\n  method ssprk3",
        right "accuracy\n  order 4\ntime\n  method rk4";
    CELL_PECLET = "W0509", "the cell Péclet number lets central differences ring",
        "With |a| Δx / k above 2 a central difference overshoots near layers that the grid does not resolve. The solution stays stable, but wiggles show there.",
        wrong "axes\n  x: 0 to 1, 11 nodes\nequations\n  ∂C/∂t = -∂C/∂x + 0.001 * ∂²C/∂x²",
        right "axes\n  x: 0 to 1, 1001 nodes";
    EULER_CENTRAL = "W0510", "forward Euler carries a central first derivative by diffusion alone",
        "Without diffusion the pair is unstable; with it the step must stay below 2k/a², however fine the grid.",
        wrong "  ∂C/∂t = -∂C/∂x + 0.01 * ∂²C/∂x²\ntime\n  method euler",
        right "time\n  method rk4";
    COEFFICIENT_JUMPS = "W0511", "a coefficient jumps inside a derivative",
        "The conservation form stays stable and conserves across a jump, but the solution has a kink there, and the order falls to one near it unless the jump lies where the scheme expects it.",
        wrong "coefficients\n  k(x) = cases(x < 0.2 m: 0.7, otherwise: 2)",
        right "coefficients\n  k(x) = 0.7 + 0.65 * (1 + tanh((x - 0.2 m) / 0.02 m))";
    DATA_NOT_DIFFERENTIABLE = "W0512", "given data cannot be differentiated in time",
        "Time-dependent data are advanced with their derivative, so that no order is lost in the stages. Where there is none in closed form the stage values are set directly, and the order in time falls to about two and a half.",
        wrong "  at x = low: T = 281 K + 7 K * abs(sin(t / 60 s))",
        right "  at x = low: T = 281 K + 7 K * sin(t / 60 s)^2";
    START_OUT_OF_RANGE = "W0513", "initial data leave the stated range",
        "The bounds of a field are used for signs, step limits and blow-up; a state that begins outside makes all of these void.",
        wrong "fields\n  u on x between 0 and 1\nconditions\n  at t = start: u = 2",
        right "fields\n  u on x between 0 and 2";
    RATE_OUTPUT_STAGGERED = "W0514", "a rate of change is written half a step off",
        "Leapfrog knows ∂u/∂t between steps. What is written under a time belongs to half a step before it.",
        wrong "  method leapfrog\noutput\n  speed = ∂u/∂t every 1 s",
        right "  method rk4";
    SIGN_AT_DEFAULT = "W0515", "a sign was decided at the default of a free constant",
        "A free constant without a range may be set to anything when the program runs. A decision about conditions was made with its default and does not hold for other signs.",
        wrong "constants\n  a = 1 m/s, free",
        right "constants\n  a = 1 m/s, free between 0.1 m/s and 5 m/s";
}
