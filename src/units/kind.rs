//! What sort of quantity a value is, beside its dimension: temperature point, enthalpy, entropy, plain.
//!
//! [`Kind`] is a tag with, for state functions, the [`State`] it was taken in. All rules of combination stand here,
//! in [`Kind::sum`], [`Kind::product`] and [`Kind::quotient`]. The idea behind the table of sums: each energy-like state
//! function is U plus a number of pV terms minus a number of TS terms, so H = (1, 0), A = (0, 1), G = (1, 1); two of
//! them may be added where the result is again one of them.

use std::sync::Arc;

use thiserror::Error;

use crate::fault::Explain;
use crate::units::dimension::Dimension;

/// The sort of quantity.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum What {
    Plain,
    /// Kelvin as typed: a point or a difference, whichever it meets.
    OpenTemperature,
    TemperaturePoint,
    TemperatureDifference,
    U,
    H,
    A,
    G,
    S,
    Cp,
    Cv,
    Heat,
    Work,
    /// A product of pressure and volume.
    PV,
    /// A product of temperature and entropy.
    TS,
    /// A standard equilibrium constant; its uncertainty lives in ln K.
    K,
}

impl What {
    /// Number of pV terms added to U and of TS terms taken off; `None` for what is not built from U.
    fn terms(self) -> Option<(i8, i8, i8)> {
        match self {
            What::U => Some((1, 0, 0)),
            What::H => Some((1, 1, 0)),
            What::A => Some((1, 0, -1)),
            What::G => Some((1, 1, -1)),
            What::PV => Some((0, 1, 0)),
            What::TS => Some((0, 0, 1)),
            _ => None,
        }
    }

    fn from_terms(terms: (i8, i8, i8)) -> Option<What> {
        [What::U, What::H, What::A, What::G, What::PV, What::TS].into_iter().find(|what| what.terms() == Some(terms))
    }

    pub fn is_temperature(self) -> bool {
        matches!(self, What::OpenTemperature | What::TemperaturePoint | What::TemperatureDifference)
    }

    /// Symbol of the IUPAC Green Book, without a Δ; empty for what has none.
    pub fn symbol(self) -> &'static str {
        match self {
            What::U => "U",
            What::H => "H",
            What::A => "A",
            What::G => "G",
            What::S => "S",
            What::Cp => "Cp",
            What::Cv => "Cv",
            What::PV => "pV",
            What::TS => "TS",
            What::K => "K°",
            What::Heat => "Q",
            What::Work => "W",
            What::OpenTemperature | What::TemperaturePoint => "T",
            What::TemperatureDifference => "ΔT",
            What::Plain => "",
        }
    }

    /// The word used in messages.
    pub fn word(self) -> &'static str {
        match self {
            What::Plain => "a plain value",
            What::OpenTemperature => "a temperature in kelvin",
            What::TemperaturePoint => "a temperature point",
            What::TemperatureDifference => "a temperature difference",
            What::U => "an internal energy U",
            What::H => "an enthalpy H",
            What::A => "a Helmholtz energy A",
            What::G => "a Gibbs energy G",
            What::S => "an entropy S",
            What::Cp => "a heat capacity Cp",
            What::Cv => "a heat capacity Cv",
            What::Heat => "a heat",
            What::Work => "a work",
            What::PV => "a pV term",
            What::TS => "a TS term",
            What::K => "an equilibrium constant",
        }
    }
}

/// From where an energy is counted.
#[derive(Clone, Debug, PartialEq)]
pub enum Zero {
    /// The elements in their reference states at 298.15 K.
    Elements298,
    /// The elements in their reference states at the value's own temperature.
    ElementsAtT,
    /// The elements in their reference states at 0 K.
    Elements0,
    /// The substance itself at a stated temperature: an increment.
    From(f64),
    /// A zero of some table's own, named.
    Named(Arc<str>),
}

impl std::fmt::Display for Zero {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Zero::Elements298 => write!(f, "the elements at 298.15 K"),
            Zero::ElementsAtT => write!(f, "the elements at the same temperature"),
            Zero::Elements0 => write!(f, "the elements at 0 K"),
            Zero::From(t_k) => write!(f, "the substance itself at {t_k} K"),
            Zero::Named(name) => write!(f, "{name}"),
        }
    }
}

/// The state a state function was taken in. `None` means *not one value*, as after a sum over several.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct State {
    pub zero: Option<Zero>,
    pub t_k: Option<f64>,
    pub p_pa: Option<f64>,
    /// Each species pure, in its standard state.
    pub standard: bool,
    /// Of a reaction, whatever it is now per mole of: such values belong to their temperature.
    pub reaction: bool,
}

/// The sort of quantity with its state.
#[derive(Clone, Debug, PartialEq)]
pub struct Kind {
    pub what: What,
    pub state: Option<Arc<State>>,
}

/// Two kinds that cannot meet.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum KindMismatch {
    #[error("cannot {verb} {left} and {right}: they differ by {term}", verb = verb(*minus), left = left.word(), right = right.word())]
    StateFunctions { left: What, right: What, minus: bool, term: &'static str },
    #[error("cannot {verb} {left} and {right}", verb = verb(*minus), left = left.word(), right = right.word())]
    Unlike { left: What, right: What, minus: bool },
    #[error("cannot add two temperature points, {left_k} K and {right_k} K: their sum is no temperature")]
    PointPlusPoint { left_k: f64, right_k: f64 },
    #[error("cannot subtract a temperature point, {right_k} K, from {left}", left = left.word())]
    MinusPoint { left: What, right_k: f64 },
    #[error("cannot negate a temperature point, {t_k} K")]
    NegatedPoint { t_k: f64 },
    #[error("cannot {verb} a reaction value at {left_k} K and one at {right_k} K: a reaction value belongs to its temperature", verb = verb(*minus))]
    ReactionTemperatures { left_k: f64, right_k: f64, minus: bool },
    #[error("cannot {verb} a reaction's value and a substance's", verb = verb(*minus))]
    ReactionAndSubstance { minus: bool },
    #[error("cannot {verb} a value counted from {left} and one counted from {right}", verb = verb(*minus))]
    Zeros { left: Zero, right: Zero, minus: bool },
}

fn verb(minus: bool) -> &'static str {
    if minus { "subtract" } else { "add" }
}

impl Explain for KindMismatch {
    fn code(&self) -> &'static str {
        match self {
            KindMismatch::StateFunctions { .. } => "state-functions-differ",
            KindMismatch::Unlike { .. } => "kinds-differ",
            KindMismatch::PointPlusPoint { .. } => "point-plus-point",
            KindMismatch::MinusPoint { .. } => "minus-point",
            KindMismatch::NegatedPoint { .. } => "negated-point",
            KindMismatch::ReactionTemperatures { .. } => "reaction-temperatures-differ",
            KindMismatch::ReactionAndSubstance { .. } => "reaction-and-substance",
            KindMismatch::Zeros { .. } => "zeros-differ",
        }
    }

    fn hint(&self) -> String {
        match self {
            KindMismatch::StateFunctions { left, right, .. } => match (left, right) {
                (What::H, What::U) | (What::U, What::H) => {
                    "bring both to one of them with the pV term, H = U + pV: for a reaction of ideal gases \
                     r.enthalpy(T) and r.internal_energy(T) differ by Δn(gas)·R·T; ask the reaction for the one you need"
                        .to_owned()
                }
                (What::G, What::A) | (What::A, What::G) => {
                    "bring both to one of them with the pV term, G = A + pV".to_owned()
                }
                (What::H, What::G) | (What::G, What::H) => {
                    "bring both to one of them with the TS term, G = H - T*S".to_owned()
                }
                (What::U, What::A) | (What::A, What::U) => {
                    "bring both to one of them with the TS term, A = U - T*S".to_owned()
                }
                _ => "ask for both as the same state function, for instance r.enthalpy(T) for each".to_owned(),
            },
            KindMismatch::Unlike { .. } => {
                "bring both to one kind first; a bare figure is `x.value(\"kJ/mol\")`, which drops the kind on purpose".to_owned()
            }
            KindMismatch::PointPlusPoint { .. } => {
                "for a mean write `mean(T1, T2)`; a difference is typed in kelvin, `q(\"25 K\")`".to_owned()
            }
            KindMismatch::MinusPoint { .. } => {
                "write both as points, `q(\"... degC\") - q(\"... degC\")`, to get a difference".to_owned()
            }
            KindMismatch::NegatedPoint { .. } => {
                "subtract two points instead, T1 - T2, which is a difference".to_owned()
            }
            KindMismatch::ReactionTemperatures { .. } => {
                "evaluate both at one temperature, `r.enthalpy(T)` with the same T; the change of an enthalpy between two is \
                 `r.enthalpy_increment(T, from)`"
                    .to_owned()
            }
            KindMismatch::ReactionAndSubstance { .. } => {
                "a reaction's value is a difference of substances already; write the substance into the reaction, or add \
                 substances' values alone"
                    .to_owned()
            }
            KindMismatch::Zeros { .. } => {
                "bring both to one zero: add the substance's own increment between the two temperatures".to_owned()
            }
        }
    }
}

impl Kind {
    pub const PLAIN: Kind = Kind { what: What::Plain, state: None };

    pub fn of(what: What) -> Kind {
        Kind { what, state: None }
    }

    pub fn in_state(what: What, state: State) -> Kind {
        Kind { what, state: Some(Arc::new(state)) }
    }

    pub fn state(&self) -> Option<&State> {
        self.state.as_deref()
    }

    /// The kind a value of this dimension has when nothing else is known: kelvin are open, all else is plain.
    pub fn bare(dim: &Dimension) -> Kind {
        let kelvin = dim.has_bases([0, 0, 0, 0, 1, 0]) && dim.entities().is_empty();
        Kind::of(if kelvin { What::OpenTemperature } else { What::Plain })
    }

    /// Kind of `left + right` or `left - right`, both of one dimension; `si` are the two values, for messages.
    pub fn sum(left: &Kind, right: &Kind, minus: bool, si: (f64, f64)) -> Result<Kind, KindMismatch> {
        use What::*;
        if left.what.is_temperature() && right.what.is_temperature() {
            return Kind::sum_of_temperatures(left.what, right.what, minus, si).map(Kind::of);
        }
        let state = State::merged(left, right, minus)?;
        let keep = |what| Ok(Kind { what, state });
        match (left.what, right.what) {
            (K, _) | (_, K) => Ok(Kind::PLAIN), // A sum of constants is none.
            (a, b) if a == b => keep(a),
            (Plain, _) | (_, Plain) => keep(Plain), // A typed correction says nothing of its kind, so the sum claims none.
            (Heat, Work) | (Work, Heat) => keep(U), // First law.
            (Heat, _) | (_, Heat) | (Work, _) | (_, Work) => keep(Plain),
            (a, b) => {
                let combined = match (a.terms(), b.terms()) {
                    (Some(x), Some(y)) if minus => What::from_terms((x.0 - y.0, x.1 - y.1, x.2 - y.2)),
                    (Some(x), Some(y)) => What::from_terms((x.0 + y.0, x.1 + y.1, x.2 + y.2)),
                    _ => return Err(KindMismatch::Unlike { left: a, right: b, minus }),
                };
                match (combined, a.terms(), b.terms()) {
                    (Some(what), _, _) => keep(what),
                    (None, Some(x), Some(y)) => {
                        let term = match ((x.1 - y.1).abs(), (x.2 - y.2).abs()) {
                            (1, 0) => "a pV term",
                            (0, 1) => "a TS term",
                            _ => "both a pV and a TS term",
                        };
                        Err(KindMismatch::StateFunctions { left: a, right: b, minus, term })
                    }
                    _ => Err(KindMismatch::Unlike { left: a, right: b, minus }),
                }
            }
        }
    }

    fn sum_of_temperatures(left: What, right: What, minus: bool, si: (f64, f64)) -> Result<What, KindMismatch> {
        use What::{OpenTemperature as Open, TemperatureDifference as Difference, TemperaturePoint as Point};
        Ok(match (left, right) {
            (Point, Point) if minus => Difference,
            (Point, Point) => return Err(KindMismatch::PointPlusPoint { left_k: si.0, right_k: si.1 }),
            (Point, _) => Point,
            (_, Point) if minus => return Err(KindMismatch::MinusPoint { left, right_k: si.1 }),
            (_, Point) => Point,
            (Open, Open) => Open,
            _ => Difference,
        })
    }

    /// Kind of a mean of two values that are no temperature points.
    pub fn mean(left: &Kind, right: &Kind) -> Result<Kind, KindMismatch> {
        match (left.what, right.what) {
            (a, b) if a.is_temperature() && a != b => Err(KindMismatch::Unlike { left: a, right: b, minus: false }),
            _ => Kind::sum(left, right, false, (0.0, 0.0)),
        }
    }

    /// An increment between temperatures that are not known any more, as Cp times a difference is.
    fn increment(what: What, of: &Kind) -> Kind {
        let reaction = of.state().is_some_and(|state| state.reaction);
        Kind::in_state(what, State { reaction, ..State::default() })
    }

    pub fn negated(&self, si: f64) -> Result<Kind, KindMismatch> {
        match self.what {
            What::TemperaturePoint => Err(KindMismatch::NegatedPoint { t_k: si }),
            What::K => Ok(Kind::PLAIN),
            _ => Ok(self.clone()),
        }
    }

    /// Kind of a product. A kind survives a factor that only changes the basis (mol[X]/mol[rxn], kg, a bare number).
    /// `si` are the two values: T times an entropy at another temperature is no TS term.
    pub fn product(left: (&Kind, &Dimension), right: (&Kind, &Dimension), dim: &Dimension, si: (f64, f64)) -> Kind {
        for ((kind, kind_dim), (other, other_dim), other_si) in [(left, right, si.1), (right, left, si.0)] {
            match (kind.what, other.what) {
                (What::K, _) => continue,
                (What::S, What::TemperaturePoint | What::OpenTemperature) => {
                    let own = kind.state().and_then(|state| state.t_k);
                    if own.is_some_and(|t_k| t_k != other_si) {
                        return Kind::bare(dim);
                    }
                    return Kind { what: What::TS, state: kind.state.clone() };
                }
                (What::Cp, What::TemperatureDifference | What::OpenTemperature) => {
                    return Kind::increment(What::H, kind);
                }
                (What::Cv, What::TemperatureDifference | What::OpenTemperature) => {
                    return Kind::increment(What::U, kind);
                }
                _ => {}
            }
            if is_pressure(kind_dim) && is_volume(other_dim) {
                return Kind::of(What::PV);
            }
        }
        for ((kind, _), (other, other_dim)) in [(left, right), (right, left)] {
            if scales(other_dim) && matches!(other.what, What::Plain) {
                return kind.scaled(dim);
            }
        }
        Kind::bare(dim)
    }

    /// Kind of a quotient.
    pub fn quotient(left: (&Kind, &Dimension), right: (&Kind, &Dimension), dim: &Dimension) -> Kind {
        if left.0.what == What::TS && right.0.what.is_temperature() {
            return Kind { what: What::S, state: left.0.state.clone() };
        }
        if scales(right.1) && right.0.what == What::Plain { left.0.scaled(dim) } else { Kind::bare(dim) }
    }

    /// Kind of a value of this kind times a bare number, or times what only changes the basis to that of `dim`.
    pub fn scaled(&self, dim: &Dimension) -> Kind {
        match self.what {
            What::TemperaturePoint | What::K | What::OpenTemperature => Kind::bare(dim),
            _ => self.clone(),
        }
    }
}

impl State {
    fn merged(left: &Kind, right: &Kind, minus: bool) -> Result<Option<Arc<State>>, KindMismatch> {
        let (left, right) = match (left, right) {
            (Kind { state: Some(left), .. }, Kind { state: Some(right), .. }) if Arc::ptr_eq(left, right) => {
                return Ok(Some(Arc::clone(left)));
            }
            (Kind { state: Some(left), .. }, Kind { state: Some(right), .. }) => (left, right),
            // A plain value takes no part in the state; a state function without one is at no known temperature.
            (Kind { state: Some(state), .. }, other) | (other, Kind { state: Some(state), .. }) => {
                if other.what == What::Plain {
                    return Ok(Some(Arc::clone(state)));
                }
                return Ok(Some(Arc::new(State { t_k: None, ..(**state).clone() })));
            }
            _ => return Ok(None),
        };
        if left.reaction != right.reaction {
            return Err(KindMismatch::ReactionAndSubstance { minus });
        }
        let reaction = left.reaction;
        if let (true, Some(left_k), Some(right_k)) = (reaction, left.t_k, right.t_k)
            && left_k != right_k
            && !matches!((&left.zero, &right.zero), (Some(Zero::From(_)), _) | (_, Some(Zero::From(_))))
        {
            return Err(KindMismatch::ReactionTemperatures { left_k, right_k, minus });
        }
        let same = |a: Option<f64>, b: Option<f64>| if a == b { a } else { None };
        let (zero, t_k) = match (&left.zero, &right.zero) {
            (Some(a), Some(b)) if a == b => (Some(a.clone()), same(left.t_k, right.t_k)),
            (Some(a), Some(b)) => {
                let joined = joined((a, left.t_k), (b, right.t_k), minus);
                let refused = || KindMismatch::Zeros { left: a.clone(), right: b.clone(), minus };
                joined.map(|(zero, t_k)| (Some(zero), t_k)).ok_or_else(refused)?
            }
            _ => (None, same(left.t_k, right.t_k)),
        };
        let standard = left.standard && right.standard;
        Ok(Some(Arc::new(State { zero, t_k, p_pa: same(left.p_pa, right.p_pa), standard, reaction })))
    }
}

/// Zero and temperature of a sum of two values with different zeros, where an increment leads from one to the other:
/// H(a) and H(T) − H(a) make H(T), and H(T) less H(T) − H(a) makes H(a). `None`: nothing joins them.
fn joined(left: (&Zero, Option<f64>), right: (&Zero, Option<f64>), minus: bool) -> Option<(Zero, Option<f64>)> {
    let starts = |value: (&Zero, Option<f64>)| match value.0 {
        Zero::From(t_k) => Some(*t_k),
        _ => None,
    };
    let meets = |t_k: Option<f64>, start: Option<f64>| t_k.is_some() && t_k == start;
    match (minus, starts(left), starts(right)) {
        (false, _, start @ Some(_)) if meets(left.1, start) => Some((left.0.clone(), right.1)),
        (false, start @ Some(_), _) if meets(right.1, start) => Some((right.0.clone(), left.1)),
        (true, _, start @ Some(_)) if left.1.is_some() && left.1 == right.1 => Some((left.0.clone(), start)),
        _ => None,
    }
}

/// Whether multiplying by this only changes how much of something is meant.
fn scales(dim: &Dimension) -> bool {
    dim.is_basis_only() || dim.has_bases([0, 1, 0, 0, 0, 0]) || dim.has_bases([0, -1, 0, 0, 0, 0])
}

fn is_pressure(dim: &Dimension) -> bool {
    dim.has_bases([-1, 1, -2, 0, 0, 0]) && dim.entities().is_empty()
}

fn is_volume(dim: &Dimension) -> bool {
    dim.has_bases([3, 0, 0, 0, 0, 0])
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::units::dimension::Base;

    fn energy() -> Dimension {
        Dimension::whole([2, 1, -2, 0, 0, 0])
    }

    fn add(left: What, right: What, minus: bool) -> Option<What> {
        Kind::sum(&Kind::of(left), &Kind::of(right), minus, (1.0, 2.0)).ok().map(|kind| kind.what)
    }

    #[test]
    fn state_functions_combine_where_the_sum_is_again_one_of_them() {
        use What::*;
        let table = [
            (H, TS, true, Some(G)),
            (H, PV, true, Some(U)),
            (U, PV, false, Some(H)),
            (G, TS, false, Some(H)),
            (U, TS, true, Some(A)),
            (A, PV, false, Some(G)),
            (H, G, true, Some(TS)),
            (H, U, true, Some(PV)),
            (H, H, false, Some(H)),
            (H, U, false, None),
            (H, G, false, None),
            (H, PV, false, None),
            (S, H, false, None),
            (Heat, Work, false, Some(U)),
        ];
        for (left, right, minus, wanted) in table {
            assert_eq!(add(left, right, minus), wanted, "{left:?} {} {right:?}", if minus { '-' } else { '+' });
        }
    }

    #[test]
    fn temperatures_follow_the_rules_of_points_and_differences() {
        use What::{OpenTemperature as Open, TemperatureDifference as Difference, TemperaturePoint as Point};
        let table = [
            (Point, Point, true, Some(Difference)),
            (Point, Point, false, None),
            (Point, Open, true, Some(Point)),
            (Open, Point, false, Some(Point)),
            (Open, Point, true, None),
            (Open, Open, true, Some(Open)),
            (Difference, Open, false, Some(Difference)),
            (Point, Difference, false, Some(Point)),
        ];
        for (left, right, minus, wanted) in table {
            assert_eq!(add(left, right, minus), wanted, "{left:?} {} {right:?}", if minus { '-' } else { '+' });
        }
    }

    #[test]
    fn reaction_values_meet_only_at_one_temperature_and_substance_values_at_any() {
        let of = |reaction, t_k| {
            let state = State { zero: Some(Zero::Elements298), t_k: Some(t_k), reaction, ..State::default() };
            Kind::in_state(What::H, state)
        };
        let sum = |a: &Kind, b: &Kind| Kind::sum(a, b, true, (1.0, 1.0));
        assert!(matches!(sum(&of(true, 300.0), &of(true, 400.0)), Err(KindMismatch::ReactionTemperatures { .. })));
        assert_eq!(sum(&of(false, 300.0), &of(false, 400.0)).unwrap().state().unwrap().t_k, None);
        assert!(matches!(sum(&of(true, 300.0), &of(false, 300.0)), Err(KindMismatch::ReactionAndSubstance { .. })));
        // An increment of the reaction's own leads from one temperature to the other; Cp times a difference to none known.
        let increment = Kind::in_state(
            What::H,
            State { zero: Some(Zero::From(300.0)), t_k: Some(400.0), reaction: true, ..State::default() },
        );
        let joined = Kind::sum(&of(true, 300.0), &increment, false, (1.0, 1.0)).unwrap();
        assert_eq!(joined.state().unwrap().t_k, Some(400.0));
    }

    #[test]
    fn an_increment_joins_only_where_it_starts_or_ends() {
        let at = |zero, t_k| Kind::in_state(What::H, State { zero: Some(zero), t_k: Some(t_k), ..State::default() });
        let absolute = |t_k| at(Zero::Elements298, t_k);
        let from = |start, t_k| at(Zero::From(start), t_k);
        let sum = |a: &Kind, b: &Kind, minus| {
            let kind = Kind::sum(a, b, minus, (1.0, 1.0)).ok()?;
            let state = kind.state().unwrap().clone();
            Some((state.zero.unwrap(), state.t_k))
        };
        assert_eq!(sum(&absolute(300.0), &from(300.0, 400.0), false), Some((Zero::Elements298, Some(400.0))));
        assert_eq!(sum(&absolute(400.0), &from(300.0, 400.0), true), Some((Zero::Elements298, Some(300.0))));
        assert_eq!(sum(&from(300.0, 400.0), &from(400.0, 500.0), false), Some((Zero::From(300.0), Some(500.0))));
        assert_eq!(sum(&absolute(400.0), &from(300.0, 400.0), false), None);
        assert_eq!(sum(&from(300.0, 400.0), &from(200.0, 500.0), true), None);
    }

    #[test]
    fn products_keep_or_make_kinds() {
        let (kelvin, none) = (Dimension::base(Base::Kelvin), Dimension::none());
        let per_kelvin = energy().over(&kelvin);
        let make = |a: What, da: &Dimension, b: What, db: &Dimension| {
            Kind::product((&Kind::of(a), da), (&Kind::of(b), db), &da.times(db), (1.0, 1.0)).what
        };
        assert_eq!(make(What::TemperaturePoint, &kelvin, What::S, &per_kelvin), What::TS);
        assert_eq!(make(What::Cp, &per_kelvin, What::TemperatureDifference, &kelvin), What::H);
        assert_eq!(make(What::H, &energy(), What::Plain, &none), What::H);
        assert_eq!(make(What::TemperaturePoint, &kelvin, What::Plain, &none), What::OpenTemperature);
        let (pressure, volume) = (Dimension::whole([-1, 1, -2, 0, 0, 0]), Dimension::whole([3, 0, 0, 0, 0, 0]));
        assert_eq!(make(What::Plain, &volume, What::Plain, &pressure), What::PV);
    }
}
