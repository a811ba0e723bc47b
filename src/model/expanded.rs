//! Expanded uncertainty: the half-width of an interval that holds a stated share of what the value may be.
//!
//! U = k u(y), k from Student's t with the effective degrees of freedom, cut to a whole number, or from the normal
//! distribution where no input states degrees of freedom (JCGM 100:2008, clauses 6.2, G.3, G.4.1 and G.6.4).
//!
//! | symbol | meaning                                                                |
//! |--------|------------------------------------------------------------------------|
//! | U, k   | expanded uncertainty and coverage factor                               |
//! | u(y)   | combined standard uncertainty, by first derivatives with correlation   |
//! | ν_eff  | u⁴/Σ (cᵢ uᵢ)⁴/νᵢ (Welch-Satterthwaite), for independent inputs only     |
//!
//! Assumes that y is near to normal or t, as it is where many inputs share in u (G.2.1). For an equilibrium constant all
//! this is said of ln K°. Source: as above.

use std::rc::Rc;

use thiserror::Error;

use crate::fault::{Explain, Fault};
use crate::model::answer::{self, Answer, LEVEL};
use crate::model::card::{Call, Card, On, Value};
use crate::model::review;
use crate::num::math;
use crate::num::student::{normal_factor, student_factor};
use crate::quantity::Quantity;
use crate::record::evaluation::Shape;
use crate::record::freedom::{self, Freedom};

pub static EXPANDED: Card = Card {
    id: "uncertainty.expanded",
    name: "expanded",
    on: On::Quantity,
    args: &[LEVEL],
    gives: "the expanded uncertainty U with its k, and the interval",
    doc: "Half-width U = k u of the interval that holds the value with the stated level of confidence. k is Student's t for \
          the effective degrees of freedom, or normal where no input states any. Parts: `U`, `k`, `level`, `dof`, `low`, \
          `high`; for an equilibrium constant `U` is that of ln K°.",
    source: "JCGM 100:2008, clauses 6.2 and G.4.1",
    example: "q(\"25.0(3) nm, dof=18\").expanded(0.99)",
    claims: &[],
    alternatives: &[],
    run: |_, call| {
        let expanded = Expanded::of(call, call.quantity(0), call.number(1))?;
        Ok(Value::Answer(Answer::Expanded(Rc::new(expanded))))
    },
    check_line: None,
    caution: None,
};

/// Why there is no expanded uncertainty.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum ExpandedError {
    #[error("a level of confidence of {level} is not between 0 and 1")]
    Level { level: f64 },
    #[error("an expanded uncertainty is a multiple of the standard one, and the inputs state none: {silent}")]
    NoUncertainty { silent: String },
    #[error(
        "`{a}` and `{b}` are correlated (r = {r:.2}) and state degrees of freedom, of which effective ones follow for independent inputs only"
    )]
    Correlated { a: String, b: String, r: f64 },
}

impl Explain for ExpandedError {
    fn code(&self) -> &'static str {
        match self {
            ExpandedError::Level { .. } => "level-of-confidence",
            ExpandedError::NoUncertainty { .. } => "expanded-without-uncertainty",
            ExpandedError::Correlated { .. } => "effective-freedom-of-correlated",
        }
    }

    fn hint(&self) -> String {
        match self {
            ExpandedError::Level { level } if (1.0..=100.0).contains(level) => {
                format!("write a share, {}, for {level} %", level / 100.0)
            }
            ExpandedError::Level { .. } => "write a share such as 0.95".to_owned(),
            ExpandedError::NoUncertainty { .. } => {
                "state the uncertainty of one input at least, as in `q(\"25.0(3) nm\")`".to_owned()
            }
            ExpandedError::Correlated { .. } => "ask `x.monte_carlo()`, or compute the result of each set of readings \
                 and give their list to `readings([...])`, which keeps the degrees of freedom (JCGM 100:2008, H.2.4)"
                .to_owned(),
        }
    }
}

/// An expanded uncertainty.
pub struct Expanded {
    pub value: Quantity,
    pub level: f64,
    pub k: f64,
    /// Effective degrees of freedom, not yet cut; `None` where no input states any.
    pub dof: Option<f64>,
    /// U and the interval are those of ln K°; `low` and `high` are taken back to K°.
    pub logarithmic: bool,
    pub half_width: Quantity,
    pub low: Quantity,
    pub high: Quantity,
    /// Inputs that state no uncertainty, in words; empty where u is complete.
    pub silent: String,
    /// An input between limits that brings more than half of the variance, so that y is far from normal.
    pub dominated_by: Option<(String, Shape)>,
}

impl Expanded {
    /// The expanded uncertainty of a value, asked for by `call`.
    ///
    /// # Errors
    /// See [`ExpandedError`].
    pub fn of(call: &Rc<Call>, value: &Quantity, level: f64) -> Result<Expanded, Fault> {
        if !(level > 0.0 && level < 1.0) {
            return Err(ExpandedError::Level { level }.into());
        }
        let silent = review::silent_words(&review::silent_inputs(value));
        let Some(u) = value.spread().u() else { return Err(ExpandedError::NoUncertainty { silent }.into()) };
        let dof = match freedom::of(value.node()) {
            Freedom::Unlimited => None,
            Freedom::Effective(dof) => Some(dof),
            Freedom::Correlated { a, b, r } => return Err(ExpandedError::Correlated { a, b, r }.into()),
        };
        let k = match dof {
            None => normal_factor(level),
            Some(dof) => student_factor(level, whole(dof)),
        };
        let logarithmic = answer::is_logarithmic(value);
        let y = value.si();
        let (half_width, low, high) = if logarithmic {
            let of_ln = k * u / y;
            (of_ln, y * math::exp(-of_ln), y * math::exp(of_ln))
        } else {
            (k * u, y - k * u, y + k * u)
        };
        Ok(Expanded {
            level,
            k,
            dof,
            logarithmic,
            half_width: answer::width(call, value, half_width)?,
            low: answer::figure(call, value, low)?,
            high: answer::figure(call, value, high)?,
            silent,
            dominated_by: dominating(value, u),
            value: value.clone(),
        })
    }

    /// The degrees of freedom that k was taken for.
    pub fn whole_dof(&self) -> Option<f64> {
        self.dof.map(whole)
    }

    pub(super) fn parts(&self) -> Vec<(&'static str, Value)> {
        vec![
            ("U", Value::Quantity(self.half_width.clone())),
            ("k", Value::Number(self.k)),
            ("level", Value::Number(self.level)),
            ("dof", self.whole_dof().map_or(Value::Nothing, Value::Number)),
            ("low", Value::Quantity(self.low.clone())),
            ("high", Value::Quantity(self.high.clone())),
        ]
    }
}

/// Degrees of freedom cut to the next lower whole number (JCGM 100:2008, G.4.1). What is whole but for rounding stays.
fn whole(dof: f64) -> f64 {
    (dof * (1.0 + 1e-12)).floor().max(1.0)
}

/// An input between limits with more than half of the variance. (Half: common practice, no source.)
fn dominating(value: &Quantity, u: f64) -> Option<(String, Shape)> {
    value.sensitivities().iter().find_map(|one| {
        let input = one.input().filter(|input| input.evaluation().shape != Shape::Normal)?;
        let part = one.part()?;
        (part * part > 0.5 * u * u).then(|| (input.name(), input.evaluation().shape))
    })
}
