//! What is wrong with a molecule as it was given.

use thiserror::Error;

use crate::fault::Explain;

/// Why there is no such molecule.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum MoleculeError {
    #[error("no molecular constants of {name} are shipped")]
    NotOnRecord { name: String, known: String },
    #[error("a molecule has no `{key}`")]
    Key { key: String, known: String },
    #[error("a molecule needs `{key}`, and it is not given")]
    Missing { key: &'static str, example: &'static str },
    #[error("`{key}` wants {wanted}, not {given}")]
    Sort { key: String, wanted: &'static str, given: String },
    #[error("`{key}` has a bare number, {value}, and nothing says its unit")]
    Unit { key: String, value: String },
    #[error("`{key}` is given in {given}, and {wanted} is wanted")]
    Dimension { key: String, given: String, wanted: &'static str, example: &'static str },
    #[error("`{key}` has the value {value}, and must be above zero")]
    NotPositive { key: String, value: String },
    #[error("{value} is the wavenumber of an imaginary mode: the structure is no minimum, and it has no heat capacity")]
    Imaginary { value: String },
    #[error(
        "{formula} has {atoms} atoms and, being {shape}, {wanted} vibrations and torsions, where {given} are given"
    )]
    ModeCount { formula: String, atoms: usize, shape: &'static str, wanted: usize, given: usize },
    #[error("{value} is no symmetry number: it counts the rotations that leave the molecule as it was")]
    SymmetryNumber { value: String },
    #[error("{given} rotational constants do not suit {formula}, which has {atoms} atoms")]
    RotationalConstants { formula: String, atoms: usize, given: usize },
    #[error("`distortion` has a list of {given}, and {wanted}")]
    Distortion { given: usize, wanted: &'static str },
    #[error("the distortion constant {value} is not small against the rotational constant {of}")]
    DistortionLarge { value: String, of: String },
    #[error("`{symbol}` is no point group")]
    PointGroup { symbol: String },
    #[error("{name} is {recorded} on record, and {given} is given")]
    Formula { name: String, recorded: String, given: String },
    #[error("the degeneracy {value} of `{key}` is no whole number above zero")]
    Degeneracy { key: String, value: String },
    #[error("the lowest electronic level has the energy {value}, and levels are counted from it")]
    LowestLevel { value: String },
    #[error("the formation enthalpy {value} does not say at which temperature the elements it is counted from are")]
    ZeroMissing { value: String },
    #[error("the formation enthalpy {value} is counted from {zero}, and {said} is said of it")]
    ZeroDiffers { value: String, zero: String, said: String },
    #[error("a formation enthalpy at {t_k} K is neither one at 298.15 K nor one at 0 K")]
    ZeroElsewhere { t_k: f64 },
    #[error("H(298.15 K) - H(0 K) of {element} in its reference state is not on record, so 0 K cannot be left")]
    ElementIncrement { element: String },
    #[error("`{name}` in `own` stands for {given}, and nothing of that name is in the equation")]
    NotInEquation { name: String, given: String },
    #[error("line {line} of the table, `{text}`, {why}")]
    TableLine { line: usize, text: String, why: String },
    #[error("the table cannot be read: {why}")]
    Table { why: String },
    #[error("at {t_k} K the heat capacity of {molecule} is still {percent} % from its classical limit")]
    NeverClassical { molecule: String, t_k: f64, percent: String },
    #[error("the powers {powers} cannot be told apart between {t_min} K and {t_max} K")]
    Powers { powers: String, t_min: f64, t_max: f64 },
    #[error("{molecule} was given no {what}")]
    NotGiven { molecule: String, what: &'static str },
}

impl Explain for MoleculeError {
    fn code(&self) -> &'static str {
        match self {
            MoleculeError::NotOnRecord { .. } => "molecule-not-on-record",
            MoleculeError::Key { .. } => "molecule-key-unknown",
            MoleculeError::Missing { .. } => "molecule-key-missing",
            MoleculeError::Sort { .. } => "molecule-key-sort",
            MoleculeError::Unit { .. } => "molecular-constant-without-unit",
            MoleculeError::Dimension { .. } => "molecular-constant-unit",
            MoleculeError::NotPositive { .. } => "molecular-constant-not-positive",
            MoleculeError::Imaginary { .. } => "imaginary-mode",
            MoleculeError::ModeCount { .. } => "mode-count",
            MoleculeError::SymmetryNumber { .. } => "symmetry-number-impossible",
            MoleculeError::RotationalConstants { .. } => "rotational-constants-count",
            MoleculeError::Distortion { .. } => "distortion-constants-count",
            MoleculeError::DistortionLarge { .. } => "distortion-constant-large",
            MoleculeError::PointGroup { .. } => "point-group-unknown",
            MoleculeError::Formula { .. } => "molecule-formula-differs",
            MoleculeError::Degeneracy { .. } => "degeneracy-impossible",
            MoleculeError::LowestLevel { .. } => "lowest-level-not-zero",
            MoleculeError::ZeroMissing { .. } => "formation-zero-missing",
            MoleculeError::ZeroDiffers { .. } => "formation-zero-differs",
            MoleculeError::ZeroElsewhere { .. } => "formation-temperature-unusual",
            MoleculeError::ElementIncrement { .. } => "element-increment-missing",
            MoleculeError::NotInEquation { .. } => "own-not-in-equation",
            MoleculeError::TableLine { .. } => "molecule-table-line",
            MoleculeError::Table { .. } => "molecule-table-unreadable",
            MoleculeError::NeverClassical { .. } => "classical-limit-not-reached",
            MoleculeError::Powers { .. } => "powers-not-independent",
            MoleculeError::NotGiven { .. } => "molecule-figure-not-given",
        }
    }

    fn hint(&self) -> String {
        match self {
            MoleculeError::NotOnRecord { known, .. } => {
                format!("give them yourself, as in `molecule(#{{ formula: \"CO2\", ... }})`; shipped are {known}")
            }
            MoleculeError::Key { known, .. } => format!("it has {known}"),
            MoleculeError::Missing { example, .. } => format!("add it, as in `{example}`"),
            MoleculeError::Sort { wanted, .. } => format!("give {wanted}"),
            MoleculeError::Unit { key, value } => format!(
                "write it with its unit, as in `\"{value} cm^-1\"`, or name one for all bare numbers: \
                 `{key}: [{value}], unit: \"cm^-1\"`"
            ),
            MoleculeError::Dimension { example, .. } => format!("write it as in {example}"),
            MoleculeError::NotPositive { .. } => {
                "leave out what is not there; translation and rotation of a quantum-chemical list are no vibrations"
                    .to_owned()
            }
            MoleculeError::Imaginary { .. } => {
                "follow the mode to the minimum and take the wavenumbers there; where it is a torsion, give it in \
                 `torsions` with its potential"
                    .to_owned()
            }
            MoleculeError::ModeCount { .. } => {
                "give each mode once, degenerate ones as `[\"667 cm^-1\", 2]`; a torsion takes the place of one".to_owned()
            }
            MoleculeError::SymmetryNumber { .. } => {
                "give a whole number from 1, or the point group, as in `point_group: \"C2v\"`".to_owned()
            }
            MoleculeError::RotationalConstants { .. } => {
                "give none for an atom, one for a linear molecule and three for any other, as in \
                 `rotational_constants: [\"9.94 cm^-1\", \"9.94 cm^-1\", \"6.20 cm^-1\"]`"
                    .to_owned()
            }
            MoleculeError::Distortion { .. } => {
                "give as many as belong to the molecule, as in `distortion: [\"1.33e-7 cm^-1\"]` of CO2, or leave them out"
                    .to_owned()
            }
            MoleculeError::DistortionLarge { .. } => {
                "distortion is the small correction of a rigid rotor, below a twentieth of its largest constant: look at the \
                 unit, as in `distortion: [\"1.33e-7 cm^-1\"]` of CO2, or leave it out"
                    .to_owned()
            }
            MoleculeError::PointGroup { .. } => {
                "write a Schoenflies symbol, such as C1, Cs, C3v, D2h, Td, Cinfv or Dinfh".to_owned()
            }
            MoleculeError::Formula { .. } => "choose another `name` for what is not the recorded substance".to_owned(),
            MoleculeError::Degeneracy { .. } => "write a pair, as in `[\"667 cm^-1\", 2]`".to_owned(),
            MoleculeError::LowestLevel { .. } => {
                "subtract it from all, so that the first is `[\"0 cm^-1\", 2]`".to_owned()
            }
            MoleculeError::ZeroMissing { .. } => {
                "say it: `formation_temperature: \"298.15 K\"` or `formation_temperature: \"0 K\"`".to_owned()
            }
            MoleculeError::ZeroDiffers { .. } => "leave out `formation_temperature`, or give the figure that it names".to_owned(),
            MoleculeError::ZeroElsewhere { .. } => {
                "take it to 298.15 K first, with the heat capacities it was derived with".to_owned()
            }
            MoleculeError::ElementIncrement { .. } => {
                "convert the figure to 298.15 K with increments of your own, and say `formation_temperature: \"298.15 K\"`"
                    .to_owned()
            }
            MoleculeError::NotInEquation { given, .. } => format!("write {given} in the equation, or leave it out of `own`"),
            MoleculeError::TableLine { .. } => {
                "a line is `property,value,unit,degeneracy`, as in `wavenumber,667,cm^-1,2`".to_owned()
            }
            MoleculeError::Table { .. } => {
                "begin a CSV table with the line `property,value,unit,degeneracy`, and a JSON table with `{`".to_owned()
            }
            MoleculeError::NeverClassical { .. } => "ask with a larger tolerance".to_owned(),
            MoleculeError::Powers { .. } => "give each power once, and fewer of them on a short interval".to_owned(),
            MoleculeError::NotGiven { .. } => "give it where the molecule is made".to_owned(),
        }
    }
}
