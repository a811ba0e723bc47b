//! Formulas of substances and ions, without phase: `Ca(OH)2`, `CdSO4.8/3H2O`, `SO4-2`, `NH4+`, `e-`.
//!
//! A [`Formula`] is a composition, a charge and the text in reference style, the style of the tables: sign before
//! number (`SO4-2`). `SO4^2-` and `SO₄²⁻` are read too. The surprise: what two people would read differently is
//! refused, with both readings spelled out. `Ca2+` is one: the tables' style makes it Ca2 with one charge.

use std::fmt;

use crate::chem::composition::Composition;
use crate::chem::formula_reader::Reader;
use crate::fault::Explain;

pub(super) const LONGEST: usize = 400;
pub(super) const DEEPEST: usize = 16;

/// A composition with its charge, and how it is written.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Formula {
    /// Everything before the charge, in plain characters.
    pub(super) body: String,
    pub(super) composition: Composition,
    pub(super) charge: i32,
    /// Whether a bare sign after the body could be read in two ways.
    pub(super) bare_sign_unclear: bool,
}

/// Why a text is no formula. Positions count characters from 1.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum FormulaError {
    #[error("there is no formula here: the text is empty")]
    Empty,
    #[error("a formula of {length} characters is longer than the {LONGEST} that are read")]
    TooLong { length: usize },
    #[error("in {text}, character {position}: expected {expected}, found {}", found_text(*.found))]
    Unexpected { text: String, position: usize, expected: &'static str, found: Option<char> },
    #[error("in {text}, character {position}: there is no element {symbol}{}", guess_text(.guess))]
    UnknownElement { text: String, position: usize, symbol: String, guess: Option<&'static str> },
    #[error("in {text}, character {position}: {open} is never closed")]
    Unclosed { text: String, position: usize, open: char },
    #[error("in {text}, character {position}: brackets nest more than {DEEPEST} deep")]
    TooDeep { text: String, position: usize },
    #[error("in {text}, character {position}: the count {count} is zero, or starts with one")]
    ZeroCount { text: String, position: usize, count: String },
    #[error("in {text}, character {position}: the number is too large to count atoms or charges with")]
    TooLarge { text: String, position: usize },
    #[error("{text} can be read as {} or as {}", .readings[0].0, .readings[1].0)]
    UnclearCharge { text: String, readings: Box<[(String, String); 2]> },
    #[error("{text} can be read as {} (an addition compound) or as {} (a fraction of an atom)", .readings[0], .readings[1])]
    UnclearPoint { text: String, readings: [String; 2] },
}

fn found_text(found: Option<char>) -> String {
    found.map_or_else(|| "the end".to_owned(), |found| format!("{found:?}").replace('\'', "`"))
}

fn guess_text(guess: &Option<&'static str>) -> String {
    guess.map_or_else(String::new, |guess| format!(" ({guess}?)"))
}

impl Explain for FormulaError {
    fn code(&self) -> &'static str {
        match self {
            FormulaError::Empty => "empty-formula",
            FormulaError::TooLong { .. } => "formula-too-long",
            FormulaError::Unexpected { .. } => "formula-unreadable",
            FormulaError::UnknownElement { .. } => "unknown-element",
            FormulaError::Unclosed { .. } => "formula-bracket-open",
            FormulaError::TooDeep { .. } => "formula-too-deep",
            FormulaError::ZeroCount { .. } => "zero-atom-count",
            FormulaError::TooLarge { .. } => "atom-count-too-large",
            FormulaError::UnclearCharge { .. } => "unclear-charge",
            FormulaError::UnclearPoint { .. } => "unclear-point",
        }
    }

    fn hint(&self) -> String {
        match self {
            FormulaError::Empty => "write a formula such as CO2, Ca(OH)2 or SO4-2".to_owned(),
            FormulaError::TooLong { .. } | FormulaError::TooDeep { .. } => {
                "write the sum of atoms instead, as in C8H18".to_owned()
            }
            FormulaError::Unexpected { .. } => {
                "formulas are written like Ca(OH)2, CuSO4.5H2O, SO4-2, NH4+; a substance with a name needs a record of \
                 that name"
                    .to_owned()
            }
            FormulaError::UnknownElement { guess: Some(guess), .. } => {
                format!("write {guess} if that element is meant")
            }
            FormulaError::UnknownElement { .. } => {
                "symbols are a capital letter, or a capital and a small one, as in Co; CO is carbon and oxygen"
                    .to_owned()
            }
            FormulaError::Unclosed { open, .. } => {
                format!("close it with {}, or leave it out", if *open == '[' { ']' } else { ')' })
            }
            FormulaError::ZeroCount { .. } => {
                "leave the element out if there is none of it, and write oxygen with the letter O".to_owned()
            }
            FormulaError::TooLarge { .. } => "write counts with fewer digits".to_owned(),
            FormulaError::UnclearCharge { readings, .. } => {
                format!("write {} for the first and {} for the second", readings[0].1, readings[1].1)
            }
            FormulaError::UnclearPoint { readings, .. } => {
                format!("write {} or {}; the middle dot and the fraction say which", readings[0], readings[1])
            }
        }
    }
}

impl Formula {
    /// Reads what a person typed; refuses `Ca2+`, `SO42-` and `N3-`, which people read in two ways.
    pub fn parse(text: &str) -> Result<Formula, FormulaError> {
        Reader::new(text)?.formula(true)
    }

    /// Reads a table's formula, where the style is known: digits before a bare sign count atoms, so that `N3-` is azide.
    pub fn parse_record(text: &str) -> Result<Formula, FormulaError> {
        Reader::new(text)?.formula(false)
    }

    pub fn composition(&self) -> &Composition {
        &self.composition
    }

    pub fn charge(&self) -> i32 {
        self.charge
    }

    /// The name that tables use: `SO4-2`, `NH4+`, `N3-`. Read it back with [`Formula::parse_record`].
    pub fn reference_name(&self) -> String {
        match self.charge {
            0 => self.body.clone(),
            charge => format!("{}{}", self.body, ChargeText(charge)),
        }
    }
}

/// The reference name, with a caret before the charge where people would read it in two ways. Parses back.
impl fmt::Display for Formula {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.bare_sign_unclear && self.charge.unsigned_abs() == 1 {
            write!(f, "{}^{}", self.body, ChargeText(self.charge))
        } else {
            f.write_str(&self.reference_name())
        }
    }
}

/// A charge behind a formula: `+`, `-`, `+2`, `-3`.
pub(super) struct ChargeText(pub i32);

impl fmt::Display for ChargeText {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self.0 {
            1 => f.write_str("+"),
            -1 => f.write_str("-"),
            charge => write!(f, "{charge:+}"),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn read(text: &str) -> (String, i32) {
        let formula = Formula::parse(text).unwrap_or_else(|error| panic!("{text}: {error}"));
        (formula.composition().to_string(), formula.charge())
    }

    fn refuse(text: &str) -> FormulaError {
        Formula::parse(text).expect_err(text)
    }

    #[test]
    fn formulas_as_tables_write_them() {
        let rows = [
            ("CO", "CO", 0),
            ("Co", "Co", 0),
            ("Ca(OH)2", "CaH2O2", 0),
            ("NH4NO3", "H4N2O3", 0),
            ("Fe(CO)5", "C5FeO5", 0),
            ("(NH4)2SO4", "H8N2O4S", 0),
            ("CaMg(CO3)2", "C2CaMgO6", 0),
            ("CuSO4.5H2O", "CuH10O9S", 0),
            ("CuSO4·5H2O", "CuH10O9S", 0),
            ("CdSO4.8/3H2O", "CdH16/3O20/3S", 0),
            ("CaSO4.0.5H2O", "CaHO9/2S", 0),
            ("MgO.Al2O3", "Al2MgO4", 0),
            ("KCl.MgCl2.6H2O", "Cl3H12KMgO6", 0),
            ("NaCl.2H2O", "ClH4NaO2", 0),
            ("Fe0.947O", "Fe947/1000O", 0),
            ("TiO1.95", "O39/20Ti", 0),
            ("CH9/5O1/2", "CH9/5O1/2", 0),
            ("HDO", "DHO", 0),
            ("[Cr(N2H4CO)6]4[Cr(CN)6]3", "C42H96Cr7N66O24", 0),
            ("H₂SO₄", "H2O4S", 0),
        ];
        for (text, composition, charge) in rows {
            assert_eq!(read(text), (composition.to_owned(), charge), "{text}");
        }
    }

    #[test]
    fn charges_with_the_sign_first_behind_a_caret_or_raised() {
        let rows = [
            ("SO4-2", -2),
            ("SO4^2-", -2),
            ("SO4^-2", -2),
            ("SO4--", -2),
            ("SO₄²⁻", -2),
            ("SO4−2", -2),
            ("Na+", 1),
            ("Na1+", 1),
            ("Ca+2", 2),
            ("Ca^2+", 2),
            ("Ca++", 2),
            ("Ca²⁺", 2),
            ("Hg2+2", 2),
            ("H+", 1),
            ("H2+", 1), // H with charge +2 does not exist
            ("OH-", -1),
            ("UO2+2", 2),
            ("NH4+", 1),
            ("H3O+", 1),
            ("N2H5+", 1),
            ("Al(OH)4-", -1),
            ("Fe(CN)6-3", -3),
            ("[Fe(CN)6]-4", -4),
            ("C6H11O7-", -1),
            ("C60-", -1),
            ("N3^-", -1),
            ("I3-", -1), // no monatomic I-3
            ("O3-", -1),
            ("Na2-", -1),
        ];
        for (text, charge) in rows {
            assert_eq!(read(text).1, charge, "{text}");
        }
        assert_eq!(read("Hg2+2").0, "Hg2");
        assert_eq!(read("SO4-2").0, "O4S");
        assert_eq!(read("e-"), (String::new(), -1));
        assert_eq!(read("e⁻"), (String::new(), -1));
    }

    #[test]
    fn what_reads_two_ways_is_refused_with_both_ways_to_write_it() {
        let rows = [
            ("Ca2+", "Ca2^+", "Ca+2"),
            ("Fe3+", "Fe3^+", "Fe+3"),
            ("N3-", "N3^-", "N-3"),
            ("O2-", "O2^-", "O-2"),
            ("SO42-", "SO42^-", "SO4-2"),
            ("Fe(CN)64-", "Fe(CN)64^-", "Fe(CN)6-4"),
            ("[Cu(NH3)4]2+", "[Cu(NH3)4]2^+", "[Cu(NH3)4]+2"),
        ];
        for (text, first, second) in rows {
            let error = refuse(text);
            assert_eq!(error.code(), "unclear-charge", "{text}");
            assert_eq!(error.hint(), format!("write {first} for the first and {second} for the second"));
            assert_eq!(Formula::parse(first).unwrap().charge().abs(), 1);
            assert!(Formula::parse(second).unwrap().charge().abs() > 1);
        }
        assert_eq!(
            refuse("Ca2+").to_string(),
            "Ca2+ can be read as Ca2 with charge +1 or as Ca with charge +2" // both things named
        );
    }

    #[test]
    fn a_point_that_could_be_a_decimal_or_an_addition_is_refused() {
        for (text, added, fraction) in [
            ("CH1.8O0.5N0.2", "CH1·8O0.5N0.2", "CH9/5O0.5N0.2"),
            ("Al2O3.2SiO2", "Al2O3·2SiO2", "Al2O16/5SiO2"),
            ("Fe.947O", "Fe·947O", "Fe0.947O"),
        ] {
            let error = refuse(text);
            assert_eq!(error.code(), "unclear-point", "{text}");
            for reading in [added, fraction] {
                assert!(error.hint().contains(reading), "{}", error.hint());
                Formula::parse(reading).unwrap();
            }
        }
        assert_eq!(read("Al2O3·2SiO2").0, "Al2O7Si2");
    }

    #[test]
    fn records_are_read_in_the_style_of_the_tables() {
        let azide = Formula::parse_record("N3-").unwrap();
        assert_eq!((azide.composition().to_string(), azide.charge()), ("N3".to_owned(), -1));
        assert_eq!(azide.reference_name(), "N3-");
        assert_eq!(azide.to_string(), "N3^-");
    }

    #[test]
    fn the_reference_name_is_one_for_all_spellings() {
        for text in ["SO4-2", "SO4^2-", "SO4--", "SO₄²⁻"] {
            assert_eq!(Formula::parse(text).unwrap().reference_name(), "SO4-2");
        }
        assert_eq!(Formula::parse("CuSO4·5H2O").unwrap().reference_name(), "CuSO4.5H2O");
        assert_eq!(Formula::parse("Al2O3·2SiO2").unwrap().reference_name(), "Al2O3·2SiO2");
    }

    #[test]
    fn faults_name_the_place_and_what_was_expected() {
        let rows = [
            ("", "empty-formula", "there is no formula here: the text is empty"),
            ("CL2", "unknown-element", "in CL2, character 2: there is no element L (Cl?)"),
            ("Xx", "unknown-element", "in Xx, character 1: there is no element Xx"),
            (
                "h2o",
                "formula-unreadable",
                "in h2o, character 1: expected the symbol of an element, with its capital letter, found `h`",
            ),
            ("Ca(OH", "formula-bracket-open", "in Ca(OH, character 3: ( is never closed"),
            (
                "Ca(OH]2",
                "formula-unreadable",
                "in Ca(OH]2, character 6: expected an element, a count or `)`, found `]`",
            ),
            (
                "Ca()2",
                "formula-unreadable",
                "in Ca()2, character 4: expected the symbol of an element, with its capital letter, found `)`",
            ),
            (
                "CuSO4.",
                "formula-unreadable",
                "in CuSO4., character 7: expected the symbol of an element, with its capital letter, found the end",
            ),
            ("C02", "zero-atom-count", "in C02, character 2: the count 02 is zero, or starts with one"),
            ("CO0", "zero-atom-count", "in CO0, character 3: the count 0 is zero, or starts with one"),
            (
                "C99999999999999999999",
                "atom-count-too-large",
                "in C99999999999999999999, character 2: the number is too large to count atoms or charges with",
            ),
            ("Na+x", "formula-unreadable", "in Na+x, character 4: expected the end, behind the charge, found `x`"),
            ("SO4^", "formula-unreadable", "in SO4^, character 5: expected a charge, as in ^2+, found the end"),
            (
                "Na+99999999999",
                "atom-count-too-large",
                "in Na+99999999999, character 4: the number is too large to count atoms or charges with",
            ),
            (
                "e-2",
                "formula-unreadable",
                "in e-2, character 2: expected the single negative charge of an electron, e-, found `-`",
            ),
        ];
        for (text, code, message) in rows {
            let error = refuse(text);
            assert_eq!((error.code(), error.to_string().as_str()), (code, message));
            assert!(!error.hint().is_empty());
        }
    }

    #[test]
    fn nesting_and_length_are_bounded() {
        let nested = |depth: usize| format!("{}C{}", "(".repeat(depth), ")".repeat(depth));
        assert_eq!(read(&nested(16)).0, "C");
        assert_eq!(refuse(&nested(17)).code(), "formula-too-deep");
        assert_eq!(refuse(&"C".repeat(401)).code(), "formula-too-long");
        let product = "((((((((((C999)999)999)999)999)999)999)999)999)999)999";
        assert_eq!(refuse(product).code(), "atom-count-too-large");
    }
}
