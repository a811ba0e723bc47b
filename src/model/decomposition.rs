//! The most stable things a substance could fall apart into, among elements, oxides and simple molecules on record.
//!
//! min Σ nⱼ Gⱼ(T)       with Σ nⱼ aₑⱼ = aₑ for each element e, all nⱼ ≥ 0
//!
//! | symbol | unit  | meaning                                                                      |
//! |--------|-------|------------------------------------------------------------------------------|
//! | nⱼ     | 1     | moles of product j per mole of the substance                                 |
//! | Gⱼ     | J/mol | of the pure product at T and its standard pressure, by its function          |
//! | aₑ     | 1     | atoms of element e in the substance; aₑⱼ in product j                        |
//!
//! A linear programme with as many equations as elements, so its optimum has at most that many products: all such choices
//! are tried, which are few. The surprise: a Gibbs energy says what could happen, never how fast.
//! Source: the second law at constant T and p; linear programming (from memory).

use std::sync::Arc;

use crate::chem::element::Element;
use crate::chem::species::State;
use crate::data::catalog::Catalog;
use crate::data::substance::Substance;
use crate::model::function;
use crate::quantity::round;

/// Simple molecules that substances fall apart into, besides elements and the oxides of elements (common practice, no source).
const SIMPLE: [&str; 19] = [
    "H2O(g)", "H2O(l)", "CO(g)", "CO2(g)", "CH4(g)", "NH3(g)", "N2O(g)", "NO(g)", "NO2(g)", "HCl(g)", "HF(g)",
    "HBr(g)", "HI(g)", "H2S(g)", "SO2(g)", "SO3(g)", "COS(g)", "CF4(g)", "SiF4(g)",
];

/// What a salt gives off without a change of oxidation number, so that nothing but heat is needed.
const GIVEN_OFF: [&str; 8] = ["H2O(g)", "CO2(g)", "SO3(g)", "NH3(g)", "HCl(g)", "HF(g)", "HBr(g)", "HI(g)"];

/// Which products are looked at.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Products {
    /// Elements, oxides and simple molecules.
    All,
    /// Solid and liquid oxides, and what salts give off.
    GivenOff,
}

/// One way of falling apart.
pub struct Decomposition {
    from: Arc<Substance>,
    products: Vec<(f64, Arc<Substance>)>,
    /// Gibbs energy of the products less that of the substance, J/mol of it.
    pub dg: f64,
}

impl Decomposition {
    /// The way of lowest Gibbs energy; `None` where no choice of products makes up the substance, or its function does not reach T.
    pub fn most_stable(from: &Arc<Substance>, which: Products, t_k: f64, data: &Catalog) -> Option<Decomposition> {
        let own = g(from, t_k)?;
        let elements: Vec<(Element, f64)> =
            from.species.composition.iter().map(|(element, count)| (element, count.to_f64())).collect();
        let candidates = candidates(from, &elements, which, t_k, data);
        let mut best: Option<(f64, Vec<(usize, f64)>)> = None;
        let mut choice = Vec::with_capacity(elements.len());
        each_choice(candidates.len(), elements.len(), 0, &mut choice, &mut |choice| {
            let Some(amounts) = amounts(choice, &candidates, &elements) else { return };
            let sum: f64 = choice.iter().zip(&amounts).map(|(at, n)| n * candidates[*at].g).sum();
            if best.as_ref().is_none_or(|(least, _)| sum < *least) {
                best = Some((sum, choice.iter().copied().zip(amounts).filter(|(_, n)| *n > 1e-9).collect()));
            }
        });
        let (sum, chosen) = best?;
        let products = chosen.into_iter().map(|(at, n)| (n, Arc::clone(&candidates[at].substance))).collect();
        Some(Decomposition { from: Arc::clone(from), products, dg: sum - own })
    }

    /// `CaCO3(cr,calcite) -> CaO(cr,lime) + CO2(g), ΔG° = -3.2 kJ/mol`.
    pub fn words(&self) -> String {
        let product = |(n, substance): &(f64, Arc<Substance>)| {
            let n: f64 = round::significant(*n, 5).parse().unwrap_or(*n);
            if n == 1.0 { substance.id().to_owned() } else { format!("{} {}", round::shortest(n), substance.id()) }
        };
        let products = self.products.iter().map(product).collect::<Vec<_>>().join(" + ");
        format!("{} -> {products}, ΔG° = {:.1} kJ/mol", self.from.id(), self.dg / 1000.0)
    }
}

struct Candidate {
    substance: Arc<Substance>,
    g: f64,
    /// Atoms of each element of the substance that falls apart, in its order.
    atoms: Vec<f64>,
}

fn g(substance: &Substance, t_k: f64) -> Option<f64> {
    let function = substance.function.as_ref().filter(|function| function.covers(t_k))?;
    Some(function::evaluate(function, t_k).g(t_k))
}

/// Products made of nothing but the elements at hand: of each substance the phase of lowest Gibbs energy, and of each element
/// the form of lowest Gibbs energy per atom.
fn candidates(
    from: &Substance,
    elements: &[(Element, f64)],
    which: Products,
    t_k: f64,
    data: &Catalog,
) -> Vec<Candidate> {
    let mut found: Vec<Candidate> = Vec::new();
    for substance in data.substances() {
        let species = &substance.species;
        let inside = species.composition.iter().all(|(element, _)| elements.iter().any(|(own, _)| *own == element));
        if !inside || species.charge != 0 || species.entity == from.species.entity || !is_product(substance, which) {
            continue;
        }
        let Some(g) = g(substance, t_k) else { continue };
        let atoms: Vec<f64> = elements.iter().map(|(e, _)| species.composition.count(*e).to_f64()).collect();
        let new = Candidate { substance: Arc::clone(substance), g, atoms };
        let is_element = species.composition.len() == 1;
        let rival = found.iter_mut().find(|known| match is_element {
            true => known.substance.species.composition.len() == 1 && shares(&known.atoms, &new.atoms),
            false => known.substance.species.entity == species.entity,
        });
        match rival {
            None => found.push(new),
            Some(known) => {
                let per_atom = |candidate: &Candidate| candidate.g / candidate.atoms.iter().sum::<f64>();
                if per_atom(&new) < per_atom(known) {
                    *known = new;
                }
            }
        }
    }
    found
}

fn shares(a: &[f64], b: &[f64]) -> bool {
    a.iter().zip(b).any(|(a, b)| *a > 0.0 && *b > 0.0)
}

fn is_product(substance: &Substance, which: Products) -> bool {
    let species = &substance.species;
    let condensed = matches!(species.phase.state, State::Liquid | State::Crystal);
    let oxide = species.composition.len() == 2
        && species.composition.iter().any(|(element, _)| element.symbol() == "O")
        && !species.composition.iter().any(|(element, _)| element.symbol() == "H");
    match which {
        Products::All => {
            (species.composition.len() == 1 && (condensed || species.is_gas()))
                || SIMPLE.contains(&substance.id())
                || (condensed && oxide)
        }
        Products::GivenOff => GIVEN_OFF.contains(&substance.id()) || (condensed && oxide),
    }
}

/// Calls `work` with every choice of at most `most` of `count` things, in rising order.
fn each_choice(count: usize, most: usize, from: usize, choice: &mut Vec<usize>, work: &mut dyn FnMut(&[usize])) {
    if !choice.is_empty() {
        work(choice);
    }
    if choice.len() == most {
        return;
    }
    for at in from..count {
        choice.push(at);
        each_choice(count, most, at + 1, choice, work);
        choice.pop();
    }
}

/// The amounts of the chosen products that make up the substance, all positive; `None` where there are none.
fn amounts(choice: &[usize], candidates: &[Candidate], elements: &[(Element, f64)]) -> Option<Vec<f64>> {
    // Elimination with the equations as rows: one for each element, the last column is what is wanted.
    let unknowns = choice.len();
    let mut rows: Vec<Vec<f64>> = (elements.iter().enumerate())
        .map(|(e, (_, wanted))| choice.iter().map(|at| candidates[*at].atoms[e]).chain([*wanted]).collect())
        .collect();
    for column in 0..unknowns {
        let size = |row: &Vec<f64>| row[column].abs();
        let pivot = (column..rows.len()).max_by(|a, b| size(&rows[*a]).total_cmp(&size(&rows[*b])))?;
        if size(&rows[pivot]) < 1e-9 {
            return None;
        }
        rows.swap(column, pivot);
        let leading = rows[column].clone();
        for (_, row) in rows.iter_mut().enumerate().filter(|(at, _)| *at != column) {
            let factor = row[column] / leading[column];
            row.iter_mut().zip(&leading).for_each(|(value, leading)| *value -= factor * leading);
        }
    }
    // Rows beyond the unknowns must be met by what was found.
    if rows[unknowns..].iter().any(|row| row[unknowns].abs() > 1e-9) {
        return None;
    }
    let found: Vec<f64> = rows[..unknowns].iter().enumerate().map(|(at, row)| row[unknowns] / row[at]).collect();
    found.iter().all(|n| *n > 1e-9).then_some(found)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn most_stable(id: &str, which: Products, t_k: f64) -> Option<Decomposition> {
        let data = Catalog::shipped();
        Decomposition::most_stable(&data.find(id).unwrap(), which, t_k, &data)
    }

    #[test]
    fn carbonates_and_hydroxides_give_off_their_gas_where_its_pressure_reaches_a_bar() {
        // Temperatures of 1 bar, in K: calcite 1160 to 1170 (K. H. Stern, E. L. Weise, NSRDS-NBS 30, 1969, from memory),
        // portlandite 785 to 795 and brucite 535 to 550 (JANAF tables, from memory). Bound: 3 kJ/mol between tables over
        // 145 J/(mol K) is 20 K.
        for (id, low, high) in [
            ("CaCO3(cr,calcite)", 1140.0, 1190.0),
            ("Ca(OH)2(cr,portlandite)", 765.0, 815.0),
            ("Mg(OH)2(cr,brucite)", 515.0, 570.0),
        ] {
            let dg = |t_k| most_stable(id, Products::GivenOff, t_k).unwrap().dg;
            assert!(dg(low) > 0.0 && dg(high) < 0.0, "{id}: {} and {} J/mol", dg(low), dg(high));
        }
        let found = most_stable("CaCO3(cr,calcite)", Products::GivenOff, 1200.0).unwrap();
        assert!(found.words().starts_with("CaCO3(cr,calcite) -> "), "{}", found.words());
        assert!(found.words().contains("CaO(cr,lime)") && found.words().contains("CO2(g)"), "{}", found.words());
        // It is not carbon and oxygen that come of it: nothing is given off that changes an oxidation number.
        assert!(most_stable("NaNO3(cr,alpha)", Products::GivenOff, 500.0).is_none());
    }

    #[test]
    fn what_gas_molecules_could_become() {
        // 2 CO = C + CO2 is downhill up to 970 to 980 K (Boudouard; JANAF tables, from memory); 20 K for 3 kJ/mol over 175 J/(mol K).
        let carbon_monoxide = |t_k| most_stable("CO(g)", Products::All, t_k).unwrap();
        assert!(carbon_monoxide(955.0).dg < 0.0 && carbon_monoxide(995.0).dg > 0.0);
        assert!(carbon_monoxide(700.0).words().contains("0.5 C(cr,graphite)"), "{}", carbon_monoxide(700.0).words());
        // 2 NH3 = N2 + 3 H2 has K = 1 near 455 to 470 K (JANAF tables, from memory).
        let ammonia = |t_k| most_stable("NH3(g)", Products::All, t_k).unwrap().dg;
        assert!(ammonia(445.0) > 0.0 && ammonia(480.0) < 0.0, "{} {}", ammonia(445.0), ammonia(480.0));
        // Water and carbon dioxide are what others fall apart into.
        assert!(most_stable("H2O(g)", Products::All, 1000.0).unwrap().dg > 0.0);
        assert!(most_stable("CO2(g)", Products::All, 1000.0).unwrap().dg > 0.0);
        // An element in its stable form has only its atoms to become; another form of it has better.
        assert!(most_stable("N2(g)", Products::All, 500.0).unwrap().dg > 0.0);
        assert!(most_stable("O3(g)", Products::All, 300.0).unwrap().dg < 0.0);
    }
}
