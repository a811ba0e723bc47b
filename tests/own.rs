//! Records of one's own: what a file changes and what it leaves alone, and that no file brings the program down.

use std::fs;
use std::path::Path;
use std::sync::Arc;

use hessbook::data::catalog::{Catalog, T_REFERENCE_K};
use hessbook::data::own::{self, Own};
use hessbook::data::own_fault::OwnFault;
use hessbook::fault::Fault;
use hessbook::model::function;
use hessbook::render::Bundle;
use hessbook::session::outcome::Host;
use hessbook::session::{Session, on_big_stack};
use hessbook::source::Embedded;

struct Silent;

impl Host for Silent {
    fn write(&mut self, _stderr: bool, _text: &str) {}

    fn show(&mut self, _bundle: &Bundle, _id: Option<&str>) {}

    fn update(&mut self, _bundle: &Bundle, _id: &str) {}
}

/// Runs cells in a folder; gives what the last one shows.
fn run(session: &mut Session, cells: &[(&str, &str)]) -> Result<String, Fault> {
    let mut shown = String::new();
    for (name, code) in cells {
        let outcome = session.run_cell(name, code, &mut Silent);
        outcome.result?;
        shown = outcome.shown.map(|bundle| bundle.plain().to_owned()).unwrap_or_default();
    }
    Ok(shown)
}

fn in_folder<T: Send>(files: &[(&str, String)], work: impl FnOnce(&mut Session, &Path) -> T + Send) -> T {
    let folder = tempfile::tempdir().unwrap();
    for (name, text) in files {
        fs::write(folder.path().join(name), text).unwrap();
    }
    on_big_stack(|| {
        let mut session = Session::new(Arc::default());
        session.set_folder(folder.path().to_owned());
        work(&mut session, folder.path())
    })
}

/// A file with these records; all figures are invented unless a test says otherwise.
fn file(extends: Option<&str>, records: &str, transitions: &str) -> String {
    let extends = extends.map_or(String::new(), |id| format!(r#", "extends": "{id}""#));
    format!(
        r#"{{"schema": "hessbook-records/1", "dataset": {{"id": "invented-1", "short": "invented 1",
        "publication": "invented for the tests", "terms": "none"{extends}}},
        "records": [{records}], "transitions": [{transitions}]}}"#
    )
}

fn read(text: &str) -> Result<Own, OwnFault> {
    own::read(&Embedded { path: "file.json", bytes: text.as_bytes(), sha256: "" }, &Catalog::shipped())
}

const AMINE: &str =
    r#"{"id": "amine(l)", "formula": "C5H13NO", "formation_enthalpy": "-385.2(12) kJ/mol", "source": "invented"}"#;
const CARBAMATE: &str = r#"{"id": "carbamate(l)", "formula": "C6H13NO3", "formation_enthalpy": "-865.0 ± 3.0 kJ/mol, k=2", "source": "invented"}"#;

const ABSORPTION: &str = r#"let r = reaction("amine(l) + CO2(g) -> carbamate(l)"); "#;

#[test]
fn a_dataset_is_not_mixed_with_another_unless_it_or_the_analyst_says_so() {
    let both = format!("{AMINE}, {CARBAMATE}");
    let files = [("alone.json", file(None, &both, "")), ("on-codata.json", file(Some("codata-1989"), &both, ""))];
    let load = |name: &str| format!(r#"dataset("{name}");"#);
    let asked = |name: &str, options: &str| {
        in_folder(&files, |session, _| {
            let ask = format!(r#"{ABSORPTION} r.enthalpy("298.15 K"{options}).value("kJ/mol")"#);
            run(session, &[("cell-1", &load(name)), ("cell-2", &ask)])
        })
    };
    let refused = asked("alone.json", "").unwrap_err();
    assert_eq!(refused.code(), "formation-not-covered");
    assert!(refused.message().contains("invented 1 lacks CO2(g)"), "{refused}");
    // ΔfH°(CO2, g) = -393.474 kJ/mol (ATcT 1.112) and -393.51 kJ/mol (CODATA 1989), as shipped.
    let near = |shown: String, co2: f64| {
        let got: f64 = shown.parse().unwrap();
        assert!((got - (-865.0 + 385.2 - co2)).abs() < 1e-9, "{got}");
    };
    near(asked("alone.json", r#", #{ formation: "mixed" }"#).unwrap(), -393.474);
    near(asked("on-codata.json", "").unwrap(), -393.51);
}

#[test]
fn results_that_use_nothing_of_a_file_are_not_changed_by_it() {
    let files = [("plant.json", file(Some("codata-1989"), &format!("{AMINE}, {CARBAMATE}"), ""))];
    let shift = r#"let r = reaction("CO(g) + H2O(g) -> CO2(g) + H2(g)"); r.enthalpy("450 degC").value("kJ/mol")"#;
    let (before, after) = in_folder(&files, |session, _| {
        let before = run(session, &[("cell-1", shift)]).unwrap();
        (before, run(session, &[("cell-2", r#"dataset("plant.json");"#), ("cell-3", shift)]).unwrap())
    });
    assert_eq!(before, after);
}

#[test]
fn a_cell_that_fails_leaves_nothing_of_a_file_and_one_run_again_reads_it_anew() {
    let changed = AMINE.replace("-385.2(12)", "-380.0(12)");
    let files = [("plant.json", file(None, AMINE, "")), ("changed.json", file(None, &changed, ""))];
    in_folder(&files, |session, folder| {
        let ask = ("cell-9", r#"substance("amine(l)").enthalpy("298.15 K").value("kJ/mol")"#);
        let failed = run(session, &[("cell-1", r#"dataset("plant.json"); require(false, "planned")"#)]);
        assert_eq!(failed.unwrap_err().code(), "requirement-failed");
        assert_eq!(run(session, &[ask]).unwrap_err().code(), "substance-unknown");
        assert_eq!(run(session, &[("cell-1", r#"dataset("plant.json");"#), ask]).unwrap(), "-385.2");
        fs::copy(folder.join("changed.json"), folder.join("plant.json")).unwrap();
        assert_eq!(run(session, &[ask]).unwrap(), "-385.2", "a file is read when its cell is run");
        assert_eq!(run(session, &[("cell-1", r#"dataset("plant.json");"#), ask]).unwrap(), "-380.0");
        assert_eq!(run(session, &[("cell-1", "1"), ask]).unwrap_err().code(), "substance-unknown");
    });
}

#[test]
fn what_a_file_stands_before_is_told_in_units_of_u() {
    let water = r#"{"id": "water(l)", "formation_enthalpy": "-285.930(30) kJ/mol", "entropy": "69.9(1) J/(mol K)",
        "heat_capacity": {"form": "powers", "unit": "J/(mol K)", "ranges": [{"from": "280 K", "to": "360 K",
        "coefficients": [{"power": 0, "factor": 75.3}]}]}, "source": "invented"}"#;
    let shown = in_folder(&[("plant.json", file(None, water, ""))], |session, _| {
        run(session, &[("cell-1", r#"dataset("plant.json")"#)]).unwrap()
    });
    // CODATA 1989 prints -285.830 ± 0.040 at 95 %, so u = 0.020 and the two are -0.1/√(0.03² + 0.02²) = -2.8 u apart.
    let before = "formation enthalpy of H2O(l): -285.930 kJ/mol, u = 0.030 stands before -285.830 kJ/mol, u = 0.020 of \
                  CODATA 1989 (-2.8 u apart)";
    assert!(shown.contains(before), "{shown}");
    assert!(shown.contains("heat capacity of H2O(l): 75.30 J/(mol K) at 298.15 K hides 75.35 J/(mol K)"), "{shown}");
}

#[test]
fn a_record_copied_from_a_shipped_table_gives_the_same_bits() {
    let shipped = Catalog::shipped();
    let of = |id: &str| shipped.find(id).unwrap().function.clone().unwrap();
    for id in ["CO2(g)", "SiO2(cr,alpha-quartz)", "H2O(l)"] {
        let function = of(id);
        let range = |one: &hessbook::data::function::Interval| {
            let letters = ["a1", "a2", "a3", "a4", "a5", "a6", "a7"];
            let a: Vec<String> = letters.iter().zip(one.a).map(|(letter, a)| format!(r#""{letter}": {a:?}"#)).collect();
            format!(
                r#"{{"from": "{} K", "to": "{} K", "coefficients": {{{}, "b1": {:?}, "b2": {:?}}}}}"#,
                one.t_min,
                one.t_max,
                a.join(", "),
                one.b[0],
                one.b[1]
            )
        };
        let ranges: Vec<String> = function.intervals.iter().map(range).collect();
        let record = format!(
            r#"{{"id": "{id}", "heat_capacity": {{"form": "nine", "R": "8.31451 J/(mol K)", "ranges": [{}]}}, "source": "copied"}}"#,
            ranges.join(", ")
        );
        let own = read(&file(None, &record, "")).unwrap();
        for t_k in [function.t_min, 298.15, 400.0, function.t_max].into_iter().filter(|t| function.covers(*t)) {
            assert_eq!(function::evaluate(&own.functions[0], t_k), function::evaluate(&function, t_k), "{id} {t_k}");
        }
    }
}

#[test]
fn a_phase_that_melts_out_of_another_meets_it_in_g() {
    let text = fs::read_to_string("notebooks/plant.json").unwrap();
    let (catalog, _) = Catalog::shipped().overlaid(&read(&text).unwrap()).unwrap();
    let at = |id: &str| function::evaluate(catalog.find(id).unwrap().function.as_ref().unwrap(), 341.2);
    let (crystal, liquid) = (at("larkmoor inhibitor(cr)"), at("larkmoor inhibitor(l)"));
    // Bound: rounding at 5e5 J/mol.
    assert!((liquid.h - crystal.h - 18_900.0).abs() < 1e-8);
    assert!((liquid.g(341.2) - crystal.g(341.2)).abs() < 1e-8);
}

#[test]
fn a_high_temperature_phase_keeps_its_own_increment_under_another_heat_capacity_of_the_low_one() {
    let quartz = r#"{"id": "SiO2(cr,alpha-quartz)", "formation_enthalpy": "-911.5(10) kJ/mol", "entropy": "41.0 J/(mol K)",
        "heat_capacity": {"form": "powers", "unit": "J/(mol K)", "ranges": [{"from": "250 K", "to": "840 K",
        "coefficients": [{"power": 0, "factor": 44.6}]}]}, "source": "invented"}"#;
    let shipped = Catalog::shipped();
    let (catalog, _) = shipped.overlaid(&read(&file(None, quartz, "")).unwrap()).unwrap();
    let increment = |catalog: &Catalog| {
        let low = catalog.find("SiO2(cr,alpha-quartz)").unwrap().function.clone().unwrap();
        let high = catalog.find("SiO2(cr,beta-quartz)").unwrap().function.clone().unwrap();
        function::evaluate(&high, 1000.0).h - function::evaluate(&low, T_REFERENCE_K).h
    };
    assert!((increment(&catalog) - increment(&shipped)).abs() < 1e-6);
}

#[test]
fn malformed_files_give_faults_and_never_a_panic() {
    // Seed 20261201. One to four changes to a good file: a byte gone, doubled or replaced, two bytes swapped, a piece cut.
    let good = fs::read("notebooks/plant.json").unwrap();
    let cases = if cfg!(debug_assertions) { 600 } else { 60_000 };
    let mut state: u64 = 20_261_201;
    let mut draw = move |below: usize| {
        state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (state >> 33) as usize % below
    };
    let shipped = Catalog::shipped();
    let (mut refused, mut read) = (0, 0);
    for _ in 0..cases {
        let mut bytes = good.clone();
        for _ in 0..=draw(4) {
            let at = draw(bytes.len());
            match draw(5) {
                0 => drop(bytes.remove(at)),
                1 => bytes.insert(at, bytes[at]),
                2 => bytes[at] = b"\"{}[]:,0-9eE.\\ax\xff"[draw(17)],
                3 => {
                    let other = draw(bytes.len());
                    bytes.swap(at, other);
                }
                _ => drop(bytes.drain(at..(at + 1 + draw(40)).min(bytes.len()))),
            }
        }
        match own::read(&Embedded { path: "file.json", bytes: &bytes, sha256: "" }, &shipped) {
            Ok(own) => {
                read += 1;
                // What is read can be used, though an exponent may have grown beyond all sense.
                if let Ok((catalog, _)) = shipped.overlaid(&own) {
                    for phase in &own.phases {
                        let substance = catalog.find(&phase.id).unwrap();
                        if let Some(function) = &substance.function {
                            function::evaluate(function, function.t_min);
                        }
                    }
                }
            }
            Err(fault) => {
                refused += 1;
                let fault = Fault::from(fault);
                assert!(!fault.message().is_empty() && !fault.hint().is_empty());
                assert!(fault.message().chars().count() < 1000, "{fault}");
            }
        }
    }
    assert!(refused > cases / 2 && read > cases / 50, "{refused} refused, {read} read");
}

#[test]
fn the_example_gives_the_text_that_stands_beside_these_tests() {
    // Written by hand: `hessbook run notebooks/own-data.rhai > tests/own-data.txt`, then read.
    let done =
        assert_cmd::Command::cargo_bin("hessbook").unwrap().args(["run", "notebooks/own-data.rhai"]).output().unwrap();
    assert!(done.status.success(), "{}", String::from_utf8_lossy(&done.stderr));
    assert_eq!(String::from_utf8(done.stdout).unwrap(), fs::read_to_string("tests/own-data.txt").unwrap());
}

#[test]
fn the_command_checks_files_and_compares_datasets() {
    let folder = tempfile::tempdir().unwrap();
    let run = |args: &[&str]| {
        let done = assert_cmd::Command::cargo_bin("hessbook").unwrap().arg("data").args(args).output().unwrap();
        (done.status.code(), String::from_utf8(done.stdout).unwrap())
    };
    assert_eq!(run(&["check", "notebooks/plant.json"]), (Some(0), "0 findings\n".to_owned()));
    assert_eq!(run(&["check"]), (Some(0), "0 findings\n".to_owned()));
    // CODATA 1989 has -285.830 kJ/mol for liquid water.
    let water = r#"{"id": "H2O(l)", "formation_enthalpy": "-258.83(4) kJ/mol", "source": "planted"}"#;
    let planted = folder.path().join("planted.json");
    fs::write(&planted, file(None, water, "")).unwrap();
    let (status, text) = run(&["check", planted.to_str().unwrap()]);
    assert_eq!(status, Some(1));
    assert!(text.contains("likely: -285.83 kJ/mol, two digits having changed places"), "{text}");
    // Water from 300 K on, invented: Cp = 75.0 throughout, so that H grows by 0.75 kJ/mol from row to row; one row has its
    // last digits in the other order.
    let table = folder.path().join("table.csv");
    fs::write(
        &table,
        "T / K,Cp / (J/(K mol)),H / (kJ/mol)\n300,75.0,0.000\n310,75.0,0.750\n320,75.0,1.500\n330,75.0,2.520\n340,75.0,3.000\n350,75.0,3.750\n",
    )
    .unwrap();
    let (status, text) = run(&["check", table.to_str().unwrap()]);
    assert_eq!(status, Some(1));
    assert!(text.contains("row at 330 K") && text.contains("likely: 2.250"), "{text}");
    let (status, text) = run(&["compare", "atct-1.112", "codata-1989"]);
    assert_eq!(status, Some(0));
    assert!(text.contains("CO2(g)  ΔfH°  -393.474, u = "), "{text}");
    assert!(run(&["show", "CO2(g)"]).1.contains("ΔfH°(298.15 K) = -393.474"), "show");
}
