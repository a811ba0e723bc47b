//! What is fed, what reacts, and what is there afterwards.
//!
//! n_after = n_fed + Σ ν ξ        ξ: extents of reaction, given, from a conversion X ξ = X n_fed/|ν|, or complete
//!
//! [`Contents`] is read from the options of a call, and read again where a claim is tested. All species share one dataset of
//! formation enthalpies, chosen for all of them together. Source: definition of the extent of reaction, IUPAC Green Book,
//! 3rd ed., section 2.10.1 (from memory).

use std::collections::BTreeMap;
use std::rc::Rc;

use crate::fault::Fault;
use crate::model::card::{Arg, Call, Cx, Default, Takes, Value, listed};
use crate::model::gather::{self, Formation, HeatCapacity, Method};
use crate::model::plant::amount::Amount;
use crate::model::plant::error::PlantError;
use crate::model::plant::stream::{self, Portion, Stream};
use crate::model::reaction::Reaction;
use crate::model::terms::{Term, Terms};
use crate::quantity::{Quantity, text};
use crate::units::constants::STANDARD_PRESSURE;
use crate::units::{Entity, Of};

/// Relative imbalance of an element that typed amounts may have: rounding of sums of figures with ten digits.
const CLOSURE: f64 = 1e-9;

/// What an amount may fall short by rounding, relative to what was fed.
const ROUNDING: f64 = 1e-12;

pub(super) const FEEDS: Arg =
    Arg { name: "feeds", takes: Takes::Streams, default: Default::Required, doc: "what is fed: a list of streams" };
pub(super) const REACTIONS: Arg = Arg {
    name: "reactions",
    takes: Takes::Maps(PROGRESS),
    default: Default::Absent,
    doc: "what reacts: a list of maps, each with a reaction and how far it goes; without either it is complete",
};
pub(super) const FORMATION: Arg = Arg {
    name: "formation",
    takes: Takes::Text,
    default: Default::Absent,
    doc: "the dataset of formation enthalpies, such as \"codata-1989\", or \"mixed\"",
};
pub(super) const PRESSURE: Arg = Arg {
    name: "pressure",
    takes: Takes::Quantity { unit: "bar" },
    default: Default::Absent,
    doc: "absolute pressure, for tests against equilibrium; 1 bar unless given. Gases are ideal, so enthalpies do not depend on it",
};

const PROGRESS: &[Arg] = &[
    Arg { name: "reaction", takes: Takes::Reaction, default: Default::Required, doc: "a reaction" },
    Arg {
        name: "extent",
        takes: Takes::AnyQuantity,
        default: Default::Absent,
        doc: "extent of reaction in moles of reaction as written, in all or per time as the feeds",
    },
    Arg {
        name: "conversion",
        takes: Takes::Fraction,
        default: Default::Absent,
        doc: "fraction of what is fed of the species named by `of` that this reaction uses up",
    },
    Arg { name: "of", takes: Takes::Text, default: Default::Absent, doc: "the species of the conversion, with phase" },
];

/// How far a reaction goes.
pub struct Progress {
    pub reaction: Rc<Reaction>,
    /// In mol or mol/s.
    pub extent: Amount,
    /// Whether it was taken as complete, since nothing was said of its extent.
    pub complete: bool,
}

/// One case.
pub struct Contents {
    pub feeds: Vec<Rc<Stream>>,
    pub fed: Vec<Portion>,
    pub progress: Vec<Progress>,
    pub after: Vec<Portion>,
    pub per_time: bool,
    /// With the dataset that has all species.
    pub method: Method,
    pub p_pa: f64,
}

fn options(call: &Call) -> &BTreeMap<String, Value> {
    match call.args.last() {
        Some(Value::Options(options)) => options,
        _ => unreachable!("{} takes a map of options", call.card.id),
    }
}

/// The streams that a call was given under a name; none where it was not given.
pub fn streams(call: &Call, name: &str) -> Vec<Rc<Stream>> {
    let Some(Value::List(list)) = options(call).get(name) else { return Vec::new() };
    let stream = |value: &Value| if let Value::Stream(stream) = value { Some(Rc::clone(stream)) } else { None };
    list.iter().filter_map(stream).collect()
}

/// An option that is a quantity.
pub fn quantity<'a>(call: &'a Call, name: &str) -> Option<&'a Quantity> {
    match options(call).get(name) {
        Some(Value::Quantity(value)) => Some(value),
        _ => None,
    }
}

/// The reactions of a call.
pub fn reactions(call: &Call) -> Vec<Rc<Reaction>> {
    maps(call).iter().filter_map(|one| reaction_of(one)).collect()
}

fn maps(call: &Call) -> Vec<Rc<BTreeMap<String, Value>>> {
    let Some(Value::List(list)) = options(call).get("reactions") else { return Vec::new() };
    list.iter().filter_map(|value| if let Value::Options(map) = value { Some(Rc::clone(map)) } else { None }).collect()
}

fn reaction_of(map: &BTreeMap<String, Value>) -> Option<Rc<Reaction>> {
    match map.get("reaction") {
        Some(Value::Reaction(reaction)) => Some(Rc::clone(reaction)),
        _ => None,
    }
}

/// "flows" or "amounts".
pub fn sort(per_time: bool) -> &'static str {
    if per_time { "flows" } else { "amounts" }
}

impl Contents {
    /// Reads feeds and reactions. `others` are streams whose species must be in the same dataset.
    ///
    /// # Errors
    /// Streams and reactions do not fit together, or no dataset has all species.
    pub fn read(cx: &Cx, call: &Call, others: &[Rc<Stream>]) -> Result<Contents, Fault> {
        let feeds = streams(call, "feeds");
        let Some(first) = feeds.first() else { return Err(PlantError::NoFeeds { function: call.card.name }.into()) };
        let per_time = first.per_time;
        if let Some(other) = feeds.iter().chain(others).find(|stream| stream.per_time != per_time) {
            let (flow, total) = if per_time { (first, other) } else { (other, first) };
            return Err(
                PlantError::FlowAndAmount { first: flow.name.to_string(), second: total.name.to_string() }.into()
            );
        }
        let fed = merged(&feeds);
        let mut progress = Vec::new();
        for map in maps(call) {
            let Some(reaction) = reaction_of(&map) else { continue };
            progress.push(progressed(reaction, &map, &fed, per_time)?);
        }
        shared_reactants(&progress)?;
        let mut after = fed.clone();
        for one in &progress {
            react(&mut after, one, 1.0);
        }
        refuse_overdrawn(&fed, &progress, &mut after, per_time)?;
        let terms = after.iter().chain(others.iter().flat_map(|stream| &stream.portions));
        let all = Terms::new(terms.map(|portion| portion.term.clone()).collect(), Entity::OPEN, String::new());
        let word = call.option("formation").map(|word| &**word);
        let method = resolved(&all, &Method::from_words(None, word, cx.data())?, cx)?;
        let p_pa = match quantity(call, "pressure") {
            Some(p) if p.si() > 0.0 => p.si(),
            Some(p) => return Err(PlantError::Pressure { given: text::shown_plain(p) }.into()),
            None => STANDARD_PRESSURE.value,
        };
        Ok(Contents { feeds, fed, progress, after, per_time, method, p_pa })
    }

    /// The same with heat capacities taken in another way.
    #[must_use]
    pub fn with_heat_capacity(&self, heat_capacity: HeatCapacity) -> Method {
        Method { heat_capacity, ..self.method.clone() }
    }
}

/// The method with one dataset for all terms, so that every stream takes it alike.
fn resolved(all: &Terms, method: &Method, cx: &Cx) -> Result<Method, Fault> {
    let used = gather::datasets_for(all, &method.formation, cx.data())?;
    let formation = match (&method.formation, used.first()) {
        (Formation::First, Some(id)) => Formation::Of(id.clone()),
        (asked, _) => asked.clone(),
    };
    Ok(Method { formation, ..method.clone() })
}

/// All streams' portions, those of one species together.
pub fn merged(streams: &[Rc<Stream>]) -> Vec<Portion> {
    let mut all: Vec<Portion> = Vec::new();
    for portion in streams.iter().flat_map(|stream| &stream.portions) {
        add(&mut all, &portion.term, &portion.amount, 1.0);
    }
    all
}

fn add(all: &mut Vec<Portion>, term: &Term, amount: &Amount, times: f64) {
    match all.iter_mut().find(|known| known.id() == term.substance.id()) {
        Some(known) => known.amount.add(amount, times),
        None => all.push(Portion { term: Term { nu: 1.0, ..term.clone() }, amount: amount.times(times) }),
    }
}

fn react(all: &mut Vec<Portion>, progress: &Progress, times: f64) {
    for term in progress.reaction.terms() {
        add(all, term, &progress.extent, times * term.nu);
    }
}

fn fed_of<'a>(fed: &'a [Portion], id: &str) -> Option<&'a Portion> {
    fed.iter().find(|portion| portion.id() == id && portion.amount.si > 0.0)
}

fn progressed(
    reaction: Rc<Reaction>,
    map: &BTreeMap<String, Value>,
    fed: &[Portion],
    per_time: bool,
) -> Result<Progress, Fault> {
    let equation = reaction.text().to_owned();
    let given = |name: &str| map.get(name).filter(|value| !matches!(value, Value::Nothing));
    let (extent, complete) = match (given("extent"), given("conversion")) {
        (Some(_), Some(_)) => return Err(PlantError::ExtentAndConversion { reaction: equation }.into()),
        (Some(Value::Quantity(extent)), None) => {
            let own = matches!(extent.dim().entities(), [(Of::Amount, entity, 2)] if entity.is_open() || *entity == Entity::RXN);
            if !own || stream::sort_of(extent) != Some((false, per_time)) {
                let given = extent.unit().text.to_string();
                let given = if given.is_empty() { "a pure number".to_owned() } else { given };
                return Err(PlantError::Extent { reaction: equation, given, feeds: sort(per_time) }.into());
            }
            (Amount::scaled_value(extent, 1.0), false)
        }
        (_, Some(conversion)) => (converted(&reaction, conversion, given("of"), fed)?, false),
        (_, None) => (limited(&reaction, fed), true),
    };
    Ok(Progress { reaction, extent, complete })
}

/// The reactants that are fed, as written.
fn reactants(reaction: &Reaction, fed: &[Portion]) -> Vec<String> {
    let used = reaction.terms().iter().filter(|term| term.nu < 0.0);
    used.map(|term| term.substance.id().to_owned()).filter(|id| fed_of(fed, id).is_some()).collect()
}

fn converted(
    reaction: &Reaction,
    conversion: &Value,
    of: Option<&Value>,
    fed: &[Portion],
) -> Result<Amount, PlantError> {
    let equation = || reaction.text().to_owned();
    let known = || {
        let known = reactants(reaction, fed);
        if known.is_empty() { String::new() } else { listed(known.iter().map(String::as_str)) }
    };
    let range = |given: String| PlantError::ConversionRange { given };
    let (fraction, value) = match conversion {
        Value::Number(fraction) => (*fraction, None),
        Value::Quantity(value) if value.dim().is_basis_only() => (value.si(), Some(value)),
        Value::Quantity(value) => return Err(range(text::shown_plain(value))),
        other => unreachable!("a fraction was checked to be one, not {}", other.sort()),
    };
    if !(0.0..=1.0).contains(&fraction) {
        return Err(range(fraction.to_string()));
    }
    let Some(Value::Text(species)) = of else {
        return Err(PlantError::ConversionOfNothing { reaction: equation(), known: known() });
    };
    // With phase as the equation has it, or as any name of the same species.
    let term = reaction.terms().iter().find(|term| term.nu < 0.0 && term.substance.id() == &**species);
    let fed_species = term.and_then(|term| Some((term, fed_of(fed, term.substance.id())?)));
    let Some((term, portion)) = fed_species else {
        return Err(PlantError::ConversionOf { species: species.to_string(), reaction: equation(), known: known() });
    };
    let per_fed = portion.amount.times(1.0 / term.nu.abs());
    Ok(value.map_or_else(|| per_fed.times(fraction), |value| per_fed.times_value(value)))
}

/// The extent at which the first reactant is used up.
fn limited(reaction: &Reaction, fed: &[Portion]) -> Amount {
    let used = reaction.terms().iter().filter(|term| term.nu < 0.0);
    let extents = used.map(|term| {
        fed.iter()
            .find(|portion| portion.id() == term.substance.id())
            .map_or_else(Amount::default, |portion| portion.amount.times(1.0 / term.nu.abs()))
    });
    extents.min_by(|a, b| a.si.total_cmp(&b.si)).unwrap_or_default()
}

/// Two complete reactions must not draw on one species.
fn shared_reactants(progress: &[Progress]) -> Result<(), PlantError> {
    let complete: Vec<&Progress> = progress.iter().filter(|one| one.complete).collect();
    let uses = |one: &Progress, id: &str| one.reaction.terms().iter().any(|t| t.nu < 0.0 && t.substance.id() == id);
    for (nth, one) in complete.iter().enumerate() {
        for other in progress {
            let earlier = complete[..nth].iter().any(|before| std::ptr::eq(*before, other)) || !other.complete;
            let mut shared = one.reaction.terms().iter().filter(|term| uses(one, term.substance.id()));
            if let Some(term) = shared.find(|term| earlier && uses(other, term.substance.id())) {
                return Err(PlantError::SharedReactant {
                    first: other.reaction.text().to_owned(),
                    second: one.reaction.text().to_owned(),
                    species: term.substance.id().to_owned(),
                });
            }
        }
    }
    Ok(())
}

fn refuse_overdrawn(
    fed: &[Portion],
    progress: &[Progress],
    after: &mut [Portion],
    per_time: bool,
) -> Result<(), PlantError> {
    for portion in after {
        if portion.amount.si >= 0.0 {
            continue;
        }
        let drawn = |formed: bool| -> f64 {
            let terms = progress.iter().flat_map(|one| one.reaction.terms().iter().map(move |term| (one, term)));
            let own = terms.filter(|(_, term)| term.substance.id() == portion.id());
            let moved = own.map(|(one, term)| term.nu * one.extent.si);
            moved.filter(|moved| (*moved > 0.0) == formed).map(f64::abs).sum()
        };
        let (formed, used) = (drawn(true), drawn(false));
        let supply = fed.iter().find(|one| one.id() == portion.id()).map_or(0.0, |one| one.amount.si) + formed;
        if -portion.amount.si > ROUNDING * used {
            return Err(PlantError::Overdrawn {
                species: portion.id().to_owned(),
                fed: stream::shown(supply, per_time),
                used: stream::shown(used, per_time),
            });
        }
        portion.amount.si = 0.0;
    }
    Ok(())
}

/// How far an element, or charge, is from balance.
pub struct Imbalance {
    /// `carbon (C)`, or `charge`.
    pub what: String,
    pub fed: f64,
    pub leaving: f64,
}

impl Imbalance {
    pub fn relative(&self) -> f64 {
        (self.leaving - self.fed).abs() / self.fed.abs().max(self.leaving.abs())
    }
}

/// The worst imbalances between what is fed and what leaves, where they are more than rounding.
pub fn imbalances(fed: &[Portion], leaving: &[Portion]) -> Vec<Imbalance> {
    let mut sums: BTreeMap<String, (f64, f64, f64)> = BTreeMap::new();
    for (side, portions) in [(0, fed), (1, leaving)] {
        for portion in portions {
            let species = &portion.term.substance.species;
            let elements =
                species.composition.iter().map(|(element, count)| (element.symbol().to_owned(), count.to_f64()));
            let charge = (species.charge != 0).then(|| ("charge".to_owned(), f64::from(species.charge)));
            for (what, count) in elements.chain(charge) {
                let sum = sums.entry(what).or_default();
                let moles = count * portion.amount.si;
                *if side == 0 { &mut sum.0 } else { &mut sum.1 } += moles;
                sum.2 += moles.abs();
            }
        }
    }
    let all = sums.into_iter().filter(|(_, (fed, leaving, scale))| (fed - leaving).abs() > CLOSURE * scale);
    let mut all: Vec<Imbalance> = all.map(|(what, (fed, leaving, _))| Imbalance { what, fed, leaving }).collect();
    all.sort_by(|a, b| b.relative().total_cmp(&a.relative()));
    all
}
