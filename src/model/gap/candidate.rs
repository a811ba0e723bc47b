//! The usual mistakes, and what one of them would do to the values at hand.
//!
//! A [`Candidate`] is a mistake computed for these substances at this temperature: the gap it would leave, and the figures
//! that say so. [`Mistake`] is its kind; a kind with many candidates must fit the better to be believed.

use crate::source::Citation;

/// A kind of mistake.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Mistake {
    WaterPhase,
    Phase,
    PvTerm,
    StateFunction,
    Calorie,
    CalorieKind,
    ZeroKelvin,
    StandardPressure,
    Coefficient,
    PowerOfTen,
    Sign,
    Celsius,
    Digits,
    PerMole,
    Dataset,
    MixedDatasets,
    HeatCapacity,
    PhaseChange,
}

impl Mistake {
    pub fn id(self) -> &'static str {
        match self {
            Mistake::WaterPhase => "water-phase",
            Mistake::Phase => "other-phase",
            Mistake::PvTerm => "pv-term",
            Mistake::StateFunction => "state-function",
            Mistake::Calorie => "calorie-for-joule",
            Mistake::CalorieKind => "kind-of-calorie",
            Mistake::ZeroKelvin => "zero-kelvin",
            Mistake::StandardPressure => "standard-pressure",
            Mistake::Coefficient => "coefficient",
            Mistake::PowerOfTen => "power-of-ten",
            Mistake::Sign => "sign",
            Mistake::Celsius => "celsius-for-kelvin",
            Mistake::Digits => "digits-swapped",
            Mistake::PerMole => "per-mole-of-another",
            Mistake::Dataset => "formation-dataset",
            Mistake::MixedDatasets => "datasets-mixed",
            Mistake::HeatCapacity => "heat-capacity-shortcut",
            Mistake::PhaseChange => "phase-change-missed",
        }
    }
}

/// A mistake, computed for the values at hand.
#[derive(Clone, Debug)]
pub struct Candidate {
    pub mistake: Mistake,
    /// What was done, in words: `H2O(l) was taken for H2O(g), ν = 2`.
    pub words: String,
    /// Value with the mistake minus value without, in SI units, or in ln K.
    pub predicted: f64,
    /// Where the figures of the alternative come from.
    pub sources: Vec<Citation>,
}

/// On which scale gaps are measured: as they are, or by logarithms for equilibrium constants.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Scale {
    Linear,
    Logarithm,
}

impl Scale {
    /// A value on this scale; `None` where it has no logarithm.
    pub fn of(self, si: f64) -> Option<f64> {
        match self {
            Scale::Linear => Some(si),
            Scale::Logarithm if si > 0.0 => Some(crate::num::math::ln(si)),
            Scale::Logarithm => None,
        }
    }

    /// What a small change of a value is on this scale.
    pub fn small(self, change: f64, si: f64) -> f64 {
        match self {
            Scale::Linear => change,
            Scale::Logarithm => change / si,
        }
    }
}
