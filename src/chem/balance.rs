//! The whole numbers that balance an equation, by exact elimination.
//!
//! Each element, and charge, gives one linear equation; the coefficients are its null space. [`solve`] works on
//! compositions, [`balance`] on text. Whatever coefficients the text has are replaced. The surprise: an equation may
//! have no solution, or several independent ones, and then it is refused with the reason rather than guessed.

use std::collections::BTreeSet;
use std::fmt;

use crate::chem::composition::Composition;
use crate::chem::element::Element;
use crate::chem::equation_text::{EquationText, WrittenTerm};
use crate::chem::formula::Formula;
use crate::chem::species::SpeciesName;
use crate::fault::{Explain, Fault};
use crate::num::rational::{Rational, gcd};

/// One species of an equation to be balanced.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Party {
    pub name: String,
    pub composition: Composition,
    pub charge: i32,
}

/// A balanced equation: positive whole numbers without a common divisor, each with its species.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Balanced {
    pub left: Vec<(i64, String)>,
    pub right: Vec<(i64, String)>,
}

/// What a reaction conserves.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Conserved {
    Element(Element),
    Charge,
}

impl Conserved {
    /// How much of it one formula unit holds.
    pub fn amount(self, composition: &Composition, charge: i32) -> Rational {
        match self {
            Conserved::Element(element) => composition.count(element),
            Conserved::Charge => Rational::from(charge),
        }
    }

    /// `2`, or for a charge `+2`.
    pub fn show(self, amount: Rational) -> String {
        match self {
            Conserved::Charge if amount.is_positive() => format!("+{amount}"),
            _ => amount.to_string(),
        }
    }
}

impl fmt::Display for Conserved {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Conserved::Element(element) => write!(f, "{element}"),
            Conserved::Charge => f.write_str("charge"),
        }
    }
}

/// One conserved thing that stays unbalanced in an equation that balances everything else.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Obstacle {
    pub what: Conserved,
    pub left: Rational,
    pub right: Rational,
    /// The equation without it.
    pub otherwise: Balanced,
}

impl fmt::Display for Obstacle {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Obstacle { what, left, right, otherwise } = self;
        write!(f, "{what} ({} on the left, {} on the right in ", what.show(*left), what.show(*right))?;
        write!(f, "{otherwise}, where everything else balances)")
    }
}

/// Why there are no coefficients, or not one set of them.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum BalanceError {
    #[error("only the {side} side has {}", listed(.elements))]
    OneSided { elements: Vec<Element>, side: &'static str },
    #[error("no coefficients balance {}", .obstacles.iter().map(Obstacle::to_string).collect::<Vec<_>>().join(", or "))]
    Obstructed { obstacles: Vec<Obstacle> },
    #[error("no coefficients balance {} all at once", listed(.conserved))]
    Contradiction { conserved: Vec<Conserved> },
    #[error("the only coefficient that balances is 0 for {}", listed(.names))]
    TakesNoPart { names: Vec<String> },
    #[error("the equation balances only with {} on the other side", listed(.names))]
    WrongSide { names: Vec<String>, otherwise: Balanced },
    #[error("the equation is a sum of {} independent reactions, so its coefficients are not fixed", .reactions.len())]
    Several { reactions: Vec<Balanced> },
    #[error("{name} stands on both sides, and only the difference of its coefficients can be found")]
    BothSides { name: String },
    #[error("the coefficients are too large to compute with")]
    TooLarge,
}

fn listed<T: fmt::Display>(items: &[T]) -> String {
    items.iter().map(T::to_string).collect::<Vec<_>>().join(", ")
}

impl Explain for BalanceError {
    fn code(&self) -> &'static str {
        match self {
            BalanceError::OneSided { .. } => "element-on-one-side",
            BalanceError::Obstructed { .. } => "cannot-balance-one",
            BalanceError::Contradiction { .. } => "cannot-balance-together",
            BalanceError::TakesNoPart { .. } => "species-takes-no-part",
            BalanceError::WrongSide { .. } => "species-on-wrong-side",
            BalanceError::Several { .. } => "several-balances",
            BalanceError::BothSides { .. } => "species-on-both-sides",
            BalanceError::TooLarge => "balance-too-large",
        }
    }

    fn hint(&self) -> String {
        match self {
            BalanceError::OneSided { elements, side } => {
                let other = if *side == "left" { "right" } else { "left" };
                format!("add what holds {} to the {other} side, or check the formulas", listed(elements))
            }
            BalanceError::Obstructed { obstacles } if obstacles.iter().all(|o| o.what == Conserved::Charge) => {
                "add what carries the charge: e-, H+ in acid or OH- in base, with H2O where oxygen needs it".to_owned()
            }
            BalanceError::Contradiction { conserved } if conserved.contains(&Conserved::Charge) => {
                "check the formulas, and for ions in water whether H2O with H+ or OH- is missing".to_owned()
            }
            BalanceError::Obstructed { .. } | BalanceError::Contradiction { .. } => {
                "check the formulas, and whether a reactant or product is missing".to_owned()
            }
            BalanceError::TakesNoPart { names } => format!("leave out {}", listed(names)),
            BalanceError::WrongSide { otherwise, .. } => format!("write {otherwise}"),
            BalanceError::Several { reactions } => {
                let shown: Vec<String> = reactions.iter().take(3).map(|reaction| format!("{reaction}")).collect();
                let more = if reactions.len() > shown.len() { "; …" } else { "" };
                format!("split it, for instance into {}{more}, and add them as the process runs", shown.join("; "))
            }
            BalanceError::BothSides { name } => format!("write {name} on the side where more of it is, once"),
            BalanceError::TooLarge => "split the reaction into several".to_owned(),
        }
    }
}

/// Coefficients, left then right, of the equation with these species.
///
/// A species named twice on one side counts once; one named on both sides is refused.
pub fn solve(left: &[Party], right: &[Party]) -> Result<Balanced, BalanceError> {
    let left = without_repeats(left);
    let right = without_repeats(right);
    if let Some(both) = left.iter().find(|party| right.iter().any(|other| other.name == party.name)) {
        return Err(BalanceError::BothSides { name: both.name.clone() });
    }
    let system = System { parties: left.iter().chain(&right).copied().collect(), on_left: left.len() };
    let conserved = system.conserved();
    for (parties, others, side) in [(&left, &right, "left"), (&right, &left, "right")] {
        let held = |parties: &[&Party], element| parties.iter().any(|p| !p.composition.count(element).is_zero());
        let one_sided = |element: &Element| held(parties, *element) && !held(others, *element);
        let elements: Vec<Element> = conserved.iter().filter_map(|c| c.element()).filter(one_sided).collect();
        if !elements.is_empty() {
            return Err(BalanceError::OneSided { elements, side });
        }
    }
    let basis = system.null_space(&conserved)?;
    match basis.as_slice() {
        [] => Err(system.obstacles(&conserved)?),
        [only] => system.one_solution(only),
        several => {
            let reactions = several.iter().map(|v| system.reaction(v)).collect::<Option<_>>();
            Err(BalanceError::Several { reactions: reactions.ok_or(BalanceError::TooLarge)? })
        }
    }
}

fn without_repeats(parties: &[Party]) -> Vec<&Party> {
    let mut seen = BTreeSet::new();
    parties.iter().filter(|party| seen.insert(party.name.as_str())).collect()
}

impl Conserved {
    fn element(self) -> Option<Element> {
        match self {
            Conserved::Element(element) => Some(element),
            Conserved::Charge => None,
        }
    }
}

/// The species, left then right. A vector of coefficients is positive for a species that stays on its side.
struct System<'a> {
    parties: Vec<&'a Party>,
    on_left: usize,
}

impl System<'_> {
    fn conserved(&self) -> Vec<Conserved> {
        let elements: BTreeSet<Element> =
            self.parties.iter().flat_map(|party| party.composition.iter().map(|(element, _)| element)).collect();
        let charged = self.parties.iter().any(|party| party.charge != 0);
        elements.into_iter().map(Conserved::Element).chain(charged.then_some(Conserved::Charge)).collect()
    }

    /// One row of whole numbers: amounts on the left, minus amounts on the right, without a common denominator.
    fn row(&self, what: Conserved) -> Result<Vec<i128>, BalanceError> {
        let amounts: Vec<Rational> = self.parties.iter().map(|p| what.amount(&p.composition, p.charge)).collect();
        let mut common: i128 = 1;
        for amount in &amounts {
            let denominator = i128::from(amount.denominator());
            common = common.checked_mul(denominator / gcd(common, denominator)).ok_or(BalanceError::TooLarge)?;
        }
        (amounts.iter().enumerate())
            .map(|(at, amount)| {
                let sign = if at < self.on_left { 1 } else { -1 };
                let scale = sign * (common / i128::from(amount.denominator()));
                i128::from(amount.numerator()).checked_mul(scale).ok_or(BalanceError::TooLarge)
            })
            .collect()
    }

    /// Whole-number vectors without common divisor that span all solutions; in each, most species stay on their side,
    /// and the first one if it is a draw.
    fn null_space(&self, conserved: &[Conserved]) -> Result<Vec<Vec<i128>>, BalanceError> {
        let mut rows = conserved.iter().map(|&what| self.row(what)).collect::<Result<Vec<_>, _>>()?;
        let columns = self.parties.len();
        let pivots = reduce(&mut rows, columns).ok_or(BalanceError::TooLarge)?;
        (0..columns)
            .filter(|column| !pivots.contains(column))
            .map(|free| null_vector(&rows, &pivots, free, columns).ok_or(BalanceError::TooLarge))
            .collect()
    }

    fn one_solution(&self, vector: &[i128]) -> Result<Balanced, BalanceError> {
        let named = |wanted: &dyn Fn(i128) -> bool| -> Vec<String> {
            self.parties.iter().zip(vector).filter(|(_, v)| wanted(**v)).map(|(p, _)| p.name.clone()).collect()
        };
        let absent = named(&|v| v == 0);
        if !absent.is_empty() {
            return Err(BalanceError::TakesNoPart { names: absent });
        }
        let moved = named(&|v| v < 0);
        let balanced = self.reaction(vector).ok_or(BalanceError::TooLarge)?;
        if moved.is_empty() { Ok(balanced) } else { Err(BalanceError::WrongSide { names: moved, otherwise: balanced }) }
    }

    /// The reaction of one vector: a species with a negative number is moved to the other side.
    fn reaction(&self, vector: &[i128]) -> Option<Balanced> {
        let (mut left, mut right) = (Vec::new(), Vec::new());
        for (at, (party, &coefficient)) in self.parties.iter().zip(vector).enumerate() {
            let size = i64::try_from(coefficient.checked_abs()?).ok()?;
            if size != 0 {
                let to_left = (at < self.on_left) == (coefficient > 0);
                let side = if to_left { &mut left } else { &mut right };
                side.push((size, party.name.clone()));
            }
        }
        Some(Balanced { left, right })
    }

    /// With no solution at all: what would have to give way for the rest to balance.
    fn obstacles(&self, conserved: &[Conserved]) -> Result<BalanceError, BalanceError> {
        let mut obstacles = Vec::new();
        for (at, &what) in conserved.iter().enumerate() {
            let others: Vec<Conserved> = [&conserved[..at], &conserved[at + 1..]].concat();
            let basis = self.null_space(&others)?;
            let [only] = basis.as_slice() else { continue };
            let Ok(otherwise) = self.one_solution(only) else { continue };
            let (on_left, on_right) = self.parties.split_at(self.on_left);
            let total = |parties: &[&Party], terms: &[(i64, String)]| {
                parties.iter().zip(terms).try_fold(Rational::ZERO, |sum, (party, &(size, _))| {
                    let amount = what.amount(&party.composition, party.charge);
                    sum.checked_add(amount.checked_mul(Rational::new(size, 1)?)?)
                })
            };
            let left = total(on_left, &otherwise.left).ok_or(BalanceError::TooLarge)?;
            let right = total(on_right, &otherwise.right).ok_or(BalanceError::TooLarge)?;
            obstacles.push(Obstacle { what, left, right, otherwise });
        }
        Ok(if obstacles.is_empty() {
            BalanceError::Contradiction { conserved: conserved.to_vec() }
        } else {
            BalanceError::Obstructed { obstacles }
        })
    }
}

/// Gauss-Jordan elimination on whole numbers, each row divided by its common divisor; `None` on overflow.
/// Returns the pivot column of each of the first rows; the rest become zero.
fn reduce(rows: &mut [Vec<i128>], columns: usize) -> Option<Vec<usize>> {
    let mut pivots = Vec::new();
    for column in 0..columns {
        let done = pivots.len();
        let Some(pivot) = (done..rows.len()).find(|&r| rows[r][column] != 0) else { continue };
        rows.swap(done, pivot);
        let pivot_row = rows[done].clone();
        for (r, row) in rows.iter_mut().enumerate() {
            if r == done || row[column] == 0 {
                continue;
            }
            let common = gcd(pivot_row[column], row[column]);
            let (keep, take) = (pivot_row[column] / common, row[column] / common);
            for (x, p) in row.iter_mut().zip(&pivot_row) {
                *x = keep.checked_mul(*x)?.checked_sub(take.checked_mul(*p)?)?;
            }
            divide_by_common(row);
        }
        pivots.push(column);
    }
    Some(pivots)
}

/// The solution with the free column set and the other free columns zero; the least whole numbers, so without a common
/// divisor.
fn null_vector(rows: &[Vec<i128>], pivots: &[usize], free: usize, columns: usize) -> Option<Vec<i128>> {
    // Row r says: pivot × x[pivot] + row[free] × x[free] = 0. x[free] is the least number that makes all x whole.
    let mut scale: i128 = 1;
    for (row, &pivot) in rows.iter().zip(pivots) {
        let needed = (row[pivot] / gcd(row[pivot], row[free])).checked_abs()?;
        scale = scale.checked_mul(needed / gcd(scale, needed))?;
    }
    let mut vector = vec![0; columns];
    vector[free] = scale;
    for (row, &pivot) in rows.iter().zip(pivots) {
        vector[pivot] = row[free].checked_mul(scale)?.checked_div(row[pivot])?.checked_neg()?;
    }
    let signs: i128 = vector.iter().map(|x| x.signum()).sum();
    let first = vector.iter().map(|x| x.signum()).find(|&sign| sign != 0).unwrap_or(1);
    let sign = if signs == 0 { first } else { signs.signum() };
    vector.into_iter().map(|x| x.checked_mul(sign)).collect()
}

fn divide_by_common(row: &mut [i128]) {
    let common = row.iter().fold(0, |common, &x| gcd(common, x));
    if common > 1 {
        row.iter_mut().for_each(|x| *x /= common);
    }
}

/// Balances the text of an equation; `compose` says what a named species is made of.
///
/// Coefficients in the text are replaced. Phases may be left out, if `compose` does without.
pub fn balance(text: &str, compose: &dyn Fn(&str) -> Result<Party, Fault>) -> Result<Balanced, Fault> {
    let text = EquationText::parse(text)?;
    let side = |terms: &[WrittenTerm]| -> Result<Vec<Party>, Fault> {
        terms.iter().map(|term| Ok(term.resolve(compose)?.1)).collect()
    };
    Ok(solve(&side(&text.left)?, &side(&text.right)?)?)
}

impl Party {
    /// A species whose base is a formula, with or without phase: a `compose` for [`balance`] that asks no records.
    pub fn from_formula(text: &str) -> Result<Party, Fault> {
        let SpeciesName { base, phase } = text.parse()?;
        let formula = Formula::parse(&base)?;
        let name = SpeciesName { base: formula.to_string(), phase }.to_string();
        Ok(Party { name, composition: formula.composition().clone(), charge: formula.charge() })
    }
}

/// `CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(g)`: text that is read as a reaction.
impl fmt::Display for Balanced {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let side = |terms: &[(i64, String)]| {
            let shown = terms.iter().map(|(n, name)| if *n == 1 { name.clone() } else { format!("{n} {name}") });
            shown.collect::<Vec<_>>().join(" + ")
        };
        write!(f, "{} -> {}", side(&self.left), side(&self.right))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn balanced(text: &str) -> String {
        balance(text, &Party::from_formula).unwrap_or_else(|fault| panic!("{text}: {fault}")).to_string()
    }

    fn refused(text: &str) -> Fault {
        balance(text, &Party::from_formula).expect_err(text)
    }

    #[test]
    fn equations_of_the_textbooks() {
        // Coefficients from memory; that they conserve atoms and charge is counted independently in tests/chem.rs.
        let rows = [
            ("CH4(g) + O2(g) -> CO2(g) + H2O(g)", "CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(g)"),
            ("7 CH4(g) + O2(g) -> CO2(g) + 3 H2O(g)", "CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(g)"),
            ("N2 + H2 -> NH3", "N2 + 3 H2 -> 2 NH3"),
            ("H2O(l) -> H2O(g)", "H2O(l) -> H2O(g)"),
            ("H2 + D2 -> HD", "H2 + D2 -> 2 HD"),
            ("Ag+ + e- -> Ag", "Ag+ + e- -> Ag"),
            ("CdSO4.8/3H2O -> CdSO4 + H2O", "3 CdSO4.8/3H2O -> 3 CdSO4 + 8 H2O"),
            ("Fe0.947O + O2 -> Fe2O3", "4000 Fe0.947O + 841 O2 -> 1894 Fe2O3"),
            ("MnO4- + Fe+2 + H+ -> Mn+2 + Fe+3 + H2O", "MnO4- + 5 Fe+2 + 8 H+ -> Mn+2 + 5 Fe+3 + 4 H2O"),
            (
                "MnO4-(aq) + C2O4-2(aq) + H+(aq) -> Mn+2(aq) + CO2(g) + H2O(l)",
                "2 MnO4-(aq) + 5 C2O4-2(aq) + 16 H+(aq) -> 2 Mn+2(aq) + 10 CO2(g) + 8 H2O(l)",
            ),
            ("Cr2O7-2 + C2H5OH + H+ -> Cr+3 + CO2 + H2O", "2 Cr2O7-2 + C2H5OH + 16 H+ -> 4 Cr+3 + 2 CO2 + 11 H2O"),
            (
                "K4Fe(CN)6 + KMnO4 + H2SO4 -> KHSO4 + Fe2(SO4)3 + MnSO4 + HNO3 + CO2 + H2O",
                "10 K4Fe(CN)6 + 122 KMnO4 + 299 H2SO4 -> \
                 162 KHSO4 + 5 Fe2(SO4)3 + 122 MnSO4 + 60 HNO3 + 60 CO2 + 188 H2O",
            ),
            (
                "[Cr(N2H4CO)6]4[Cr(CN)6]3 + KMnO4 + H2SO4 -> K2Cr2O7 + MnSO4 + CO2 + KNO3 + K2SO4 + H2O",
                "10 [Cr(N2H4CO)6]4[Cr(CN)6]3 + 1176 KMnO4 + 1399 H2SO4 -> \
                 35 K2Cr2O7 + 1176 MnSO4 + 420 CO2 + 660 KNO3 + 223 K2SO4 + 1879 H2O",
            ),
            (
                "H2 + Ca(CN)2 + NaAlF4 + FeSO4 + MgSiO3 + KI + H3PO4 + PbCrO4 + BrCl + CF2Cl2 + SO2 -> \
                 PbBr2 + CrCl3 + MgCO3 + KAl(OH)4 + Fe(SCN)3 + PI3 + Na2SiO3 + CaF2 + H2O",
                "88 H2 + 15 Ca(CN)2 + 6 NaAlF4 + 10 FeSO4 + 3 MgSiO3 + 6 KI + 2 H3PO4 + 6 PbCrO4 + 12 BrCl + 3 CF2Cl2 \
                 + 20 SO2 -> 6 PbBr2 + 6 CrCl3 + 3 MgCO3 + 6 KAl(OH)4 + 10 Fe(SCN)3 + 2 PI3 + 3 Na2SiO3 + 15 CaF2 \
                 + 79 H2O",
            ),
        ];
        for (text, expected) in rows {
            assert_eq!(balanced(text), expected);
        }
    }

    #[test]
    fn an_element_on_one_side_is_named() {
        let fault = refused("CH4 + O2 -> CO2 + H2O + NaCl");
        assert_eq!(fault.code(), "element-on-one-side");
        assert_eq!(fault.message(), "only the right side has Na, Cl");
        assert_eq!(fault.hint(), "add what holds Na, Cl to the left side, or check the formulas");
        assert_eq!(refused("H2 -> D2").message(), "only the left side has H");
    }

    #[test]
    fn an_element_or_charge_that_cannot_balance_is_named_with_both_counts() {
        let charge = refused("Ag+ -> Ag");
        assert_eq!(charge.code(), "cannot-balance-one");
        assert_eq!(
            charge.message(),
            "no coefficients balance charge (+1 on the left, 0 on the right in Ag+ -> Ag, where everything else balances)"
        );
        assert!(charge.hint().contains("e-"));
        let oxygen = refused("CaO2 -> CaO");
        assert!(oxygen.message().contains("Ca (1 on the left, 2 on the right in CaO2 -> 2 CaO"), "{oxygen}");
        assert!(oxygen.message().contains("O (2 on the left, 1 on the right in CaO2 -> CaO"), "{oxygen}");
        assert_eq!(refused("CaCO3 -> CaC2O").code(), "cannot-balance-together");
    }

    #[test]
    fn a_species_without_part_or_on_the_wrong_side_is_named() {
        let idle = refused("H2 + O2 + NaCl -> H2O + Na2Cl");
        assert_eq!(idle.message(), "the only coefficient that balances is 0 for NaCl, Na2Cl");
        let wrong = refused("CO + H2 -> CO2 + H2O");
        assert_eq!(wrong.message(), "the equation balances only with H2, H2O on the other side");
        assert_eq!(wrong.hint(), "write CO + H2O -> H2 + CO2");
    }

    #[test]
    fn independent_reactions_are_counted_and_shown() {
        let fault = refused("H2O2 + MnO4- + H+ -> Mn+2 + O2 + H2O");
        assert_eq!(fault.code(), "several-balances");
        assert!(fault.message().contains("a sum of 2 independent reactions"));
        // Whatever reactions the hint proposes must balance by themselves.
        let reactions = fault.hint().strip_prefix("split it, for instance into ").unwrap().to_owned();
        let reactions = reactions.strip_suffix(", and add them as the process runs").unwrap();
        for reaction in reactions.split("; ") {
            assert_eq!(balanced(reaction), reaction);
        }
        assert_eq!(refused("C + O2 -> CO + CO2").code(), "several-balances");
    }

    #[test]
    fn a_species_on_both_sides_is_refused_and_one_twice_on_a_side_counts_once() {
        assert_eq!(refused("H2O + C -> CO + H2 + H2O").code(), "species-on-both-sides");
        assert_eq!(balanced("H2 + H2 + O2 -> H2O"), "2 H2 + O2 -> 2 H2O");
    }

    #[test]
    fn numbers_past_the_range_are_refused_without_panic() {
        let huge = "C999999999999999999H999999999999999998";
        assert_eq!(refused(&format!("{huge} + O2 -> CO2 + H2O + C3H7O11")).code(), "balance-too-large");
        let chain = format!(
            "{huge} + C999999999999999989N999999999999999967 + N999999999999999877O999999999999999863 + O2 -> \
             C3H7N11O13 + CO2 + H2O + N2O5"
        );
        assert_eq!(refused(&chain).code(), "balance-too-large");
    }
}
