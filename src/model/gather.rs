//! Collects the figures a reaction property needs, term by term, from the catalogue.
//!
//! [`Method`] says how: which formation dataset, and how heat capacities are taken between 298.15 K and T. One dataset
//! serves all species of a reaction, joined to each function's increment H(T) − H(298.15 K), so that no cycle is opened
//! by mixing editions. The surprise: an element in its reference state belongs to every dataset, by convention.

use std::rc::Rc;
use std::sync::{Arc, LazyLock};

use smallvec::SmallVec;
use thiserror::Error;

use crate::data::catalog::Catalog;
use crate::data::dataset::{Dataset, DatasetId};
use crate::data::formation;
use crate::data::function::Function;
use crate::data::substance::Substance;
use crate::fault::{Explain, Fault};
use crate::model::card::Cx;
use crate::model::first_order;
use crate::model::function::{self, Functions, T_REFERENCE};
pub use crate::model::heat_capacity::HeatCapacity;
use crate::model::path::Route;
use crate::model::stated;
use crate::model::tabulated;
use crate::model::terms::{Term, Terms};
use crate::model::thermo::{AtT, Thermo};
use crate::num::math;
use crate::record::evaluation::Evaluation;
use crate::record::node::{Input, LeafKey, Node};
use crate::source::Citation;

/// Which formation enthalpies are used.
#[derive(Clone, Debug, PartialEq)]
pub enum Formation {
    /// The first dataset, by precedence, that has all species of the reaction.
    First,
    /// This one.
    Of(DatasetId),
    /// For each species the first dataset that has it, mixed on the analyst's demand.
    Mixed,
    /// None: what is asked does not contain them.
    Unneeded,
}

/// A printed figure or a function's value, with where it comes from.
#[derive(Clone)]
pub struct Figure {
    /// J/mol or J/(mol K)
    pub si: f64,
    pub origin: FigureOrigin,
    /// As printed in kJ/mol, for check lines; absent for function values.
    pub printed: Option<Arc<str>>,
}

/// What a figure rests on.
#[derive(Clone)]
pub enum FigureOrigin {
    /// It is an input itself: a printed figure, or a value drawn from a function.
    Input(Box<Input>),
    /// It follows from nodes, with its derivatives.
    Nodes(SmallVec<[(Rc<Node>, f64); 2]>),
}

impl From<Input> for FigureOrigin {
    fn from(input: Input) -> Self {
        FigureOrigin::Input(Box::new(input))
    }
}

impl Figure {
    /// Where an input was printed; `None` for a figure that follows from others.
    pub fn citation(&self) -> Option<&Citation> {
        match &self.origin {
            FigureOrigin::Input(input) => input.citation.as_ref(),
            FigureOrigin::Nodes(_) => None,
        }
    }
}

/// What one species contributes at T, per mole of it.
#[derive(Clone)]
pub struct Contribution {
    pub nu: f64,
    pub formation: Figure,
    /// H(T) − H(298.15 K) as the method takes it; absent at 298.15 K.
    pub increment: Option<Figure>,
    pub entropy: Option<Figure>,
    pub cp: Option<Figure>,
    /// Derivatives with respect to T of increment and entropy as the method takes them, and of Cp.
    pub slopes: Slopes,
}

#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Slopes {
    pub increment: f64,
    pub entropy: f64,
    pub cp: f64,
}

/// Why a reaction property cannot be computed from the shipped data.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum GatherError {
    #[error("{t_k} K is outside the range of the data for {species}, {t_min} K to {t_max} K")]
    Range { species: String, t_k: f64, t_min: f64, t_max: f64 },
    #[error(
        "{phase} ends at {t_end} K on record, and the change to {gas} is not inserted on the way to {t_k} K: where it happens depends on the pressure"
    )]
    GasNotInserted { phase: String, gas: String, t_k: f64, t_end: f64 },
    #[error("no heat capacity of {species} is at hand, so nothing can be said at {t_k} K")]
    NoFunction { species: String, t_k: f64 },
    #[error("the heat capacity of {species} is on record at 298.15 K only, so it cannot be integrated to {t_k} K")]
    ConstantOnly { species: String, t_k: f64 },
    #[error("no one dataset has the formation enthalpies of all species: {missing}")]
    NotCovered { missing: String },
    #[error("the dataset {dataset} has no formation enthalpy of {species}")]
    NotInDataset { dataset: String, species: String, others: String },
    #[error("`{word}` is no dataset of formation enthalpies")]
    UnknownDataset { word: String, known: String },
    #[error("no entropy of {species} is at hand")]
    NoEntropy { species: String },
}

impl Explain for GatherError {
    fn code(&self) -> &'static str {
        match self {
            GatherError::Range { .. } => "temperature-out-of-range",
            GatherError::GasNotInserted { .. } => "gas-not-inserted",
            GatherError::NoFunction { .. } => "heat-capacity-missing",
            GatherError::ConstantOnly { .. } => "heat-capacity-at-298-only",
            GatherError::NotCovered { .. } => "formation-not-covered",
            GatherError::NotInDataset { .. } => "formation-missing",
            GatherError::UnknownDataset { .. } => "dataset-unknown",
            GatherError::NoEntropy { .. } => "entropy-missing",
        }
    }

    fn hint(&self) -> String {
        match self {
            GatherError::Range { species, t_min, t_max, .. } => format!(
                "choose a temperature from {t_min} K to {t_max} K, or a phase of the substance that exists at this one, instead of {species}"
            ),
            GatherError::GasNotInserted { gas, t_end, .. } => {
                format!("write {gas} where the gas is meant, or choose a temperature up to {t_end} K")
            }
            GatherError::NoFunction { .. } => "ask for 298.15 K, where the tables give it".to_owned(),
            GatherError::ConstantOnly { .. } => {
                "add `#{ heat_capacity: \"constant\" }` to hold it there for all species; the register then says what that rests on"
                    .to_owned()
            }
            GatherError::NotCovered { .. } => {
                "mixing datasets is done on demand only: add `#{ formation: \"mixed\" }`, and the register prices it"
                    .to_owned()
            }
            GatherError::NotInDataset { others, .. } => format!("choose another: {others}"),
            GatherError::UnknownDataset { known, .. } => format!("choose one of {known}, or \"mixed\""),
            GatherError::NoEntropy { .. } => "ask for the enthalpy, or choose a substance with an entropy".to_owned(),
        }
    }
}

/// How a reaction property is to be computed.
#[derive(Clone, Debug)]
pub struct Method {
    pub heat_capacity: HeatCapacity,
    pub formation: Formation,
    pub given: Option<crate::model::given::Given>,
}

impl Method {
    /// From the words of a call's options.
    ///
    /// # Errors
    /// The dataset is unknown.
    pub fn from_words(
        heat_capacity: Option<&str>,
        formation: Option<&str>,
        data: &Catalog,
    ) -> Result<Method, GatherError> {
        let heat_capacity = heat_capacity.map_or(HeatCapacity::Full, HeatCapacity::from_word);
        let formation = match formation {
            None => Formation::First,
            Some("mixed") => Formation::Mixed,
            Some(word) => Formation::Of(dataset_named(word, data)?),
        };
        Ok(Method { heat_capacity, formation, given: None })
    }
}

/// A dataset by its id or by its short name, whole or its first word: `codata-1989`, `CODATA 1989`, `CODATA`.
fn dataset_named(word: &str, data: &Catalog) -> Result<DatasetId, GatherError> {
    let wanted = word.trim().to_lowercase();
    let ranked: Vec<&Dataset> = formation_datasets(data).collect();
    let fits = |dataset: &Dataset| {
        let short = dataset.short.to_lowercase();
        dataset.id.as_str() == wanted || short == wanted || short.split_whitespace().next() == Some(wanted.as_str())
    };
    match ranked.iter().copied().find(|dataset| fits(dataset)) {
        Some(dataset) => Ok(dataset.id.clone()),
        None => {
            let known: Vec<String> = ranked.iter().map(|dataset| format!("\"{}\"", dataset.id)).collect();
            Err(GatherError::UnknownDataset { word: word.to_owned(), known: known.join(", ") })
        }
    }
}

/// The formation datasets that have every species of the reaction, by precedence.
///
/// One that was read beside the notebook is among them only where it has a record of its own of one of the species: a file
/// that is loaded must not change results that use nothing of it.
pub fn covering(reaction: &Terms, data: &Catalog) -> Vec<DatasetId> {
    those_covering(reaction, data).cloned().collect()
}

/// The same one by one, since a call wants the first of them only.
fn those_covering<'a>(reaction: &'a Terms, data: &'a Catalog) -> impl Iterator<Item = &'a DatasetId> {
    let terms = || reaction.terms().iter();
    let serves =
        move |dataset: &&Dataset| !dataset.own || terms().any(|term| has_own_formation(&term.substance, dataset, data));
    let has_all = move |dataset: &&Dataset| terms().all(|term| has_formation(term, &dataset.id, data));
    formation_datasets(data).filter(serves).filter(has_all).map(|dataset| &dataset.id)
}

/// Whether a term has a formation enthalpy in a dataset: [`term_formation`] without making the figure.
fn has_formation(term: &Term, dataset: &DatasetId, data: &Catalog) -> bool {
    if let Some(own) = term.own.as_ref().filter(|own| own.fit().is_none() || own.formation().is_some()) {
        return own.formation().is_some() && own.dataset().is_none_or(|only| only == dataset);
    }
    let stands_in = |phase: &Substance| {
        data.with_extended(dataset).any(|dataset| {
            phase.formation(dataset).is_some() || phase.function.as_ref().is_some_and(|f| is_in(f, dataset))
        })
    };
    match &term.substance.function {
        Some(function) if !function.covers(T_REFERENCE) => {
            data.reference_phase(&term.substance).is_some_and(|phase| stands_in(&phase))
        }
        _ => stands_in(&term.substance),
    }
}

/// Whether a function itself says the formation enthalpy of its substance in a dataset.
fn is_in(function: &Function, dataset: &DatasetId) -> bool {
    is_element(function) || (function.dataset == *dataset && function.zero.enthalpy)
}

/// An element in its reference state, whose formation enthalpy is zero by convention.
fn is_element(function: &Function) -> bool {
    function.is_reference_element && function.dhf_298 == 0.0
}

/// Whether the formation enthalpy of a substance would come from a record of this dataset, not of one that it extends.
fn has_own_formation(substance: &Arc<Substance>, dataset: &Dataset, data: &Catalog) -> bool {
    let joined = substance.function.as_ref().is_some_and(|function| !function.covers(T_REFERENCE));
    let phase = if joined { data.reference_phase(substance) } else { Some(Arc::clone(substance)) };
    phase.is_some_and(|phase| phase.formation(&dataset.id).is_some())
}

/// Which dataset each term's formation enthalpy is taken from.
///
/// # Errors
/// The dataset asked for lacks a species, or none has all.
pub fn datasets_for(reaction: &Terms, formation: &Formation, data: &Catalog) -> Result<Vec<DatasetId>, GatherError> {
    let terms = reaction.terms();
    match formation {
        Formation::Of(id) => {
            if let Some(term) = terms.iter().find(|term| !has_formation(term, id, data)) {
                let others: Vec<String> = covering(reaction, data).iter().map(|id| format!("\"{id}\"")).collect();
                let others = if others.is_empty() { "\"mixed\"".to_owned() } else { others.join(", ") };
                let species = term.substance.species.id.to_string();
                return Err(GatherError::NotInDataset { dataset: id.to_string(), species, others });
            }
            Ok(vec![id.clone(); terms.len()])
        }
        Formation::Unneeded => Ok(vec![DatasetId::new(""); terms.len()]),
        Formation::First => match those_covering(reaction, data).next() {
            Some(id) => Ok(vec![id.clone(); terms.len()]),
            None => Err(GatherError::NotCovered { missing: missing_words(reaction, data) }),
        },
        Formation::Mixed => {
            let ranked: Vec<&Dataset> = formation_datasets(data).collect();
            let first = |term: &Term| {
                ranked.iter().find(|dataset| has_formation(term, &dataset.id, data)).map(|dataset| dataset.id.clone())
            };
            let found: Option<Vec<DatasetId>> = terms.iter().map(first).collect();
            found.ok_or_else(|| GatherError::NotCovered { missing: missing_words(reaction, data) })
        }
    }
}

fn missing_words(reaction: &Terms, data: &Catalog) -> String {
    let lacks: Vec<String> = formation_datasets(data)
        .map(|dataset| {
            let missing: Vec<&str> = (reaction.terms().iter())
                .filter(|term| !has_formation(term, &dataset.id, data))
                .map(|term| &*term.substance.species.id)
                .collect();
            format!("{} lacks {}", dataset.short, missing.join(", "))
        })
        .collect();
    lacks.join("; ")
}

/// Datasets that have formation enthalpies, by precedence.
fn formation_datasets(data: &Catalog) -> impl Iterator<Item = &Dataset> {
    data.datasets().iter().filter(|dataset| dataset.rank.is_some())
}

/// The formation enthalpy of a term: a substance of one's own brings it, whichever dataset serves the others.
pub(crate) fn term_formation(term: &Term, dataset: &DatasetId, data: &Catalog) -> Option<Figure> {
    match &term.own {
        // A measured heat capacity leaves the formation enthalpy to the tables.
        Some(own) if own.fit().is_some() => own.formation().or_else(|| formation_of(&term.substance, dataset, data)),
        Some(own) if own.dataset().is_none_or(|only| only == dataset) => own.formation(),
        Some(_) => None,
        None => formation_of(&term.substance, dataset, data),
    }
}

/// The formation enthalpy of a substance in one dataset: of the phase whose enthalpy scale its function continues.
pub(crate) fn formation_of(substance: &Arc<Substance>, dataset: &DatasetId, data: &Catalog) -> Option<Figure> {
    let joined = substance.function.as_ref().is_some_and(|function| !function.covers(T_REFERENCE));
    let phase = if joined { data.reference_phase(substance)? } else { Arc::clone(substance) };
    data.with_extended(dataset).find_map(|dataset| formation_at_reference(&phase, dataset))
}

fn formation_at_reference(substance: &Substance, dataset: &DatasetId) -> Option<Figure> {
    let key = LeafKey::Datum {
        dataset: dataset.shared(),
        record: substance.species.id.clone(),
        field: FORMATION,
        t_bits: 0,
        way: "",
    };
    if let Some(record) = substance.formation(dataset) {
        let digit = if record.dhf.is_convention() { None } else { Some(record.dhf.last_place) };
        let (shape, dof) = (record.dhf.shape, record.dhf.dof);
        let evaluation = Evaluation { shape, dof, correlation: record.correlation.clone() };
        let citation = Some(record.citation.clone());
        let input = Input { u: record.dhf.u, evaluated: evaluation.kept(), digit, citation, ..Input::of(key) };
        // A figure that its table prints in J/mol would stand beside others in kJ/mol.
        let printed = (record.dhf.unit == "kJ/mol").then(|| record.dhf.printed.clone());
        return Some(Figure { si: record.dhf.value, origin: input.into(), printed });
    }
    let function = substance.function.as_ref()?;
    if is_element(function) {
        // One text for all, since every reaction has elements.
        static CONVENTION: LazyLock<Citation> =
            LazyLock::new(|| Citation::new("convention: an element in its reference state", ""));
        let input = Input { u: Some(0.0), citation: Some(CONVENTION.clone()), ..Input::of(key) };
        return Some(Figure { si: 0.0, origin: input.into(), printed: Some("0".into()) });
    }
    if !is_in(function, dataset) {
        return None;
    }
    // The report prints formation enthalpies in J/mol to three decimals; that is not what they are good for.
    let input = Input { digit: Some(1.0), citation: Some(function.citation.clone()), ..Input::of(key) };
    Some(Figure { si: function.dhf_298, origin: input.into(), printed: None })
}

/// Names of the fields that leaves are told apart by, singular, as in "formation enthalpy of CO2(g)".
pub const FORMATION: &str = formation::FIELD;
pub const HEAT_CAPACITY: &str = "heat capacity";
pub const ENTROPY: &str = "entropy";

/// Everything the reaction's species contribute at `t_k`.
///
/// # Errors
/// A figure is missing, or `t_k` is outside a record's range.
pub fn contributions(reaction: &Terms, t_k: f64, method: &Method, cx: &Cx) -> Result<Vec<Contribution>, Fault> {
    let datasets = datasets_for(reaction, &method.formation, cx.data())?;
    let mut all = Vec::with_capacity(reaction.terms().len());
    tabulated::refuse(reaction, t_k, method.heat_capacity)?;
    for (at, (term, dataset)) in reaction.terms().iter().zip(&datasets).enumerate() {
        refuse_two_in_one(at, reaction, t_k, cx.data())?;
        all.push(contribution(term, dataset, t_k, method.heat_capacity, cx)?);
    }
    Ok(all)
}

/// Two phases that the equation tells apart stay two: a term whose route would pass into another one is meant as written.
fn refuse_two_in_one(at: usize, terms: &Terms, t_k: f64, data: &Catalog) -> Result<(), GatherError> {
    let term = &terms.terms()[at];
    let (None, Some(function)) = (&term.own, &term.substance.function) else { return Ok(()) };
    if function.covers(t_k) || !Route::to(&term.substance, t_k, data)?.meets_another_term(at, terms) {
        return Ok(());
    }
    let (t_min, t_max) = (function.t_min, function.t_max);
    Err(GatherError::Range { species: term.substance.id().to_owned(), t_k, t_min, t_max })
}

/// What one term contributes; its formation enthalpy must be in `dataset` ([`formation_of`]).
///
/// # Errors
/// A figure is missing, or `t_k` is outside the record's range.
pub(crate) fn contribution(
    term: &Term,
    dataset: &DatasetId,
    t_k: f64,
    mode: HeatCapacity,
    cx: &Cx,
) -> Result<Contribution, Fault> {
    if let HeatCapacity::FirstOrder { about_k } = mode {
        return first_order::contribution(term, dataset, t_k, about_k, cx);
    }
    let (substance, data) = (&term.substance, cx.data());
    let formation =
        // Only what does not contain it is asked of a dataset that lacks it.
        term_formation(term, dataset, data).unwrap_or_else(|| Figure::of_nodes(0.0, []));
    if let Some(own) = &term.own {
        return of_own(own.as_ref(), term, formation, t_k, mode, cx);
    }
    let Some(function) = &substance.function else {
        return tabulated::contribution(term, formation, t_k, mode);
    };
    if !function.covers(t_k) {
        return Route::to(substance, t_k, data)?.contribution(term.nu, formation, mode);
    }
    let at_t = function::evaluate(function, t_k);
    let figure = |taken: &Drawn, field: &'static str, digit: f64| Figure {
        si: taken.si,
        origin: FigureOrigin::from(Input {
            digit: Some(digit),
            citation: Some(function.citation.clone()),
            ..Input::of(LeafKey::Datum {
                dataset: function.dataset.shared(),
                record: substance.species.id.clone(),
                field,
                t_bits: taken.t_k.to_bits(),
                way: taken.way,
            })
        }),
        printed: None,
    };
    // A phase that does not reach 298.15 K continues the enthalpy scale of another, whose formation enthalpy it is joined to.
    // Where that scale stands at 298.15 K the function says, which may be off the printed figure by 1 J/mol (Hg by 0.5): the
    // other phase is counted from there too, and only so do the two meet at their transition.
    let joined = if function.covers(T_REFERENCE) { None } else { data.reference_phase(substance) };
    let h_298 = joined
        .as_ref()
        .and_then(|phase| phase.function.as_ref())
        .map_or(function.dhf_298, |f| function::evaluate(f, T_REFERENCE).h);
    let taken = between(function, h_298, t_k, at_t, mode);
    // Table B and Appendix D of the source are good to 1 J/mol and 0.001 J/(mol K); fewer digits are defensible, none are stated.
    let increment =
        (t_k != T_REFERENCE || !function.covers(T_REFERENCE)).then(|| figure(&taken.increment, HEAT_CAPACITY, 1.0));
    let plain = Contribution {
        nu: term.nu,
        formation,
        increment,
        entropy: function.zero.entropy.then(|| figure(&taken.entropy, ENTROPY, 0.001)),
        cp: Some(figure(&taken.cp, HEAT_CAPACITY, 0.001)),
        slopes: taken.slopes,
    };
    stated::applied(plain, function, substance)
}

/// What a substance of one's own contributes, with the heat capacity as the method takes it.
fn of_own(
    own: &dyn Thermo,
    term: &Term,
    formation: Figure,
    t_k: f64,
    mode: HeatCapacity,
    cx: &Cx,
) -> Result<Contribution, Fault> {
    let species = || term.substance.species.id.to_string();
    let (t_min, t_max) = own.range_k();
    // Every way but the full integral starts from 298.15 K.
    let needed = if mode == HeatCapacity::Full { [t_k; 2] } else { [t_k, T_REFERENCE] };
    if let Some(outside) = needed.into_iter().find(|t| !(t_min <= *t && *t <= t_max)) {
        return Err(GatherError::Range { species: species(), t_k: outside, t_min, t_max }.into());
    }
    let whole = |at: AtT| Contribution {
        nu: term.nu,
        formation: formation.clone(),
        slopes: Slopes { increment: at.cp.si, entropy: at.cp.si / t_k, cp: at.cp_slope },
        increment: (t_k != T_REFERENCE).then_some(at.increment),
        entropy: at.entropy,
        cp: Some(at.cp),
    };
    // It is one phase, so there is no change of phase to miss.
    if matches!(mode, HeatCapacity::Full | HeatCapacity::Missed) {
        return Ok(whole(own.at(cx, t_k)?));
    }
    let at_0 = own.at(cx, T_REFERENCE)?;
    let (span, ln_ratio) = (t_k - T_REFERENCE, math::ln(t_k / T_REFERENCE));
    let (cp, cp_slope) = match mode {
        HeatCapacity::Full | HeatCapacity::Missed | HeatCapacity::FirstOrder { .. } => {
            unreachable!("it was answered above")
        }
        HeatCapacity::Constant => (at_0.cp.clone(), 0.0),
        HeatCapacity::Midpoint => {
            let middle = own.at(cx, 0.5 * (t_k + T_REFERENCE))?;
            (middle.cp, 0.5 * middle.cp_slope)
        }
        HeatCapacity::Mean => {
            let at_t = own.at(cx, t_k)?;
            (Figure::combined(&[(&at_0.cp, 0.5), (&at_t.cp, 0.5)]), 0.5 * at_t.cp_slope)
        }
        HeatCapacity::Neglected => {
            let slopes = Slopes::default();
            let increment = Some(Figure::of_nodes(0.0, []));
            let (entropy, cp) = (at_0.entropy, Some(at_0.cp));
            return Ok(Contribution { nu: term.nu, formation, increment, entropy, cp, slopes });
        }
    };
    Ok(Contribution {
        nu: term.nu,
        formation,
        increment: Some(Figure::combined(&[(&cp, span)])),
        entropy: at_0.entropy.map(|s_0| Figure::combined(&[(&s_0, 1.0), (&cp, ln_ratio)])),
        slopes: Slopes { increment: cp.si + cp_slope * span, entropy: cp.si / t_k + cp_slope * ln_ratio, cp: cp_slope },
        cp: Some(cp),
    })
}

/// A figure drawn from a function: at which temperature, and in which way where there are several.
pub(super) struct Drawn {
    pub si: f64,
    pub t_k: f64,
    pub way: &'static str,
}

/// Figures of one species at T as a method takes the heat capacity.
pub(super) struct Taken {
    pub increment: Drawn,
    pub entropy: Drawn,
    pub cp: Drawn,
    pub slopes: Slopes,
}

pub(super) const INTEGRATED: &str = "integrated from 298.15 K";
pub(super) const AT_REFERENCE: &str = "Cp held at its value at 298.15 K";
pub(super) const HALF_WAY: &str = "Cp held at its value half-way";
pub(super) const BOTH_ENDS: &str = "Cp held at the mean of both ends";
pub(super) const MEAN_OF_BOTH: &str = "mean of it and the one at 298.15 K";

/// With Cp held at one value, whose own slope with T is `cp_slope`.
pub(super) fn flat(at_0: Functions, t_k: f64, cp: Drawn, cp_slope: f64, way: &'static str) -> Taken {
    let (span, ln_ratio) = (t_k - T_REFERENCE, math::ln(t_k / T_REFERENCE));
    Taken {
        increment: Drawn { si: cp.si * span, t_k, way },
        entropy: Drawn { si: at_0.s + cp.si * ln_ratio, t_k, way },
        slopes: Slopes { increment: cp.si + cp_slope * span, entropy: cp.si / t_k + cp_slope * ln_ratio, cp: cp_slope },
        cp,
    }
}

/// With the values at 298.15 K.
pub(super) fn neglected(at_0: Functions, t_k: f64) -> Taken {
    Taken {
        increment: Drawn { si: 0.0, t_k, way: "neglected" },
        entropy: Drawn { si: at_0.s, t_k: T_REFERENCE, way: "" },
        cp: Drawn { si: at_0.cp, t_k: T_REFERENCE, way: "" },
        slopes: Slopes::default(),
    }
}

/// Increment and entropy between 298.15 K and T, as the method takes the heat capacity.
///
/// A phase that does not reach down to 298.15 K has no heat capacity there, and is always integrated: its enthalpy scale
/// continues that of the phase it forms from.
fn between(function: &Function, h_298: f64, t_k: f64, at_t: Functions, mode: HeatCapacity) -> Taken {
    let slope = function::cp_slope(function, t_k);
    let integrated = |h_298: f64| Taken {
        increment: Drawn { si: at_t.h - h_298, t_k, way: INTEGRATED },
        entropy: Drawn { si: at_t.s, t_k, way: "" },
        cp: Drawn { si: at_t.cp, t_k, way: "" },
        slopes: Slopes { increment: at_t.cp, entropy: at_t.cp / t_k, cp: slope },
    };
    if !function.covers(T_REFERENCE) {
        return integrated(h_298);
    }
    let at_0 = function::evaluate(function, T_REFERENCE);
    match mode {
        // Within one record there is no change of phase to miss.
        HeatCapacity::Full | HeatCapacity::Missed => integrated(at_0.h),
        HeatCapacity::FirstOrder { .. } => unreachable!("it is a sum of two full integrals"),
        HeatCapacity::Constant => {
            let cp = Drawn { si: at_0.cp, t_k: T_REFERENCE, way: "" };
            flat(at_0, t_k, cp, 0.0, AT_REFERENCE)
        }
        HeatCapacity::Midpoint => {
            let middle = 0.5 * (t_k + T_REFERENCE);
            let cp = Drawn { si: function::evaluate(function, middle).cp, t_k: middle, way: "" };
            flat(at_0, t_k, cp, 0.5 * function::cp_slope(function, middle), HALF_WAY)
        }
        HeatCapacity::Mean => {
            let cp = Drawn { si: 0.5 * (at_0.cp + at_t.cp), t_k, way: MEAN_OF_BOTH };
            flat(at_0, t_k, cp, 0.5 * slope, BOTH_ENDS)
        }
        HeatCapacity::Neglected => neglected(at_0, t_k),
    }
}

#[cfg(test)]
mod tests {
    use std::cell::Cell;

    use super::*;
    use crate::model::card::References;
    use crate::model::reaction::Reaction;
    use crate::record::node::{Node, Operator, Origin};
    use crate::record::spread::{Spread, spread};
    use crate::source::Embedded;
    use crate::units::{Dimension, Kind, constants};

    /// Two gases with invented figures, u = 0.3 and 0.4 kJ/mol, correlated by `r`.
    fn invented(r: &str) -> Result<Catalog, crate::data::dataset::TableFault> {
        let record = |id: &str, formula: &str, value: &str, u: &str| {
            format!(
                r#"{{"id": "{id}", "formula": "{formula}", "dhf_298": {{"value": "{value}", "u": "{u}"}},
                "source": "invented for this test", "obtained": "", "confirmation": "single source"}}"#
            )
        };
        let text = format!(
            r#"{{"schema": "hessbook-formation/1", "dataset": {{"id": "invented", "short": "invented",
            "publication": "none", "terms": "none", "uncertainty": "standard", "divisor": 1, "rank": 1}},
            "title": "invented", "p_standard_pa": 100000, "records": [{}, {}],
            "dhf_298_correlations": [{{"records": ["CO(g)", "CO2(g)"], "r": {r}}}]}}"#,
            record("CO(g)", "CO", "-110.0", "0.3"),
            record("CO2(g)", "CO2", "-390.0", "0.4"),
        );
        let file = Embedded { path: "invented.json", bytes: text.leak().as_bytes(), sha256: "" };
        Catalog::from_files(&[file])
    }

    #[test]
    fn correlation_that_a_table_gives_reaches_the_uncertainty() {
        let data = invented("[[1, 0.5], [0.5, 1]]").unwrap();
        let leaf = |id: &str| {
            let figure = formation_of(&data.find(id).unwrap(), &DatasetId::new("invented"), &data).unwrap();
            let origin = match figure.origin {
                FigureOrigin::Input(input) => Origin::Input(input),
                FigureOrigin::Nodes(_) => unreachable!("a printed figure is an input"),
            };
            Rc::new(Node::new(figure.si, Dimension::none(), Kind::PLAIN, SmallVec::new(), origin, None))
        };
        let inputs = SmallVec::from_vec(vec![(leaf("CO2(g)"), 1.0), (leaf("CO(g)"), -1.0)]);
        let origin = Origin::Operator(Operator::Subtract);
        let gap = Rc::new(Node::new(-280e3, Dimension::none(), Kind::PLAIN, inputs, origin, None));
        // 0.3² + 0.4² − 2·0.5·0.12 in (kJ/mol)²
        let Spread::Full(u) = spread(&gap) else { panic!("both state their u") };
        assert!((u - 1000.0 * f64::sqrt(0.13)).abs() < 1e-9, "{u}");
    }

    #[test]
    fn a_figure_is_at_hand_where_it_is_said_to_be() {
        let data = Catalog::shipped();
        for substance in data.substances() {
            for dataset in formation_datasets(&data) {
                let term = Term::of_tables(Arc::clone(substance), 1.0);
                let figure = term_formation(&term, &dataset.id, &data);
                assert_eq!(
                    has_formation(&term, &dataset.id, &data),
                    figure.is_some(),
                    "{} {}",
                    substance.id(),
                    dataset.id
                );
            }
        }
    }

    #[test]
    fn coefficients_that_cannot_be_are_refused_with_the_table() {
        for r in ["[[1, 0.5], [0.4, 1]]", "[[1, 2], [2, 1]]", "[[1, 0.5]]"] {
            let message = invented(r).unwrap_err().to_string();
            assert!(message.contains("invented.json"), "{message}");
        }
    }

    #[test]
    fn a_phase_below_298_k_is_joined_to_the_phase_it_melts_into() {
        let (references, ordinal) = (References::new(constants::current()), Cell::new(0));
        let cx = Cx { references: &references, place: None, ordinal: &ordinal, halted: &|| None };
        let data = cx.data();
        let melting = Reaction::read("H2O(cr,ice-ih) -> H2O(l)", data).unwrap();
        for formation in ["codata-1989", "atct-1.112", "nasa-tp-2002-211556"] {
            let method = Method::from_words(None, Some(formation), data).unwrap();
            let all = contributions(&melting, 273.15, &method, &cx).unwrap();
            let h: f64 = all.iter().map(|c| c.nu * (c.formation.si + c.increment.as_ref().unwrap().si)).sum();
            // Heat of melting of ice at 273.15 K, 6.0067 kJ/mol: IAPWS-95 and IAPWS R10-06, computed from the published
            // formulations. Bound: the two functions of the report meet there with 6.0099 kJ/mol, 3.2 J/mol more.
            assert!((h - 6006.7).abs() < 3.5, "{formation}: {h} J/mol");
        }
    }
    #[test]
    fn phases_meet_at_their_transition_as_their_functions_do() {
        let (references, ordinal) = (References::new(constants::current()), Cell::new(0));
        let cx = Cx { references: &references, place: None, ordinal: &ordinal, halted: &|| None };
        let data = cx.data();
        for (equation, t_k) in
            [("Hg(cr) -> Hg(l)", 234.29), ("H2O(cr,ice-ih) -> H2O(l)", 273.15), ("Fe(cr,delta) -> Fe(l)", 1809.0)]
        {
            let reaction = Reaction::read(equation, data).unwrap();
            let all = contributions(&reaction, t_k, &Method::from_words(None, None, data).unwrap(), &cx).unwrap();
            let h: f64 = all.iter().map(|c| c.nu * (c.formation.si + c.increment.as_ref().unwrap().si)).sum();
            let of = |term: &Term| term.nu * function::evaluate(term.substance.function.as_ref().unwrap(), t_k).h;
            let direct: f64 = reaction.terms().iter().map(of).sum();
            // The same functions summed in another order: rounding at 3e5 J/mol, of terms that reach 1e9 J/mol in water.
            assert!((h - direct).abs() < 1e-6, "{equation}: {h} and {direct} J/mol");
        }
    }
}
