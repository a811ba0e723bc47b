//! The rules of the house, read from the files themselves: layers, cards, fault codes, manners, words, papers.
//!
//! Each test below runs one rule over the tree and lists what breaks it with a way to mend it. The rules are functions
//! over texts in `tests/house/`, and each stands beside a test with planted violations, so that none of them can be one
//! that never fails. The tree is the folder the test runs in, which cargo makes the project's root.

#[path = "house/cards.rs"]
mod cards;
#[path = "house/codes.rs"]
mod codes;
#[path = "house/documents.rs"]
mod documents;
#[path = "house/layers.rs"]
mod layers;
#[path = "house/manners.rs"]
mod manners;
#[path = "house/scripts.rs"]
mod scripts;
#[path = "house/source.rs"]
mod source;
#[path = "house/words.rs"]
mod words;

use std::collections::BTreeSet;
use std::fs;
use std::path::Path;
use std::sync::LazyLock;

use hessbook::model::CARDS;
use hessbook::record::register::CLAIMS;

use source::Source;

/// Every text file of the project: path and content.
static TEXTS: LazyLock<Vec<(String, String)>> = LazyLock::new(|| {
    let readable = |path: String| fs::read_to_string(&path).ok().map(|text| (path, text));
    let texts: Vec<(String, String)> = source::files(Path::new(".")).into_iter().filter_map(readable).collect();
    assert!(texts.iter().any(|(path, _)| path == "src/lib.rs"), "the tests do not run in the project's root");
    texts
});

static SOURCES: LazyLock<Vec<Source>> = LazyLock::new(|| {
    let rust = TEXTS.iter().filter(|(path, _)| path.ends_with(".rs"));
    rust.map(|(path, text)| Source::new(path, text)).collect()
});

fn sources(below: &[&str]) -> impl Iterator<Item = &'static Source> {
    SOURCES.iter().filter(|source| below.iter().any(|folder| source.path.starts_with(folder)))
}

fn over(below: &[&str], rule: fn(&Source) -> Vec<String>) -> Vec<String> {
    sources(below).flat_map(rule).collect()
}

#[track_caller]
fn none(found: Vec<String>, mend: &str) {
    assert!(found.is_empty(), "{} found:\n  {}\nhow to mend: {mend}\n", found.len(), found.join("\n  "));
}

#[test]
fn layers_are_one_way() {
    none(
        over(&["src/"], layers::arrows),
        "move the type to the lower module, or hand it down as a parameter or a trait; a new module is entered in \
         LAYERS of tests/house/layers.rs",
    );
}

#[test]
fn names_stay_in_the_room_they_belong_to() {
    none(over(&["src/"], layers::strays), "let the room that owns the name convert to a type of ours, and use that");
}

#[test]
fn layers_that_compute_read_nothing_from_outside() {
    none(
        over(&["src/"], layers::noises),
        "take the value as an argument; session, notebook, kernel and cli read and print",
    );
}

#[test]
fn elementary_functions_come_through_one_door() {
    none(
        over(&["src/"], manners::elementary),
        "use crate::num::math, which gives the same bits on every machine; write small powers as products",
    );
}

#[test]
fn order_comes_from_ordered_collections() {
    none(
        over(&["src/"], manners::unordered),
        "use BTreeMap, BTreeSet or a Vec; where order cannot reach any output, say why in a comment line of the file that \
         begins with `// Unordered:`",
    );
}

#[test]
fn every_file_opens_with_what_it_is_for() {
    none(
        over(&["src/", "tests/", "benches/", "build.rs"], manners::opening),
        "open with `//!`: purpose, main type, the one surprise",
    );
}

#[test]
fn files_are_short() {
    none(over(&["src/", "build.rs"], manners::length), "split it by noun; 600 lines are the most");
}

#[test]
fn nothing_is_left_unfinished() {
    none(
        over(&["src/", "tests/", "benches/", "build.rs"], manners::unfinished),
        "finish it, delete it, or let the test run",
    );
}

#[test]
fn fault_codes_are_kebab_case_and_used_once() {
    let (mut all, mut found) = (Vec::new(), Vec::new());
    for source in sources(&["src/"]) {
        let (codes, misses) = codes::codes(source);
        all.extend(codes);
        found.extend(misses);
    }
    assert!(all.len() > 50, "only {} fault codes were read", all.len());
    found.extend(codes::judged(&all));
    none(found, "name the fault by a phrase of its own, as a literal; cases that share a code share a match arm");
}

#[test]
fn no_hint_is_empty() {
    none(over(&["src/"], codes::empty_hints), "say the way out; every fault has one, even if it is where to look");
}

#[test]
fn cards_are_complete_and_told_apart() {
    let mut found: Vec<String> = CARDS.iter().flat_map(|card| cards::gaps(card)).collect();
    found.extend(cards::clashes(CARDS));
    none(found, "complete the CARD beside its formula in src/model/");
}

#[test]
fn cards_and_register_know_the_same_assumptions() {
    let findings: Vec<(String, String)> = sources(&["src/"]).flat_map(cards::findings).collect();
    let review = sources(&["src/model/review.rs"]).next().map(cards::findings);
    let reviewed: BTreeSet<String> = review.unwrap_or_default().into_iter().map(|(id, _)| id).collect();
    none(
        cards::register(CLAIMS, CARDS, &findings, &reviewed),
        "an assumption is one row of CLAIMS in src/record/register.rs and a claim of each card that rests on it",
    );
}

#[test]
fn every_shipped_record_has_a_published_source() {
    let mut found = Vec::new();
    for (path, text) in TEXTS.iter().filter(|(path, _)| path.starts_with("stdlib/") && path.ends_with(".json")) {
        match serde_json::from_str(text) {
            Ok(table) => found.extend(words::unsourced(path, &table)),
            Err(e) => found.push(format!("{path}: {e}")),
        }
    }
    none(
        found,
        "give the record its publication with table or page, and say how the figure was read; no program is a source",
    );
}

#[test]
fn no_file_carries_words_of_one_machine_or_of_how_work_is_organised() {
    // The lock file names the registry; cargo writes it.
    let ours = TEXTS.iter().filter(|(path, _)| !path.ends_with("Cargo.lock"));
    none(ours.flat_map(|(path, text)| words::unwanted(path, text)).collect(), "say it of the program, or leave it out");
}

#[test]
fn what_the_papers_name_exists() {
    let mut found = Vec::new();
    for paper in ["README.md", "DEVELOPERS.md"] {
        let text = fs::read_to_string(paper).unwrap_or_else(|e| panic!("{paper} cannot be read: {e}"));
        let absent = documents::paths(&text).into_iter().filter(|path| !Path::new(path).exists());
        found.extend(absent.map(|path| format!("{paper}: `{path}` does not exist")));
        if paper == "README.md" {
            found.extend(documents::missing_commands(&text).into_iter().map(|what| format!("{paper}: {what}")));
        }
    }
    let checks = fs::read_to_string(".ci/run").unwrap_or_default();
    found.extend(documents::unchecked_commands(&checks).into_iter().map(|what| format!(".ci/run: {what}")));
    none(found, "correct the paper, or make the file");
}

#[test]
fn scripts_stop_at_errors_and_can_be_started() {
    let mut found = Vec::new();
    for (path, text) in
        TEXTS.iter().filter(|(_, text)| text.starts_with("#!") && text.lines().next().unwrap_or("").ends_with("sh"))
    {
        found.extend(documents::script(path, text, is_executable(path)));
    }
    for path in ["tests/run", ".ci/run", ".ci/long"] {
        if !Path::new(path).exists() {
            found.push(format!("{path} does not exist"));
        }
    }
    none(found, "begin with `#!/usr/bin/env bash` and `set -euo pipefail`, and `chmod +x`");
}

#[cfg(unix)]
fn is_executable(path: &str) -> bool {
    use std::os::unix::fs::PermissionsExt;
    fs::metadata(path).is_ok_and(|file| file.permissions().mode() & 0o111 != 0)
}

#[cfg(not(unix))]
fn is_executable(_: &str) -> bool {
    true // Other systems keep no such mark.
}
