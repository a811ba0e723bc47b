//! Reactions: cycles close, state functions hang together, and what does not balance is refused.
//!
//! Equations are generated here from a small table of atoms counted by hand, so that balance is known without the library.

use std::collections::BTreeMap;

use proptest::prelude::*;

use crate::asking::Desk;
use crate::{Integral, check, integral, near};
use hessbook::data::catalog::Catalog;
use hessbook::fault::Fault;
use hessbook::model::card::Card;
use hessbook::model::function;
use hessbook::model::property_card::{
    ENTHALPY, ENTROPY, EQUILIBRIUM_CONSTANT, GIBBS_ENERGY, HEAT_CAPACITY, HELMHOLTZ_ENERGY, INTERNAL_ENERGY,
};
use hessbook::num::math::ln;
use hessbook::quantity::Quantity;
use hessbook::record::spread::Spread;

/// Atoms of C, H, O and N, counted by hand. All gases, each with a function from 200 to 6000 K.
const SPECIES: [(&str, [i64; 4]); 16] = [
    ("CH4(g)", [1, 4, 0, 0]),
    ("CO(g)", [1, 0, 1, 0]),
    ("CO2(g)", [1, 0, 2, 0]),
    ("H2O(g)", [0, 2, 1, 0]),
    ("C2H2(g)", [2, 2, 0, 0]),
    ("C2H4(g)", [2, 4, 0, 0]),
    ("C2H6(g)", [2, 6, 0, 0]),
    ("propane(g)", [3, 8, 0, 0]),
    ("methanol(g)", [1, 4, 1, 0]),
    ("ethanol(g)", [2, 6, 1, 0]),
    ("dimethyl ether(g)", [2, 6, 1, 0]),
    ("formaldehyde(g)", [1, 2, 1, 0]),
    ("NH3(g)", [0, 3, 0, 1]),
    ("NO(g)", [0, 0, 1, 1]),
    ("N2O(g)", [0, 0, 1, 2]),
    ("benzene(g)", [6, 6, 0, 0]),
];

/// Reference elements, and how many atoms each molecule has of its own.
const ELEMENTS: [(&str, i64); 4] = [("C(cr,graphite)", 1), ("H2(g)", 2), ("O2(g)", 2), ("N2(g)", 2)];

/// Stoichiometric numbers in halves, by index: species first, then elements.
pub type Halves = BTreeMap<usize, i64>;

pub fn name(at: usize) -> &'static str {
    SPECIES.get(at).map_or_else(|| ELEMENTS[at - SPECIES.len()].0, |(name, _)| *name)
}

fn is_gas(at: usize) -> bool {
    name(at).ends_with("(g)")
}

/// The elements that balance some species, added to them.
fn balanced(species: &[(usize, i64)]) -> Halves {
    let mut halves: Halves = BTreeMap::new();
    for (at, nu) in species {
        *halves.entry(*at).or_default() += 2 * nu;
        for (element, (_, in_molecule)) in ELEMENTS.iter().enumerate() {
            *halves.entry(SPECIES.len() + element).or_default() -= 2 * nu * SPECIES[*at].1[element] / in_molecule;
        }
    }
    halves.retain(|_, nu| *nu != 0);
    halves
}

/// `a` times one and `b` times the other.
fn combined(one: &Halves, a: i64, other: &Halves, b: i64) -> Halves {
    let mut halves = Halves::new();
    for (reaction, factor) in [(one, a), (other, b)] {
        reaction.iter().for_each(|(at, nu)| *halves.entry(*at).or_default() += factor * nu);
    }
    halves.retain(|_, nu| *nu != 0);
    halves
}

pub fn equation(halves: &Halves) -> String {
    let side = |sign: i64| {
        let term = |(at, nu): (&usize, &i64)| match (nu.abs() / 2, nu.abs() % 2) {
            (whole, 0) => format!("{whole} {}", name(*at)),
            _ => format!("{}/2 {}", nu.abs(), name(*at)),
        };
        let terms: Vec<String> = halves.iter().filter(|(_, nu)| nu.signum() == sign).map(term).collect();
        terms.join(" + ")
    };
    format!("{} -> {}", side(-1), side(1))
}

pub fn delta_n(halves: &Halves) -> f64 {
    halves.iter().filter(|(at, _)| is_gas(**at)).map(|(_, nu)| *nu as f64 / 2.0).sum()
}

/// Sum of |ν H| and of |ν S|: what rounding is measured by.
pub fn sizes(halves: &Halves, t_k: f64) -> (f64, f64) {
    let at = |at: &usize| {
        let substance = Catalog::shipped().find(name(*at)).unwrap();
        let of = function::evaluate(substance.function.as_ref().unwrap(), t_k);
        (of.h.abs() + of.cp * t_k, of.s)
    };
    let terms = halves.iter().map(|(index, nu)| (at(index), nu.abs() as f64 / 2.0));
    terms.fold((0.0, 0.0), |(h, s), (of, nu)| (h + nu * of.0, s + nu * of.1))
}

pub fn reaction() -> impl Strategy<Value = Halves> {
    let term = (0..SPECIES.len(), prop_oneof![-4i64..=-1, 1i64..=4]);
    proptest::collection::vec(term, 1..4)
        .prop_map(|terms| balanced(&terms))
        .prop_filter("nothing is left of it", |halves| !halves.is_empty())
}

/// Ranges in which no function of the table joins another interval: graphite joins at 600 and 2000 K, the gases at 1000 K.
const SMOOTH: [(f64, f64); 3] = [(200.0, 600.0), (600.0, 1000.0), (1000.0, 2000.0)];

/// A temperature well inside one smooth range.
pub fn temperature() -> impl Strategy<Value = f64> {
    (0..SMOOTH.len(), 0.01..0.99)
        .prop_map(|(range, share)| SMOOTH[range].0 + share * (SMOOTH[range].1 - SMOOTH[range].0))
}

pub fn kelvin(t_k: f64) -> String {
    format!("{t_k} K")
}

/// The report's own formation enthalpies, since it has all species of the table.
pub const ONE_DATASET: (&str, &str) = ("formation", "nasa-tp-2002-211556");

fn at(desk: &Desk, card: &'static Card, halves: &Halves, t_k: f64) -> Quantity {
    let options: &[(&str, &str)] = if matches!(card.name, "entropy" | "heat_capacity") { &[] } else { &[ONE_DATASET] };
    let text = equation(halves);
    desk.ask(card, &text, &kelvin(t_k), options).unwrap_or_else(|fault| panic!("{text} at {t_k} K: {fault}"))
}

/// Relative to the sum of |ν H|: some dozens of roundings.
const ROUNDING: f64 = 1e-12;

#[test]
fn cycles_close_whatever_they_are_made_of() {
    let desk = Desk::new();
    let factor = || prop_oneof![-3i64..=-1, 1i64..=3];
    check(120, &(reaction(), reaction(), factor(), factor(), temperature()), |(one, other, a, b, t_k)| {
        let sum = combined(&one, a, &other, b);
        prop_assume!(!sum.is_empty());
        let (h_one, s_one) = sizes(&one, t_k);
        let (h_other, s_other) = sizes(&other, t_k);
        let (h, s) =
            (a.abs() as f64 * h_one + b.abs() as f64 * h_other, a.abs() as f64 * s_one + b.abs() as f64 * s_other);
        for (card, size) in [
            (&ENTHALPY, h),
            (&INTERNAL_ENERGY, h),
            (&GIBBS_ENERGY, h + t_k * s),
            (&HELMHOLTZ_ENERGY, h + t_k * s),
            (&ENTROPY, s),
            (&HEAT_CAPACITY, s),
        ] {
            let (x, y) = (at(&desk, card, &one, t_k), at(&desk, card, &other, t_k));
            let path = x.scaled(a as f64, None).unwrap().plus(&y.scaled(b as f64, None).unwrap(), None).unwrap();
            near(card.name, path.si(), at(&desk, card, &sum, t_k).si(), ROUNDING * size)?;
        }
        Ok(())
    });
}

#[test]
fn the_u_of_a_cycle_is_that_of_the_reaction_it_adds_up_to() {
    // ATcT 1.112 has these with their u. What cancels in the sum must cancel in u: the inputs are the same figures.
    let desk = Desk::new();
    let covered = ["CH4(g)", "CO(g)", "CO2(g)", "H2O(g)", "C2H4(g)", "methanol(g)", "NH3(g)", "NO(g)"];
    let index = |name: &str| SPECIES.iter().position(|(known, _)| *known == name).unwrap();
    let term = (0..covered.len(), prop_oneof![-3i64..=-1, 1i64..=3]);
    let terms = || proptest::collection::vec(term.clone(), 1..4);
    check(60, &(terms(), terms(), -3i64..=3), |(one, other, b)| {
        let chosen = |terms: &[(usize, i64)]| {
            balanced(&terms.iter().map(|(at, nu)| (index(covered[*at]), *nu)).collect::<Vec<_>>())
        };
        let (one, other) = (chosen(&one), chosen(&other));
        let sum = combined(&one, 1, &other, b);
        prop_assume!(!one.is_empty() && !other.is_empty() && !sum.is_empty());
        let ask = |halves: &Halves| {
            desk.ask(&ENTHALPY, &equation(halves), "298.15 K", &[("formation", "atct-1.112")]).unwrap()
        };
        let path = ask(&one).plus(&ask(&other).scaled(b as f64, None).unwrap(), None).unwrap();
        let [along, direct] = [&path, &ask(&sum)].map(|value| value.spread().u().unwrap());
        // By hand: |ν| u of each species in quadrature, the elements having none.
        let u = |at: &usize| {
            let substance = Catalog::shipped().find(name(*at)).unwrap();
            let atct = substance.formations.iter().find(|f| f.dataset.as_str() == "atct-1.112");
            atct.and_then(|formation| formation.dhf.u).unwrap_or(0.0)
        };
        let by_hand: f64 = sum.iter().map(|(at, nu)| *nu as f64 / 2.0 * u(at)).map(|part| part * part).sum();
        // A species that cancels may leave a rounding of its weight behind.
        near("u along the path", along, f64::sqrt(by_hand), 1e-9 * f64::sqrt(by_hand) + 1e-9)?;
        near("u of the sum", direct, f64::sqrt(by_hand), 1e-9 * f64::sqrt(by_hand) + 1e-9)
    });
}

#[test]
fn figures_of_two_datasets_do_not_cancel_as_if_they_were_one() {
    // H2O(l), half of the printed 95 % figures: 0.040 kJ/mol in CODATA Key Values 1989, 0.027 kJ/mol in ATcT 1.112 (from a
    // machine-readable copy). The elements have none by convention, in both.
    let desk = Desk::new();
    let formed =
        |dataset| desk.ask(&ENTHALPY, "H2(g) + 1/2 O2(g) -> H2O(l)", "298.15 K", &[("formation", dataset)]).unwrap();
    let (codata, atct) = (formed("codata-1989"), formed("atct-1.112"));
    let u = codata.minus(&atct, None).unwrap().spread().u().unwrap();
    assert!((u - f64::sqrt(20.0 * 20.0 + 13.5 * 13.5)).abs() < 1e-9, "{u} J/mol");
    let again = codata.minus(&formed("codata-1989"), None).unwrap().spread();
    assert_eq!(again, Spread::Full(0.0));
}

#[test]
fn a_reaction_read_backwards_has_the_opposite_properties_and_the_inverse_constant() {
    let desk = Desk::new();
    check(60, &(reaction(), temperature()), |(forwards, t_k)| {
        let backwards: Halves = forwards.iter().map(|(at, nu)| (*at, -nu)).collect();
        let (h, s) = sizes(&forwards, t_k);
        for (card, size) in [(&ENTHALPY, h), (&GIBBS_ENERGY, h + t_k * s), (&ENTROPY, s), (&HEAT_CAPACITY, s)] {
            let (x, y) = (at(&desk, card, &forwards, t_k), at(&desk, card, &backwards, t_k));
            near(card.name, x.si(), -y.si(), ROUNDING * size)?;
            prop_assert_eq!(x.spread().u(), y.spread().u());
        }
        let constant = |halves: &Halves| -> Result<f64, Fault> {
            desk.ask(&EQUILIBRIUM_CONSTANT, &equation(halves), &kelvin(t_k), &[ONE_DATASET]).map(|k| ln(k.si()))
        };
        // A constant beyond the range of numbers is refused both ways or one way only, near the smallest numbers.
        if let (Ok(forwards), Ok(backwards)) = (constant(&forwards), constant(&backwards)) {
            near("ln K", forwards, -backwards, ROUNDING * (h + t_k * s) / (8.0 * t_k))?;
        }
        Ok(())
    });
}

#[test]
fn state_functions_of_one_reaction_hang_together() {
    // R of the CODATA set of 2022, written out: U = H - Δn R T, A = G - Δn R T, G = H - T S, ln K = -G/(R T).
    let r = 8.314_462_618_153_24;
    let desk = Desk::new();
    check(60, &(reaction(), temperature()), |(halves, t_k)| {
        let value = |card| at(&desk, card, &halves, t_k).si();
        let (h, g) = (value(&ENTHALPY), value(&GIBBS_ENERGY));
        let (h_size, s_size) = sizes(&halves, t_k);
        let allowed = ROUNDING * (h_size + t_k * s_size);
        let n_rt = delta_n(&halves) * r * t_k;
        near("U", value(&INTERNAL_ENERGY), h - n_rt, allowed)?;
        near("G", g, h - t_k * value(&ENTROPY), allowed)?;
        near("A", value(&HELMHOLTZ_ENERGY), g - n_rt, allowed)?;
        if let Ok(k) = desk.ask(&EQUILIBRIUM_CONSTANT, &equation(&halves), &kelvin(t_k), &[ONE_DATASET]) {
            near("ln K", ln(k.si()), -g / (r * t_k), allowed / (r * t_k) + 1e-13)?;
        }
        Ok(())
    });
}

#[test]
fn heating_along_a_path_and_back_leads_where_the_closed_forms_lead() {
    let desk = Desk::new();
    let strategy = (reaction(), 0..SMOOTH.len(), 0.02..0.98, 0.02..0.98);
    check(8, &strategy, |(halves, range, first, second)| {
        let within = |share: f64| SMOOTH[range].0 + share * (SMOOTH[range].1 - SMOOTH[range].0);
        let (t1, t2) = (within(first), within(second));
        let value = |card, t_k: f64| at(&desk, card, &halves, t_k).si();
        let cp = |t_k: f64| value(&HEAT_CAPACITY, t_k);
        let (h_size, s_size) = sizes(&halves, t1.max(t2));
        let there = integral(cp, t1, t2);
        let (start, end) = (value(&ENTHALPY, t1), value(&ENTHALPY, t2));
        // Rounding of the sum over species, and what each function loses to its large terms: both below 1e-10 of |ν H|.
        let lost = 1e-10 * h_size;
        near("ΔrH at T2", end, start + there.value, there.bound + lost)?;
        let Integral { value: heat, bound } = integral(|t_k| cp(t_k) / t_k, t1, t2);
        near("ΔrS", value(&ENTROPY, t2), value(&ENTROPY, t1) + heat, bound + 1e-10 * s_size)?;
        // And back again, with the panels elsewhere: through the middle in two steps.
        let middle = 0.37 * t1 + 0.63 * t2;
        let (back, rest) = (integral(cp, t2, middle), integral(cp, middle, t1));
        near("ΔrH at T1 again", end + back.value + rest.value, start, back.bound + rest.bound + lost)
    });
}

#[test]
fn a_heat_capacity_held_at_one_value_gives_straight_lines() {
    // ΔrH(298.15 K) + ΔrCp (T - 298.15 K) and ΔrS(298.15 K) + ΔrCp ln(T/298.15 K), with ΔrCp asked where each way holds it.
    let desk = Desk::new();
    check(40, &(reaction(), temperature()), |(halves, t_k)| {
        let value = |card, t_k: f64| at(&desk, card, &halves, t_k).si();
        let t0 = 298.15;
        let cp = |t_k: f64| value(&HEAT_CAPACITY, t_k);
        let (h_size, s_size) = sizes(&halves, t_k);
        for (way, held) in
            [("constant", cp(t0)), ("midpoint", cp(0.5 * (t0 + t_k))), ("mean", 0.5 * (cp(t0) + cp(t_k)))]
        {
            let text = equation(&halves);
            let options = [("heat_capacity", way), ONE_DATASET];
            let h = desk.ask(&ENTHALPY, &text, &kelvin(t_k), &options).unwrap().si();
            near(way, h, value(&ENTHALPY, t0) + held * (t_k - t0), ROUNDING * h_size)?;
            let s = desk.ask(&ENTROPY, &text, &kelvin(t_k), &options[..1]).unwrap().si();
            near(way, s, value(&ENTROPY, t0) + held * ln(t_k / t0), ROUNDING * s_size)?;
            let g = desk.ask(&GIBBS_ENERGY, &text, &kelvin(t_k), &options).unwrap().si();
            near(way, g, h - t_k * s, ROUNDING * (h_size + t_k * s_size))?;
        }
        Ok(())
    });
}

#[test]
fn the_slope_of_the_gibbs_energy_is_minus_the_entropy() {
    // dG/dT = -S and d(G/T)/dT = -H/T², by central differences. Bound: h²/6 times the third derivative, which is of the
    // order of S/T² (and H/T⁴), so 1e-8 of S for h = 1e-4 T; rounding over 2 h is added.
    let desk = Desk::new();
    check(60, &(reaction(), temperature()), |(halves, t_k)| {
        let h = 1e-4 * t_k;
        prop_assume!(SMOOTH.iter().any(|(low, high)| low + h <= t_k && t_k + h <= *high));
        let gibbs = |t_k: f64| at(&desk, &GIBBS_ENERGY, &halves, t_k).si();
        let (above, below) = (gibbs(t_k + h), gibbs(t_k - h));
        let (h_size, s_size) = sizes(&halves, t_k);
        let rounding = 1e-12 * (h_size + t_k * s_size) / h;
        let slope = (above - below) / (2.0 * h);
        near("dG/dT", slope, -at(&desk, &ENTROPY, &halves, t_k).si(), 1e-7 * s_size + rounding)?;
        let slope = (above / (t_k + h) - below / (t_k - h)) / (2.0 * h);
        let wanted = -at(&desk, &ENTHALPY, &halves, t_k).si() / (t_k * t_k);
        near("d(G/T)/dT", slope, wanted, (1e-7 * h_size / t_k + rounding) / t_k)
    });
}

#[test]
fn a_number_that_unbalances_an_equation_is_refused_with_the_element() {
    let desk = Desk::new();
    check(100, &(reaction(), any::<prop::sample::Index>(), 1i64..4), |(halves, which, by)| {
        let mut wrong = halves.clone();
        let at = *halves.keys().nth(which.index(halves.len())).unwrap();
        *wrong.get_mut(&at).unwrap() += by * halves[&at].signum();
        let fault = desk.ask(&ENTHALPY, &equation(&wrong), "298.15 K", &[]).unwrap_err();
        prop_assert_eq!(fault.code(), "unbalanced-element", "{} was refused: {}", equation(&wrong), fault);
        // The element that is named is one whose atoms, counted by hand, do not balance.
        let off = |element: usize| -> i64 {
            let own = SPECIES.len() + element;
            let atoms = |at: &usize| match SPECIES.get(*at) {
                Some((_, atoms)) => atoms[element],
                None if *at == own => ELEMENTS[element].1,
                None => 0,
            };
            wrong.iter().map(|(at, nu)| nu * atoms(at)).sum()
        };
        let words = ["C", "H", "O", "N"];
        let named = (0..4).any(|element| off(element) != 0 && mentions(fault.message(), words[element]));
        prop_assert!(named, "{}: {}", equation(&wrong), fault);
        Ok(())
    });
}

fn mentions(message: &str, element: &str) -> bool {
    message.split(|c: char| !c.is_alphanumeric()).any(|word| word == element)
}

#[test]
fn the_number_of_moles_of_gas_is_counted_from_the_phases() {
    // Through U - H, which is all that Δn does: -Δn R T at 300 K, with R of the CODATA set of 2022.
    let desk = Desk::new();
    let rt = 8.314_462_618_153_24 * 300.0;
    for (equation, moles) in [
        ("H2(g) + 1/2 O2(g) -> H2O(l)", -1.5),
        ("H2O(l) -> H2O(g)", 1.0),
        ("CaCO3(cr,calcite) -> CaO(cr,lime) + CO2(g)", 1.0),
        ("C(cr,graphite) + O2(g) -> CO2(g)", 0.0),
    ] {
        let value = |card| desk.ask(card, equation, "300 K", &[]).unwrap().si();
        let gap = value(&INTERNAL_ENERGY) - value(&ENTHALPY);
        assert!((gap + moles * rt).abs() < 1e-6, "{equation}: {gap}");
    }
}
