//! Elements, and their standard atomic weights with uncertainty and source.
//!
//! An [`Element`] is an atomic number, and for deuterium and tritium (`D`, `T`) the mass number too: in a composition
//! they count apart from `H`. The surprise: not every element has a standard atomic weight, and no isotope has one, so
//! [`atomic_weight`] may answer `None`. The printed uncertainty is a bound, not a standard uncertainty.

use std::collections::BTreeMap;
use std::fmt;
use std::sync::{Arc, LazyLock};

use serde::Deserialize;

use crate::source::{Citation, Embedded, embedded};

/// The file that the weights are read from.
pub static ATOMIC_WEIGHTS: Embedded<'static> = embedded("stdlib/data/atomic_weights.json");

const SYMBOLS: [&str; 118] = [
    "H", "He", "Li", "Be", "B", "C", "N", "O", "F", "Ne", "Na", "Mg", "Al", "Si", "P", "S", "Cl", "Ar", "K", "Ca",
    "Sc", "Ti", "V", "Cr", "Mn", "Fe", "Co", "Ni", "Cu", "Zn", "Ga", "Ge", "As", "Se", "Br", "Kr", "Rb", "Sr", "Y",
    "Zr", "Nb", "Mo", "Tc", "Ru", "Rh", "Pd", "Ag", "Cd", "In", "Sn", "Sb", "Te", "I", "Xe", "Cs", "Ba", "La", "Ce",
    "Pr", "Nd", "Pm", "Sm", "Eu", "Gd", "Tb", "Dy", "Ho", "Er", "Tm", "Yb", "Lu", "Hf", "Ta", "W", "Re", "Os", "Ir",
    "Pt", "Au", "Hg", "Tl", "Pb", "Bi", "Po", "At", "Rn", "Fr", "Ra", "Ac", "Th", "Pa", "U", "Np", "Pu", "Am", "Cm",
    "Bk", "Cf", "Es", "Fm", "Md", "No", "Lr", "Rf", "Db", "Sg", "Bh", "Hs", "Mt", "Ds", "Rg", "Cn", "Nh", "Fl", "Mc",
    "Lv", "Ts", "Og",
];

static BY_SYMBOL: LazyLock<BTreeMap<&'static str, Element>> = LazyLock::new(|| {
    let natural = SYMBOLS.iter().zip(1..).map(|(&symbol, z)| (symbol, Element { z, mass_number: 0 }));
    natural.chain([("D", Element::DEUTERIUM), ("T", Element::TRITIUM)]).collect()
});

/// An element of normal isotopic composition, or deuterium or tritium. Ordered by atomic number, then mass number.
#[derive(Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Element {
    z: u8, // Invariant: 1 to 118.
    /// 0 for the normal mixture of isotopes.
    mass_number: u8,
}

impl Element {
    pub const HYDROGEN: Element = Element { z: 1, mass_number: 0 };
    pub const DEUTERIUM: Element = Element { z: 1, mass_number: 2 };
    pub const TRITIUM: Element = Element { z: 1, mass_number: 3 };
    pub const CARBON: Element = Element { z: 6, mass_number: 0 };

    /// The element of that symbol, capitals as in print: `Co` is cobalt, `CO` is none.
    pub fn from_symbol(symbol: &str) -> Option<Element> {
        BY_SYMBOL.get(symbol).copied()
    }

    /// The element of that atomic number, of normal isotopic composition.
    pub fn from_atomic_number(z: u8) -> Option<Element> {
        (1..=118).contains(&z).then_some(Element { z, mass_number: 0 })
    }

    pub fn atomic_number(self) -> u8 {
        self.z
    }

    /// 2 for `D` and 3 for `T`; `None` for the normal mixture of isotopes.
    pub fn mass_number(self) -> Option<u8> {
        (self.mass_number != 0).then_some(self.mass_number)
    }

    pub fn symbol(self) -> &'static str {
        match (self.z, self.mass_number) {
            (1, 2) => "D",
            (1, 3) => "T",
            _ => SYMBOLS[usize::from(self.z) - 1],
        }
    }
}

impl fmt::Display for Element {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.symbol())
    }
}

impl fmt::Debug for Element {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.symbol())
    }
}

/// A standard atomic weight as printed, and its standard uncertainty.
///
/// The figure is a relative atomic mass, shown as g/mol: the molar mass constant differs from 1 g/mol by 3.5e-10
/// (CODATA 2018) or 1.05e-9 (CODATA 2022) of its value, which only the best-known weights (F, Na, Al, P) would notice.
#[derive(Clone, Debug, PartialEq)]
pub struct AtomicWeight {
    pub element: Element,
    pub value_g_mol: f64,
    /// The printed digits of the value.
    pub printed: Box<str>,
    /// The uncertainty as printed, g/mol: a bound of half-width u.
    pub printed_u: f64,
    /// The printed figure is divided by this to give the standard uncertainty of a rectangular distribution.
    pub u_divisor: f64,
    /// Standard uncertainty, g/mol. All atoms of an element share one: it is one input, not one per atom.
    pub u_standard: f64,
    /// The standard atomic weight itself, where it is an interval of normal materials.
    pub interval: Option<(f64, f64)>,
    /// Year of the table.
    pub edition: u16,
    pub citation: Citation,
}

/// The standard atomic weight; `None` for isotopes and for elements without a characteristic isotopic composition.
pub fn atomic_weight(element: Element) -> Option<&'static AtomicWeight> {
    static BUILT_IN: LazyLock<BTreeMap<Element, AtomicWeight>> = LazyLock::new(|| {
        read_weights(ATOMIC_WEIGHTS.bytes).expect("the built-in table of atomic weights is read by this file's tests")
    });
    BUILT_IN.get(&element)
}

/// What the first member of a table of atomic weights names.
pub const SCHEMA: &str = "hessbook/atomic-weights/1";

/// What this file needs of the table; the rest of it is for readers.
#[derive(Deserialize)]
struct Table {
    #[serde(rename = "schema")]
    _schema: Schema,
    /// Year to publication.
    editions: BTreeMap<u16, String>,
    read_from: String,
    uncertainty: Uncertainty,
    records: Vec<Record>,
}

#[derive(Deserialize)]
enum Schema {
    #[serde(rename = "hessbook/atomic-weights/1")]
    One,
}

#[derive(Deserialize)]
struct Uncertainty {
    divisor: Divisor,
}

#[derive(Clone, Copy, Deserialize)]
enum Divisor {
    #[serde(rename = "sqrt(3)")]
    SqrtThree,
}

impl Divisor {
    fn value(self) -> f64 {
        match self {
            Divisor::SqrtThree => 3_f64.sqrt(),
        }
    }
}

#[derive(Deserialize)]
struct Record {
    #[serde(rename = "Z")]
    z: u8,
    symbol: String,
    value: Option<String>,
    u: Option<String>,
    interval: Option<(String, String)>,
    edition: u16,
    check: Option<String>,
}

/// Reads a table of atomic weights.
///
/// # Errors
/// It is no such table; the error says which row is wrong.
pub fn read_weights(bytes: &[u8]) -> Result<BTreeMap<Element, AtomicWeight>, String> {
    let table: Table = serde_json::from_slice(bytes).map_err(|error| error.to_string())?;
    let u_divisor = table.uncertainty.divisor.value();
    let mut weights = BTreeMap::new();
    for record in table.records {
        let row = &record.symbol;
        let element = Element::from_symbol(row)
            .filter(|element| element.atomic_number() == record.z && element.mass_number().is_none())
            .ok_or_else(|| format!("{row}: not element {}", record.z))?;
        let (value, u) = match (&record.value, &record.u) {
            (Some(value), Some(u)) => (value, u),
            (None, None) => continue,
            _ => return Err(format!("{row}: value and u go together")),
        };
        let number = |text: &str| text.parse::<f64>().map_err(|_| format!("{row}: {text:?} is not a number"));
        let (value_g_mol, printed_u) = (number(value)?, number(u)?);
        let interval = match &record.interval {
            Some((low, high)) => Some((number(low)?, number(high)?)),
            None => None,
        };
        let source = table.editions.get(&record.edition).ok_or_else(|| format!("{row}: no such edition"))?;
        let mut obtained = table.read_from.clone();
        if let Some(check) = &record.check {
            obtained = format!("{obtained}; {check}");
        }
        let weight = AtomicWeight {
            element,
            value_g_mol,
            printed: value.as_str().into(),
            printed_u,
            u_divisor,
            u_standard: printed_u / u_divisor,
            interval,
            edition: record.edition,
            citation: Citation::new(source.as_str(), Arc::from(obtained)),
        };
        if weights.insert(element, weight).is_some() {
            return Err(format!("{row}: twice"));
        }
    }
    Ok(weights)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn weight(symbol: &str) -> &'static AtomicWeight {
        atomic_weight(Element::from_symbol(symbol).unwrap()).unwrap()
    }

    #[test]
    fn symbols_and_numbers_agree_both_ways() {
        for z in 1..=118 {
            let element = Element::from_atomic_number(z).unwrap();
            assert_eq!(Element::from_symbol(element.symbol()), Some(element));
            assert_eq!(element.atomic_number(), z);
        }
        assert_eq!(Element::from_atomic_number(0), None);
        assert_eq!(Element::from_atomic_number(119), None);
        assert_eq!(Element::from_symbol("co"), None);
    }

    #[test]
    fn deuterium_is_hydrogen_by_number_but_counts_apart_and_has_no_weight() {
        let d = Element::from_symbol("D").unwrap();
        assert_eq!((d.atomic_number(), d.mass_number(), d.symbol()), (1, Some(2), "D"));
        assert_ne!(d, Element::HYDROGEN);
        assert!(atomic_weight(d).is_none() && atomic_weight(Element::TRITIUM).is_none());
    }

    #[test]
    fn the_built_in_table_has_every_weight_that_was_published() {
        let weights = read_weights(ATOMIC_WEIGHTS.bytes).unwrap();
        // CIAAW 2021: 84 elements have a standard atomic weight, that is all up to Bi but Tc and Pm, and Th, Pa, U.
        assert_eq!(weights.len(), 84);
        let without = (1..=92).filter(|&z| atomic_weight(Element::from_atomic_number(z).unwrap()).is_none());
        assert_eq!(without.collect::<Vec<_>>(), [43, 61, 84, 85, 86, 87, 88, 89]);
        for weight in weights.values() {
            // CIAAW chose u so that value ± u covers the interval. The abridged value itself may lie outside by its
            // own rounding: oxygen, 15.999 beside 15.99903 to 15.99977. 1e-9 is for the rounding of doubles.
            if let Some((low, high)) = weight.interval {
                assert!(low < high, "{weight:?}");
                assert!(weight.value_g_mol - weight.printed_u <= low + 1e-9, "{weight:?}");
                assert!(high <= weight.value_g_mol + weight.printed_u + 1e-9, "{weight:?}");
            }
            assert!(weight.u_standard > 0.0 && weight.printed.contains('.'), "{weight:?}");
        }
    }

    #[test]
    fn the_printed_bound_is_divided_by_the_root_of_three() {
        // CIAAW 2021, abridged: H 1.0080 ± 0.0002, C 12.011 ± 0.002.
        let hydrogen = weight("H");
        assert_eq!((&*hydrogen.printed, hydrogen.printed_u), ("1.0080", 0.0002));
        assert!((hydrogen.u_standard * hydrogen.u_standard * 3.0 - 4e-8).abs() < 1e-20); // rounding of doubles only
        assert_eq!(weight("C").value_g_mol, 12.011);
        assert_eq!(weight("C").interval, Some((12.0096, 12.0116)));
    }

    #[test]
    fn citations_say_edition_and_how_the_figure_was_obtained() {
        assert!(weight("O").citation.to_string().contains("10.1515/pac-2019-0603"));
        assert!(weight("O").citation.obtained.contains("the printed table was not seen"));
        assert_eq!(weight("Zr").edition, 2024);
        assert!(weight("Zr").citation.obtained.contains("uncertainty from memory"));
    }

    #[test]
    fn a_damaged_table_names_the_row() {
        let text = std::str::from_utf8(ATOMIC_WEIGHTS.bytes).unwrap();
        let wrong_number = text.replacen("\"Z\": 2,", "\"Z\": 3,", 1);
        assert_eq!(read_weights(wrong_number.as_bytes()).unwrap_err(), "He: not element 3");
        let lost_u = text.replacen("\"u\": \"0.000002\", ", "", 1);
        assert_eq!(read_weights(lost_u.as_bytes()).unwrap_err(), "He: value and u go together");
    }
}
