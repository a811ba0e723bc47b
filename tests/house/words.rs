//! Words that the project's files do not carry, and the sources that its data must.
//!
//! The surprise: the words are written in two halves here, so that this file is read by its own rule like any other.

use serde_json::Value;

use crate::source::words;

/// Folders at the root of one machine or account.
const ROOTS: [&str; 8] = ["home", "root", "srv", "mnt", "work", "farm", "Users", "scratch"];

/// How work is organised, what is left undone, and hosts that only a tool of its own should name.
const UNWANTED: [(&str, &str); 14] = [
    ("work", "tree"),
    ("pull", " request"),
    ("merge", " request"),
    ("sub", "agent"),
    ("sub-", "agent"),
    ("language", " model"),
    ("chat", "bot"),
    ("TO", "DO"),
    ("FIX", "ME"),
    ("XX", "X"),
    ("issue", " #"),
    ("crates", ".io"),
    ("pypi", ".org"),
    ("registry.", "npmjs"),
];

/// Unwanted words, paths of one machine and commit ids in a file of any sort.
pub fn unwanted(path: &str, text: &str) -> Vec<String> {
    let mut found = Vec::new();
    let phrases = UNWANTED.map(|(first, second)| format!("{first}{second}"));
    for (line, text) in (1..).zip(text.lines()) {
        let lower = text.to_lowercase();
        for phrase in &phrases {
            // Upper-case marks as such; the rest in any case, as words of their own and not inside another.
            let marks = phrase.chars().any(char::is_uppercase);
            if stands_in(if marks { text } else { &lower }, phrase) {
                found.push(format!("{path}:{line}: `{phrase}`"));
            }
        }
        if let Some(root) = ROOTS.iter().find(|root| has_machine_path(text, root)) {
            found.push(format!("{path}:{line}: a path below /{root}"));
        }
        let is_commit = |word: &str| word.len() == 40 && word.chars().all(|c| c.is_ascii_hexdigit());
        if words(text).iter().any(|(_, word)| is_commit(word)) {
            found.push(format!("{path}:{line}: the id of a commit"));
        }
    }
    found
}

fn stands_in(text: &str, phrase: &str) -> bool {
    text.match_indices(phrase).any(|(at, _)| {
        let outside = |c: Option<char>| c.is_none_or(|c| !c.is_alphanumeric());
        let closed = phrase.ends_with(|c: char| !c.is_alphanumeric());
        // A plural is the same word.
        let after = text[at + phrase.len()..].trim_start_matches('s');
        outside(text[..at].chars().next_back()) && (closed || outside(after.chars().next()))
    })
}

fn has_machine_path(text: &str, root: &str) -> bool {
    text.match_indices(&format!("/{root}/")).any(|(at, path)| {
        // Inside a longer path it is a folder of ours, and in a unit a divisor.
        let before = text[..at].chars().next_back();
        let starts = before.is_none_or(|c| !(c.is_alphanumeric() || "._-)]}*$".contains(c)));
        starts && text[at + path.len()..].starts_with(|c: char| c.is_alphanumeric() || c == '.' || c == '_')
    })
}

/// The members of a table that hold records.
const LISTS: [&str; 5] = ["records", "critical_constants", "second_virial", "condensed_volumes", "vapour_pressures"];

/// Records of a shipped table that do not say where they were printed, and sources that are programs.
pub fn unsourced(path: &str, table: &Value) -> Vec<String> {
    let mut found = Vec::new();
    let said = |value: &Value| value.as_str().is_some_and(|text| !text.trim().is_empty());
    let editions = &table["editions"];
    let lists: Vec<&Vec<Value>> = LISTS.iter().filter_map(|list| table[*list].as_array()).collect();
    if lists.is_empty() && !said(&table["source"]) {
        found.push(format!("{path}: neither records nor a source"));
    }
    for (nth, record) in lists.into_iter().flat_map(|records| records.iter().enumerate()) {
        // A table may give the sources once, by edition.
        let edition = editions.get(record["edition"].to_string());
        if !said(&record["source"]) && !edition.is_some_and(said) {
            let name = record["id"]
                .as_str()
                .or(record["symbol"].as_str())
                .map_or(format!("record {}", nth + 1), str::to_owned);
            found.push(format!("{path}: {name} has no source"));
        }
    }
    if let Some(dataset) = table.get("dataset") {
        for member in ["publication", "terms"] {
            if !said(&dataset[member]) {
                found.push(format!("{path}: the dataset has no {member}"));
            }
        }
    }
    programs(path, "", table, &mut found);
    found
}

/// Looks through everything that names a source for what only a program is called.
fn programs(path: &str, member: &str, value: &Value, found: &mut Vec<String>) {
    match value {
        Value::String(text) if ["source", "obtained", "publication", "read_from", "editions"].contains(&member) => {
            if let Some(sign) = sign_of_a_program(text) {
                found.push(format!("{path}: {member} `{text}` names a program ({sign})"));
            }
        }
        Value::Array(values) => values.iter().for_each(|value| programs(path, member, value, found)),
        Value::Object(members) => {
            for (name, value) in members {
                let member = if member == "editions" { member } else { name };
                programs(path, member, value, found);
            }
        }
        _ => {}
    }
}

fn sign_of_a_program(text: &str) -> Option<&'static str> {
    let lower = text.to_lowercase();
    let nouns = ["software", "library", "package", "module", "repository", "python", "github"];
    if let Some(noun) = nouns.into_iter().find(|noun| words(&lower).iter().any(|(_, word)| word == noun)) {
        return Some(noun);
    }
    // Three numbers with points: no table and no report is numbered so. A DOI has slashes.
    let version = |word: &str| {
        let numbers: Vec<&str> = word.trim_start_matches('v').split('.').collect();
        numbers.len() == 3 && numbers.iter().all(|n| !n.is_empty() && n.chars().all(|c| c.is_ascii_digit()))
    };
    let pieces = text.split(|c: char| c.is_whitespace() || ",;()=".contains(c));
    pieces.map(|piece| piece.trim_end_matches('.')).any(version).then_some("a version of three numbers")
}

#[test]
fn an_unwanted_word_or_path_is_found_and_its_neighbours_are_not() {
    for (first, second) in UNWANTED {
        let text = format!("see the {first}{second} 7");
        assert_eq!(unwanted("a.md", &text).len(), 1, "{text}");
    }
    assert_eq!(unwanted("a.md", &format!("two Sub{}s", "agents".trim_end_matches('s'))).len(), 1);
    for root in ROOTS {
        for text in [format!("cd /{root}/someone"), format!("path = \"/{root}/x\""), format!("file:///{root}/x")] {
            assert_eq!(unwanted("run", &text).len(), 1, "{text}");
        }
    }
    assert_eq!(unwanted("a.md", &format!("as of {}", "0a1b2".repeat(8))).len(), 1);
    for text in [
        "kJ/mol/work/s",
        "tests/work/cases",
        "$HOME/work/x",
        "the tissue #1",
        "framework trees",
        "0a1b2",
        "AXXX",
        "an oxidising agent",
        "https://example.org/home/x",
        "a digest of sixty-four",
    ] {
        assert_eq!(unwanted("a.md", text), Vec::<String>::new(), "{text}");
    }
    assert_eq!(unwanted("a.md", &"0a1b2c3d".repeat(8)), Vec::<String>::new(), "a SHA-256 is no commit");
}

#[test]
fn a_figure_without_source_or_from_a_program_is_found() {
    let table = |text: &str| unsourced("t.json", &serde_json::from_str(text).unwrap()).len();
    assert_eq!(table(r#"{"records": [{"id": "CO(g)", "source": "Cox 1989, p. 1"}]}"#), 0);
    assert_eq!(table(r#"{"records": [{"id": "CO(g)", "source": " "}, {"id": "CO2(g)"}]}"#), 2);
    assert_eq!(table(r#"{"editions": {"2021": "IUPAC 2021"}, "records": [{"symbol": "H", "edition": 2021}]}"#), 0);
    assert_eq!(table(r#"{"editions": {"2021": "IUPAC 2021"}, "records": [{"symbol": "H", "edition": 2019}]}"#), 1);
    assert_eq!([table(r#"{"source": "IUPAC 2005"}"#), table(r#"{"title": "names"}"#)], [0, 1]);
    assert_eq!(table(r#"{"source": "x 1990", "dataset": {"publication": "x", "terms": ""}}"#), 1);
    for source in ["someprogram 1.4.2", "a Python package", "the Library of somebody", "copied from github, file x"] {
        let text =
            serde_json::json!({"records": [{"id": "CO(g)", "source": "Cox 1989", "obtained": source}]}).to_string();
        assert_eq!(table(&text), 1, "{source}");
    }
    assert_eq!(
        table(r#"{"source": "Pure Appl. Chem. 94, 573, 2022, DOI 10.1515/pac-2019-0603; network version 1.112"}"#),
        0
    );
}
