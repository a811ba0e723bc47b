//! `explain_gap`: every planted mistake is found and stands first, and random gaps have no name.
//!
//! A planted value is computed here by another road than the finder takes: from another reaction, from figures of the
//! shipped records, or by hand; then it is typed with the digits an analyst would type. Random gaps are drawn by a fixed
//! generator: either sign, sizes log-uniform within a factor 30 of 20 kJ/mol, a usual size of such mistakes.

use std::cell::Cell;
use std::collections::{BTreeMap, BTreeSet};
use std::rc::Rc;

use hessbook::fault::Fault;
use hessbook::model::CARDS;
use hessbook::model::card::{self, Cx, References, Value};
use hessbook::model::gap::candidate::{Mistake, Scale};
use hessbook::model::gap::{Fit, Gap, Told};
use hessbook::num::math;
use hessbook::quantity::{Quantity, text};
use hessbook::record::register::Reported;
use hessbook::units::constants;

const HYDROGEN: &str = "2 H2(g) + O2(g) -> 2 H2O(g)";
const SHIFT: &str = "CO(g) + H2O(g) -> CO2(g) + H2(g)";
const METHANE: &str = "CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(l)";
const AMMONIA: &str = "N2(g) + 3 H2(g) -> 2 NH3(g)";
const METHANOL: &str = "CO(g) + 2 H2(g) -> methanol(g)";
const SALT: &str = "2 Na(cr) + Cl2(g) -> 2 NaCl(cr,halite)";
const MONOXIDE: &str = "2 CO(g) + O2(g) -> 2 CO2(g)";

struct Desk {
    references: References,
    ordinal: Cell<u64>,
}

impl Desk {
    fn new() -> Self {
        Desk { references: References::new(constants::current()), ordinal: Cell::new(0) }
    }

    fn with<T>(&self, work: impl FnOnce(&Cx) -> T) -> T {
        work(&Cx { references: &self.references, place: None, ordinal: &self.ordinal, halted: &|| None })
    }

    fn call(&self, name: &str, args: Vec<Value>) -> Result<Value, Fault> {
        let card = CARDS.iter().copied().find(|card| card.name == name).unwrap();
        self.with(|cx| card::call(cx, card, args))
    }

    fn asked(&self, reaction: &str, property: &str, t: &str, options: &[(&str, &str)]) -> Quantity {
        let reaction = self.call("reaction", vec![Value::Text(reaction.into())]).unwrap();
        let options: BTreeMap<String, Value> =
            options.iter().map(|(name, word)| ((*name).to_owned(), Value::Text((*word).into()))).collect();
        match self.call(property, vec![reaction, Value::Text(t.into()), Value::Options(Rc::new(options))]) {
            Ok(Value::Quantity(value)) => value,
            Ok(other) => panic!("{property} gives {}", other.sort()),
            Err(fault) => panic!("{reaction} {property} {t}: {fault}", reaction = "the reaction"),
        }
    }

    /// In kJ/mol, or in J/(K mol) of an entropy, or as it is.
    fn number(&self, reaction: &str, property: &str, t: &str) -> f64 {
        shown(&self.asked(reaction, property, t, &[]))
    }

    fn gap(&self, a: &Quantity, b: &Quantity) -> Gap {
        self.with(|cx| Gap::of(cx, a, b)).unwrap()
    }
}

fn shown(value: &Quantity) -> f64 {
    value.unit().from_si(value.si())
}

fn typed(number: f64, decimals: usize, like: &Quantity) -> Quantity {
    typed_with(number, decimals, "", like)
}

/// With an uncertainty in brackets, where one is given.
fn typed_with(number: f64, decimals: usize, u: &str, like: &Quantity) -> Quantity {
    text::parse(&format!("{number:.decimals$}{u} {}", like.unit().text), None, 9_999).unwrap()
}

fn r() -> f64 {
    constants::current().molar_gas.value / 1000.0
}

/// What a mistake makes of a value, in the value's unit.
type Wrong = Box<dyn Fn(&Desk, f64) -> f64>;

/// A mistake made on purpose in a value.
struct Planted {
    kind: Mistake,
    reaction: &'static str,
    property: &'static str,
    t: &'static str,
    wrong: Wrong,
    decimals: usize,
}

fn plant(
    kind: Mistake,
    reaction: &'static str,
    property: &'static str,
    t: &'static str,
    decimals: usize,
    wrong: impl Fn(&Desk, f64) -> f64 + 'static,
) -> Planted {
    Planted { kind, reaction, property, t, wrong: Box::new(wrong), decimals }
}

/// A printed formation enthalpy of ATcT 1.112, the dataset of these values, in kJ/mol.
fn formation(desk: &Desk, species: &str) -> f64 {
    let substance = desk.references.catalog().find(species).unwrap();
    let record = substance.formations.iter().find(|record| record.dataset.as_str() == "atct-1.112").unwrap();
    record.dhf.value / 1000.0
}

/// H(298.15 K) - H(0 K) in kJ/mol, of the function's record.
fn increment(desk: &Desk, species: &str) -> f64 {
    let substance = desk.references.catalog().find(species).unwrap();
    let function = substance.function.as_ref().and_then(|function| function.h298_minus_h0);
    let record = substance.formations.iter().find(|record| record.dataset.as_str() == "atct-1.112");
    let printed = record.and_then(|record| record.h298_minus_h0.as_ref()).map(|datum| datum.value);
    printed.or(function).unwrap() / 1000.0
}

fn planted() -> Vec<Planted> {
    use Mistake::*;
    let mut all = vec![
        // The liquid written in another reaction, in place of the gas, and the other way round.
        plant(WaterPhase, HYDROGEN, "enthalpy", "298.15 K", 2, |desk, _| {
            desk.number("2 H2(g) + O2(g) -> 2 H2O(l)", "enthalpy", "298.15 K")
        }),
        plant(WaterPhase, METHANE, "enthalpy", "298.15 K", 1, |desk, _| {
            desk.number("CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(g)", "enthalpy", "298.15 K")
        }),
        plant(WaterPhase, SHIFT, "enthalpy", "450 degC", 2, |desk, value| {
            value - (formation(desk, "H2O(l)") - formation(desk, "H2O(g)"))
        }),
        plant(WaterPhase, METHANE, "gibbs_energy", "350 K", 2, |desk, _| {
            desk.number("CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(g)", "gibbs_energy", "350 K")
        }),
        plant(Phase, METHANOL, "enthalpy", "298.15 K", 2, |desk, _| {
            desk.number("CO(g) + 2 H2(g) -> methanol(l)", "enthalpy", "298.15 K")
        }),
        // U for H, or the wrong sign of Δn(gas) R T, Δn(gas) counted by hand.
        plant(PvTerm, METHANE, "enthalpy", "298.15 K", 2, |_, value| value + 2.0 * r() * 298.15),
        plant(PvTerm, AMMONIA, "enthalpy", "700 K", 2, |_, value| value + 2.0 * r() * 700.0),
        plant(PvTerm, METHANOL, "internal_energy", "298.15 K", 2, |_, value| value - 4.0 * r() * 298.15),
        plant(PvTerm, HYDROGEN, "gibbs_energy", "1000 K", 3, |_, value| value + r() * 1000.0),
        plant(StateFunction, AMMONIA, "enthalpy", "298.15 K", 2, |desk, _| {
            desk.number(AMMONIA, "gibbs_energy", "298.15 K")
        }),
        plant(StateFunction, SHIFT, "gibbs_energy", "450 degC", 2, |desk, _| {
            desk.number(SHIFT, "enthalpy", "450 degC")
        }),
        // cal_th = 4.184 J, cal_IT = 4.1868 J: NIST SP 811 (2008), Appendix B.8, from memory.
        plant(CalorieKind, METHANE, "enthalpy", "298.15 K", 3, |_, value| value / 4.184 * 4.1868),
        plant(CalorieKind, MONOXIDE, "enthalpy", "298.15 K", 3, |_, value| value / 4.1868 * 4.184),
        plant(ZeroKelvin, AMMONIA, "enthalpy", "298.15 K", 2, |desk, value| {
            let at = |species: &str| increment(desk, species);
            value - (2.0 * at("NH3(g)") - at("N2(g)") - 3.0 * at("H2(g)"))
        }),
        plant(ZeroKelvin, SHIFT, "enthalpy", "450 degC", 3, |desk, value| value + increment(desk, "CO2(g)")),
        plant(ZeroKelvin, METHANE, "enthalpy", "298.15 K", 2, |desk, value| {
            let substance = desk.references.catalog().find("CH4(g)").unwrap();
            let record = substance.formations.iter().find(|record| record.dataset.as_str() == "atct-1.112").unwrap();
            value - (record.dhf_0.as_ref().unwrap().value - record.dhf.value) / 1000.0
        }),
        // R ln 1.01325 for each mole of gas; p° = 1 bar = 100 000 Pa and 1 atm = 101 325 Pa by definition.
        plant(StandardPressure, METHANE, "entropy", "298.15 K", 3, |_, value| {
            value + 2.0 * 1000.0 * r() * math::ln(1.01325)
        }),
        plant(StandardPressure, AMMONIA, "gibbs_energy", "700 K", 4, |_, value| {
            value - 2.0 * r() * 700.0 * math::ln(1.01325)
        }),
        plant(Coefficient, METHANE, "enthalpy", "298.15 K", 2, |desk, value| value - formation(desk, "H2O(l)")),
        plant(Coefficient, SHIFT, "enthalpy", "298.15 K", 2, |desk, value| value + formation(desk, "CO(g)")),
        plant(Coefficient, METHANOL, "enthalpy", "298.15 K", 2, |desk, value| value + 2.0 * formation(desk, "CO(g)")),
        plant(Celsius, SHIFT, "enthalpy", "450 degC", 3, |desk, _| desk.number(SHIFT, "enthalpy", "450 K")),
        plant(Celsius, AMMONIA, "gibbs_energy", "450 K", 2, |desk, _| desk.number(AMMONIA, "gibbs_energy", "450 degC")),
        // ATcT 1.112 prints -393.474, -241.822 and -74.513 kJ/mol (machine-readable copy).
        plant(Digits, SHIFT, "enthalpy", "298.15 K", 3, |_, value| value + 393.474 - 339.474),
        plant(Digits, METHANE, "enthalpy", "298.15 K", 3, |_, value| value - 74.513 + 47.513),
        plant(Digits, SHIFT, "gibbs_energy", "450 degC", 3, |desk, _| desk.number(SHIFT, "gibbs_energy", "540 degC")),
        // The figure itself, mistyped: 483.65 for 438.65 and so on, whatever its digits are.
        plant(Digits, MONOXIDE, "enthalpy", "298.15 K", 2, |_, value| {
            let digits = format!("{value:.2}");
            let (head, tail) = digits.split_at(2);
            let swapped: String = tail.chars().take(2).collect::<Vec<_>>().into_iter().rev().collect();
            format!("{head}{swapped}{}", &tail[2..]).parse().unwrap()
        }),
        plant(PerMole, MONOXIDE, "enthalpy", "450 degC", 2, |_, value| value / 2.0),
        plant(PerMole, AMMONIA, "enthalpy", "298.15 K", 2, |_, value| value / 3.0),
        plant(PerMole, METHANE, "enthalpy", "298.15 K", 2, |_, value| value * 2.0),
        plant(Dataset, AMMONIA, "enthalpy", "700 K", 3, |desk, _| {
            shown(&desk.asked(AMMONIA, "enthalpy", "700 K", &[("formation", "nasa-tp-2002-211556")]))
        }),
        plant(Phase, "ethylene(g) + H2O(g) -> ethanol(g)", "enthalpy", "298.15 K", 2, |desk, value| {
            value + formation(desk, "ethanol(l)") - formation(desk, "ethanol(g)")
        }),
        plant(Dataset, SHIFT, "enthalpy", "450 degC", 5, |desk, _| {
            shown(&desk.asked(SHIFT, "enthalpy", "450 degC", &[("formation", "codata-1989")]))
        }),
        plant(MixedDatasets, AMMONIA, "enthalpy", "298.15 K", 4, |desk, value| {
            let substance = desk.references.catalog().find("NH3(g)").unwrap();
            let record = substance.formations.iter().find(|record| record.dataset.as_str() == "codata-1989").unwrap();
            value + 2.0 * (record.dhf.value / 1000.0 - formation(desk, "NH3(g)"))
        }),
        plant(HeatCapacity, SHIFT, "enthalpy", "450 degC", 3, |desk, _| {
            shown(&desk.asked(SHIFT, "enthalpy", "450 degC", &[("heat_capacity", "constant")]))
        }),
        plant(HeatCapacity, AMMONIA, "enthalpy", "700 K", 3, |desk, _| desk.number(AMMONIA, "enthalpy", "298.15 K")),
        plant(HeatCapacity, METHANOL, "gibbs_energy", "550 K", 3, |desk, _| {
            shown(&desk.asked(METHANOL, "gibbs_energy", "550 K", &[("heat_capacity", "midpoint")]))
        }),
        // Sodium melts at 371.01 K with 2.598 kJ/mol: NASA/TP-2002-211556, p. 248.
        plant(PhaseChange, SALT, "enthalpy", "500 K", 3, |_, value| value + 2.0 * 2.598),
        plant(PowerOfTen, AMMONIA, "equilibrium_constant", "700 K", 9, |_, value| value * 100.0),
        plant(Sign, AMMONIA, "equilibrium_constant", "700 K", 2, |_, value| 1.0 / value),
        plant(StateFunction, HYDROGEN, "internal_energy", "1000 K", 2, |desk, _| {
            desk.number(HYDROGEN, "helmholtz_energy", "1000 K")
        }),
    ];
    for reaction in [HYDROGEN, SHIFT, METHANE, AMMONIA, METHANOL, MONOXIDE] {
        all.push(plant(Calorie, reaction, "enthalpy", "298.15 K", 2, |_, value| value / 4.184));
        all.push(plant(Sign, reaction, "gibbs_energy", "298.15 K", 1, |_, value| -value));
        for factor in [0.001, 0.1, 10.0, 1000.0] {
            all.push(plant(PowerOfTen, reaction, "enthalpy", "298.15 K", 3, move |_, value| factor * value));
        }
    }
    all
}

fn kinds(fit: &Fit) -> Vec<Mistake> {
    std::iter::once(&fit.told).chain(&fit.also).map(|told: &Told| told.mistake).collect()
}

fn told(gap: &Gap) -> String {
    let line = |fit: &Fit| format!("    {:?} {}: P {:.1e}", fit.told.mistake, fit.told.words, fit.chance);
    gap.fits.iter().map(line).collect::<Vec<_>>().join("\n")
}

#[test]
fn every_planted_mistake_stands_first() {
    let desk = Desk::new();
    let (mut misses, mut found, mut count, mut worst) = (Vec::new(), BTreeSet::new(), 0, 0.0_f64);
    for planted in planted() {
        let a = desk.asked(planted.reaction, planted.property, planted.t, &[]);
        let b = typed((planted.wrong)(&desk, shown(&a)), planted.decimals, &a);
        let gap = desk.gap(&a, &b);
        count += 1;
        match gap.fits.first() {
            Some(first) if kinds(first).contains(&planted.kind) => {
                found.insert(planted.kind);
                worst = worst.max(first.chance);
            }
            _ => misses.push(format!(
                "{:?} in {} of {} at {}: gap {}, {} alternatives\n{}",
                planted.kind,
                planted.property,
                planted.reaction,
                planted.t,
                gap.gap,
                gap.tested,
                told(&gap)
            )),
        }
    }
    println!("{count} planted mistakes of {} kinds; largest chance of a named one {worst:.4}", found.len());
    assert!(misses.is_empty(), "{} missed\n{}", misses.len(), misses.join("\n"));
    assert!(found.len() >= 12, "{found:?}");
}

/// Steele, Lea, Flood, "Fast splittable pseudorandom number generators" (2014), from memory: good enough to scatter gaps.
struct Random(u64);

impl Random {
    /// From 0 to 1.
    fn next(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        (z ^ (z >> 31)) as f64 / u64::MAX as f64
    }

    /// Of either sign, log-uniform in size within a factor 30 of `typical`.
    fn gap(&mut self, typical: f64) -> f64 {
        let size = typical * math::exp((2.0 * self.next() - 1.0) * math::ln(30.0));
        if self.next() < 0.5 { -size } else { size }
    }
}

/// Which of a hundred random gaps are named.
fn named(desk: &Desk, a: &Quantity, typical: f64, (decimals, u): (usize, &str), seed: u64) -> Vec<String> {
    let mut random = Random(seed);
    let drawn = (0..100).map(|_| typed_with(shown(a) + random.gap(typical), decimals, u, a));
    drawn.filter_map(|b| desk.gap(a, &b).fits.first().map(|fit| format!("{} {}", b.si(), fit.told.words))).collect()
}

#[test]
fn random_gaps_have_no_name() {
    let desk = Desk::new();
    let cases = [
        (METHANE, "enthalpy", "298.15 K", 20.0),
        (SHIFT, "enthalpy", "450 degC", 20.0),
        (AMMONIA, "gibbs_energy", "700 K", 20.0),
        (METHANOL, "internal_energy", "550 K", 20.0),
        (METHANE, "entropy", "298.15 K", 20.0),
    ];
    for (case, (reaction, property, t, typical)) in cases.into_iter().enumerate() {
        let a = desk.asked(reaction, property, t, &[]);
        for (nth, digits) in [(0, ""), (1, ""), (2, ""), (3, ""), (2, "(15)"), (1, "(9)")].into_iter().enumerate() {
            let seed = 1000 + 10 * case as u64 + nth as u64;
            let named = named(&desk, &a, typical, digits, seed);
            let (decimals, u) = digits;
            println!("{property} of {reaction} at {t}, {decimals} decimals{u}, seed {seed}: {} of 100", named.len());
            assert!(named.len() <= 5, "{}", named.join("\n"));
        }
    }
}

#[test]
fn a_gap_within_rounding_needs_no_mistake_and_equal_values_have_none() {
    let desk = Desk::new();
    let a = desk.asked(SHIFT, "enthalpy", "298.15 K", &[]);
    assert!(desk.gap(&a, &typed(shown(&a), 2, &a)).fits.is_empty());
    assert!(desk.gap(&a, &a).fits.is_empty());
}

#[test]
fn figures_known_to_few_digits_name_nothing_though_one_fits() {
    // A shortcut worth 2 kJ/mol, typed to 0.1: it fits, and one alternative or another would fit one gap in four.
    let desk = Desk::new();
    let a = desk.asked(SHIFT, "enthalpy", "450 degC", &[]);
    let wrong = shown(&desk.asked(SHIFT, "enthalpy", "450 degC", &[("heat_capacity", "constant")]));
    let names = |decimals| desk.gap(&a, &typed(wrong, decimals, &a)).fits.iter().map(|fit| fit.told.mistake).collect();
    let (coarse, fine): (Vec<Mistake>, Vec<Mistake>) = (names(1), names(3));
    assert_eq!((coarse, fine), (vec![], vec![Mistake::HeatCapacity]));
}

#[test]
fn a_value_per_mole_of_a_species_knows_its_other_bases() {
    let desk = Desk::new();
    let whole = desk.asked(MONOXIDE, "enthalpy", "450 degC", &[]);
    let per = desk.call("per", vec![Value::Quantity(whole.clone()), Value::Text("CO".into())]).unwrap();
    let Value::Quantity(per) = per else { panic!("per gives a quantity") };
    let first = |number: f64| desk.gap(&per, &typed(number, 2, &per)).fits.into_iter().next().map(|fit| fit.told);
    let told = first(shown(&whole)).unwrap();
    assert_eq!(told.mistake, Mistake::PerMole);
    assert!(told.words.contains("per mole of"), "{}", told.words);
}

#[test]
fn a_published_value_of_another_origin_is_matched_within_the_uncertainty() {
    // CODATA Key Values 1989: formation enthalpies of H2O(l) -285.830(40), H2O(g) -241.826(40) kJ/mol at 95 %.
    let desk = Desk::new();
    let a = desk.asked(HYDROGEN, "enthalpy", "298.15 K", &[]);
    let b = text::parse("-571.660(40) kJ/mol[rxn]", None, 1).unwrap();
    let gap = desk.gap(&a, &b);
    let first = gap.fits.first().unwrap();
    assert_eq!(first.told.mistake, Mistake::WaterPhase);
    assert!(!first.within_rounding && first.residual.abs() < 100.0, "{}", first.residual);
}

#[test]
fn the_mistake_is_found_in_either_value_and_through_arithmetic() {
    let desk = Desk::new();
    let a = desk.asked(HYDROGEN, "enthalpy", "298.15 K", &[]);
    let b = typed(desk.number("2 H2(g) + O2(g) -> 2 H2O(l)", "enthalpy", "298.15 K"), 2, &a);
    let turned = desk.gap(&b, &a);
    assert!(turned.fits[0].told.mistake == Mistake::WaterPhase && turned.fits[0].told.in_first);
    // Half of it, per mole of water, with a figure added: the prediction is carried through.
    let half = a.scaled(0.5, None).unwrap().plus(&text::parse("10.00 kJ/mol[rxn]", None, 2).unwrap(), None).unwrap();
    let b = typed(0.5 * shown(&b) + 10.0, 2, &a);
    assert_eq!(desk.gap(&half, &b).fits[0].told.mistake, Mistake::WaterPhase);
}

#[test]
fn predictions_come_from_computed_alternatives_with_their_sources() {
    let desk = Desk::new();
    let a = desk.asked(SHIFT, "enthalpy", "450 degC", &[]);
    let constant = desk.asked(SHIFT, "enthalpy", "450 degC", &[("heat_capacity", "constant")]);
    let gap = desk.gap(&a, &constant);
    let first = &gap.fits[0];
    assert_eq!(first.predicted, constant.si() - a.si());
    let better = BTreeMap::from([(a.node().id(), constant.si())]);
    assert_eq!(Reported::of(a.node()).price(&better).0, -first.predicted);
    assert!(first.sources.iter().any(|source| source.source.contains("NASA/TP-2002-211556")), "{:?}", first.sources);
    assert_eq!(gap.scale, Scale::Linear);
}

#[test]
fn two_typed_figures_are_searched_for_what_can_happen_to_a_figure() {
    let desk = Desk::new();
    let q = |text: &str, ordinal| text::parse(text, None, ordinal).unwrap();
    let first = |a: &str, b: &str| desk.gap(&q(a, 1), &q(b, 2)).fits.first().map(|fit| fit.told.mistake);
    assert_eq!(first("-285.830 kJ/mol[H2O]", "-283.830 kJ/mol[H2O]"), None);
    assert_eq!(first("-285.830 kJ/mol[H2O]", "-258.830 kJ/mol[H2O]"), Some(Mistake::Digits));
    assert_eq!(first("-285.830 kJ/mol[H2O]", "-68.315 kJ/mol[H2O]"), Some(Mistake::Calorie));
    assert_eq!(first("25.00 degC", "571.30 K"), Some(Mistake::Celsius));
    assert_eq!(first("1.2500 kJ", "1250.0 kJ"), Some(Mistake::PowerOfTen));
}
