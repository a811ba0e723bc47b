//! What every source file keeps to: how it opens, how long it is, and what may not stand in it.

use crate::source::Source;

/// A file longer than this without its tests wants splitting by noun.
const MOST_LINES: usize = 600;

/// The door to the elementary functions.
const DOOR: &str = "src/num/math.rs";

/// Methods of the standard library's numbers whose last bits depend on platform and version. Those of the first list
/// take no argument, which tells them from methods of our own types: `quantity.exp(place)`.
const BARE: [&str; 25] = [
    "exp", "exp2", "exp_m1", "ln", "ln_1p", "log2", "log10", "sin", "cos", "tan", "sin_cos", "asin", "acos", "atan",
    "sinh", "cosh", "tanh", "asinh", "acosh", "atanh", "cbrt", "gamma", "ln_gamma", "erf", "erfc",
];
const WITH_ARGUMENTS: [&str; 5] = ["powf", "powi", "log", "atan2", "hypot"];

/// A file that does not open with what it is for.
pub fn opening(source: &Source) -> Vec<String> {
    let first = source.text().lines().next().unwrap_or("");
    let said = first.strip_prefix("//!").is_some_and(|words| !words.trim().is_empty());
    if said { Vec::new() } else { vec![format!("{}: opens with `{}`", source.path, first)] }
}

/// A file that is too long.
pub fn length(source: &Source) -> Vec<String> {
    let lines = source.code().trim_end().lines().count();
    if lines <= MOST_LINES { Vec::new() } else { vec![format!("{}: {lines} lines without its tests", source.path)] }
}

/// Unfinished code, debugging left behind, silenced warnings and tests that do not run.
pub fn unfinished(source: &Source) -> Vec<String> {
    // With its tests: an ignored test, or a `dbg!` in one, is no better.
    let all = Source::new(&source.path, &source.text().replace("#[cfg(test)]\nmod ", "#[cfg(all(test))]\nmod "));
    let code = all.code();
    let mut found = Vec::new();
    let mut lint = false;
    for (at, word) in all.words() {
        let (before, after) = (code[..at].trim_end(), code[at + word.len()..].trim_start());
        match word {
            "todo" | "unimplemented" | "dbg" if after.starts_with('!') => found.push((at, format!("`{word}!`"))),
            "ignore" if before.ends_with("#[") => found.push((at, "`#[ignore]`".to_owned())),
            "allow" | "expect" => lint = before.ends_with("#[") || before.ends_with("#!["),
            "dead_code" | "unused" if lint => found.push((at, format!("a silenced `{word}`"))),
            _ if lint && word.starts_with("unused_") => found.push((at, format!("a silenced `{word}`"))),
            _ => {}
        }
        lint &= !after.starts_with(')');
    }
    found.into_iter().map(|(at, what)| format!("{}: {what}", all.place(at))).collect()
}

/// Elementary functions that do not come through `num::math`.
pub fn elementary(source: &Source) -> Vec<String> {
    if source.path == DOOR || source.module().is_none() {
        return Vec::new();
    }
    let code = source.code();
    let mut found = Vec::new();
    for (at, word) in source.words() {
        let (before, after) = (code[..at].trim_end(), code[at + word.len()..].trim_start());
        let listed = BARE.contains(&word) || WITH_ARGUMENTS.contains(&word);
        let of_a_type = ["f64::", "f32::"].iter().any(|of| before.ends_with(of));
        let call = after.strip_prefix('(').is_some_and(|inside| {
            WITH_ARGUMENTS.contains(&word) || (BARE.contains(&word) && inside.trim_start().starts_with(')'))
        });
        if listed && (of_a_type || (before.ends_with('.') && call)) {
            found.push(format!("{}: `{word}` of the standard library", source.place(at)));
        }
        if word == "libm" && after.starts_with("::") {
            found.push(format!("{}: `libm` itself", source.place(at)));
        }
    }
    found
}

/// Collections without an order of their own, in a file that does not say why order cannot reach the output.
pub fn unordered(source: &Source) -> Vec<String> {
    let reason = |line: &str| line.trim().strip_prefix("// Unordered:").is_some_and(|why| why.trim().len() >= 20);
    if source.module().is_none() || source.text().lines().any(reason) {
        return Vec::new();
    }
    let unordered = source.words().into_iter().filter(|(_, word)| ["HashMap", "HashSet", "hash_map"].contains(word));
    unordered.map(|(at, word)| format!("{}: `{word}`", source.place(at))).collect()
}

fn count(rule: fn(&Source) -> Vec<String>, text: &str) -> usize {
    rule(&Source::new("src/model/x.rs", text)).len()
}

#[test]
fn a_file_that_says_nothing_of_itself_is_found() {
    assert_eq!(
        [count(opening, "//! Bombs."), count(opening, "use std::fmt;"), count(opening, "//!\n"), count(opening, "")],
        [0, 1, 1, 1]
    );
}

#[test]
fn a_long_file_is_found_and_its_tests_do_not_count() {
    let lines = |n: usize| "fn f() {}\n".repeat(n);
    assert_eq!([count(length, &lines(600)), count(length, &lines(601))], [0, 1]);
    assert_eq!(count(length, &format!("{}#[cfg(test)]\nmod tests {{\n{}}}\n", lines(599), lines(300))), 0);
}

#[test]
fn unfinished_code_is_found_in_tests_too() {
    for text in [
        "fn f() { todo!() }",
        "fn f() { unimplemented!(\"later\") }",
        "fn f() { dbg!(1); }",
        "#[allow(dead_code)] fn f() {}",
        "#![allow(clippy::all, unused_variables)]",
        "#[expect(unused)] fn f() {}",
        "#[cfg(test)]\nmod tests { #[test] #[ignore] fn f() {} }",
        "#[ignore = \"slow\"] fn f() {}",
    ] {
        assert_eq!(count(unfinished, text), 1, "{text}");
    }
    for text in [
        "// todo!()\nfn f() { \"dbg!\" }",
        "#[allow(clippy::float_cmp)] fn unused() {}",
        "fn f() { x.expect(\"unused\") }",
    ] {
        assert_eq!(count(unfinished, text), 0, "{text}");
    }
}

#[test]
fn an_elementary_function_by_another_door_is_found() {
    for text in [
        "fn f(x: f64) -> f64 { x.exp() }",
        "fn f(x: f64) -> f64 { x\n        .ln() }",
        "fn f(x: f64) -> f64 { x.powi(2) }",
        "fn f(x: f64) -> f64 { 10_f64.powf(x) }",
        "fn f(x: &[f64]) { x.iter().map(f64::sin) }",
        "fn f(x: f64) -> f64 { libm::exp(x) }",
        "fn f(x: f64) -> f64 { x.log(2.0) }",
    ] {
        assert_eq!(count(elementary, text), 1, "{text}");
        assert_eq!(elementary(&Source::new(DOOR, text)), Vec::<String>::new(), "{text}");
    }
    for text in [
        "fn f(x: f64) -> f64 { math::exp(x).sqrt().abs() }",
        "fn f(q: &Quantity) { q.exp(place) }",
        "fn f(n: u64) { n.pow(2) }",
    ] {
        assert_eq!(count(elementary, text), 0, "{text}");
    }
}

#[test]
fn a_collection_without_order_is_found_unless_a_reason_stands_by_it() {
    let text = "use std::collections::HashMap;\n";
    assert_eq!(count(unordered, text), 1);
    assert_eq!(count(unordered, &format!("// Unordered: entries are only looked up, never walked.\n{text}")), 0);
    assert_eq!(count(unordered, &format!("// Unordered: fine.\n{text}")), 1, "a reason is more than a word");
    assert_eq!(count(unordered, "use std::collections::BTreeMap; // not a HashMap"), 0);
}
