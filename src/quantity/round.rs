//! Rounding for people: two digits of the uncertainty decide (JCGM 100:2008, clause 7.2.6).
//!
//! Halves: the double's own exact binary value decides, and where that is exactly half-way, the even digit is taken.
//! Nothing is rounded before a value is shown.

/// Decimal places that give `u` two significant digits; negative where u is 100 or more. A u that rounds up to three
/// digits (0.0996 to 0.10) is taken with one place less.
pub fn decimals_for(u: f64) -> i32 {
    let exponent = decade(u);
    let decimals = 1 - exponent;
    let in_last = u * power_of_ten(decimals);
    if in_last >= 99.5 { decimals - 1 } else { decimals }
}

/// Decimal places that show one unit of `digit`.
pub fn decimals_of_digit(digit: f64) -> i32 {
    -decade(digit * 1.000_000_1) // A digit of 0.01 may be 0.00999… after a unit factor.
}

/// Decimal places that show that many significant digits of a value.
pub fn decimals_for_digits(value: f64, digits: i32) -> i32 {
    if value == 0.0 { i32::MIN } else { digits - 1 - decade(value.abs()) }
}

/// Exponent of the leading digit.
fn decade(x: f64) -> i32 {
    if x <= 0.0 || !x.is_finite() {
        return 0;
    }
    // The formatter finds the decade exactly, where a logarithm may be off by one at a power of ten.
    let text = format!("{x:e}");
    text.split('e').nth(1).and_then(|exponent| exponent.parse().ok()).unwrap_or(0)
}

pub fn power_of_ten(exponent: i32) -> f64 {
    // Parsed, so that it is the double nearest to the decimal.
    format!("1e{exponent}").parse().unwrap_or(f64::NAN)
}

/// `value` with that many decimal places; negative places round to tens, hundreds.
pub fn fixed(value: f64, decimals: i32) -> String {
    // Figures that long are read by their power of ten, and digits past the seventeenth are noise.
    if value != 0.0 && (decimals > 12 || decade(value.abs()) > 15) {
        let digits = (decimals + decade(value.abs()) + 1).clamp(1, 17);
        return format!("{value:.*e}", (digits - 1) as usize);
    }
    let text = if decimals >= 0 {
        format!("{value:.*}", decimals as usize)
    } else {
        let scale = power_of_ten(-decimals);
        format!("{:.0}", (value / scale).round_ties_even() * scale)
    };
    if text.trim_start_matches('-').chars().all(|c| c == '0' || c == '.') {
        text.trim_start_matches('-').to_owned()
    } else {
        text
    }
}

/// The value with its uncertainty in brackets: `-37.62(13)`.
pub fn with_brackets(value: f64, u: f64) -> String {
    if u == 0.0 {
        return shortest(value);
    }
    let decimals = decimals_for(u);
    // Very large or small values read better with a power of ten, and brackets need a last digit to refer to. The rounded
    // figures decide, or 9.9998e-5 would be printed as 10.0e-5 and read back as another text.
    let rounded = |x: f64| fixed(x, decimals).parse::<f64>().map_or(0.0, f64::abs);
    let exponent = decade(rounded(value).max(rounded(u)));
    if !(-4..7).contains(&exponent) {
        let scale = power_of_ten(exponent);
        return format!("{}e{exponent}", bracketed(value / scale, u / scale, decimals + exponent));
    }
    bracketed(value, u, decimals)
}

fn bracketed(value: f64, u: f64, decimals: i32) -> String {
    let digits = if decimals >= 0 { fixed(u * power_of_ten(decimals), 0) } else { fixed(u, decimals) };
    format!("{}({digits})", fixed(value, decimals))
}

/// A number with that many significant digits, for figures without an uncertainty of their own.
pub fn significant(value: f64, digits: i32) -> String {
    let exponent = decade(value.abs());
    if value != 0.0 && !(-4..6).contains(&exponent) {
        return format!("{value:.*e}", (digits - 1).max(0) as usize);
    }
    fixed(value, digits - 1 - exponent)
}

/// An uncertainty, or a part of one, with two digits: `0.13`, `130`, `1.3e-9`.
pub fn with_two_digits(u: f64) -> String {
    let decimals = decimals_for(u.abs());
    if (-4..=6).contains(&decimals) { fixed(u, decimals) } else { format!("{u:.1e}") }
}

/// The shortest decimal that reads back as the same double; plain where that stays readable.
pub fn shortest(value: f64) -> String {
    let magnitude = value.abs();
    if magnitude != 0.0 && !(1e-4..1e15).contains(&magnitude) { format!("{value:e}") } else { format!("{value}") }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn two_digits_of_u_decide() {
        // JCGM 100:2008, 7.2.6: y = 10.057 62 ohm with u = 27 mohm is rounded to 10.058 ohm.
        assert_eq!(with_brackets(10.05762, 0.027), "10.058(27)");
        assert_eq!(with_brackets(-37.6183, 0.128), "-37.62(13)");
        assert_eq!(with_brackets(-37618.3, 128.0), "-37620(130)");
        assert_eq!(with_brackets(0.5, 0.0996), "0.50(10)");
        assert_eq!(with_brackets(1234.5, 9.96), "1234(10)");
        assert_eq!(with_brackets(5.0, 0.0), "5");
    }

    #[test]
    fn a_power_of_ten_is_chosen_by_the_rounded_figures() {
        assert_eq!(with_brackets(9.999_78e-5, 8.51e-5), "0.000100(85)");
        assert_eq!(with_brackets(9.96e-6, 2.1e-7), "9.96(21)e-6");
        assert_eq!(with_brackets(9_999_999.7, 12.0), "1.0000000(12)e7");
        assert_eq!(with_brackets(3.0e-7, 9.96e-6), "0.0(10)e-5");
    }

    #[test]
    fn exact_halves_go_to_the_even_digit() {
        assert_eq!(fixed(0.125, 2), "0.12");
        assert_eq!(fixed(0.375, 2), "0.38");
        assert_eq!(fixed(25.0, -1), "20");
        assert_eq!(fixed(-0.001, 2), "0.00");
    }
}
