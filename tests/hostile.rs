//! Files that someone made wrong, by accident or on purpose: each costs its own row of an audit, and says what is wrong.
//!
//! `tests/hostile/files` holds whole files, `seals` changes to the seal of a small notebook, `cells` what stands in its cell
//! instead of what was sealed. `tests/hostile/expected.txt` says what an audit makes of each; `UPDATE_HOSTILE=1` writes it
//! anew, to be read. Files that are too large to keep are made here.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

use serde_json::{Value, json};

const CELL: &str = "report(\"typed\", 2 * q(\"1.5(1) kJ\"));";
const EXPECTED: &str = "tests/hostile/expected.txt";

fn hessbook(args: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_hessbook")).args(args).output().unwrap()
}

fn own(kind: &str) -> Vec<(String, Vec<u8>)> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/hostile").join(kind);
    let mut all: Vec<_> = std::fs::read_dir(folder)
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .map(|path| (path.file_stem().unwrap().to_string_lossy().into_owned(), std::fs::read(path).unwrap()))
        .collect();
    all.sort();
    all
}

/// Writes what is hostile into a folder, under names that say of which kind it is.
struct Archive {
    folder: tempfile::TempDir,
    /// A small notebook, sealed.
    sealed: Value,
}

impl Archive {
    fn new() -> Archive {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("good.ipynb");
        let cell = json!({"cell_type": "code", "id": "a", "metadata": {}, "source": CELL, "execution_count": null, "outputs": []});
        let tree = json!({"cells": [cell], "metadata": {}, "nbformat": 4, "nbformat_minor": 5});
        std::fs::write(&path, tree.to_string()).unwrap();
        let output = hessbook(&["seal", path.to_str().unwrap()]);
        assert!(output.status.success(), "{output:?}");
        let sealed = serde_json::from_slice(&std::fs::read(&path).unwrap()).unwrap();
        Archive { folder, sealed }
    }

    fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    fn file(&self, name: &str, bytes: &[u8]) {
        std::fs::write(self.path(&format!("{name}.ipynb")), bytes).unwrap();
    }

    /// The sealed notebook with members of its seal exchanged, each by its place as RFC 6901 writes it.
    fn with_seal(&self, name: &str, changes: &Value) {
        let mut tree = self.sealed.clone();
        for (place, value) in changes.as_object().unwrap() {
            let seal = &mut tree["metadata"]["hessbook_seal"];
            let value = match value.as_str().and_then(|words| words.strip_prefix("copy of ")) {
                Some(other) => seal.pointer(other).unwrap().clone(),
                None => value.clone(),
            };
            match seal.pointer_mut(place) {
                Some(there) => *there = value,
                // One after the last of a list, or a member that is left out where it is empty.
                None => {
                    let (within, member) = place.rsplit_once('/').unwrap();
                    match seal.pointer_mut(within) {
                        Some(Value::Array(list)) => list.push(value),
                        Some(Value::Object(members)) => drop(members.insert(member.to_owned(), value)),
                        _ => panic!("{name}: nothing at {place}"),
                    }
                }
            }
        }
        self.file(name, tree.to_string().as_bytes());
    }

    fn with_cell(&self, name: &str, source: &str) {
        let mut tree = self.sealed.clone();
        tree["cells"][0]["source"] = json!(source);
        self.file(name, tree.to_string().as_bytes());
    }

    /// Every audit, by the name of its file, and what was said on the terminal.
    fn audits(&self, more: &[&str]) -> (BTreeMap<String, Value>, Output) {
        let (folder, state) = (self.folder.path().display().to_string(), self.path("state.json"));
        let mut args = vec!["audit", &folder, "--resume", state.to_str().unwrap()];
        args.extend(more);
        let output = hessbook(&args);
        let text = std::fs::read_to_string(&state).unwrap_or_else(|_| panic!("{output:?}"));
        let mut audits = BTreeMap::new();
        for line in text.lines() {
            let line: Value = serde_json::from_str(line).unwrap();
            if let Some(audit) = line.pointer("/audit/audit") {
                let file = Path::new(audit["file"].as_str().unwrap());
                audits.insert(file.file_stem().unwrap().to_string_lossy().into_owned(), audit.clone());
            }
        }
        (audits, output)
    }
}

/// What is worth keeping of an audit: its status, the verdicts, the codes of faults, what is wrong with the seal.
fn words(audit: &Value) -> String {
    let texts = |list: &Value, pointer: &str| -> Vec<String> {
        let all = list.as_array().into_iter().flatten();
        all.filter_map(|one| one.pointer(pointer)?.as_str().map(str::to_owned)).collect()
    };
    let mut words = vec![audit["status"].as_str().unwrap().to_owned()];
    words.extend(texts(&audit["values"], "/under_sealed/verdict"));
    let mut codes = texts(&audit["faults"], "/fault/code");
    codes.dedup();
    // Which limit an endless cell comes to first depends on the machine.
    let lost = ["audit-overdue", "audit-out-of-memory"];
    codes.iter_mut().filter(|code| lost.contains(&code.as_str())).for_each(|code| *code = lost.join(" or "));
    words.extend(codes);
    if audit.pointer("/seal/whole") == Some(&json!(false)) {
        words.push("seal altered".to_owned());
    }
    if audit.pointer("/seal/signed/invalid").is_some() {
        words.push("signature does not hold".to_owned());
    }
    words.join(", ")
}

#[test]
fn each_costs_its_own_row_and_says_what_is_wrong() {
    let archive = Archive::new();
    for (name, bytes) in own("files") {
        archive.file(&format!("file-{name}"), &bytes);
    }
    for (name, bytes) in own("seals") {
        archive.with_seal(&format!("seal-{name}"), &serde_json::from_slice(&bytes).unwrap());
    }
    for (name, bytes) in own("cells") {
        archive.with_cell(&format!("cell-{name}"), &String::from_utf8(bytes).unwrap());
    }
    // Debug builds run cells some twenty times slower: what ends by itself must have the time for it.
    let (audits, output) = archive.audits(&["--time-limit", "12", "--memory-limit", "192", "--from-sources"]);
    assert_eq!(audits["good"]["status"], "same", "{:?}", audits["good"]);
    assert_eq!(output.status.code(), Some(2));
    let made = std::fs::read_dir(archive.folder.path()).unwrap().count();
    assert_eq!(audits.len(), made - 1, "one row for each file but the state");
    assert!(audits.len() > 50);
    let text = String::from_utf8(output.stdout).unwrap();
    assert!(!text.contains(|c: char| c.is_control() && c != '\n'), "no label steers a terminal");
    let (rows, summary) = text.split_once(&format!("\n{} notebooks audited", audits.len())).unwrap();
    let rows = rows.lines().filter(|line| !line.starts_with(' ')).count();
    assert_eq!(rows, audits.len(), "no label forges a row");
    let not_same =
        audits.values().filter(|audit| ["differs", "could-not-run"].contains(&audit["status"].as_str().unwrap()));
    let (_, listed) = summary.split_once("\nnot the same\n").unwrap();
    assert_eq!(listed.lines().count(), not_same.count(), "nor a line of the summary");
    let found: String = audits.iter().map(|(name, audit)| format!("{name}: {}\n", words(audit))).collect();
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join(EXPECTED);
    if std::env::var_os("UPDATE_HOSTILE").is_some() {
        std::fs::write(path, found).unwrap();
        return;
    }
    let expected = std::fs::read_to_string(path).unwrap();
    for (found, expected) in found.lines().zip(expected.lines()) {
        assert_eq!(found, expected);
    }
    assert_eq!(found, expected);
    let outside = Path::new("/tmp/hessbook-must-not-be-written.csv");
    assert!(!outside.exists(), "an audit writes nothing beside the notebook or elsewhere");
}

#[cfg(unix)]
#[test]
fn what_is_no_file_or_too_large_costs_its_own_row() {
    let archive = Archive::new();
    let link = |to: &Path, name: &str| std::os::unix::fs::symlink(to, archive.path(name)).unwrap();
    link(&archive.path("to-itself.ipynb"), "to-itself.ipynb");
    link(Path::new("nowhere.ipynb"), "to-nothing.ipynb");
    link(Path::new("/dev/zero"), "to-device.ipynb");
    link(&archive.path("good.ipynb"), "to-good.ipynb");
    std::fs::create_dir(archive.path("a-folder.ipynb")).unwrap();
    assert!(Command::new("mkfifo").arg(archive.path("a-pipe.ipynb")).status().unwrap().success());
    let mut large = archive.sealed.clone();
    large["cells"][0]["outputs"] = json!([{"output_type": "stream", "name": "stdout", "text": "x".repeat(200 << 20)}]);
    archive.file("large-output", large.to_string().as_bytes());
    let mut deep = archive.sealed.to_string();
    deep.insert_str(1, &format!("\"deep\":{}{},", "[".repeat(4 << 20), "]".repeat(4 << 20)));
    archive.file("deep", deep.as_bytes());
    let (audits, output) = archive.audits(&["--memory-limit", "1024"]);
    let found: Vec<String> = audits.iter().map(|(name, audit)| format!("{name}: {}", words(audit))).collect();
    assert_eq!(
        found,
        [
            "a-pipe: could-not-run, file-unreadable",
            "deep: could-not-run, not-a-notebook",
            "good: same, identical",
            "large-output: same, identical",
            "to-device: could-not-run, file-unreadable",
            "to-good: same, identical",
            "to-itself: could-not-run, file-unreadable",
            "to-nothing: could-not-run, file-unreadable",
        ],
        "{output:?}"
    );
    // The same large one where there is not the memory to read it, and where there is not enough to take it apart.
    std::fs::remove_file(archive.path("state.json")).unwrap();
    let (audits, _) = archive.audits(&["--memory-limit", "250", "--jobs", "1"]);
    assert_eq!(words(&audits["large-output"]), "could-not-run, audit-overdue or audit-out-of-memory");
    std::fs::remove_file(archive.path("state.json")).unwrap();
    let (audits, _) = archive.audits(&["--memory-limit", "64", "--jobs", "1"]);
    assert_eq!(words(&audits["large-output"]), "could-not-run, notebook-out-of-memory");
    assert_eq!(words(&audits["good"]), "same, identical");
}
