//! The engine's names of kinds and functions in plain words.
//!
//! [`Library`] knows every function that cells may call; [`kind`] and [`kind_of`] turn the engine's type names into
//! words that stand in a sentence. No message may show a Rust type or the made-up name of a closure.

use std::collections::{BTreeMap, BTreeSet};

use rhai::{Dynamic, Engine};

use crate::num::edits;

/// How the engine begins the name it makes up for a closure.
const CLOSURE: &str = "anon$";

/// Whether this is the name of a closure, which no message may show.
pub fn is_closure(name: &str) -> bool {
    name.starts_with(CLOSURE)
}

/// A function's name as users may see it.
pub fn function_name(name: &str) -> &str {
    if is_closure(name) { "a closure" } else { name }
}

/// The engine's name of a type, with its article: `i64` is "a whole number".
pub fn kind(type_name: &str) -> String {
    let bare = type_name.trim().trim_start_matches("&mut ").trim_start_matches('&');
    match bare {
        "i64" | "INT" => "a whole number",
        "f64" | "FLOAT" => "a number",
        "bool" => "true or false",
        "string" | "str" | "String" | "ImmutableString" | "str | ImmutableString | String" => "a text",
        "char" => "a character",
        "()" => "nothing",
        "array" | "Array" => "an array",
        "map" | "Map" => "a map",
        "blob" | "Blob" => "a block of bytes",
        "Fn" | "FnPtr" => "a function",
        "range" | "range=" | "ExclusiveRange" | "InclusiveRange" => "a range",
        "types::dynamic::Dynamic" | "Dynamic" | "?" | "_" => "any value",
        _ if bare.ends_with("::reaction::Reaction>") => "a reaction",
        _ if bare.ends_with("::PureSubstance>") => "a substance",
        _ if bare.ends_with("::grid::Grid>") => "a grid of temperatures",
        _ if bare.ends_with("::curve::Curve>") => "a curve",
        _ if bare.ends_with("::table::Table>") => "a table",
        _ if bare.ends_with("::Dynamic") => "any value",
        _ if bare.contains("Range") => "a range",
        _ if bare.contains("StepRange") || bare.contains("Stream") => "a sequence",
        // A name without Rust's marks was given by us to a type of ours, and is a word.
        _ if !bare.is_empty() && bare.chars().all(|c| c.is_alphanumeric() || c == ' ' || c == '-') => {
            let vowel = bare.to_lowercase().starts_with(['a', 'e', 'i', 'o', 'u']);
            return format!("{} {bare}", if vowel { "an" } else { "a" });
        }
        _ => "a value of another kind",
    }
    .to_owned()
}

/// What a value is, in words.
pub fn kind_of(value: &Dynamic) -> String {
    kind(value.type_name())
}

/// Several kinds in a sentence.
pub fn kinds(type_names: &[&str]) -> String {
    list(&type_names.iter().map(|name| kind(name)).collect::<Vec<_>>())
}

/// Words in a sentence: "a text, a map and a number".
pub fn list(words: &[String]) -> String {
    match words {
        [] => "nothing".to_owned(),
        [one] => one.clone(),
        [most @ .., last] => format!("{} and {last}", most.join(", ")),
    }
}

/// A call as the engine reports one it could not find: `f (i64, array)`.
pub fn split_call(signature: &str) -> (&str, Vec<&str>) {
    match signature.split_once(" (").and_then(|(name, rest)| Some((name, rest.strip_suffix(')')?))) {
        Some((name, "")) => (name, Vec::new()),
        Some((name, arguments)) => (name, arguments.split(", ").collect()),
        None => (signature, Vec::new()),
    }
}

/// Every function of the library, with the arguments of each of its forms.
#[derive(Clone, Debug, Default)]
pub struct Library {
    functions: BTreeMap<String, BTreeSet<Vec<String>>>,
}

impl Library {
    /// Reads the functions of an engine to which no cell has added any.
    pub fn of(engine: &Engine) -> Self {
        let mut functions: BTreeMap<String, BTreeSet<Vec<String>>> = BTreeMap::new();
        for signature in engine.gen_fn_signatures(true) {
            if let Some((name, arguments)) = split_signature(&signature) {
                functions.entry(name.to_owned()).or_default().insert(arguments);
            }
        }
        Library { functions }
    }

    pub fn holds(&self, name: &str) -> bool {
        self.functions.contains_key(name)
    }

    pub fn names(&self) -> impl Iterator<Item = &str> {
        self.functions.keys().map(String::as_str)
    }

    /// What a function takes, in words, one text per form: all of them, or those with a number of arguments. A form
    /// that differs from another only in taking whole numbers is left out.
    pub fn forms(&self, name: &str, arguments: Option<usize>) -> Vec<String> {
        let forms = self.functions.get(name).into_iter().flatten();
        let forms: Vec<Vec<String>> = forms
            .filter(|form| arguments.is_none_or(|count| form.len() == count))
            .map(|form| form.iter().map(|typ| kind(typ)).collect())
            .collect();
        let with_points = |form: &[String]| -> Vec<String> {
            form.iter().map(|kind| kind.replace("a whole number", "a number")).collect()
        };
        let mut texts: Vec<String> = Vec::new();
        for form in &forms {
            let wider = with_points(form);
            let covered = wider != *form && forms.contains(&wider);
            let text = if form.is_empty() { "no arguments".to_owned() } else { list(form) };
            if !covered && !texts.contains(&text) {
                texts.push(text);
            }
        }
        texts
    }
}

/// `name(x: f64, y: &mut array) -> f64` to the name and the types. Properties, operators and closures are left out.
fn split_signature(signature: &str) -> Option<(&str, Vec<String>)> {
    let (name, rest) = signature.split_once('(')?;
    let named = name.starts_with(|c: char| c.is_alphabetic() || c == '_') && !name.contains('$');
    if !named {
        return None;
    }
    // The types hold brackets of their own, so the closing one is found by depth.
    let mut depth = 0_i32;
    let mut arguments = vec![String::new()];
    for c in rest.chars() {
        match c {
            ')' if depth == 0 => break,
            ',' if depth == 0 => arguments.push(String::new()),
            _ => {
                depth += i32::from("(<[".contains(c)) - i32::from(")>]".contains(c));
                arguments.last_mut()?.push(c);
            }
        }
    }
    let types = arguments.iter().map(|argument| argument.split_once(": ").map_or(argument.as_str(), |(_, typ)| typ));
    Some((name, types.map(|typ| typ.trim().to_owned()).filter(|typ| !typ.is_empty()).collect()))
}

/// The known name nearest to a mistyped one, if one is near.
pub fn nearest<'a>(wanted: &str, known: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    let allowed = match wanted.chars().count() {
        0..=2 => 0,
        3..=5 => 1,
        _ => 2,
    };
    let mut best: Option<(usize, &str)> = None;
    for name in known {
        let steps = if wanted.to_lowercase() == name.to_lowercase() { 0 } else { edits::between(wanted, name) };
        if name != wanted && steps <= allowed && best.is_none_or(|(least, found)| (steps, name) < (least, found)) {
            best = Some((steps, name));
        }
    }
    best.map(|(_, name)| name)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn signatures_and_calls_come_apart() {
        assert_eq!(split_signature("log(x: f64, base: f64) -> f64"), Some(("log", vec!["f64".into(), "f64".into()])));
        assert_eq!(split_signature("exit() -> Result<(), Box<X>>"), Some(("exit", vec![])));
        assert_eq!(
            split_signature("pair(_: Pair<a,b>, _: ()) -> ()"),
            Some(("pair", vec!["Pair<a,b>".into(), "()".into()]))
        );
        assert_eq!(split_signature("get$floor(x: f64) -> f64"), None);
        assert_eq!(split_signature("+(x: f64) -> f64"), None);
        assert_eq!(split_call("f (i64, array)"), ("f", vec!["i64", "array"]));
        assert_eq!(split_call("f ()"), ("f", vec![]));
        assert_eq!(split_call("sqrt (&str | ImmutableString | String)").1, ["&str | ImmutableString | String"]);
    }

    #[test]
    fn kinds_read_as_words() {
        assert_eq!(kind("&str | ImmutableString | String"), "a text");
        assert_eq!(kind("core::some::Type<i64>"), "a value of another kind");
        assert_eq!(kind("equation"), "an equation");
        assert_eq!(kinds(&["i64", "f64", "array"]), "a whole number, a number and an array");
    }

    #[test]
    fn the_nearest_name_is_near() {
        let known = ["sqrt", "sin", "sinh", "enthalpy"];
        assert_eq!(nearest("sqrtt", known), Some("sqrt"));
        assert_eq!(nearest("Sin", known), Some("sin"));
        assert_eq!(nearest("enthlapy", known), Some("enthalpy"));
        assert_eq!(nearest("xyz", known), None);
        assert_eq!(nearest("si", known), None);
    }
}
