//! Why something is no crystal, or has no answer.

use thiserror::Error;

use crate::fault::Explain;

#[derive(Clone, Debug, PartialEq, Error)]
pub enum SolidError {
    #[error("a crystal has no `{key}`")]
    Key { key: String, known: String },
    #[error("a crystal needs `{key}`, and the map has none")]
    Missing { key: &'static str, example: &'static str },
    #[error("`{key}` is {given}, where {wanted} is needed")]
    Sort { key: String, wanted: &'static str, given: String },
    #[error("`{key}` is in {given}, where {wanted} is needed")]
    Dimension { key: String, given: String, wanted: &'static str, example: &'static str },
    #[error("`{key}` is {value}, and must be above 0")]
    NotPositive { key: String, value: String },
    #[error("{formula} has {wanted} modes, 3 for each of its {atoms} atoms, and {given} are given")]
    ModeCount { formula: String, atoms: f64, wanted: f64, given: f64 },
    #[error("`{given}` is the name of a phase that is no crystal")]
    NoCrystal { given: String },
    #[error(
        "`{given}` is given without its fellows: expansion needs `expansivity`, `compressibility` and `molar_volume`"
    )]
    Expansion { given: &'static str },
    #[error("Cp - Cv would follow from `melting_point` and from `expansivity`, and the two differ")]
    ExpansionTwice,
    #[error("the expansion given for {crystal} is too large to be carried to {t_k} K: 4 A T Cv passes 1")]
    ExpansionTooLarge { crystal: String, t_k: f64 },
    #[error(
        "a heat capacity of {given} J/(K mol) at {t_k} K is outside what {crystal} can have, 0 to {limit} J/(K mol)"
    )]
    NoTemperature { crystal: String, t_k: f64, given: String, limit: String },
    #[error("{crystal} was given no formation enthalpy")]
    NoFormation { crystal: String },
}

impl Explain for SolidError {
    fn code(&self) -> &'static str {
        match self {
            SolidError::Key { .. } => "crystal-key-unknown",
            SolidError::Missing { .. } => "crystal-key-missing",
            SolidError::Sort { .. } => "crystal-entry-of-wrong-sort",
            SolidError::Dimension { .. } => "crystal-entry-in-wrong-unit",
            SolidError::NotPositive { .. } => "crystal-entry-not-positive",
            SolidError::ModeCount { .. } => "crystal-mode-count",
            SolidError::NoCrystal { .. } => "phase-is-no-crystal",
            SolidError::Expansion { .. } => "expansion-incomplete",
            SolidError::ExpansionTwice => "expansion-twice",
            SolidError::ExpansionTooLarge { .. } => "expansion-too-large",
            SolidError::NoTemperature { .. } => "characteristic-temperature-not-found",
            SolidError::NoFormation { .. } => "crystal-formation-not-given",
        }
    }

    fn hint(&self) -> String {
        match self {
            SolidError::Key { known, .. } => format!("it has {known}"),
            SolidError::Missing { example, .. } => format!("add it, as in `{example}`"),
            SolidError::Sort { wanted, .. } => format!("give {wanted}"),
            SolidError::Dimension { example, .. } => format!("write it as in {example}"),
            SolidError::NotPositive { .. } => "leave out what is not there".to_owned(),
            SolidError::ModeCount { .. } => {
                "write counts that add up, as in `debye: [\"300 K\", 3], einstein: [\"500 K\", 3]`, or leave one out: a \
                 temperature alone takes all that are left"
                    .to_owned()
            }
            SolidError::NoCrystal { .. } => "write (cr), or a crystal form as in (cr,graphite)".to_owned(),
            SolidError::Expansion { .. } => {
                "give all three: Cp - Cv = T V α²/κ; or `melting_point` alone for an estimate; or none, and Cp is taken to be Cv"
                    .to_owned()
            }
            SolidError::ExpansionTwice => {
                "leave out `melting_point`, whose estimate serves where nothing was measured".to_owned()
            }
            SolidError::ExpansionTooLarge { .. } => {
                "ask below that temperature, or leave the expansion out and add Cp - Cv by yourself".to_owned()
            }
            SolidError::NoTemperature { .. } => {
                "give the heat capacity at constant volume, per mole of the formula, at a temperature where it is well below \
                 3R for each atom"
                    .to_owned()
            }
            SolidError::NoFormation { .. } => {
                "give it where the crystal is made: `formation_enthalpy: \"-411.1 kJ/mol\", formation_temperature: \"298.15 K\"`"
                    .to_owned()
            }
        }
    }
}
