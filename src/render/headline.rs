//! The one line a value is known by: symbol, rounded number with uncertainty, unit, what is not known, and per what.
//!
//! The surprise: an equilibrium constant is shown by lg K°, where its uncertainty is symmetric, beside K° itself.

use std::sync::Arc;

use crate::model::basis;
use crate::model::card::call_of;
use crate::model::caution::{self, Caution};
use crate::model::conditions;
use crate::model::review;
use crate::num::math;
use crate::quantity::Quantity;
use crate::quantity::round;
use crate::quantity::text::Caveat;
use crate::units::{self, Unit, What};

/// A value's headline in parts.
pub struct Headline {
    /// `ΔrH°`, or nothing.
    pub symbol: String,
    pub number: String,
    pub unit: Arc<Unit>,
    /// `partial (no u stated for heat capacities)`, or nothing.
    pub caveat: Option<String>,
    /// `per mole of reaction as written`, or nothing.
    pub basis: Option<String>,
    /// What an equilibrium constant says besides.
    pub logarithm: Option<Logarithm>,
    /// Whether it is a figure that can hurt someone.
    pub cautioned: bool,
}

/// lg K° with its uncertainty, and the interval of K° of one standard uncertainty to both sides.
pub struct Logarithm {
    pub lg: String,
    pub interval: Option<(String, String)>,
}

impl Headline {
    pub fn of(value: &Quantity) -> Headline {
        let shown = value.shown();
        let caveat = shown.caveat.map(|caveat| match caveat {
            Caveat::Partial => {
                let silent = review::silent_inputs(value);
                format!("partial (no u stated for {})", review::silent_words(&silent))
            }
            Caveat::NotStated => "u not stated".to_owned(),
        });
        let (number, logarithm) = match value.kind().what {
            What::K => {
                let logarithm = Logarithm::of(value);
                (round::significant(value.si(), 3), Some(logarithm))
            }
            _ => (shown.number, None),
        };
        let basis = match (shown.basis, basis::direction(value)) {
            (Some(basis), Some(direction)) => Some(format!("{basis} {direction}")),
            // Twice a reaction value, or a sum of two reactions, is not per mole of one reaction as written.
            (Some(_), None) if value.dim().is_per_reaction() && call_of(value.node()).is_none() => {
                Some("per mole of reaction".to_owned())
            }
            (basis, _) => basis,
        };
        let cautioned = !caution::of(value).is_empty();
        Headline { symbol: conditions::symbol(value), number, unit: shown.unit, caveat, basis, logarithm, cautioned }
    }

    /// The unit for readers, empty for a pure number.
    pub fn unit_text(&self) -> String {
        units::reader_text(&self.unit)
    }

    /// The headline as text: `ΔrH° = -37.62(13) kJ/mol, partial (no u stated for heat capacities), per mole of ...`.
    pub fn line(&self) -> String {
        let mut line = String::new();
        if !self.symbol.is_empty() {
            line.push_str(&self.symbol);
            line.push_str(" = ");
        }
        line.push_str(&self.number);
        let unit = self.unit_text();
        if !unit.is_empty() {
            line.push(' ');
            line.push_str(&unit);
        }
        for part in self.remarks() {
            line.push_str(", ");
            line.push_str(&part);
        }
        line
    }

    /// What follows the number and unit, in order.
    pub fn remarks(&self) -> Vec<String> {
        let mut remarks = Vec::new();
        if let Some(logarithm) = &self.logarithm {
            remarks.push(format!("lg K° = {}", logarithm.lg));
            if let Some((low, high)) = &logarithm.interval {
                remarks.push(format!("K° from {low} to {high} for one standard uncertainty of lg K°"));
            }
            remarks.push("p° = 1 bar".to_owned());
        }
        remarks.extend(self.caveat.clone());
        remarks.extend(self.basis.clone());
        remarks.extend(self.cautioned.then(|| Caution::IN_SHORT.to_owned()));
        remarks
    }
}

impl Logarithm {
    fn of(value: &Quantity) -> Logarithm {
        let k = value.si();
        let lg = math::log10(k);
        // u(ln K) = u(K)/K to first order, exactly how the node carries it.
        let u_lg = value.spread().u().filter(|u| *u > 0.0).map(|u| u / k / std::f64::consts::LN_10);
        match u_lg {
            Some(u) => {
                let bound = |lg: f64| round::significant(math::pow(10.0, lg), 3);
                Logarithm { lg: round::with_brackets(lg, u), interval: Some((bound(lg - u), bound(lg + u))) }
            }
            None => Logarithm { lg: round::fixed(lg, 3), interval: None },
        }
    }
}
