//! Numbers as text, like C's `%g`: seventeen digits read back as the same double, and are the same text from C.

/// `value` with at most `digits` significant digits (at least one), trailing zeros cut off; like C's `%.{digits}g`.
pub fn general(value: f64, digits: usize) -> String {
    if value.is_nan() {
        return if value.is_sign_negative() { "-nan".to_owned() } else { "nan".to_owned() };
    }
    if value.is_infinite() {
        return if value < 0.0 { "-inf".to_owned() } else { "inf".to_owned() };
    }
    let digits = digits.max(1);
    let scientific = format!("{value:.*e}", digits - 1);
    let (mantissa, exponent) = scientific.split_once('e').unwrap_or((&scientific, "0"));
    let exponent: i32 = exponent.parse().unwrap_or(0);
    let (sign, mantissa) = match mantissa.strip_prefix('-') {
        Some(rest) => ("-", rest),
        None => ("", mantissa),
    };
    let figures: String = mantissa.chars().filter(char::is_ascii_digit).collect();
    let figures = match figures.trim_end_matches('0') {
        "" => "0",
        kept => kept,
    };
    let body = if exponent < -4 || exponent >= digits as i32 {
        let (first, rest) = figures.split_at(1);
        let point = if rest.is_empty() { "" } else { "." };
        let minus = if exponent < 0 { '-' } else { '+' };
        format!("{first}{point}{rest}e{minus}{:02}", exponent.abs())
    } else if exponent < 0 {
        format!("0.{}{figures}", "0".repeat((-exponent - 1) as usize))
    } else {
        let whole = exponent as usize + 1;
        if figures.len() <= whole {
            format!("{figures}{}", "0".repeat(whole - figures.len()))
        } else {
            format!("{}.{}", &figures[..whole], &figures[whole..])
        }
    };
    format!("{sign}{body}")
}

/// All digits of a double.
pub fn exact(value: f64) -> String {
    general(value, 17)
}

/// JSON has neither infinities nor NaN.
pub fn json_number(value: f64) -> String {
    if value.is_finite() { exact(value) } else { "null".to_owned() }
}

/// A quoted JSON string.
pub fn json_string(text: &str) -> String {
    let mut quoted = String::from("\"");
    for character in text.chars() {
        match character {
            '"' | '\\' => quoted.extend(['\\', character]),
            control if control < ' ' => quoted.push_str(&format!("\\u{:04x}", control as u32)),
            other => quoted.push(other),
        }
    }
    quoted.push('"');
    quoted
}

/// Text for an XML attribute or element.
pub fn xml_string(text: &str) -> String {
    text.replace('&', "&amp;").replace('<', "&lt;").replace('>', "&gt;").replace('"', "&quot;")
}

/// A CSV cell: quoted where it has to be.
pub fn csv_cell(text: &str) -> String {
    if text.contains([',', '"', '\n', '\r']) {
        format!("\"{}\"", text.replace('"', "\"\""))
    } else {
        text.to_owned()
    }
}
