//! Cells that do not parse, in words.
//!
//! [`SyntaxError`] says what is wrong and at which piece of the cell. The engine's own sentences are written for
//! programmers who come from other languages; none of them is shown.

use std::fmt;

use rhai::{LexError, ParseErrorType};

use crate::fault::Explain;
use crate::script::token::{Kind, tokens};

/// What keeps a cell from being read.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Problem {
    /// The cell ends inside something.
    Unfinished,
    UnfinishedText,
    Unexpected(String),
    /// A symbol that should stand here.
    Missing(String),
    /// Two statements without `;` between them.
    MissingSemicolon,
    NotAnOperator(String),
    Reserved(String),
    /// A literal that cannot be read: what it is, and its text.
    BadLiteral(&'static str, String),
    /// What should stand here instead.
    Expected(&'static str),
    WrongKind {
        wanted: String,
        given: String,
    },
    Duplicate {
        what: &'static str,
        name: String,
    },
    FunctionNotOutermost,
    FunctionIncomplete(String),
    MisplacedDocComment,
    OutsideLoop,
    TooNested,
    ConstantAssigned(String),
    NotAssignable,
    SwitchOrder,
    Import,
    Eval,
    Other(String),
}

/// A cell that does not parse.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct SyntaxError {
    pub problem: Problem,
    /// The piece of the cell where the engine stopped, if it is known.
    pub near: Option<String>,
}

impl SyntaxError {
    /// The engine's error on `code`, at a line and column of it.
    pub fn new(error: &ParseErrorType, code: &str, place: Option<(usize, usize)>) -> Self {
        let near = place.and_then(|(line, column)| piece_at(code, line, column));
        SyntaxError { problem: Problem::of(error), near }
    }
}

/// The token that covers a place, shortened.
fn piece_at(code: &str, line: usize, column: usize) -> Option<String> {
    let (tokens, _) = tokens(code);
    let token = tokens.iter().find(|token| {
        let width = token.text.lines().next().unwrap_or("").chars().count();
        token.line == line && (token.column..token.column + width.max(1)).contains(&column)
    })?;
    let first_line = token.text.lines().next().unwrap_or("");
    let whole = first_line.chars().count() <= 30 && first_line.len() == token.text.len();
    let hidden = token.kind == Kind::Text && token.text.is_empty();
    if hidden {
        None
    } else if whole {
        Some(first_line.to_owned())
    } else {
        Some(format!("{}…", first_line.chars().take(30).collect::<String>()))
    }
}

impl Problem {
    fn of(error: &ParseErrorType) -> Self {
        use ParseErrorType as E;
        match error {
            E::UnexpectedEOF => Problem::Unfinished,
            E::BadInput(error) => Problem::of_piece(error),
            E::UnknownOperator(op) => Problem::NotAnOperator(op.clone()),
            E::MissingToken(token, why) if token == ";" && why.contains("terminate") => Problem::MissingSemicolon,
            E::MissingToken(token, _) => Problem::Missing(token.clone()),
            E::Reserved(word) => Problem::of_word(word),
            E::PropertyExpected => Problem::Expected("the name of a property"),
            E::VariableExpected => Problem::Expected("the name of a variable"),
            E::FnMissingName => Problem::Expected("the name of the function"),
            E::ExprExpected(_) | E::MissingSymbol(_) => Problem::Expected("a value"),
            E::MalformedIndexExpr(_) => Problem::Expected("a whole number, or the name of an entry in quotes"),
            E::MismatchedType(wanted, given) => {
                Problem::WrongKind { wanted: plain_kind(wanted), given: plain_kind(given) }
            }
            E::DuplicatedProperty(name) => Problem::Duplicate { what: "entry", name: name.clone() },
            E::DuplicatedVariable(name) => Problem::Duplicate { what: "variable", name: name.clone() },
            E::FnDuplicatedDefinition(name, _) => Problem::Duplicate { what: "function", name: name.clone() },
            E::FnDuplicatedParam(_, name) => Problem::Duplicate { what: "argument", name: name.clone() },
            E::WrongFnDefinition => Problem::FunctionNotOutermost,
            E::FnMissingParams(name) | E::FnMissingBody(name) => Problem::FunctionIncomplete(name.clone()),
            E::WrongDocComment => Problem::MisplacedDocComment,
            E::LoopBreak => Problem::OutsideLoop,
            E::ExprTooDeep => Problem::TooNested,
            E::AssignmentToConstant(name) if !name.is_empty() => Problem::ConstantAssigned(name.clone()),
            E::AssignmentToConstant(_) | E::AssignmentToInvalidLHS(_) => Problem::NotAssignable,
            E::WrongSwitchIntegerCase | E::WrongSwitchDefaultCase | E::WrongSwitchCaseCondition => Problem::SwitchOrder,
            other => Problem::Other(other.to_string()),
        }
    }

    fn of_piece(error: &LexError) -> Self {
        match error {
            LexError::UnterminatedString => Problem::UnfinishedText,
            LexError::UnexpectedInput(piece) => Problem::Unexpected(piece.clone()),
            LexError::MalformedNumber(piece) => Problem::BadLiteral("a number", piece.clone()),
            LexError::MalformedChar(piece) => Problem::BadLiteral("a single character", piece.clone()),
            LexError::MalformedEscapeSequence(piece) => Problem::BadLiteral("an escape in a text", piece.clone()),
            LexError::MalformedIdentifier(piece) => Problem::BadLiteral("a name", piece.clone()),
            LexError::ImproperSymbol(word, _) => Problem::of_word(word),
            other => Problem::Other(other.to_string()),
        }
    }

    fn of_word(word: &str) -> Self {
        match word {
            "import" | "export" | "as" => Problem::Import,
            "eval" => Problem::Eval,
            _ if word.starts_with(|c: char| c.is_alphabetic()) => Problem::Reserved(word.to_owned()),
            _ => Problem::NotAnOperator(word.to_owned()),
        }
    }
}

/// The engine's description of a literal in our words.
fn plain_kind(kind: &str) -> String {
    match kind {
        "a boolean expression" => "true or false",
        "an iterable value" => "an array, a range or a text",
        "a floating-point number" => "a number",
        "a string" => "a text",
        "an object map" => "a map",
        "()" => "nothing",
        other => other,
    }
    .to_owned()
}

impl fmt::Display for SyntaxError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match &self.problem {
            Problem::Unfinished => write!(f, "the cell ends in the middle of something")?,
            Problem::UnfinishedText => write!(f, "a text is opened here and not closed on its line")?,
            Problem::Unexpected(piece) => write!(f, "{piece} does not fit here")?,
            Problem::Missing(token) => write!(f, "{token} is missing")?,
            Problem::MissingSemicolon => write!(f, "; is missing between two statements")?,
            Problem::NotAnOperator(op) => write!(f, "{op} is not an operator here")?,
            Problem::Reserved(word) => write!(f, "{word} is a word of the language and cannot stand here")?,
            Problem::BadLiteral(what, piece) => write!(f, "{piece} cannot be read as {what}")?,
            Problem::Expected(what) => write!(f, "{what} should stand here")?,
            Problem::WrongKind { wanted, given } => write!(f, "{wanted} should stand here, and this is {given}")?,
            Problem::Duplicate { what, name } => write!(f, "there are two of {what} {name}")?,
            Problem::FunctionNotOutermost => write!(f, "a function is defined inside something else")?,
            Problem::FunctionIncomplete(name) if name.is_empty() => write!(f, "a closure is incomplete")?,
            Problem::FunctionIncomplete(name) => write!(f, "function {name} is incomplete")?,
            Problem::MisplacedDocComment => write!(f, "/// does not stand before a function")?,
            Problem::OutsideLoop => write!(f, "break and continue belong in a loop")?,
            Problem::TooNested => write!(f, "this expression is nested too deep")?,
            Problem::ConstantAssigned(name) => write!(f, "{name} is constant and cannot be changed")?,
            Problem::NotAssignable => write!(f, "what stands left of = cannot be given a value")?,
            Problem::SwitchOrder => write!(f, "the cases of this switch are not in order")?,
            Problem::Import => write!(f, "import and export are not used in notebooks")?,
            Problem::Eval => write!(f, "eval is not offered in notebooks: the text it runs could not be sealed")?,
            Problem::Other(text) => write!(f, "{text}")?,
        }
        match (&self.problem, &self.near) {
            // These name the piece themselves.
            (
                Problem::Unexpected(_) | Problem::Reserved(_) | Problem::BadLiteral(..) | Problem::NotAnOperator(_),
                _,
            )
            | (Problem::Import | Problem::Eval | Problem::OutsideLoop | Problem::UnfinishedText, _)
            | (_, None) => Ok(()),
            (Problem::MissingSemicolon | Problem::Missing(_), Some(near)) => write!(f, ", before {near}"),
            (_, Some(near)) => write!(f, ", at {near}"),
        }
    }
}

impl Explain for SyntaxError {
    fn code(&self) -> &'static str {
        match self.problem {
            Problem::Unfinished | Problem::UnfinishedText => "unfinished-cell",
            Problem::MissingSemicolon | Problem::Missing(_) => "missing-symbol",
            Problem::Reserved(_) => "reserved-word",
            Problem::Import => "import-refused",
            Problem::Eval => "eval-refused",
            _ => "syntax",
        }
    }

    fn hint(&self) -> String {
        match &self.problem {
            Problem::Unfinished => "close what is open: a bracket, a brace, a text or a comment".to_owned(),
            Problem::UnfinishedText => {
                "close it with the same quote; a text over several lines stands in back-ticks".to_owned()
            }
            Problem::Missing(token) => format!("add {token}, or look for a bracket that is open too long"),
            Problem::MissingSemicolon => "end each statement with ; (the last one of a cell may go without)".to_owned(),
            Problem::NotAnOperator(op) => match op.as_str() {
                "===" => "write ==".to_owned(),
                "!==" => "write !=".to_owned(),
                "?" => "write if … { a } else { b }".to_owned(),
                "++" | "--" => "write x += 1 or x -= 1".to_owned(),
                ":=" | "<-" => "write =".to_owned(),
                _ => "the operators are + - * / % ** == != < <= > >= && || ! ?? and in".to_owned(),
            },
            Problem::Reserved(word) if word == "null" => "nothing is written ()".to_owned(),
            Problem::Reserved(_) => "choose another name".to_owned(),
            Problem::BadLiteral("a single character", _) => {
                "a text of more than one character stands in \" quotes".to_owned()
            }
            Problem::BadLiteral("an escape in a text", _) => {
                "a backslash itself is written \\\\; \\n and \\t are line end and tab".to_owned()
            }
            Problem::WrongKind { .. } => "compare it with something: x > 0".to_owned(),
            Problem::Duplicate { .. } => "rename or remove one of them".to_owned(),
            Problem::FunctionNotOutermost => "define it outside, or use a closure: let f = |x| …".to_owned(),
            Problem::FunctionIncomplete(_) => "write fn name(argument) { … }".to_owned(),
            Problem::MisplacedDocComment => "use // for other comments".to_owned(),
            Problem::OutsideLoop => "leave a cell early with return".to_owned(),
            Problem::TooNested => "split it over several let statements".to_owned(),
            Problem::ConstantAssigned(_) => "use let where it is defined, or a new name".to_owned(),
            Problem::NotAssignable => "give a value to a name, an entry a[0] or a property; == compares".to_owned(),
            Problem::SwitchOrder => "single cases first, then ranges, and _ last".to_owned(),
            Problem::Import => {
                "write module::function(…): the file module.rhai beside the notebook is found by itself".to_owned()
            }
            Problem::Eval => "define a function and call it".to_owned(),
            Problem::Unexpected(_) | Problem::BadLiteral(..) | Problem::Expected(_) | Problem::Other(_) => {
                "look for a symbol too many or too few before it".to_owned()
            }
        }
    }
}
