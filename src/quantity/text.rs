//! Quantities as text: `q("-285.830(20) kJ/mol")` in, value with its uncertainty out.
//!
//! In: brackets are a standard uncertainty in the last digits; `±` must say what it is (`k=2`, `95 %`, `limits`), since
//! a bare one means three different things. Out: two digits of u decide; without u, the decimals of the coarsest input.

use std::sync::Arc;

use thiserror::Error;

use crate::fault::{Explain, Place};
use crate::quantity::{Quantity, round};
use crate::record::node::{Input, LeafKey};
use crate::record::spread::Spread;
use crate::units::{self, Kind, Unit, UnitError, What, parse as unit_parse};

/// Factor between a 95 % interval and a standard uncertainty for a normal distribution (JCGM 100:2008, table G.1).
const K_95: f64 = 1.96;

/// Why a text is no quantity.
#[derive(Clone, Debug, Error)]
pub enum TextError {
    #[error("`{text}` does not begin with a number")]
    NoNumber { text: String },
    #[error("`{text}` has a comma in its number, which could be a decimal mark or group digits")]
    Comma { text: String },
    #[error("`{text}` says ± without saying what it is: a standard uncertainty, an expanded one, or limits")]
    BarePlusMinus { text: String },
    #[error("`{what}` is not a meaning of ±")]
    Meaning { what: String },
    #[error("the brackets in `{text}` are not an uncertainty in the last digits")]
    Brackets { text: String },
    #[error("`{text}` states its uncertainty twice, in brackets and with ±")]
    Twice { text: String },
    #[error("`{text}` is beyond the range of numbers")]
    Range { text: String },
    #[error("an uncertainty of {u} is negative")]
    Negative { u: f64 },
    #[error("{t_k} K is below absolute zero")]
    BelowZero { t_k: f64 },
    #[error(transparent)]
    Unit(#[from] UnitError),
}

impl Explain for TextError {
    fn code(&self) -> &'static str {
        match self {
            TextError::NoNumber { .. } => "number-missing",
            TextError::Comma { .. } => "comma-in-number",
            TextError::BarePlusMinus { .. } => "bare-plus-minus",
            TextError::Meaning { .. } => "plus-minus-unknown",
            TextError::Brackets { .. } => "brackets-unreadable",
            TextError::Twice { .. } => "uncertainty-twice",
            TextError::Range { .. } => "quantity-out-of-range",
            TextError::Negative { .. } => "uncertainty-negative",
            TextError::BelowZero { .. } => "below-absolute-zero",
            TextError::Unit(unit) => unit.code(),
        }
    }

    fn hint(&self) -> String {
        match self {
            TextError::NoNumber { .. } => {
                "write a number and a unit, as in `q(\"-285.830(20) kJ/mol[H2O]\")`".to_owned()
            }
            TextError::Comma { .. } => "write the decimal mark as a point and group no digits: `1234.5`".to_owned(),
            TextError::BarePlusMinus { text } => {
                let number = text.split('±').next().unwrap_or("").trim().trim_start_matches('(');
                format!(
                    "write `{number}(u)` for a standard uncertainty in the last digits, or say what ± is: \
                     `{number} ± U unit, k=2` (expanded), `{number} ± U unit, 95 %` (expanded, normal), \
                     `{number} ± a unit, limits` (bounds, rectangular)"
                )
            }
            TextError::Meaning { .. } => "after the comma stands `k=2`, `95 %` or `limits`".to_owned(),
            TextError::Brackets { .. } => "`-285.830(20)` means a standard uncertainty of 0.020".to_owned(),
            TextError::Twice { .. } => "keep one of the two".to_owned(),
            TextError::Range { .. } => "check the exponent".to_owned(),
            TextError::Negative { .. } => "give its size, without a sign".to_owned(),
            TextError::BelowZero { .. } => "check the sign and the scale of the temperature".to_owned(),
            TextError::Unit(unit) => unit.hint(),
        }
    }
}

struct Number<'a> {
    value: f64,
    /// Value of one unit in the last digit written.
    digit: f64,
    u: Option<f64>,
    rest: &'a str,
}

/// Reads a quantity. `ordinal` tells evaluations of one place apart, as in a loop.
///
/// # Errors
/// See [`TextError`]; nothing is guessed.
pub fn parse(text: &str, place: Option<Place>, ordinal: u64) -> Result<Quantity, TextError> {
    let whole = text.trim();
    let (body, meaning) = match whole.split_once(',') {
        Some((body, meaning)) if whole.contains('±') || whole.contains("+/-") => (body.trim(), Some(meaning.trim())),
        _ => (whole, None),
    };
    let grouped = body.starts_with('(');
    let inner = if grouped { &body[1..] } else { body };
    let first = number(inner, whole)?;
    let after = first.rest.trim_start();
    let plus_minus = after.strip_prefix('±').or_else(|| after.strip_prefix("+/-"));
    let (u, rest) = match plus_minus {
        None if grouped => return Err(TextError::NoNumber { text: whole.to_owned() }),
        None => (first.u, first.rest),
        Some(_) if first.u.is_some() => return Err(TextError::Twice { text: whole.to_owned() }),
        Some(after) => {
            let half = number(after.trim_start(), whole)?;
            let Some(meaning) = meaning else { return Err(TextError::BarePlusMinus { text: whole.to_owned() }) };
            if half.value < 0.0 {
                return Err(TextError::Negative { u: half.value });
            }
            let rest = if grouped { half.rest.trim_start().strip_prefix(')') } else { Some(half.rest) };
            let rest = rest.ok_or_else(|| TextError::Brackets { text: whole.to_owned() })?;
            (Some(half.value / divisor(meaning)?), rest)
        }
    };
    let unit = unit_parse::unit(if rest.trim().is_empty() { "1" } else { rest.trim() })?;
    build(first.value, u, Some(first.digit), unit, whole, place, ordinal)
}

/// A bare number in a unit, as in `450.0.K`: no uncertainty stated.
///
/// # Errors
/// The number is not finite, or a temperature below absolute zero.
pub fn from_number(value: f64, unit: Unit, place: Option<Place>, ordinal: u64) -> Result<Quantity, TextError> {
    let name = format!("{} {}", round::shortest(value), unit.text);
    let digit = round::shortest(value).split_once('.').map(|(_, d)| round::power_of_ten(-(d.len() as i32)));
    build(value, None, digit.or(Some(1.0)), unit, &name, place, ordinal)
}

fn build(
    value: f64,
    u: Option<f64>,
    digit: Option<f64>,
    unit: Unit,
    name: &str,
    place: Option<Place>,
    ordinal: u64,
) -> Result<Quantity, TextError> {
    let si = unit.to_si(value);
    if !si.is_finite() {
        return Err(TextError::Range { text: name.to_owned() });
    }
    let kind = if unit.is_point() { Kind::of(What::TemperaturePoint) } else { Kind::bare(&unit.dim) };
    if kind.what == What::TemperaturePoint && si < 0.0 {
        return Err(TextError::BelowZero { t_k: si });
    }
    let scale = unit.factor.abs();
    let unit = Arc::new(unit);
    let input = Input {
        u: u.map(|u| u * scale),
        digit: digit.map(|digit| digit * scale),
        label: Some(name.into()),
        unit: Some(Arc::clone(&unit)),
        ..Input::of(LeafKey::Typed { place: place.clone(), ordinal })
    };
    let made = Quantity::input(si, unit.dim.clone(), kind, input, place);
    let made = made.map_err(|_| TextError::Range { text: name.to_owned() })?;
    Ok(made.in_unit(Some(unit)))
}

fn divisor(meaning: &str) -> Result<f64, TextError> {
    let compact: String = meaning.chars().filter(|c| !c.is_whitespace()).collect();
    let unknown = || TextError::Meaning { what: meaning.to_owned() };
    match compact.as_str() {
        "95%" => Ok(K_95),
        "limits" => Ok(3f64.sqrt()),
        other => {
            let k: f64 = other.strip_prefix("k=").ok_or_else(unknown)?.parse().map_err(|_| unknown())?;
            if k > 0.0 && k.is_finite() { Ok(k) } else { Err(unknown()) }
        }
    }
}

/// A number at the start of `text`, with brackets and exponent where it has them.
fn number<'a>(text: &'a str, whole: &str) -> Result<Number<'a>, TextError> {
    let missing = || TextError::NoNumber { text: whole.to_owned() };
    let (negative, unsigned) = match text.chars().next() {
        Some('-' | '−') => (true, &text[text.chars().next().map_or(0, char::len_utf8)..]),
        Some('+') => (false, &text[1..]),
        _ => (false, text),
    };
    let digits_end = unsigned.find(|c: char| !c.is_ascii_digit() && c != '.').unwrap_or(unsigned.len());
    let (mantissa, mut rest) = unsigned.split_at(digits_end);
    let decimals = match mantissa.split_once('.') {
        Some((whole_part, decimals)) if !whole_part.is_empty() && !decimals.is_empty() && !decimals.contains('.') => {
            decimals.len()
        }
        None if !mantissa.is_empty() => 0,
        _ => return Err(missing()),
    };
    if rest.starts_with(',') && rest[1..].starts_with(|c: char| c.is_ascii_digit()) {
        return Err(TextError::Comma { text: whole.to_owned() });
    }
    let mut brackets = None;
    if let Some(after) = rest.strip_prefix('(') {
        let unreadable = || TextError::Brackets { text: whole.to_owned() };
        let (inside, after) = after.split_once(')').ok_or_else(unreadable)?;
        if inside.is_empty() || !inside.chars().all(|c| c.is_ascii_digit() || c == '.') {
            return Err(unreadable());
        }
        brackets = Some(inside);
        rest = after;
    }
    let (exponent, rest) = exponent(rest);
    let read = |mantissa: &str, shift: i32| -> Result<f64, TextError> {
        let value: f64 = format!("{mantissa}e{}", exponent.saturating_add(shift)).parse().map_err(|_| missing())?;
        if value.is_finite() { Ok(value) } else { Err(TextError::Range { text: whole.to_owned() }) }
    };
    let magnitude = read(mantissa, 0)?;
    let u = match brackets {
        None => None,
        Some(inside) if inside.contains('.') => Some(read(inside, 0)?),
        Some(inside) => Some(read(inside, -(decimals as i32))?),
    };
    let value = if negative { -magnitude } else { magnitude };
    Ok(Number { value, digit: read("1", -(decimals as i32))?, u, rest })
}

/// `e-3`, `E+5`, `×10^-3`, `x10^5` or `*10^5` at the start; the exponent and what follows.
fn exponent(text: &str) -> (i32, &str) {
    let trimmed = text.trim_start();
    let after = ["×10^", "x10^", "*10^", "× 10^", "x 10^"].iter().find_map(|mark| trimmed.strip_prefix(mark));
    let after = after.or_else(|| text.strip_prefix(['e', 'E']));
    let Some(after) = after else { return (0, text) };
    let after = after.strip_prefix('{').unwrap_or(after);
    let end = after
        .char_indices()
        .find(|&(i, c)| !(c.is_ascii_digit() || i == 0 && (c == '-' || c == '+')))
        .map_or(after.len(), |(i, _)| i);
    match after[..end].parse() {
        Ok(exponent) => (exponent, after[end..].strip_prefix('}').unwrap_or(&after[end..])),
        Err(_) => (0, text), // `e` may begin a unit, as in `5 eV`.
    }
}

/// What a reader is shown of a value, in parts, so that text, HTML and LaTeX say the same.
#[derive(Clone, Debug, PartialEq)]
pub struct Shown {
    /// The number, rounded, with its uncertainty in brackets where one is known.
    pub number: String,
    pub unit: Arc<Unit>,
    /// `per mole of CH4`; nothing for totals.
    pub basis: Option<String>,
    /// `partial` or `u not stated`; nothing where u is complete.
    pub caveat: Option<Caveat>,
    /// Half a unit of the last digit shown, in SI units: part of what decides whether a price matters.
    pub half_digit_si: f64,
}

/// How much of the uncertainty is known.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Caveat {
    Partial,
    NotStated,
}

impl Quantity {
    /// The value as a reader is to see it.
    pub fn shown(&self) -> Shown {
        let unit = self.unit();
        let value = unit.from_si(self.si());
        let scale = unit.factor.abs();
        let spread = self.spread();
        let (number, half_digit_si) = match spread.u().map(|u| u / scale) {
            Some(u) if u > 0.0 => {
                (round::with_brackets(value, u), 0.5 * round::power_of_ten(-round::decimals_for(u)) * scale)
            }
            _ => match coarsest_digit(self) {
                Some(digit) => {
                    let decimals = round::decimals_of_digit(digit / scale);
                    (round::fixed(value, decimals), 0.5 * round::power_of_ten(-decimals) * scale)
                }
                None => (exact(value), 0.0),
            },
        };
        let caveat = match spread {
            Spread::Full(_) => None,
            Spread::Partial { .. } => Some(Caveat::Partial),
            Spread::NotStated { .. } => Some(Caveat::NotStated),
        };
        Shown { number, basis: units::basis_words(&unit.dim), unit, caveat, half_digit_si }
    }
}

/// A value that is exact as far as anyone said: all its digits where they are few, else six.
fn exact(value: f64) -> String {
    let all = round::shortest(value);
    let digits = all.split('e').next().unwrap_or("").chars().filter(char::is_ascii_digit).count();
    if digits <= 7 { all } else { round::significant(value, 6) }
}

/// The coarsest of what the last digits of the inputs are worth in the result, in SI units.
fn coarsest_digit(value: &Quantity) -> Option<f64> {
    let worth = value.sensitivities().into_iter().filter_map(|s| {
        let digit = s.input().and_then(|input| input.digit)?;
        Some((s.derivative * digit).abs())
    });
    worth.fold(None, |coarsest: Option<f64>, digit| Some(coarsest.map_or(digit, |c| c.max(digit))))
}

/// Number and unit alone, in machine text: `0.5 kJ/mol[rxn]`.
pub fn shown_plain(value: &Quantity) -> String {
    let shown = value.shown();
    format!("{} {}", shown.number, shown.unit.text)
}

/// The value in one line: number, unit, basis in words, and what is not known of its uncertainty.
pub fn shown(value: &Quantity) -> String {
    let shown = value.shown();
    let unit = units::reader_text(&shown.unit);
    let mut text = shown.number;
    if !unit.is_empty() {
        text = format!("{text} {unit}");
    }
    match shown.caveat {
        Some(Caveat::Partial) => text.push_str(", u partial"),
        Some(Caveat::NotStated) => text.push_str(", u not stated"),
        None => {}
    }
    match shown.basis {
        Some(basis) => format!("{text}, {basis}"),
        None => text,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn read(text: &str) -> (f64, Option<f64>) {
        let value = parse(text, None, 0).unwrap();
        (value.si(), value.node().input().unwrap().u)
    }

    fn code(text: &str) -> &'static str {
        parse(text, None, 0).unwrap_err().code()
    }

    #[test]
    fn brackets_are_a_standard_uncertainty_in_the_last_digits() {
        let (value, u) = read("-285.830(20) kJ/mol[H2O]");
        assert_eq!(value, -285_830.0);
        assert!((u.unwrap() - 20.0).abs() < 1e-12);
        assert_eq!(read("25.00(5) degC"), (298.15, Some(0.05)));
        assert_eq!(read("6.02(1)e23"), (6.02e23, Some(1e21)));
        assert_eq!(read("1.5 J"), (1.5, None));
        assert_eq!(read("5 eV").0, 5.0 * 1.602_176_634e-19); // SI Brochure, 9th ed.: e is exact
    }

    #[test]
    fn plus_minus_must_say_what_it_is() {
        assert_eq!(read("-285.830 ± 0.040 kJ/mol, k=2"), (-285_830.0, Some(20.0)));
        assert_eq!(read("(10.0 ± 1.96) J, 95 %").1, Some(1.0));
        assert!((read("10 ± 3 J, limits").1.unwrap() - 3f64.sqrt()).abs() < 1e-15);
        assert_eq!(code("-285.830 ± 0.040 kJ/mol"), "bare-plus-minus");
        assert_eq!(code("1 ± 0.1 J, maybe"), "plus-minus-unknown");
        assert_eq!(code("1.0(1) ± 0.1 J, k=2"), "uncertainty-twice");
    }

    #[test]
    fn nothing_is_guessed() {
        assert_eq!(code("kJ"), "number-missing");
        assert_eq!(code("1,5 J"), "comma-in-number");
        assert_eq!(code("-300 degC"), "below-absolute-zero");
        assert_eq!(code("1e999 J"), "quantity-out-of-range");
        assert_eq!(code("1.0(x) J"), "brackets-unreadable");
        assert_eq!(code("5 cal"), "bare-calorie");
    }

    #[test]
    fn two_digits_of_u_are_shown_and_its_absence_is_said() {
        assert_eq!(shown(&parse("-285.830(20) kJ/mol[H2O]", None, 0).unwrap()), "-285.830(20) kJ/mol, per mole of H2O");
        assert_eq!(shown(&parse("12.50 kJ", None, 0).unwrap()), "12.50 kJ, u not stated");
    }
}
