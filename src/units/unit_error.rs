//! What can be wrong with the text of a unit, and the way out of each.
//!
//! Main type: [`UnitError`]. One variant is one cause and has one code; only the refused symbols bring theirs along.

use std::fmt;

use crate::fault::Explain;
use crate::units::parse::{MAX_BYTES, MAX_DEPTH, unit};
use crate::units::refused::Refused;
use crate::units::table::Prefix;

/// Why a text is not a unit.
#[derive(Clone, Debug)]
pub enum UnitError {
    Empty,
    TooLong {
        bytes: usize,
    },
    TooDeep,
    /// No such unit; `near` are spellings that exist, best first.
    Unknown {
        symbol: String,
        near: Vec<String>,
    },
    /// `kJ/mol CH4`: a substance where a unit should stand, after a unit that can say what it is of.
    SubstanceOutsideBrackets {
        substance: String,
        holder: String,
    },
    /// `cm3`: could be a power, and could be a formula.
    ExponentWithoutCaret {
        written: String,
        meant: String,
    },
    Refused {
        entry: &'static Refused,
        written: String,
        prefix: Option<&'static Prefix>,
        /// The text before and after the symbol.
        before: String,
        after: String,
    },
    /// `J/mol K`, with both ways to read it.
    SlashThenProduct {
        text: String,
        below: String,
        above: String,
    },
    /// degC or degF in a numerator, or to a power.
    PointInProduct {
        symbol: &'static str,
        interval: &'static str,
        text: String,
        instead: String,
    },
    EntityOnOtherUnit {
        symbol: String,
        entity: String,
    },
    EntityWithoutUnit {
        entity: String,
    },
    EmptyEntity {
        symbol: String,
    },
    UnmatchedBracket {
        bracket: char,
    },
    MissingFactor {
        beside: char,
    },
    NumberInUnit {
        number: String,
    },
    UnreadableExponent {
        symbol: String,
    },
    ExponentNotHalf {
        symbol: String,
        exponent: String,
    },
    ZeroExponent {
        symbol: String,
    },
    ExponentTooLarge {
        symbol: String,
    },
    SizeOutOfRange {
        text: String,
    },
    StrangeCharacter {
        character: char,
    },
}

impl fmt::Display for UnitError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            UnitError::Empty => write!(f, "there is no unit in an empty text"),
            UnitError::TooLong { bytes } => {
                write!(f, "a unit's text may have {MAX_BYTES} bytes, and this one has {bytes}")
            }
            UnitError::TooDeep => write!(f, "brackets in a unit may be nested {MAX_DEPTH} deep, and these go deeper"),
            UnitError::Unknown { symbol, .. } => write!(f, "there is no unit {}", quoted(symbol)),
            UnitError::SubstanceOutsideBrackets { substance, holder } => {
                write!(f, "{} is not a unit, and {} is not told what it is of", quoted(substance), quoted(holder))
            }
            UnitError::ExponentWithoutCaret { written, .. } => {
                write!(f, "{} may be a power of a unit or a formula", quoted(written))
            }
            UnitError::Refused { entry, written, prefix, .. } => refusal(f, entry, written, *prefix),
            UnitError::SlashThenProduct { text, below, above } => {
                write!(f, "{} can be read as `{below}` or as `{above}`", quoted(text))
            }
            UnitError::PointInProduct { symbol, text, .. } => write!(
                f,
                "{symbol} names a point on a temperature scale and cannot be a factor above the line, as in {}",
                quoted(text)
            ),
            UnitError::EntityOnOtherUnit { symbol, entity } => {
                write!(f, "{} does not count moles or mass, so it cannot be of {}", quoted(symbol), quoted(entity))
            }
            UnitError::EntityWithoutUnit { entity } => {
                write!(f, "{} in brackets has no unit before it to be what that unit is of", quoted(entity))
            }
            UnitError::EmptyEntity { symbol } => write!(f, "the brackets after {} name nothing", quoted(symbol)),
            UnitError::UnmatchedBracket { bracket } => write!(f, "a {} has no partner", quoted(&bracket.to_string())),
            UnitError::MissingFactor { beside } => {
                write!(f, "a unit is missing beside {}", quoted(&beside.to_string()))
            }
            UnitError::NumberInUnit { number } => write!(f, "the number {} stands in a unit", quoted(number)),
            UnitError::UnreadableExponent { symbol } => write!(f, "the power of {} cannot be read", quoted(symbol)),
            UnitError::ExponentNotHalf { symbol, exponent } => write!(
                f,
                "{} to the power {} is refused, since powers are whole numbers or halves",
                quoted(symbol),
                quoted(exponent)
            ),
            UnitError::ZeroExponent { symbol } => {
                write!(f, "{} to the power 0 is 1 and no unit", quoted(symbol))
            }
            UnitError::ExponentTooLarge { symbol } => {
                write!(f, "the power of {} is past 63, the largest that a dimension holds", quoted(symbol))
            }
            UnitError::SizeOutOfRange { text } => {
                write!(f, "one {} in SI units is a number too large or too small to hold", quoted(text))
            }
            UnitError::StrangeCharacter { character } => {
                write!(f, "{} has no meaning at its place in a unit", quoted(&character.to_string()))
            }
        }
    }
}

impl std::error::Error for UnitError {}

impl Explain for UnitError {
    fn code(&self) -> &'static str {
        match self {
            UnitError::Empty => "empty-unit",
            UnitError::TooLong { .. } => "unit-too-long",
            UnitError::TooDeep => "unit-too-deep",
            UnitError::Unknown { .. } => "unknown-unit",
            UnitError::SubstanceOutsideBrackets { .. } => "substance-outside-brackets",
            UnitError::ExponentWithoutCaret { .. } => "exponent-without-caret",
            UnitError::Refused { entry, .. } => entry.code,
            UnitError::SlashThenProduct { .. } => "slash-then-product",
            UnitError::PointInProduct { symbol: "degF", .. } => "fahrenheit-in-product",
            UnitError::PointInProduct { .. } => "celsius-in-product",
            UnitError::EntityOnOtherUnit { .. } => "entity-on-other-unit",
            UnitError::EntityWithoutUnit { .. } => "entity-without-unit",
            UnitError::EmptyEntity { .. } => "empty-entity",
            UnitError::UnmatchedBracket { .. } => "unmatched-bracket",
            UnitError::MissingFactor { .. } => "missing-factor",
            UnitError::NumberInUnit { .. } => "number-in-unit",
            UnitError::UnreadableExponent { .. } => "unreadable-exponent",
            UnitError::ExponentNotHalf { .. } => "exponent-not-half",
            UnitError::ZeroExponent { .. } => "zero-exponent",
            UnitError::ExponentTooLarge { .. } => "exponent-too-large",
            UnitError::SizeOutOfRange { .. } => "unit-size-out-of-range",
            UnitError::StrangeCharacter { .. } => "strange-character-in-unit",
        }
    }

    fn hint(&self) -> String {
        match self {
            UnitError::Empty => "write the unit, or 1 for a pure number".to_owned(),
            UnitError::TooLong { .. } => "multiply units in smaller pieces".to_owned(),
            UnitError::TooDeep => "write the unit as one fraction, as in J/(K mol)".to_owned(),
            UnitError::Unknown { near, .. } if near.is_empty() => {
                "units are written as in print: kJ/mol, J/(K mol), bar, cm^-1".to_owned()
            }
            UnitError::Unknown { near, .. } => format!("did you mean {}?", listed(near)),
            UnitError::SubstanceOutsideBrackets { substance, holder } => {
                format!("put what it is of in brackets: {holder}[{}]", shortened(substance))
            }
            UnitError::ExponentWithoutCaret { meant, .. } => {
                format!("write {meant}, or put a substance in brackets after mol, as in mol[H2]")
            }
            UnitError::Refused { entry, prefix, before, after, .. } => {
                let readings = in_context(entry, *prefix, before, after);
                match (readings.is_empty(), entry.way_out) {
                    (true, way_out) => way_out.to_owned(),
                    (false, "") => format!("write {}", listed(&readings)),
                    (false, way_out) => format!("write {}, {way_out}", listed(&readings)),
                }
            }
            UnitError::SlashThenProduct { below, above, .. } => format!("write {below} or {above}"),
            UnitError::PointInProduct { interval, instead, .. } => {
                format!("for a temperature difference write {interval}, as in {}", shortened(instead))
            }
            UnitError::EntityOnOtherUnit { entity, .. } => {
                let entity = shortened(entity);
                format!("brackets belong to units of amount or mass, as in mol[{entity}] or kg[{entity}]")
            }
            UnitError::EntityWithoutUnit { entity } => format!("write mol[{0}] or kg[{0}]", shortened(entity)),
            UnitError::EmptyEntity { symbol } => {
                format!("name the substance or stream, as in {symbol}[CH4], or leave the brackets out")
            }
            UnitError::UnmatchedBracket { .. } => "close every bracket that is opened, in order".to_owned(),
            UnitError::MissingFactor { .. } => "write a unit on both sides, or 1 above the line, as in 1/K".to_owned(),
            UnitError::NumberInUnit { .. } => {
                "put numbers into the value and powers after ^; only 1 may stand above a fraction line, as in 1/K"
                    .to_owned()
            }
            UnitError::UnreadableExponent { symbol } => {
                let symbol = shortened(symbol);
                format!("write {symbol}^2, {symbol}^-1, {symbol}^(1/2) or {symbol}²")
            }
            UnitError::ExponentNotHalf { .. } => {
                "write a whole number or a half, as in ^2, ^-1, ^(1/2) or ^0.5".to_owned()
            }
            UnitError::ZeroExponent { .. } => "leave that factor out".to_owned(),
            UnitError::ExponentTooLarge { .. } => "check the power; the trade's units need no more than 4".to_owned(),
            UnitError::SizeOutOfRange { .. } => "use other prefixes or smaller powers".to_owned(),
            UnitError::StrangeCharacter { .. } => {
                "units are joined by a space, · or *, divided by /, and raised by ^, as in J/(K mol) or m^2".to_owned()
            }
        }
    }
}

fn refusal(f: &mut fmt::Formatter<'_>, entry: &Refused, written: &str, prefix: Option<&'static Prefix>) -> fmt::Result {
    write!(f, "{} {}", quoted(written), entry.why)?;
    let measure = entry.measured_in.and_then(|symbol| unit(symbol).ok());
    let sizes = entry.readings.iter().filter_map(|reading| {
        let measure = measure.as_ref()?;
        let one = unit(&prefixed(prefix, reading)).ok().filter(|one| one.dim == measure.dim)?;
        Some(format!("{} is {} {}", one.text, figure(one.factor / measure.factor), measure.text))
    });
    let sizes: Vec<String> = sizes.collect();
    if sizes.is_empty() { Ok(()) } else { write!(f, ": {}", sizes.join(", ")) }
}

/// The readings put where the symbol stood, or alone where the whole text would be too long to show.
fn in_context(entry: &Refused, prefix: Option<&'static Prefix>, before: &str, after: &str) -> Vec<String> {
    let alone = before.trim().is_empty() && after.trim().is_empty();
    let place = |reading: &&str| {
        let reading = prefixed(prefix, reading);
        if alone || before.len() + after.len() > SHOWN {
            return reading;
        }
        let compound = reading.contains(['/', ' ']);
        if compound { format!("{before}({reading}){after}") } else { format!("{before}{reading}{after}") }
    };
    entry.readings.iter().map(place).map(|text| text.trim().to_owned()).collect()
}

fn prefixed(prefix: Option<&'static Prefix>, reading: &str) -> String {
    format!("{}{reading}", prefix.map_or("", |prefix| prefix.symbol))
}

/// Thirteen significant digits, so that a ratio of floats reads as the decimal it stands for.
fn figure(number: f64) -> String {
    format!("{number:.12e}").parse::<f64>().unwrap_or(number).to_string()
}

fn listed(items: &[String]) -> String {
    match items {
        [] => String::new(),
        [one] => one.clone(),
        [most @ .., last] => format!("{} or {last}", most.join(", ")),
    }
}

/// Longest piece of the user's text that a message repeats, in characters.
const SHOWN: usize = 60;

fn shortened(text: &str) -> String {
    let plain: String = text.chars().map(|c| if c.is_control() { '\u{FFFD}' } else { c }).take(SHOWN).collect();
    if text.chars().count() > SHOWN { format!("{plain}…") } else { plain }
}

fn quoted(text: &str) -> String {
    format!("`{}`", shortened(text))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::fault::Fault;
    use crate::units::refused::REFUSED;
    use crate::units::table::spelled;

    fn fault(text: &str) -> (String, String) {
        let fault = Fault::from(unit(text).unwrap_err());
        (fault.message().to_owned(), fault.hint().to_owned())
    }

    #[test]
    fn a_bare_calorie_is_spelled_out_where_it_stands() {
        let (message, hint) = fault("kcal/mol");
        assert_eq!(
            message,
            "`kcal` does not say which calorie: kcal_th is 4184 J, kcal_IT is 4186.8 J, kcal_15 is 4185.8 J, \
             kcal_20 is 4181.9 J, kcal_mean is 4190.02 J"
        );
        assert_eq!(hint, "write kcal_th/mol, kcal_IT/mol, kcal_15/mol, kcal_20/mol or kcal_mean/mol");
    }

    #[test]
    fn a_compound_reading_is_put_in_brackets() {
        let (_, hint) = fault("J/mM");
        assert!(hint.starts_with("write J/(mmol/L) or J/(mmol/kg), "), "{hint}");
    }

    #[test]
    fn messages_repeat_only_so_much_of_a_text() {
        let long = "x".repeat(300);
        let (message, _) = fault(&long);
        assert!(message.chars().count() < 100, "{message}");
    }

    #[test]
    fn every_refused_symbol_offers_readings_that_are_units_where_it_stood() {
        let mut codes = std::collections::BTreeSet::new();
        for entry in REFUSED {
            assert!(codes.insert(entry.code), "{} twice", entry.code);
            assert!(!entry.readings.is_empty() || !entry.way_out.is_empty(), "{}", entry.code);
            for (symbol, _) in spelled(entry.symbols, entry.prefixes) {
                for text in [symbol.clone(), format!("{symbol}/g"), format!("J/{symbol}"), format!("J/(s {symbol})")] {
                    let error = unit(&text).unwrap_err();
                    let UnitError::Refused { prefix, before, after, .. } = &error else { panic!("{text}: {error}") };
                    assert_eq!(error.code(), entry.code, "{text}");
                    for reading in in_context(entry, *prefix, before, after) {
                        let read = unit(&reading).map_err(|error| error.code());
                        let degree = matches!(read, Err("celsius-in-product" | "fahrenheit-in-product"));
                        assert!(read.is_ok() || degree, "{text}: {reading}: {read:?}");
                    }
                }
            }
        }
    }
}
