//! Powers as they are written: `-1`, `0.5`, `1/2`, `⁻¹`, counted in halves.
//!
//! Only halves are kept, since a dimension holds nothing finer; a third is refused, not rounded.

use crate::units::unit_error::UnitError;

/// An exponent in halves. Zeros that say nothing are dropped, so that only a large number is too large.
pub(crate) fn halves(
    negative: bool,
    whole: &str,
    decimals: &str,
    divisor: &str,
    symbol: &str,
) -> Result<i32, UnitError> {
    if whole.is_empty() {
        return Err(UnitError::UnreadableExponent { symbol: symbol.to_owned() });
    }
    let (whole, decimals) = (whole.trim_start_matches('0'), decimals.trim_end_matches('0'));
    let shown = || {
        let point = if decimals.is_empty() { "" } else { "." };
        let slash = if divisor.is_empty() { "" } else { "/" };
        let sign = if negative { "-" } else { "" };
        let whole = if whole.is_empty() { "0" } else { whole };
        format!("{sign}{whole}{point}{decimals}{slash}{divisor}")
    };
    let not_half = || UnitError::ExponentNotHalf { symbol: symbol.to_owned(), exponent: shown() };
    if whole.len() > 4 {
        return Err(UnitError::ExponentTooLarge { symbol: symbol.to_owned() });
    }
    let whole: i32 = if whole.is_empty() { 0 } else { whole.parse().map_err(|_| not_half())? };
    let half = match decimals {
        "" => 0,
        "5" => 1,
        _ => return Err(not_half()),
    };
    let divisor: i32 = match divisor.trim_start_matches('0') {
        "" if divisor.is_empty() => 1,
        digits => digits.parse().map_err(|_| not_half())?,
    };
    let twice = 2 * whole + half;
    if divisor == 0 || twice % divisor != 0 {
        return Err(not_half());
    }
    Ok(if negative { -twice / divisor } else { twice / divisor })
}

/// The hyphen, the minus sign, and the dash that word processors make of it.
pub(crate) fn is_minus(c: char) -> bool {
    matches!(c, '-' | '−' | '–')
}

/// The digit that a superscript stands for.
pub(crate) fn superscript(c: char) -> Option<char> {
    let digits = ['⁰', '¹', '²', '³', '⁴', '⁵', '⁶', '⁷', '⁸', '⁹'];
    let at = digits.iter().position(|&digit| digit == c)?;
    char::from_digit(at as u32, 10)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn read(whole: &str, decimals: &str, divisor: &str) -> Option<i32> {
        halves(true, whole, decimals, divisor, "m").ok()
    }

    #[test]
    fn wholes_and_halves_are_read_and_nothing_else() {
        assert_eq!(read("2", "", ""), Some(-4));
        assert_eq!(read("002", "000", ""), Some(-4));
        assert_eq!(read("1", "5", ""), Some(-3));
        assert_eq!(read("3", "", "2"), Some(-3));
        assert_eq!(read("4", "", "8"), Some(-1));
        assert_eq!(read("9999", "", ""), Some(-19_998));
        for (whole, decimals, divisor) in
            [("", "", ""), ("1", "", "3"), ("1", "", "0"), ("0", "25", ""), ("99999", "", "")]
        {
            assert_eq!(read(whole, decimals, divisor), None, "{whole}.{decimals}/{divisor}");
        }
        assert_eq!(read("1", "", "99999999999999999999"), None);
    }
}
