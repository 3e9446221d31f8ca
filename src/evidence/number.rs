//! Numbers as people read them.

/// A number rounded to `digits` significant digits, but never coarser than one unit: 1.2346 becomes `1.235`, 0.00001234
/// becomes `1.234e-5`, and 512345.67 becomes `512346`. Trailing zeros are dropped; a number that is not finite is empty.
pub fn significant(value: f64, digits: usize) -> String {
    if !value.is_finite() {
        return String::new();
    }
    let digits = digits.max(1);
    let scientific = format!("{value:.*e}", digits - 1);
    let Some((mantissa, exponent)) = scientific.split_once('e') else {
        return scientific;
    };
    let exponent: i32 = exponent.parse().unwrap_or(0);
    if value == 0.0 {
        "0".into()
    } else if !(-4..16).contains(&exponent) {
        format!("{}e{exponent}", trimmed(mantissa))
    } else {
        let decimals = (digits as i32 - 1 - exponent).max(0) as usize;
        trimmed(&format!("{value:.decimals$}")).to_owned()
    }
}

/// Without trailing zeros after the decimal point, and without the point if nothing is left behind it.
fn trimmed(text: &str) -> &str {
    if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.') } else { text }
}

/// A whole number with a comma between thousands, such as `12,500`.
pub fn grouped(value: f64) -> String {
    let whole = format!("{:.0}", value.abs());
    let mut text = String::new();
    for (position, digit) in whole.chars().enumerate() {
        if position > 0 && (whole.len() - position).is_multiple_of(3) {
            text.push(',');
        }
        text.push(digit);
    }
    if value < 0.0 && whole != "0" { format!("\u{2212}{text}") } else { text }
}

/// A depth for people, such as `1,500 m`; fractions of a metre are kept below ten metres.
pub fn depth_label(metres: f64) -> String {
    if metres.abs() < 10.0 { format!("{} m", significant(metres, 2)) } else { format!("{} m", grouped(metres)) }
}

/// A distance for people: `500 m`, `1.5 km`.
pub fn distance_label(metres: f64) -> String {
    if metres.abs() < 1000.0 {
        format!("{} m", significant(metres, 3))
    } else {
        format!("{} km", significant(metres / 1000.0, 4))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn four_digits_but_never_coarser_than_a_unit() {
        // Expected texts: decimal rounding by hand.
        for (value, text) in [
            (1.23456, "1.235"),
            (0.000012345678, "1.235e-5"),
            (512345.67, "512346"),
            (0.05, "0.05"),
            (9.9999, "10"),
            (-0.0, "0"),
            (-2.5, "-2.5"),
            (100.0, "100"),
            (1e20, "1e20"),
            (f64::NAN, ""),
            (f64::INFINITY, ""),
        ] {
            assert_eq!(significant(value, 4), text);
        }
    }

    #[test]
    fn depths_and_distances_read_as_on_a_map() {
        assert_eq!(depth_label(12500.0), "12,500 m");
        assert_eq!(depth_label(1234567.0), "1,234,567 m");
        assert_eq!(depth_label(2.5), "2.5 m");
        assert_eq!(depth_label(-120.0), "\u{2212}120 m");
        assert_eq!(distance_label(500.0), "500 m");
        assert_eq!(distance_label(1500.0), "1.5 km");
    }
}
