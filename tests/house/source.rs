//! A Rust source as the house rules read it: without comments, with or without the contents of strings, without its tests.
//!
//! Main type: [`Source`]. What is left out is blanked, not cut, so that an offset in [`Source::code`] is the same place in
//! [`Source::strings`] and in the file. The surprise: quotation marks stay, so that a rule can tell where a string stood.

use std::fs;
use std::path::Path;

/// Folders that hold nothing of ours.
const SKIPPED: [&str; 7] =
    [".git", "target", ".venv", ".venv-lab", "node_modules", "__pycache__", ".ipynb_checkpoints"];

/// One Rust file.
pub struct Source {
    /// Path below the project's root, with `/`.
    pub path: String,
    text: String,
    code: String,
    strings: String,
}

impl Source {
    pub fn new(path: &str, text: &str) -> Source {
        let (code, strings) = (blanked(text, true), blanked(text, false));
        let end = tests_begin(&code);
        let (code, strings) = (code[..end].to_owned(), strings[..end].to_owned());
        Source { path: path.to_owned(), text: text.to_owned(), code, strings }
    }

    /// The whole file.
    pub fn text(&self) -> &str {
        &self.text
    }

    /// What compiles, without tests; strings are empty.
    pub fn code(&self) -> &str {
        &self.code
    }

    /// The same with the contents of strings.
    pub fn strings(&self) -> &str {
        &self.strings
    }

    /// Names and keywords with their offsets.
    pub fn words(&self) -> Vec<(usize, &str)> {
        words(&self.code)
    }

    /// Text of the string whose opening quotation mark stands at `at`.
    pub fn string_at(&self, at: usize) -> &str {
        let end = self.code[at + 1..].find('"').map_or(self.code.len(), |length| at + 1 + length);
        &self.strings[at + 1..end]
    }

    /// `src/units/table.rs:12`
    pub fn place(&self, at: usize) -> String {
        format!("{}:{}", self.path, 1 + self.code[..at].matches('\n').count())
    }

    /// The top module of a file of `src/`; `lib` and `main` name the two roots.
    pub fn module(&self) -> Option<&str> {
        let below = self.path.strip_prefix("src/")?;
        Some(below.split_once('/').map_or_else(|| below.trim_end_matches(".rs"), |(folder, _)| folder))
    }
}

/// Names and keywords of a text with their offsets.
pub fn words(code: &str) -> Vec<(usize, &str)> {
    let mut found = Vec::new();
    let mut start = None;
    for (at, c) in code.char_indices().chain([(code.len(), ' ')]) {
        match (c.is_alphanumeric() || c == '_', start) {
            (true, None) => start = Some(at),
            (false, Some(from)) => {
                found.push((from, &code[from..at]));
                start = None;
            }
            _ => {}
        }
    }
    found
}

/// Whether a phrase is words of lower-case letters and digits joined by dashes, beginning with a letter.
pub fn is_kebab(phrase: &str) -> bool {
    let plain = |c: char| c.is_ascii_lowercase() || c.is_ascii_digit();
    phrase.starts_with(|c: char| c.is_ascii_lowercase())
        && phrase.split('-').all(|word| !word.is_empty() && word.chars().all(plain))
}

/// Every file below `folder` with its path from there, in order of paths.
pub fn files(folder: &Path) -> Vec<String> {
    let mut found = Vec::new();
    let mut folders = vec![String::new()];
    while let Some(below) = folders.pop() {
        let here = folder.join(&below);
        let entries = fs::read_dir(&here).unwrap_or_else(|e| panic!("{} cannot be read: {e}", here.display()));
        for entry in entries {
            let entry = entry.unwrap_or_else(|e| panic!("{} cannot be read: {e}", here.display()));
            let name = entry.file_name().to_string_lossy().into_owned();
            let path = if below.is_empty() { name.clone() } else { format!("{below}/{name}") };
            match entry.file_type() {
                Ok(kind) if kind.is_dir() && !SKIPPED.contains(&name.as_str()) => folders.push(path),
                // `.git` is a file where one repository has several folders.
                Ok(kind) if kind.is_file() && name != ".git" => found.push(path),
                _ => {}
            }
        }
    }
    found.sort();
    found
}

/// The text with comments blanked, and the contents of strings and of characters too where asked.
fn blanked(text: &str, and_strings: bool) -> String {
    let bytes = text.as_bytes();
    let mut out = text.to_owned().into_bytes();
    let mut blank = |from: usize, to: usize| {
        out[from..to].iter_mut().filter(|byte| **byte != b'\n').for_each(|byte| *byte = b' ');
    };
    let mut at = 0;
    while at < bytes.len() {
        let rest = &text[at..];
        let end = if rest.starts_with("//") {
            let end = rest.find('\n').map_or(bytes.len(), |length| at + length);
            blank(at, end);
            end
        } else if rest.starts_with("/*") {
            let end = at + block_comment(rest);
            blank(at, end);
            end
        } else if let Some((open, length)) = string(text, at) {
            if and_strings {
                blank(at + open, at + length.max(open + 1) - 1);
            }
            at + length
        } else if let Some(length) = character(rest) {
            // Also where strings are kept: a quotation mark in here opens none.
            blank(at + 1, at + length - 1);
            at + length
        } else {
            at + rest.chars().next().map_or(1, char::len_utf8)
        };
        at = end;
    }
    // Only whole comments and literals were blanked, so no character was cut.
    String::from_utf8(out).expect("blanking keeps UTF-8")
}

/// Length of a block comment; they nest.
fn block_comment(text: &str) -> usize {
    let (mut depth, mut at) = (0, 0);
    while at < text.len() {
        let rest = &text.as_bytes()[at..];
        if rest.starts_with(b"/*") {
            (depth, at) = (depth + 1, at + 2);
        } else if rest.starts_with(b"*/") {
            (depth, at) = (depth - 1, at + 2);
            if depth == 0 {
                return at;
            }
        } else {
            at += 1;
        }
    }
    text.len()
}

/// Where a string literal starts at `at`: the length up to its contents, and its whole length less any closing `#`.
fn string(text: &str, at: usize) -> Option<(usize, usize)> {
    let rest = &text[at..];
    if rest.starts_with('"') {
        let mut escaped = false;
        let closing = rest.bytes().enumerate().skip(1).find(|&(_, byte)| {
            let closes = byte == b'"' && !escaped;
            escaped = byte == b'\\' && !escaped;
            closes
        });
        return Some((1, closing.map_or(rest.len(), |(end, _)| end + 1)));
    }
    // `r"` inside a name, as in `for"`, cannot occur: a name and a string never touch.
    let hashes = rest.strip_prefix('r')?.bytes().take_while(|byte| *byte == b'#').count();
    let before = text[..at].chars().next_back();
    let begins = !before.is_some_and(|c| (c.is_alphanumeric() && c != 'b') || c == '_');
    if !begins || rest.as_bytes().get(1 + hashes) != Some(&b'"') {
        return None;
    }
    let open = 2 + hashes;
    let closing = format!("\"{}", "#".repeat(hashes));
    Some((open, rest[open..].find(&closing).map_or(rest.len(), |length| open + length + 1)))
}

/// Length of a character literal; `None` for a lifetime.
fn character(rest: &str) -> Option<usize> {
    let mut chars = rest.strip_prefix('\'')?.char_indices();
    match chars.next()?.1 {
        '\\' => {
            let after = chars.next()?; // What is escaped, which may be the mark itself.
            let from = 1 + after.0 + after.1.len_utf8();
            rest[from..].find('\'').map(|length| from + length + 1)
        }
        c => rest[1 + c.len_utf8()..].starts_with('\'').then(|| 2 + c.len_utf8()),
    }
}

/// Where the tests at the end of a file begin.
fn tests_begin(code: &str) -> usize {
    const MARK: &str = "#[cfg(test)]\n";
    let starts = code.match_indices(MARK).map(|(at, _)| at);
    let mut tails = starts.filter(|at| code[..*at].ends_with('\n') || *at == 0);
    tails.find(|at| code[at + MARK.len()..].starts_with("mod ")).unwrap_or(code.len())
}

#[test]
fn comments_strings_and_tests_are_told_from_code() {
    let text = "//! todo!()\nfn a<'a>(s: &'a str) -> char {\n    let _ = (\"/* \\\" x\", r#\"a \"quoted\" dbg!\"#, br\"b\");\n    \
                /* one /* two */ still */ keep('\"', '\\'', '\\u{2212}', 'é');\n}\n#[cfg(test)]\nfn kept() {}\n\
                #[cfg(test)]\nmod tests { fn gone() {} }\n";
    let source = Source::new("src/a.rs", text);
    let words: Vec<&str> = source.words().into_iter().map(|(_, word)| word).collect();
    let want = "fn a a s a str char let _ r br keep fn kept";
    assert_eq!(
        words.iter().filter(|word| !["cfg", "test"].contains(word)).copied().collect::<Vec<_>>().join(" "),
        want
    );
    assert!(source.strings().contains("a \"quoted\" dbg!") && source.strings().contains("/* \\\" x"));
    assert!(!source.strings().contains("todo") && !source.strings().contains("still"));
    let at = source.code().find('"').unwrap();
    assert_eq!((source.string_at(at), source.place(at).as_str()), ("/* \\\" x", "src/a.rs:3"));
    assert_eq!(source.code().lines().count(), 7, "blanking keeps lines");
}

#[test]
fn a_phrase_of_lower_case_words_and_dashes_is_kebab() {
    for (phrase, is) in [("ideal-gas", true), ("k-2", true), ("", false), ("Ideal-gas", false), ("a--b", false)] {
        assert_eq!(is_kebab(phrase), is, "{phrase}");
    }
    assert!(!is_kebab("2-k") && !is_kebab("a_b") && !is_kebab("a-") && !is_kebab("a b"));
}
