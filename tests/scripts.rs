//! Scripts that must run to their end: each `tests/scripts/*.rhai` states with `require` what has to hold, in the words an
//! analyst would use. A script is one cell for each part between lines `// --- next cell`.

use std::path::Path;
use std::sync::Arc;

use hessbook::render::Bundle;
use hessbook::session::outcome::Host;
use hessbook::session::{Session, on_big_stack};

struct Silent;

impl Host for Silent {
    fn write(&mut self, _stderr: bool, _text: &str) {}

    fn show(&mut self, _bundle: &Bundle, _id: Option<&str>) {}

    fn update(&mut self, _bundle: &Bundle, _id: &str) {}
}

#[test]
fn every_script_holds_what_it_requires() {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/scripts");
    let mut scripts: Vec<_> = std::fs::read_dir(folder).unwrap().map(|entry| entry.unwrap().path()).collect();
    scripts.retain(|path| path.extension().is_some_and(|extension| extension == "rhai"));
    scripts.sort();
    assert!(!scripts.is_empty());
    let misses: Vec<String> = on_big_stack(move || scripts.iter().filter_map(|path| miss(path)).collect());
    assert!(misses.is_empty(), "{}", misses.join("\n\n"));
}

fn miss(path: &Path) -> Option<String> {
    let text = std::fs::read_to_string(path).unwrap();
    let mut session = Session::new(Arc::default());
    let name = path.file_name().unwrap().to_string_lossy();
    text.split("// --- next cell\n").enumerate().find_map(|(nth, cell)| {
        let outcome = session.run_cell(&format!("{name} part {}", nth + 1), cell, &mut Silent);
        outcome.result.err().map(|fault| fault.to_string())
    })
}
