//! How many atoms of each element a formula unit holds.
//!
//! Counts are exact fractions, since `CdSO4.8/3H2O` and `Fe0.947O` are formulas too. Deuterium and tritium count apart
//! from hydrogen. Charge is no part of a composition: `Fe+2` and `Fe` have the same one.

use std::collections::BTreeMap;
use std::fmt;

use crate::chem::element::{Element, atomic_weight};
use crate::fault::Explain;
use crate::num::rational::Rational;

/// Element to count, without zero or negative counts, in order of atomic number.
#[derive(Clone, Debug, Default, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Composition {
    counts: BTreeMap<Element, Rational>,
}

/// Why a composition has no molar mass from standard atomic weights.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum NoMolarMass {
    #[error("{} is one isotope, and standard atomic weights are for the normal mixture of isotopes", .0)]
    Isotope(Element),
    #[error("{} has no standard atomic weight, since it has no characteristic isotopic composition on Earth", .0)]
    NoStandardWeight(Element),
    #[error("there are no atoms in it, as in an electron")]
    NoAtoms,
}

impl Explain for NoMolarMass {
    fn code(&self) -> &'static str {
        match self {
            NoMolarMass::Isotope(_) => "isotope-without-standard-weight",
            NoMolarMass::NoStandardWeight(_) => "no-standard-weight",
            NoMolarMass::NoAtoms => "no-atoms-to-weigh",
        }
    }

    fn hint(&self) -> String {
        match self {
            NoMolarMass::Isotope(_) | NoMolarMass::NoStandardWeight(_) => {
                "state the molar mass with its source, as a quantity in g/mol".to_owned()
            }
            NoMolarMass::NoAtoms => "the electron's molar mass is its mass times the Avogadro constant".to_owned(),
        }
    }
}

impl Composition {
    /// From element-count pairs; counts of a repeated element add up. `None` for a count that is not positive or too large.
    pub fn from_counts(counts: impl IntoIterator<Item = (Element, Rational)>) -> Option<Composition> {
        let mut composition = Composition::default();
        for (element, count) in counts {
            composition.add(element, count)?;
        }
        Some(composition)
    }

    /// Adds atoms of one element; `None`, with nothing changed, for a count that is not positive or too large.
    pub fn add(&mut self, element: Element, count: Rational) -> Option<()> {
        if !count.is_positive() {
            return None;
        }
        let sum = self.count(element).checked_add(count)?;
        self.counts.insert(element, sum);
        Some(())
    }

    /// Adds `times` another composition.
    pub fn add_times(&mut self, other: &Composition, times: Rational) -> Option<()> {
        for (element, count) in other.iter() {
            self.add(element, count.checked_mul(times)?)?;
        }
        Some(())
    }

    pub fn count(&self, element: Element) -> Rational {
        self.counts.get(&element).copied().unwrap_or(Rational::ZERO)
    }

    /// Elements with their counts, in order of atomic number.
    pub fn iter(&self) -> impl Iterator<Item = (Element, Rational)> {
        self.counts.iter().map(|(&element, &count)| (element, count))
    }

    /// Whether there are no atoms at all, as in an electron.
    pub fn is_empty(&self) -> bool {
        self.counts.is_empty()
    }

    /// How many elements there are.
    pub fn len(&self) -> usize {
        self.counts.len()
    }

    /// Each element with its count, once all are known to have a standard atomic weight: the molar mass is the sum of
    /// count × [`atomic_weight`], and each element's weight is one input however often the element occurs.
    ///
    /// Electrons are not counted: an ion of charge z is lighter by z × 5.486e-4 g/mol (CODATA 2018 electron mass), a
    /// twentieth of a percent for H+ and less for every other ion.
    pub fn molar_mass_terms(&self) -> Result<Vec<(Element, f64)>, NoMolarMass> {
        if self.is_empty() {
            return Err(NoMolarMass::NoAtoms);
        }
        self.iter()
            .map(|(element, count)| match (atomic_weight(element), element.mass_number()) {
                (Some(_), _) => Ok((element, count.to_f64())),
                (None, Some(_)) => Err(NoMolarMass::Isotope(element)),
                (None, None) => Err(NoMolarMass::NoStandardWeight(element)),
            })
            .collect()
    }

    /// Molar mass in g/mol, atoms only; see [`Composition::molar_mass_terms`].
    pub fn molar_mass_g_mol(&self) -> Result<f64, NoMolarMass> {
        let terms = self.molar_mass_terms()?;
        Ok(terms.iter().filter_map(|&(element, count)| Some(count * atomic_weight(element)?.value_g_mol)).sum())
    }
}

/// Hill order: carbon, then hydrogen where there is carbon, then the others by symbol. Parses back to an equal one.
impl fmt::Display for Composition {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let has_carbon = !self.count(Element::CARBON).is_zero();
        let mut parts: Vec<(Element, Rational)> = self.iter().collect();
        parts.sort_by_key(|&(element, _)| {
            let rank = match element {
                Element::CARBON => 0,
                Element::HYDROGEN if has_carbon => 1,
                _ => 2,
            };
            (rank, element.symbol())
        });
        for (element, count) in parts {
            write!(f, "{element}")?;
            if count != Rational::ONE {
                write!(f, "{count}")?;
            }
        }
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn composition(parts: &[(&str, &str)]) -> Composition {
        let counts = parts.iter().map(|(symbol, n)| (Element::from_symbol(symbol).unwrap(), n.parse().unwrap()));
        Composition::from_counts(counts).unwrap()
    }

    #[test]
    fn hill_order_puts_carbon_then_hydrogen_first_and_is_alphabetical_without_carbon() {
        assert_eq!(composition(&[("O", "1"), ("H", "6"), ("C", "2")]).to_string(), "C2H6O");
        assert_eq!(composition(&[("S", "1"), ("O", "4"), ("H", "2")]).to_string(), "H2O4S");
        assert_eq!(composition(&[("O", "20/3"), ("Cd", "1"), ("S", "1"), ("H", "16/3")]).to_string(), "CdH16/3O20/3S");
    }

    #[test]
    fn molar_masses_are_the_sums_of_the_printed_weights() {
        // By hand from CIAAW 2021 abridged: H 1.0080, C 12.011, O 15.999, S 32.06, Cd 112.414 g/mol.
        let rows = [
            (composition(&[("C", "1"), ("H", "4")]), 16.043),
            (composition(&[("H", "2"), ("O", "1")]), 18.015),
            (composition(&[("Cd", "1"), ("S", "1"), ("O", "20/3"), ("H", "16/3")]), 256.51),
        ];
        for (composition, by_hand) in rows {
            let mass = composition.molar_mass_g_mol().unwrap();
            assert!((mass - by_hand).abs() < 1e-12 * by_hand, "{composition}: {mass}"); // rounding of doubles only
        }
    }

    #[test]
    fn a_missing_weight_is_named_with_its_reason() {
        let heavy_water = composition(&[("D", "2"), ("O", "1")]);
        assert_eq!(heavy_water.molar_mass_terms(), Err(NoMolarMass::Isotope(Element::DEUTERIUM)));
        let radon = composition(&[("Rn", "1")]);
        assert!(matches!(radon.molar_mass_g_mol(), Err(NoMolarMass::NoStandardWeight(_))));
        assert_eq!(Composition::default().molar_mass_g_mol(), Err(NoMolarMass::NoAtoms));
    }

    #[test]
    fn zero_and_negative_counts_are_refused() {
        let mut empty = Composition::default();
        assert_eq!(empty.add(Element::CARBON, Rational::ZERO), None);
        assert_eq!(empty.add(Element::CARBON, -Rational::ONE), None);
        assert!(empty.is_empty());
    }
}
