//! Changes of phase between 298.15 K and T: inserted where they are recorded, named in the result, refused where they are not.
//!
//! Every transition of the shipped data between condensed phases is crossed, in reactions and in substances.

mod asking;
mod second;

use std::sync::Arc;

use asking::Desk;
use hessbook::data::catalog::Catalog;
use hessbook::data::substance::Substance;
use hessbook::data::transition::Transition;
use hessbook::fault::Fault;
use hessbook::model::card::{self, Card, Value};
use hessbook::model::property_card::*;
use hessbook::model::substance::{ENTHALPY_INCREMENT, SUBSTANCE};
use hessbook::quantity::Quantity;
use hessbook::render::report::{Assumption, Record, Report};
use second::T_0;

/// The phases written at 298.15 K, each with its transitions on heating.
fn chains(data: &Catalog) -> Vec<(Arc<Substance>, Vec<Arc<Transition>>)> {
    let mut chains = Vec::new();
    for written in data.substances() {
        if !written.function.as_ref().is_some_and(|function| function.covers(T_0)) {
            continue;
        }
        let (mut phase, mut transitions) = (written.clone(), Vec::new());
        while let Some((transition, to)) = second::next(data, &phase) {
            transitions.push(transition);
            phase = to;
        }
        if !transitions.is_empty() {
            chains.push((written.clone(), transitions));
        }
    }
    chains
}

fn of_substance(desk: &Desk, card: &'static Card, id: &str, given: &[&str]) -> Result<Quantity, Fault> {
    let substance = card::call(&desk.cx(), &SUBSTANCE, vec![Value::Text(id.into())])?;
    let texts = given.iter().map(|text| Value::Text((*text).into()));
    match card::call(&desk.cx(), card, std::iter::once(substance).chain(texts).collect())? {
        Value::Quantity(value) => Ok(value),
        other => panic!("{} is no quantity", other.sort()),
    }
}

fn kelvin(t_k: f64) -> String {
    format!("{t_k} K")
}

fn at(desk: &Desk, card: &'static Card, id: &str, t_k: f64) -> f64 {
    of_substance(desk, card, id, &[&kelvin(t_k)]).unwrap_or_else(|fault| panic!("{id} at {t_k} K: {fault}")).si()
}

fn reported(desk: &Desk, value: &Quantity) -> Record {
    Report::of(&desk.cx(), "a result", value, &[]).record
}

fn row<'a>(record: &'a Record, id: &str, subject: &str) -> &'a Assumption {
    let found = record.assumptions.iter().find(|row| row.id == id && row.subject == subject);
    found.unwrap_or_else(|| panic!("no row {id} about {subject}: {:?}", record.assumptions))
}

/// The reaction of a substance to the atoms it is made of, as gases, where all are shipped.
fn atomization(data: &Catalog, substance: &Substance) -> Option<String> {
    let mut products = Vec::new();
    for (element, count) in substance.species.composition.iter() {
        let atom = format!("{}(g)", element.symbol());
        data.find(&atom).ok()?;
        products.push(format!("{count} {atom}"));
    }
    Some(format!("{} -> {}", substance.id(), products.join(" + ")))
}

#[test]
fn every_recorded_transition_is_crossed_and_the_reaction_enthalpy_steps_by_it() {
    let (desk, data) = (Desk::new(), Catalog::shipped());
    let (mut crossed, mut reactions, mut worst) = (0, 0, 0.0_f64);
    for (written, transitions) in chains(&data) {
        for transition in transitions {
            // The transition temperature belongs to the phase that ends there; the next number above it to the other one.
            let (below, above) = (transition.t_k, transition.t_k.next_up());
            let step = |card| at(&desk, card, written.id(), above) - at(&desk, card, written.id(), below);
            // Bound: rounding of sums that reach 1e7 J/mol. Cp contributes 1e-11 J/mol over one step of numbers.
            let dh = step(&SUBSTANCE_ENTHALPY);
            assert!((dh - transition.dh).abs() < 1e-8, "{}: {dh} and {} J/mol", transition.id, transition.dh);
            let ds = step(&SUBSTANCE_ENTROPY);
            assert!((ds - transition.ds).abs() < 1e-10, "{}: {ds} and {} J/(mol K)", transition.id, transition.ds);
            // Bound: the record gives three decimals, computed from the functions.
            let dcp = step(&SUBSTANCE_HEAT_CAPACITY);
            assert!((dcp - transition.dcp).abs() < 6e-4, "{}: {dcp} and {}", transition.id, transition.dcp);
            // Bound: the record gives ΔtrsH and ΔtrsS of two phases in equilibrium, to within 0.1 J/mol of each other.
            let dg = step(&SUBSTANCE_GIBBS_ENERGY);
            assert!(dg.abs() < 0.2, "{}: the Gibbs energy steps by {dg} J/mol", transition.id);
            crossed += 1;
            worst = worst.max((dh - transition.dh).abs());
            let Some(equation) = atomization(&data, &written) else { continue };
            let h = |t_k: f64| desk.ask(&ENTHALPY, &equation, &kelvin(t_k), &[]).map(|value| value.si());
            // Some atoms end below the highest transitions or lack a formation enthalpy beside the solid's.
            let (Ok(before), Ok(after)) = (h(below), h(above)) else { continue };
            assert!((before - after - transition.dh).abs() < 1e-8, "{equation} at {below} K: {}", after - before);
            reactions += 1;
        }
    }
    println!("{crossed} transitions crossed, {reactions} of them in a reaction; worst {worst:.1e} J/mol");
    assert!(crossed >= 70 && reactions >= 20, "{crossed}, {reactions}");
}

#[test]
fn closed_form_and_quadrature_agree_over_every_transition() {
    let (desk, data) = (Desk::new(), Catalog::shipped());
    let (mut worst, mut compared) = (0.0_f64, 0);
    for (written, transitions) in chains(&data) {
        for transition in transitions {
            let function = data.find(&transition.to).unwrap().function.clone().unwrap();
            let t_k = 0.5 * (transition.t_k + function.t_max.min(transition.t_k + 400.0));
            let got = of_substance(&desk, &ENTHALPY_INCREMENT, written.id(), &[&kelvin(t_k)]).unwrap().si();
            let (heatings, passed) = second::increment(&data, &written, t_k, &[]);
            let integral: f64 = heatings.iter().map(|heating| heating.integral).sum();
            let joins: usize = heatings.iter().map(|heating| heating.joins_passed).sum();
            let steps: f64 = heatings.iter().map(|heating| heating.joins).sum();
            let taken_up: f64 = passed.iter().map(|transition| transition.dh).sum();
            let second = integral + taken_up;
            // Bound: the printed constants leave up to 1 J/mol where two intervals of one function join, as the transition
            // table says of Cr; between joins nothing but rounding.
            assert!(
                (got - second).abs() <= 1.001 * joins as f64 + 1e-6,
                "{} at {t_k} K: {got}, {second}",
                written.id()
            );
            assert!((got - second - steps).abs() <= 1e-6, "{} at {t_k} K: {got}, {}", written.id(), second + steps);
            worst = worst.max((got - second - steps).abs());
            compared += 1;
        }
    }
    println!("{compared} paths; without the steps at joins {worst:.1e} J/mol at most");
    assert!(compared >= 70);
}

#[test]
fn a_second_order_join_within_one_function_is_no_change_of_phase() {
    let (desk, data) = (Desk::new(), Catalog::shipped());
    let within = |transition: &&Arc<Transition>| transition.from == transition.to;
    let mut seen = 0;
    for substance in data.substances() {
        for transition in data.transitions_of(substance).iter().filter(within) {
            let (below, above) = (transition.t_k, transition.t_k.next_up());
            let step = at(&desk, &SUBSTANCE_ENTHALPY, substance.id(), above)
                - at(&desk, &SUBSTANCE_ENTHALPY, substance.id(), below);
            // Bound: what the table says of the joins, at most 1.000 J/mol.
            assert!(step.abs() <= 1.001, "{}: {step} J/mol", transition.id);
            let value = of_substance(&desk, &SUBSTANCE_ENTHALPY, substance.id(), &[&kelvin(above)]).unwrap();
            assert!(!reported(&desk, &value).conditions.contains("changed"), "{}", transition.id);
            seen += 1;
        }
    }
    assert_eq!(seen, 4);
}

#[test]
fn a_phase_written_at_its_own_temperature_is_what_the_path_leads_to() {
    let (desk, data) = (Desk::new(), Catalog::shipped());
    for (written, transitions) in chains(&data) {
        for (passed, transition) in (1..).zip(&transitions) {
            let function = data.find(&transition.to).unwrap().function.clone().unwrap();
            let t_k = 0.5 * (transition.t_k + function.t_max.min(transition.t_k + 400.0));
            for (card, digit) in [(&SUBSTANCE_ENTHALPY, 0.05), (&SUBSTANCE_ENTROPY, 5e-5)] {
                let (path, itself) = (at(&desk, card, written.id(), t_k), at(&desk, card, &transition.to, t_k));
                // Bound: each recorded ΔtrsH and ΔtrsS is rounded to its last digit. Rounding of arithmetic is far below.
                let bound = 1.01 * digit * f64::from(passed);
                assert!((path - itself).abs() <= bound, "{} at {t_k} K: {path}, {itself}", transition.to);
            }
        }
    }
}

#[test]
fn the_result_says_which_phase_it_is_in_and_what_lies_on_the_way() {
    let desk = Desk::new();
    let value = desk.ask(&ENTHALPY, "Fe(cr,alpha) + S(cr,rhombic) -> FeS(cr,alpha)", "1300 K", &[]).unwrap();
    let record = reported(&desk, &value);
    let conditions = &record.conditions;
    assert!(conditions.contains("Fe(cr,alpha) is Fe(cr,gamma), changed at 1184 K"), "{conditions}");
    assert!(conditions.contains("S(cr,rhombic) is S(l), changed at 368.3 K, 388.36 K"), "{conditions}");
    // 0.900 kJ/mol for the change of iron stands between its two heatings, with a source of its own.
    assert!(record.check_line.contains(" + 0.900["), "{}", record.check_line);
    let source = |source: &str| record.sources.iter().any(|line| line.contains(source));
    assert!(source("difference of the Appendix D polynomials, p. 228"), "{:?}", record.sources);
    let stable = row(&record, "stable-phase", "Fe(cr,alpha), S(cr,rhombic)");
    assert!(stable.note.contains("to Fe(cr,gamma) at 1184 K with ΔtrsH = 0.900 kJ/mol, inserted"), "{}", stable.note);
    assert_eq!(stable.status, "holds");
    // What becomes of FeS on heating is named even where no other phase tests it.
    let untested = row(&record, "stable-phase", "FeS(cr,alpha)");
    assert!(untested.note.contains("to FeS(cr,gamma) at 598 K") && untested.status == "untested", "{}", untested.note);
    // An input of its own: it is named among those that state no u.
    let silent = record.assumptions.iter().find(|row| row.id == "uncertainty-incomplete").unwrap();
    assert!(silent.note.contains("transition enthalpies (Fe(cr,alpha)->Fe(cr,gamma)"), "{}", silent.note);
}

#[test]
fn what_a_missed_change_of_phase_would_cost_is_among_the_shortcuts() {
    let (desk, data) = (Desk::new(), Catalog::shipped());
    let (t_k, lead) = (900.0, data.find("Pb(cr)").unwrap());
    let value = of_substance(&desk, &SUBSTANCE_ENTHALPY, "Pb(cr)", &[&kelvin(t_k)]).unwrap();
    let record = reported(&desk, &value);
    let missed = record.alternatives.iter().find(|shortcut| shortcut.id == "missed-phase-change").unwrap();
    let price: f64 = missed.price.parse().unwrap();
    // By hand: the solid's Cp at its melting point is held on, and no enthalpy of fusion is taken.
    let function = lead.function.clone().unwrap();
    let (fusion, liquid) = second::next(&data, &lead).unwrap();
    let held = function.r_of_source * second::cp_over_r(function.intervals.last().unwrap(), fusion.t_k);
    let heated = second::heating(liquid.function.as_ref().unwrap(), fusion.t_k, t_k, &[]);
    let expected = held * (t_k - fusion.t_k) - fusion.dh - heated.integral - heated.joins;
    // Bound: rounding; the record's numbers read back exactly.
    assert!((price * 1000.0 - expected).abs() < 1e-6, "{price} kJ/mol, {expected} J/mol");
    // Where nothing changes, there is nothing to miss.
    let below = reported(&desk, &of_substance(&desk, &SUBSTANCE_ENTHALPY, "Pb(cr)", &["600 K"]).unwrap());
    assert!(below.alternatives.iter().all(|shortcut| shortcut.id != "missed-phase-change"));
}

#[test]
fn liquid_water_at_525_k_and_1_bar_is_broken_and_priced_for_the_property_asked() {
    let desk = Desk::new();
    let (liquid, gas) = ("CuO(cr) + H2(g) -> Cu(cr) + H2O(l)", "CuO(cr) + H2(g) -> Cu(cr) + H2O(g)");
    for (card, wrong, right) in [(&ENTHALPY, Some(-123.8), Some(-89.8)), (&ENTROPY, None, None)] {
        let (written, meant) =
            (desk.ask(card, liquid, "525 K", &[]).unwrap(), desk.ask(card, gas, "525 K", &[]).unwrap());
        for (value, expected) in [(&written, wrong), (&meant, right)] {
            // -123.8 and -89.8 kJ/mol: formation enthalpies of Table B and increments of Appendix D of NASA/TP-2002-211556, summed by hand.
            // Bound: half a unit of the last digit.
            let Some(expected) = expected else { continue };
            assert!((value.si() / 1000.0 - expected).abs() <= 0.05, "{}", value.si());
        }
        let record = reported(&desk, &written);
        let broken = row(&record, "stable-phase", "H2O(l)");
        assert_eq!(broken.status, "broken");
        let scale = if card.id == ENTHALPY.id { 1000.0 } else { 1.0 };
        let price = broken.price.as_ref().unwrap().parse::<f64>().unwrap() * scale;
        // The price is the difference of the two values, whatever property was asked. Bound: rounding.
        assert!((price - (written.si() - meant.si())).abs() < 1e-6, "{price}");
        assert!(broken.note.contains("H2O(g) has the lower Gibbs energy") && broken.note.contains("write that phase"));
    }
}

#[test]
fn derivatives_with_respect_to_t_hold_beyond_a_change_of_phase() {
    let desk = Desk::new();
    // Bound: a central difference over 0.02 K is off by a third derivative, below 1e-6 relative here.
    for card in [&SUBSTANCE_ENTHALPY, &SUBSTANCE_GIBBS_ENERGY, &SUBSTANCE_ENTROPY, &SUBSTANCE_HEAT_CAPACITY] {
        for mode in ["full", "constant", "midpoint", "mean"] {
            let value = |t: &str| {
                let substance = card::call(&desk.cx(), &SUBSTANCE, vec![Value::Text("Fe(cr,alpha)".into())]).unwrap();
                let options = [("heat_capacity".to_owned(), Value::Text(mode.into()))];
                let options = Value::Options(std::rc::Rc::new(options.into()));
                match card::call(&desk.cx(), card, vec![substance, Value::Text(t.into()), options]) {
                    Ok(Value::Quantity(value)) => value,
                    other => panic!("{}", other.map(|value| value.sort().to_owned()).unwrap_or_default()),
                }
            };
            let difference = (value("2000.01 K").si() - value("1999.99 K").si()) / 0.02;
            let with_u = value("2000.00(1) K");
            let of_t = with_u
                .sensitivities()
                .into_iter()
                .find(|s| matches!(s.input().unwrap().key, hessbook::record::node::LeafKey::Typed { .. }));
            let slope = of_t.map_or(0.0, |s| s.derivative);
            let close = (slope - difference).abs() <= 1e-5 * (difference.abs() + 1e-3);
            assert!(close, "{} {mode}: {slope} {difference}", card.id);
        }
    }
}

#[test]
fn an_increment_over_a_change_is_the_same_forth_and_back() {
    let desk = Desk::new();
    let increment =
        |to: &str, from: &str| of_substance(&desk, &ENTHALPY_INCREMENT, "Fe(cr,alpha)", &[to, from]).unwrap();
    let (up, down) = (increment("2000 K", "350 K"), increment("350 K", "2000 K"));
    assert_eq!(up.si(), -down.si());
    let by_enthalpies =
        at(&desk, &SUBSTANCE_ENTHALPY, "Fe(cr,alpha)", 2000.0) - at(&desk, &SUBSTANCE_ENTHALPY, "Fe(cr,alpha)", 350.0);
    // Bound: rounding of sums near 1e5 J/mol.
    assert!((up.si() - by_enthalpies).abs() < 1e-8, "{} {by_enthalpies}", up.si());
    let record = reported(&desk, &down);
    assert!(record.conditions.contains("changed at 1184 K, 1665 K, 1809 K"), "{}", record.conditions);
    assert!(record.check_line.contains("13.807["), "{}", record.check_line);
}

#[test]
fn a_substance_shows_the_phases_it_changes_to() {
    let desk = Desk::new();
    let shown = |id: &str| match card::call(&desk.cx(), &SUBSTANCE, vec![Value::Text(id.into())]).unwrap() {
        Value::Substance(substance) => hessbook::render::substance(&substance).plain().to_owned(),
        other => panic!("{}", other.sort()),
    };
    let iron = shown("Fe(cr,alpha)");
    let phases =
        "200 K to 1184 K, then as Fe(cr,gamma) from 1184 K, Fe(cr,delta) from 1665 K, Fe(l) from 1809 K to 6000 K";
    assert!(iron.ends_with(phases), "{iron}");
    assert!(!shown("Fe(cr,gamma)").contains("then") && !shown("H2O(l)").contains("then"));
}

#[test]
fn what_is_not_on_record_is_refused_and_not_skipped() {
    let desk = Desk::new();
    let code = |equation: &str, t: &str| desk.ask(&ENTHALPY, equation, t, &[]).unwrap_err().code().to_owned();
    // A gas is never inserted.
    assert_eq!(code("2 H2(g) + O2(g) -> 2 H2O(l)", "700 K"), "gas-not-inserted");
    // Two phases that the equation tells apart do not become one.
    assert_eq!(code("Na(cr) -> Na(l)", "400 K"), "temperature-out-of-range");
    // A phase that does not exist at 298.15 K is written for its own range.
    assert_eq!(code("Fe(cr,gamma) -> Fe(g)", "1700 K"), "temperature-out-of-range");
    // Below the record nothing is inserted: supercooled water is not taken for ice.
    assert_eq!(code("H2O(l) -> H2O(g)", "260 K"), "temperature-out-of-range");
    // Beside its vapour, sodium melts on the way.
    assert!(desk.ask(&ENTHALPY, "Na(cr) -> Na(g)", "500 K", &[]).is_ok());
}
