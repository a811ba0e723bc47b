//! Values to what people see. No engine, no sockets.
//!
//! A [`Bundle`] holds one output in several forms. A report's forms are all made from one [`report::Report`], so that
//! text, HTML, LaTeX and the machine record cannot disagree.

pub mod balance;
pub mod budget;
pub mod card;
pub mod cells;
pub mod comparison;
pub mod csv;
pub mod curve;
pub mod cycle;
pub mod dataset;
pub mod derivation;
pub mod fit;
pub mod gap;
pub mod harmless;
pub mod headline;
pub mod html;
pub mod interval;
pub mod latex;
pub mod molecule;
pub mod plot;
pub mod register;
pub mod report;
pub mod shortcut;
pub mod table;
pub mod text;

use std::collections::BTreeMap;

use crate::model::answer::Answer;
use crate::model::caution;
use crate::model::reaction::Reaction;
use crate::model::substance::PureSubstance;
use crate::quantity::Quantity;
use crate::render::headline::Headline;

/// One output in several forms: MIME type to its content (text types as strings, `+json` types as JSON values).
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Bundle {
    pub data: BTreeMap<String, serde_json::Value>,
}

/// A value in one line, with the cautions that belong to it, in text, HTML and LaTeX.
pub fn quantity(value: &Quantity) -> Bundle {
    let headline = Headline::of(value);
    let cautions = caution::texts(value);
    Bundle::text(format!("{}{}", headline.line(), text::cautions(&cautions)))
        .with_text("text/html", format!("{}{}", html::headline(&headline), html::cautions(&cautions)))
        .with_text("text/latex", format!("{}{}", latex::headline(&headline), latex::cautions(&cautions)))
}

/// A reaction as written, in text, HTML and LaTeX.
pub fn reaction(reaction: &Reaction) -> Bundle {
    Bundle::text(reaction.text())
        .with_text("text/html", html::equation(reaction))
        .with_text("text/latex", latex::equation(reaction))
}

/// What is known of a substance, in one line.
pub fn substance(substance: &PureSubstance) -> Bundle {
    if let Some(fit) = substance.thermo().and_then(|own| own.fit()) {
        return fit::bundle(fit);
    }
    let record = substance.record();
    let name = record.name.as_ref().map_or_else(String::new, |name| format!(", {name}"));
    let range = match &record.function {
        Some(function) => format!("heat capacity from {} K to {} K", function.t_min, function.t_max),
        None => "figures at 298.15 K only".to_owned(),
    };
    let onward: Vec<String> =
        substance.onward().iter().map(|(t_k, phase)| format!("{} from {t_k} K", phase.substance.id())).collect();
    let onward = match substance.onward().last() {
        Some((_, last)) => format!(", then as {} to {} K", onward.join(", "), last.function.t_max),
        None => String::new(),
    };
    let text = format!("{}{name}: {range}{onward}", record.id());
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
        Answer::Cycle(cycle) => cycle::bundle(cycle),
        Answer::Gap(gap) => gap::bundle(gap),
        Answer::HeatBalance(balance) => balance::bundle(balance),
        Answer::Shares(shares) => molecule::shares(shares),
        Answer::PowerFit(fit) => molecule::power_fit(fit),
        Answer::Validity(validity) => shortcut::validity(validity),
        Answer::SideBySide(ways) => shortcut::side_by_side(ways),
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

#[cfg(test)]
mod tests {
    use std::cell::Cell;
    use std::rc::Rc;

    use smallvec::SmallVec;

    use super::*;
    use crate::model::card::{Call, Card, Cx, On, References, Value};
    use crate::model::caution::Caution;
    use crate::model::derivation::Derivation;
    use crate::record::node::Step;
    use crate::render::report::{MIME, Report};
    use crate::units::{Dimension, Kind, constants};

    /// A figure of 2, made by an invented formula with this caution.
    fn figure(caution: Option<Caution>) -> Quantity {
        let card = Box::leak(Box::new(Card {
            id: "invented.figure",
            name: "figure",
            on: On::Nothing,
            args: &[],
            gives: "2",
            doc: "Gives 2.",
            source: "invented for this test",
            example: "figure()",
            claims: &[],
            alternatives: &[],
            run: |_, _| Ok(Value::Nothing),
            check_line: None,
            caution,
        }));
        let step: Rc<dyn Step> = Rc::new(Call { card, args: Vec::new() });
        Quantity::from_step(2.0, Dimension::none(), Kind::PLAIN, SmallVec::new(), step, None).unwrap()
    }

    /// Every form in which a value is shown, with what is shown.
    fn forms(value: &Quantity) -> Vec<(String, String)> {
        let (references, ordinal) = (References::new(constants::current()), Cell::new(0));
        let cx = Cx { references: &references, place: None, ordinal: &ordinal, halted: &|| None };
        let report = Report::of(&cx, "label", value, &[]).bundle();
        let derivation = derivation::bundle(&Derivation::of(&cx, value, 60));
        let mut forms = Vec::new();
        for (name, bundle) in [("value", quantity(value)), ("report", report), ("derivation", derivation)] {
            for (mime, content) in &bundle.data {
                let shown = if mime == MIME { content["cautions"].to_string() } else { content.to_string() };
                forms.push((format!("{name} as {mime}"), shown));
            }
        }
        forms
    }

    #[test]
    fn each_caution_stands_in_every_form_of_each_value_that_rests_on_its_figure() {
        for caution in Caution::ALL {
            let made = figure(Some(caution));
            let later = made.scaled(3.0, None).unwrap().shifted(1.0, None).unwrap();
            for value in [&made, &later] {
                let forms = forms(value);
                assert_eq!(forms.len(), 3 + 4 + 3, "{forms:?}");
                for (form, shown) in forms {
                    assert!(shown.contains(&caution.text()), "{caution:?}: {form}: {shown}");
                }
                // In the middle of a text or a list there is room for a few words only.
                assert!(text::value(value).contains(Caution::IN_SHORT), "{caution:?}");
            }
        }
        for (form, shown) in forms(&figure(None)) {
            assert!(!shown.contains("safety"), "{form}: {shown}");
        }
    }
}
