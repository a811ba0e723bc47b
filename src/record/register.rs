//! Assumptions: what a value rests on, how each was tested, and what it costs.
//!
//! A [`Finding`] is the outcome of a test, bound to the node whose formula leaned on the assumption. Its price at a
//! *reported* value, and so its status, is worked out when that value is reported: [`judge`]. The surprise: a status is
//! never stored, since it depends on the value asked for and on the tolerance in force.

use std::collections::BTreeMap;
use std::rc::Rc;

use crate::record::node::{Node, history, replayed};
use crate::record::spread::derivatives;
use crate::source::Citation;

/// Every assumption the program knows, with its claim in words. Ids are fixed: notebooks and seals hold them.
pub const CLAIMS: &[(&str, &str)] = &[
    ("constant-heat-capacity", "the heat capacities change too little with temperature to matter"),
    ("aqueous-heat-capacity", "the heat capacities of the solutes at 298.15 K hold up to this temperature"),
    ("stable-phase", "each species is in the stable phase of its composition at this temperature and pressure"),
    ("ideal-gas", "the gases are ideal"),
    ("second-virial", "the gases are thin enough for the second virial coefficient alone"),
    ("condensed-volume-neglected", "the volume of liquids and solids is too small to matter"),
    ("pressure-neglected", "the pressure moves these phases too little to matter"),
    ("constant-expansivity", "the volume goes on expanding as it does in the range of its data"),
    ("standard-pressure", "the records are for the standard pressure in use"),
    ("complete-conversion", "the reactions go on until one of their reactants is used up"),
    ("no-dissociation", "the contents neither dissociate nor form nitric oxide at this temperature"),
    ("no-heat-loss", "the contents lose no heat"),
    ("unmixed", "mixing takes up and gives off no heat"),
    ("elements-closed", "as much of each element leaves as is fed"),
    ("infinite-dilution", "the solutes are so dilute that they do not meet"),
    ("saturated-vapour-ideal", "the saturated vapour is ideal, and the liquid has no volume beside it"),
    ("formation-dataset", "the formation enthalpies of this dataset are the ones to use"),
    ("monomer-vapour", "the molecules of a vapour stay single"),
    ("no-decomposition", "no species falls apart into more stable ones"),
    ("fit-quality", "the heat capacity functions are as good as their figures look"),
    ("independent-inputs", "the rows of one table are independent of each other"),
    ("equipartition", "every vibration and torsion has reached its classical limit"),
    (
        "harmonic",
        "the vibrations are harmonic, so that fundamentals are their wavenumbers, and rotation does not depend on them",
    ),
    ("rigid-rotor", "rotation does not stretch the molecule"),
    ("free-rotor", "the internal rotation turns freely"),
    ("high-temperature-rotation", "the rotational levels lie so dense that their sum is an integral"),
    ("symmetry-number", "the symmetry number counts the rotations that leave the molecule as it was"),
    ("debye-model", "the crystal's heat capacity is that of waves and oscillators with these temperatures"),
    ("expansion-neglected", "the heat capacity of the crystal at constant pressure is the one at constant volume"),
    ("expansion-estimate", "Cp - Cv of the crystal follows from its melting point, after Nernst and Lindemann"),
    ("additive-estimate", "each atom of a crystal brings its own heat capacity"),
    ("linear-propagation", "first derivatives are enough to propagate the uncertainties"),
    ("uncertainty-incomplete", "the inputs that state no uncertainty add none that matters"),
    ("basis-unnamed", "a mole of nothing in particular was a mole of what it met"),
    ("together", "the assumptions that hold one by one also hold together"),
];

/// The claim in words of an id of [`CLAIMS`].
pub fn claim_of(id: &str) -> Option<&'static str> {
    CLAIMS.iter().find(|(known, _)| *known == id).map(|(_, claim)| *claim)
}

/// What a test gave.
#[derive(Clone)]
pub enum Tested {
    /// The claim holds in itself; there is no better value than the one in hand.
    True { how: String },
    /// The better alternative was computed; it is a value for the finding's node.
    Better { value: Rc<Node>, how: String },
    /// The claim is false, with the better alternative where there is one.
    False { why: String, value: Option<Rc<Node>> },
    /// The data for the test are missing; says which.
    Missing { what: String },
    /// The price was given by the analyst, in SI units of the node.
    Given { price: f64, how: String },
    /// The standard uncertainty was computed in a better way: the price is the change of u, in SI units of the node. It says
    /// nothing of the uncertainty of any other value.
    Spread { price: f64, how: String },
}

/// One assumption, tested.
#[derive(Clone)]
pub struct Finding {
    pub id: Rc<str>,
    pub claim: Rc<str>,
    /// What it is about: species, records, inputs.
    pub subject: String,
    /// The node whose value leaned on the assumption.
    pub at: Rc<Node>,
    /// Temperatures at which it was leaned on, lowest and highest.
    pub t_k: Option<(f64, f64)>,
    pub tested: Tested,
    /// Sources of figures that only the test used.
    pub sources: Vec<Citation>,
}

impl Finding {
    /// A finding for an id of [`CLAIMS`].
    pub fn known(
        id: &'static str,
        subject: impl Into<String>,
        at: &Rc<Node>,
        t_k: Option<f64>,
        tested: Tested,
    ) -> Self {
        let claim = claim_of(id).unwrap_or(id);
        let t_k = t_k.map(|t| (t, t));
        Finding {
            id: id.into(),
            claim: claim.into(),
            subject: subject.into(),
            at: Rc::clone(at),
            t_k,
            tested,
            sources: Vec::new(),
        }
    }
}

/// Where an assumption stands, for one reported value.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Status {
    Broken,
    Strained,
    Untested,
    Holds,
}

impl Status {
    pub fn word(self) -> &'static str {
        match self {
            Status::Broken => "broken",
            Status::Strained => "strained",
            Status::Untested => "untested",
            Status::Holds => "holds",
        }
    }
}

/// A judgement on one row.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Judgement {
    pub status: Status,
    /// Value with the assumption minus value of the better alternative, in SI units of the reported value.
    pub price: Option<f64>,
    /// Whether the price at the reported value is the first derivative times the price at the finding's node.
    pub first_order: bool,
}

/// A value as prices are worked out at it: with its history and its derivatives, each found once.
pub struct Reported {
    history: Vec<Rc<Node>>,
    derivatives: BTreeMap<u64, f64>,
    si: f64,
    id: u64,
}

impl Reported {
    pub fn of(node: &Rc<Node>) -> Self {
        let (si, id) = (node.si(), node.id());
        Reported { history: history(node), derivatives: derivatives(node), si, id }
    }

    /// Every node the value rests on, inputs before their users, itself last.
    pub fn history(&self) -> &[Rc<Node>] {
        &self.history
    }

    /// The derivative with respect to a node; 0 where the value does not rest on it.
    pub fn derivative(&self, id: u64) -> f64 {
        self.derivatives.get(&id).copied().unwrap_or(0.0)
    }

    /// What the value costs if some of its nodes should have been these, all at once, and whether that is to first order:
    /// recomputed through every step that can be, else by the derivatives.
    pub fn price(&self, better: &BTreeMap<u64, f64>) -> (f64, bool) {
        if let Some(instead) = replayed(&self.history, better).filter(|instead| instead.is_finite()) {
            return (self.si - instead, false);
        }
        let changed = self.history.iter().filter_map(|node| Some((node, better.get(&node.id())?)));
        (changed.map(|(node, si)| self.derivative(node.id()) * (node.si() - si)).sum(), true)
    }
}

/// The price and status, at a reported value, of findings that are one row: the same assumption about the same subject,
/// leaned on by several steps. All their better values are put in at once, so what cancels between the steps costs nothing.
/// `tolerance` is in SI units of the reported value.
pub fn judge(findings: &[Finding], reported: &Reported, tolerance: f64) -> Judgement {
    let (price, first_order) = row_price(findings, reported);
    let is_false = findings.iter().any(|finding| matches!(finding.tested, Tested::False { .. }));
    let status = match price {
        _ if is_false => Status::Broken,
        None => Status::Untested,
        Some(price) if price.abs() <= tolerance => Status::Holds,
        Some(_) => Status::Strained,
    };
    Judgement { status, price, first_order }
}

fn row_price(findings: &[Finding], reported: &Reported) -> (Option<f64>, bool) {
    let mut better = BTreeMap::new();
    let mut of_u = 0.0;
    for finding in findings {
        let at = &finding.at;
        match &finding.tested {
            Tested::True { .. } => {}
            Tested::Missing { .. } | Tested::False { value: None, .. } => return (None, false),
            Tested::Better { value, .. } | Tested::False { value: Some(value), .. } => {
                better.insert(at.id(), value.si());
            }
            Tested::Given { price, .. } => {
                better.insert(at.id(), at.si() - price);
            }
            Tested::Spread { price, .. } if at.id() == reported.id => of_u += price,
            Tested::Spread { .. } => return (None, false),
        }
    }
    if better.is_empty() {
        return (Some(of_u), false);
    }
    let (price, first_order) = reported.price(&better);
    (Some(price + of_u), first_order)
}

#[cfg(test)]
mod tests {
    use smallvec::{SmallVec, smallvec};

    use super::*;
    use crate::record::node::{Input, LeafKey, Operator, Origin};
    use crate::units::{Dimension, Kind};

    fn leaf(si: f64) -> Rc<Node> {
        let input = Input::of(LeafKey::Own(si.to_string().into()));
        Rc::new(Node::new(si, Dimension::none(), Kind::PLAIN, SmallVec::new(), Origin::Input(Box::new(input)), None))
    }

    #[test]
    fn a_price_is_the_value_with_the_assumption_minus_the_better_one() {
        let (at, better) = (leaf(3.0), leaf(2.0));
        let doubled = Node::new(
            6.0,
            Dimension::none(),
            Kind::PLAIN,
            smallvec![(Rc::clone(&at), 2.0)],
            Origin::Operator(Operator::Scale(2.0)),
            None,
        );
        let reported = Rc::new(doubled);
        let tested = Tested::Better { value: better, how: "computed".into() };
        let finding = Finding::known("ideal-gas", "CO2(g)", &at, None, tested);
        let judged = |tolerance| judge(std::slice::from_ref(&finding), &Reported::of(&reported), tolerance);
        assert_eq!(judged(1.9), Judgement { status: Status::Strained, price: Some(2.0), first_order: false });
        assert_eq!(judged(2.0).status, Status::Holds);
    }

    #[test]
    fn a_price_of_u_belongs_to_its_own_value_only() {
        let (at, other) = (leaf(3.0), leaf(6.0));
        let tested = Tested::Spread { price: -0.2, how: "drawn".into() };
        let finding = Finding::known("linear-propagation", "u", &at, None, tested);
        let judged = |value: &Rc<Node>| judge(std::slice::from_ref(&finding), &Reported::of(value), 0.1);
        assert_eq!((judged(&at).status, judged(&at).price), (Status::Strained, Some(-0.2)));
        assert_eq!((judged(&other).status, judged(&other).price), (Status::Untested, None));
    }

    #[test]
    fn steps_of_one_row_are_corrected_together() {
        // (3/2) with both steps better by 1: (2/1), where each alone would give 2/2 and 3/1.
        let (a, b) = (leaf(3.0), leaf(2.0));
        let inputs = smallvec![(Rc::clone(&a), 0.5), (Rc::clone(&b), -0.75)];
        let quotient = Node::new(1.5, Dimension::none(), Kind::PLAIN, inputs, Origin::Operator(Operator::Divide), None);
        let finding = |at: &Rc<Node>, si| {
            Finding::known("ideal-gas", "x", at, None, Tested::Better { value: leaf(si), how: "computed".into() })
        };
        let judged = judge(&[finding(&a, 2.0), finding(&b, 1.0)], &Reported::of(&Rc::new(quotient)), 1.0);
        assert_eq!(judged, Judgement { status: Status::Holds, price: Some(-0.5), first_order: false });
    }

    #[test]
    fn a_false_claim_is_broken_however_small_its_price_and_a_missing_test_never_holds() {
        let at = leaf(3.0);
        let finding = |tested| Finding::known("stable-phase", "H2O(l)", &at, None, tested);
        let broken = finding(Tested::False { why: "it boils".into(), value: Some(leaf(3.0)) });
        let missing = finding(Tested::Missing { what: "no vapour record".into() });
        assert_eq!(judge(&[broken], &Reported::of(&at), f64::INFINITY).status, Status::Broken);
        assert_eq!(judge(&[missing], &Reported::of(&at), f64::INFINITY).status, Status::Untested);
    }
}
