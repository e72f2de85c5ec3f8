//! Codes of text and syntax (E01xx), and of names and numbers that the syntax alone decides (E02xx below E0220).
//!
//! The codes of the checker are in [`super::codes_check`].

use crate::code_table;

code_table! {
    UNEXPECTED = "E0101", "the statement cannot be read here",
        "A statement does not have one of the forms that its section takes. The message says what could have stood at the marked place, and which forms the section has. The other statements of the file are read all the same.",
        wrong "constants\n  k 0.72",
        right "constants\n  k = 0.72";
    NOT_UTF8 = "E0102", "the file is not UTF-8 text",
        "A model file is Unicode text in UTF-8. A file in another encoding shows as this fault; save it as UTF-8 in the editor.",
        wrong "(a file saved in a national code page)",
        right "(the same file saved as UTF-8)";
    TOO_LARGE = "E0103", "the file is too large",
        "A model file is a page of text and has at most 1 MiB. Data belong into files of their own.",
        wrong "(two megabytes of numbers)",
        right "coefficients\n  c in m/s on x from \"c.npy\"";
    STRAY_CHARACTER = "E0104", "a character that is none of the language",
        "Formulas are made of letters, the digits 0 to 9, superscripts, subscript digits and the signs + - * · / ^ = < > ≤ ≥ ( ) , : ; ∂ ∇ Δ °. Characters that only look like one of these (a long minus, a multiplication cross, a no-break space) are read as it; all others are refused. Comments after # and texts in quotes may hold anything.",
        wrong "constants\n  n = x[1]",
        right "constants\n  n = x_1";
    OPEN_TEXT = "E0105", "a text in quotes is not closed",
        "A text begins and ends with a double quote on one line and knows no escapes.",
        wrong "model wall \"A wall",
        right "model wall \"A wall\"";
    UNKNOWN_CONTROL_WORD = "E0106", "an unknown control word",
        "A control word is a backslash and the longest run of letters after it, as in TeX, and stands for a symbol: \\partial, \\nabla, \\Delta, \\pi, \\cdot, \\le, the Greek letters, the names of functions. Others are refused.",
        wrong "equations\n  \\partialu/\\partial t = \\frac{1}{2}",
        right "equations\n  \\partial u/\\partial t = 1/2";
    PRIME = "E0107", "a prime in a formula",
        "Derivatives are fractions, so a prime could only be part of a name, and it would be read as a derivative by every reader. Write ∂u/∂x, or give the second variable a name of its own.",
        wrong "equations\n  T' = T",
        right "equations\n  ∂T/∂t = T";
    TOO_DEEP = "E0108", "formulas nested too deep",
        "Brackets nest at most 256 deep and signs stand at most 64 in a row. No formula of a paper comes near; a generated one can name its parts as coefficients.",
        wrong "((((… 300 times …))))",
        right "coefficients\n  part(x) = …";
    TOO_LONG = "E0109", "a statement too long",
        "A statement has at most 20 000 words and signs. Divide it by naming parts as coefficients, or read data from a file.",
        wrong "k = a + a + a + … (20 000 times)",
        right "k = 20000 * a";
    TOO_MANY_FAULTS = "E0110", "too many faults",
        "After 500 faults the rest of the file is not read: it is hardly a model.",
        wrong "(a file of another kind)",
        right "model wall \"A wall\"\n…";
    NO_HEADER = "E0111", "the model's name is missing",
        "The first line of a file is `model NAME \"TITLE\"`. The name prefixes what is emitted, the title heads the report.",
        wrong "axes\n  x: 0 to 1, 11 nodes",
        right "model wall \"A wall\"\n\naxes\n  x: 0 to 1, 11 nodes";
    UNKNOWN_SECTION = "E0112", "a word that opens no section",
        "A word alone at the start of a line opens a section. The sections are axes, constants, coefficients, fields, operators, equations, conditions, accuracy, time, output and verification, in lower case and without a colon.",
        wrong "Constants:\n  k = 1",
        right "constants\n  k = 1";
    DUPLICATE_SECTION = "E0113", "a section opened twice",
        "Each section stands once in a file; the order of sections is free.",
        wrong "constants\n  k = 1\nfields\n  u on x\nconstants\n  c = 2",
        right "constants\n  k = 1\n  c = 2\nfields\n  u on x";
    OUTSIDE_SECTION = "E0114", "a statement in no section",
        "After the first line every statement stands under a section word.",
        wrong "model wall \"A wall\"\nk = 1",
        right "model wall \"A wall\"\nconstants\n  k = 1";
    OPEN_BRACKET = "E0115", "a bracket that is never closed",
        "A statement goes on over line ends while a bracket is open, at most to the next section word. Statements after the line with the open bracket are read as if it were closed, so that their faults show too.",
        wrong "constants\n  a = (1 + 2\n  b = 3",
        right "constants\n  a = (1 + 2)\n  b = 3";
    STRAY_BRACKET = "E0116", "a bracket that closes nothing",
        "A closing bracket stands where none is open.",
        wrong "constants\n  a = 1 + 2)",
        right "constants\n  a = 1 + 2";
    SECOND_EQUALS = "E0117", "a second equals sign",
        "An equality has two sides. This often comes from a line that begins with a sign: such a line goes on from the one above.",
        wrong "equations\n  ∂u/∂t = a\n  -∂v/∂t = b",
        right "equations\n  ∂u/∂t = a\n  ∂v/∂t = -b";
    WRONG_OPERATOR = "E0118", "an operator of another notation",
        "Powers are written ^ or with superscripts, an equality with one =, comparisons <, ≤ (<=), > and ≥ (>=).",
        wrong "a = x**2",
        right "a = x^2";
    NO_PLACE = "E0119", "a condition without a place",
        "Every condition says where it holds before a colon. Several conditions at one place, and several places for one condition, are separated by semicolons.",
        wrong "conditions\n  T = 281 K",
        right "conditions\n  at x = low: T = 281 K";
    JUXTAPOSITION = "E0120", "an operator is missing",
        "Multiplication is written, as * or ·. A word may follow a number only as its unit, with one space before it and none within; products in units are written with ·.",
        wrong "m = 3 kg m/s² \na = 2*π m",
        right "m = 3 kg·m/s²\na = 2*π * 1 m";
    DERIVATIVE_ORDERS = "E0121", "the orders of a derivative disagree",
        "The order above the line equals the sum of the powers below it, as in ∂²u/∂x∂y. `∂u/∂x^2` could be a second derivative or the square of a first one.",
        wrong "∂u/∂x^2",
        right "∂²u/∂x²    or    (∂u/∂x)^2";
    DERIVATIVE_POWER = "E0122", "a power in the numerator of a derivative",
        "`∂u²/∂x` could be the derivative of u² or a slip for a second derivative.",
        wrong "∂u²/∂x",
        right "∂(u^2)/∂x    or    ∂²u/∂x²";
    DERIVATIVE_APPLIED = "E0123", "a bracket after a derivative",
        "`∂u/∂x(k)` could be a product, or the derivative of k. Multiplication is written, and what is derived stands either above the line or in the bracket.",
        wrong "∂u/∂x(k)",
        right "∂u/∂x * k    or    ∂/∂x(k)";
    DERIVATIVE_BARE = "E0124", "a derivative without a bracket",
        "What ∂/∂x is applied to stands in a bracket, so that its extent is not in doubt.",
        wrong "∂/∂x u",
        right "∂/∂x(u)    or    ∂u/∂x";
    DERIVATIVE_RANGE = "E0125", "a derivative of an order that is not offered",
        "Derivatives have orders 1 to 4. A higher one can be written with a further field.",
        wrong "∂⁵u/∂x⁵",
        right "∂⁴u/∂x⁴";
    POWER_CHAIN = "E0126", "a power of a power without a bracket",
        "`x^2^3` is read from the right by some and from the left by others.",
        wrong "x^2^3",
        right "(x^2)^3    or    x^(2^3)";
    QUOTIENT_OF_QUANTITY = "E0127", "a number over a quantity",
        "`1/400 m` could be a four-hundredth of a metre or one over 400 metres. Where a plain number stands before the line, the unit's side must be shown.",
        wrong "step 1/400 m",
        right "1 m / 400    or    1 / (400 m)";
    UNIT_DIVISION = "E0128", "a unit with more than one factor after the line",
        "After a / in a unit there is one factor or a bracket. `W/m·K` is read in two ways.",
        wrong "k = 0.72 W/m·K",
        right "k = 0.72 W/(m·K)";
    UNIT_OR_NAME = "E0129", "a unit that is also a name of the model",
        "A word after a number is a unit. Where the model declares the same word as a name, `2 h` could be two hours or twice h.",
        wrong "constants\n  h = 8\n  a = 2 h",
        right "constants\n  h = 8\n  a = 2 * h";
    OFFSET_SCALE = "E0130", "a temperature scale with an offset",
        "Degrees Celsius and Fahrenheit have their zero elsewhere, so that sums and products of such values mean nothing. Temperatures are given in kelvin.",
        wrong "T = 20 °C",
        right "T = 293.15 K";
    INDEX_DERIVATIVE = "E0131", "a derivative in another notation",
        "Names like u_t, u_xx or du/dx are names, not derivatives. A derivative is written as a fraction with ∂ (or \\partial).",
        wrong "equations\n  u_t = u_xx",
        right "equations\n  ∂u/∂t = ∂²u/∂x²";
    DELTA_IN_NAME = "E0132", "Δ in a name",
        "Δ is the Laplace operator; it stands in no name.",
        wrong "constants\n  Δt = 0.1 s",
        right "constants\n  dt = 0.1 s";
    FUNCTION_WITHOUT_BRACKET = "E0133", "a function without its argument",
        "The argument of a function stands in a bracket. The square of a sine is sin(x)^2.",
        wrong "sin x + cos²(x)",
        right "sin(x) + cos(x)^2";
    NOT_A_FUNCTION = "E0134", "a bracket after a name that is no function",
        "A name before a bracket is a function or a named operator. Coefficients are used by their bare names; products are written with *.",
        wrong "h(T - T_room)",
        right "h * (T - T_room)";
    ARGUMENTS = "E0135", "a wrong number of arguments",
        "`min` and `max` take two arguments or more, the other functions one.",
        wrong "sqrt(a, b)",
        right "sqrt(a)";
    POWER_OF_QUANTITY = "E0136", "a power after a quantity",
        "`4 m ^2` could be the square of four metres or four square metres.",
        wrong "4 m ^2",
        right "(4 m)^2    or    4 m^2";
    UNIT_PRODUCT = "E0137", "a unit with the multiplication sign of formulas",
        "Products within a unit are written with ·. In `0.72 W/(m*K)` the unit ends at W, and what follows is a quotient by names that are not declared.",
        wrong "k = 0.72 W/(m*K)",
        right "k = 0.72 W/(m·K)";
    NUMBER_FORM = "E0201", "a number that is not written as one",
        "Numbers are written 0.5, .5, 3e8 or 1.5e-3. Digits follow the decimal point.",
        wrong "5.",
        right "5    or    5.0";
    DECIMAL_COMMA = "E0202", "a comma between digits",
        "The decimal sign is a point. As `0,5` is also how two numbers without a space look, a space is asked for after every comma that stands between numbers.",
        wrong "max(0,5)",
        right "max(0, 5)    or    0.5";
    NUMBER_TOO_LARGE = "E0203", "a number that cannot be kept exactly",
        "Numbers are kept exactly, so their size is bounded: exponents of ten go to ±1000, exponents of units to ±100.",
        wrong "1e5000",
        right "1e50";
    NUMBER_JOINED = "E0204", "a number and a word run together",
        "A unit follows a number after a space; a product is written with *.",
        wrong "2x + 3m",
        right "2 * x + 3 m";
    RESERVED_NAME = "E0205", "a name that cannot be declared",
        "Section words, function names, t and π have their meaning everywhere and cannot be declared.",
        wrong "constants\n  t = 3 s",
        right "constants\n  t_0 = 3 s";
    BAD_NAME = "E0206", "a name that does not begin with a letter",
        "Names begin with a letter and go on with letters, digits, underscores and subscript digits.",
        wrong "_a = 1",
        right "a = 1";
}
