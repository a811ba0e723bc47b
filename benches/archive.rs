//! The audit of a thousand sealed notebooks, beside the run of notebooks of the same polynomials by a Python kernel.
//!
//! `benches/archive.py` runs ten cells each by the reference client with a fresh kernel for each notebook, as many at a time
//! as there are cores. Only what a notebook costs is compared. The surprise: an audit does more than that run, since it reads
//! the seal, tests every assumption again and compares.

use std::cell::Cell;
use std::path::Path;
use std::process::{Command, Stdio};
use std::time::{Duration, Instant};

use hessbook::model::card::{self, Cx, References, Value};
use hessbook::model::property_card::ENTHALPY;
use hessbook::model::reaction::REACTION;
use hessbook::units::constants;
use serde_json::json;

#[path = "shared/polynomials.rs"]
mod polynomials;
use polynomials::species;

const SHIFT: &str = "CO(g) + H2O(g) -> CO2(g) + H2(g)";
const NOTEBOOKS: usize = 1000;
/// Few, since each takes a good second.
const THEIRS: usize = 24;
const PROGRAM: &str = env!("CARGO_BIN_EXE_hessbook");
const PYTHON: &str = ".venv/bin/python";
const SETUP: &str = "`tests/client/bench` sets it up";

/// Up to 600 degC, in steps that are numbers of few digits.
fn celsius(n: usize) -> f64 {
    300.0 + 0.3 * n as f64
}

/// Ten cells: a reaction at a temperature of its own, the register, three reports.
fn cells(n: usize) -> [String; 10] {
    [
        format!("let shift = reaction(\"{SHIFT}\");"),
        format!("let T = q(\"{} degC\");", celsius(n)),
        "let dH = shift.enthalpy(T);".to_owned(),
        "let dS = shift.entropy(T);".to_owned(),
        "let dG = shift.gibbs_energy(T);".to_owned(),
        "report(\"enthalpy\", dH)".to_owned(),
        "report(\"entropy\", dS)".to_owned(),
        "report(\"Gibbs energy\", dG)".to_owned(),
        "let ratio = dG / dH;".to_owned(),
        "assumptions()".to_owned(),
    ]
}

fn write_archive(folder: &Path) {
    for n in 0..NOTEBOOKS {
        let cells = cells(n);
        let cells: Vec<_> = (cells.iter().enumerate())
            .map(|(nth, source)| {
                json!({"cell_type": "code", "id": format!("c{nth}"), "metadata": {}, "source": source,
                    "execution_count": null, "outputs": []})
            })
            .collect();
        let tree = json!({"cells": cells, "metadata": {}, "nbformat": 4, "nbformat_minor": 5});
        std::fs::write(folder.join(format!("{n:04}.ipynb")), tree.to_string()).expect("a temporary folder is writable");
    }
}

/// Resident memory of a process and of those that it started, in MiB.
fn resident_mib(pid: u32) -> f64 {
    let field = |pid: &str, file: &str, name: &str| -> Option<u64> {
        let text = std::fs::read_to_string(format!("/proc/{pid}/{file}")).ok()?;
        text.lines().find_map(|line| line.strip_prefix(name))?.split_whitespace().next()?.parse().ok()
    };
    let mut kib = 0;
    for entry in std::fs::read_dir("/proc").into_iter().flatten().flatten() {
        let name = entry.file_name().to_string_lossy().into_owned();
        let is_own = name == pid.to_string() || field(&name, "status", "PPid:") == Some(u64::from(pid));
        if is_own {
            kib += field(&name, "status", "VmRSS:").unwrap_or(0);
        }
    }
    kib as f64 / 1024.0
}

/// Wall time and greatest resident memory of an audit.
fn audit(folder: &Path) -> (f64, f64) {
    let start = Instant::now();
    let mut child = Command::new(PROGRAM)
        .arg("audit")
        .arg(folder)
        .stdout(Stdio::null())
        .spawn()
        .unwrap_or_else(|e| panic!("{PROGRAM}: {e}"));
    let mut most: f64 = 0.0;
    let status = loop {
        if let Some(status) = child.try_wait().expect("it was started here") {
            break status;
        }
        most = most.max(resident_mib(child.id()));
        std::thread::sleep(Duration::from_millis(20));
    };
    assert!(status.success(), "every notebook is the same as sealed: {status}");
    (start.elapsed().as_secs_f64(), most)
}

fn main() {
    let folder = tempfile::tempdir().expect("there is space for temporary files");
    write_archive(folder.path());
    let start = Instant::now();
    let mut paths: Vec<_> = std::fs::read_dir(folder.path()).unwrap().map(|entry| entry.unwrap().path()).collect();
    paths.sort();
    let sealed = Command::new(PROGRAM).args(["seal", "--draft"]).args(&paths).stdout(Stdio::null()).status();
    assert!(sealed.is_ok_and(|status| status.success()), "the notebooks are sealed");
    let sealing = start.elapsed().as_secs_f64();
    let bytes: u64 = paths.iter().filter_map(|path| path.metadata().ok()).map(|facts| facts.len()).sum();
    let (seconds, mib) = audit(folder.path());
    let cores = std::thread::available_parallelism().map_or(1, usize::from);
    let per = seconds / NOTEBOOKS as f64;
    println!(
        "\n{NOTEBOOKS} sealed notebooks of ten cells, {:.0} kB each, {cores} cores",
        bytes as f64 / 1e3 / NOTEBOOKS as f64
    );
    println!("  {:<52}{sealing:>9.2} s", "sealed, one after the other");
    println!("  {:<52}{seconds:>9.2} s     (aim: less than 10)", "audited");
    println!("  {:<52}{:>9.2} ms", "for each notebook", per * 1e3);
    println!("  {:<52}{mib:>9.0} MiB   (aim: less than 300)", "greatest memory, all processes together");
    match theirs(cores) {
        Err(why) => println!("  nothing to compare with: {why}; {SETUP}"),
        Ok(seconds) => {
            let each = seconds / THEIRS as f64;
            println!("  {:<52}{:>9.0} ms", "one of the same polynomials in a Python kernel", each * 1e3);
            println!("  {:<52}{:>9.0}      (aim: 100 or more)", "times as cheap", each / per);
        }
    }
}

/// Seconds of the Python side for all its notebooks, whose enthalpies are compared with those here.
fn theirs(cores: usize) -> Result<f64, String> {
    let (references, ordinal) = (References::new(constants::current()), Cell::new(0));
    let cx = Cx { references: &references, place: None, ordinal: &ordinal, halted: &|| None };
    let called = |card, arguments| card::call(&cx, card, arguments).map_err(|fault| fault.to_string());
    let reaction = called(&REACTION, vec![Value::Text(SHIFT.into())])?;
    let kelvin: Vec<f64> = (0..THEIRS).map(|n| celsius(n) + 273.15).collect();
    let told = json!({ "temperatures": kelvin, "species": species(&reaction, &cx) });
    let mut python = Command::new(PYTHON);
    python.args(["benches/archive.py", &cores.to_string()]);
    python.stdin(Stdio::piped()).stdout(Stdio::piped()).stderr(Stdio::piped());
    let mut child = python.spawn().map_err(|e| format!("{PYTHON}: {e}"))?;
    let input = child.stdin.take().expect("it was piped");
    serde_json::to_writer(input, &told).map_err(|e| e.to_string())?;
    let output = child.wait_with_output().map_err(|e| e.to_string())?;
    let said: serde_json::Value = serde_json::from_slice(&output.stdout)
        .map_err(|_| String::from_utf8_lossy(&output.stderr).lines().last().unwrap_or("no word").to_owned())?;
    for (t_k, there) in kelvin.iter().zip(said["enthalpies"].as_array().into_iter().flatten()) {
        let here = match called(&ENTHALPY, vec![reaction.clone(), Value::Text(format!("{t_k} K").into())])? {
            Value::Quantity(value) => value.si(),
            other => panic!("a quantity was asked for, not {}", other.sort()),
        };
        let there: f64 = there.as_str().and_then(|text| text.parse().ok()).ok_or("no enthalpy was printed")?;
        // Bound: a dozen terms of 1e6 J/mol at most, each rounded to 1e-16 of itself.
        assert!((here - there).abs() < 1e-8, "{here} J/mol here and {there} there, at {t_k} K");
    }
    said["seconds"].as_f64().ok_or_else(|| "no time was given".to_owned())
}
