//! `hessbook explain`: a formula, a verb, an assumption, or a method of one's own, by its name.

use std::path::{Path, PathBuf};
use std::process::ExitCode;

use clap::Args;

use crate::fault::Fault;
use crate::model::CARDS;
use crate::model::card::Card;
use crate::record::register::CLAIMS;
use crate::render::card::{card, named, wrapped};
use crate::script::module_text::{self, ENDING, Item};
use crate::script::verbs::{FUNCTIONS, VERBS, Verb};
use crate::script::words::nearest;

use super::{Done, out};

/// Explain a function, an assumption, or a method of a module beside a notebook.
///
/// NAME is a function of the language (`enthalpy`, `reaction.enthalpy`), the id of an assumption (`stable-phase`) or of a
/// shortcut (`midpoint`), a module (`plant`), or one of its methods (`plant::duty`).
#[derive(Args)]
pub struct Explain {
    /// What is to be explained
    name: String,
    /// The folder in which the files of modules are
    #[arg(long = "in", value_name = "FOLDER", default_value = ".")]
    folder: PathBuf,
}

impl Explain {
    pub(super) fn run(self) -> Done {
        out(&explained(&self.name, &self.folder)?);
        Ok(ExitCode::SUCCESS)
    }
}

fn explained(name: &str, folder: &Path) -> Result<String, Fault> {
    if !folder.is_dir() {
        return Err(Fault::new(
            "explain-folder-missing",
            format!("there is no folder {} with modules in it", folder.display()),
            "give the folder of the notebook to --in, or leave it out for this one",
        ));
    }
    if let Some((module, method)) = name.split_once("::") {
        return of_module(module, method, folder);
    }
    let bare =
        |card: &&&Card| card.name == name || card.id == name || card.signature().starts_with(&format!("{name}("));
    let mut parts: Vec<String> = CARDS.iter().filter(bare).map(|one| card(one)).collect();
    parts.extend(verbs().filter(|verb| verb.name == name).map(verb));
    parts.extend(shortcut(name));
    parts.extend(CLAIMS.iter().filter(|(id, _)| *id == name).map(|(id, claim)| assumption(id, claim)));
    let file = folder.join(format!("{name}{ENDING}"));
    if file.is_file() {
        parts.push(module(name, &items(name, folder)?));
    }
    if parts.is_empty() { Err(unknown(name, folder)) } else { Ok(parts.join("\n")) }
}

fn unknown(name: &str, folder: &Path) -> Fault {
    let mut known: Vec<String> = CARDS.iter().map(|card| card.name.to_owned()).collect();
    known.extend(verbs().map(|verb| verb.name.to_owned()));
    known.extend(CARDS.iter().flat_map(|card| card.alternatives).map(|one| one.id.to_owned()));
    known.extend(CLAIMS.iter().map(|(id, _)| (*id).to_owned()));
    known.extend(modules(folder));
    let hint = match nearest(name, known.iter().map(String::as_str)) {
        Some(near) => format!("did you mean {near}?"),
        None => format!(
            "name a function, an assumption, or a module{}; `hessbook data show` tells of substances",
            listed_modules(folder)
        ),
    };
    Fault::new("explain-unknown", format!("there is nothing called {name} to explain"), hint)
}

fn verbs() -> impl Iterator<Item = &'static Verb> {
    VERBS.iter().chain(FUNCTIONS)
}

/// A shortcut that reports price where it was not taken, with the formulas that have it.
fn shortcut(id: &str) -> Option<String> {
    // What is an assumption too is told as one.
    if CLAIMS.iter().any(|(known, _)| *known == id) {
        return None;
    }
    let has = |card: &&&Card| card.alternatives.iter().any(|one| one.id == id);
    let formulas: Vec<String> = CARDS.iter().filter(has).map(|card| card.signature()).collect();
    let mut words: Vec<&str> = Vec::new();
    for one in CARDS.iter().flat_map(|card| card.alternatives).filter(|one| one.id == id) {
        if !words.contains(&one.words) {
            words.push(one.words);
        }
    }
    if words.is_empty() {
        return None;
    }
    let mut text = format!("{id}\n");
    named(&mut text, "shortcut", &words.join("; "));
    named(&mut text, "priced for", &formulas.join("; "));
    Some(text)
}

/// Names of the modules in a folder, in order; a script that runs by itself is none.
fn modules(folder: &Path) -> Vec<String> {
    let entries = std::fs::read_dir(folder).into_iter().flatten().flatten();
    let name = |entry: std::fs::DirEntry| {
        let name = entry.file_name().to_str()?.strip_suffix(ENDING)?.to_owned();
        let text = std::fs::read_to_string(entry.path()).ok()?;
        module_text::read(&name, &text).is_ok().then_some(name)
    };
    let mut names: Vec<String> = entries.filter_map(name).collect();
    names.sort();
    names
}

fn listed_modules(folder: &Path) -> String {
    let names = modules(folder);
    if names.is_empty() { String::new() } else { format!(" such as {}", names.join(", ")) }
}

fn verb(verb: &Verb) -> String {
    let mut text = format!("{}\n", verb.signature);
    named(&mut text, "", verb.doc);
    text
}

/// An assumption, with the formulas that rest on it.
fn assumption(id: &str, claim: &str) -> String {
    let mut text = format!("{id}\n");
    named(&mut text, "claim", claim);
    let rests = |card: &&&Card| card.claims.iter().any(|one| one.id == id);
    let formulas: Vec<String> = CARDS.iter().filter(rests).map(|card| card.signature()).collect();
    if formulas.is_empty() {
        named(&mut text, "tested", "when a value is reported, whatever it was computed by");
    } else {
        named(&mut text, "tested for", &formulas.join("; "));
    }
    text
}

fn items(name: &str, folder: &Path) -> Result<Vec<Item>, Fault> {
    let file = format!("{name}{ENDING}");
    let text = std::fs::read_to_string(folder.join(&file)).map_err(|error| {
        let near = nearest(name, modules(folder).iter().map(String::as_str)).map(str::to_owned);
        let hint = match near {
            Some(near) => format!("did you mean {near}?"),
            None => format!("say with --in in which folder it is; there are modules{} here", listed_modules(folder)),
        };
        Fault::new("explain-module-unreadable", format!("{file} cannot be read: {error}"), hint)
    })?;
    module_text::read(&file, &text).map_err(|(refusal, line, _)| {
        let fault = Fault::from(refusal);
        Fault::new(fault.code(), format!("{}, in line {line}", fault.message()), fault.hint().to_owned())
    })
}

fn signature(module: &str, item: &Item) -> String {
    let arguments = item.arguments.as_ref().map(|list| format!("({})", list.join(", "))).unwrap_or_default();
    format!("{module}::{}{arguments}", item.name)
}

/// What a module has, each with the first sentence of its comment.
fn module(name: &str, items: &[Item]) -> String {
    let mut text = format!("{name}{ENDING}\n");
    for item in items.iter().filter(|item| !item.private) {
        let first = item.comment.lines().take_while(|line| !line.trim().is_empty()).collect::<Vec<_>>().join(" ");
        let first = first.split_inclusive(". ").next().unwrap_or_default().trim().to_owned();
        text.push_str(&format!("  {}\n", signature(name, item)));
        wrapped(&mut text, "    ", if first.is_empty() { "it has no comment" } else { &first });
    }
    text
}

fn of_module(name: &str, method: &str, folder: &Path) -> Result<String, Fault> {
    let items = items(name, folder)?;
    let Some(item) = items.iter().find(|item| item.name == method) else {
        let open: Vec<&str> = items.iter().filter(|item| !item.private).map(|item| item.name.as_str()).collect();
        let hint = match nearest(method, open.iter().copied()) {
            Some(near) => format!("did you mean {name}::{near}?"),
            None => format!("it has {}", open.join(", ")),
        };
        return Err(Fault::new("explain-method-unknown", format!("{name}{ENDING} has no {method}"), hint));
    };
    let mut text = format!("{}\n  {name}{ENDING}, line {}\n\n", signature(name, item), item.line);
    for line in item.comment.lines() {
        text.push_str(format!("  {line}").trim_end());
        text.push('\n');
    }
    let missing = unsaid(&item.comment);
    if !missing.is_empty() {
        text.push_str(&format!("  (its comment says nothing of its {})\n", missing.join(", its ")));
    }
    text.push('\n');
    item.text.lines().for_each(|line| text.push_str(&format!("    {line}\n")));
    Ok(text)
}

/// What the comment above a method should tell of and does not.
fn unsaid(comment: &str) -> Vec<&'static str> {
    let lower = comment.to_lowercase();
    let told = |word: &str| lower.lines().any(|line| line.trim_start().starts_with(word));
    ["derivation", "conditions", "source"].into_iter().filter(|word| !told(word)).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn code(name: &str, folder: &Path) -> (&'static str, String) {
        let fault = explained(name, folder).unwrap_err();
        (fault.code(), fault.hint().to_owned())
    }

    #[test]
    fn cards_verbs_and_assumptions_are_found_by_their_names() {
        let here = Path::new(".");
        let all = explained("enthalpy", here).unwrap();
        assert!(all.contains("reaction.enthalpy(T, options)") && all.contains("substance.enthalpy("), "{all}");
        let one = explained("reaction.enthalpy", here).unwrap();
        assert!(one.contains("equation    ΔrH°(T) = Σ ν") && !one.contains("substance.enthalpy("), "{one}");
        assert!(explained("report", here).unwrap().starts_with("report(label, value)\n"));
        assert!(explained("stable-phase", here).unwrap().contains("reaction.enthalpy(T, options)"));
        assert_eq!(code("enthlapy", here), ("explain-unknown", "did you mean enthalpy?".to_owned()));
        assert_eq!(code("stable-fase", here).1, "did you mean stable-phase?");
    }

    #[test]
    fn functions_without_a_card_and_shortcuts_are_told_and_a_folder_that_is_not_there_is() {
        let here = Path::new(".");
        for name in ["q", "exact", "abs", "exp", "ln", "sqrt", "sin", "cos", "tan"] {
            assert!(explained(name, here).unwrap().starts_with(&format!("{name}(")), "{name}");
        }
        for id in CARDS.iter().flat_map(|card| card.alternatives).map(|one| one.id) {
            assert!(explained(id, here).unwrap().contains(&format!("{id}\n")), "{id}");
        }
        assert!(explained("midpoint", here).unwrap().contains("with ΔCp held at its value half-way"));
        assert_eq!(code("enthalpy", Path::new("nowhere")).0, "explain-folder-missing");
        let folder = tempfile::tempdir().unwrap();
        std::fs::write(folder.path().join("first.rhai"), "let x = q(\"1 kJ\");\nreport(\"x\", x);\n").unwrap();
        std::fs::write(folder.path().join("second.rhai"), "fn duty(n) { n }\n").unwrap();
        assert_eq!(modules(folder.path()), ["second"]);
    }

    #[test]
    fn a_method_is_printed_with_its_comment_and_its_text() {
        let folder = tempfile::tempdir().unwrap();
        let text = "// Heat taken up. More of it.\n//\n// Derivation: Q = n dh.\nfn duty(n, dh) {\n    n * dh\n}\nprivate fn own() { 1 }\n";
        std::fs::write(folder.path().join("method.rhai"), text).unwrap();
        let told = explained("method::duty", folder.path()).unwrap();
        assert_eq!(
            told,
            "method::duty(n, dh)\n  method.rhai, line 4\n\n  Heat taken up. More of it.\n\n  Derivation: Q = n dh.\n  \
             (its comment says nothing of its conditions, its source)\n\n    fn duty(n, dh) {\n        n * dh\n    }\n"
        );
        assert_eq!(
            explained("method", folder.path()).unwrap(),
            "method.rhai\n  method::duty(n, dh)\n    Heat taken up.\n"
        );
        assert_eq!(
            code("method::dutty", folder.path()),
            ("explain-method-unknown", "did you mean method::duty?".to_owned())
        );
        assert_eq!(code("methods::duty", folder.path()).1, "did you mean method?");
        assert_eq!(code("methd", folder.path()).1, "did you mean method?");
    }
}
