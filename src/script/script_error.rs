//! What goes wrong in a script, as far as the engine finds it and no function of ours.
//!
//! [`ScriptError`] names what is there and what is missing in the words of a notebook. It is made in
//! `script/fault.rs`, which knows how the engine reports each case.

use std::fmt;

use crate::fault::Explain;
use crate::script::words;

/// Depth to which functions may call each other; the evaluation stack is sized for it.
pub const CALL_LEVELS: usize = 500;

/// An error of the engine. Kinds of values are given in words, with their article.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum ScriptError {
    UnknownFunction {
        name: String,
        near: Option<String>,
    },
    /// A function that has no form for this number of arguments; `takes` lists its forms.
    ArgumentCount {
        name: String,
        given: usize,
        takes: Vec<String>,
    },
    /// A formula that is not written so; `written` lists how it is.
    FormulaArguments {
        name: String,
        written: Vec<String>,
    },
    /// A function of the library that has forms for this number of arguments, but not for their kinds.
    WrongArguments {
        name: String,
        given: Vec<String>,
        takes: Vec<String>,
    },
    ClosureArguments {
        given: usize,
    },
    /// A variable that holds a function was called like a function.
    CalledVariable {
        name: String,
    },
    Operator {
        op: String,
        operands: Vec<String>,
    },
    Unsortable {
        unlike: bool,
    },
    UnknownVariable {
        name: String,
        near: Option<String>,
    },
    /// A variable of the notebook, used inside a function.
    OutsideFunction {
        name: String,
    },
    UnknownModule {
        name: String,
        near: Option<String>,
    },
    /// A name behind `module::` that the module does not have; `has` lists what it has.
    UnknownInModule {
        file: String,
        name: String,
        near: Option<String>,
        has: Vec<String>,
    },
    /// A constant of a module, used in one of its functions without `global::`.
    OwnConstant {
        name: String,
    },
    UnknownProperty {
        name: String,
        of: String,
    },
    ReadOnlyProperty {
        name: String,
        of: String,
    },
    MissingEntry {
        name: String,
    },
    OutOfRange {
        of: &'static str,
        index: i64,
        length: usize,
    },
    NotIndexable {
        what: String,
    },
    WrongKind {
        wanted: String,
        given: String,
    },
    NotIterable,
    Constant {
        name: String,
    },
    InUse,
    NoThis,
    TooDeep,
    /// An error of the engine for which there are no words here.
    Other {
        text: String,
    },
    /// The script said `throw`.
    Thrown {
        message: String,
        hint: Option<String>,
    },
    /// A panic in native code.
    Bug {
        what: String,
    },
}

/// `2 arguments`, in figures.
pub fn count(number: usize, noun: &str) -> String {
    match number {
        0 => format!("no {noun}s"),
        1 => format!("1 {noun}"),
        _ => format!("{number} {noun}s"),
    }
}

impl fmt::Display for ScriptError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            ScriptError::UnknownFunction { name, .. } => write!(f, "there is no function {name}"),
            ScriptError::WrongArguments { name, given, .. } => write!(f, "{name} does not take {}", words::list(given)),
            ScriptError::FormulaArguments { name, .. } => write!(f, "{name} takes another number of arguments"),
            ScriptError::ArgumentCount { name, given, .. } => {
                write!(f, "{name} was called with {}", count(*given, "argument"))
            }
            ScriptError::ClosureArguments { given } => {
                write!(f, "a closure was called with {}, and takes another number", count(*given, "argument"))
            }
            ScriptError::CalledVariable { name } => write!(f, "{name} is a variable that holds a function"),
            ScriptError::Operator { op, operands } if operands.len() == 1 => {
                write!(f, "{op} does not work on {}", operands[0])
            }
            ScriptError::Operator { op, operands } => write!(f, "{op} does not work between {}", words::list(operands)),
            ScriptError::Unsortable { unlike: true } => write!(f, "an array of unlike values cannot be sorted"),
            ScriptError::Unsortable { unlike: false } => {
                write!(f, "the values of this array have no order of their own")
            }
            ScriptError::UnknownVariable { name, .. } => write!(f, "there is no variable {name}"),
            ScriptError::OutsideFunction { name } => write!(f, "{name} is not visible inside a function"),
            ScriptError::UnknownModule { name, .. } => write!(f, "there is no module {name}"),
            ScriptError::UnknownInModule { file, name, .. } => write!(f, "{file} has no {name}"),
            ScriptError::OwnConstant { name } => {
                write!(f, "{name} is a constant of the module, and its functions do not see it by its bare name")
            }
            ScriptError::UnknownProperty { name, of } => write!(f, "{of} has no property {name}"),
            ScriptError::ReadOnlyProperty { name, of } => write!(f, "property {name} of {of} cannot be set"),
            ScriptError::MissingEntry { name } => write!(f, "the map has no entry {name}"),
            ScriptError::OutOfRange { of, index, length: 0 } => write!(f, "the {of} is empty and has no index {index}"),
            ScriptError::OutOfRange { of, index, length } => {
                write!(f, "index {index} is outside this {of}, which has {length}")
            }
            ScriptError::NotIndexable { what } => write!(f, "{what} has no parts to be taken with [ ]"),
            ScriptError::WrongKind { wanted, given } if wanted == "a whole number" && given == "a number" => {
                write!(f, "a whole number is needed here, and a number with a point was given")
            }
            ScriptError::WrongKind { wanted, given } => write!(f, "{wanted} is needed here, and {given} was given"),
            ScriptError::NotIterable => write!(f, "for cannot go through this value"),
            ScriptError::Constant { name } if name.is_empty() => write!(f, "a constant cannot be changed"),
            ScriptError::Constant { name } => write!(f, "{name} is constant and cannot be changed"),
            ScriptError::InUse => write!(f, "a value that a closure shares is used while it is being changed"),
            ScriptError::NoThis => write!(f, "this stands for nothing here"),
            ScriptError::TooDeep => write!(f, "functions call each other more than {CALL_LEVELS} deep"),
            ScriptError::Other { text } => write!(f, "{text}"),
            ScriptError::Thrown { message, .. } => write!(f, "{message}"),
            ScriptError::Bug { what } => write!(f, "a bug in this program, not in your cell: {what}"),
        }
    }
}

impl Explain for ScriptError {
    fn code(&self) -> &'static str {
        match self {
            ScriptError::UnknownFunction { .. } => "unknown-function",
            ScriptError::WrongArguments { .. } => "wrong-arguments",
            ScriptError::ArgumentCount { .. }
            | ScriptError::FormulaArguments { .. }
            | ScriptError::ClosureArguments { .. } => "argument-count",
            ScriptError::CalledVariable { .. } => "called-variable",
            ScriptError::Operator { .. } => "operator-mismatch",
            ScriptError::Unsortable { .. } => "unsortable",
            ScriptError::UnknownVariable { .. } => "unknown-variable",
            ScriptError::OutsideFunction { .. } => "outside-function",
            ScriptError::UnknownModule { .. } => "unknown-module",
            ScriptError::UnknownInModule { .. } => "unknown-in-module",
            ScriptError::OwnConstant { .. } => "own-constant",
            ScriptError::UnknownProperty { .. } => "unknown-property",
            ScriptError::ReadOnlyProperty { .. } => "read-only-property",
            ScriptError::MissingEntry { .. } => "missing-entry",
            ScriptError::OutOfRange { .. } => "index-out-of-range",
            ScriptError::NotIndexable { .. } => "not-indexable",
            ScriptError::WrongKind { .. } => "wrong-kind",
            ScriptError::NotIterable => "not-iterable",
            ScriptError::Constant { .. } => "constant-changed",
            ScriptError::InUse => "value-in-use",
            ScriptError::NoThis => "no-this",
            ScriptError::TooDeep => "calls-too-deep",
            ScriptError::Other { .. } => "script-error",
            ScriptError::Thrown { .. } => "thrown",
            ScriptError::Bug { .. } => "bug",
        }
    }

    fn hint(&self) -> String {
        let what_is_it = "print the value to see what it is";
        match self {
            ScriptError::UnknownFunction { near: Some(near), .. }
            | ScriptError::UnknownVariable { near: Some(near), .. }
            | ScriptError::UnknownInModule { near: Some(near), .. } => format!("did you mean {near}?"),
            ScriptError::UnknownInModule { has, .. } => format!("it has {}", words::list(has)),
            ScriptError::OwnConstant { name } => format!("write global::{name}"),
            ScriptError::UnknownModule { near: Some(near), .. } => {
                format!("did you mean {near}, which is beside the notebook?")
            }
            ScriptError::UnknownFunction { name, .. } => {
                format!("define it with fn {name}(…) in this cell or an earlier one")
            }
            ScriptError::WrongArguments { name, takes, .. } | ScriptError::ArgumentCount { name, takes, .. } => {
                format!("{name} takes {}", takes.join(", or "))
            }
            ScriptError::FormulaArguments { written, .. } => {
                format!("write {}; what has a default may be left out", written.join(", or "))
            }
            ScriptError::ClosureArguments { .. } => {
                "what stands between its bars is what it takes: |a, b| takes 2".to_owned()
            }
            ScriptError::CalledVariable { name } => format!("write {name}.call(…)"),
            ScriptError::Operator { op, .. } if op.starts_with("..") => {
                "a range goes between whole numbers; to_int() makes one of a number".to_owned()
            }
            ScriptError::Operator { operands, .. } if operands.len() == 1 => what_is_it.to_owned(),
            ScriptError::Operator { .. } => "print both sides to see what they are".to_owned(),
            ScriptError::Unsortable { .. } => {
                "give the rule: sort(|a, b| …), below zero where a comes first".to_owned()
            }
            ScriptError::UnknownVariable { name, .. } => {
                format!("define it first with let {name} = …; of a cell that failed nothing is kept")
            }
            ScriptError::OutsideFunction { name } => {
                format!("a function sees only what it is given: pass {name} as an argument")
            }
            ScriptError::UnknownModule { name, .. } => {
                format!("put {name}.rhai beside the notebook, or check the name before ::")
            }
            ScriptError::UnknownProperty { .. } => format!("check the name, or {what_is_it}"),
            ScriptError::ReadOnlyProperty { .. } => "make a new value instead of changing this one".to_owned(),
            ScriptError::MissingEntry { name } => format!("keys() lists the entries; ask first with \"{name}\" in map"),
            ScriptError::OutOfRange { .. } => "the first has index 0, the last has -1".to_owned(),
            ScriptError::NotIndexable { .. } => "arrays, maps and texts have parts: a[0], m[\"name\"]".to_owned(),
            ScriptError::WrongKind { wanted, given } if wanted == "a whole number" && given == "a number" => {
                "/ and ** always give a number with a point; x.to_int() makes a whole one".to_owned()
            }
            ScriptError::WrongKind { .. } => what_is_it.to_owned(),
            ScriptError::NotIterable => "for goes through arrays, texts, and ranges such as 0..10".to_owned(),
            ScriptError::Constant { .. } => "use let where it is defined, or a new name".to_owned(),
            ScriptError::InUse => "copy it into a variable of its own first".to_owned(),
            ScriptError::NoThis => "this is what stands before the dot where a function is called: x.f()".to_owned(),
            ScriptError::TooDeep => "check that every path of the recursion comes to an end".to_owned(),
            ScriptError::Other { .. } => "look at the place named above".to_owned(),
            ScriptError::Thrown { hint: Some(hint), .. } if !hint.is_empty() => hint.clone(),
            ScriptError::Thrown { .. } => "the script raised this itself, with throw".to_owned(),
            ScriptError::Bug { .. } => {
                "the session is as it was before the cell; please report the cell with this text".to_owned()
            }
        }
    }
}

/// A cell or module defines a function whose name the library holds: it would replace it inside the library too.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct ReservedName {
    pub name: String,
}

impl fmt::Display for ReservedName {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{} is a function of the library and cannot be defined again", self.name)
    }
}

impl Explain for ReservedName {
    fn code(&self) -> &'static str {
        "reserved-name"
    }

    fn hint(&self) -> String {
        format!("choose another name, such as my_{}", self.name)
    }
}
