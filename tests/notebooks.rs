//! The shipped notebooks as goldens: run anew, they must give the records that stand in their files, to the last digit.
//!
//! Goldens and seals are written by hand (`hessbook seal notebooks/*.ipynb`, then read the difference), never by a test. Because a golden
//! only says that nothing changed, the figures are compared with their sources too: recomputed here from the shipped
//! tables by code that shares nothing with the program but the files.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use hessbook::notebook::file::{NotebookFile, Output};
use hessbook::notebook::run::{RunRecord, RunStatus, Source, Watcher, run};
use hessbook::notebook::seal::{KEY, Seal};
use hessbook::render::Bundle;
use hessbook::render::report::{MIME, Record};
use hessbook::session::{Session, on_big_stack};
use serde::Deserialize;
use serde_json::Value;

struct Quiet;

impl Watcher for Quiet {
    fn begins(&mut self, _cell: &str, _nth: usize, _of: usize) {}

    fn gives(&mut self, _output: &Output) {}

    fn updates(&mut self, _bundle: &Bundle) {}
}

fn notebooks() -> Vec<PathBuf> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("notebooks");
    let mut found: Vec<PathBuf> = std::fs::read_dir(folder).unwrap().map(|entry| entry.unwrap().path()).collect();
    found.retain(|path| path.extension().is_some_and(|extension| extension == "ipynb"));
    found.sort();
    found
}

fn ran(path: &Path) -> RunRecord {
    let path = path.to_owned();
    on_big_stack(move || {
        let mut source = Source::read(&path).unwrap();
        let mut session = Session::new(Arc::default());
        // By its path, since it may use a module or a table that lies beside it.
        run(&path.to_string_lossy(), &mut source, &mut session, &mut Quiet)
    })
}

/// The records that stand in a notebook's outputs.
fn recorded(path: &Path) -> Vec<Record> {
    let tree: Value = serde_json::from_slice(&std::fs::read(path).unwrap()).unwrap();
    let cells = tree["cells"].as_array().unwrap();
    let outputs = cells.iter().filter_map(|cell| cell["outputs"].as_array()).flatten();
    outputs.filter_map(|output| output["data"].get(MIME)).map(|record| Record::deserialize(record).unwrap()).collect()
}

#[test]
fn each_notebook_gives_the_records_that_stand_in_its_file() {
    let all = notebooks();
    assert!(!all.is_empty());
    for path in all {
        let record = ran(&path);
        assert_eq!(record.status, RunStatus::Ok, "{}: {:?}", path.display(), record.faults);
        let (now, golden) = (record.reports, recorded(&path));
        assert_eq!(now.len(), golden.len(), "{}", path.display());
        for (now, golden) in now.iter().zip(&golden) {
            assert_eq!(now, golden, "{}: {}", path.display(), now.label);
        }
    }
}

#[test]
fn seal_and_outputs_of_the_shipped_notebooks_say_the_same() {
    // Both are written by `hessbook seal notebooks/*.ipynb`; a golden made anew by other means would leave the seal behind.
    for path in notebooks() {
        let notebook = NotebookFile::read(&path).unwrap();
        let seal = Seal::deserialize(notebook.metadata(KEY).unwrap()).unwrap();
        let recorded = notebook.recorded(MIME);
        let sealed: Vec<Value> = seal.values.iter().map(|value| serde_json::to_value(&value.record).unwrap()).collect();
        assert_eq!(
            recorded,
            sealed.iter().collect::<Vec<_>>(),
            "{}: seal it again with `target/debug/hessbook seal notebooks/*.ipynb`",
            path.display()
        );
        let cells: Vec<String> = notebook.code_cells().into_iter().map(|cell| cell.name).collect();
        assert_eq!(seal.cells.into_iter().map(|cell| cell.name).collect::<Vec<_>>(), cells);
    }
}

/// H(T) − H(298.15 K) in J/mol by Simpson's rule on Cp, from the polynomials as the file has them.
fn increment_by_quadrature(id: &str, t: f64) -> f64 {
    let tables: Value =
        serde_json::from_str(include_str!("../stdlib/data/nasa-tp-2002-211556-functions.json")).unwrap();
    let record = tables["records"].as_array().unwrap().iter().find(|record| record["id"] == id).unwrap();
    let intervals = record["intervals"].as_array().unwrap();
    let number = |value: &Value| value.as_f64().unwrap();
    let cp = |t: f64| {
        let interval = intervals.iter().find(|i| number(&i["t"][0]) <= t && t <= number(&i["t"][1])).unwrap();
        (0..7).map(|k| number(&interval["a"][k]) * t.powi(k as i32 - 2)).sum::<f64>() * number(&tables["r_j_mol_k"])
    };
    let steps = 400;
    let h = (t - 298.15) / f64::from(steps);
    let weight = |i: i32| {
        if i == 0 || i == steps {
            1.0
        } else if i % 2 == 1 {
            4.0
        } else {
            2.0
        }
    };
    (0..=steps).map(|i| weight(i) * cp(298.15 + f64::from(i) * h)).sum::<f64>() * h / 3.0
}

/// ΔfH°(298.15 K) in kJ/mol as printed.
fn printed_formation(id: &str) -> f64 {
    let table: Value = serde_json::from_str(include_str!("../stdlib/data/atct-1.112.json")).unwrap();
    let record = table["records"].as_array().unwrap().iter().find(|record| record["id"] == id).unwrap();
    record["dhf_298"]["value"].as_str().unwrap().parse().unwrap()
}

#[test]
fn the_shift_converter_agrees_with_its_sources() {
    // ATcT 1.112 and NASA/TP-2002-211556, read from the shipped files. Bound: Simpson's rule with 400 steps on smooth
    // functions, far below 1e-6 kJ/mol.
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("notebooks/shift-converter.ipynb");
    let records = recorded(&path);
    let shift = [("CO(g)", -1.0), ("H2O(g)", -1.0), ("CO2(g)", 1.0), ("H2(g)", 1.0)];
    let methanation = [("CO(g)", -1.0), ("H2(g)", -3.0), ("CH4(g)", 1.0), ("H2O(g)", 1.0)];
    let enthalpy = |terms: &[(&str, f64)], t: f64| -> f64 {
        terms.iter().map(|(id, nu)| nu * (printed_formation(id) + increment_by_quadrature(id, t) / 1000.0)).sum()
    };
    let (inlet, outlet) = (320.0 + 273.15, 430.0 + 273.15);
    for (label, expected) in [
        ("shift enthalpy at inlet", enthalpy(&shift, inlet)),
        ("shift enthalpy at outlet", enthalpy(&shift, outlet)),
        ("methanation enthalpy at outlet", enthalpy(&methanation, outlet)),
        // R from the SI Brochure, 9th ed.: product of two defining constants.
        (
            "methanation internal energy at outlet",
            enthalpy(&methanation, outlet) + 2.0 * 8.314_462_618_153_24e-3 * outlet,
        ),
    ] {
        let record = records.iter().find(|record| record.label == label).unwrap();
        let value: f64 = record.value.parse().unwrap();
        assert!((value - expected).abs() < 1e-6, "{label}: {value}, recomputed {expected} kJ/mol");
    }
}

#[test]
fn the_methanol_loop_agrees_with_its_sources() {
    // As above; elements are not listed in the table of formation enthalpies and count as zero. Flows as the notebook has them;
    // 10.0 kg/h and 8.4 kg/h by atomic weights of CIAAW 2021, C 12.011, H 1.008, N 14.007. Bound: Simpson's rule, and seven
    // digits of the molar masses of what passes through.
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("notebooks/methanol-loop.ipynb");
    let records = recorded(&path);
    let value =
        |label: &str| -> f64 { records.iter().find(|record| record.label == label).unwrap().value.parse().unwrap() };
    let elements = ["H2(g)", "N2(g)"];
    let h = |id: &str, t: f64| {
        let formation = if elements.contains(&id) { 0.0 } else { printed_formation(id) };
        formation + increment_by_quadrature(id, t) / 1000.0
    };
    let sum = |stream: &[(&str, f64)], t: f64| -> f64 { stream.iter().map(|(id, n)| n / 3.6 * h(id, t)).sum() };
    let (methane, nitrogen) = (10.0 / 16.043, 8.4 / 28.014);
    let (fresh, recycle) = (
        [("CO(g)", 6.2), ("CO2(g)", 2.4), ("H2(g)", 17.5), ("CH4(g)", methane), ("N2(g)", nitrogen)],
        [("CO(g)", 3.0), ("CO2(g)", 5.0), ("H2(g)", 60.0), ("CH4(g)", 9.0), ("N2(g)", 5.0), ("methanol(g)", 0.4)],
    );
    let (by_co, by_co2) = (0.55 * 9.2, 1.9);
    let leaving = [
        ("CO(g)", 9.2 - by_co),
        ("CO2(g)", 7.4 - by_co2),
        ("H2(g)", 77.5 - 2.0 * by_co - 3.0 * by_co2),
        ("CH4(g)", 9.0 + methane),
        ("N2(g)", 5.0 + nitrogen),
        ("methanol(g)", 0.4 + by_co + by_co2),
        ("H2O(g)", by_co2),
    ];
    let fed = sum(&fresh, 215.0 + 273.15) + sum(&recycle, 228.0 + 273.15);
    let duty = sum(&leaving, 255.0 + 273.15) - fed;
    assert!((value("heat duty of the reactor") - duty).abs() < 1e-5, "{duty} kW");
    let hot = value("adiabatic temperature");
    assert!((sum(&leaving, hot) - fed).abs() < 1e-5, "{hot} K");
}
