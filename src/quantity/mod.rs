//! A number that can be defended: value, dimension with basis, kind, and the node saying where it came from.
//!
//! Values are SI inside; units matter only where text comes in or goes out. There is no `==`: ask
//! [`Quantity::agrees`], which knows about correlation, or compare bits in an audit.

pub mod arith;
pub mod meaning;
pub mod mismatch;
pub mod round;
pub mod text;

use std::rc::Rc;
use std::sync::Arc;

use smallvec::SmallVec;

use crate::fault::Place;
use crate::record::node::{Input, Node, Origin, Step};
use crate::record::spread::{self, Sensitivity, Spread};
use crate::units::{Dimension, Kind, Unit, What, parse, unit_for};

pub use mismatch::Mismatch;

/// Relative rounding error of a value that took a few dozen operations in double precision.
const ROUNDING: f64 = 64.0 * f64::EPSILON;

/// A value in SI units with its history. Invariant: finite; every constructor refuses NaN and infinity.
#[derive(Clone)]
pub struct Quantity {
    node: Rc<Node>,
    /// The unit someone wrote or asked for; only for display.
    unit: Option<Arc<Unit>>,
}

impl Quantity {
    /// An input, such as a figure of a table. `si` must be finite.
    pub fn input(si: f64, dim: Dimension, kind: Kind, input: Input, place: Option<Place>) -> Result<Self, Mismatch> {
        Quantity::from_node(Node::new(si, dim, kind, SmallVec::new(), Origin::Input(Box::new(input)), place))
    }

    /// The result of a formula.
    pub fn from_step(
        si: f64,
        dim: Dimension,
        kind: Kind,
        inputs: SmallVec<[(Rc<Node>, f64); 2]>,
        step: Rc<dyn Step>,
        place: Option<Place>,
    ) -> Result<Self, Mismatch> {
        Quantity::from_node(Node::new(si, dim, kind, inputs, Origin::Step(step), place))
    }

    pub(crate) fn from_node(node: Node) -> Result<Self, Mismatch> {
        if !node.si().is_finite() {
            return Err(Mismatch::NotFinite);
        }
        Ok(Quantity { node: Rc::new(node), unit: None })
    }

    /// The same input with more said of it; values that were computed are left as they are.
    #[must_use]
    pub fn with_input(self, say: impl FnOnce(&mut Input)) -> Self {
        let Some(mut input) = self.node.input().cloned() else { return self };
        say(&mut input);
        let (si, dim, kind, place) = (self.si(), self.dim().clone(), self.kind().clone(), self.node.place().cloned());
        let node = Node::new(si, dim, kind, SmallVec::new(), Origin::Input(Box::new(input)), place);
        Quantity { node: Rc::new(node), unit: self.unit }
    }

    /// A reading of an existing node, without a unit of its own.
    pub fn of_node(node: Rc<Node>) -> Self {
        Quantity { node, unit: None }
    }

    #[must_use]
    pub fn in_unit(mut self, unit: Option<Arc<Unit>>) -> Self {
        self.unit = unit;
        self
    }

    pub fn si(&self) -> f64 {
        self.node.si()
    }

    pub fn dim(&self) -> &Dimension {
        self.node.dim()
    }

    pub fn kind(&self) -> &Kind {
        self.node.kind()
    }

    pub fn node(&self) -> &Rc<Node> {
        &self.node
    }

    /// The unit this value is shown in: the one asked for, else the trade's usual one for the dimension.
    pub fn unit(&self) -> Arc<Unit> {
        self.unit.clone().unwrap_or_else(|| Arc::new(unit_for(self.dim())))
    }

    pub(crate) fn written_unit(&self) -> Option<&Arc<Unit>> {
        self.unit.as_ref()
    }

    pub fn spread(&self) -> Spread {
        spread::spread(&self.node)
    }

    pub fn sensitivities(&self) -> Vec<Sensitivity> {
        spread::sensitivities(&self.node)
    }

    /// Whether the difference is zero within `k` standard uncertainties of the difference itself; that of the logarithms for
    /// two equilibrium constants, whose uncertainty is symmetric there.
    ///
    /// # Errors
    /// The two cannot be subtracted, or nothing is stated about the uncertainty of their difference.
    pub fn agrees(&self, other: &Quantity, k: f64) -> Result<bool, Mismatch> {
        let logarithms = self.kind().what == What::K && other.kind().what == What::K;
        let gap = if logarithms { self.ln(None)?.minus(&other.ln(None)?, None)? } else { self.minus(other, None)? };
        match gap.spread().u() {
            // Two ways of computing one value differ by rounding, which no uncertainty covers.
            Some(u) => Ok(gap.si().abs() <= k * u + ROUNDING * (self.si().abs() + other.si().abs())),
            None => Err(Mismatch::AgreementWithoutUncertainty),
        }
    }

    /// The same value to be shown in another unit.
    ///
    /// # Errors
    /// The unit measures something else, or the value is a temperature difference and the unit a point.
    pub fn to(&self, unit: Unit) -> Result<Quantity, Mismatch> {
        if *self.dim() != unit.dim {
            // An open mole takes the basis of the unit asked for, and the value remembers it; a unit with an open mole is
            // short for the value's own basis: `dH.to("kcal_th/mol")`.
            return match (self.dim().bindings_to(&unit.dim).as_slice(), unit.dim.bindings_to(self.dim()).as_slice()) {
                ([entity], _) => self.bound(*entity, None)?.to(unit),
                (_, [entity]) => self.to(parse::bound(&unit, *entity)?),
                _ => Err(Mismatch::unit(self.dim(), &unit)),
            };
        }
        if unit.is_point() && self.kind().what == What::TemperatureDifference {
            return Err(Mismatch::DifferenceAsPoint { difference_k: self.si(), unit: unit.text.to_string() });
        }
        Ok(Quantity { node: Rc::clone(&self.node), unit: Some(Arc::new(unit)) })
    }
}

/// For messages and debug output: the value as shown, without its history.
impl std::fmt::Debug for Quantity {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(f, "{}", text::shown(self))
    }
}
