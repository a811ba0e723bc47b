//! The exact text users see when a cell fails: each `messages/*.rhai` against the `.txt` beside it.
//!
//! A script holds one or several cells, parted by a line `// --- next cell`. The expected text has, for every cell that
//! fails, the fault's code in brackets and the fault as it is shown. `UPDATE_MESSAGES=1 cargo test --test messages`
//! writes new texts, to be read before they are committed; without it nothing is ever written.

use std::fmt::Write as _;
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::sync::atomic::AtomicBool;

use hessbook::render::Bundle;
use hessbook::session::outcome::Host;
use hessbook::session::{Session, on_big_stack};

struct Silent;

impl Host for Silent {
    fn write(&mut self, _stderr: bool, _text: &str) {}

    fn show(&mut self, _bundle: &Bundle, _id: Option<&str>) {}

    fn update(&mut self, _bundle: &Bundle, _id: &str) {}
}

/// The faults of a script's cells, as users see them.
fn faults_of(script: &str) -> String {
    let cells: Vec<String> = script.split("// --- next cell\n").map(str::to_owned).collect();
    on_big_stack(move || {
        let mut session = Session::new(Arc::new(AtomicBool::new(false)));
        session.set_folder("tests/messages/files".into());
        let mut text = String::new();
        for (index, cell) in cells.iter().enumerate() {
            let outcome = session.run_cell(&format!("cell-{}", index + 1), cell, &mut Silent);
            if let Err(fault) = outcome.result {
                writeln!(text, "[{}]\n{fault}", fault.code()).expect("a text takes what is written to it");
            }
        }
        text
    })
}

fn scripts() -> Vec<PathBuf> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/messages");
    let mut scripts: Vec<PathBuf> = std::fs::read_dir(folder)
        .expect("the folder of messages is part of the repository")
        .map(|entry| entry.expect("its entries can be read").path())
        .filter(|path| path.extension().is_some_and(|extension| extension == "rhai"))
        .collect();
    scripts.sort();
    scripts
}

#[test]
fn faults_read_as_agreed() {
    let update = std::env::var_os("UPDATE_MESSAGES").is_some_and(|value| value == "1");
    let mut misses = Vec::new();
    for path in scripts() {
        let name = path.file_name().unwrap_or_default().to_string_lossy().into_owned();
        let script = std::fs::read_to_string(&path).expect("scripts are UTF-8");
        let found = faults_of(&script);
        if found.is_empty() {
            misses.push(format!("{name}: no cell fails"));
        }
        let agreed_path = path.with_extension("txt");
        if update {
            std::fs::write(&agreed_path, &found).expect("the folder can be written to");
        }
        let agreed = std::fs::read_to_string(&agreed_path).unwrap_or_default();
        if found != agreed {
            misses.push(format!("{name}\n--- agreed\n{agreed}--- found\n{found}"));
        }
    }
    assert!(misses.is_empty(), "{}", misses.join("\n"));
}

#[test]
fn every_fault_names_a_way_out_and_no_insides_of_the_engine() {
    // Words of the engine's and of Rust's own texts.
    let insides =
        ["anon$", "i64", "f64", "&str", "ImmutableString", "Dynamic", "EvalAltResult", "rhai::", "::types", "FnPtr"];
    let mut seen = 0;
    for path in scripts() {
        let text = faults_of(&std::fs::read_to_string(&path).expect("scripts are UTF-8"));
        for inside in insides {
            assert!(!text.contains(inside), "{} shows {inside}:\n{text}", path.display());
        }
        for fault in text.split("\n[") {
            let hint = fault.lines().last().unwrap_or("");
            assert!(hint.starts_with("  try: ") && hint.len() > 12, "{}: no way out in\n{fault}", path.display());
            seen += 1;
        }
    }
    assert!(seen >= 20, "only {seen} faults were looked at");
}
