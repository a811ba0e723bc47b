//! Where dissociation begins to matter for a temperature that was computed without it, and what it costs.
//!
//! Each dissociation of the list is brought to equilibrium alone in the contents as they are; the lowest temperature at which
//! one of them takes more than 1 % of what can dissociate is the stated limit (common practice, no source). The price is the
//! temperature without them minus that with all of them at equilibrium. The surprise: all together they imply the shift
//! reaction too, which is quick where gases dissociate; where each alone takes next to nothing, none of them goes on.

use std::rc::Rc;

use crate::fault::Fault;
use crate::model::card::{Call, Cx};
use crate::model::gather;
use crate::model::plant::adiabatic;
use crate::model::plant::amount::Amount;
use crate::model::plant::claims::{mixture, numbers_over, settled, sum_of, with_amount};
use crate::model::plant::contents::Contents;
use crate::model::plant::equilibrium::Held;
use crate::model::plant::stream::Portion;
use crate::model::plant::tally::Tally;
use crate::model::reaction::Reaction;
use crate::model::terms::{Term, Terms};
use crate::num::root;
use crate::quantity::{Quantity, round};
use crate::record::node::Node;
use crate::record::register::{Finding, Tested};
use crate::units::Entity;

/// The share that counts as beginning to matter. Common practice, no source.
const SHARE: f64 = 0.01;

/// A share that is next to nothing: its heat moves the temperature by less than any tolerance.
const NEXT_TO_NOTHING: f64 = 1e-4;

/// What is tested: the first steps by which hot combustion gases come apart, and nitric oxide.
const DISSOCIATIONS: &[&str] = &[
    "CO2(g) -> CO(g) + 1/2 O2(g)",
    "H2O(g) -> H2(g) + 1/2 O2(g)",
    "H2O(g) -> OH(g) + 1/2 H2(g)",
    "H2(g) -> 2 H(g)",
    "O2(g) -> 2 O(g)",
    "N2(g) -> 2 N(g)",
    "CO(g) -> C(g) + O(g)",
    "N2(g) + O2(g) -> 2 NO(g)",
    "HCl(g) -> H(g) + Cl(g)",
    "Cl2(g) -> 2 Cl(g)",
    "HF(g) -> H(g) + F(g)",
    "SO3(g) -> SO2(g) + 1/2 O2(g)",
    "SO2(g) -> SO(g) + 1/2 O2(g)",
    "NO(g) -> 1/2 N2(g) + 1/2 O2(g)",
    "NO2(g) -> NO(g) + 1/2 O2(g)",
];

/// The contents with every species that the dissociations bring in, and the dissociations that apply.
struct Prepared {
    portions: Vec<Portion>,
    /// Text, numbers over the portions, and whether what dissociates is there to begin with.
    changes: Vec<(String, Vec<f64>, bool)>,
    /// Gases of several atoms that no dissociation of the list begins with.
    not_listed: Vec<String>,
}

fn prepared(cx: &Cx, contents: &Contents) -> Prepared {
    let mut portions: Vec<Portion> = contents.after.clone();
    let there =
        |portions: &[Portion], id: &str| portions.iter().any(|portion| portion.id() == id && portion.amount.si > 0.0);
    let covered = |reaction: &Reaction| {
        let terms = Terms::new(reaction.terms().to_vec(), Entity::OPEN, String::new());
        gather::datasets_for(&terms, &contents.method.formation, cx.data()).is_ok()
    };
    let shipped: Vec<Reaction> =
        DISSOCIATIONS.iter().filter_map(|text| Reaction::read(text, cx.data()).ok()).filter(covered).collect();
    let mut chosen: Vec<(&Reaction, bool)> = Vec::new();
    loop {
        let before = chosen.len();
        for reaction in &shipped {
            let reactants = || reaction.terms().iter().filter(|term| term.nu < 0.0);
            let at_hand = reactants().all(|term| portions.iter().any(|portion| portion.id() == term.substance.id()));
            if !at_hand || chosen.iter().any(|(known, _)| std::ptr::eq(*known, reaction)) {
                continue;
            }
            let at_first = reactants().all(|term| there(&contents.after, term.substance.id()));
            let begins = at_first || !chosen.is_empty();
            if !begins {
                continue;
            }
            for term in reaction.terms() {
                if !portions.iter().any(|portion| portion.id() == term.substance.id()) {
                    let term = Term { nu: 1.0, ..term.clone() };
                    portions.push(Portion { term, amount: Amount::default() });
                }
            }
            chosen.push((reaction, at_first));
        }
        if chosen.len() == before {
            break;
        }
    }
    let changes = chosen
        .iter()
        .map(|(reaction, first)| (reaction.text().to_owned(), numbers_over(reaction.terms(), &portions), *first))
        .collect();
    let gases = contents.after.iter().filter(|p| p.amount.si > 0.0 && p.term.substance.species.is_gas());
    let not_listed = gases.filter(|portion| {
        let species = &portion.term.substance.species;
        let atoms: f64 = species.composition.iter().map(|(_, count)| count.to_f64()).sum();
        let begins = |reaction: &Reaction| {
            reaction.terms().iter().any(|term| term.nu < 0.0 && term.substance.id() == portion.id())
        };
        atoms > 1.0 && !shipped.iter().any(begins)
    });
    let not_listed = not_listed.map(|portion| portion.id().to_owned()).collect();
    Prepared { portions, changes, not_listed }
}

impl Prepared {
    /// The share that one dissociation takes alone.
    fn share(&self, cx: &Cx, contents: &Contents, nu: &[f64], t_k: f64, held: Held) -> Result<f64, Fault> {
        let extent = mixture(cx, contents, &self.portions, t_k, held)?.extent(nu);
        let at_most = nu.iter().zip(&self.portions).filter(|(nu, _)| **nu < 0.0).map(|(nu, p)| p.amount.si / -nu);
        Ok(extent / at_most.fold(f64::INFINITY, f64::min))
    }

    /// The lowest temperature at which one of them takes its share, with its text.
    fn limit(&self, cx: &Cx, contents: &Contents, held: &impl Fn(f64) -> Held) -> Result<Option<(f64, &str)>, Fault> {
        let [(low, _), (high, _)] = adiabatic::common_range(cx, &self.portions)?;
        let mut lowest: Option<(f64, &str)> = None;
        for (text, nu, _) in self.changes.iter().filter(|(_, _, first)| *first) {
            let over = |t_k: f64| Ok::<f64, Fault>(self.share(cx, contents, nu, t_k, held(t_k))? - SHARE);
            // To 0.1 K: it is stated to 10 K.
            if let Ok(root) = root::bracketed(over, low, high, 0.1)?
                && lowest.is_none_or(|(t_k, _)| root.x < t_k)
            {
                lowest = Some((root.x, text));
            }
        }
        Ok(lowest)
    }

    /// The temperature with all of them at equilibrium.
    fn temperature(
        &self,
        cx: &Cx,
        call: &Rc<Call>,
        contents: &Contents,
        held: &impl Fn(f64) -> Held,
    ) -> Result<Rc<Node>, Fault> {
        let energy = adiabatic::energy_of(call, contents)?;
        let target = adiabatic::fed(cx, contents, energy, &contents.method)?;
        let changes: Vec<Vec<f64>> = self.changes.iter().map(|(_, nu, _)| nu.clone()).collect();
        let at = |t_k: f64| settled(cx, contents, &self.portions, &changes, t_k, held(t_k));
        let t_k = adiabatic::closing(cx, &self.portions, target, |t_k| {
            sum_of(cx, contents, &self.portions, &at(t_k)?, t_k, energy)
        })?;
        // Derivatives at the composition found; how the composition itself answers is in the slope along T alone.
        let h = 0.01;
        let sum = |t_k: f64| Ok::<f64, Fault>(sum_of(cx, contents, &self.portions, &at(t_k)?, t_k, energy)?.si);
        let capacity = (sum(t_k + h)? - sum(t_k - h)?) / (2.0 * h);
        let n = at(t_k)?;
        let moved: Vec<Portion> = self.portions.iter().zip(&n).map(|(portion, n)| with_amount(portion, *n)).collect();
        let mut tally = Tally::new(energy, &contents.method, cx);
        tally.add(1.0, &moved, t_k, None)?;
        for feed in &contents.feeds {
            tally.add(-1.0, &feed.portions, feed.t.si(), Some(&feed.t))?;
        }
        Ok(Rc::clone(adiabatic::point(cx, call, t_k, &tally, capacity)?.node()))
    }
}

/// The rows of an adiabatic temperature.
pub fn findings(
    cx: &Cx,
    call: &Rc<Call>,
    contents: &Contents,
    value: &Quantity,
    held: &impl Fn(f64) -> Held,
) -> Vec<Finding> {
    let prepared = prepared(cx, contents);
    let mut findings = Vec::new();
    let row =
        |subject: String, tested| Finding::known("no-dissociation", subject, value.node(), Some(value.si()), tested);
    if prepared.changes.iter().any(|(_, _, first)| *first) {
        let priced = || -> Result<Tested, Fault> {
            let (most, words) = most(cx, contents, &prepared, value, held)?;
            let limit = limit_words(cx, contents, &prepared, value, held)?;
            if most < NEXT_TO_NOTHING {
                return Ok(Tested::True { how: format!("{words}{limit}") });
            }
            let better = prepared.temperature(cx, call, contents, held)?;
            Ok(Tested::Better {
                value: better,
                how: format!("the temperature with dissociation at equilibrium; {words}{limit}"),
            })
        };
        let tested = priced().unwrap_or_else(|fault| Tested::Missing { what: fault.message().to_owned() });
        let mut begins: Vec<&str> = Vec::new();
        for (text, _, _) in prepared.changes.iter().filter(|(_, _, first)| *first) {
            for species in text.split(" -> ").next().unwrap_or("").split(" + ") {
                if !begins.contains(&species) {
                    begins.push(species);
                }
            }
        }
        findings.push(row(begins.join(", "), tested));
    }
    if !prepared.not_listed.is_empty() {
        let what = "no dissociation of these is tested here; decomposition is not covered".to_owned();
        findings.push(row(prepared.not_listed.join(", "), Tested::Missing { what }));
    }
    findings
}

/// The largest share that one of them takes alone at the value's temperature, with words for it.
fn most(
    cx: &Cx,
    contents: &Contents,
    prepared: &Prepared,
    value: &Quantity,
    held: &impl Fn(f64) -> Held,
) -> Result<(f64, String), Fault> {
    let t_k = value.si();
    let (mut most, mut of) = (0.0, "");
    for (text, nu, _) in prepared.changes.iter().filter(|(_, _, first)| *first) {
        let share = prepared.share(cx, contents, nu, t_k, held(t_k))?;
        if share > most {
            (most, of) = (share, text);
        }
    }
    let t_k = round::fixed(t_k, 0);
    let words = if most < NEXT_TO_NOTHING {
        format!("each dissociation alone takes less than {} % at {t_k} K", 100.0 * NEXT_TO_NOTHING)
    } else {
        format!("alone, {of} goes to {} % at {t_k} K", round::significant(100.0 * most, 2))
    };
    Ok((most, words))
}

/// From where one of them takes more than its share.
fn limit_words(
    cx: &Cx,
    contents: &Contents,
    prepared: &Prepared,
    value: &Quantity,
    held: &impl Fn(f64) -> Held,
) -> Result<String, Fault> {
    let at = match held(value.si()) {
        Held::Pressure(p) => format!("{} bar", round::shortest(p)),
        Held::Volume(_) => "this volume".to_owned(),
    };
    Ok(match prepared.limit(cx, contents, held)? {
        Some((t_k, text)) => {
            let t_k = 10.0 * (t_k / 10.0).floor();
            let percent = 100.0 * SHARE;
            format!(
                "; at {at} {text} passes {percent} % from {t_k} K on, the first to do so (limit: common practice, no source)"
            )
        }
        None => String::new(),
    })
}
