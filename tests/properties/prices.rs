//! Prices: what an assumption or a shortcut costs is what the two answers differ by, and scales with the reaction.

use proptest::prelude::*;

use crate::asking::Desk;
use crate::reactions::{self, Halves, ONE_DATASET};
use crate::{check, near};
use hessbook::data::catalog::{Catalog, T_REFERENCE_K};
use hessbook::model::basis::PER;
use hessbook::model::card::{self, Card, Value};
use hessbook::model::property_card::{
    ENTHALPY, ENTROPY, EQUILIBRIUM_CONSTANT, GIBBS_ENERGY, HEAT_CAPACITY, HELMHOLTZ_ENERGY, INTERNAL_ENERGY,
    SUBSTANCE_ENTROPY, SUBSTANCE_HEAT_CAPACITY,
};
use hessbook::model::substance::SUBSTANCE;
use hessbook::quantity::Quantity;
use hessbook::record::spread::Spread;
use hessbook::render::report::{Assumption, Record, Report};

const ENERGIES: [&Card; 4] = [&ENTHALPY, &INTERNAL_ENERGY, &GIBBS_ENERGY, &HELMHOLTZ_ENERGY];

fn report(desk: &Desk, value: &Quantity) -> Record {
    Report::of(&desk.cx(), "a result", value, &[]).record
}

fn number(text: &str) -> f64 {
    text.parse().unwrap_or_else(|_| panic!("`{text}` is no number"))
}

fn in_own_unit(value: &Quantity) -> f64 {
    value.unit().from_si(value.si())
}

fn rows<'a>(record: &'a Record, id: &str) -> Vec<&'a Assumption> {
    record.assumptions.iter().filter(|row| row.id == id).collect()
}

fn ask(desk: &Desk, card: &'static Card, halves: &Halves, t: &str, mode: &str) -> Quantity {
    let all = [("heat_capacity", mode), ONE_DATASET];
    let options = if matches!(card.name, "entropy" | "heat_capacity") { &all[..1] } else { &all[..] };
    let text = reactions::equation(halves);
    desk.ask(card, &text, t, options).unwrap_or_else(|fault| panic!("{text} at {t}: {fault}"))
}

/// Some roundings of numbers as large as the terms of the sum, in the unit of the value.
fn allowed(card: &Card, halves: &Halves, t_k: f64) -> f64 {
    let (h, s) = reactions::sizes(halves, t_k);
    let si = if matches!(card.name, "entropy" | "heat_capacity") { s } else { (h + t_k * s) / 1000.0 };
    1e-11 * si
}

#[test]
fn a_value_less_the_price_of_its_shortcut_is_the_value_in_full() {
    let desk = Desk::new();
    let modes = ["constant", "midpoint", "mean"];
    check(25, &(reactions::reaction(), reactions::temperature(), 0..modes.len()), |(halves, t_k, mode)| {
        let t = reactions::kelvin(t_k);
        for card in ENERGIES.into_iter().chain([&ENTROPY, &HEAT_CAPACITY]) {
            let short = ask(&desk, card, &halves, &t, modes[mode]);
            let full = ask(&desk, card, &halves, &t, "full");
            let record = report(&desk, &short);
            let [row] = rows(&record, "constant-heat-capacity")[..] else { panic!("{} has not one row", card.name) };
            prop_assert_eq!(&row.price_unit, &record.unit);
            prop_assert!(!row.first_order, "{}: the price is of the value itself", card.name);
            let price = number(row.price.as_ref().unwrap());
            let corrected = number(&record.value) - price;
            near(card.name, corrected, in_own_unit(&full), allowed(card, &halves, t_k))?;
            // And what it costs is what it is judged by.
            let holds = price.abs() <= number(&record.tolerance);
            prop_assert_eq!(row.status.as_str(), if holds { "holds" } else { "strained" });
            // In full there is nothing to price, and the shortcut moves among the alternatives.
            prop_assert!(rows(&report(&desk, &full), "constant-heat-capacity").is_empty());
        }
        Ok(())
    });
}

#[test]
fn the_price_of_a_shortcut_not_taken_is_what_it_would_have_given_less_the_value() {
    let desk = Desk::new();
    check(25, &(reactions::reaction(), reactions::temperature()), |(halves, t_k)| {
        let t = reactions::kelvin(t_k);
        for card in ENERGIES.into_iter().chain([&ENTROPY, &HEAT_CAPACITY]) {
            let full = ask(&desk, card, &halves, &t, "full");
            let record = report(&desk, &full);
            // R ln 1.01325 for each mole of gas: S° is smaller by it for 1 atm, and G° larger by T times it. R of CODATA 2022.
            let atmosphere = 8.314_462_618_153_24 * f64::ln(1.013_25) * reactions::delta_n(&halves);
            let by = |id: &str| {
                let other = match id {
                    "constant-heat-capacity" => ask(&desk, card, &halves, &t, "constant"),
                    "midpoint" | "mean" => ask(&desk, card, &halves, &t, id),
                    "no-correction" => ask(&desk, card, &halves, "298.15 K", "full"),
                    "internal-energy-for-enthalpy" => ask(&desk, &INTERNAL_ENERGY, &halves, &t, "full"),
                    "enthalpy-for-internal-energy" => ask(&desk, &ENTHALPY, &halves, &t, "full"),
                    "standard-pressure" if card.name == "entropy" => return -atmosphere,
                    "standard-pressure" => return atmosphere * t_k / 1000.0,
                    other => panic!("{other} is no shortcut that is known here"),
                };
                in_own_unit(&other) - in_own_unit(&full)
            };
            let ids: Vec<&str> = record.alternatives.iter().map(|shortcut| shortcut.id.as_str()).collect();
            let mut expected = match card.name {
                "heat_capacity" => vec!["no-correction"],
                _ => vec!["constant-heat-capacity", "midpoint", "mean", "no-correction"],
            };
            if reactions::delta_n(&halves) != 0.0 {
                expected.extend(match card.name {
                    "enthalpy" => Some("internal-energy-for-enthalpy"),
                    "internal_energy" => Some("enthalpy-for-internal-energy"),
                    "heat_capacity" => None,
                    _ => Some("standard-pressure"),
                });
            }
            prop_assert_eq!(ids, expected);
            for shortcut in &record.alternatives {
                let wanted = by(&shortcut.id);
                let slack = 2.0 * allowed(card, &halves, t_k);
                near(&format!("{} {}", card.name, shortcut.id), number(&shortcut.price), wanted, slack)?;
            }
        }
        Ok(())
    });
}

#[test]
fn the_price_of_a_dataset_is_the_difference_to_the_one_it_names() {
    let desk = Desk::new();
    let mut priced = 0;
    for (equation, t) in [
        ("CO(g) + H2O(g) -> CO2(g) + H2(g)", "723.15 K"),
        ("2 CO(g) + O2(g) -> 2 CO2(g)", "1100 K"),
        ("CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(l)", "25 degC"),
        ("1/2 N2(g) + 3/2 H2(g) -> NH3(g)", "700 K"),
        ("H2(g) + Cl2(g) -> 2 HCl(g)", "500 K"),
    ] {
        for card in ENERGIES {
            for formation in ["atct-1.112", "codata-1989", "nasa-tp-2002-211556"] {
                let Ok(value) = desk.ask(card, equation, t, &[("formation", formation)]) else { continue };
                let record = report(&desk, &value);
                let [row] = rows(&record, "formation-dataset")[..] else { panic!("{equation} has not one row") };
                let (_, other) =
                    row.note.split_once("formation enthalpies of ").unwrap_or_else(|| panic!("{}", row.note));
                let instead = desk.ask(card, equation, t, &[("formation", other)]).unwrap();
                let wanted = in_own_unit(&value) - in_own_unit(&instead);
                let price = number(row.price.as_ref().unwrap());
                // Rounding of values of some hundred kJ/mol.
                assert!((price - wanted).abs() < 1e-9, "{equation} {}: {price} and {wanted}", card.name);
                priced += 1;
            }
        }
    }
    assert!(priced >= 40, "{priced}");
}

#[test]
fn a_phase_that_is_not_stable_costs_the_difference_to_the_one_that_is() {
    let desk = Desk::new();
    check(25, &(380.0..595.0), |t_k: f64| {
        let t = reactions::kelvin(t_k);
        let with = |phase: &str, card| {
            let equation = format!("CO(g) + 2 H2O({phase}) + C2H4(g) -> CO2(g) + H2(g) + ethanol(g)");
            desk.ask(card, &equation, &t, &[ONE_DATASET]).unwrap()
        };
        for card in ENERGIES.into_iter().chain([&GIBBS_ENERGY]) {
            let liquid = with("l", card);
            let record = report(&desk, &liquid);
            let broken = rows(&record, "stable-phase").into_iter().find(|row| row.status == "broken");
            let row = broken.unwrap_or_else(|| panic!("liquid water is not stable at {t} and 1 bar"));
            prop_assert_eq!(&row.subject, "H2O(l)");
            let wanted = in_own_unit(&liquid) - in_own_unit(&with("g", card));
            // The function of water gives its own formation enthalpy at 298.15 K to 0.1 J/mol; two moles of it.
            near(card.name, number(row.price.as_ref().unwrap()), wanted, 2.0e-4)?;
        }
        Ok(())
    });
}

#[test]
fn a_reaction_written_n_times_has_n_times_the_values_and_prices() {
    let desk = Desk::new();
    check(25, &(reactions::reaction(), reactions::temperature(), 2i64..7), |(halves, t_k, n)| {
        let t = reactions::kelvin(t_k);
        let often: Halves = halves.iter().map(|(at, nu)| (*at, n * nu)).collect();
        for card in ENERGIES.into_iter().chain([&ENTROPY, &HEAT_CAPACITY]) {
            for mode in ["full", "constant"] {
                let [one, many] = [&halves, &often].map(|halves| report(&desk, &ask(&desk, card, halves, &t, mode)));
                let slack = 2.0 * n as f64 * allowed(card, &halves, t_k);
                let times_n = |text: &str| n as f64 * number(text);
                near(card.name, number(&many.value), times_n(&one.value), slack)?;
                prop_assert_eq!(one.alternatives.len(), many.alternatives.len());
                for (a, b) in one.alternatives.iter().zip(&many.alternatives) {
                    near(&a.id, number(&b.price), times_n(&a.price), slack)?;
                }
                let priced = |record: &Record| -> Vec<(String, Option<String>)> {
                    let rows = record.assumptions.iter().filter(|row| row.id != "together");
                    let mut all: Vec<_> =
                        rows.map(|row| (format!("{} {}", row.id, row.subject), row.price.clone())).collect();
                    all.sort();
                    all
                };
                let (few_rows, many_rows) = (priced(&one), priced(&many));
                prop_assert_eq!(few_rows.len(), many_rows.len());
                for ((id, few), (also, more)) in few_rows.iter().zip(&many_rows) {
                    // The subject of a dataset or a species is the same; that of a reaction is its text.
                    prop_assert_eq!(id.split(' ').next(), also.split(' ').next());
                    match (few, more) {
                        (Some(few), Some(more)) => near(id, number(more), times_n(few), slack)?,
                        (few, more) => prop_assert_eq!(few, more),
                    }
                }
            }
        }
        Ok(())
    });
}

#[test]
fn a_value_per_mole_of_a_species_carries_its_prices_along() {
    let desk = Desk::new();
    let strategy = (reactions::reaction(), reactions::temperature(), any::<prop::sample::Index>());
    check(40, &strategy, |(halves, t_k, which)| {
        let (at, nu) = halves.iter().nth(which.index(halves.len())).unwrap();
        let (name, _) = reactions::name(*at).split_once('(').unwrap();
        let t = reactions::kelvin(t_k);
        let whole = ask(&desk, &ENTHALPY, &halves, &t, "constant");
        let given = vec![Value::Quantity(whole.clone()), Value::Text(name.into())];
        let Value::Quantity(part) = card::call(&desk.cx(), &PER, given).unwrap() else { panic!("not a quantity") };
        let [all, of_it] = [&whole, &part].map(|value| report(&desk, value));
        let factor = 2.0 / nu.abs() as f64;
        let slack = 2.0 * factor * allowed(&ENTHALPY, &halves, t_k);
        near("value", number(&of_it.value), factor * number(&all.value), slack)?;
        let price = |record: &Record| {
            let [row] = rows(record, "constant-heat-capacity")[..] else { panic!("not one row") };
            number(row.price.as_ref().unwrap())
        };
        near("price", price(&of_it), factor * price(&all), slack)?;
        prop_assert_eq!(of_it.unit, format!("kJ/mol[{name}]"));
        let direction = if *nu < 0 { "consumed" } else { "formed" };
        prop_assert!(of_it.shown.ends_with(&format!(", per mole of {name} {direction}")), "{}", of_it.shown);
        Ok(())
    });
}

#[test]
fn a_price_at_a_result_computed_further_is_what_that_result_would_change_by() {
    // Through a square, where the first derivative would not do: the steps are computed again.
    let desk = Desk::new();
    check(40, &(reactions::reaction(), reactions::temperature(), 0.1..3.0), |(halves, t_k, factor): (_, _, f64)| {
        let t = reactions::kelvin(t_k);
        let squared = |value: &Quantity| {
            let scaled = value.scaled(factor, None).unwrap();
            scaled.times(&scaled, None).unwrap()
        };
        let short = ask(&desk, &ENTHALPY, &halves, &t, "constant");
        let full = ask(&desk, &ENTHALPY, &halves, &t, "full");
        let result = squared(&short);
        let record = report(&desk, &result);
        let [row] = rows(&record, "constant-heat-capacity")[..] else { panic!("not one row") };
        prop_assert!(!row.first_order);
        let wanted = squared(&short).si() - squared(&full).si();
        let price = number(row.price.as_ref().unwrap()) * result.unit().factor;
        let (h, _) = reactions::sizes(&halves, t_k);
        near("price", price, wanted, 1e-10 * factor * factor * h * h)
    });
}

#[test]
fn the_price_of_a_shortcut_in_an_equilibrium_constant_is_in_the_constant_itself() {
    let desk = Desk::new();
    check(25, &(900.0..2000.0), |t_k: f64| {
        let t = reactions::kelvin(t_k);
        let ask = |mode: &str| {
            desk.ask(&EQUILIBRIUM_CONSTANT, "CO(g) + H2O(g) -> CO2(g) + H2(g)", &t, &[("heat_capacity", mode)]).unwrap()
        };
        let (short, full) = (ask("constant"), ask("full"));
        let record = report(&desk, &short);
        let [row] = rows(&record, "constant-heat-capacity")[..] else { panic!("not one row") };
        // ln K is good to a few roundings of G/(R T), about 1e-13.
        let corrected = number(&record.value) - number(row.price.as_ref().unwrap());
        near("K°", corrected, full.si(), 1e-11 * full.si())
    });
}

#[test]
fn at_the_reference_temperature_nothing_is_corrected() {
    let desk = Desk::new();
    check(40, &reactions::reaction(), |halves| {
        // By hand: the formation enthalpies that the report prints in its Table B, and nothing else.
        let formation = |at: &usize| {
            let substance = Catalog::shipped().find(reactions::name(*at)).unwrap();
            let table = substance.formations.iter().find(|f| f.dataset.as_str() == ONE_DATASET.1);
            table.map_or(f64::NAN, |formation| formation.dhf.value)
        };
        let by_hand: f64 = halves.iter().map(|(at, nu)| *nu as f64 / 2.0 * formation(at)).sum();
        for t in ["298.15 K", "25 degC", "77 degF"] {
            for mode in ["full", "constant", "midpoint", "mean"] {
                let value = ask(&desk, &ENTHALPY, &halves, t, mode);
                // 77 degF is 298.15 K but for a rounding of the scale, and may be corrected by as much.
                let (h, _) = reactions::sizes(&halves, T_REFERENCE_K);
                near(&format!("{t} {mode}"), value.si(), by_hand, 1e-12 * h)?;
                if t != "77 degF" {
                    let record = report(&desk, &value);
                    // What is left is a shortcut of another sort.
                    let of_heat = record.alternatives.iter().filter(|one| one.id != "internal-energy-for-enthalpy");
                    prop_assert_eq!(of_heat.count(), 0, "{:?}", record.alternatives);
                    prop_assert!(rows(&record, "constant-heat-capacity").is_empty());
                }
            }
        }
        Ok(())
    });
}

#[test]
fn two_ways_of_taking_the_heat_capacity_do_not_cancel_as_if_they_were_one_figure() {
    // The heat capacities state no u. What the shortcut costs rests on them, so its u is not known, and least of all zero.
    let desk = Desk::new();
    let shift = |mode| {
        let equation = "CO(g) + H2O(g) -> CO2(g) + H2(g)";
        desk.ask(&ENTHALPY, equation, "723.15 K", &[("heat_capacity", mode)]).unwrap()
    };
    let cost = shift("constant").minus(&shift("full"), None).unwrap();
    assert!(cost.si().abs() > 100.0, "the two ways differ here: {} J/mol", cost.si());
    assert!(matches!(cost.spread(), Spread::NotStated { .. }), "{:?}", cost.spread());
    // The formation enthalpies, which both share, do cancel.
    assert!(cost.sensitivities().iter().all(|s| s.input().unwrap().u.is_none()));
    // An increment and a heat capacity at one temperature are two figures too.
    let equation = "CO(g) + H2O(g) -> CO2(g) + H2(g)";
    let cp = desk.ask(&HEAT_CAPACITY, equation, "723.15 K", &[]).unwrap();
    let kelvin = hessbook::quantity::text::parse("1 K", None, 99).unwrap();
    let rest = shift("full").minus(&cp.times(&kelvin, None).unwrap(), None).unwrap();
    assert!(matches!(rest.spread(), Spread::Partial { .. }), "{:?}", rest.spread());
}

#[test]
fn a_function_at_two_temperatures_gives_two_figures() {
    // Neither states a u, so the difference of the two has none either; zero would say that it is known exactly.
    let desk = Desk::new();
    let at = |card, t: &str| {
        let gas = card::call(&desk.cx(), &SUBSTANCE, vec![Value::Text("CO(g)".into())]).unwrap();
        let Value::Quantity(value) = card::call(&desk.cx(), card, vec![gas, Value::Text(t.into())]).unwrap() else {
            panic!("not a quantity")
        };
        value
    };
    for card in [&SUBSTANCE_HEAT_CAPACITY, &SUBSTANCE_ENTROPY] {
        let change = at(card, "900 K").minus(&at(card, "700 K"), None).unwrap();
        assert!(change.si() > 0.1, "{}: {}", card.id, change.si());
        assert!(matches!(change.spread(), Spread::NotStated { .. }), "{}: {:?}", card.id, change.spread());
        let nothing = at(card, "900 K").minus(&at(card, "900 K"), None).unwrap();
        assert_eq!(nothing.spread(), Spread::Full(0.0), "{}", card.id);
    }
}
