//! Assumptions: what a value rests on, how each was tested, and what it costs.
//!
//! A [`Finding`] is the outcome of a test, bound to the node whose formula leaned on the assumption. Its price at a
//! *reported* value, and so its status, is worked out when that value is reported: [`judge`]. The surprise: a status is
//! never stored, since it depends on the value asked for and on the tolerance in force.

use std::rc::Rc;

use crate::record::node::{Node, replayed};
use crate::record::spread::derivative;
use crate::source::Citation;

/// Every assumption the program knows, with its claim in words. Ids are fixed: notebooks and seals hold them.
pub const CLAIMS: &[(&str, &str)] = &[
    ("constant-heat-capacity", "the heat capacities change too little with temperature to matter"),
    ("stable-phase", "each species is in the stable phase of its composition at this temperature and pressure"),
    ("ideal-gas", "the gases are ideal"),
    ("condensed-volume-neglected", "the volume of liquids and solids is too small to matter"),
    ("formation-dataset", "the formation enthalpies of this dataset are the ones to use"),
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

/// The price and status, at a reported value, of findings that are one row: the same assumption about the same subject,
/// leaned on by several steps. Their prices add up, and what cancels between the steps costs nothing. `tolerance` is in SI
/// units of the reported value.
pub fn judge(findings: &[Finding], reported: &Rc<Node>, tolerance: f64) -> Judgement {
    let prices: Vec<(Option<f64>, bool)> = findings.iter().map(|finding| price_at(finding, reported)).collect();
    let price: Option<f64> = prices.iter().map(|(price, _)| *price).sum();
    let is_false = findings.iter().any(|finding| matches!(finding.tested, Tested::False { .. }));
    let status = match price {
        _ if is_false => Status::Broken,
        None => Status::Untested,
        Some(price) if price.abs() <= tolerance => Status::Holds,
        Some(_) => Status::Strained,
    };
    Judgement { status, price, first_order: prices.iter().any(|(_, first_order)| *first_order) }
}

fn price_at(finding: &Finding, reported: &Rc<Node>) -> (Option<f64>, bool) {
    match &finding.tested {
        Tested::True { .. } => (Some(0.0), false),
        Tested::Missing { .. } | Tested::False { value: None, .. } => (None, false),
        Tested::Given { price, .. } => {
            (Some(price * derivative(reported, finding.at.id())), finding.at.id() != reported.id())
        }
        Tested::Better { value, .. } | Tested::False { value: Some(value), .. } => {
            price_of(reported, &finding.at, value.si())
        }
    }
}

/// What the reported value costs if the node `at` should have been `better`, and whether that is first order only.
pub fn price_of(reported: &Rc<Node>, at: &Node, better: f64) -> (Option<f64>, bool) {
    if at.id() == reported.id() {
        return (Some(reported.si() - better), false);
    }
    match replayed(reported, at.id(), better) {
        Some(instead) => (Some(reported.si() - instead), false),
        None => (Some(derivative(reported, at.id()) * (at.si() - better)), true),
    }
}

#[cfg(test)]
mod tests {
    use smallvec::{SmallVec, smallvec};

    use super::*;
    use crate::record::node::{Input, LeafKey, Operator, Origin};
    use crate::units::{Dimension, Kind};

    fn leaf(si: f64) -> Rc<Node> {
        let input =
            Input { key: LeafKey::Own(si.to_string().into()), u: None, digit: None, label: None, citation: None };
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
        let judged = |tolerance| judge(std::slice::from_ref(&finding), &reported, tolerance);
        assert_eq!(judged(1.9), Judgement { status: Status::Strained, price: Some(2.0), first_order: false });
        assert_eq!(judged(2.0).status, Status::Holds);
    }

    #[test]
    fn a_false_claim_is_broken_however_small_its_price_and_a_missing_test_never_holds() {
        let at = leaf(3.0);
        let finding = |tested| Finding::known("stable-phase", "H2O(l)", &at, None, tested);
        let broken = finding(Tested::False { why: "it boils".into(), value: Some(leaf(3.0)) });
        let missing = finding(Tested::Missing { what: "no vapour record".into() });
        assert_eq!(judge(&[broken], &at, f64::INFINITY).status, Status::Broken);
        assert_eq!(judge(&[missing], &at, f64::INFINITY).status, Status::Untested);
    }
}
