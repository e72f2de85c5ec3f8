//! Codes of the checker: names (E02xx), units (E03xx), equations (E04xx), starts and places (E05xx), accuracy and
//! operators (E06xx), time (E07xx), outputs (E08xx), grids and what is not available yet (E09xx).

use crate::code_table;

code_table! {
    UNKNOWN_NAME = "E0210", "a name that is declared nowhere",
        "Every name is declared once, in its section: axes, constants, coefficients, fields, operators. Only `t`, `π` and the functions need no declaration.",
        wrong "∂T/∂t = D * ∂²T/∂x²   # no constant D", right "constants\n  D = 1e-5 m²/s";
    DUPLICATE_NAME = "E0211", "a name that is declared twice",
        "A name means one thing in a model, whatever the section. Outputs need names of their own as well.",
        wrong "constants\n  k = 1\n  k = 2", right "constants\n  k_1 = 1\n  k_2 = 2";
    CYCLE = "E0212", "something that is defined by itself",
        "Constants, coefficients and operators may use each other in any order, but not in a circle.",
        wrong "a = 2 * b\nb = a / 2", right "a = 2\nb = a / 2";
    CASE_TWINS = "E0213", "fields or outputs that differ only in case",
        "Fields or written outputs `u` and `U` would be mistaken for each other, in formulas and as folders of results.",
        wrong "fields\n  u on x\n  U on x", right "fields\n  u on x\n  v on x";
    WRONG_KIND = "E0214", "a name of another kind",
        "Here an axis, a field, an operator or a function is expected, and the name was declared as something else.",
        wrong "at T = low: T = 0", right "at x = low: T = 0";
    HIDDEN_ARGUMENT = "E0215", "a coefficient that depends on what its arguments do not name",
        "The arguments of a coefficient name all that it depends on: axes, `t`, fields, also through other coefficients.",
        wrong "k(x) = 1 + y", right "k(x, y) = 1 + y";
    OPERATOR_ARGUMENTS = "E0216", "a wrong number of arguments of an operator",
        "A named operator takes as many arguments as its declaration has parameters.",
        wrong "spread(T, 2)", right "spread(T)";
    MISPLACED = "E0217", "something that cannot stand here",
        "Bounds, extents and times are numbers that are known before the run; given data depend on place and time; derivatives stand in equations and outputs; ∂/∂n stands in conditions.",
        wrong "axes\n  x: 0 m to T, 11 nodes", right "axes\n  x: 0 m to 1 m, 11 nodes";
    DIVISION_BY_ZERO = "E0218", "a division by zero",
        "What is below the line is exactly zero.",
        wrong "k = 1 / 0", right "k = 1";
    UNUSED_ARGUMENT = "W0201", "an argument that a coefficient does not use",
        "The arguments of a coefficient name what it depends on. One that its formula does not hold may be left over, or the formula may lack something.",
        wrong "k(x, y) = 1 + x", right "k(x) = 1 + x";
    FORMULA_TOO_LARGE = "E0219", "a formula that grows too large",
        "Constants, coefficients and operators may build on each other, but with everything put in a formula has at most 5000 parts, at most 300 deep: each of them is worked through at every node. A chain in which every name holds the one before twice doubles its size with each line.",
        wrong "a_1(x) = a_0 * a_0\na_2(x) = a_1 * a_1   # … and so on to a_60", right "a_60(x) = exp(2^60 * log(a_0))";
    NUMBER_OUT_OF_RANGE = "E0220", "a number beyond what a run can hold",
        "Numbers are exact here, but a run computes with doubles, in SI base units: a number is zero or has a size between about 1e-307 and 1e308.",
        wrong "L = 1e400 m", right "L = 1e4 m";
    NO_VALUE = "E0221", "a root, power or logarithm that has no value",
        "Roots and broken powers are taken of numbers that are not negative, logarithms of positive ones. Where a constant shows that there is no value, the model is refused; what depends on place or state is looked at when it runs.",
        wrong "a = sqrt(1 - 2)", right "a = sqrt(2 - 1)";
    UNKNOWN_UNIT = "E0301", "an unknown unit",
        "Units are those of the SI, with prefixes, and min, h, d, °. A unit has no space in it; products are written with `·`, and after `/` stands one factor or a bracket.",
        wrong "3 furlong", right "603.5 m";
    DIMENSIONS_DIFFER = "E0302", "units that do not agree",
        "Only quantities of the same dimension are added, compared or set equal. The literal 0 takes any dimension. Units in messages are SI base units.",
        wrong "k = 3 m + 2 s", right "k = 3 m + 2 m";
    ARGUMENT_NOT_A_NUMBER = "E0303", "a function of a quantity with a unit",
        "sin, exp, log and their kin take pure numbers. Divide the argument by a quantity of the same unit.",
        wrong "sin(x)   # x in m", right "sin(x / 1 m)";
    EXPONENT = "E0304", "an exponent that is no small pure number",
        "An exponent has no unit; the exponent of a quantity with a unit is a literal, because the unit of the result depends on it; and no exponent goes beyond ±64.",
        wrong "x^k   # x in m", right "x^2";
    NO_EQUATION = "E0401", "a field without an equation",
        "Each field has one equation, with its first or second time derivative.",
        wrong "fields\n  p on x\n  v on x\nequations\n  ∂p/∂t = -∂v/∂x", right "equations\n  ∂p/∂t = -∂v/∂x\n  ∂v/∂t = -∂p/∂x";
    SECOND_EQUATION = "E0402", "a field with two equations",
        "Each field has one equation.",
        wrong "∂T/∂t = 1\n∂T/∂t = 2", right "∂T/∂t = 3";
    NOT_LINEAR_IN_RATE = "E0403", "an equation that is not linear in its highest time derivative",
        "Equations are brought to the form ∂u/∂t = …, so the derivative may be multiplied by something without derivatives, and nothing else; and that something is not zero.",
        wrong "(∂T/∂t)^2 = 1", right "∂T/∂t = 1";
    NO_TIME_DERIVATIVE = "E0404", "an equation without a time derivative",
        "Steady equations are not solved: a steady state is what an evolution comes to.",
        wrong "0 = Δ T", right "∂T/∂t = Δ T";
    TWO_TIME_DERIVATIVES = "E0405", "an equation with the highest time derivatives of two fields",
        "Each equation belongs to the field whose highest time derivative it holds.",
        wrong "∂p/∂t + ∂v/∂t = 0", right "∂p/∂t = -∂v/∂x";
    RATE_ON_RIGHT = "E0406", "a rate that is not known yet",
        "The rate of change of a field that is first order in time follows from its own equation; put that in its place. Rates of fields that are second order in time may stand anywhere.",
        wrong "∂v/∂t = ∂p/∂t", right "∂v/∂t = -∂p/∂x";
    RATE_OF_FORMULA = "E0407", "the derivative of a formula where that of a field is expected",
        "∂/∂t and ∂/∂n are taken of a field, times constants at most.",
        wrong "∂(T^2)/∂t = 1", right "2 * T * ∂T/∂t = 1";
    TIME_ORDER = "E0408", "a time derivative of an order that is not offered",
        "Equations are of first or second order in time; conditions and outputs hold first time derivatives only.",
        wrong "∂³u/∂t³ = 1", right "∂²u/∂t² = 1";
    VECTOR_ALONE = "E0409", "a vector where a number is expected, or a number where a vector is",
        "∇T is a vector: take its divergence or a scalar product. ∇· takes terms with one gradient each.",
        wrong "∂T/∂t = ∇T", right "∂T/∂t = ∇·(k * ∇T)";
    NO_INITIAL = "E0531", "a start that is not given",
        "Every field needs its state at the start; a field that is second order in time needs its rate as well.",
        wrong "at t = start: u = 0   # ∂²u/∂t² = …", right "at t = start: u = 0; ∂u/∂t = 0";
    SECOND_INITIAL = "E0532", "a start that is given twice, or too much of it",
        "The state at the start is given once; the rate of a field that is first order in time follows from its equation.",
        wrong "at t = start: T = 1; T = 2", right "at t = start: T = 1";
    INITIAL_FORM = "E0533", "a start that is not of the form field = data",
        "At the start stands a field, or ∂/∂t of one, on the left, and data on the right.",
        wrong "at t = start: 2 * T = 1", right "at t = start: T = 1/2";
    NOT_A_FACE = "E0534", "a condition that is not on a face",
        "Only faces carry conditions: `low`, `high`, or a coordinate that is exactly one end of the axis.",
        wrong "at x = 0.1 m: T = 0   # inside", right "at x = low: T = 0";
    ORDER_RANGE = "E0601", "an order that is not offered",
        "Orders go from 1 to 16; with boundaries the offered closures set a lower bound.",
        wrong "order 40", right "order 4";
    STATED_TWICE = "E0602", "something that is stated twice",
        "Properties of an axis, the axes of a field, the arguments of a coefficient, the order, the closures, the interval, the method, the step, the grids and each solution are stated once.",
        wrong "order 2\norder 4", right "order 4";
    UNKNOWN_METHOD = "E0701", "an unknown time method",
        "The methods are euler, ssprk3, rk4, lsrk4 and leapfrog, by their names in the literature.",
        wrong "method rk5", right "method rk4";
    NOT_A_TIME = "E0702", "not a time",
        "Intervals, steps and the time between outputs are times, in the unit of the time interval.",
        wrong "T every 3 m", right "T every 3 s";
    TIME_DIRECTION = "E0703", "a time interval that does not run forwards",
        "The end is after the start.",
        wrong "3 s to 0 s", right "0 s to 3 s";
    NOT_POSITIVE = "E0704", "not greater than zero, or out of range",
        "Steps, fractions of the limit and distances between outputs are greater than zero; ranges lead from the first to the last.",
        wrong "step 0 s", right "step 0.9 of limit";
    TOO_MANY_STEPS = "E0705", "more steps or outputs than a run can make",
        "A run has at most 10¹² steps, and as many outputs of one line.",
        wrong "0 s to 1 d\n  step 1e-300 s", right "0 s to 1 d\n  step 0.9 of limit";
    OUTSIDE = "E0801", "a place outside the grid",
        "Gauges stand inside the axes or on their ends.",
        wrong "gauge a: T at x = 2 m   # x: 0 m to 1 m", right "gauge a: T at x = 0.5 m";
    PLACE_INCOMPLETE = "E0802", "a place without a coordinate for each axis",
        "A place has one coordinate along each axis.",
        wrong "gauge a: T at x = 0.5 m   # axes x and y", right "gauge a: T at x = 0.5 m, y = 0.2 m";
    GRIDS_ORDER = "E0803", "grids that do not grow",
        "A verification has two grids or more, and their node counts grow from one to the next: an order is seen in how the error falls.",
        wrong "grids 33, 17", right "grids 17, 33";
    VERIFICATION_INCOMPLETE = "E0804", "a verification that cannot be carried out",
        "A verification states grids, and what the results are compared with: exact solutions of the model as it is, or manufactured solutions, one for every field, from which sources and data are derived.",
        wrong "verification\n  grids 17, 33, 65", right "verification\n  exact T = 281 K\n  grids 17, 33, 65";
    NOT_AVAILABLE_YET = "E0901", "understood, but not available yet",
        "The language has this, and the compiler has not got it yet. The message names what and what to do instead.",
        wrong "method bdf2", right "method rk4";
    SECTION_MISSING = "E0910", "something that every model must say is missing",
        "A model says its axes, fields, equations, conditions, accuracy and time: nothing is assumed behind your back.",
        wrong "# no section `accuracy`", right "accuracy\n  order 4";
    AXES_COUNT = "E0911", "not one, two or three axes",
        "A model has 1 to 3 axes.",
        wrong "# four axes", right "axes\n  x: 0 to 1, 11 nodes\n  y: 0 to 1, 11 nodes";
    AXIS_DIRECTION = "E0912", "an axis that does not run upwards",
        "The first end of an axis is less than the second.",
        wrong "x: 1 m to 0 m, 11 nodes", right "x: 0 m to 1 m, 11 nodes";
    GRID_SIZE = "E0913", "a grid that is too small or too large",
        "An axis has at least 2 nodes, and a grid at most 2³⁴.",
        wrong "x: 0 m to 1 m, 1 nodes", right "x: 0 m to 1 m, 41 nodes";
    BOUNDS_ORDER = "E0914", "bounds in the wrong order",
        "`between A and B` has the lower bound first.",
        wrong "between 1 and 0", right "between 0 and 1";
    DEFAULT_OUTSIDE = "E0915", "a value outside its range",
        "A free constant has the value of the model when a run gives none, so that value lies in the range that `between` states.",
        wrong "f = 8, free between 0 and 5", right "f = 8, free between 0 and 50";
}
