//! Tests of what a balance of streams rests on. Each alternative is the same balance with one thing changed.

use std::rc::Rc;

use crate::chem::species::State as Aggregate;
use crate::data::dataset::DatasetId;
use crate::fault::Fault;
use crate::model::card::{Alternative, Call, Cx};
use crate::model::claims::{RESOLUTION_CONDENSED, RESOLUTION_GAS};
use crate::model::function;
use crate::model::gather::{self, HeatCapacity, Method};
use crate::model::plant::adiabatic::{self, ADIABATIC_TEMPERATURE};
use crate::model::plant::balance::{self, Case, HEAT_BALANCE};
use crate::model::plant::contents::{self, Contents, Imbalance};
use crate::model::plant::dissociation;
use crate::model::plant::equilibrium::{Held, Mixture};
use crate::model::plant::rise;
use crate::model::plant::stream::{self, Portion, Stream};
use crate::model::plant::tally::{self, Energy, Sum};
use crate::model::terms::Terms;
use crate::num::{math, root};
use crate::quantity::{Quantity, round};
use crate::record::node::Node;
use crate::record::register::{Finding, Tested};
use crate::units::Entity;
use crate::units::constants::STANDARD_PRESSURE;

/// Anything that ends a test without a price ends it with words.
fn tested(better: Result<Rc<Node>, Fault>, how: String) -> Tested {
    match better {
        Ok(value) => Tested::Better { value, how },
        Err(fault) => Tested::Missing { what: fault.message().to_owned() },
    }
}

/// A call with its case, whichever of the three it is.
struct Asked {
    call: Rc<Call>,
    case: Case,
}

impl Asked {
    fn of(cx: &Cx, call: &Call) -> Result<Asked, Fault> {
        let call = Rc::new(Call { card: call.card, args: call.args.clone() });
        let case = if call.card.id == HEAT_BALANCE.id {
            Case::read(cx, &call)?
        } else {
            Case { contents: Contents::read(cx, &call, &[])?, products: Vec::new() }
        };
        Ok(Asked { call, case })
    }

    fn contents(&self) -> &Contents {
        &self.case.contents
    }

    /// The value by a method, with this heat lost.
    fn value(&self, cx: &Cx, method: &Method, loss: Option<&Quantity>) -> Result<Quantity, Fault> {
        let (call, contents) = (&self.call, self.contents());
        match call.card.id {
            id if id == HEAT_BALANCE.id => balance::duty(cx, call, &self.case, method),
            id if id == ADIABATIC_TEMPERATURE.id => adiabatic::temperature(cx, call, contents, method, loss),
            _ => rise::rise(cx, call, contents, method, loss),
        }
    }

    fn node(&self, cx: &Cx) -> Result<Rc<Node>, Fault> {
        Ok(Rc::clone(self.value(cx, &self.contents().method, None)?.node()))
    }

    /// Every stream with its temperature; what is there at the end has the temperature asked for.
    fn streams(&self, value: &Quantity) -> Vec<(Rc<Stream>, f64)> {
        let own = |stream: &Rc<Stream>| (Rc::clone(stream), stream.t.si());
        let mut all: Vec<(Rc<Stream>, f64)> =
            self.contents().feeds.iter().chain(&self.case.products).map(own).collect();
        if self.call.card.id == ADIABATIC_TEMPERATURE.id {
            all.push((Rc::new(self.contents().outlet(value)), value.si()));
        }
        all
    }
}

/// What is left of a reactant below this is nothing that could be found.
const COMPLETE: f64 = 1e-8;

/// `complete-conversion`: reactions of which no extent was said, against their equilibrium where the contents end.
pub fn complete_conversion(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Ok(mut asked) = Asked::of(cx, call) else { return Vec::new() };
    let complete: Vec<usize> =
        (0..asked.contents().progress.len()).filter(|&at| asked.contents().progress[at].complete).collect();
    if complete.is_empty() {
        return Vec::new();
    }
    let names = complete.iter().map(|&at| asked.contents().progress[at].reaction.text().to_owned());
    let subject = names.collect::<Vec<_>>().join("; ");
    let tested = at_equilibrium(cx, &mut asked, &complete, value);
    let tested = tested.unwrap_or_else(|fault| Tested::Missing { what: fault.message().to_owned() });
    vec![Finding::known("complete-conversion", subject, value.node(), None, tested)]
}

/// Sets the extents of the complete reactions to equilibrium where the contents end, and gives the value there.
fn at_equilibrium(cx: &Cx, asked: &mut Asked, complete: &[usize], value: &Quantity) -> Result<Tested, Fault> {
    let contents = asked.contents();
    let held = held(cx, asked, contents);
    let changes: Vec<Vec<f64>> = complete.iter().map(|&at| numbers(contents, at)).collect();
    let settled = |t_k: f64| settled(cx, contents, &contents.after, &changes, t_k, held(t_k));
    let t_k = match asked.call.card.id {
        id if id == HEAT_BALANCE.id => asked.case.products[0].t.si(),
        id if id == ADIABATIC_TEMPERATURE.id => {
            let energy = adiabatic::energy_of(&asked.call, contents)?;
            let target = adiabatic::fed(cx, contents, energy, &contents.method)?;
            adiabatic::closing(cx, &contents.after, target, |t_k| {
                let n = settled(t_k)?;
                sum_of(cx, contents, &contents.after, &n, t_k, energy)
            })?
        }
        _ => {
            // The rise is that of the extents at its own end: what both sides of it agree on.
            let start = rise::start(contents)?.si();
            let whole = value.si();
            let ends = |t_k: f64| -> Result<f64, Fault> {
                let n = settled(t_k)?;
                let reacted = reacted(contents, &contents.after, &n, complete);
                Ok(t_k - start - whole * reacted)
            };
            let (low, high) = if whole > 0.0 { (start, start + whole) } else { (start + whole, start) };
            match root::bracketed(ends, low, high, 1e-9 * whole.abs())? {
                Ok(root) => root.x,
                Err(_) => high,
            }
        }
    };
    let n = settled(t_k)?;
    let (mut how, mut most_left) = (Vec::new(), 0.0_f64);
    let contents = &mut asked.case.contents;
    let moved: Vec<f64> = extents(contents, &contents.after, &n, complete);
    for (&at, moved) in complete.iter().zip(&moved) {
        let one = &mut contents.progress[at];
        let whole = one.extent.si;
        if whole > 0.0 {
            let left = -moved / whole;
            most_left = most_left.max(left);
            how.push(format!("{} % left", round::significant(100.0 * left, 2)));
            let extent = one.extent.times(1.0 - left);
            let reaction = Rc::clone(&one.reaction);
            let delta = extent.si - whole;
            one.extent = extent;
            let share = delta / whole;
            let before = one.extent.times(share / (1.0 - left));
            for term in reaction.terms() {
                if let Some(portion) = contents.after.iter_mut().find(|portion| portion.id() == term.substance.id()) {
                    portion.amount.add(&before, term.nu);
                    portion.amount.si = portion.amount.si.max(0.0);
                }
            }
        }
    }
    if asked.call.card.id == HEAT_BALANCE.id {
        let outlet = asked.case.contents.outlet(&asked.case.products[0].t);
        asked.case.products = vec![Rc::new(outlet)];
    }
    let at = match held(t_k) {
        Held::Pressure(p) => format!("{} bar", round::shortest(p)),
        Held::Volume(_) => "the volume of the vessel".to_owned(),
    };
    let at = format!("equilibrium at {} K and {at}", round::fixed(t_k, 1));
    if most_left < COMPLETE {
        return Ok(Tested::True { how: format!("{at} leaves less than {} %", 100.0 * COMPLETE) });
    }
    let how = format!("{at}: {}", how.join(", "));
    Ok(Tested::Better { value: asked.node(cx)?, how })
}

/// What is held while the contents come to equilibrium, at a temperature.
fn held(cx: &Cx, asked: &Asked, contents: &Contents) -> impl Fn(f64) -> Held + use<> {
    let p = contents.p_pa / STANDARD_PRESSURE.value;
    let r = cx.constants().molar_gas.value;
    let volume = match adiabatic::energy_of(&asked.call, contents) {
        Ok(Energy::U) => Some(volume(contents, r)),
        _ => None,
    };
    move |t_k| match volume {
        Some(volume) if volume > 0.0 => Held::Volume(r * t_k / (volume * STANDARD_PRESSURE.value)),
        _ => Held::Pressure(p),
    }
}

/// The volume of what was fed as ideal gases at the pressure given, m³.
pub(super) fn volume(contents: &Contents, r: f64) -> f64 {
    let gases = |stream: &Rc<Stream>| -> f64 {
        let gases = stream.portions.iter().filter(|portion| portion.term.substance.species.is_gas());
        gases.map(|portion| portion.amount.si * r * stream.t.si() / contents.p_pa).sum()
    };
    contents.feeds.iter().map(gases).sum()
}

/// Stoichiometric numbers of a reaction over what is there afterwards.
fn numbers(contents: &Contents, at: usize) -> Vec<f64> {
    numbers_over(contents.progress[at].reaction.terms(), &contents.after)
}

pub(super) fn numbers_over(terms: &[crate::model::terms::Term], over: &[Portion]) -> Vec<f64> {
    let of = |portion: &Portion| {
        terms.iter().filter(|term| term.substance.id() == portion.id()).map(|term| term.nu).sum::<f64>()
    };
    over.iter().map(of).collect()
}

/// The amounts with some reactions at equilibrium.
pub(super) fn settled(
    cx: &Cx,
    contents: &Contents,
    portions: &[Portion],
    changes: &[Vec<f64>],
    t_k: f64,
    held: Held,
) -> Result<Vec<f64>, Fault> {
    let mut mixture = mixture(cx, contents, portions, t_k, held)?;
    if mixture.settle(changes) {
        return Ok(mixture.n);
    }
    Err(Fault::new(
        "equilibrium-not-found",
        "the equilibrium of the contents was not found",
        "leave the row untested, and say so",
    ))
}

/// The contents at a temperature, as the equilibrium takes them.
///
/// # Errors
/// A species has no entropy, or the temperature is outside the data.
pub(super) fn mixture(
    cx: &Cx,
    contents: &Contents,
    portions: &[Portion],
    t_k: f64,
    held: Held,
) -> Result<Mixture, Fault> {
    let terms = portions.iter().map(|portion| portion.term.clone()).collect();
    let all = tally::contributions(terms, t_k, &contents.method, cx)?;
    let rt = cx.constants().molar_gas.value * t_k;
    let mut g_rt = Vec::with_capacity(all.len());
    for (one, portion) in all.iter().zip(portions) {
        let no_entropy = || gather::GatherError::NoEntropy { species: portion.id().to_owned() };
        let s = one.entropy.as_ref().ok_or_else(no_entropy)?.si;
        let h = one.formation.si + one.increment.as_ref().map_or(0.0, |increment| increment.si);
        g_rt.push((h - t_k * s) / rt);
    }
    let n = portions.iter().map(|portion| portion.amount.si).collect();
    let gas = portions.iter().map(|portion| portion.term.substance.species.is_gas()).collect();
    Ok(Mixture { n, gas, g_rt, held })
}

/// Σ n h of other amounts of the same portions.
pub(super) fn sum_of(
    cx: &Cx,
    contents: &Contents,
    portions: &[Portion],
    n: &[f64],
    t_k: f64,
    energy: Energy,
) -> Result<Sum, Fault> {
    let moved: Vec<Portion> = portions.iter().zip(n).map(|(portion, n)| with_amount(portion, *n)).collect();
    tally::sum(&moved, t_k, energy, &contents.method, cx)
}

/// A portion with its amount changed by something that is no input.
pub(super) fn with_amount(portion: &Portion, n: f64) -> Portion {
    let mut moved = portion.clone();
    moved.amount.si = n;
    moved
}

/// How far each of some independent reactions went between two sets of amounts, by the one species that only it changes.
fn extents(contents: &Contents, from: &[Portion], to: &[f64], of: &[usize]) -> Vec<f64> {
    let own = |&at: &usize| {
        let nu = numbers(contents, at);
        let others = |i: usize| of.iter().any(|&other| other != at && numbers(contents, other)[i] != 0.0);
        // Complete reactions share no reactant, so each has reactants of its own.
        let i = (0..nu.len()).find(|&i| nu[i] < 0.0 && !others(i)).or_else(|| (0..nu.len()).find(|&i| nu[i] != 0.0));
        i.map_or(0.0, |i| (to[i] - from[i].amount.si) / nu[i])
    };
    of.iter().map(own).collect()
}

/// The share of the complete reactions' extents that is left of them, by heat the same for one reaction.
fn reacted(contents: &Contents, from: &[Portion], to: &[f64], of: &[usize]) -> f64 {
    let whole: f64 = of.iter().map(|&at| contents.progress[at].extent.si).sum();
    let moved: f64 = extents(contents, from, to, of).iter().sum();
    if whole > 0.0 { 1.0 + moved / whole } else { 1.0 }
}

/// `no-heat-loss`: priced by the loss that the call estimates.
pub fn no_heat_loss(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Ok(asked) = Asked::of(cx, call) else { return Vec::new() };
    let tested = match adiabatic::heat_loss(call, asked.contents()) {
        Ok(Some(loss)) => {
            let better = asked.value(cx, &asked.contents().method, Some(loss));
            let how = format!("the loss that was estimated, {}", crate::quantity::text::shown_plain(loss));
            tested(better.map(|better| Rc::clone(better.node())), how)
        }
        _ => no_estimate(),
    };
    let names = asked.contents().feeds.iter().map(|feed| feed.name.to_string()).collect::<Vec<_>>().join(", ");
    vec![Finding::known("no-heat-loss", names, value.node(), None, tested)]
}

fn no_estimate() -> Tested {
    Tested::Missing { what: "no estimate of the heat loss is given".to_owned() }
}

/// `no-heat-loss` where only figures are known.
pub fn no_heat_loss_of_figures(_: &Cx, _: &Call, value: &Quantity) -> Vec<Finding> {
    vec![Finding::known("no-heat-loss", "the contents", value.node(), None, no_estimate())]
}

/// `constant-heat-capacity` where only figures are known.
pub fn constant_figure(_: &Cx, _: &Call, value: &Quantity) -> Vec<Finding> {
    let what = "how the heat capacity changes on the way, and with what is formed, is not known".to_owned();
    vec![Finding::known("constant-heat-capacity", "the contents", value.node(), None, Tested::Missing { what })]
}

/// `constant-heat-capacity` of a rise: against the balance with heat capacities integrated and those of what is formed.
pub fn constant_heat_capacity(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Ok(asked) = Asked::of(cx, call) else { return Vec::new() };
    let contents = asked.contents();
    let integrated = || -> Result<Rc<Node>, Fault> {
        // The end is a step of its own card, since it is a temperature and not a rise.
        let as_point = Rc::new(Call { card: &ADIABATIC_TEMPERATURE, args: asked.call.args.clone() });
        let end = adiabatic::temperature(cx, &as_point, contents, &contents.method, None)?;
        let rise = end.minus(rise::start(contents)?, None)?;
        Ok(Rc::clone(rise.node()))
    };
    let how = "the balance with heat capacities integrated, and those of what is formed".to_owned();
    let tested = tested(integrated(), how);
    vec![Finding::known("constant-heat-capacity", "the contents", value.node(), None, tested)]
}

/// `no-dissociation`: against the temperature with the shipped dissociations at equilibrium.
pub fn no_dissociation(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Ok(asked) = Asked::of(cx, call) else { return Vec::new() };
    let held = held(cx, &asked, asked.contents());
    dissociation::findings(cx, &asked.call, asked.contents(), value, &held)
}

/// `formation-dataset`: against the next dataset that has all species.
pub fn formation_dataset(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Ok(asked) = Asked::of(cx, call) else { return Vec::new() };
    let products = asked.case.products.iter().flat_map(|stream| &stream.portions);
    let terms = asked.contents().after.iter().chain(products).map(|portion| portion.term.clone()).collect();
    let all = Terms::new(terms, Entity::OPEN, String::new());
    let Ok(used) = gather::datasets_for(&all, &asked.contents().method.formation, cx.data()) else { return Vec::new() };
    let short = |id: &DatasetId| cx.data().dataset(id).map_or_else(|| id.to_string(), |found| found.short.to_string());
    let mut names: Vec<String> = used.iter().map(short).collect();
    names.sort();
    names.dedup();
    let other = gather::covering(&all, cx.data()).into_iter().find(|id| used.iter().any(|taken| taken != id));
    let tested = match other {
        None => Tested::Missing { what: "no other shipped dataset has all species".to_owned() },
        Some(id) => {
            let better = Asked::of(cx, &call.with_option("formation", id.as_str())).and_then(|asked| asked.node(cx));
            tested(better, format!("formation enthalpies of {}", short(&id)))
        }
    };
    vec![Finding::known("formation-dataset", names.join(" and "), value.node(), None, tested)]
}

/// `stable-phase`: each species against the other shipped phases of its composition, a gas at its partial pressure.
pub fn stable_phase(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Ok(asked) = Asked::of(cx, call) else { return Vec::new() };
    let p = asked.contents().p_pa / STANDARD_PRESSURE.value;
    let (mut stable, mut alone, mut findings) = (Vec::new(), Vec::new(), Vec::new());
    for (stream, t_k) in asked.streams(value) {
        let gases = stream.portions.iter().filter(|portion| portion.term.substance.species.is_gas());
        let gas: f64 = gases.map(|portion| portion.amount.si).sum();
        for portion in stream.portions.iter().filter(|portion| portion.amount.si > 0.0) {
            let at = format!("{} at {} K", portion.id(), round::shortest(round::fixed(t_k, 2).parse().unwrap_or(t_k)));
            let list = match phase(cx, portion, t_k, p, p * portion.amount.si / gas) {
                Phase::Stable => &mut stable,
                Phase::Alone => &mut alone,
                Phase::Unstable(why) => {
                    let why = format!("in `{}`, {why}", stream.name);
                    let tested = Tested::False { why, value: None };
                    findings.push(Finding::known("stable-phase", at, value.node(), Some(t_k), tested));
                    continue;
                }
            };
            if !list.contains(&at) {
                list.push(at);
            }
        }
    }
    let p_shown = round::shortest(p);
    if !stable.is_empty() {
        let how =
            format!("no other shipped phase is more stable; each gas at its partial pressure, {p_shown} bar in all");
        let tested = Tested::True { how };
        findings.push(Finding::known("stable-phase", joined(&stable), value.node(), None, tested));
    }
    if !alone.is_empty() {
        let what = "no other phase with a function that reaches this temperature is shipped".to_owned();
        findings.push(Finding::known("stable-phase", joined(&alone), value.node(), None, Tested::Missing { what }));
    }
    findings
}

/// `CO(g), H2(g) at 493.15 K`: those of one temperature together.
fn joined(all: &[String]) -> String {
    let mut by_t: Vec<(&str, Vec<&str>)> = Vec::new();
    for one in all {
        let (species, t) = one.rsplit_once(" at ").unwrap_or((one, ""));
        match by_t.iter_mut().find(|(known, _)| *known == t) {
            Some((_, list)) => list.push(species),
            None => by_t.push((t, vec![species])),
        }
    }
    by_t.iter().map(|(t, list)| format!("{} at {t}", list.join(", "))).collect::<Vec<_>>().join("; ")
}

enum Phase {
    Stable,
    Alone,
    Unstable(String),
}

/// A species of a stream against its other phases. `p` and `partial` are the pressure of all and of the gas, over p°.
fn phase(cx: &Cx, portion: &Portion, t_k: f64, p: f64, partial: f64) -> Phase {
    let substance = &portion.term.substance;
    let is_gas = substance.species.is_gas();
    let above = substance.pressure.critical.as_ref().is_some_and(|critical| t_k > critical.t_k);
    let Some(own) = substance.function.as_ref().filter(|function| function.covers(t_k)) else { return Phase::Alone };
    let rt = cx.constants().molar_gas.value * t_k;
    let at = |g: f64, gas: bool, p: f64| if gas { g + rt * math::ln(p) } else { g };
    let g_own = at(function::evaluate(own, t_k).g(t_k), is_gas, partial);
    let mut compared = Phase::Alone;
    for other in cx.data().phases_of(substance) {
        let Some(function) = other.function.as_ref().filter(|function| function.covers(t_k)) else { continue };
        // Above the critical temperature there is no liquid, whatever its function says.
        if above && is_gas && other.species.phase.state == Aggregate::Liquid {
            continue;
        }
        let gas = other.species.is_gas();
        let lower = g_own - at(function::evaluate(function, t_k).g(t_k), gas, p);
        let resolution = if gas || is_gas { RESOLUTION_GAS } else { RESOLUTION_CONDENSED };
        if lower > resolution {
            let lower = lower / 1000.0;
            return Phase::Unstable(format!(
                "{} has the lower Gibbs energy, by {lower:.1} kJ/mol; put it into the stream in that phase, as far as it is there",
                other.id()
            ));
        }
        compared = Phase::Stable;
    }
    match compared {
        Phase::Alone if is_gas && above => Phase::Stable,
        compared => compared,
    }
}

/// `ideal-gas`: untested as long as no second virial coefficients are shipped.
pub fn ideal_gas(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    lacking(
        cx,
        call,
        value,
        "ideal-gas",
        &[Aggregate::Gas],
        1,
        "no second virial coefficients of these gases are shipped",
    )
}

/// `condensed-volume-neglected`, at constant volume only.
pub fn condensed_volume(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Ok(asked) = Asked::of(cx, call) else { return Vec::new() };
    if adiabatic::energy_of(call, asked.contents()).is_ok_and(|energy| energy == Energy::H) {
        return Vec::new();
    }
    let states = [Aggregate::Liquid, Aggregate::Crystal];
    lacking(cx, call, value, "condensed-volume-neglected", &states, 1, "no molar volumes of these are shipped")
}

/// `unmixed`: ideal gases mix without heat; nothing is known of liquids and solutions.
pub fn unmixed(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let states = [Aggregate::Liquid, Aggregate::Aqueous];
    lacking(cx, call, value, "unmixed", &states, 2, "no heats of mixing or dilution of these are shipped")
}

/// A row about the species of some states, where one stream has at least `least` of them.
fn lacking(
    cx: &Cx,
    call: &Call,
    value: &Quantity,
    id: &'static str,
    states: &[Aggregate],
    least: usize,
    what: &str,
) -> Vec<Finding> {
    let Ok(asked) = Asked::of(cx, call) else { return Vec::new() };
    let mut species: Vec<String> = Vec::new();
    for (stream, _) in asked.streams(value) {
        let there = stream.portions.iter().filter(|portion| portion.amount.si > 0.0);
        let own: Vec<&Portion> = there.filter(|p| states.contains(&p.term.substance.species.phase.state)).collect();
        if own.len() >= least {
            let new = own.iter().map(|portion| portion.id().to_owned()).filter(|id| !species.contains(id));
            species.extend(new.collect::<Vec<_>>());
        }
    }
    if species.is_empty() {
        return Vec::new();
    }
    let finding = Finding::known(id, species.join(", "), value.node(), None, Tested::Missing { what: what.to_owned() });
    vec![finding]
}

/// `elements-closed`: untested where measured flows were let pass without closing.
pub fn elements_closed(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Ok(case) = Case::read(cx, call) else { return Vec::new() };
    if !case.contents.progress.is_empty() {
        return Vec::new();
    }
    let open = contents::imbalances(&case.contents.fed, &contents::merged(&case.products));
    if open.is_empty() {
        return Vec::new();
    }
    let shown = |si| stream::shown(si, case.contents.per_time);
    let one = |open: &Imbalance| {
        let percent = round::significant(100.0 * open.relative(), 2);
        format!("{}: {} fed, {} leaving ({percent} %)", open.what, shown(open.fed), shown(open.leaving))
    };
    let what = open.iter().map(one).collect::<Vec<_>>().join("; ");
    let subject = open.iter().map(|open| open.what.clone()).collect::<Vec<_>>().join(", ");
    let what = format!("{what}; which flow is wrong is not known, so what it costs is not either");
    vec![Finding::known("elements-closed", subject, value.node(), None, Tested::Missing { what })]
}

/// What the usual shortcuts would have given.
pub const SHORTCUTS: &[Alternative] = &[
    Alternative {
        id: "constant-heat-capacity",
        words: "with every heat capacity held at its value at 298.15 K",
        value: with_constant_heat_capacity,
    },
    Alternative {
        id: "no-correction",
        words: "with the reactions' heat at 298.15 K alone, streams' temperatures left out",
        value: heat_of_reaction_alone,
    },
];

fn with_constant_heat_capacity(cx: &Cx, call: &Call, _: &Quantity) -> Option<f64> {
    let asked = Asked::of(cx, call).ok()?;
    let method = asked.contents().with_heat_capacity(HeatCapacity::Constant);
    asked.value(cx, &method, None).ok().map(|value| value.si())
}

fn heat_of_reaction_alone(cx: &Cx, call: &Call, _: &Quantity) -> Option<f64> {
    if call.card.id != HEAT_BALANCE.id {
        return None;
    }
    let asked = Asked::of(cx, call).ok()?;
    let method = asked.contents().with_heat_capacity(HeatCapacity::Neglected);
    asked.value(cx, &method, None).ok().map(|value| value.si())
}
