//! A dataset: one publication, what its uncertainties mean, and the shipped tables taken from it.
//!
//! [`Dataset`] is the description shown beside every figure; [`Datum`] is one printed figure with its printed
//! uncertainty. The surprise: a printed uncertainty is kept as printed, and becomes a standard one only by the divisor
//! that its dataset declares; where a dataset states none, the uncertainty is absent, which is not zero.

use std::borrow::Cow;
use std::fmt;
use std::sync::Arc;

use serde::Deserialize;

use crate::fault::Explain;
use crate::quantity::Quantity;
use crate::record::evaluation::Shape;
use crate::source::Embedded;

/// The short name of a dataset, as in `codata-1989`. Equal names are one dataset, whichever file they were read from.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct DatasetId(Arc<str>);

impl DatasetId {
    pub fn new(name: impl Into<Arc<str>>) -> Self {
        DatasetId(name.into())
    }

    pub fn as_str(&self) -> &str {
        &self.0
    }

    /// The name, to be shared: keys of inputs hold it.
    pub fn shared(&self) -> Arc<str> {
        self.0.clone()
    }
}

impl fmt::Display for DatasetId {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.0)
    }
}

/// One publication as far as it is shipped.
#[derive(Clone, Debug)]
pub struct Dataset {
    pub id: DatasetId,
    /// For lines of text: `CODATA 1989`.
    pub short: Arc<str>,
    /// Authors, title, publisher, year.
    pub publication: Arc<str>,
    /// Under which terms its figures are shipped.
    pub terms: Arc<str>,
    /// What its printed uncertainties mean, in words.
    pub uncertainty: Arc<str>,
    /// Printed uncertainty divided by this is a standard uncertainty. `None`: the dataset states no uncertainty.
    pub divisor: Option<f64>,
    /// Precedence of its formation enthalpies, smallest first. `None`: it has none.
    pub rank: Option<u32>,
    /// Whether it was read beside a notebook: it serves reactions that have one of its own substances, and no others.
    pub own: bool,
    /// The dataset whose formation enthalpies stand beside its own in one reaction, where its author says that they fit.
    pub extends: Option<DatasetId>,
    pub tables: Vec<Table>,
}

/// One shipped file of a dataset.
#[derive(Clone, Debug)]
pub struct Table {
    pub title: Arc<str>,
    pub path: Arc<str>,
    /// SHA-256 of the file, in hexadecimal.
    pub sha256: Arc<str>,
    pub records: usize,
}

/// A dataset as every table's file describes it.
#[derive(Deserialize)]
pub(super) struct Heading<'a> {
    pub id: &'a str,
    short: &'a str,
    publication: &'a str,
    terms: &'a str,
    uncertainty: &'a str,
    pub divisor: Option<f64>,
    rank: Option<u32>,
}

/// Adds a table to the description of its dataset, which the first of its tables makes.
pub(super) fn enter(
    datasets: &mut Vec<Dataset>,
    heading: &Heading<'_>,
    title: &str,
    file: &Embedded<'_>,
    records: usize,
) -> DatasetId {
    let table = Table { title: title.into(), path: file.path.into(), sha256: file.sha256.into(), records };
    match datasets.iter_mut().find(|dataset| dataset.id.as_str() == heading.id) {
        Some(dataset) => {
            dataset.divisor = dataset.divisor.or(heading.divisor);
            dataset.rank = dataset.rank.or(heading.rank);
            dataset.tables.push(table);
            dataset.id.clone()
        }
        None => {
            let id = DatasetId::new(heading.id);
            datasets.push(Dataset {
                id: id.clone(),
                short: heading.short.into(),
                publication: heading.publication.into(),
                terms: heading.terms.into(),
                uncertainty: heading.uncertainty.into(),
                divisor: heading.divisor,
                rank: heading.rank,
                own: false,
                extends: None,
                tables: vec![table],
            });
            id
        }
    }
}

/// One printed figure, and what it is in SI units.
#[derive(Clone, Debug, PartialEq)]
pub struct Datum {
    /// As printed: `-285.830`.
    pub printed: Arc<str>,
    /// The printed uncertainty: `0.040`, a 95 % figure in some datasets.
    pub printed_u: Option<Arc<str>>,
    /// The unit of both printed figures.
    pub unit: Cow<'static, str>,
    /// One unit of the last printed place, in the unit of `value`.
    pub last_place: f64,
    /// In J/mol or J/(mol K).
    pub value: f64,
    /// Standard uncertainty, in the unit of `value`. `None`: not stated. `Some(0.0)`: zero by convention.
    pub u: Option<f64>,
    /// The distribution that u was evaluated by.
    pub shape: Shape,
    /// Degrees of freedom of u, where they are stated.
    pub dof: Option<f64>,
}

/// A figure as its file holds it.
#[derive(Deserialize)]
pub(super) struct Figure<'a> {
    value: &'a str,
    u: Option<&'a str>,
}

/// The printed unit of a column, with the power of ten that leads to J/mol or J/(mol K).
#[derive(Clone, Copy)]
pub(super) enum Column {
    /// kJ/mol, zero where the convention of the elements makes it so.
    Formation,
    /// kJ/mol
    Energy,
    /// J/(mol K)
    Entropy,
}

impl Datum {
    /// `None` where a text is not a decimal number, or an uncertainty is printed and the dataset declares no divisor.
    pub(super) fn read(figure: &Figure<'_>, column: Column, divisor: Option<f64>) -> Option<Datum> {
        let (unit, shift) = match column {
            Column::Formation | Column::Energy => ("kJ/mol", 3),
            Column::Entropy => ("J/(mol K)", 0),
        };
        let value = shifted(figure.value, shift)?;
        let zero = value == 0.0 && figure.u.is_none_or(|u| shifted(u, 0) == Some(0.0));
        let u = match figure.u {
            // Every dataset prints a zero for the elements and for H+(aq), some with an uncertainty of zero beside it.
            _ if zero && (figure.u.is_some() || matches!(column, Column::Formation)) => Some(0.0),
            None => None,
            Some(printed) => {
                let printed_u = shifted(printed, shift)?;
                // An uncertainty that rounds to zero in the print is bounded by half a unit of its last place.
                let bound =
                    if printed_u == 0.0 { shifted("0.5", shift - i32::from(decimals_of(printed)))? } else { printed_u };
                Some(bound / divisor?)
            }
        };
        Some(Datum {
            printed: figure.value.into(),
            printed_u: figure.u.map(Arc::from),
            unit: unit.into(),
            last_place: shifted("1", shift - i32::from(decimals_of(figure.value)))?,
            value,
            u,
            shape: Shape::Normal,
            dof: None,
        })
    }

    /// A figure written as it is typed in a notebook, `-285.830(20) kJ/mol`; `None` for a computed quantity.
    pub(super) fn of_written(written: &str, quantity: &Quantity) -> Option<Datum> {
        let input = quantity.node().input()?;
        let number = written.trim().find(|c: char| !(c.is_ascii_digit() || "+-.−".contains(c)));
        let (printed, _) = written.trim().split_at(number.unwrap_or(written.trim().len()));
        Some(Datum {
            printed: printed.into(),
            printed_u: None,
            unit: quantity.unit().text.to_string().into(),
            last_place: input.digit.unwrap_or(f64::NAN),
            value: quantity.si(),
            u: input.u,
            shape: input.evaluation().shape,
            dof: input.evaluation().dof,
        })
    }

    /// A formation enthalpy in J/mol without uncertainty; zero is a convention.
    pub(super) fn formation_j_mol(value: f64) -> Datum {
        Datum { u: (value == 0.0).then_some(0.0), ..Datum::energy_j_mol(value) }
    }

    /// An energy in J/mol without uncertainty, its decimals as far as a number carries them.
    pub(super) fn energy_j_mol(value: f64) -> Datum {
        let printed = value.to_string();
        Datum {
            last_place: shifted("1", -i32::from(decimals_of(&printed))).unwrap_or(f64::NAN),
            printed: printed.into(),
            printed_u: None,
            unit: "J/mol".into(),
            value,
            u: None,
            shape: Shape::Normal,
            dof: None,
        }
    }

    /// Whether this is zero by convention, and so limits neither the uncertainty nor the decimals of a result.
    pub fn is_convention(&self) -> bool {
        self.value == 0.0 && self.u == Some(0.0)
    }
}

fn decimals_of(text: &str) -> u8 {
    text.split_once('.').map_or(0, |(_, after)| after.len().min(u8::MAX.into()) as u8)
}

/// A decimal text times a power of ten, correctly rounded: -285.830 times 1000 is -285830, not a neighbour of it.
///
/// Fifteen digits are a whole number below 2^53, and powers up to 10^22 are exact, so that one multiplication or
/// division by IEEE 754 gives the double nearest to the decimal. `None` for more digits, or for other text.
fn shifted(text: &str, power: i32) -> Option<f64> {
    let (sign, digits) = text.strip_prefix('-').map_or((1.0, text), |rest| (-1.0, rest));
    let (before, after) = digits.split_once('.').unwrap_or((digits, ""));
    let count = before.len() + after.len();
    if before.is_empty() || count > 15 || !before.bytes().chain(after.bytes()).all(|byte| byte.is_ascii_digit()) {
        return None;
    }
    let whole = before.bytes().chain(after.bytes()).fold(0_u64, |whole, byte| 10 * whole + u64::from(byte - b'0'));
    let exponent = power - after.len() as i32;
    let scale = POWERS_OF_TEN.get(exponent.unsigned_abs() as usize)?;
    Some(sign * if exponent < 0 { whole as f64 / scale } else { whole as f64 * scale })
}

const POWERS_OF_TEN: [f64; 19] =
    [1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18];

/// Why a table cannot be used.
#[derive(Clone, Debug, PartialEq)]
pub enum TableFault {
    /// The file is not what its schema promises.
    Unreadable { path: String, why: String },
    /// A figure is no decimal number, or has an uncertainty whose meaning its dataset does not declare.
    Figure { path: String, record: String, column: &'static str },
    /// A record's id or formula names no species.
    Name { record: String, why: String },
    /// Numbers that are no correlation coefficients of records of the table.
    Correlation { path: String, why: String },
}

impl fmt::Display for TableFault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            TableFault::Unreadable { path, why } => write!(f, "cannot read the data table {path}: {why}"),
            TableFault::Figure { path, record, column } => {
                write!(f, "cannot read the figure {column} of {record} in the data table {path}")
            }
            TableFault::Name { record, why } => write!(f, "the record {record} names no species: {why}"),
            TableFault::Correlation { path, why } => {
                write!(f, "cannot use the correlation coefficients in the data table {path}: {why}")
            }
        }
    }
}

impl Explain for TableFault {
    fn code(&self) -> &'static str {
        match self {
            TableFault::Unreadable { .. } => "data-table-unreadable",
            TableFault::Figure { .. } => "data-figure-unreadable",
            TableFault::Name { .. } => "data-record-nameless",
            TableFault::Correlation { .. } => "data-correlation-unusable",
        }
    }

    fn hint(&self) -> String {
        match self {
            TableFault::Unreadable { .. } => "compare the file with a shipped one of the same schema".to_owned(),
            TableFault::Figure { .. } => {
                "write figures as decimal text, and declare a divisor where uncertainties are printed".to_owned()
            }
            TableFault::Correlation { .. } => {
                "give one row of coefficients per record, symmetric, with 1 on the diagonal, to as many digits as are printed"
                    .to_owned()
            }
            TableFault::Name { .. } => "give the record an id with phase, as CO2(g), and a formula".to_owned(),
        }
    }
}

/// Reads a whole file as the type that its schema promises.
pub(super) fn parse<'a, T: Deserialize<'a>>(file: &Embedded<'a>) -> Result<T, TableFault> {
    serde_json::from_slice(file.bytes)
        .map_err(|error| TableFault::Unreadable { path: file.path.to_owned(), why: error.to_string() })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn datum(value: &str, u: Option<&str>, column: Column, divisor: Option<f64>) -> Option<Datum> {
        Datum::read(&Figure { value, u }, column, divisor)
    }

    #[test]
    fn a_printed_95_percent_figure_is_halved_and_digits_stay() {
        // H2O(l), CODATA Key Values 1989: -285.830 +- 0.040 kJ/mol.
        let water = datum("-285.830", Some("0.040"), Column::Formation, Some(2.0)).unwrap();
        assert_eq!((water.value, water.u), (-285_830.0, Some(20.0)));
        assert_eq!((&*water.printed, water.printed_u.as_deref()), ("-285.830", Some("0.040")));
        assert_eq!(water.last_place, 1.0);
    }

    #[test]
    fn an_absent_uncertainty_is_not_zero_unless_the_figure_is_a_convention() {
        assert_eq!(datum("-74.6", None, Column::Formation, None).unwrap().u, None);
        assert!(datum("0", None, Column::Formation, None).unwrap().is_convention());
        assert_eq!(datum("0", None, Column::Entropy, None).unwrap().u, None);
        assert!(datum("0", Some("0"), Column::Entropy, Some(2.0)).unwrap().is_convention());
    }

    #[test]
    fn an_uncertainty_printed_as_zero_beside_a_figure_is_bounded_by_its_last_place() {
        // H(g), ATcT 1.112: 217.998 +- 0.000 kJ/mol, so less than 0.0005 at 95 %.
        let atom = datum("217.998", Some("0.000"), Column::Formation, Some(2.0)).unwrap();
        assert_eq!(atom.u, Some(0.25));
        assert!(!atom.is_convention());
    }

    #[test]
    fn a_shifted_decimal_is_the_double_nearest_to_it() {
        // The standard library's own reader is the second route.
        for text in ["-285.830", "0.1", "69.95", "-3010.100", "0.0005", "123456789012.345", "7"] {
            for power in [-3, 0, 3] {
                assert_eq!(shifted(text, power), format!("{text}e{power}").parse().ok(), "{text}e{power}");
            }
        }
    }

    #[test]
    fn text_that_is_no_decimal_number_and_an_uncertainty_without_meaning_are_refused() {
        for text in ["", "1e3", "inf", "NaN", "1,5", "--1", "1.2.3", ".5", "1234567890.123456"] {
            assert!(datum(text, None, Column::Energy, None).is_none(), "{text}");
        }
        assert!(datum("1.5", Some("0.1"), Column::Energy, None).is_none());
    }
}
