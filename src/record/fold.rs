//! Long runs of arithmetic, folded into one node, so that a loop of a million operations runs in bounded memory.
//!
//! A node that rests on a run of more than [`LONGEST`] operator nodes takes in place of its input that input's
//! [`Folded`] form: the same value, id, place and kind, as a linear form over whatever the run rested on. Values, sources
//! and sensitivities stay as they are; what is lost is the single steps. Three rules keep it honest:
//! - a value that someone holds (a variable, a list, an argument of a formula) stays in the history of what rests on it;
//!   at most its own long run is folded there;
//! - formula steps and inputs are never folded;
//! - a value in hand keeps its own full history: only what is computed from it later sees a folded form.
//!
//! The surprise: inputs that differ cannot be folded away, so a loop that types a new figure with a stated uncertainty in
//! each pass still grows by one input a pass, some 600 bytes. Only figures of the same text and place *without* a stated
//! uncertainty are taken together ([`LeafKey::Repeated`]), where nothing outside the run uses one of them. Values that feed
//! each other are folded each for itself, so that m of them cost up to m walks over what they share.

use std::collections::BTreeMap;
use std::rc::Rc;
use std::sync::Arc;

use smallvec::SmallVec;

use crate::fault::Place;
use crate::record::node::{Input, LeafKey, Node, Operator, Origin};
use crate::units::Entity;

/// The longest run of operator nodes that is kept step by step.
pub const LONGEST: u32 = 4096;

/// The shortest run that is folded; shorter ones between folded nodes keep their steps.
const WORTHWHILE: u32 = LONGEST / 2;

/// A run is looked at again after this many nodes of the thread, however short its longest chain: a run can be wide.
const SPAN: u64 = 16 * LONGEST as u64;

/// What became of a run of operator nodes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Folded {
    /// How many steps of arithmetic it was.
    pub steps: u64,
    /// Whether it may have been more: runs that share steps are counted so that none counts twice.
    pub at_least: bool,
    /// Whether every step was a sum or a bare factor, so that the linear form holds at any distance.
    pub linear: bool,
    /// Smallest id of the nodes it stands for.
    since: u64,
}

impl Folded {
    const NOTHING: Folded = Folded { steps: 0, at_least: false, linear: true, since: u64::MAX };
}

/// How much arithmetic a node rests on that may still be folded.
#[derive(Clone, Copy)]
pub(super) struct Run {
    /// Longest chain of operator nodes down to an input, a formula step or a folded node.
    chain: u32,
    /// Smallest id among them.
    since: u64,
    /// Whether any of it ends at a folded node.
    on_folded: bool,
}

impl Run {
    /// Of what is no arithmetic.
    pub(super) const NONE: Run = Run { chain: 0, since: u64::MAX, on_folded: false };
    const FOLDED: Run = Run { on_folded: true, ..Run::NONE };

    /// Of an operator node with these inputs.
    fn over(inputs: &[(Rc<Node>, f64)], id: u64) -> Run {
        let mut run = Run { since: id, ..Run::NONE };
        for (input, _) in inputs {
            let below = input.run().get();
            run.chain = run.chain.max(below.chain);
            run.since = run.since.min(below.since);
            run.on_folded |= below.on_folded;
        }
        run.chain += 1;
        run
    }

    fn is_long(self, id: u64) -> bool {
        self.chain >= LONGEST || id.saturating_sub(self.since) >= SPAN
    }
}

/// Puts the folded form in place of inputs that rest on long runs, and gives the run of the operator node `id` they are
/// the inputs of. Costs a constant per input, and a walk over the run once in `LONGEST` steps or more.
pub(super) fn shorten(inputs: &mut [(Rc<Node>, f64)], id: u64) -> Run {
    for (input, _) in inputs.iter_mut() {
        if input.run().get().is_long(id)
            && let Some(short) = short_of(input, 0)
        {
            *input = short;
        }
    }
    Run::over(inputs, id)
}

/// How deep short forms of held values are looked for below one another. Deeper ones stay as they are for now.
const DEPTH: u8 = 32;

/// The short form of a node that rests on a long run, itself or through values that someone holds; `None` where there is
/// nothing to shorten. A form is made once for a node and kept with it.
fn short_of(root: &Rc<Node>, depth: u8) -> Option<Rc<Node>> {
    if let Some(short) = root.short().get() {
        return Some(Rc::clone(short));
    }
    let form = Form::of(root);
    let finite = form.ends.iter().all(|end| end.partial.is_finite());
    let stands_for: Vec<Option<Rc<Node>>> = form.ends.iter().map(|end| short_end(end.node, root.id(), depth)).collect();
    let short = if form.nodes >= WORTHWHILE && finite {
        let (folded, bound) = (form.folded, form.bound);
        Rc::new(root.remade(Origin::Folded(Box::new(folded)), form.inputs(&stands_for), Run::FOLDED).with_bound(bound))
    } else if stands_for.iter().any(Option::is_some) {
        form.rebuilt(&stands_for)
    } else {
        // It is wide rather than long and most of it is held, or a derivative is past all numbers: not to be asked again
        // soon.
        root.run().set(Run { chain: form.nodes.min(WORTHWHILE), since: root.id(), ..root.run().get() });
        return None;
    };
    Some(Rc::clone(root.short().get_or_init(|| short)))
}

/// What stands for an end of a run, if not the end itself. A value in hand keeps its history, but through a short form
/// that others keep it would hold on to every pass of a loop it was once part of: two sums that feed each other would
/// each keep the other's past. So a held value that rests on a long run itself is taken in its short form there.
fn short_end(end: &Rc<Node>, id: u64, depth: u8) -> Option<Rc<Node>> {
    let run = end.run().get();
    let may = matches!(end.origin(), Origin::Operator(_)) && depth < DEPTH;
    let long = run.on_folded || run.chain >= WORTHWHILE || id.saturating_sub(run.since) >= SPAN / 2;
    if may && long { short_of(end, depth + 1) } else { None }
}

/// A run as a linear form over the nodes it ends at.
struct Form<'a> {
    ends: Vec<End<'a>>,
    /// The nodes walked over, users first, as long as they are few.
    few: Vec<&'a Rc<Node>>,
    /// How many nodes were walked over.
    nodes: u32,
    folded: Folded,
    /// From here up, older forms have counted the steps.
    counted_from: u64,
    bound: Option<Entity>,
}

struct End<'a> {
    node: &'a Rc<Node>,
    partial: f64,
    /// Uses of the node within the run.
    uses: usize,
}

impl<'a> Form<'a> {
    fn of(root: &'a Rc<Node>) -> Self {
        let folded = Folded::NOTHING;
        let mut form =
            Form { ends: Vec::new(), few: Vec::new(), nodes: 0, folded, counted_from: u64::MAX, bound: None };
        // Sorted by id. New entries belong near the end, where a place is cheap to find and to make: half the cost of a map.
        let mut pending = vec![End { node: root, partial: 1.0, uses: 0 }];
        // The largest id first: all users of a node have larger ids, so its partial is complete when it is taken out.
        while let Some(end) = pending.pop() {
            let open = end.node.id() == root.id() || !is_held(end.node);
            if !(open && form.takes(end.node)) {
                form.ends.push(end);
                continue;
            }
            if form.nodes < WORTHWHILE {
                form.few.push(end.node);
            }
            for (input, partial) in end.node.inputs() {
                let (at, known) = place_of(&pending, input.id());
                if !known {
                    pending.insert(at, End { node: input, partial: 0.0, uses: 0 });
                }
                pending[at].partial += end.partial * partial;
                pending[at].uses += 1;
            }
        }
        form.ends.reverse();
        form
    }

    /// Whether a node nobody holds becomes part of the run; counts it if so.
    fn takes(&mut self, node: &Node) -> bool {
        // One folded node can say of one entity that an open mole was taken for it.
        let binds_alike = self.bound.is_none() || node.bound().is_none_or(|entity| Some(entity) == self.bound);
        let part = match node.origin() {
            // That a temperature was chosen is read off this very node.
            Origin::Operator(Operator::Condition) => return false,
            Origin::Operator(operator) => {
                Folded { steps: 1, linear: is_linear(*operator), since: node.id(), ..Folded::NOTHING }
            }
            // An older form over many inputs stays as it is: to write it out anew each time would cost its length again.
            Origin::Folded(folded) if node.inputs().len() <= self.nodes as usize => **folded,
            _ => return false,
        };
        if binds_alike {
            self.bound = self.bound.or(node.bound());
            self.nodes = self.nodes.saturating_add(1);
            let maybe_counted = node.id() >= self.counted_from;
            if !maybe_counted {
                self.folded.steps += part.steps;
            }
            self.folded.at_least |= part.at_least || maybe_counted;
            self.folded.linear &= part.linear;
            self.folded.since = self.folded.since.min(part.since);
            if part.since < node.id() {
                self.counted_from = self.counted_from.min(part.since);
            }
        }
        binds_alike
    }

    /// The ends as inputs of one node: equal inputs once, and figures typed again and again taken together.
    fn inputs(self, stands_for: &[Option<Rc<Node>>]) -> SmallVec<[(Rc<Node>, f64); 2]> {
        let mut inputs: SmallVec<[(Rc<Node>, f64); 2]> = SmallVec::with_capacity(self.ends.len().min(64));
        let mut known: BTreeMap<&LeafKey, usize> = BTreeMap::new();
        let mut repeated: BTreeMap<(&Option<Place>, &Arc<str>), Repeated> = BTreeMap::new();
        for (end, short) in self.ends.iter().zip(stands_for) {
            let Some(input) = end.node.input() else {
                inputs.push((Rc::clone(short.as_ref().unwrap_or(end.node)), end.partial));
                continue;
            };
            if let Some(typed) = typed_again(end, input) {
                let all = repeated.entry((typed.place, typed.text)).or_insert_with(|| Repeated::new(end.node));
                all.add(end, &typed);
                continue;
            }
            match known.get(&input.key) {
                Some(&at) => inputs[at].1 += end.partial,
                None => {
                    known.insert(&input.key, inputs.len());
                    inputs.push((Rc::clone(end.node), end.partial));
                }
            }
        }
        inputs.extend(repeated.into_iter().map(|((place, _), repeated)| repeated.input(place.clone())));
        inputs
    }

    /// The same few steps over the short forms of the ends.
    fn rebuilt(&self, stands_for: &[Option<Rc<Node>>]) -> Rc<Node> {
        let short = |(end, short): (&End<'a>, &Option<Rc<Node>>)| Some((end.node.id(), Rc::clone(short.as_ref()?)));
        let mut made: BTreeMap<u64, Rc<Node>> = self.ends.iter().zip(stands_for).filter_map(short).collect();
        let mut last = Rc::clone(self.few[0]);
        for node in self.few.iter().rev() {
            let inputs = node.inputs().iter();
            let inputs = inputs.map(|(input, partial)| (Rc::clone(made.get(&input.id()).unwrap_or(input)), *partial));
            let inputs: SmallVec<[(Rc<Node>, f64); 2]> = inputs.collect();
            let run = match node.origin() {
                Origin::Operator(_) => Run::over(&inputs, node.id()),
                _ => Run::FOLDED,
            };
            last = Rc::new(node.remade(node.origin().clone(), inputs, run).with_bound(node.bound()));
            made.insert(node.id(), Rc::clone(&last));
        }
        last
    }
}

/// Where a node of that id stands in a list sorted by id, or belongs.
fn place_of(sorted: &[End<'_>], id: u64) -> (usize, bool) {
    match sorted.binary_search_by(|end| end.node.id().cmp(&id)) {
        Ok(at) => (at, true),
        Err(at) => (at, false),
    }
}

fn is_held(node: &Rc<Node>) -> bool {
    Rc::strong_count(node) > node.users() as usize
}

fn is_linear(operator: Operator) -> bool {
    use Operator::{Add, DivideBy, Mean, Negate, Scale, Shift, Subtract};
    matches!(operator, Add | Subtract | Negate | Scale(_) | DivideBy(_) | Shift(_) | Mean)
}

/// A typed figure that may be taken together with others of its place and text.
struct TypedAgain<'a> {
    place: &'a Option<Place>,
    text: &'a Arc<str>,
    first: u64,
    count: u64,
}

/// Without a stated uncertainty it matters only as a source, and when nothing outside the run uses it, nothing can
/// cancel against it.
fn typed_again<'a>(end: &End<'a>, input: &'a Input) -> Option<TypedAgain<'a>> {
    let (place, first, count) = match &input.key {
        LeafKey::Typed { place, ordinal } => (place, *ordinal, 1),
        LeafKey::Repeated { place, first, count } => (place, *first, *count),
        _ => return None,
    };
    let own = Rc::strong_count(end.node) == end.uses && input.u.is_none();
    own.then_some(TypedAgain { place, text: input.label.as_ref()?, first, count })
}

/// Figures of one place and text, taken together.
struct Repeated<'a> {
    model: &'a Rc<Node>,
    partial: f64,
    first: u64,
    count: u64,
    /// The coarsest of what one unit in the last digit of each is worth.
    worth: Option<f64>,
}

impl<'a> Repeated<'a> {
    fn new(model: &'a Rc<Node>) -> Self {
        Repeated { model, partial: 0.0, first: u64::MAX, count: 0, worth: None }
    }

    fn add(&mut self, end: &End<'a>, typed: &TypedAgain<'a>) {
        // The last one lends its id: forms over different spans of one loop then have inputs of different ids.
        self.model = end.node;
        self.partial += end.partial;
        self.first = self.first.min(typed.first);
        self.count += typed.count;
        let worth = end.node.input().and_then(|input| input.digit).map(|digit| (end.partial * digit).abs());
        self.worth =
            worth.into_iter().chain(self.worth).fold(None, |most, one| Some(most.map_or(one, |m: f64| m.max(one))));
    }

    fn input(self, place: Option<Place>) -> (Rc<Node>, f64) {
        let Some(one) = self.model.input().filter(|_| self.count > 1) else {
            return (Rc::clone(self.model), self.partial);
        };
        let key = LeafKey::Repeated { place, first: self.first, count: self.count };
        // The digits of the result are decided by the coarsest single figure, not by their sum.
        let digit = self.worth.filter(|_| self.partial != 0.0).map(|worth| worth / self.partial.abs());
        let input = Input { key, digit, ..one.clone() };
        let made = self.model.remade(Origin::Input(Box::new(input)), SmallVec::new(), Run::NONE);
        (Rc::new(made), self.partial)
    }
}

#[cfg(test)]
mod tests {
    use smallvec::smallvec;

    use super::*;
    use crate::record::node::{self, Step};
    use crate::record::spread::{Spread, sensitivities, spread};
    use crate::units::{Dimension, Kind};

    fn node(si: f64, inputs: &[(&Rc<Node>, f64)], origin: Origin) -> Rc<Node> {
        let inputs = inputs.iter().map(|(input, partial)| (Rc::clone(input), *partial)).collect();
        Rc::new(Node::new(si, Dimension::none(), Kind::PLAIN, inputs, origin, None))
    }

    fn leaf(key: LeafKey, u: Option<f64>, label: Option<&str>) -> Rc<Node> {
        let input = Input { u, digit: Some(0.1), label: label.map(Arc::from), ..Input::of(key) };
        node(2.0, &[], Origin::Input(Box::new(input)))
    }

    fn own(name: &str) -> Rc<Node> {
        leaf(LeafKey::Own(name.into()), Some(0.3), None)
    }

    fn add(a: &Rc<Node>, b: &Rc<Node>) -> Rc<Node> {
        node(a.si() + b.si(), &[(a, 1.0), (b, 1.0)], Origin::Operator(Operator::Add))
    }

    fn times(a: &Rc<Node>, b: &Rc<Node>) -> Rc<Node> {
        node(a.si() * b.si(), &[(a, b.si()), (b, a.si())], Origin::Operator(Operator::Multiply))
    }

    fn scale(a: &Rc<Node>, by: f64) -> Rc<Node> {
        node(a.si() * by, &[(a, by)], Origin::Operator(Operator::Scale(by)))
    }

    const PASSES: usize = 3 * LONGEST as usize;

    /// Steps folded away in the history of a node.
    fn folded_in(of: &Rc<Node>) -> u64 {
        let folded = |node: &Rc<Node>| if let Origin::Folded(folded) = node.origin() { folded.steps } else { 0 };
        node::history(of).iter().map(folded).sum()
    }

    #[test]
    fn a_long_sum_is_a_short_history_with_the_same_value_sensitivities_and_steps() {
        let (a, start) = (own("a"), own("start"));
        let mut s = Rc::clone(&start);
        let mut si = start.si();
        for _ in 0..PASSES {
            s = add(&s, &scale(&a, 2.0));
            si += 2.0 * a.si();
        }
        assert_eq!(s.si().to_bits(), si.to_bits());
        let history = node::history(&s);
        assert!(history.len() < 2 * LONGEST as usize, "{} nodes", history.len());
        assert!(history.iter().all(|node| !matches!(node.origin(), Origin::Folded(folded) if folded.at_least)));
        let kept = history.iter().filter(|node| matches!(node.origin(), Origin::Operator(_))).count();
        assert_eq!(folded_in(&s) + kept as u64, 2 * PASSES as u64);
        let partials: Vec<f64> = sensitivities(&s).iter().map(|s| s.derivative).collect();
        // Whole numbers below 2^53: their sums are exact in any order.
        assert_eq!(partials, [2.0 * PASSES as f64, 1.0]);
    }

    #[test]
    fn what_someone_holds_is_not_folded_away_and_keeps_its_own_history() {
        let a = own("a");
        let mut s = own("start");
        let mut held = Vec::new();
        for pass in 0..PASSES {
            s = add(&s, &a);
            if pass % 1000 == 500 {
                held.push(Rc::clone(&s));
            }
        }
        let history = node::history(&s);
        for kept in &held {
            assert!(history.iter().any(|node| Rc::ptr_eq(node, kept)), "a value in a list is gone from the history");
            assert!(!matches!(kept.origin(), Origin::Folded(_)));
        }
        assert_eq!(folded_in(&s), 0, "no run between held values is longer than the limit");
    }

    #[test]
    fn a_value_at_hand_serves_many_later_steps_by_one_folded_form() {
        let a = own("a");
        let mut s = own("start");
        for _ in 0..LONGEST {
            s = add(&s, &a);
        }
        let (first, second) = (scale(&s, 2.0), scale(&s, 3.0));
        assert!(Rc::ptr_eq(&first.inputs()[0].0, &second.inputs()[0].0));
        assert_eq!(first.inputs()[0].0.id(), s.id());
        assert_eq!(folded_in(&s), 0);
        assert_eq!(folded_in(&first), u64::from(LONGEST));
        // Old and new forms of one value are one value.
        let gap = node(0.0, &[(&s, 1.0), (&first.inputs()[0].0, -1.0)], Origin::Operator(Operator::Subtract));
        assert_eq!(spread(&gap), Spread::Full(0.0));
    }

    /// Derivative with respect to the input of that name.
    fn by(of: &Rc<Node>, name: &str) -> f64 {
        let key = LeafKey::Own(name.into());
        sensitivities(of).iter().find(|s| s.input().unwrap().key == key).map_or(0.0, |s| s.derivative)
    }

    #[test]
    fn values_that_feed_each_other_are_folded_although_each_is_held_in_turn() {
        let (k, mut x, mut v) = (own("k"), own("x"), own("v"));
        // Second route: the same derivatives carried forward as plain numbers.
        let (mut dx, mut dv) = ([1.0, 0.0, 0.0], [0.0, 1.0, 0.0]);
        for pass in 0..4 * PASSES {
            let push = times(&x, &k);
            for (i, dv) in dv.iter_mut().enumerate() {
                *dv -= 1e-3 * (dx[i] * k.si() + if i == 2 { x.si() } else { 0.0 });
            }
            v = add(&v, &scale(&push, -1e-3));
            x = add(&x, &scale(&v, 1e-3));
            dx.iter_mut().zip(dv).for_each(|(dx, dv)| *dx += 1e-3 * dv);
            if pass % PASSES == 0 {
                let nodes = node::history(&x).len();
                assert!(nodes < 8 * LONGEST as usize, "{nodes} nodes after {pass} passes");
            }
        }
        let folded = node::history(&x).iter().find_map(|node| match node.origin() {
            Origin::Folded(folded) => Some(**folded),
            _ => None,
        });
        // Each of the two stands for steps of the other, so that only a bound on their number is known.
        assert!(folded.is_some_and(|folded| folded.at_least && folded.steps <= 5 * 4 * PASSES as u64));
        for (name, wanted) in ["x", "v", "k"].into_iter().zip(dx) {
            let got = by(&x, name);
            // Bound: about 1e5 sums of rounding 1e-16 each, in another order.
            assert!((got - wanted).abs() <= 1e-9 * wanted.abs(), "{name}: {got} {wanted}");
        }
    }

    #[test]
    fn an_iteration_with_a_held_value_and_temporaries_of_it_is_folded() {
        let (a, mut x) = (own("a"), own("x"));
        for _ in 0..PASSES {
            let ratio = node(
                a.si() / x.si(),
                &[(&a, 1.0 / x.si()), (&x, -a.si() / (x.si() * x.si()))],
                Origin::Operator(Operator::Divide),
            );
            x = scale(&add(&x, &ratio), 0.5);
        }
        let nodes = node::history(&x).len();
        assert!(nodes < 4 * LONGEST as usize, "{nodes} nodes");
        // The square root of a: its derivative is 1/(2x).
        assert!((by(&x, "a") - 0.5 / x.si()).abs() < 1e-15);
    }

    #[test]
    fn a_held_value_of_few_steps_keeps_them_below_something_folded() {
        let a = own("a");
        let mut s = own("start");
        for _ in 0..=LONGEST {
            s = add(&s, &a);
        }
        let named = scale(&times(&s, &a), 0.5);
        let mut t = Rc::clone(&named);
        for _ in 0..2 * LONGEST {
            t = add(&t, &a);
        }
        let history = node::history(&t);
        let again = history.iter().find(|node| node.id() == named.id()).unwrap();
        assert!(matches!(again.origin(), Origin::Operator(Operator::Scale(_))));
        assert_eq!(by(again, "a").to_bits(), by(&named, "a").to_bits());
    }

    #[test]
    fn a_wide_run_is_folded_although_no_chain_in_it_is_long() {
        let a = own("a");
        let mut s = own("start");
        for _ in 0..400 {
            let mut inner = scale(&a, 1.0);
            for _ in 0..400 {
                inner = add(&inner, &a);
            }
            s = add(&s, &inner);
        }
        let history = node::history(&s).len();
        assert!(history < 2 * SPAN as usize && folded_in(&s) > SPAN, "{history} nodes");
        let by_a =
            sensitivities(&s).iter().find(|s| s.input().unwrap().key == LeafKey::Own("a".into())).unwrap().derivative;
        assert_eq!(by_a, 400.0 * 401.0);
    }

    #[test]
    fn replay_passes_a_linear_run_and_stops_at_another() {
        let run = |step: fn(&Rc<Node>, &Rc<Node>) -> Rc<Node>| {
            let (x, a) = (own("x"), own("a"));
            let mut s = Rc::clone(&x);
            for _ in 0..=LONGEST {
                s = step(&s, &a);
            }
            assert!(folded_in(&s) > 0);
            (x, s)
        };
        let replayed = |of: &Rc<Node>, changed: &Rc<Node>, si: f64| {
            node::replayed(&node::history(of), &BTreeMap::from([(changed.id(), si)]))
        };
        let (x, sum) = run(add);
        assert_eq!(replayed(&sum, &x, x.si() + 5.0), Some(sum.si() + 5.0));
        let (x, product) = run(|s, a| scale(&times(s, a), 0.5));
        assert_eq!(replayed(&product, &x, x.si() + 5.0), None);
    }

    struct Formula(Rc<Node>);

    impl Step for Formula {
        fn name(&self) -> &'static str {
            "formula"
        }

        fn take_arguments(&mut self) -> Vec<Rc<Node>> {
            Vec::new()
        }

        fn does(&self) -> String {
            "a formula".to_owned()
        }

        fn source(&self) -> &str {
            "invented for this test"
        }

        fn arguments(&self) -> Vec<Rc<Node>> {
            vec![Rc::clone(&self.0)]
        }

        fn as_any(&self) -> &dyn std::any::Any {
            self
        }
    }

    #[test]
    fn formula_steps_and_what_open_moles_were_taken_for_outlast_folding() {
        let a = own("a");
        let formula = node(7.0, &[(&a, 3.0)], Origin::Step(Rc::new(Formula(Rc::clone(&a)))));
        let mut s = Rc::clone(&formula);
        for _ in 0..=LONGEST {
            let sum = Node::new(
                s.si() + a.si(),
                Dimension::none(),
                Kind::PLAIN,
                smallvec![(Rc::clone(&s), 1.0), (Rc::clone(&a), 1.0)],
                Origin::Operator(Operator::Add),
                None,
            );
            s = Rc::new(sum.with_bound(Some(Entity::named("CH4"))));
        }
        let history = node::history(&s);
        assert!(history.iter().any(|node| Rc::ptr_eq(node, &formula)));
        let folded = history.iter().find(|node| matches!(node.origin(), Origin::Folded(_))).unwrap();
        assert_eq!(folded.bound(), Some(Entity::named("CH4")));
    }

    fn typed(ordinal: u64, u: Option<f64>) -> Rc<Node> {
        let place = Some(Place { cell: "cell-1".into(), line: 2, column: 9 });
        leaf(LeafKey::Typed { place, ordinal }, u, Some("2.0 kJ"))
    }

    #[test]
    fn one_text_typed_again_and_again_without_u_is_one_input_with_a_count() {
        let (mut s, held) = (typed(0, None), typed(1, None));
        s = add(&s, &held);
        for ordinal in 2..=u64::from(LONGEST) + 1 {
            s = add(&s, &typed(ordinal, None));
        }
        let all = sensitivities(&s);
        let counts: Vec<(u64, f64)> = all
            .iter()
            .filter_map(|s| match s.input()?.key {
                LeafKey::Repeated { count, .. } => Some((count, s.derivative)),
                _ => None,
            })
            .collect();
        let [(count, derivative)] = counts[..] else { panic!("{counts:?}") };
        assert_eq!(count as f64, derivative);
        let total: f64 = all.iter().map(|s| s.derivative).sum();
        assert_eq!(total, f64::from(LONGEST) + 2.0);
        // The one that is held stays an input of its own, so that a later difference can cancel against it.
        assert!(all.iter().any(|s| s.input().unwrap().key == held.input().unwrap().key));
        // A digit of one of them still decides what is shown.
        let worth = all.iter().map(|s| s.derivative * s.input().unwrap().digit.unwrap());
        assert!(worth.into_iter().all(|worth| (worth - 0.1).abs() < 1e-12));
    }

    #[test]
    fn figures_with_a_stated_uncertainty_stay_inputs_of_their_own() {
        let mut s = typed(0, Some(0.5));
        for ordinal in 1..=2 * u64::from(LONGEST) {
            s = add(&s, &typed(ordinal, Some(0.5)));
        }
        assert!(folded_in(&s) > 0);
        let Spread::Full(u) = spread(&s) else { panic!("every input states its uncertainty") };
        // Independent evaluations: u grows with the root of their number.
        let wanted = 0.5 * f64::sqrt(2.0 * f64::from(LONGEST) + 1.0);
        assert!((u / wanted - 1.0).abs() < 1e-12, "{u} {wanted}");
    }
}
