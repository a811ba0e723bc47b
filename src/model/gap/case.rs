//! One property in the history of a value, ready to be computed again with a mistake in it.
//!
//! Every alternative is evaluated by the code that made the value itself, from figures of the same catalogue, and is then
//! carried to the value asked about: by replay of the arithmetic between, or by its first derivative.

use std::collections::BTreeMap;
use std::rc::Rc;

use crate::chem::species::State as Aggregate;
use crate::data::dataset::DatasetId;
use crate::data::substance::Substance;
use crate::model::card::{Call, Cx};
use crate::model::gap::candidate::{Candidate, Mistake, Scale};
use crate::model::gather::{self, Contribution, Figure, Method};
use crate::model::path::{self, Route};
use crate::model::property::{self, Property};
use crate::model::terms::Terms;
use crate::quantity::{Quantity, text};
use crate::record::node::Node;
use crate::record::register::Reported;
use crate::source::Citation;

/// A property of a reaction or a substance that a value rests on.
pub struct Case<'a> {
    pub cx: &'a Cx<'a>,
    pub property: Property,
    pub terms: &'a Terms,
    pub t_k: f64,
    pub method: Method,
    pub contributions: Vec<Contribution>,
    pub datasets: Vec<DatasetId>,
    pub call: &'a Call,
    value: &'a Quantity,
    reported: &'a Reported,
    node: &'a Rc<Node>,
    scale: Scale,
    /// Named before each mistake where the value rests on several properties.
    named: bool,
}

impl<'a> Case<'a> {
    /// The case of a node that a property's card made.
    pub fn of(
        cx: &'a Cx<'a>,
        value: &'a Quantity,
        reported: &'a Reported,
        node: &'a Rc<Node>,
        call: &'a Call,
        scale: Scale,
        named: bool,
    ) -> Option<Case<'a>> {
        let property = Property::of(call.card)?;
        let method = property::method_of(call, cx).ok()?;
        let (terms, t_k) = (call.terms()?, call.quantity(1).si());
        let contributions = gather::contributions(terms, t_k, &method, cx).ok()?;
        let datasets = gather::datasets_for(terms, &method.formation, cx.data()).ok()?;
        Some(Case {
            cx,
            property,
            terms,
            t_k,
            method,
            contributions,
            datasets,
            call,
            value,
            reported,
            node,
            scale,
            named,
        })
    }

    pub fn r(&self) -> f64 {
        self.cx.constants().molar_gas.value
    }

    pub fn delta_n(&self) -> f64 {
        self.terms.delta_n_gas()
    }

    /// A property from other contributions.
    pub fn evaluated(&self, property: Property, contributions: &[Contribution], delta_n: f64) -> Option<f64> {
        let at = property::at_pressure(self.terms, self.t_k, &self.method, self.cx).ok()?;
        let made = property::evaluate(property, contributions, &at, self.terms, self.t_k, self.r()).ok()?;
        // The gas term is taken with the Δn(gas) of the alternative, which the terms as written do not know.
        let more = delta_n - self.delta_n();
        Some(if property.uses_gas_law() { made.si - more * self.r() * self.t_k } else { made.si })
    }

    /// The property with one species' contribution changed.
    pub fn with(&self, at: usize, change: impl FnOnce(&mut Contribution)) -> Option<f64> {
        let mut contributions = self.contributions.clone();
        change(&mut contributions[at]);
        self.evaluated(self.property, &contributions, self.delta_n())
    }

    /// The property at another temperature or by another method.
    pub fn number(&self, t_k: f64, method: &Method) -> Option<f64> {
        property::number(self.property, self.terms, t_k, method, self.cx).ok()
    }

    pub fn substance(&self, at: usize) -> &Substance {
        &self.terms.terms()[at].substance
    }

    /// The way of a species to T, where it changes phase.
    pub fn route(&self, at: usize) -> Option<Route> {
        let crossings = path::crossings(self.terms, self.t_k, self.cx.data());
        crossings.into_iter().find(|(of, _)| *of == at).map(|(_, route)| route)
    }

    /// Adds a mistake by what the property would have been with it.
    pub fn push(
        &self,
        out: &mut Vec<Candidate>,
        mistake: Mistake,
        words: String,
        with_mistake: Option<f64>,
        sources: impl IntoIterator<Item = Citation>,
    ) {
        let Some(si) = with_mistake else { return };
        let price = self.reported.price(&BTreeMap::from([(self.node.id(), si)])).0;
        let (Some(before), Some(after)) = (self.scale.of(self.value.si()), self.scale.of(self.value.si() - price))
        else {
            return;
        };
        let words = if self.named {
            let at = text::shown(&self.call.quantity(1).clone());
            format!("in {} of {} at {at}: {words}", self.call.card.name.replace('_', " "), self.terms.text())
        } else {
            words
        };
        out.push(Candidate { mistake, words, predicted: after - before, sources: sources.into_iter().collect() });
    }
}

/// Where figures come from.
pub fn cited<'a>(figures: impl IntoIterator<Item = &'a Figure>) -> Vec<Citation> {
    let mut sources = Vec::new();
    for citation in figures.into_iter().filter_map(|figure| figure.citation()) {
        if !sources.contains(citation) {
            sources.push(citation.clone());
        }
    }
    sources
}

pub fn is_gas(substance: &Substance) -> bool {
    substance.species.phase.state == Aggregate::Gas
}
