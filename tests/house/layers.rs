//! Layers are one-way, and what belongs to one room stays in it.
//!
//! [`LAYERS`] is the only place where the order is written for the machine; a new module is entered there.

use crate::source::Source;

/// From the bottom up. A module uses modules of earlier rows and itself.
pub const LAYERS: &[&[&str]] = &[
    &["num", "fault", "source"],
    &["units"],
    &["record"],
    &["quantity"],
    &["chem"],
    &["data"],
    &["model"],
    &["render"],
    &["script"],
    &["session"],
    &["notebook", "kernel"],
    &["archive"],
    &["cli"],
];

/// Names that may stand only in these modules, or in these files.
const CONFINED: &[(&str, &[&str], &[&str])] = &[
    ("rhai", &["script", "session"], &[]),
    ("zeromq", &["kernel"], &[]),
    // What can be serialised becomes a promise; the report's record is one, with its version in its name.
    ("Serialize", &["notebook", "kernel", "archive"], &["src/render/report.rs"]),
];

/// Keys of the notebook format, which one room reads and writes. The protocol has keys of its own.
const NOTEBOOK_KEYS: [&str; 4] = ["nbformat", "nbformat_minor", "cell_type", "output_type"];

/// The highest layer that computes and does nothing else.
const LAST_QUIET: &str = "model";

/// Names of the world outside: files, clocks, chance, the terminal.
const OUTSIDE: [&str; 15] = [
    "fs",
    "net",
    "process",
    "Instant",
    "SystemTime",
    "UNIX_EPOCH",
    "chrono",
    "uuid",
    "rand",
    "stdin",
    "stdout",
    "println",
    "print",
    "eprintln",
    "eprint",
];

fn layer(module: &str) -> Option<usize> {
    LAYERS.iter().position(|row| row.contains(&module))
}

/// Uses of a module that is not below the file's own, and modules that are in no layer.
pub fn arrows(source: &Source) -> Vec<String> {
    let Some(own) = source.module() else { return Vec::new() };
    if own == "lib" {
        return unknown_modules(source);
    }
    let Some(own_layer) = layer(own).or((own == "main").then_some(LAYERS.len())) else {
        return vec![format!("{}: module `{own}` is in no layer", source.path)];
    };
    let judged = |(at, module): (usize, String)| match layer(&module) {
        _ if module == own => None,
        Some(used) if used < own_layer => None,
        Some(_) => Some(format!("{}: `{own}` uses `{module}`", source.place(at))),
        None => Some(format!("{}: `{own}` uses `{module}`, which is in no layer", source.place(at))),
    };
    uses(source).into_iter().filter_map(judged).collect()
}

fn unknown_modules(lib: &Source) -> Vec<String> {
    let words = lib.words();
    let declared = words.windows(2).filter(|pair| pair[0].1 == "mod").map(|pair| pair[1]);
    let unknown = declared.filter(|(_, module)| layer(module).is_none());
    unknown.map(|(at, module)| format!("{}: module `{module}` is in no layer", lib.place(at))).collect()
}

/// Top modules that a file names by a path from the crate's root, each with its offset.
fn uses(source: &Source) -> Vec<(usize, String)> {
    let code = source.code();
    let depth = source.path.trim_end_matches("/mod.rs").matches('/').count();
    let mut found = Vec::new();
    for (at, word) in source.words() {
        let mut path = &code[at..];
        let from_root = match word {
            "crate" => strip(path, "crate"),
            "super" if !code[..at].trim_end().ends_with("::") => {
                let mut supers = 0;
                while let Some(rest) = strip(path, "super") {
                    (supers, path) = (supers + 1, rest);
                }
                (supers >= depth).then_some(path)
            }
            "hessbook" => strip(path, "hessbook"),
            _ => None,
        };
        if let Some(rest) = from_root {
            found.extend(heads(rest).into_iter().map(|head| (at, head)));
        }
    }
    found
}

/// What follows `name::`.
fn strip<'a>(path: &'a str, name: &str) -> Option<&'a str> {
    Some(path.trim_start().strip_prefix(name)?.trim_start().strip_prefix("::")?.trim_start())
}

/// First segments of a path, which may be a group in braces.
fn heads(path: &str) -> Vec<String> {
    let head = |path: &str| {
        let path = path.trim_start();
        let end = path.find(|c: char| !(c.is_alphanumeric() || c == '_')).unwrap_or(path.len());
        path[..end.max(usize::from(path.starts_with('*')))].to_owned()
    };
    let Some(group) = path.strip_prefix('{') else { return vec![head(path)] };
    let mut heads = vec![head(group)];
    let mut depth = 0;
    for (at, c) in group.char_indices() {
        match c {
            '{' => depth += 1,
            '}' if depth == 0 => break,
            '}' => depth -= 1,
            ',' if depth == 0 => heads.push(head(&group[at + 1..])),
            _ => {}
        }
    }
    heads.retain(|head| !head.is_empty()); // After a comma at the end.
    heads
}

/// Names outside the room they belong to.
pub fn strays(source: &Source) -> Vec<String> {
    let Some(own) = source.module() else { return Vec::new() };
    let mut found = Vec::new();
    for (at, word) in source.words() {
        for (name, modules, files) in CONFINED {
            if word == *name && !modules.contains(&own) && !files.contains(&source.path.as_str()) {
                found.push(format!("{}: `{name}` belongs to {}", source.place(at), modules.join(" and ")));
            }
        }
    }
    if own != "notebook" {
        for key in NOTEBOOK_KEYS {
            let quoted = format!("\"{key}\"");
            let places = source.strings().match_indices(&quoted).map(|(at, _)| source.place(at));
            found.extend(places.map(|place| format!("{place}: the key `{key}` belongs to notebook")));
        }
    }
    found
}

/// Files, clocks, chance or the terminal in a layer that computes.
pub fn noises(source: &Source) -> Vec<String> {
    let last = layer(LAST_QUIET);
    if source.module().is_none_or(|own| layer(own).is_none() || layer(own) > last) {
        return Vec::new();
    }
    let code = source.code();
    let outside = |at: usize, word: &str| {
        let after = &code[at + word.len()..];
        match word {
            "fs" | "net" | "process" => code[..at].trim_end().ends_with("std::"),
            "println" | "print" | "eprintln" | "eprint" => after.starts_with('!'),
            _ => OUTSIDE.contains(&word),
        }
    };
    let heard = source.words().into_iter().filter(|(at, word)| outside(*at, word));
    heard.map(|(at, word)| format!("{}: `{word}` in a layer that only computes", source.place(at))).collect()
}

fn found(rule: fn(&Source) -> Vec<String>, path: &str, text: &str) -> String {
    rule(&Source::new(path, text)).join("\n")
}

#[test]
fn an_arrow_upwards_or_sideways_is_found_however_it_is_written() {
    for (path, text, module) in [
        ("src/units/unit.rs", "use crate::quantity::Quantity;", "quantity"),
        ("src/units/unit.rs", "use crate::{fault, model::{card, claims}, units};", "model"),
        ("src/units/unit.rs", "use crate::{\n    source::Citation,\n    record::{node, register},\n};", "record"),
        ("src/model/hess.rs", "fn f() -> crate::render::Bundle { todo() }", "render"),
        ("src/kernel/wire.rs", "use crate::notebook::file;", "notebook"),
        ("src/num/math.rs", "use crate::fault::Fault;", "fault"),
        ("src/units/mod.rs", "use super::session;", "session"),
        ("src/units/unit.rs", "use super::super::session::Session;", "session"),
        ("src/source.rs", "use super::units;", "units"),
        ("src/units/unit.rs", "use crate::*;", "*"),
        ("src/units/unit.rs", "use crate::nowhere::X;", "nowhere"),
    ] {
        let found = found(arrows, path, text);
        assert!(found.contains(&format!("uses `{module}`")), "{path}: {text}: {found}");
        assert_eq!(found.lines().count(), 1, "{path}: {text}: {found}");
    }
    assert!(found(arrows, "src/plumbing/x.rs", "").contains("`plumbing` is in no layer"));
    assert!(found(arrows, "src/lib.rs", "pub mod num;\npub mod plumbing;").contains("`plumbing` is in no layer"));
}

#[test]
fn an_arrow_downwards_or_inside_is_none() {
    for (path, text) in [
        ("src/model/hess.rs", "use crate::{data::catalog::Catalog, model::card::{Card, Claim}, num::math};"),
        ("src/units/unit.rs", "use super::dimension; pub(crate) fn f() {} pub(super) fn g() {}"),
        ("src/units/unit.rs", "/// See [`crate::model::CARDS`].\nfn f() { \"crate::model\" }"),
        ("src/units/unit.rs", "\n#[cfg(test)]\nmod tests { use crate::quantity::Quantity; }"),
        ("src/main.rs", "fn main() { hessbook::cli::run() }"),
        ("src/lib.rs", "pub mod num;\npub mod cli;"),
        ("tests/units.rs", "use crate::anything;"),
    ] {
        assert_eq!(found(arrows, path, text), "", "{path}: {text}");
    }
}

#[test]
fn a_name_outside_its_room_is_found() {
    for (path, text) in [
        ("src/render/text.rs", "use rhai::Dynamic;"),
        ("src/kernel/worker.rs", "fn f(e: &rhai::Engine) {}"),
        ("src/session/mod.rs", "use zeromq::Socket;"),
        ("src/render/text.rs", "#[derive(Serialize)] struct S;"),
        ("src/kernel/handle.rs", "fn f() { map.get(\"cell_type\") }"),
    ] {
        assert_eq!(found(strays, path, text).lines().count(), 1, "{path}: {text}");
    }
    for (path, text) in [
        ("src/script/bind.rs", "use rhai::Dynamic;"),
        ("src/kernel/server.rs", "use zeromq::Socket; #[derive(Serialize)] struct S;"),
        ("src/render/report.rs", "#[derive(Serialize)] struct S;"),
        ("src/notebook/file.rs", "fn f() { map.get(\"nbformat\") }"),
        ("src/cli/run.rs", "fn f() { \"a .rhai script\" } // rhai and zeromq are named, not used"),
    ] {
        assert_eq!(found(strays, path, text), "", "{path}: {text}");
    }
}

#[test]
fn a_layer_that_computes_and_reads_a_clock_or_a_file_is_found() {
    for text in
        ["use std::time::Instant;", "fn f() { std::fs::read(p) }", "fn f() { println!(\"x\") }", "use chrono::Utc;"]
    {
        assert_eq!(found(noises, "src/model/hess.rs", text).lines().count(), 1, "{text}");
        assert_eq!(found(noises, "src/session/mod.rs", text), "", "{text}");
    }
    assert_eq!(found(noises, "src/model/hess.rs", "fn process(print: f64) { let net = print; }"), "");
}
