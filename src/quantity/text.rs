//! Quantities as text: `q("-285.830(20) kJ/mol")` in, value with its uncertainty out.
//!
//! In: brackets are a standard uncertainty in the last digits; `±` must say what it is (`k=2`, `95 %`, `limits`; see
//! [`Meaning`]), since a bare one means three different things; its half-width may have a unit of its own, and is a share of
//! the value where that unit is % or ppm. Out: two digits of u decide; without u, the decimals of the coarsest input.

use std::sync::Arc;

use thiserror::Error;

use crate::fault::{Explain, Place};
use crate::quantity::meaning::{Meaning, MeaningError};
use crate::quantity::{Quantity, round};
use crate::record::evaluation::Evaluation;
use crate::record::node::{Input, LeafKey};
use crate::record::spread::Spread;
use crate::units::{self, Kind, Unit, UnitError, What, parse as unit_parse};

/// Why a text is no quantity.
#[derive(Clone, Debug, Error)]
pub enum TextError {
    #[error("`{text}` does not begin with a number")]
    NoNumber { text: String },
    #[error("`{text}` has a comma in its number, which could be a decimal mark or group digits")]
    Comma { text: String },
    #[error("`{text}` says ± without saying what it is: a standard uncertainty, an expanded one, or limits")]
    BarePlusMinus { text: String },
    #[error(transparent)]
    Meaning(#[from] MeaningError),
    #[error("`{text}` could mean a share of the value or so many per cent more and less")]
    ShareOrPoints { text: String },
    #[error("the value in `{text}` is in {value}, and its half-width {half}")]
    HalfWidthUnit { text: String, value: String, half: String },
    #[error("`relative` is said of the uncertainty in `{text}`, and its half-width is no share in % or ppm")]
    NotAShare { text: String },
    #[error("a share of a temperature point, as in `{text}`, depends on where the scale {unit} begins")]
    ShareOfPoint { text: String, unit: String },
    #[error("a share of zero, as in `{text}`, is no uncertainty")]
    ShareOfZero { text: String },
    #[error("`{text}` has a space before its brackets, which could be an uncertainty or a factor")]
    Detached { text: String },
    #[error("the brackets in `{text}` are not an uncertainty in the last digits")]
    Brackets { text: String },
    #[error("`{text}` states its uncertainty twice, in brackets and with ±")]
    Twice { text: String },
    #[error("`{text}` is beyond the range of numbers")]
    Range { text: String },
    #[error("an uncertainty of {u} is negative")]
    Negative { u: f64 },
    #[error("{t_k:.2} K is below absolute zero")]
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
            TextError::Meaning(meaning) => meaning.code(),
            TextError::ShareOrPoints { .. } => "percent-after-plus-minus",
            TextError::HalfWidthUnit { .. } => "half-width-unit",
            TextError::NotAShare { .. } => "relative-without-share",
            TextError::ShareOfPoint { .. } => "relative-of-a-point",
            TextError::ShareOfZero { .. } => "relative-of-zero",
            TextError::Detached { .. } => "brackets-detached",
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
                let number = text.trim_start_matches('(').split([' ', '±']).next().unwrap_or("");
                format!(
                    "write `{number}(u)` for a standard uncertainty in the last digits, or say what ± is: \
                     `{number} ± U unit, k=2` or `{number} ± U unit, 95 %` (expanded), \
                     `{number} ± a unit, limits` (bounds, rectangular)"
                )
            }
            TextError::Meaning(meaning) => meaning.hint(),
            TextError::ShareOrPoints { .. } => {
                "for percentage points write brackets, `(85 ± 2) %, k=2`; for a share of the value say so, \
                 `85 % ± 2 %, relative, k=2`, or write the value's unit before ±, `12.5 nm ± 2 %, k=2`"
                    .to_owned()
            }
            TextError::HalfWidthUnit { value, .. } => {
                format!("write the half-width in {value} too, or as a share in %")
            }
            TextError::NotAShare { .. } => {
                "write the half-width in %, or leave `relative` out where it is in the unit of the value".to_owned()
            }
            TextError::ShareOfPoint { .. } => "state the half-width in kelvin, as in `25 degC ± 0.3 K, k=2`".to_owned(),
            TextError::ShareOfZero { .. } => "state the half-width in the unit of the value".to_owned(),
            TextError::Detached { .. } => "write the uncertainty right behind the digits: `-285.830(20)`".to_owned(),
            TextError::Brackets { .. } => {
                "`-285.830(20)` means a standard uncertainty of 0.020; a share of the value is written after ±, \
                 as in `12.5 nm ± 3 %, k=1`"
                    .to_owned()
            }
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

/// A text taken apart: the number, its standard uncertainty in the same unit, the unit.
struct Written {
    value: f64,
    digit: Option<f64>,
    u: Option<f64>,
    unit: Unit,
    evaluation: Evaluation,
}

/// Reads a quantity. `ordinal` tells evaluations of one place apart, as in a loop.
///
/// # Errors
/// See [`TextError`]; nothing is guessed.
pub fn parse(text: &str, place: Option<Place>, ordinal: u64) -> Result<Quantity, TextError> {
    let whole = text.trim();
    let (body, words) = split_words(whole);
    let meaning = words.map(Meaning::read).transpose()?;
    let halves = body.split_once('±').or_else(|| body.split_once("+/-"));
    let written = match halves {
        Some((value, half)) => with_plus_minus(value.trim(), half.trim(), meaning, whole)?,
        None => without_plus_minus(body, meaning, whole)?,
    };
    build(written, whole, place, ordinal)
}

/// The text before the comma that begins the words about the uncertainty, and those words. A comma in brackets belongs to
/// a name, and one between digits to a number.
fn split_words(text: &str) -> (&str, Option<&str>) {
    let mut depth = 0_i32;
    let mut before = ' ';
    for (at, c) in text.char_indices() {
        match c {
            '(' | '[' | '{' => depth += 1,
            ')' | ']' | '}' => depth -= 1,
            ',' if depth == 0 => {
                let after = text[at + 1..].chars().next();
                if !(before.is_ascii_digit() && after.is_some_and(|c| c.is_ascii_digit())) {
                    return (text[..at].trim(), Some(text[at + 1..].trim()));
                }
            }
            _ => {}
        }
        before = c;
    }
    (text, None)
}

fn unit_of(text: &str) -> Result<Unit, UnitError> {
    unit_parse::unit(if text.is_empty() { "1" } else { text })
}

fn without_plus_minus(body: &str, meaning: Option<Meaning>, whole: &str) -> Result<Written, TextError> {
    let first = number(body, whole)?;
    let unit = unit_of(first.rest.trim())?;
    let mut evaluation = Evaluation::UNSTATED;
    if let Some(meaning) = meaning {
        if first.u.is_none() {
            return Err(meaning.without_uncertainty(whole).into());
        }
        meaning.fits_brackets(whole)?;
        evaluation.dof = meaning.dof();
    }
    Ok(Written { value: first.value, digit: Some(first.digit), u: first.u, unit, evaluation })
}

fn with_plus_minus(value: &str, half: &str, meaning: Option<Meaning>, whole: &str) -> Result<Written, TextError> {
    let text = || whole.to_owned();
    let grouped = value.strip_prefix('(');
    let first = number(grouped.unwrap_or(value), whole)?;
    let half = number(half, whole)?;
    if first.u.is_some() || half.u.is_some() {
        return Err(TextError::Twice { text: text() });
    }
    let bare = || TextError::BarePlusMinus { text: text() };
    let meaning = meaning.ok_or_else(bare)?;
    let divisor = meaning.divisor().ok_or_else(bare)?;
    if half.value < 0.0 {
        return Err(TextError::Negative { u: half.value });
    }
    let (before, after) = (first.rest.trim(), half.rest.trim());
    let (unit, half_unit) = if grouped.is_some() {
        let after = after.strip_prefix(')').filter(|_| before.is_empty());
        let unit = unit_of(after.ok_or_else(|| TextError::Brackets { text: text() })?.trim())?;
        (unit.clone(), unit)
    } else if before.is_empty() {
        if after.starts_with('%') && !meaning.relative {
            return Err(TextError::ShareOrPoints { text: text() });
        }
        let half_unit = unit_of(after)?;
        (if meaning.relative { unit_of("")? } else { half_unit.clone() }, half_unit)
    } else {
        (unit_of(before)?, unit_of(after)?)
    };
    // A ratio such as % or ppm; radian and the bare number are of dimension 1 too, with factor 1.
    let is_ratio = |unit: &Unit| unit.dim.is_none() && unit.factor != 1.0;
    let share = is_ratio(&half_unit) && (meaning.relative || !unit.dim.is_none());
    if share {
        if unit.is_point() {
            return Err(TextError::ShareOfPoint { text: text(), unit: unit.text.to_string() });
        }
        if first.value == 0.0 {
            return Err(TextError::ShareOfZero { text: text() });
        }
    } else if meaning.relative {
        return Err(TextError::NotAShare { text: text() });
    } else if grouped.is_none() && !before.is_empty() {
        if is_ratio(&half_unit) {
            return Err(TextError::ShareOrPoints { text: text() });
        }
        if half_unit.dim != unit.dim || after.is_empty() {
            let half = if after.is_empty() { "is a bare number".to_owned() } else { format!("in {}", half_unit.text) };
            return Err(TextError::HalfWidthUnit { text: text(), value: unit.text.to_string(), half });
        }
    }
    let half_width = if share {
        first.value.abs() * half.value * half_unit.factor
    } else {
        half.value * half_unit.factor.abs() / unit.factor.abs()
    };
    let evaluation = Evaluation { shape: meaning.shape(), dof: meaning.dof(), correlation: None };
    Ok(Written { value: first.value, digit: Some(first.digit), u: Some(half_width / divisor), unit, evaluation })
}

/// A bare number in a unit, as in `450.0.K`: no uncertainty stated.
///
/// # Errors
/// The number is not finite, or a temperature below absolute zero.
pub fn from_number(value: f64, unit: Unit, place: Option<Place>, ordinal: u64) -> Result<Quantity, TextError> {
    let name = format!("{} {}", round::shortest(value), unit.text);
    let digit = number(&round::shortest(value), &name).ok().map(|read| read.digit);
    build(Written { value, digit, u: None, unit, evaluation: Evaluation::UNSTATED }, &name, place, ordinal)
}

fn build(written: Written, name: &str, place: Option<Place>, ordinal: u64) -> Result<Quantity, TextError> {
    let Written { value, digit, u, unit, evaluation } = written;
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
        evaluated: evaluation.kept(),
        label: Some(name.into()),
        unit: Some(Arc::clone(&unit)),
        ..Input::of(LeafKey::Typed { place: place.clone(), ordinal })
    };
    let made = Quantity::input(si, unit.dim.clone(), kind, input, place);
    let made = made.map_err(|_| TextError::Range { text: name.to_owned() })?;
    Ok(made.in_unit(Some(unit)))
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
    let detached =
        rest.trim_start().strip_prefix('(').is_some_and(|after| after.starts_with(|c: char| c.is_ascii_digit()));
    if rest.starts_with(' ') && detached {
        return Err(TextError::Detached { text: whole.to_owned() });
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
        let vanished = value == 0.0 && mantissa.contains(|c: char| ('1'..='9').contains(&c));
        if value.is_finite() && !vanished { Ok(value) } else { Err(TextError::Range { text: whole.to_owned() }) }
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
                    // A coarse input is no reason to turn 3.6 MJ into 4: where its decimals would round, at least four digits.
                    let written = round::decimals_of_digit(digit / scale);
                    let is_exact = round::fixed(value, written).parse() == Ok(value);
                    let decimals = if is_exact { written } else { written.max(round::decimals_for_digits(value, 4)) };
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
    // A chosen condition is no measurement, and limits no digits.
    let worth = value.sensitivities().into_iter().filter(|s| !s.chosen).filter_map(|s| {
        let digit = s.input().and_then(|input| input.digit)?;
        Some((s.derivative * digit).abs())
    });
    worth.fold(None, |coarsest: Option<f64>, digit| Some(coarsest.map_or(digit, |c| c.max(digit))))
}

/// Number and unit alone, in machine text: `0.5 kJ/mol[rxn]`.
pub fn shown_plain(value: &Quantity) -> String {
    let shown = value.shown();
    if value.dim().is_none() && &*shown.unit.text == "1" {
        shown.number
    } else {
        format!("{} {}", shown.number, shown.unit.text)
    }
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
    use crate::record::evaluation::Shape;

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
        assert_eq!(read("77 degF").0, 298.15); // to the last bit, or it would not be the reference temperature
        assert_eq!(read("6.02(1)e23"), (6.02e23, Some(1e21)));
        assert_eq!(read("1.5 J"), (1.5, None));
        assert_eq!(read("5 eV").0, 5.0 * 1.602_176_634e-19); // SI Brochure, 9th ed.: e is exact
    }

    #[test]
    fn plus_minus_must_say_what_it_is() {
        assert_eq!(read("-285.830 ± 0.040 kJ/mol, k=2"), (-285_830.0, Some(20.0)));
        // JCGM 100:2008, table G.1: 95 % of a normal distribution lie within 1.960 standard deviations.
        assert!((read("(10.0 ± 1.960) J, 95 %").1.unwrap() - 1.0).abs() < 0.000_5 / 1.96);
        assert!((read("10 ± 3 J, limits").1.unwrap() - 3f64.sqrt()).abs() < 1e-15);
        assert_eq!(code("-285.830 ± 0.040 kJ/mol"), "bare-plus-minus");
        assert_eq!(code("1 ± 0.1 J, maybe"), "plus-minus-unknown");
        assert_eq!(code("1.0(1) ± 0.1 J, k=2"), "uncertainty-twice");
    }

    #[test]
    fn a_half_width_may_have_a_unit_of_its_own_or_be_a_share() {
        let close = |text: &str, value: f64, u: f64| {
            let (found, found_u) = read(text);
            let found_u = found_u.unwrap();
            assert!(
                (found - value).abs() < 1e-12 * value.abs() && (found_u / u - 1.0).abs() < 1e-12,
                "{text}: {found_u}"
            );
        };
        close("9.7 nm ± 500 pm, k=2", 9.7e-9, 0.25e-9);
        close("25 degC ± 0.5 K, k=2", 298.15, 0.25);
        close("12.5 nm ± 0.5 %, k=2", 12.5e-9, 12.5e-9 * 0.0025);
        close("-4.184 J/(g K) ± 300 ppm, limits", -4184.0, 4184.0 * 300e-6 / 3f64.sqrt());
        close("(85 ± 2) %, k=2", 0.85, 0.01);
        close("85 % ± 2 %, relative, k=2", 0.85, 0.0085);
        close("0.85 ± 2 %, relative, k=2", 0.85, 0.0085);
        close("1.0456 rad ± 0.0004 rad, k=2", 1.0456, 0.0002);
        assert_eq!(code("85 % ± 2 %, k=2"), "percent-after-plus-minus");
        assert_eq!(code("0.85 ± 2 %, k=2"), "percent-after-plus-minus");
        assert_eq!(code("12.5 ± 0.5 % nm, k=2"), "percent-after-plus-minus");
        assert_eq!(code("12.5 nm ± 0.5, k=2"), "half-width-unit");
        assert_eq!(code("12.5 nm ± 0.5 K, k=2"), "half-width-unit");
        assert_eq!(code("12.5 ± 0.5 nm, k=2, relative"), "relative-without-share");
        assert_eq!(code("25 degC ± 1 %, k=2"), "relative-of-a-point");
        assert_eq!(code("0 nm ± 1 %, k=2"), "relative-of-zero");
        assert_eq!(code("12.5(3 %) nm"), "brackets-unreadable");
    }

    #[test]
    fn degrees_of_freedom_go_with_both_forms_and_the_other_words_with_plus_minus_only() {
        let evaluation = |text: &str| parse(text, None, 0).unwrap().node().input().unwrap().evaluation().clone();
        assert_eq!(evaluation("25.0(3) nm, dof=18").dof, Some(18.0));
        assert_eq!(evaluation("25.0 ± 0.6 nm, 95 %, dof=18").dof, Some(18.0));
        assert_eq!(evaluation("25.0 ± 0.6 nm, limits, triangular").shape, Shape::Triangular);
        assert_eq!(evaluation("25.0 ± 0.6 nm, k=2").dof, None);
        assert_eq!(code("25.0(3) nm, k=2"), "brackets-with-meaning");
        assert_eq!(code("25.0 nm, dof=18"), "meaning-without-uncertainty");
        assert_eq!(code("25.0 ± 0.3 nm, dof=18"), "bare-plus-minus");
        // Commas of a name belong to the unit.
        assert_eq!(read("1.5(1) kJ/mol[SiO2(cr,alpha-quartz)]").1, Some(100.0));
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
