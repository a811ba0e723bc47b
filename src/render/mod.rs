//! Values to what people see. No engine, no sockets.
//!
//! A [`Bundle`] holds one output in several forms. A report's forms are all made from one [`report::Report`], so that
//! text, HTML, LaTeX and the machine record cannot disagree.

pub mod budget;
pub mod comparison;
pub mod curve;
pub mod derivation;
pub mod gap;
pub mod headline;
pub mod html;
pub mod interval;
pub mod latex;
pub mod register;
pub mod report;
pub mod text;

use std::collections::BTreeMap;

use crate::model::answer::Answer;
use crate::model::reaction::Reaction;
use crate::model::substance::PureSubstance;
use crate::quantity::Quantity;
use crate::render::headline::Headline;

/// One output in several forms: MIME type to its content (text types as strings, `+json` types as JSON values).
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Bundle {
    pub data: BTreeMap<String, serde_json::Value>,
}

/// A value in one line, in text, HTML and LaTeX.
pub fn quantity(value: &Quantity) -> Bundle {
    let headline = Headline::of(value);
    Bundle::text(headline.line())
        .with_text("text/html", html::headline(&headline))
        .with_text("text/latex", latex::headline(&headline))
}

/// A reaction as written, in text, HTML and LaTeX.
pub fn reaction(reaction: &Reaction) -> Bundle {
    Bundle::text(reaction.text())
        .with_text("text/html", html::equation(reaction))
        .with_text("text/latex", latex::equation(reaction))
}

/// What is known of a substance, in one line.
pub fn substance(substance: &PureSubstance) -> Bundle {
    let record = substance.record();
    let name = record.name.as_ref().map_or_else(String::new, |name| format!(", {name}"));
    let range = match &record.function {
        Some(function) => format!("heat capacity from {} K to {} K", function.t_min, function.t_max),
        None => "figures at 298.15 K only".to_owned(),
    };
    let text = format!("{}{name}: {range}", record.id());
    Bundle::text(text.clone()).with_text("text/html", html::escaped(&text))
}

/// An answer to be read, in text and HTML, some in LaTeX.
pub fn answer(answer: &Answer) -> Bundle {
    match answer {
        Answer::Budget(budget) => budget::bundle(budget),
        Answer::Expanded(expanded) => interval::expanded(expanded),
        Answer::Propagation(propagation) => interval::propagation(propagation),
        Answer::Derivation(derivation) => derivation::bundle(derivation),
        Answer::Comparison(comparison) => comparison::bundle(comparison),
        Answer::Gap(gap) => gap::bundle(gap),
    }
}

impl Bundle {
    pub fn text(text: impl Into<String>) -> Self {
        Bundle::default().with("text/plain", serde_json::Value::String(text.into()))
    }

    #[must_use]
    pub fn with(mut self, mime: &str, content: serde_json::Value) -> Self {
        self.data.insert(mime.to_owned(), content);
        self
    }

    #[must_use]
    pub fn with_text(self, mime: &str, content: String) -> Self {
        self.with(mime, serde_json::Value::String(content))
    }

    pub fn plain(&self) -> &str {
        self.data.get("text/plain").and_then(|text| text.as_str()).unwrap_or("")
    }
}
