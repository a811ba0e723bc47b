//! A balanced reaction equation: species with their stoichiometric numbers, positive for products.
//!
//! [`Equation::parse`] refuses what is not balanced, element by element, with the balanced equation as the way out where
//! there is just one. Two rules that may surprise: a species on both sides counts with its difference, and one that
//! cancels out altogether (a catalyst, a spectator ion) is refused, since a value per mole of reaction does not know it.

use std::collections::BTreeSet;
use std::fmt;
use std::sync::Arc;

use crate::chem::balance::{Conserved, Party, solve};
use crate::chem::equation_text::{EquationText, WrittenTerm};
use crate::chem::species::Species;
use crate::fault::{Explain, Fault};
use crate::num::rational::Rational;

/// A reaction as written. Numbers are exact fractions, and atoms and charge balance exactly.
#[derive(Clone, Debug)]
pub struct Equation {
    /// Reactants, then products, each in the order written. Invariant: no number is zero, no species comes twice.
    terms: Vec<(Species, Rational)>,
    delta_n_gas: Rational,
    text: Arc<str>,
}

/// What is out of balance: the amounts on both sides of the equation as written.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Imbalance {
    pub what: Conserved,
    pub left: Rational,
    pub right: Rational,
}

/// `O: 2 on the left, 4 on the right`
impl fmt::Display for Imbalance {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Imbalance { what, left, right } = self;
        write!(f, "{what}: {} on the left, {} on the right", what.show(*left), what.show(*right))
    }
}

/// Why an equation, well written, is no reaction.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum EquationError {
    #[error("{text} is not balanced: {}", .imbalances.iter().map(Imbalance::to_string).collect::<Vec<_>>().join("; "))]
    Unbalanced {
        text: Arc<str>,
        /// Elements by atomic number, charge last; never empty.
        imbalances: Vec<Imbalance>,
        /// The balanced equation, or why there is none.
        way_out: Result<String, String>,
    },
    #[error("in {text}, the same coefficient on both sides cancels out: {}", .names.join(", "))]
    Cancels { text: Arc<str>, names: Vec<String> },
    #[error("in {text}, the coefficients are too large or too finely divided to add up exactly")]
    TooLarge { text: Arc<str> },
}

impl Explain for EquationError {
    fn code(&self) -> &'static str {
        match self {
            EquationError::Unbalanced { imbalances, .. } => {
                let only_charge = imbalances.iter().all(|imbalance| imbalance.what == Conserved::Charge);
                if only_charge { "unbalanced-charge" } else { "unbalanced-element" }
            }
            EquationError::Cancels { .. } => "species-cancels",
            EquationError::TooLarge { .. } => "coefficients-too-large",
        }
    }

    fn hint(&self) -> String {
        match self {
            EquationError::Unbalanced { way_out: Ok(balanced), .. } => format!("balanced it reads {balanced}"),
            EquationError::Unbalanced { way_out: Err(reason), .. } => {
                format!("no coefficients can be offered, since {reason}")
            }
            EquationError::Cancels { names, .. } => {
                format!("leave out {}: what is not changed does not count in a reaction's values", names.join(", "))
            }
            EquationError::TooLarge { .. } => "write small whole numbers or fractions such as 1/2".to_owned(),
        }
    }
}

impl Equation {
    /// Reads a balanced equation. `find` makes a species of its name, `n-butane(g)`; it is also asked for `2H2O(l)`, which
    /// it should not know, before `2` is taken for a coefficient.
    pub fn parse(text: &str, find: &dyn Fn(&str) -> Result<Species, Fault>) -> Result<Equation, Fault> {
        let read = EquationText::parse(text)?;
        let side = |terms: &[WrittenTerm]| terms.iter().map(|term| term.resolve(find)).collect::<Result<Vec<_>, _>>();
        let (left, right) = (side(&read.left)?, side(&read.right)?);
        Ok(Equation::from_sides(text, &left, &right)?)
    }

    fn from_sides(
        text: &str,
        left: &[(Rational, Species)],
        right: &[(Rational, Species)],
    ) -> Result<Equation, EquationError> {
        let text: Arc<str> = text.split_whitespace().collect::<Vec<_>>().join(" ").into();
        let too_large = || EquationError::TooLarge { text: text.clone() };
        let imbalances = imbalances(left, right).ok_or_else(too_large)?;
        if !imbalances.is_empty() {
            let way_out = way_out(left, right);
            return Err(EquationError::Unbalanced { text, imbalances, way_out });
        }
        let mut net: Vec<(Species, Rational)> = Vec::new();
        let signed = left.iter().map(|(n, s)| (-*n, s)).chain(right.iter().map(|(n, s)| (*n, s)));
        for (number, species) in signed {
            match net.iter_mut().find(|(known, _)| known == species) {
                Some((_, sum)) => *sum = sum.checked_add(number).ok_or_else(too_large)?,
                None => net.push((species.clone(), number)),
            }
        }
        let cancelled = net.iter().filter(|(_, nu)| nu.is_zero());
        let names: Vec<String> = cancelled.map(|(species, _)| species.id.to_string()).collect();
        if !names.is_empty() {
            return Err(EquationError::Cancels { text, names });
        }
        net.sort_by_key(|(_, nu)| nu.is_positive());
        let gases = net.iter().filter(|(species, _)| species.is_gas());
        let delta_n_gas =
            gases.map(|(_, nu)| *nu).try_fold(Rational::ZERO, Rational::checked_add).ok_or_else(too_large)?;
        Ok(Equation { terms: net, delta_n_gas, text })
    }

    /// Species with their stoichiometric numbers, reactants (negative) first, each side in the order written.
    pub fn terms(&self) -> &[(Species, Rational)] {
        &self.terms
    }

    /// The equation as it was typed, spaces tidied.
    pub fn text(&self) -> &str {
        &self.text
    }

    /// The stoichiometric number of the species with that id; `None` if it takes no part.
    pub fn nu(&self, id: &str) -> Option<Rational> {
        self.terms.iter().find(|(species, _)| &*species.id == id).map(|(_, nu)| *nu)
    }

    /// Species with their stoichiometric numbers as doubles.
    pub fn nu_f64(&self) -> impl Iterator<Item = (&Species, f64)> {
        self.terms.iter().map(|(species, nu)| (species, nu.to_f64()))
    }

    /// Reactants with their coefficients, which are positive.
    pub fn reactants(&self) -> impl Iterator<Item = (&Species, Rational)> {
        self.terms.iter().filter(|(_, nu)| nu.is_negative()).map(|(species, nu)| (species, nu.abs()))
    }

    /// Products with their coefficients.
    pub fn products(&self) -> impl Iterator<Item = (&Species, Rational)> {
        self.terms.iter().filter(|(_, nu)| nu.is_positive()).map(|(species, nu)| (species, *nu))
    }

    /// Sum of the stoichiometric numbers of the gases.
    pub fn delta_n_gas(&self) -> Rational {
        self.delta_n_gas
    }

    /// The largest coefficient of a species, as a double.
    pub fn largest_nu_f64(&self) -> f64 {
        self.terms.iter().map(|(_, nu)| nu.abs().to_f64()).fold(0.0, f64::max)
    }
}

/// `1/2 N2(g) + 3/2 H2(g) -> NH3(g)`, by ids and with what stands on both sides taken off; reads back to equal terms
/// wherever ids are known.
impl fmt::Display for Equation {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        fn side<'a>(terms: impl Iterator<Item = (&'a Species, Rational)>) -> String {
            let one = |(species, n): (&Species, Rational)| match n {
                Rational::ONE => species.id.to_string(),
                n => format!("{n} {}", species.id),
            };
            terms.map(one).collect::<Vec<_>>().join(" + ")
        }
        write!(f, "{} -> {}", side(self.reactants()), side(self.products()))
    }
}

/// All that is out of balance, elements by atomic number and charge last; `None` if a sum is out of range.
fn imbalances(left: &[(Rational, Species)], right: &[(Rational, Species)]) -> Option<Vec<Imbalance>> {
    let all = left.iter().chain(right);
    let elements: BTreeSet<_> = all.flat_map(|(_, s)| s.composition.iter().map(|(element, _)| element)).collect();
    let total = |side: &[(Rational, Species)], what: Conserved| {
        side.iter().try_fold(Rational::ZERO, |sum, (n, species)| {
            sum.checked_add(n.checked_mul(what.amount(&species.composition, species.charge))?)
        })
    };
    let mut found = Vec::new();
    for what in elements.into_iter().map(Conserved::Element).chain([Conserved::Charge]) {
        let imbalance = Imbalance { what, left: total(left, what)?, right: total(right, what)? };
        if imbalance.left != imbalance.right {
            found.push(imbalance);
        }
    }
    Some(found)
}

/// The equation balanced, or why that cannot be done.
fn way_out(left: &[(Rational, Species)], right: &[(Rational, Species)]) -> Result<String, String> {
    let parties = |side: &[(Rational, Species)]| -> Vec<Party> {
        let party = |species: &Species| Party {
            name: species.id.to_string(),
            composition: species.composition.clone(),
            charge: species.charge,
        };
        side.iter().map(|(_, species)| party(species)).collect()
    };
    match solve(&parties(left), &parties(right)) {
        Ok(balanced) => Ok(balanced.to_string()),
        Err(error) => Err(format!("{error}; {}", error.hint())),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::chem::formula::Formula;
    use crate::chem::species::SpeciesName;
    use crate::units::dimension::Entity;

    /// A small catalogue, which knows three names, and formulas.
    fn find(text: &str) -> Result<Species, Fault> {
        let name: SpeciesName = text.parse()?;
        let formula = match name.base.as_str() {
            "2-propanol" => "C3H8O",
            "acetone" => "C3H6O",
            "2H-pyran" => "C5H6O",
            _ => return Ok(Species::from_formula(text)?),
        };
        let formula = Formula::parse(formula)?;
        Ok(Species {
            id: text.into(),
            entity: Entity::named(&name.base),
            composition: formula.composition().clone(),
            charge: 0,
            phase: name.phase.ok_or_else(|| Fault::new("test", "no phase", "give one"))?,
        })
    }

    fn read(text: &str) -> Equation {
        Equation::parse(text, &find).unwrap_or_else(|fault| panic!("{text}: {fault}"))
    }

    fn refuse(text: &str) -> Fault {
        Equation::parse(text, &find).expect_err(text)
    }

    #[test]
    fn stoichiometric_numbers_are_exact_and_negative_for_reactants() {
        let ammonia = read("½ N2(g) + 1.5 H2(g) → NH3(g)");
        assert_eq!(ammonia.to_string(), "1/2 N2(g) + 3/2 H2(g) -> NH3(g)");
        assert_eq!(ammonia.nu("H2(g)"), Rational::new(-3, 2));
        assert_eq!(ammonia.nu("He(g)"), None);
        assert_eq!(ammonia.delta_n_gas(), Rational::from(-1));
        assert_eq!(ammonia.nu_f64().map(|(_, nu)| nu).collect::<Vec<_>>(), [-0.5, -1.5, 1.0]);
        assert_eq!(ammonia.largest_nu_f64(), 1.5);
        assert_eq!(ammonia.text(), "½ N2(g) + 1.5 H2(g) → NH3(g)");
    }

    #[test]
    fn only_gases_count_in_delta_n() {
        assert_eq!(read("CaCO3(cr) -> CaO(cr) + CO2(g)").delta_n_gas(), Rational::ONE);
        assert_eq!(read("H2O(l) -> H2O(g)").delta_n_gas(), Rational::ONE);
        assert_eq!(read("Ag+(aq) + Cl-(aq) -> AgCl(cr)").delta_n_gas(), Rational::ZERO);
    }

    #[test]
    fn names_with_digits_in_front() {
        let text = "2 2-propanol(g) -> 2 acetone(g) + 2H2(g)";
        assert_eq!(read(text).to_string(), "2 2-propanol(g) -> 2 acetone(g) + 2 H2(g)");
        assert_eq!(read("2-propanol(g)->acetone(g)+H2(g)").to_string(), "2-propanol(g) -> acetone(g) + H2(g)");
        assert_eq!(read("2H-pyran(l) = 2H-pyran(g)").to_string(), "2H-pyran(l) -> 2H-pyran(g)");
        assert_eq!(read("2CO(g)+O2(g)=2CO2(g)").to_string(), "2 CO(g) + O2(g) -> 2 CO2(g)");
    }

    #[test]
    fn an_unbalanced_equation_names_each_element_with_both_counts() {
        let fault = refuse("CH4(g) + O2(g) -> CO2(g) + 2 H2O(g)");
        assert_eq!(fault.code(), "unbalanced-element");
        assert_eq!(
            fault.message(),
            "CH4(g) + O2(g) -> CO2(g) + 2 H2O(g) is not balanced: O: 2 on the left, 4 on the right"
        );
        assert_eq!(fault.hint(), "balanced it reads CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(g)");
        let fault = refuse("2 Ag+(aq) + Cu(cr) -> Ag(cr) + Cu+2(aq)");
        assert!(fault.message().ends_with("Ag: 2 on the left, 1 on the right"), "{fault}");
        let fault = refuse("Fe+3(aq) + 2 I-(aq) -> Fe+2(aq) + 1/2 I2(cr)");
        assert!(
            fault.message().ends_with("I: 2 on the left, 1 on the right; charge: +1 on the left, +2 on the right"),
            "{fault}"
        );
        assert_eq!(fault.code(), "unbalanced-element");
    }

    #[test]
    fn charge_alone_has_its_own_code_and_a_hint() {
        let fault = refuse("Ag+(aq) -> Ag(cr)");
        assert_eq!(fault.code(), "unbalanced-charge");
        assert!(fault.message().ends_with("is not balanced: charge: +1 on the left, 0 on the right"), "{fault}");
        assert!(fault.hint().contains("add what carries the charge: e-"), "{}", fault.hint());
        let fault = refuse("Fe+3(aq) + Cu(cr) -> Fe+2(aq) + Cu+2(aq)");
        assert_eq!(fault.code(), "unbalanced-charge");
        assert_eq!(fault.hint(), "balanced it reads 2 Fe+3(aq) + Cu(cr) -> 2 Fe+2(aq) + Cu+2(aq)");
    }

    #[test]
    fn without_one_balanced_equation_the_hint_says_why() {
        let fault = refuse("C(cr) + O2(g) -> CO(g) + CO2(g)");
        assert!(fault.hint().contains("a sum of 2 independent reactions"), "{}", fault.hint());
        let fault = refuse("H2(g) -> H2O(g)");
        assert!(fault.hint().contains("only the right side has O"), "{}", fault.hint());
    }

    #[test]
    fn a_repeated_species_adds_up_and_one_on_both_sides_counts_with_its_difference() {
        assert_eq!(read("H2(g) + H2(g) + O2(g) -> 2 H2O(l)").to_string(), "2 H2(g) + O2(g) -> 2 H2O(l)");
        let net = read("H2O(l) + CO(g) + H2O(l) -> CO2(g) + H2(g) + H2O(l)");
        assert_eq!(net.to_string(), "H2O(l) + CO(g) -> CO2(g) + H2(g)");
        // What is formed in the end stands among the products, wherever it was written first.
        let formed = read("O2(g) + 3 O2(g) + O3(g) -> 1 O2(g) + 3 O3(g)");
        assert_eq!(formed.to_string(), "3 O2(g) -> 2 O3(g)");
        let fault = refuse("CO(g) + H2O(g) + Cu(cr) -> CO2(g) + H2(g) + Cu(cr)");
        assert_eq!(fault.code(), "species-cancels");
        assert!(fault.message().ends_with("the same coefficient on both sides cancels out: Cu(cr)"), "{fault}");
        let fault = refuse("H2O(g) + CO(g) -> CO(g) + H2O(g)");
        assert!(fault.message().ends_with("the same coefficient on both sides cancels out: H2O(g), CO(g)"), "{fault}");
    }

    #[test]
    fn decimals_are_exact_so_a_rounded_third_is_out_of_balance() {
        let fault = refuse("0.333 O3(g) -> 0.5 O2(g)");
        assert!(fault.message().ends_with("O: 999/1000 on the left, 1 on the right"), "{fault}");
        assert_eq!(fault.hint(), "balanced it reads 2 O3(g) -> 3 O2(g)");
    }

    #[test]
    fn faults_of_the_resolver_and_of_the_text_pass_through() {
        assert_eq!(refuse("H2O -> H2O(g)").code(), "no-phase");
        assert_eq!(refuse("2Xx(g) -> Xx2(g)").message(), "in Xx, character 1: there is no element Xx");
        assert_eq!(refuse("H2(g) + O2(g)").code(), "no-arrow");
        let huge = "9223372036854775807";
        assert_eq!(refuse(&format!("{huge} H2(g) -> {huge} H2(g)")).code(), "coefficients-too-large");
    }
}
