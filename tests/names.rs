//! Which substance a text names, and how a text that names none is refused.

use std::collections::{BTreeMap, BTreeSet};

use serde_json::Value;

use hessbook::chem::formula::Formula;
use hessbook::chem::species::State;
use hessbook::data::catalog::Catalog;
use hessbook::fault::{Explain, Fault};
use hessbook::source::embedded;

fn names() -> Value {
    serde_json::from_slice(embedded("stdlib/data/names.json").bytes).unwrap()
}

fn found(text: &str) -> String {
    match Catalog::shipped().find(text) {
        Ok(substance) => substance.id().to_owned(),
        Err(fault) => format!("{}: {fault}", fault.code()),
    }
}

#[test]
fn every_id_of_a_substance_or_a_record_finds_it() {
    let catalog = Catalog::shipped();
    for substance in catalog.substances() {
        assert_eq!(found(substance.id()), substance.id());
        for formation in &substance.formations {
            assert_eq!(found(&formation.id), substance.id());
        }
        if let Some(function) = &substance.function {
            assert_eq!(found(&function.id), substance.id());
        }
    }
}

#[test]
fn every_listed_name_finds_its_entity_and_no_other() {
    let catalog = Catalog::shipped();
    let mut owners: BTreeMap<String, BTreeSet<String>> = BTreeMap::new();
    let mut phases: BTreeMap<String, Vec<String>> = BTreeMap::new();
    for substance in catalog.substances() {
        let entity = substance.species.entity.name().to_owned();
        phases.entry(entity.clone()).or_default().push(substance.species.phase.to_string());
        if let Some(name) = &substance.name {
            owners.entry(name.to_lowercase()).or_default().insert(entity);
        }
    }
    let names = names();
    for record in names["entities"].as_array().unwrap() {
        let entity = record["entity"].as_str().unwrap();
        assert!(phases.contains_key(entity), "{entity} is named but not on record");
        let listed = record["names"].as_array().unwrap().iter().chain(record.get("name"));
        for name in listed.map(|name| name.as_str().unwrap()) {
            // Case tells formulas apart, not words.
            let key = if Formula::parse_record(name).is_ok() { name.to_owned() } else { name.to_lowercase() };
            owners.entry(key).or_default().insert(entity.to_owned());
            assert!(name == entity || !phases.contains_key(name), "{name} is a name of {entity} and a substance");
            for phase in &phases[entity] {
                assert_eq!(found(&format!("{name}({phase})")), format!("{entity}({phase})"));
            }
        }
    }
    for (name, entities) in &owners {
        assert_eq!(entities.len(), 1, "{name} means {entities:?}");
    }
}

#[test]
fn what_is_listed_as_the_same_exists_and_is_not_a_substance_twice() {
    let catalog = Catalog::shipped();
    let ids: BTreeSet<&str> = catalog.substances().map(|substance| substance.id()).collect();
    let names = names();
    for row in names["same"].as_array().unwrap() {
        let [id, is] = ["id", "is"].map(|member| row[member].as_str().unwrap());
        assert!(ids.contains(is) && !ids.contains(id), "{row}");
        assert!(row["why"].as_str().is_some_and(|why| why.len() > 8), "{row}");
        assert_eq!(found(id), is);
    }
    for row in names["forms"].as_array().unwrap() {
        let [name, is] = ["name", "is"].map(|member| row[member].as_str().unwrap());
        assert!(ids.contains(is), "{row}");
        assert_eq!(found(&format!("{name}(cr)")), is);
    }
    // Crystals with and without a named form would be two entries of what may be one substance.
    for substance in catalog.substances().filter(|s| s.species.phase.state == State::Crystal) {
        let plain = format!("{}(cr)", substance.species.entity.name());
        assert!(substance.id() == plain || !ids.contains(plain.as_str()), "{} beside {plain}", substance.id());
    }
}

#[test]
fn texts_find_what_they_name() {
    let rows = [
        ("water(l)", "H2O(l)"),
        ("Water (l)", "H2O(l)"),
        ("carbon monoxide(g)", "CO(g)"),
        ("CH3OH(g)", "methanol(g)"),
        ("C2H5OH(l)", "ethanol(l)"),
        ("CH3COOH(l)", "acetic acid(l)"),
        ("HCOOH(g)", "formic acid(g)"),
        ("CH3OCH3(g)", "dimethyl ether(g)"),
        ("(CH3)2CO(g)", "acetone(g)"),
        ("C6H6(l)", "benzene(l)"),
        ("chloroform(g)", "trichloromethane(g)"),
        ("ethylene glycol(g)", "1,2-ethanediol(g)"),
        ("butane(g)", "n-butane(g)"),
        ("MgO(cr)", "MgO(cr,periclase)"),
        ("MgO(s)", "MgO(cr,periclase)"),
        ("CaO(cr)", "CaO(cr,lime)"),
        ("SnO2(cr)", "SnO2(cr,tetragonal)"),
        ("B(cr,rhombic)", "B(cr,beta)"),
        ("Ca(cr)", "Ca(cr,alpha)"),
        ("calcium(cr)", "Ca(cr,alpha)"),
        ("TiO2(cr)", "TiO2(cr,rutile)"),
        ("CO2(aq)", "CO2(aq,undissoc.)"),
        ("SO4^2-(aq)", "SO4-2(aq)"),
        ("NO3-(aq)", "NO3-(aq)"),
        ("graphite(cr)", "C(cr,graphite)"),
        ("C(cr,Graphite)", "C(cr,graphite)"),
        ("ice(cr)", "H2O(cr,ice-ih)"),
        ("iron(III) oxide(cr)", "Fe2O3(cr,hematite)"),
        ("aluminum(l)", "Al(l)"),
        ("tin(l)", "Sn(l)"),
        ("TiN(cr)", "TiN(cr)"),
    ];
    for (text, id) in rows {
        assert_eq!(found(text), id, "{text}");
    }
}

#[test]
fn texts_that_name_no_single_substance_are_refused_with_the_way_out() {
    let rows = [
        ("CO2", "phase-missing: CO2 has no phase: it can be CO2(g) or CO2(aq,undissoc.)"),
        ("methanol", "phase-missing: methanol has no phase: it can be methanol(g) or methanol(l)"),
        ("graphite", "phase-missing: graphite has no phase: it can be C(cr,graphite)"),
        (
            "graphite(g)",
            "phase-not-on-record: graphite(g) is not on record; of the same substance there is C(cr,graphite)",
        ),
        (
            "SiO2(cr)",
            "form-ambiguous: SiO2(cr) is on record in 3 forms: SiO2(cr,alpha-quartz), SiO2(cr,beta-cristobalite) or \
             SiO2(cr,beta-quartz)",
        ),
        (
            "C4H10(g)",
            "name-ambiguous: C4H10(g) is a formula that several substances can share; on record with these atoms: \
             isobutane(g), n-butane(g)",
        ),
        (
            "C6H12(g)",
            "name-ambiguous: C6H12(g) is a formula that several substances can share; on record with these atoms: \
             cyclohexane(g)",
        ),
        (
            "C4H10",
            "name-ambiguous: C4H10 is a formula that several substances can share; on record with these atoms: \
             isobutane(g), n-butane(g)",
        ),
        ("CO(l)", "phase-not-on-record: CO(l) is not on record; of the same substance there is CO(g)"),
        (
            "Fe(cr,epsilon)",
            "phase-not-on-record: Fe(cr,epsilon) is not on record; of the same substance there is Fe(cr,alpha), \
             Fe(cr,delta), Fe(cr,gamma)",
        ),
        ("methnaol(l)", "substance-unknown: methnaol(l) is not on record"),
        ("co2(g)", "substance-unknown: co2(g) is not on record"),
        ("2H2O(l)", "substance-unknown: 2H2O(l) is not on record"),
        ("C6H12O6(cr)", "substance-unknown: C6H12O6(cr) is not on record"),
        ("CO2(gas)", "unknown-phase: in CO2(gas): (gas) is no phase of a substance"),
        ("", "no-substance-name: there is no substance here: the text \"\" names none"),
    ];
    for (text, fault) in rows {
        assert_eq!(found(text), fault, "{text}");
        assert!(!Catalog::shipped().find(text).unwrap_err().hint().is_empty());
    }
    let hint = |text: &str| Fault::from(Catalog::shipped().find(text).unwrap_err()).hint().to_owned();
    assert_eq!(hint("methnaol(l)"), "perhaps methanol(l) or ethanol(l)");
    assert_eq!(hint("co2(g)"), "perhaps CO2(g)");
    assert_eq!(hint("CO2"), "write CO2(g) or CO2(aq,undissoc.)");
}

#[test]
fn an_equation_may_hold_a_species_that_is_on_no_record() {
    let catalog = Catalog::shipped();
    let glucose = catalog.species("C6H12O6(cr)").unwrap();
    assert_eq!((&*glucose.id, glucose.composition.to_string().as_str()), ("C6H12O6(cr)", "C6H12O6"));
    assert_eq!(&*catalog.species("CH3OH(l)").unwrap().id, "methanol(l)");
    assert_eq!(&*catalog.species("CO(l)").unwrap().id, "CO(l)");
    for (text, code) in [
        ("C4H10(g)", "name-ambiguous"),
        ("CO2", "phase-missing"),
        ("2H2O(l)", "substance-unknown"),
        ("kryptonite(cr)", "substance-unknown"),
    ] {
        assert_eq!(catalog.species(text).unwrap_err().code(), code, "{text}");
    }
}

#[test]
fn phases_of_one_substance_know_each_other() {
    let catalog = Catalog::shipped();
    let others = |id: &str| -> Vec<String> {
        let substance = catalog.find(id).unwrap();
        catalog.phases_of(&substance).iter().map(|phase| phase.id().to_owned()).collect()
    };
    assert_eq!(others("H2O(l)"), ["H2O(cr,ice-ih)", "H2O(g)"]);
    assert_eq!(others("Fe(cr,gamma)"), ["Fe(cr,alpha)", "Fe(cr,delta)", "Fe(g)", "Fe(l)"]);
    assert_eq!(others("chloroform(l)"), ["trichloromethane(g)"]);
    // Solutions and isomers are not phases.
    assert!(others("CO2(g)").is_empty());
    assert!(others("CO2(aq)").is_empty());
    assert!(others("n-butane(g)").is_empty());
    let transitions = |id: &str| -> Vec<f64> {
        let substance = catalog.find(id).unwrap();
        catalog.transitions_of(&substance).iter().map(|transition| transition.t_k).collect()
    };
    // NASA/TP-2002-211556, Appendix D, p. 228: alpha to gamma at 1184 K, gamma to delta at 1665 K, lambda point 1042 K.
    assert_eq!(transitions("Fe(cr,alpha)"), [1042.0, 1184.0]);
    assert_eq!(transitions("Fe(cr,gamma)"), [1184.0, 1665.0]);
    assert!(transitions("H2O(g)").is_empty());
}

#[test]
fn search_gives_those_that_start_with_the_text_first() {
    let catalog = Catalog::shipped();
    let ids = |text: &str| -> Vec<String> { catalog.search(text).iter().map(|s| s.id().to_owned()).collect() };
    assert_eq!(ids("meth").first().map(String::as_str), Some("CH(g)")); // methylidyne
    assert!(ids("meth").contains(&"iodomethane(g)".to_owned()));
    let ethanol = ids("ethanol");
    assert_eq!(ethanol[..2], ["ethanol(g)".to_owned(), "ethanol(l)".to_owned()]);
    assert!(ethanol.contains(&"methanol(l)".to_owned()));
    assert!(ids("kryptonite").is_empty());
}
