//! What takes part in a reaction: a substance or ion in a phase.
//!
//! [`SpeciesName`] is the text, split into base and phase; `n-butane(g)` is one without anybody knowing what n-butane
//! is made of. [`Species`] is the thing itself, made by whoever knows the records. `(s)` is read as `(cr)`: the tables
//! speak of crystals, and a glass is written `(gl)`.

use std::fmt;
use std::str::FromStr;
use std::sync::Arc;

use crate::chem::composition::Composition;
use crate::chem::formula::{Formula, FormulaError};
use crate::fault::Explain;
use crate::units::dimension::Entity;

const LONGEST: usize = 400;

/// State of aggregation, with the symbols of the tables.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum State {
    /// Ideal gas.
    Gas,
    Liquid,
    Crystal,
    Glass,
    /// Dissolved in water, the hypothetical ideal solution of 1 mol/kg.
    Aqueous,
}

impl State {
    pub const ALL: [State; 5] = [State::Gas, State::Liquid, State::Crystal, State::Glass, State::Aqueous];

    pub fn symbol(self) -> &'static str {
        match self {
            State::Gas => "g",
            State::Liquid => "l",
            State::Crystal => "cr",
            State::Glass => "gl",
            State::Aqueous => "aq",
        }
    }

    /// The state of that symbol; `s` is read as `cr`.
    pub fn from_symbol(symbol: &str) -> Option<State> {
        if symbol == "s" {
            return Some(State::Crystal);
        }
        State::ALL.into_iter().find(|state| state.symbol() == symbol)
    }
}

/// A state, and which form of it where a substance has several: `cr,graphite`, `aq,undissoc.`
#[derive(Clone, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Phase {
    pub state: State,
    pub form: Option<String>,
}

impl Phase {
    pub fn of(state: State) -> Phase {
        Phase { state, form: None }
    }

    /// Reads what stands between the brackets, as in `cr,graphite`; `None` if that is no phase.
    fn read(text: &str) -> Option<Phase> {
        match text.split_once(',') {
            None => Some(Phase::of(State::from_symbol(text.trim())?)),
            Some((state, form)) => {
                let form = form.trim();
                let state = State::from_symbol(state.trim())?;
                (!form.is_empty()).then(|| Phase { state, form: Some(form.to_owned()) })
            }
        }
    }
}

/// As between the brackets: `g`, `cr,graphite`.
impl fmt::Display for Phase {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match &self.form {
            None => f.write_str(self.state.symbol()),
            Some(form) => write!(f, "{},{form}", self.state.symbol()),
        }
    }
}

/// A species as written: a formula or name, and the phase where one is given.
#[derive(Clone, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct SpeciesName {
    /// `CO2`, `n-butane`, `methyl formate`: single spaces, no phase.
    pub base: String,
    pub phase: Option<Phase>,
}

/// Why a text names no species.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum SpeciesError {
    #[error("there is no substance here: the text {text:?} names none")]
    NoName { text: String },
    #[error("a name of {length} characters is longer than the {LONGEST} that are read")]
    TooLong { length: usize },
    #[error("in {text}: ({phase}) is no phase of a substance")]
    UnknownPhase { text: String, phase: String },
    #[error("in {text}: a bracket is opened and never closed, or closed and never opened")]
    UnpairedBracket { text: String },
    #[error("after {before} comes {rest:?}, which belongs to nothing")]
    StrayText { before: String, rest: String },
    #[error("{name} has no phase, and its values differ from phase to phase")]
    NoPhase { name: String },
    #[error(transparent)]
    Formula(#[from] FormulaError),
}

impl Explain for SpeciesError {
    fn code(&self) -> &'static str {
        match self {
            SpeciesError::NoName { .. } => "no-substance-name",
            SpeciesError::TooLong { .. } => "substance-name-too-long",
            SpeciesError::UnknownPhase { .. } => "unknown-phase",
            SpeciesError::UnpairedBracket { .. } => "unpaired-bracket",
            SpeciesError::StrayText { .. } => "stray-text",
            SpeciesError::NoPhase { .. } => "no-phase",
            SpeciesError::Formula(error) => error.code(),
        }
    }

    fn hint(&self) -> String {
        match self {
            SpeciesError::NoName { .. } => "write a formula or a name and the phase, as in CO2(g) or n-butane(g)".to_owned(),
            SpeciesError::TooLong { .. } => "use the formula instead of the name".to_owned(),
            SpeciesError::UnknownPhase { .. } => {
                "phases are g (gas), l (liquid), cr (crystal), gl (glass) and aq (in water); a form follows a comma, as \
                 in C(cr,graphite)"
                    .to_owned()
            }
            SpeciesError::UnpairedBracket { .. } => "give each bracket its partner, as in Ca(OH)2(cr)".to_owned(),
            SpeciesError::StrayText { .. } => {
                "put + between two species, and conditions such as a temperature into the call".to_owned()
            }
            SpeciesError::NoPhase { name } => format!("write {name}(g), {name}(l), {name}(cr) or {name}(aq)"),
            SpeciesError::Formula(error) => error.hint(),
        }
    }
}

/// Byte position of the bracket that the last character closes; `None` if it closes none.
fn last_group_start(text: &str) -> Option<usize> {
    if !text.ends_with(')') {
        return None;
    }
    let mut depth = 0_usize;
    for (at, c) in text.char_indices().rev() {
        match c {
            ')' => depth += 1,
            '(' => depth -= 1,
            _ => {}
        }
        if depth == 0 {
            return Some(at);
        }
    }
    None
}

/// Whether a text ends in a phase, as `CO2(g)` does and `Ca(OH)` does not.
pub(super) fn ends_in_phase(text: &str) -> bool {
    last_group_start(text).is_some_and(|start| Phase::read(&text[start + 1..text.len() - 1]).is_some())
}

/// Whether a text starts with a phase, as `(aq) + …` does and `(OH)2` does not.
pub(super) fn starts_with_phase(text: &str) -> bool {
    let group = text.strip_prefix('(').and_then(|rest| rest.split_once(')'));
    group.is_some_and(|(inside, _)| Phase::read(inside).is_some())
}

fn brackets_pair(text: &str) -> bool {
    let mut open = Vec::new();
    for c in text.chars() {
        match c {
            '(' | '[' => open.push(c),
            ')' if open.pop() != Some('(') => return false,
            ']' if open.pop() != Some('[') => return false,
            _ => {}
        }
    }
    open.is_empty()
}

impl FromStr for SpeciesName {
    type Err = SpeciesError;

    /// Reads `CO2`, `C(cr,graphite)`, `Ca(OH)2(cr)`, `methyl formate(l)`, `H2O (l)`.
    fn from_str(text: &str) -> Result<Self, SpeciesError> {
        let length = text.chars().count();
        if length > LONGEST {
            return Err(SpeciesError::TooLong { length });
        }
        let text = text.split_whitespace().collect::<Vec<_>>().join(" ");
        if !brackets_pair(&text) {
            return Err(SpeciesError::UnpairedBracket { text });
        }
        let mut base = text.as_str();
        let mut phase = None;
        if let Some(start) = last_group_start(&text) {
            let inside = &text[start + 1..text.len() - 1];
            phase = Phase::read(inside);
            // Elements start with a capital letter, so a group in small letters can only be meant as a phase.
            if phase.is_none() && inside.starts_with(|c: char| c.is_ascii_lowercase()) && start > 0 {
                let phase = inside.to_owned();
                return Err(SpeciesError::UnknownPhase { text, phase });
            }
            if phase.is_some() {
                base = text[..start].trim_end();
            }
        }
        if !base.chars().any(|c| c.is_alphabetic()) {
            return Err(SpeciesError::NoName { text });
        }
        // A phase ends a species; what follows it is another one without its plus sign, or a condition. At the very
        // start it is part of a name, as in (l)-menthol.
        if let Some((at, _)) = base.match_indices('(').find(|&(at, _)| at > 0 && starts_with_phase(&base[at..])) {
            let end = at + base[at..].find(')').map_or(0, |close| close + 1);
            return Err(SpeciesError::StrayText {
                before: text[..end].to_owned(),
                rest: text[end..].trim().to_owned(),
            });
        }
        Ok(SpeciesName { base: base.to_owned(), phase })
    }
}

/// `C(cr,graphite)`; parses back to an equal one.
impl fmt::Display for SpeciesName {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.base)?;
        match &self.phase {
            Some(phase) => write!(f, "({phase})"),
            None => Ok(()),
        }
    }
}

/// A substance or ion in one phase.
#[derive(Clone, Debug)]
pub struct Species {
    /// Name with phase, as in the tables: `C(cr,graphite)`. Equal ids are one species.
    pub id: Arc<str>,
    /// The same without phase, for `mol[CO2]`.
    pub entity: Entity,
    pub composition: Composition,
    pub charge: i32,
    pub phase: Phase,
}

impl Species {
    /// A species whose base is a formula; no records are asked.
    pub fn from_formula(text: &str) -> Result<Species, SpeciesError> {
        let name: SpeciesName = text.parse()?;
        let formula = Formula::parse(&name.base)?;
        let base = formula.reference_name();
        let Some(phase) = name.phase else {
            return Err(SpeciesError::NoPhase { name: base });
        };
        Ok(Species {
            id: format!("{base}({phase})").into(),
            entity: Entity::named(&base),
            charge: formula.charge(),
            composition: formula.composition().clone(),
            phase,
        })
    }

    pub fn is_gas(&self) -> bool {
        self.phase.state == State::Gas
    }
}

impl PartialEq for Species {
    fn eq(&self, other: &Self) -> bool {
        self.id == other.id
    }
}

impl Eq for Species {}

impl fmt::Display for Species {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.id)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn split(text: &str) -> (String, String) {
        let name: SpeciesName = text.parse().unwrap_or_else(|error| panic!("{text}: {error}"));
        (name.base, name.phase.map_or_else(String::new, |phase| phase.to_string()))
    }

    #[test]
    fn names_and_phases_are_told_apart() {
        let rows = [
            ("CO2", "CO2", ""),
            ("C(cr,graphite)", "C", "cr,graphite"),
            ("CO2(aq,undissoc.)", "CO2", "aq,undissoc."),
            ("n-butane(g)", "n-butane", "g"),
            ("2,2,4-trimethylpentane(g)", "2,2,4-trimethylpentane", "g"),
            ("Ca(OH)2(cr,portlandite)", "Ca(OH)2", "cr,portlandite"),
            ("Ca(OH)2", "Ca(OH)2", ""),
            ("Fe(CO)", "Fe(CO)", ""),
            ("Fe(CO)5(l)", "Fe(CO)5", "l"),
            ("methyl formate(l)", "methyl formate", "l"),
            ("  methyl   formate (l) ", "methyl formate", "l"),
            ("SiO2(gl)", "SiO2", "gl"),
            ("NaCl(s)", "NaCl", "cr"),
            ("SO4-2(aq)", "SO4-2", "aq"),
            ("L-(+)-tartaric acid(cr)", "L-(+)-tartaric acid", "cr"),
            ("(l)-menthol(cr)", "(l)-menthol", "cr"),
            ("CdSO4.8/3H2O(cr)", "CdSO4.8/3H2O", "cr"),
        ];
        for (text, base, phase) in rows {
            assert_eq!(split(text), (base.to_owned(), phase.to_owned()), "{text}");
            let name: SpeciesName = text.parse().unwrap();
            assert_eq!(name.to_string().parse::<SpeciesName>().unwrap(), name);
        }
    }

    #[test]
    fn faults_say_what_is_in_the_way() {
        let rows = [
            ("", "no-substance-name", "there is no substance here: the text \"\" names none"),
            ("(g)", "no-substance-name", "there is no substance here: the text \"(g)\" names none"),
            ("2", "no-substance-name", "there is no substance here: the text \"2\" names none"),
            ("CO2(gas)", "unknown-phase", "in CO2(gas): (gas) is no phase of a substance"),
            ("C(cr,)", "unknown-phase", "in C(cr,): (cr,) is no phase of a substance"),
            ("H2(g) O2(g)", "stray-text", "after H2(g) comes \"O2(g)\", which belongs to nothing"),
            ("H2O(g) at 298 K", "stray-text", "after H2O(g) comes \"at 298 K\", which belongs to nothing"),
            (
                "Ca(OH2(cr)",
                "unpaired-bracket",
                "in Ca(OH2(cr): a bracket is opened and never closed, or closed and never opened",
            ),
        ];
        for (text, code, message) in rows {
            let error = text.parse::<SpeciesName>().expect_err(text);
            assert_eq!((error.code(), error.to_string().as_str()), (code, message));
        }
    }

    #[test]
    fn a_species_from_its_formula_has_the_name_of_the_tables() {
        let sulfate = Species::from_formula("SO4^2-(aq)").unwrap();
        assert_eq!((&*sulfate.id, sulfate.entity.name(), sulfate.charge), ("SO4-2(aq)", "SO4-2", -2));
        assert_eq!(sulfate, Species::from_formula("SO4-2(aq)").unwrap());
        assert_ne!(Species::from_formula("H2O(l)").unwrap(), Species::from_formula("H2O(g)").unwrap());
        let error = Species::from_formula("H2O").unwrap_err();
        assert_eq!(error.code(), "no-phase");
        assert_eq!(error.hint(), "write H2O(g), H2O(l), H2O(cr) or H2O(aq)");
        assert_eq!(Species::from_formula("n-butane(g)").unwrap_err().code(), "formula-unreadable");
    }
}
