//! Fault codes: each a kebab-case phrase, used for one fault only, with a way out that is never empty.

use std::collections::BTreeMap;

use crate::source::{Source, is_kebab};

/// A code and where it is given.
pub struct Code {
    pub code: String,
    pub place: String,
}

/// Codes of a file, and places where the rule cannot read the code.
pub fn codes(source: &Source) -> (Vec<Code>, Vec<String>) {
    let (mut codes, mut misses) = (Vec::new(), Vec::new());
    for (at, body) in functions(source, "code") {
        let given = results(source, body);
        if given.is_empty() && !source.code()[body.0..body.1].contains(".code()") {
            misses.push(format!("{}: no code is written here", source.place(at)));
        }
        codes.extend(given.into_iter().map(|(code, place)| Code { code, place }));
    }
    for (at, _) in source.code().match_indices("Fault::new(") {
        let arguments = at + "Fault::new(".len();
        let first = &source.code()[arguments..];
        let begin = arguments + (first.len() - first.trim_start().len());
        if source.code()[begin..].starts_with('"') {
            codes.push(Code { code: source.string_at(begin).to_owned(), place: source.place(at) });
        } else if !first.split(',').next().is_some_and(|argument| argument.trim_end().ends_with(".code()")) {
            misses.push(format!("{}: the code of this fault is not written here", source.place(at)));
        }
    }
    (codes, misses)
}

/// Codes that are not kebab-case, and codes that stand in two places.
pub fn judged(codes: &[Code]) -> Vec<String> {
    let mut places: BTreeMap<&str, Vec<&str>> = BTreeMap::new();
    for code in codes {
        places.entry(&code.code).or_default().push(&code.place);
    }
    let shape = codes.iter().filter(|one| !is_kebab(&one.code));
    let mut found: Vec<String> = shape.map(|one| format!("{}: `{}` is not kebab-case", one.place, one.code)).collect();
    let twice = places.iter().filter(|(_, places)| places.len() > 1);
    found.extend(twice.map(|(code, places)| format!("`{code}` is given at {}", places.join(" and "))));
    found
}

/// Hints that are empty in some case.
pub fn empty_hints(source: &Source) -> Vec<String> {
    let mut found = Vec::new();
    for (_, (from, to)) in functions(source, "hint") {
        let body = &source.code()[from..to];
        let at_each = |form: &str| body.match_indices(form).map(|(at, _)| from + at).collect::<Vec<_>>();
        // A literal that becomes the hint; one that is a part of it, or is compared with, may be empty.
        let becomes = [".to_owned()", ".to_string()", ".into()"];
        let whole = |at: &usize| {
            let after = &source.code()[at + 2..];
            source.string_at(*at).is_empty() && becomes.iter().any(|call| after.starts_with(call))
        };
        let literals = at_each("\"\"").into_iter().filter(whole);
        let places = literals.chain(at_each("String::new()")).chain(at_each("String::default()"));
        found.extend(places.map(|at| format!("{}: an empty hint", source.place(at))));
    }
    found
}

/// Functions of that name in every `impl Explain for`: offset, and begin and end of the body.
fn functions(source: &Source, name: &str) -> Vec<(usize, (usize, usize))> {
    let code = source.code();
    let impls = code.match_indices("Explain for ").filter_map(|(at, _)| Some((at, block(code, at)?)));
    let head = format!("fn {name}(");
    impls
        .filter_map(|(at, (from, to))| {
            let inside = code[from..to].find(&head).map(|inside| from + inside);
            // A type without the function does not compile; not finding it here must not go unseen.
            Some((at, inside.map_or(Some((from, from)), |inside| block(code, inside))?))
        })
        .collect()
}

/// Begin and end of the next block in braces.
fn block(code: &str, at: usize) -> Option<(usize, usize)> {
    let open = at + code[at..].find('{')?;
    let mut depth = 0;
    for (length, c) in code[open..].char_indices() {
        match c {
            '{' => depth += 1,
            '}' => depth -= 1,
            _ => {}
        }
        if depth == 0 {
            return Some((open, open + length + 1));
        }
    }
    None
}

/// Strings that a body may give: those after an arrow, an opening brace or `return`; others are parts of patterns.
fn results(source: &Source, (from, to): (usize, usize)) -> Vec<(String, String)> {
    let code = source.code();
    let quotes: Vec<usize> = code[from..to].match_indices('"').map(|(at, _)| from + at).collect();
    let opening = quotes.chunks(2).map(|pair| pair[0]);
    let given =
        opening.filter(|at| ["=>", "{", "return"].iter().any(|mark| code[from..*at].trim_end().ends_with(mark)));
    given.map(|at| (source.string_at(at).to_owned(), source.place(at))).collect()
}

const PLANTED: &str = r#"
impl Explain for Bomb {
    fn code(&self) -> &'static str {
        match self {
            Bomb::Leak { symbol: "O2", .. } | Bomb::Hole => "bomb-leaks",
            Bomb::Long(_) => {
                "bomb-burst"
            }
            Bomb::Inner(inner) => inner.code(),
            Bomb::Deep(x) => if x.wet() { "bomb-wet" } else { "bomb-dry" },
        }
    }

    fn hint(&self) -> String {
        match self { Bomb::Leak { .. } => "tighten it".to_owned(), _ => "call".into() }
    }
}
fn f() -> Fault { Fault::new(
    "bomb-late", format!("late"), "start earlier") }
"#;

fn planted(text: &str) -> (Vec<Code>, Vec<String>) {
    codes(&Source::new("src/model/bomb.rs", text))
}

#[test]
fn every_code_is_read_and_patterns_are_not_codes() {
    let (read, misses) = planted(PLANTED);
    let read: Vec<&str> = read.iter().map(|code| code.code.as_str()).collect();
    assert_eq!(read, ["bomb-leaks", "bomb-burst", "bomb-wet", "bomb-dry", "bomb-late"]);
    assert!(misses.is_empty(), "{misses:?}");
    assert_eq!(
        planted("impl From<E> for Fault { fn from(e: E) -> Self { Fault::new(error.code(), a, b) } }").1.len(),
        0
    );
}

#[test]
fn a_code_that_the_rule_cannot_read_is_found() {
    assert_eq!(planted("impl Explain for A { fn code(&self) -> &'static str { CODE } }").1.len(), 1);
    assert_eq!(planted("fn f(code: &'static str) -> Fault { Fault::new(code, a, b) }").1.len(), 1);
}

#[test]
fn a_code_that_is_given_twice_or_not_kebab_case_is_found() {
    let (mut codes, _) = planted(PLANTED);
    assert_eq!(judged(&codes), Vec::<String>::new());
    codes.extend(planted("impl Explain for B { fn code(&self) -> &'static str { \"bomb-wet\" } }").0);
    codes.extend(planted("fn f() { Fault::new(\"Bomb_Dry\", a, b) }").0);
    let found = judged(&codes);
    assert_eq!(found.len(), 2, "{found:?}");
    assert!(found[0].contains("Bomb_Dry") && found[1].contains("`bomb-wet` is given at"), "{found:?}");
}

#[test]
fn an_empty_hint_is_found() {
    let hints = |text: &str| empty_hints(&Source::new("src/model/bomb.rs", text)).len();
    assert_eq!(hints(PLANTED), 0);
    assert_eq!(hints("impl Explain for A { fn hint(&self) -> String { x.next().unwrap_or(\"\").trim().into() } }"), 0);
    assert_eq!(hints("impl Explain for A { fn hint(&self) -> String { String::new() } }"), 1);
    assert_eq!(hints("impl Explain for A { fn hint(&self) -> String { match self { A => \"\".to_owned() } } }"), 1);
}
