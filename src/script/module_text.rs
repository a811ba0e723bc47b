//! The text of a module: its functions and constants, each with the comment above it, and the modules it names.
//!
//! A module is a file of in-house methods beside a notebook. [`read`] refuses what is neither a function nor a constant: a
//! module that computed or reported something when it is first named would do so at a moment nobody chose. The surprise:
//! names are found in the tokens, not in the engine's tree, since comments and places have to be those of the file.

use std::collections::BTreeSet;
use std::fmt;

use crate::fault::Explain;
use crate::script::token::{Kind, Token, tokens};

/// Ending of the files in which modules are kept.
pub const ENDING: &str = ".rhai";

/// The name before `::` that means the constants of a module itself.
pub const OWN: &str = "global";

/// What makes a function of its name.
const BY_NAME: &str = "Fn";

/// A function or constant of a module.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Item {
    pub name: String,
    /// Names of its arguments; none for a constant.
    pub arguments: Option<Vec<String>>,
    /// Only for the functions of the same file.
    pub private: bool,
    /// Of its first word, from 1.
    pub line: usize,
    /// The comment directly above it, without its marks.
    pub comment: String,
    /// From its first word to its last.
    pub text: String,
}

/// A module, named somewhere as `name::`.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Use {
    pub name: String,
    pub line: usize,
    pub column: usize,
}

/// What a module may not hold.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum ModuleRefusal {
    /// A statement that is neither a function nor a constant.
    Statement {
        file: String,
        found: String,
    },
    /// A call of something that neither the module nor the library defines.
    CallsOutside {
        file: String,
        function: String,
        near: Option<String>,
    },
    /// Modules that use each other, in the order of use; the last is the first again.
    Circle {
        names: Vec<String>,
    },
    NotText {
        file: String,
    },
}

impl fmt::Display for ModuleRefusal {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            ModuleRefusal::Statement { file, found } => {
                write!(
                    f,
                    "{file} has `{found}` outside its functions, and a module holds functions and constants alone"
                )
            }
            ModuleRefusal::CallsOutside { file, function, .. } if function == BY_NAME => {
                write!(f, "{file} calls a function by a name that is not written out")
            }
            ModuleRefusal::CallsOutside { file, function, .. } => {
                write!(f, "{file} calls {function}, which neither it nor the library defines")
            }
            ModuleRefusal::Circle { names } => write!(f, "modules use each other in a circle: {}", names.join(" -> ")),
            ModuleRefusal::NotText { file } => write!(f, "{file} is no text in UTF-8"),
        }
    }
}

impl Explain for ModuleRefusal {
    fn code(&self) -> &'static str {
        match self {
            ModuleRefusal::Statement { .. } => "module-statement",
            ModuleRefusal::CallsOutside { .. } => "module-calls-outside",
            ModuleRefusal::Circle { .. } => "module-circle",
            ModuleRefusal::NotText { .. } => "module-not-text",
        }
    }

    fn hint(&self) -> String {
        match self {
            ModuleRefusal::Statement { .. } => {
                "write `const NAME = …;` or put it into a function; what computes and reports belongs in a cell"
                    .to_owned()
            }
            ModuleRefusal::CallsOutside { function, .. } if function == BY_NAME => {
                "write it as in Fn(\"duty\"), the module or the library having duty, or take the function as an argument; the \
                 functions of cells are not seen from a module"
                    .to_owned()
            }
            ModuleRefusal::CallsOutside { near: Some(near), .. } => format!("did you mean {near}?"),
            ModuleRefusal::CallsOutside { function, .. } => format!(
                "define {function} in the module, or name the module that has it, as in other::{function}(…); the functions \
                 of cells are not seen from a module"
            ),
            ModuleRefusal::Circle { names } if names.len() == 2 => {
                "a module calls its own functions by their bare names".to_owned()
            }
            ModuleRefusal::Circle { .. } => {
                "put what they share into a module of its own, which uses none of them".to_owned()
            }
            ModuleRefusal::NotText { .. } => "save it as UTF-8".to_owned(),
        }
    }
}

/// The modules that a text names, each at its first place.
pub fn uses(text: &str) -> Vec<Use> {
    if !text.contains("::") {
        return Vec::new();
    }
    let (tokens, _) = tokens(text);
    let mut found: Vec<Use> = Vec::new();
    for (index, token) in tokens.iter().enumerate() {
        let names = token.kind == Kind::Word && tokens.get(index + 1).is_some_and(|next| next.is("::"));
        let nested = index.checked_sub(1).is_some_and(|before| tokens[before].is("::"));
        if names && !nested && token.text != OWN && !found.iter().any(|known| known.name == token.text) {
            found.push(Use { name: token.text.to_owned(), line: token.line, column: token.column });
        }
    }
    found
}

/// The functions and constants of a module.
///
/// # Errors
/// It holds something else; with line and column.
pub fn read(file: &str, text: &str) -> Result<Vec<Item>, (ModuleRefusal, usize, usize)> {
    let (tokens, _) = tokens(text);
    let lines: Vec<&str> = text.lines().collect();
    let mut items = Vec::new();
    let mut at = 0;
    while let Some(first) = tokens.get(at) {
        if first.is(";") {
            at += 1;
            continue;
        }
        let private = first.is("private");
        let word = if private { tokens.get(at + 1) } else { Some(first) };
        let end = match word {
            Some(word) if word.is("fn") => end_of_function(&tokens, at),
            Some(word) if word.is("const") => end_of_statement(&tokens, at),
            _ => {
                let found = lines.get(first.line - 1).map_or(first.text, |line| line.trim()).chars().take(60).collect();
                return Err((ModuleRefusal::Statement { file: file.to_owned(), found }, first.line, first.column));
            }
        };
        let is_function = word.is_some_and(|word| word.is("fn"));
        let name_at = at + 1 + usize::from(private);
        items.push(Item {
            name: tokens.get(name_at).map_or("", |name| name.text).to_owned(),
            arguments: is_function.then(|| arguments(&tokens[name_at..end.min(tokens.len())])),
            private,
            line: first.line,
            comment: comment_above(&lines, first.line),
            text: text[first.offset..tokens.get(end - 1).map_or(text.len(), Token::end)].to_owned(),
        });
        at = end;
    }
    Ok(items)
}

/// A call of a name that is none of `known`, with its place; of [`BY_NAME`] where the name is not written out.
///
/// Names behind a dot count too, and those in `Fn("…")`: the engine looks for both among the functions of the cell that
/// called, when they are called.
pub fn calls_outside(text: &str, known: impl Fn(&str) -> bool) -> Option<(String, usize, usize)> {
    // Words that the engine itself reads as calls, or that only look like one.
    const LANGUAGE: [&str; 16] = [
        "if",
        "while",
        "until",
        "for",
        "in",
        "switch",
        "return",
        "throw",
        "catch",
        "and",
        "or",
        "call",
        "curry",
        "type_of",
        "is_shared",
        "is_def_var",
    ];
    let (tokens, _) = tokens(text);
    let defined: BTreeSet<&str> = tokens.windows(2).filter(|pair| pair[0].is("fn")).map(|pair| pair[1].text).collect();
    for (index, token) in tokens.iter().enumerate() {
        let called = tokens.get(index + 1).is_some_and(|next| next.is("(") || next.is("()"));
        let behind = index.checked_sub(1).is_some_and(|before| {
            let before = &tokens[before];
            before.is("::") || before.is("fn")
        });
        let defined = |name: &str| defined.contains(name) || known(name);
        if token.kind != Kind::Word || !called || behind {
            continue;
        }
        if token.is(BY_NAME) {
            let name = match tokens.get(index + 2..index + 4) {
                Some([text, end]) if text.kind == Kind::Text && end.is(")") => text.text.trim_matches('"'),
                _ => BY_NAME,
            };
            if !defined(name) {
                return Some((name.to_owned(), token.line, token.column));
            }
        } else if !(LANGUAGE.contains(&token.text) || defined(token.text)) {
            return Some((token.text.to_owned(), token.line, token.column));
        }
    }
    None
}

/// Index behind the body of the function that starts at `at`.
fn end_of_function(tokens: &[Token<'_>], at: usize) -> usize {
    let mut depth = 0_usize;
    for (index, token) in tokens.iter().enumerate().skip(at) {
        depth = deeper(depth, token);
        if depth == 0 && token.is("}") {
            return index + 1;
        }
    }
    tokens.len()
}

/// Index behind the statement that starts at `at`, its semicolon included.
fn end_of_statement(tokens: &[Token<'_>], at: usize) -> usize {
    let mut depth = 0_usize;
    for (index, token) in tokens.iter().enumerate().skip(at) {
        depth = deeper(depth, token);
        if depth == 0 && token.is(";") {
            return index + 1;
        }
    }
    tokens.len()
}

fn deeper(depth: usize, token: &Token<'_>) -> usize {
    match token.text {
        _ if token.kind != Kind::Symbol => depth,
        "(" | "[" | "?[" | "{" | "#{" | "${" => depth + 1,
        ")" | "]" | "}" => depth.saturating_sub(1),
        _ => depth,
    }
}

/// Names between the brackets behind a function's name, which is the first token.
fn arguments(tokens: &[Token<'_>]) -> Vec<String> {
    let list = tokens.iter().skip(1).take_while(|token| !token.is(")") && !token.is("()") && !token.is("{"));
    list.filter(|token| token.kind == Kind::Word).map(|token| token.text.to_owned()).collect()
}

/// The comment lines directly above a line, which is counted from 1.
fn comment_above(lines: &[&str], line: usize) -> String {
    let above = lines[..(line - 1).min(lines.len())].iter().rev();
    let mut block: Vec<&str> = above.map_while(|line| line.trim().strip_prefix("//")).collect();
    block.reverse();
    let bare = |line: &str| {
        let line = line.trim_start_matches('/');
        line.strip_prefix(' ').unwrap_or(line).trim_end().to_owned()
    };
    block.into_iter().map(bare).collect::<Vec<_>>().join("\n")
}

#[cfg(test)]
mod tests {
    use super::*;

    const TEXT: &str = "// About the file.\n\n// The heat that goes in.\n//   Q = n Δh\nfn duty(n, dh) {\n    if n > 0 { n * dh } else { none() }\n}\n\
                        private fn none() { 0 }\n// Loss.\nconst LOSS = #{ a: 1 };";

    #[test]
    fn functions_and_constants_come_with_the_comment_directly_above() {
        let items = read("plant.rhai", TEXT).unwrap();
        let told = |item: &Item| (item.name.clone(), item.line, item.private, item.comment.clone());
        assert_eq!(
            items.iter().map(told).collect::<Vec<_>>(),
            [
                ("duty".to_owned(), 5, false, "The heat that goes in.\n  Q = n Δh".to_owned()),
                ("none".to_owned(), 8, true, String::new()),
                ("LOSS".to_owned(), 10, false, "Loss.".to_owned()),
            ]
        );
        assert_eq!(items[0].arguments, Some(vec!["n".to_owned(), "dh".to_owned()]));
        assert_eq!((items[1].arguments.clone(), items[2].arguments.clone()), (Some(Vec::new()), None));
        assert!(items[0].text.starts_with("fn duty(n, dh) {\n") && items[0].text.ends_with("none() }\n}"));
        assert_eq!(items[2].text, "const LOSS = #{ a: 1 };");
    }

    #[test]
    fn what_is_neither_function_nor_constant_is_found_with_its_place() {
        for (text, line, column) in
            [("let x = 1;", 1, 1), ("fn f() { 1 }\n  report(\"x\", 1)", 2, 3), ("const A = 1; A", 1, 14)]
        {
            let (refusal, at_line, at_column) = read("plant.rhai", text).unwrap_err();
            assert_eq!((refusal.code(), at_line, at_column), ("module-statement", line, column), "{text}");
        }
    }

    #[test]
    fn names_before_two_colons_are_uses() {
        let text = "let x = plant::duty(duct::A, global::B) + plant::loss(\"no::use\"); // not::this\nx";
        let found: Vec<(String, usize)> = uses(text).into_iter().map(|one| (one.name, one.column)).collect();
        assert_eq!(found, [("plant".to_owned(), 9), ("duct".to_owned(), 21)]);
    }

    #[test]
    fn calls_of_what_is_defined_nowhere_are_found() {
        let known = |name: &str| name == "q";
        assert_eq!(
            calls_outside(
                r#"fn f(x) { if (x) { q("1 K") } else { x.f(1) + f(2) + other::h(3) + [1].map(Fn("f")).q() } }"#,
                |name| known(name) || name == "map"
            ),
            None
        );
        for (text, name, column) in [
            ("fn f(x) { x.helper() }", "helper", 13),
            ("fn f(x) { x?.helper(1) }", "helper", 14),
            ("fn f(x) { Fn(\"helper\").call(x) }", "helper", 11),
            ("fn f(x) { Fn(`helper`).call(x) }", "Fn", 11),
            ("fn f(x) { Fn(x).call(1) }", "Fn", 11),
            ("fn f(x) { Fn(\"f\" + x).call(1) }", "Fn", 11),
        ] {
            assert_eq!(calls_outside(text, known), Some((name.to_owned(), 1, column)), "{text}");
        }
        assert_eq!(calls_outside("fn f(x) {\n  helper (x) }", known), Some(("helper".to_owned(), 2, 3)));
    }
}
