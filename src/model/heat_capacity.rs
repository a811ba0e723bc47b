//! The ways of taking heat capacities between 298.15 K and T: in full, held at one value, or not at all.

/// How heat capacities are taken between 298.15 K and T.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum HeatCapacity {
    /// The integral of the function.
    Full,
    /// Its value at 298.15 K throughout.
    Constant,
    /// Its value half-way between 298.15 K and T throughout.
    Midpoint,
    /// The mean of its values at both ends throughout.
    Mean,
    /// To first order about a temperature: integrated to there, and its value there onwards.
    FirstOrder { about_k: f64 },
    /// None: the value at 298.15 K stands for the value at T.
    Neglected,
    /// The integral of the function of the phase as written, its value held beyond the end of its record: changes of phase on
    /// the way are left out.
    Missed,
}

impl HeatCapacity {
    pub const WORDS: &'static [&'static str] = &["full", "constant", "midpoint", "mean", "taylor"];

    /// How Cp was taken, for the register.
    pub fn words(self) -> String {
        let words = match self {
            HeatCapacity::FirstOrder { about_k } => return format!("taken to first order about {about_k} K"),
            HeatCapacity::Full => "integrated",
            HeatCapacity::Constant => "held at its value at 298.15 K",
            HeatCapacity::Midpoint => "held at its value half-way",
            HeatCapacity::Mean => "held at the mean of both ends",
            HeatCapacity::Neglected => "neglected",
            HeatCapacity::Missed => "that of the phase as written",
        };
        words.to_owned()
    }

    pub fn from_word(word: &str) -> HeatCapacity {
        match word {
            "constant" => HeatCapacity::Constant,
            "midpoint" => HeatCapacity::Midpoint,
            "mean" => HeatCapacity::Mean,
            _ => HeatCapacity::Full,
        }
    }
}
