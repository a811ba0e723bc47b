//! A report: the machine record `application/vnd.hessbook.report.v1+json` and the forms people read, from one source.
//!
//! Numbers in the record are decimal strings that read back as the same doubles, since notebook editors rewrite JSON
//! numbers. This record is one of the few shapes that may not change without a new version in its name.

use serde::{Deserialize, Serialize};

use crate::model::answer;
use crate::model::card::Cx;
use crate::model::review::{self, Dealing, Review};
use crate::num::math;
use crate::quantity::Quantity;
use crate::quantity::round::{self, shortest};
use crate::record::register::Status;
use crate::record::spread::Spread;
use crate::render::headline::Headline;
use crate::render::{Bundle, html, latex, text};
use crate::units;

/// MIME type of the machine record.
pub const MIME: &str = "application/vnd.hessbook.report.v1+json";

/// The machine record of one reported value.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Record {
    pub label: String,
    /// In `unit`; reads back as the same double.
    pub value: String,
    /// Standard uncertainty in `unit`; none where no input states one.
    pub u: Option<String>,
    pub u_coverage: Coverage,
    /// Inputs without a stated uncertainty.
    pub u_missing: Vec<String>,
    /// Machine text with the basis: `kJ/mol[rxn]`.
    pub unit: String,
    /// The headline as readers see it.
    pub shown: String,
    /// The reactions and substances it was computed from, as written.
    pub about: Vec<String>,
    pub conditions: String,
    pub check_line: String,
    pub tolerance: String,
    pub assumptions: Vec<Assumption>,
    pub alternatives: Vec<Alternative>,
    pub sources: Vec<String>,
    pub cautions: Vec<String>,
    /// Cell, line and column of the report.
    pub place: Option<String>,
}

/// Whether `u` covers all inputs.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Coverage {
    Full,
    Partial,
    None,
}

/// One row of the register.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Assumption {
    pub id: String,
    pub status: String,
    /// In `price_unit`; subtract it from the value to get the better one. None where nothing could be computed.
    pub price: Option<String>,
    pub price_unit: String,
    pub claim: String,
    pub subject: String,
    pub note: String,
    pub place: Option<String>,
    /// Whether the price was carried to this value by its first derivative.
    pub first_order: bool,
    pub dealt: Option<String>,
    /// The price rounded for readers, with its unit.
    pub price_shown: Option<String>,
}

/// One shortcut not taken.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Alternative {
    pub id: String,
    /// Value by the shortcut minus the value.
    pub price: String,
    pub price_unit: String,
    pub words: String,
    pub price_shown: String,
}

/// A reported value with all that is said of it.
pub struct Report {
    pub headline: Headline,
    pub record: Record,
    /// For each row of the register whether it needs nothing more from the analyst.
    pub answered: Vec<bool>,
}

impl Report {
    /// Tests every assumption of the value and writes down what came out.
    pub fn of(cx: &Cx, label: &str, value: &Quantity, dealings: &[Dealing]) -> Report {
        let review = review::review(cx, label, value, dealings);
        let headline = Headline::of(value);
        let record = record(label, value, &headline, &review);
        let answered = review.rows.iter().map(|row| row.answered).collect();
        Report { headline, record, answered }
    }

    /// The record, and the same in text, HTML and LaTeX.
    pub fn bundle(&self) -> Bundle {
        let record =
            serde_json::to_value(&self.record).unwrap_or_else(|e| unreachable!("a record is plain strings: {e}"));
        Bundle::text(text::report(self))
            .with_text("text/html", html::report(self))
            .with_text("text/latex", latex::report(self))
            .with(MIME, record)
    }
}

/// The text of a status, which a row's text and colour are chosen by.
pub fn status_word(status: Status) -> String {
    status.word().to_owned()
}

fn record(label: &str, value: &Quantity, headline: &Headline, review: &Review) -> Record {
    let unit = value.unit();
    let scale = unit.factor;
    let spread = value.spread();
    let price_unit = unit.text.to_string();
    let with_unit = |price: f64| {
        let reader = units::reader_text(&unit);
        let number = review::signed(review.precision, price);
        if reader.is_empty() { number } else { format!("{number} {reader}") }
    };
    // K° lives in its logarithm, where a price can be set beside its uncertainty.
    let logarithmic = |price: f64, ratio: f64, of_u: bool| {
        let lg = if of_u { price / value.si() / std::f64::consts::LN_10 } else { math::log10(ratio) };
        if answer::is_logarithmic(value) && lg.is_finite() && price != 0.0 {
            let sign = if lg > 0.0 { "+" } else { "" };
            format!(" ({sign}{} in lg K°)", round::significant(lg, 2))
        } else {
            String::new()
        }
    };
    let of_row = |row: &review::Row| {
        let price = row.price?;
        Some(with_unit(price) + logarithmic(price, value.si() / (value.si() - price), row.of_u).as_str())
    };
    let missing = |(field, records): &(String, Vec<String>)| {
        records.iter().map(|record| format!("{field} of {record}")).collect::<Vec<_>>()
    };
    Record {
        label: label.to_owned(),
        value: shortest(unit.from_si(value.si())),
        u: spread.u().map(|u| shortest(u / scale)),
        u_coverage: match spread {
            Spread::Full(_) => Coverage::Full,
            Spread::Partial { .. } => Coverage::Partial,
            Spread::NotStated { .. } => Coverage::None,
        },
        u_missing: review.silent.iter().flat_map(missing).collect(),
        unit: price_unit.clone(),
        shown: headline.line(),
        about: review.about.clone(),
        conditions: review.conditions.clone(),
        check_line: review.check_line.clone(),
        tolerance: shortest(review.tolerance),
        assumptions: review
            .rows
            .iter()
            .map(|row| Assumption {
                id: row.id.clone(),
                status: status_word(row.status),
                price: row.price.map(shortest),
                price_unit: price_unit.clone(),
                claim: row.claim.clone(),
                subject: row.subject.clone(),
                note: row.note.clone(),
                place: row.place.clone(),
                first_order: row.first_order,
                dealt: row.dealt.clone(),
                price_shown: of_row(row),
            })
            .collect(),
        alternatives: review
            .alternatives
            .iter()
            .map(|shortcut| Alternative {
                id: shortcut.id.clone(),
                price: shortest(shortcut.price),
                price_unit: price_unit.clone(),
                words: shortcut.words.clone(),
                price_shown: with_unit(shortcut.price)
                    + logarithmic(shortcut.price, 1.0 + shortcut.price / value.si(), false).as_str(),
            })
            .collect(),
        sources: review.sources.iter().map(ToString::to_string).collect(),
        cautions: review.cautions.clone(),
        place: value.node().place().map(ToString::to_string),
    }
}
