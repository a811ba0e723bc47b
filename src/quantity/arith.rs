//! Arithmetic on quantities, each step with its partial derivatives.
//!
//! Every operation checks dimension and kind, computes in SI units and makes one node. An open mole that meets a named
//! one is bound here, and the node remembers it, so that the register can say so.

use std::rc::Rc;
use std::sync::Arc;

use smallvec::SmallVec;

use crate::fault::Place;
use crate::num::math;
use crate::quantity::{Mismatch, Quantity};
use crate::record::node::{Node, Operator, Origin};
use crate::units::{Dimension, Entity, Kind, Unit, What};

struct Meeting<'a> {
    dim: &'a Dimension,
    bound: Option<Entity>,
}

/// The common dimension of two values that are to be added or compared.
fn meet<'a>(verb: &'static str, left: &'a Dimension, right: &'a Dimension) -> Result<Meeting<'a>, Mismatch> {
    if left == right {
        return Ok(Meeting { dim: left, bound: None });
    }
    for (open, named) in [(left, right), (right, left)] {
        match open.bindings_to(named).as_slice() {
            [] => {}
            [entity] => return Ok(Meeting { dim: named, bound: Some(*entity) }),
            [first, second, ..] => {
                return Err(Mismatch::OpenMole { first: first.name(), second: second.name() });
            }
        }
    }
    Err(Mismatch::between(verb, left, right))
}

impl Quantity {
    pub fn plus(&self, other: &Quantity, place: Option<Place>) -> Result<Quantity, Mismatch> {
        self.sum(other, false, place)
    }

    pub fn minus(&self, other: &Quantity, place: Option<Place>) -> Result<Quantity, Mismatch> {
        self.sum(other, true, place)
    }

    fn sum(&self, other: &Quantity, minus: bool, place: Option<Place>) -> Result<Quantity, Mismatch> {
        let (verb, operator, sign) =
            if minus { ("subtract", Operator::Subtract, -1.0) } else { ("add", Operator::Add, 1.0) };
        let Meeting { dim, bound } = meet(verb, self.dim(), other.dim())?;
        let kind = Kind::sum(self.kind(), other.kind(), minus, (self.si(), other.si()))?;
        // A difference of two points in degC is shown in K: the unit of a point would be refused.
        let unit = self.written_unit().or(other.written_unit());
        let unit = unit.filter(|unit| unit.dim == *dim && (!unit.is_point() || kind.what == What::TemperaturePoint));
        let made = combine(operator, [(self, 1.0), (other, sign)], dim.clone(), kind, place, bound)?;
        Ok(made.in_unit(unit.cloned()))
    }

    pub fn times(&self, other: &Quantity, place: Option<Place>) -> Result<Quantity, Mismatch> {
        let dim = self.dim().times(other.dim());
        let kind = Kind::product((self.kind(), self.dim()), (other.kind(), other.dim()), &dim, (self.si(), other.si()));
        let inputs = [(self, other.si()), (other, self.si())];
        let unit = carried(self, &dim).or_else(|| carried(other, &dim));
        Ok(combine(Operator::Multiply, inputs, dim, kind, place, None)?.in_unit(unit))
    }

    pub fn over(&self, other: &Quantity, place: Option<Place>) -> Result<Quantity, Mismatch> {
        let dim = self.dim().over(other.dim());
        let kind = Kind::quotient((self.kind(), self.dim()), (other.kind(), other.dim()), &dim);
        let (a, b) = (self.si(), other.si());
        let inputs = [(self, 1.0 / b), (other, -a / (b * b))];
        let unit = carried(self, &dim);
        Ok(combine(Operator::Divide, inputs, dim, kind, place, None)?.in_unit(unit))
    }

    pub fn negated(&self, place: Option<Place>) -> Result<Quantity, Mismatch> {
        let kind = self.kind().negated(self.si())?;
        let unit = self.written_unit().cloned();
        Ok(self.unary(Operator::Negate, -1.0, self.dim().clone(), kind, place)?.in_unit(unit))
    }

    /// Times a bare number.
    pub fn scaled(&self, factor: f64, place: Option<Place>) -> Result<Quantity, Mismatch> {
        let kind = self.kind().scaled(self.dim());
        let unit = carried(self, self.dim());
        Ok(self.unary(Operator::Scale(factor), factor, self.dim().clone(), kind, place)?.in_unit(unit))
    }

    /// Divided by a bare number.
    pub fn divided(&self, divisor: f64, place: Option<Place>) -> Result<Quantity, Mismatch> {
        let kind = self.kind().scaled(self.dim());
        let unit = carried(self, self.dim());
        let made = self.unary(Operator::DivideBy(divisor), 1.0 / divisor, self.dim().clone(), kind, place)?;
        Ok(made.in_unit(unit))
    }

    /// To the power of another value, both pure numbers; an exponent that is exact may have any base that `power` takes.
    pub fn power_of(&self, exponent: &Quantity, place: Option<Place>) -> Result<Quantity, Mismatch> {
        let (a, b) = (self.si(), exponent.si());
        if !exponent.dim().is_none() {
            return Err(Mismatch::NotPure { function: "an exponent", dim: exponent.dim().clone() });
        }
        if exponent.sensitivities().is_empty() {
            return self.power(b, place);
        }
        if !self.dim().is_none() {
            return Err(Mismatch::Exponent { exponent: b, dim: self.dim().clone() });
        }
        if a <= 0.0 {
            return Err(Mismatch::NotPositive { function: "an uncertain power", number: a });
        }
        let power = math::pow(a, b);
        let inputs = [(self, b * math::pow(a, b - 1.0)), (exponent, power * math::ln(a))];
        combine(Operator::PowerOf, inputs, Dimension::none(), Kind::PLAIN, place, None)
    }

    /// The same value with its open moles made moles of `entity`, and the node remembers it.
    pub(crate) fn bound(&self, entity: Entity, place: Option<Place>) -> Result<Quantity, Mismatch> {
        let dim = self.dim().bind(entity);
        combine(Operator::Scale(1.0), [(self, 1.0)], dim, self.kind().clone(), place, Some(entity))
    }

    /// Plus a bare number; the value must be a pure number.
    pub fn shifted(&self, by: f64, place: Option<Place>) -> Result<Quantity, Mismatch> {
        if !self.dim().is_none() {
            return Err(Mismatch::between("add", self.dim(), &Dimension::none()));
        }
        self.unary(Operator::Shift(by), 1.0, Dimension::none(), Kind::PLAIN, place)
    }

    /// A bare number divided by the value.
    pub fn reciprocal(&self, numerator: f64, place: Option<Place>) -> Result<Quantity, Mismatch> {
        let dim = Dimension::none().over(self.dim());
        let partial = -numerator / (self.si() * self.si());
        let kind = Kind::bare(&dim);
        self.unary(Operator::Reciprocal(numerator), partial, dim, kind, place)
    }

    /// To a bare power; whole and half powers of units only.
    pub fn power(&self, exponent: f64, place: Option<Place>) -> Result<Quantity, Mismatch> {
        let halves = 2.0 * exponent;
        let refused = || Mismatch::Exponent { exponent, dim: self.dim().clone() };
        let dim = if self.dim().is_none() {
            Dimension::none()
        } else if halves.fract() == 0.0 && halves.abs() < 64.0 {
            self.dim().powered(halves as i32).ok_or_else(refused)?
        } else {
            return Err(refused());
        };
        let partial = exponent * math::pow(self.si(), exponent - 1.0);
        let kind = if exponent == 1.0 { self.kind().clone() } else { Kind::bare(&dim) };
        self.unary(Operator::Power(exponent), partial, dim, kind, place)
    }

    pub fn exp(&self, place: Option<Place>) -> Result<Quantity, Mismatch> {
        let of = self.pure("exp")?;
        of.unary(Operator::Exp, math::exp(self.si()), Dimension::none(), Kind::PLAIN, place)
    }

    pub fn ln(&self, place: Option<Place>) -> Result<Quantity, Mismatch> {
        let of = self.pure("ln")?;
        if self.si() <= 0.0 {
            return Err(Mismatch::NotPositive { function: "ln", number: self.si() });
        }
        of.unary(Operator::Ln, 1.0 / self.si(), Dimension::none(), Kind::PLAIN, place)
    }

    pub fn sin(&self, place: Option<Place>) -> Result<Quantity, Mismatch> {
        let of = self.pure("sin")?;
        of.unary(Operator::Sin, math::cos(self.si()), Dimension::none(), Kind::PLAIN, place)
    }

    pub fn cos(&self, place: Option<Place>) -> Result<Quantity, Mismatch> {
        let of = self.pure("cos")?;
        of.unary(Operator::Cos, -math::sin(self.si()), Dimension::none(), Kind::PLAIN, place)
    }

    pub fn tan(&self, place: Option<Place>) -> Result<Quantity, Mismatch> {
        let of = self.pure("tan")?;
        let tangent = math::tan(self.si());
        of.unary(Operator::Tan, 1.0 + tangent * tangent, Dimension::none(), Kind::PLAIN, place)
    }

    pub fn absolute(&self, place: Option<Place>) -> Result<Quantity, Mismatch> {
        let partial = if self.si() < 0.0 { -1.0 } else { 1.0 };
        let unit = self.written_unit().cloned();
        Ok(self.unary(Operator::Absolute, partial, self.dim().clone(), self.kind().clone(), place)?.in_unit(unit))
    }

    /// The mean of several values of one dimension; a mean of temperature points is a point.
    pub fn mean(values: &[Quantity], place: Option<Place>) -> Result<Quantity, Mismatch> {
        let Some((first, rest)) = values.split_first() else { return Err(Mismatch::NotFinite) };
        let (mut dim, mut bound, mut kind) = (first.dim().clone(), None, first.kind().clone());
        for other in rest {
            let meeting = meet("average", &dim, other.dim())?;
            (bound, dim) = (meeting.bound.or(bound), meeting.dim.clone());
            let other = other.kind();
            kind = match (kind.what, other.what) {
                (What::TemperaturePoint, What::TemperaturePoint | What::OpenTemperature) => kind,
                (What::OpenTemperature, What::TemperaturePoint) => other.clone(),
                _ => Kind::mean(&kind, other)?,
            };
        }
        let weight = 1.0 / values.len() as f64;
        let inputs = values.iter().map(|value| (Rc::clone(value.node()), weight)).collect();
        let unit = first.written_unit().filter(|unit| unit.dim == dim).cloned();
        let si = Operator::Mean.value(&values.iter().map(Quantity::si).collect::<Vec<f64>>());
        Ok(made(Operator::Mean, si, inputs, dim, kind, place, bound)?.in_unit(unit))
    }

    /// Which is larger, for values of one dimension; by value alone.
    pub fn compared(&self, other: &Quantity) -> Result<std::cmp::Ordering, Mismatch> {
        meet("compare", self.dim(), other.dim())?;
        Kind::sum(self.kind(), other.kind(), true, (self.si(), other.si()))?;
        Ok(self.si().total_cmp(&other.si()))
    }

    /// The value as a pure number: as it is, or with an open mole bound to the one entity that makes it pure.
    fn pure(&self, function: &'static str) -> Result<Quantity, Mismatch> {
        if self.dim().is_none() {
            return Ok(self.clone());
        }
        match self.dim().bindings_to(&Dimension::none()).as_slice() {
            [entity] => self.bound(*entity, None),
            _ => Err(Mismatch::NotPure { function, dim: self.dim().clone() }),
        }
    }

    fn unary(
        &self,
        operator: Operator,
        partial: f64,
        dim: Dimension,
        kind: Kind,
        place: Option<Place>,
    ) -> Result<Quantity, Mismatch> {
        combine(operator, [(self, partial)], dim, kind, place, None)
    }
}

/// The written unit, where multiplying left the dimension as it was and the unit is no temperature scale.
fn carried(from: &Quantity, dim: &Dimension) -> Option<Arc<Unit>> {
    from.written_unit().filter(|unit| unit.dim == *dim && !unit.is_point()).cloned()
}

/// The result of an operator on one or two values, each with its partial derivative.
fn combine<const N: usize>(
    operator: Operator,
    inputs: [(&Quantity, f64); N],
    dim: Dimension,
    kind: Kind,
    place: Option<Place>,
    bound: Option<Entity>,
) -> Result<Quantity, Mismatch> {
    let si = operator.value(&inputs.map(|(value, _)| value.si()));
    let mut kept = SmallVec::new();
    for (value, partial) in inputs {
        kept.push((Rc::clone(value.node()), partial));
    }
    made(operator, si, kept, dim, kind, place, bound)
}

fn made(
    operator: Operator,
    si: f64,
    inputs: SmallVec<[(Rc<Node>, f64); 2]>,
    dim: Dimension,
    kind: Kind,
    place: Option<Place>,
    bound: Option<Entity>,
) -> Result<Quantity, Mismatch> {
    let underflows = si == 0.0 && matches!(operator, Operator::Exp | Operator::PowerOf);
    if underflows || inputs.iter().any(|(_, partial)| !partial.is_finite()) {
        return Err(Mismatch::NotFinite);
    }
    if dim.is_saturated() {
        return Err(Mismatch::PowerTooHigh { dim });
    }
    let node = Node::new(si, dim, kind, inputs, Origin::Operator(operator), place);
    Quantity::from_node(node.with_bound(bound))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::text::parse;
    use crate::record::spread::Spread;

    fn q(text: &str) -> Quantity {
        parse(text, None, 0).unwrap()
    }

    #[test]
    fn a_difference_with_itself_is_exactly_nothing() {
        let x = q("-285.830(20) kJ/mol[H2O]");
        let gap = x.minus(&x, None).unwrap();
        assert_eq!((gap.si(), gap.spread()), (0.0, Spread::Full(0.0)));
    }

    #[test]
    fn partials_agree_with_a_finite_difference() {
        // Bound: central difference with a relative step of 1e-5 has an error of order 1e-10.
        let make = |a: f64, b: f64| {
            let (a, b) = (q(&format!("{a:.17}(1) J")), q(&format!("{b:.17}(1) J")));
            let ratio = a.over(&b, None).unwrap();
            ratio.times(&ratio, None).unwrap().power(1.5, None).unwrap().exp(None).unwrap().ln(None).unwrap()
        };
        let (a, b, h) = (1.3, 0.7, 1e-5);
        let at = make(a, b);
        let partials: Vec<f64> = at.sensitivities().iter().map(|s| s.derivative).collect();
        // Both leaves were typed at the same place and evaluation, so they are one key and come as one sum.
        let by_a = (make(a + h, b).si() - make(a - h, b).si()) / (2.0 * h);
        let by_b = (make(a, b + h).si() - make(a, b - h).si()) / (2.0 * h);
        assert!((partials[0] - (by_a + by_b)).abs() < 1e-8 * by_a.abs(), "{partials:?} {by_a} {by_b}");
    }

    #[test]
    fn slopes_of_the_functions_of_an_angle_agree_with_a_finite_difference() {
        // Bound: h²/6 times the third derivative, which is below 150 here (that of the tangent), and rounding of order ε/h.
        let h = 1e-5;
        for function in [Quantity::sin, Quantity::cos, Quantity::tan] {
            let at = |angle: f64| function(&q(&format!("{angle:.17}(1) rad")), None).unwrap();
            let slope = (at(1.0456 + h).si() - at(1.0456 - h).si()) / (2.0 * h);
            let partial = at(1.0456).sensitivities()[0].derivative;
            assert!((partial - slope).abs() < 1e-8, "{partial} {slope}");
        }
        assert!(matches!(q("1 K").sin(None), Err(Mismatch::NotPure { function: "sin", .. })));
    }

    #[test]
    fn an_open_mole_takes_the_basis_it_meets_and_the_node_remembers() {
        let (open, named) = (q("1 kJ/mol"), q("2 kJ/mol[CH4]"));
        for (a, b) in [(&open, &named), (&named, &open)] {
            let gap = a.minus(b, None).unwrap();
            assert_eq!((gap.node().bound(), gap.dim()), (Some(Entity::named("CH4")), named.dim()));
            let mean = Quantity::mean(&[a.clone(), b.clone()], None).unwrap();
            assert_eq!((mean.node().bound(), mean.dim()), (Some(Entity::named("CH4")), named.dim()));
        }
        assert!(matches!(q("1 kJ/mol[CH4]").plus(&q("1 kJ/mol[rxn]"), None), Err(Mismatch::Basis { .. })));
    }

    #[test]
    fn a_mean_of_points_is_a_point_and_their_sum_is_refused() {
        let (a, b) = (q("20 degC"), q("40 degC"));
        let mean = Quantity::mean(&[a.clone(), b.clone()], None).unwrap();
        assert_eq!((mean.kind().what, mean.si()), (What::TemperaturePoint, 303.15));
        assert!(a.plus(&b, None).is_err());
    }

    #[test]
    fn logarithms_want_pure_positive_numbers() {
        assert!(matches!(q("300 K").ln(None), Err(Mismatch::NotPure { .. })));
        assert!(matches!(q("-1").ln(None), Err(Mismatch::NotPositive { .. })));
    }
}
