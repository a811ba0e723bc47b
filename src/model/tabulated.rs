//! A species with figures at 298.15 K alone, such as an ion in solution: what it contributes there, and beside it by holding Cp.
//!
//! H(T) − H(298.15 K) = Cp°(298.15 K) (T − 298.15 K)       S(T) = S°(298.15 K) + Cp°(298.15 K) ln(T/298.15 K)
//!
//! | symbol | unit      | meaning                                                                      |
//! |--------|-----------|------------------------------------------------------------------------------|
//! | Cp°    | J/(mol K) | heat capacity of a table; of a solute, of the ideal solution of 1 mol/kg      |
//! | S°     | J/(mol K) | entropy of a table, on the same basis                                         |
//!
//! Away from 298.15 K this is refused unless `heat_capacity: "constant"` is asked for and every such species has a heat
//! capacity. Every property of H+(aq) is zero by convention, at every temperature. The surprise: heat capacities of ions in
//! water change sign within 100 K, so the register leaves `aqueous-heat-capacity` untested and says so.
//! Source: definition of Cp; IUPAC Green Book, 3rd ed., section 2.11 (from memory).

use std::rc::Rc;
use std::sync::Arc;

use crate::chem::species::State as Aggregate;
use crate::data::dataset::Datum;
use crate::data::formation::Formation;
use crate::data::substance::Substance;
use crate::fault::Fault;
use crate::model::function::T_REFERENCE;
use crate::model::gather::{self, Contribution, Figure, GatherError, HeatCapacity, Slopes};
use crate::model::path::{self, Sort};
use crate::model::terms::{Term, Terms};
use crate::num::math;
use crate::record::node::{Input, LeafKey, Node};
use crate::source::Citation;

/// The convention that fixes the properties of ions in water.
const PROTON: &str = "H+(aq)";

/// Whether a term has figures at 298.15 K alone.
pub fn is_tabulated(term: &Term) -> bool {
    term.own.is_none() && term.substance.function.is_none()
}

/// Refuses what cannot be said away from 298.15 K, naming all species concerned.
///
/// # Errors
/// A heat capacity is missing, or one that is known at 298.15 K alone was to be integrated.
pub(super) fn refuse(terms: &Terms, t_k: f64, mode: HeatCapacity) -> Result<(), GatherError> {
    // What is neglected need not be known.
    if t_k == T_REFERENCE || mode == HeatCapacity::Neglected {
        return Ok(());
    }
    let tabulated = || terms.terms().iter().filter(|term| is_tabulated(term));
    let named = |terms: Vec<&Term>| terms.iter().map(|term| term.substance.id()).collect::<Vec<_>>().join(", ");
    let missing: Vec<&Term> = tabulated().filter(|term| heat_capacity(&term.substance).is_none()).collect();
    if !missing.is_empty() {
        return Err(GatherError::NoFunction { species: named(missing), t_k });
    }
    if mode != HeatCapacity::Constant && tabulated().next().is_some() {
        return Err(GatherError::ConstantOnly { species: named(tabulated().collect()), t_k });
    }
    Ok(())
}

/// What one term contributes at `t_k`, which [`refuse`] has let pass.
///
/// # Errors
/// It has no heat capacity where one is needed.
pub(super) fn contribution(
    term: &Term,
    formation: Figure,
    t_k: f64,
    mode: HeatCapacity,
) -> Result<Contribution, Fault> {
    let substance = &term.substance;
    let (entropy, cp) = (entropy(substance), heat_capacity(substance));
    let at_reference = Contribution { nu: term.nu, formation, increment: None, entropy, cp, slopes: Slopes::default() };
    if t_k == T_REFERENCE {
        return Ok(at_reference);
    }
    if mode == HeatCapacity::Neglected {
        return Ok(Contribution { increment: Some(Figure::of_nodes(0.0, [])), ..at_reference });
    }
    let species = || substance.id().to_owned();
    let Some(cp) = at_reference.cp.as_ref().filter(|_| mode == HeatCapacity::Constant) else {
        return Err(GatherError::NoFunction { species: species(), t_k }.into());
    };
    let (span, ln_ratio) = (t_k - T_REFERENCE, math::ln(t_k / T_REFERENCE));
    let cp_node = node(cp)?;
    let entropy = match &at_reference.entropy {
        Some(at_0) => {
            let nodes = [(node(at_0)?, 1.0), (Rc::clone(&cp_node), ln_ratio)];
            Some(Figure::of_nodes(at_0.si + cp.si * ln_ratio, nodes))
        }
        None => None,
    };
    let slopes = Slopes { increment: cp.si, entropy: cp.si / t_k, cp: 0.0 };
    let increment = Some(Figure::of_nodes(cp.si * span, [(cp_node, span)]));
    Ok(Contribution { increment, entropy, slopes, ..at_reference })
}

/// A figure per kelvin as an input of what is computed from it.
fn node(figure: &Figure) -> Result<Rc<Node>, Fault> {
    match &figure.origin {
        gather::FigureOrigin::Input(input) => path::input_node(figure.si, (**input).clone(), Sort::PerKelvin),
        gather::FigureOrigin::Nodes(_) => unreachable!("a printed figure is an input"),
    }
}

/// The entropy at 298.15 K of the first table that has it.
pub(super) fn entropy(substance: &Substance) -> Option<Figure> {
    printed(substance, gather::ENTROPY, |record| record.s.as_ref())
}

/// The heat capacity at 298.15 K of the first table that has it.
fn heat_capacity(substance: &Substance) -> Option<Figure> {
    let found = printed(substance, gather::HEAT_CAPACITY, |record| record.cp.as_ref());
    let by_convention = || {
        let is_proton = substance.species.phase.state == Aggregate::Aqueous && substance.id() == PROTON;
        let record = substance.formations.first().filter(|_| is_proton)?;
        let citation = Some(Citation::new("convention: every property of H+(aq) is zero", ""));
        let input = Input { u: Some(0.0), citation, ..Input::of(key(substance, record, gather::HEAT_CAPACITY)) };
        Some(Figure { si: 0.0, origin: input.into(), printed: Some("0".into()) })
    };
    found.or_else(by_convention)
}

fn printed(substance: &Substance, field: &'static str, of: impl Fn(&Formation) -> Option<&Datum>) -> Option<Figure> {
    let (record, datum) = substance.formations.iter().find_map(|record| Some((record, of(record)?)))?;
    let digit = if datum.is_convention() { None } else { Some(datum.last_place) };
    let citation = Some(record.citation.clone());
    let input = Input { u: datum.u, digit, citation, ..Input::of(key(substance, record, field)) };
    Some(Figure { si: datum.value, origin: input.into(), printed: Some(datum.printed.clone()) })
}

fn key(substance: &Substance, record: &Arc<Formation>, field: &'static str) -> LeafKey {
    let (dataset, record) = (record.dataset.shared(), substance.species.id.clone());
    LeafKey::Datum { dataset, record, field, t_bits: 0, way: "" }
}

#[cfg(test)]
mod tests {
    use std::cell::Cell;
    use std::collections::BTreeMap;

    use super::*;
    use crate::data::catalog::Catalog;
    use crate::model::card::{self, Card, Cx, References, Value};
    use crate::model::property_card::{ENTHALPY, ENTROPY, GIBBS_ENERGY, HEAT_CAPACITY};
    use crate::model::reaction::REACTION;
    use crate::model::review;
    use crate::quantity::Quantity;
    use crate::source::Embedded;
    use crate::units::constants;

    /// Ions and a salt with invented figures; one ion has no heat capacity.
    fn invented() -> Arc<Catalog> {
        let record = |id: &str, formula: &str, dhf: &str, s: &str, cp: Option<(&str, &str)>| {
            let cp =
                cp.map_or_else(String::new, |(value, u)| format!(r#""cp_298": {{"value": "{value}", "u": "{u}"}},"#));
            format!(
                r#"{{"id": "{id}", "formula": "{formula}", "dhf_298": {{"value": "{dhf}", "u": "0.000"}},
                "s_298": {{"value": "{s}", "u": "0.1"}}, {cp}
                "source": "invented for this test", "obtained": "", "confirmation": "single source"}}"#
            )
        };
        let records = [
            record("Ag+(aq)", "Ag+", "100.0", "70.0", Some(("20.0", "3.0"))),
            record("Cl-(aq)", "Cl-", "-160.0", "50.0", Some(("-140.0", "4.0"))),
            record("AgCl(cr)", "AgCl", "-130.0", "90.0", Some(("60.0", "0.0"))),
            record("H+(aq)", "H+", "0", "0", None),
            record("Br-(aq)", "Br-", "-120.0", "80.0", None),
            record("AgBr(cr)", "AgBr", "-100.0", "100.0", Some(("50.0", "0.0"))),
            record("HCl(g)", "HCl", "-92.0", "187.0", Some(("29.0", "0.0"))),
        ];
        let text = format!(
            r#"{{"schema": "hessbook-formation/1", "dataset": {{"id": "invented", "short": "invented",
            "publication": "none", "terms": "none", "uncertainty": "standard", "divisor": 1, "rank": 1}},
            "title": "invented", "p_standard_pa": 100000, "records": [{}]}}"#,
            records.join(", ")
        );
        let file = Embedded { path: "invented.json", bytes: text.leak().as_bytes(), sha256: "" };
        Arc::new(Catalog::from_files(&[file]).unwrap())
    }

    fn asked<T>(
        data: Option<Arc<Catalog>>,
        card: &'static Card,
        (equation, t, heat_capacity): (&str, &str, &str),
        look: impl FnOnce(&Cx, &Quantity) -> T,
    ) -> Result<T, Fault> {
        let constants = constants::current();
        let references = data.map_or_else(|| References::new(constants), |data| References::of(data, constants));
        let ordinal = Cell::new(0);
        let cx = Cx { references: &references, place: None, ordinal: &ordinal, halted: &|| None };
        let reaction = card::call(&cx, &REACTION, vec![Value::Text(equation.into())])?;
        let options = BTreeMap::from([("heat_capacity".to_owned(), Value::Text(heat_capacity.into()))]);
        match card::call(&cx, card, vec![reaction, Value::Text(t.into()), Value::Options(Rc::new(options))])? {
            Value::Quantity(value) => Ok(look(&cx, &value)),
            other => panic!("{}", other.sort()),
        }
    }

    const SALT: &str = "Ag+(aq) + Cl-(aq) -> AgCl(cr)";

    #[test]
    fn with_constant_heat_capacities_ions_are_known_beside_298_k() {
        let of = |card, t| asked(Some(invented()), card, (SALT, t, "constant"), |_, value| value.clone()).unwrap();
        // By hand: ΔrH(298) = -70 kJ/mol, ΔrS = -30 and ΔrCp = +180 J/(K mol). Bound: rounding.
        let (span, ln_ratio) = (350.0 - 298.15, f64::ln(350.0 / 298.15));
        let h = of(&ENTHALPY, "350 K");
        assert!((h.si() - (-70_000.0 + 180.0 * span)).abs() < 1e-9, "{}", h.si());
        // The heat capacities bring their u in proportion to the distance: 5 J/(K mol) from 3 and 4. Bound: what is printed as
        // zero counts as half a digit, which adds 0.0003 in quadrature.
        let u = h.spread().u().unwrap() / span;
        assert!((u - 5.0).abs() < 0.001, "{u}");
        assert!((of(&ENTROPY, "350 K").si() - (-30.0 + 180.0 * ln_ratio)).abs() < 1e-10);
        let g = -70_000.0 + 180.0 * span - 350.0 * (-30.0 + 180.0 * ln_ratio);
        assert!((of(&GIBBS_ENERGY, "350 K").si() - g).abs() < 1e-9);
        assert!((of(&HEAT_CAPACITY, "350 K").si() - 180.0).abs() < 1e-12);
        assert!((of(&HEAT_CAPACITY, "298.15 K").si() - 180.0).abs() < 1e-12);
        assert!((of(&ENTHALPY, "298.15 K").si() + 70_000.0).abs() < 1e-9);
    }

    #[test]
    fn the_register_says_that_nothing_tests_it() {
        let rows = asked(Some(invented()), &ENTHALPY, (SALT, "350 K", "constant"), review::rows).unwrap();
        let row = rows.iter().map(|(_, row)| row).find(|row| row.id == "aqueous-heat-capacity").unwrap();
        assert_eq!((row.status.word(), &*row.subject), ("untested", "Ag+(aq), Cl-(aq)"));
        assert!(row.note.contains("0.52 kJ/mol"), "{}", row.note);
        let at_298 = asked(Some(invented()), &ENTHALPY, (SALT, "298.15 K", "constant"), review::rows).unwrap();
        assert!(at_298.iter().all(|(_, row)| row.id != "aqueous-heat-capacity"));
    }

    #[test]
    fn the_proton_is_zero_at_every_temperature() {
        let h = asked(Some(invented()), &ENTHALPY, ("HCl(g) -> H+(aq) + Cl-(aq)", "350 K", "constant"), |_, v| v.si());
        let by_hand = -68_000.0 + (-140.0 - 29.0) * (350.0 - 298.15);
        assert!((h.unwrap() - by_hand).abs() < 1e-9);
    }

    #[test]
    fn what_is_missing_is_named_and_nothing_is_integrated_that_is_known_at_one_temperature() {
        let refused = |data: Option<Arc<Catalog>>, equation: &str, mode: &str| {
            asked(data, &ENTHALPY, (equation, "350 K", mode), |_, _| ()).unwrap_err()
        };
        let integrated = refused(Some(invented()), SALT, "full");
        assert_eq!(integrated.code(), "heat-capacity-at-298-only");
        assert!(integrated.message().contains("Ag+(aq), Cl-(aq), AgCl(cr)"), "{integrated}");
        let missing = refused(Some(invented()), "Ag+(aq) + Br-(aq) -> AgBr(cr)", "constant");
        assert_eq!(missing.code(), "heat-capacity-missing");
        assert!(missing.message().contains("of Br-(aq) is"), "{missing}");
        // No table with heat capacities of ions may be shipped, so the shipped data refuse all but 298.15 K.
        let shipped = refused(None, "Ag+(aq) + Cl-(aq) -> AgCl(cr)", "constant");
        assert_eq!(shipped.code(), "heat-capacity-missing");
        assert!(shipped.message().contains("Ag+(aq), Cl-(aq)"), "{shipped}");
    }
}
