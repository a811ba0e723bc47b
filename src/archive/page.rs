//! The audits of an archive as a page of HTML to be filed: complete in itself, read without network and script, and printed.
//!
//! The page is written part by part, each by a walk of its own; the words of each part stand in `page/*.html`, in three
//! pieces: what opens it, what is said of each row, and what closes it. Everything that comes from a notebook is escaped,
//! and what could steer the direction of a text is made visible. The surprise: rows of the notebooks are never marked as
//! safe, so that a template cannot let a label's markup through by accident.

use std::io::Write;

use minijinja::value::Serde;
use minijinja::{AutoEscape, Environment, Template, UndefinedBehavior, Value, context, escape_formatter};

use crate::archive::audits::Audits;
use crate::archive::report::{About, ReportError, unwritable};
use crate::archive::rows::{self, At};
use crate::archive::tally::Tally;
use crate::fault::Fault;
use crate::notebook::verdict::NotebookAudit;
use crate::render::harmless::harmless;

/// Ends the opening of a part, and the words for each row.
const EACH: &str = "<!-- each -->\n";
const CLOSE: &str = "<!-- close -->\n";

/// The rows that a notebook brings to a part.
type Rows = fn(&NotebookAudit, &At) -> Vec<serde_json::Value>;

/// A part of the page.
struct Part {
    name: &'static str,
    template: &'static str,
    /// One walk each.
    rows: &'static [Rows],
}

macro_rules! part {
    ($name:literal, $rows:expr) => {
        Part { name: $name, template: include_str!(concat!("page/", $name, ".html")), rows: $rows }
    };
}

/// In the order in which an auditor asks: the result, what it rests on, what is not the same and why, what was decided, what
/// was not looked at, and then the whole list.
static PARTS: &[Part] = &[
    part!("head", &[]),
    part!("not-same", &[rows::not_same]),
    part!("faults", &[rows::faults]),
    part!("moves", &[rows::moves]),
    part!("steps", &[rows::steps]),
    part!("justifications", &[rows::lapsed, rows::in_force]),
    part!("untested", &[]),
    part!("not-compared", &[rows::not_rederived]),
    part!("surroundings", &[rows::edited]),
    part!("notebooks", &[rows::notebooks]),
    part!("foot", &[]),
];

pub(super) fn write(audits: &dyn Audits, tally: &Tally, about: &About, out: &mut dyn Write) -> Result<(), Fault> {
    let environment = environment();
    let (about_shown, tally) = (Value::from(Serde(about)), Value::from(Serde(rows::tally(tally))));
    let whole = context! { about => about_shown, tally => &tally };
    for part in PARTS {
        let (open, each, close) = pieces(part)?;
        let template = |piece| environment.template_from_named_str("page.html", piece).map_err(unmade);
        render(&template(open)?, &whole, out)?;
        let each = template(each)?;
        for rows in part.rows {
            let mut notebook = 0;
            let mut at = At { about, derivations: 0 };
            audits.each(&mut |audit| {
                notebook += 1;
                for row in rows(audit, &at) {
                    render(&each, &context! { tally => &tally, notebook => notebook, row => Serde(row) }, out)?;
                }
                at.derivations += audit.values.iter().map(|value| value.steps.len()).sum::<usize>();
                Ok(())
            })?;
        }
        render(&template(close)?, &whole, out)?;
    }
    Ok(())
}

/// What opens a part, what is said of each row, and what closes it.
fn pieces(part: &Part) -> Result<(&'static str, &'static str, &'static str), Fault> {
    if part.rows.is_empty() {
        return Ok((part.template, "", ""));
    }
    let lacks = || unmade(format!("the part {} has not its three pieces", part.name));
    let (open, rest) = part.template.split_once(EACH).ok_or_else(lacks)?;
    let (each, close) = rest.split_once(CLOSE).ok_or_else(lacks)?;
    Ok((open, each, close))
}

fn unmade(why: impl std::fmt::Display) -> Fault {
    ReportError::Make { why: format!("{why:#}") }.into()
}

/// Escapes everything, and has no value for what does not exist.
fn environment() -> Environment<'static> {
    let mut environment = Environment::new();
    environment.set_undefined_behavior(UndefinedBehavior::Strict);
    environment.set_auto_escape_callback(|_| AutoEscape::Html);
    environment.set_formatter(|out, state, value| match value.as_str() {
        Some(text) => escape_formatter(out, state, &Value::from(harmless(text).as_ref())),
        None => escape_formatter(out, state, value),
    });
    environment
}

fn render(piece: &Template, context: &Value, out: &mut dyn Write) -> Result<(), Fault> {
    let text = piece.render(context.clone()).map_err(unmade)?;
    out.write_all(text.as_bytes()).map_err(unwritable)
}
