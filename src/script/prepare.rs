//! A cell's text made ready for the engine: what can be misread is refused, two constructs are completed.
//!
//! [`prepare`] refuses `-x**2` and literals that a number cannot hold. It also completes `catch (e) {`, so that the
//! engine's own errors are caught in the same form as ours, and `switch x {`, so that a value which can never match
//! is refused instead of ignored. The surprise: both completions are inserted text, so columns behind one shift;
//! [`Shifts`] takes a position back to what the user wrote.

use std::collections::BTreeMap;
use std::fmt;

use crate::fault::Explain;
use crate::script::token::{Kind, Token, tokens};

/// Name of the function that gives every caught error one form.
pub const CAUGHT: &str = "caught";
/// Name of the function that refuses what `switch` cannot compare.
pub const SWITCHABLE: &str = "switchable";

/// Why a cell is refused before it is parsed.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Misreading {
    /// `-x**2`: the engine takes the minus first, print takes the power first.
    MinusBeforePower { operand: String, exponent: String },
    /// A whole number that 64 bits do not hold; the engine would round it or turn it negative without a word.
    WholeNumberTooLong { literal: String },
    /// `1e999`, which would be infinite, or `1e-999`, which would be nothing.
    NumberOutOfRange { literal: String },
}

impl fmt::Display for Misreading {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Misreading::MinusBeforePower { operand, exponent } => {
                write!(f, "-{operand}**{exponent} can be read two ways: the minus first, or the power first")
            }
            Misreading::WholeNumberTooLong { literal } => {
                write!(f, "{literal} has more digits than a whole number can hold here")
            }
            Misreading::NumberOutOfRange { literal } => {
                write!(f, "{literal} is outside the range of numbers, about 1e-308 to 1e308")
            }
        }
    }
}

impl Explain for Misreading {
    fn code(&self) -> &'static str {
        match self {
            Misreading::MinusBeforePower { .. } => "minus-before-power",
            Misreading::WholeNumberTooLong { .. } => "whole-number-too-long",
            Misreading::NumberOutOfRange { .. } => "number-out-of-range",
        }
    }

    fn hint(&self) -> String {
        match self {
            Misreading::MinusBeforePower { operand, exponent } => {
                format!("write -({operand}**{exponent}) or (-{operand})**{exponent}")
            }
            Misreading::WholeNumberTooLong { literal } if literal.starts_with("0x") || literal.starts_with("0X") => {
                "the largest is 0x7FFF_FFFF_FFFF_FFFF".to_owned()
            }
            Misreading::WholeNumberTooLong { literal } => {
                format!("write it with a point, {literal}.0, and about 16 digits are kept")
            }
            Misreading::NumberOutOfRange { .. } => "choose a unit in which the number is nearer to 1".to_owned(),
        }
    }
}

/// Text inserted before a character of the cell.
#[derive(Clone, Debug, PartialEq, Eq)]
struct Insertion {
    offset: usize,
    line: usize,
    column: usize,
    text: String,
    /// Column that stands for the inserted text in messages.
    anchor: usize,
}

/// A cell ready to be parsed.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Prepared {
    pub text: String,
    /// Whether the cell ends in `;`, which asks that its value be not shown.
    pub quiet: bool,
    insertions: Vec<Insertion>,
}

/// Where text was inserted, by source and line: to take positions back to what was written.
#[derive(Clone, Debug, Default)]
pub struct Shifts {
    by_source: BTreeMap<String, BTreeMap<usize, Vec<Shift>>>,
}

#[derive(Clone, Copy, Debug)]
struct Shift {
    column: usize,
    length: usize,
    anchor: usize,
}

impl Shifts {
    /// Notes the insertions of a source, in place of what was noted under that name before.
    pub fn note(&mut self, source: &str, prepared: &Prepared) {
        let mut lines: BTreeMap<usize, Vec<Shift>> = BTreeMap::new();
        for insertion in &prepared.insertions {
            let length = insertion.text.chars().count();
            let shift = Shift { column: insertion.column, length, anchor: insertion.anchor };
            lines.entry(insertion.line).or_default().push(shift);
        }
        if lines.is_empty() {
            self.by_source.remove(source);
        } else {
            self.by_source.insert(source.to_owned(), lines);
        }
    }

    /// The column in the written text for one in the prepared text.
    pub fn written(&self, source: &str, line: usize, column: usize) -> usize {
        let mut before = 0;
        for shift in self.by_source.get(source).and_then(|lines| lines.get(&line)).into_iter().flatten() {
            if column < shift.column + before {
                break;
            }
            if column < shift.column + before + shift.length {
                return shift.anchor;
            }
            before += shift.length;
        }
        column - before
    }
}

/// Reads a cell before the engine does. On a misreading the place is its line and column.
pub fn prepare(code: &str) -> Result<Prepared, (Misreading, usize, usize)> {
    let (tokens, _) = tokens(code);
    for (index, token) in tokens.iter().enumerate() {
        let found = match token.kind {
            Kind::Number => number_out_of_range(token.text),
            Kind::Symbol if token.text == "-" => minus_before_power(code, &tokens, index),
            _ => None,
        };
        if let Some(misreading) = found {
            return Err((misreading, token.line, token.column));
        }
    }
    let mut insertions: Vec<Insertion> = (0..tokens.len())
        .flat_map(|index| catch_completion(&tokens, index).into_iter().chain(switch_completion(&tokens, index)))
        .collect();
    insertions.sort_by_key(|insertion| insertion.offset);
    let mut text = String::with_capacity(code.len());
    let mut copied = 0;
    for insertion in &insertions {
        text.push_str(&code[copied..insertion.offset]);
        text.push_str(&insertion.text);
        copied = insertion.offset;
    }
    text.push_str(&code[copied..]);
    Ok(Prepared { text, quiet: tokens.last().is_some_and(|token| token.is(";")), insertions })
}

fn number_out_of_range(literal: &str) -> Option<Misreading> {
    let plain = literal.replace('_', "");
    let lower = plain.to_ascii_lowercase();
    let radix = [("0x", 16), ("0o", 8), ("0b", 2)].into_iter().find(|(mark, _)| lower.starts_with(mark));
    if let Some((_, radix)) = radix {
        let too_long =
            i64::from_str_radix(&lower[2..], radix).is_err() && u128::from_str_radix(&lower[2..], radix).is_ok();
        return too_long.then(|| Misreading::WholeNumberTooLong { literal: literal.to_owned() });
    }
    if !lower.contains(['.', 'e']) {
        let too_long = plain.parse::<i64>().is_err();
        return too_long.then(|| Misreading::WholeNumberTooLong { literal: literal.to_owned() });
    }
    let value: f64 = plain.parse().ok()?;
    let mantissa = lower.split('e').next().unwrap_or("");
    let vanished = value == 0.0 && mantissa.contains(|digit: char| ('1'..='9').contains(&digit));
    (value.is_infinite() || vanished).then(|| Misreading::NumberOutOfRange { literal: literal.to_owned() })
}

/// Whether an expression may end with this token, so that a minus behind it subtracts.
fn ends_operand(token: &Token<'_>) -> bool {
    match token.kind {
        Kind::Number | Kind::Text => true,
        Kind::Word => !is_keyword(token.text) || matches!(token.text, "this" | "true" | "false"),
        Kind::Symbol => matches!(token.text, ")" | "]" | "}" | "()" | "`"),
    }
}

fn is_keyword(word: &str) -> bool {
    const KEYWORDS: [&str; 24] = [
        "let", "const", "if", "else", "switch", "do", "while", "until", "loop", "for", "in", "continue", "break",
        "return", "throw", "try", "catch", "fn", "private", "import", "export", "as", "and", "or",
    ];
    KEYWORDS.contains(&word)
}

fn minus_before_power(code: &str, tokens: &[Token<'_>], minus: usize) -> Option<Misreading> {
    if let Some(before) = minus.checked_sub(1).map(|index| &tokens[index]) {
        // A block may end a statement: then a minus on a later line starts the next one.
        let starts_statement = before.is("}") && before.line < tokens[minus].line;
        if ends_operand(before) && !starts_statement {
            return None;
        }
    }
    let operand_end = operand(tokens, minus + 1)?;
    let power = tokens.get(operand_end)?;
    if !power.is("**") {
        return None;
    }
    let exponent_end = operand(tokens, operand_end + 1).unwrap_or(operand_end + 1);
    let written = |from: usize, to: usize, stand_in: &str| {
        let text = &code[tokens[from].offset..tokens[to - 1].end()];
        let short = text.chars().count() <= 30 && !text.contains('\n');
        if short { text.to_owned() } else { stand_in.to_owned() }
    };
    Some(Misreading::MinusBeforePower {
        operand: written(minus + 1, operand_end, "x"),
        exponent: if exponent_end > operand_end + 1 {
            written(operand_end + 1, exponent_end, "n")
        } else {
            "n".to_owned()
        },
    })
}

/// Index behind the operand that starts at `index`: signs, a value, and the calls, indexes and names that follow it.
fn operand(tokens: &[Token<'_>], mut index: usize) -> Option<usize> {
    while tokens.get(index).is_some_and(|token| token.is("-") || token.is("+") || token.is("!")) {
        index += 1;
    }
    let first = tokens.get(index)?;
    index = match first.kind {
        Kind::Symbol if matches!(first.text, "(" | "[" | "#{") => closing(tokens, index)? + 1,
        Kind::Symbol => return None,
        Kind::Word if is_keyword(first.text) => return None,
        Kind::Word | Kind::Number | Kind::Text => index + 1,
    };
    while let Some(token) = tokens.get(index) {
        index = match token.text {
            "()" => index + 1,
            "(" | "[" | "?[" => closing(tokens, index)? + 1,
            "." | "?." | "::" if tokens.get(index + 1).is_some_and(|name| name.kind == Kind::Word) => index + 2,
            // `f!(x)` is a call too.
            "!" if tokens.get(index + 1).is_some_and(|next| next.is("(") || next.is("()")) => index + 1,
            _ => break,
        };
    }
    Some(index)
}

/// Index of the bracket that closes the one at `open`.
fn closing(tokens: &[Token<'_>], open: usize) -> Option<usize> {
    let mut depth = 0_usize;
    for (index, token) in tokens.iter().enumerate().skip(open) {
        if token.kind != Kind::Symbol {
            continue;
        }
        match token.text {
            "(" | "[" | "?[" | "{" | "#{" | "${" => depth += 1,
            ")" | "]" | "}" => {
                depth = depth.checked_sub(1)?;
                if depth == 0 {
                    return Some(index);
                }
            }
            _ => {}
        }
    }
    None
}

/// `catch (e) {` becomes `catch (e) { let e = caught(e);`.
fn catch_completion(tokens: &[Token<'_>], index: usize) -> Option<Insertion> {
    let [catch, open, name, close, body] = tokens.get(index..index + 5)? else { return None };
    let fits = catch.is("catch") && open.is("(") && name.kind == Kind::Word && close.is(")") && body.is("{");
    fits.then(|| Insertion {
        offset: body.end(),
        line: body.line,
        column: body.column + 1,
        text: format!(" let {0} = {CAUGHT}({0});", name.text),
        anchor: body.column,
    })
}

/// `switch x {` becomes `switch switchable(x) {`.
fn switch_completion(tokens: &[Token<'_>], index: usize) -> Vec<Insertion> {
    let member = index.checked_sub(1).is_some_and(|before| tokens[before].is(".") || tokens[before].is("?."));
    let keyword = &tokens[index];
    if !keyword.is("switch") || keyword.kind != Kind::Word || member {
        return Vec::new();
    }
    let Some(body) = switch_body(tokens, index + 1) else { return Vec::new() };
    if body == index + 1 {
        return Vec::new();
    }
    let last = &tokens[body - 1];
    let column_behind = |token: &Token<'_>| token.column + token.text.chars().count();
    vec![
        Insertion {
            offset: keyword.end(),
            line: keyword.line,
            column: column_behind(keyword),
            text: format!(" {SWITCHABLE}("),
            anchor: keyword.column,
        },
        Insertion {
            offset: last.end(),
            line: last.line,
            column: column_behind(last),
            text: ")".to_owned(),
            anchor: last.column,
        },
    ]
}

/// Index of the `{` that opens the cases of a `switch` whose value starts at `start`.
fn switch_body(tokens: &[Token<'_>], start: usize) -> Option<usize> {
    let mut index = start;
    while let Some(token) = tokens.get(index) {
        let opens = token.kind == Kind::Symbol && matches!(token.text, "(" | "[" | "?[" | "#{" | "${");
        if token.is("{") {
            // Behind bars it is the body of a closure, and at the start a block: their cases come later.
            let closure = tokens[index - 1].is("|") || tokens[index - 1].is("||");
            return (index > start && !closure).then_some(index);
        }
        // A value with blocks of its own, and a text over several lines, behind which columns are not known, are rare
        // enough to stay as they are: an engine's error on completed text would be worse.
        let blocks = token.kind == Kind::Word && token.text != "in" && is_keyword(token.text);
        if token.is(";") || blocks || (token.kind == Kind::Text && token.text.contains('\n')) {
            return None;
        }
        index = if opens { closing(tokens, index)? + 1 } else { index + 1 };
    }
    None
}

#[cfg(test)]
mod tests {
    use super::*;

    fn refusal(code: &str) -> Option<String> {
        prepare(code).err().map(|(misreading, line, column)| format!("{line}:{column} {}", misreading.hint()))
    }

    #[test]
    fn a_minus_before_a_power_is_found() {
        let cases = [
            ("-x**2", "1:1 write -(x**2) or (-x)**2"),
            ("let y = -2.5**n;", "1:9 write -(2.5**n) or (-2.5)**n"),
            ("f(a, -x.y[1](2)**-3)", "1:6 write -(x.y[1](2)**-3) or (-x.y[1](2))**-3"),
            ("2**-x**2", "1:4 write -(x**2) or (-x)**2"),
            ("-(a + b)**2", "1:1 write -((a + b)**2) or (-(a + b))**2"),
            ("`a ${-x**2}`", "1:6 write -(x**2) or (-x)**2"),
            ("|x| -x**2", "1:5 write -(x**2) or (-x)**2"),
            ("if a { 1 }\n-x**2", "2:1 write -(x**2) or (-x)**2"),
            ("return -x**2", "1:8 write -(x**2) or (-x)**2"),
            ("1 - -x**2", "1:5 write -(x**2) or (-x)**2"),
            ("-f()**2", "1:1 write -(f()**2) or (-f())**2"),
        ];
        for (code, found) in cases {
            assert_eq!(refusal(code).as_deref(), Some(found), "{code}");
        }
    }

    #[test]
    fn a_subtraction_or_a_bracket_is_left_alone() {
        let cases = [
            "a - b**2",
            "-(x**2)",
            "(-x)**2",
            "x**-2",
            "a[1] - b**2",
            "f() - b**2",
            "#{a: 1} - b**2",
            "\"-x**2\"",
            "`-x**2 ${a - b**2}`",
            "// -x**2\n1",
            "/* -x**2 */ 1",
            "-x * 2**2",
            "-x + y**2",
            "`a` - x**2",
            "true - x**2",
        ];
        for code in cases {
            assert_eq!(refusal(code), None, "{code}");
        }
    }

    #[test]
    fn literals_that_would_change_silently_are_refused() {
        assert!(refusal("1e999").unwrap().contains("nearer to 1"));
        assert!(refusal("1.5e-999").is_some());
        assert!(refusal("9223372036854775808").unwrap().contains("9223372036854775808.0"));
        assert!(refusal("0xFFFF_FFFF_FFFF_FFFF").is_some());
        for code in ["0.0e-999", "9_223_372_036_854_775_807", "1e308", "0x7FFF_FFFF_FFFF_FFFF", "9223372036854775808.0"]
        {
            assert_eq!(refusal(code), None, "{code}");
        }
    }

    #[test]
    fn completions_are_inserted_and_positions_come_back() {
        let code = "try { a } catch (e) { b } switch x + #{y: 1}.y { 1 => c }";
        let prepared = prepare(code).unwrap();
        assert_eq!(
            prepared.text,
            "try { a } catch (e) { let e = caught(e); b } switch switchable( x + #{y: 1}.y) { 1 => c }"
        );
        let mut shifts = Shifts::default();
        shifts.note("cell-1", &prepared);
        let column = |text: &str, word: &str| text.find(word).unwrap() + 1;
        for word in ["a }", "b }", "switch", "x +", "#{y", "{ 1", "c }"] {
            let shifted = column(&prepared.text, word);
            assert_eq!(shifts.written("cell-1", 1, shifted), column(code, word), "{word}");
        }
        let inside = column(&prepared.text, "caught");
        assert_eq!(shifts.written("cell-1", 1, inside), column(code, "{ b"));
        assert_eq!(shifts.written("cell-1", 1, column(&prepared.text, "switchable")), column(code, "switch"));
        assert_eq!(shifts.written("cell-2", 1, 40), 40);
    }

    #[test]
    fn a_switch_on_a_value_with_blocks_is_left_alone() {
        for code in
            ["switch if a { 1 } else { 2 } { 1 => 2 }", "switch |x| { x } { 1 => 2 }", "switch { 1 } { 1 => 2 }"]
        {
            assert_eq!(prepare(code).unwrap().text, code);
        }
        let text = prepare("switch [1].map(|x| { x }) { 1 => 2 }").unwrap().text;
        assert_eq!(text, "switch switchable( [1].map(|x| { x })) { 1 => 2 }");
    }

    #[test]
    fn a_semicolon_at_the_end_is_seen_behind_comments() {
        assert!(prepare("let a = 1; // done;\n/* ; */  ").unwrap().quiet);
        assert!(!prepare("let a = 1; a // ;").unwrap().quiet);
        assert!(!prepare("").unwrap().quiet);
        assert!(!prepare("\"a;\"").unwrap().quiet);
    }
}
