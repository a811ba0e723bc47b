//! From what people write to the id of a substance on record.
//!
//! [`Lookup`] answers only where one substance is meant: a name without phase, a formula that isomers share and a
//! substance in several crystal forms are refused with the ids to choose from. The surprise: a formula finds a
//! substance only as one of its names, never by counting atoms; atoms only help the refusal.

use std::collections::{BTreeMap, BTreeSet};
use std::fmt;
use std::sync::Arc;

use crate::chem::composition::Composition;
use crate::chem::formula::Formula;
use crate::chem::species::{Phase, SpeciesError, SpeciesName, State};
use crate::fault::Explain;

use super::names::Names;
use super::near::nearest;
use super::substance::Substance;

/// Why a text names no substance on record.
#[derive(Clone, Debug, PartialEq)]
pub enum NameFault {
    /// The text is not written as a name with phase at all.
    Unreadable(SpeciesError),
    /// A substance without its phase.
    PhaseMissing { name: String, candidates: Vec<String> },
    /// A substance in several forms of the phase.
    SeveralForms { name: String, candidates: Vec<String> },
    /// A formula that names no substance, with the substances that have those atoms.
    FormulaShared { name: String, candidates: Vec<String> },
    /// A substance on record, though not in this phase.
    PhaseNotOnRecord { name: String, candidates: Vec<String> },
    /// Nothing of the kind.
    Unknown { name: String, near: Vec<String> },
}

/// `a`, `a or b`, `a, b or c`
fn one_of(names: &[String]) -> String {
    match names {
        [] => "nothing".to_owned(),
        [only] => only.clone(),
        [all @ .., last] => format!("{} or {last}", all.join(", ")),
    }
}

impl fmt::Display for NameFault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            NameFault::Unreadable(error) => error.fmt(f),
            NameFault::PhaseMissing { name, candidates } => {
                write!(f, "{name} has no phase: it can be {}", one_of(candidates))
            }
            NameFault::SeveralForms { name, candidates } => {
                write!(f, "{name} is on record in {} forms: {}", candidates.len(), one_of(candidates))
            }
            NameFault::FormulaShared { name, candidates } => {
                write!(f, "{name} is a formula that several substances can share; on record with these atoms: ")?;
                f.write_str(&candidates.join(", "))
            }
            NameFault::PhaseNotOnRecord { name, candidates } => {
                write!(f, "{name} is not on record; of the same substance there is {}", candidates.join(", "))
            }
            NameFault::Unknown { name, .. } => write!(f, "{name} is not on record"),
        }
    }
}

impl Explain for NameFault {
    fn code(&self) -> &'static str {
        match self {
            NameFault::Unreadable(error) => error.code(),
            NameFault::PhaseMissing { .. } => "phase-missing",
            NameFault::SeveralForms { .. } => "form-ambiguous",
            NameFault::FormulaShared { .. } => "name-ambiguous",
            NameFault::PhaseNotOnRecord { .. } => "phase-not-on-record",
            NameFault::Unknown { .. } => "substance-unknown",
        }
    }

    fn hint(&self) -> String {
        match self {
            NameFault::Unreadable(error) => error.hint(),
            NameFault::PhaseMissing { candidates, .. } | NameFault::SeveralForms { candidates, .. } => {
                format!("write {}", one_of(candidates))
            }
            NameFault::FormulaShared { candidates, .. } => {
                format!("write the name of the one that is meant: {}", one_of(candidates))
            }
            NameFault::PhaseNotOnRecord { candidates, .. } => {
                format!("use {}, or another substance", one_of(candidates))
            }
            NameFault::Unknown { near, .. } if near.is_empty() => {
                "write a formula or name with its phase, as in CO2(g) or n-butane(g)".to_owned()
            }
            NameFault::Unknown { near, .. } => format!("perhaps {}", one_of(near)),
        }
    }
}

/// A substance without phase, by what a search needs of it.
#[derive(Debug)]
struct Entry {
    composition: Composition,
    charge: i32,
    /// Phase and id, in order of state and id.
    phases: Vec<(Phase, Arc<str>)>,
}

/// The names of all substances on record.
#[derive(Debug, Default)]
pub(super) struct Lookup {
    entities: BTreeMap<Arc<str>, Entry>,
    /// Other names to entities, case and all.
    names: BTreeMap<Arc<str>, Arc<str>>,
    /// The names that are words, in lower case: case matters in formulas only.
    words: BTreeMap<String, Arc<str>>,
    /// Ids as a dataset writes them, to the ids used here.
    same: BTreeMap<Arc<str>, Arc<str>>,
    /// Names of one crystal form, in lower case, to ids.
    forms: BTreeMap<String, Arc<str>>,
}

impl Lookup {
    pub fn new<'a>(names: &Names, substances: impl Iterator<Item = &'a Substance>) -> Lookup {
        let mut lookup = Lookup::default();
        let mut record_names = Vec::new();
        for substance in substances {
            let species = &substance.species;
            let entity: Arc<str> = species.entity.name().into();
            // A record of graphite is called graphite, which is no name for the other phases of carbon.
            let name = substance.name.iter().filter(|name| !names.forms.contains_key(*name));
            record_names.extend(name.map(|name| (name, entity.clone())));
            let entry = lookup.entities.entry(entity).or_insert_with(|| Entry {
                composition: species.composition.clone(),
                charge: species.charge,
                phases: Vec::new(),
            });
            entry.phases.push((species.phase.clone(), species.id.clone()));
        }
        for entry in lookup.entities.values_mut() {
            entry
                .phases
                .sort_by(|(left, left_id), (right, right_id)| (left.state, left_id).cmp(&(right.state, right_id)));
        }
        for (name, entity) in record_names {
            lookup.name(name, &entity);
        }
        for record in &names.entities {
            for name in record.name.iter().chain(&record.names) {
                lookup.name(name, &record.entity);
            }
        }
        let ids: BTreeSet<&Arc<str>> = lookup.entities.values().flat_map(|entry| &entry.phases).map(|p| &p.1).collect();
        let on_record = |(_, id): &(&Arc<str>, &Arc<str>)| ids.contains(id);
        lookup.forms =
            names.forms.iter().filter(on_record).map(|(name, id)| (name.to_lowercase(), id.clone())).collect();
        lookup.same = names.same.iter().filter(on_record).map(|(same, id)| (same.clone(), id.clone())).collect();
        lookup
    }

    /// A name for an entity, unless the entity's dataset is not among the files.
    fn name(&mut self, name: &Arc<str>, entity: &Arc<str>) {
        if !self.entities.contains_key(entity) {
            return;
        }
        self.names.insert(name.clone(), entity.clone());
        // Formulas start with a capital letter or a bracket; only names that do need a closer look.
        if name.starts_with(|first: char| first.is_ascii_lowercase()) || Formula::parse_record(name).is_err() {
            self.words.insert(name.to_lowercase(), entity.clone());
        }
    }

    /// The id of the one substance that a text names.
    pub fn find(&self, text: &str) -> Result<&Arc<str>, NameFault> {
        let name: SpeciesName = text.parse().map_err(NameFault::Unreadable)?;
        if let Some(id) = self.same.get(name.to_string().as_str()) {
            return Ok(id);
        }
        let Some((entity, entry)) = self.entity_named(&name.base) else {
            return self.find_form(&name);
        };
        let Some(phase) = &name.phase else {
            let candidates = entry.phases.iter().map(|(_, id)| id.to_string()).collect();
            return Err(NameFault::PhaseMissing { name: name.to_string(), candidates });
        };
        match self.same.get(format!("{entity}({phase})").as_str()) {
            Some(id) => Ok(id),
            None => entry.choose(phase, &name),
        }
    }

    /// The entity that a text without phase names: by the name of the table, another name, or another spelling.
    fn entity_named(&self, base: &str) -> Option<(&Arc<str>, &Entry)> {
        self.entities
            .get_key_value(base)
            .or_else(|| self.entities.get_key_value(self.names.get(base)?))
            .or_else(|| self.entities.get_key_value(self.words.get(&base.to_lowercase())?))
            .or_else(|| {
                let name = Formula::parse(base).ok()?.reference_name();
                self.entities
                    .get_key_value(name.as_str())
                    .or_else(|| self.entities.get_key_value(self.names.get(name.as_str())?))
            })
    }

    /// A name such as graphite, which says substance and form at once; refusals where there is none.
    fn find_form(&self, name: &SpeciesName) -> Result<&Arc<str>, NameFault> {
        let Some(id) = self.forms.get(&name.base.to_lowercase()) else {
            return Err(self.refuse(name));
        };
        let candidates = vec![id.to_string()];
        match &name.phase {
            None => Err(NameFault::PhaseMissing { name: name.to_string(), candidates }),
            Some(phase) if *phase == Phase::of(State::Crystal) => Ok(id),
            Some(_) => Err(NameFault::PhaseNotOnRecord { name: name.to_string(), candidates }),
        }
    }

    /// Says what comes near to a name that nothing on record has: the same atoms, or similar letters.
    fn refuse(&self, name: &SpeciesName) -> NameFault {
        let fits = |phase: &Phase| name.phase.as_ref().is_none_or(|wanted| wanted.state == phase.state);
        if let Ok(formula) = Formula::parse(&name.base) {
            let same_atoms = self
                .entities
                .values()
                .filter(|entry| entry.charge == formula.charge() && entry.composition == *formula.composition());
            let phases: Vec<&(Phase, Arc<str>)> = same_atoms.flat_map(|entry| &entry.phases).collect();
            let mut fitting: Vec<&(Phase, Arc<str>)> =
                phases.iter().copied().filter(|(phase, _)| fits(phase)).collect();
            if fitting.is_empty() {
                fitting = phases;
            }
            if !fitting.is_empty() {
                let candidates = fitting.iter().map(|(_, id)| id.to_string()).collect();
                return NameFault::FormulaShared { name: name.to_string(), candidates };
            }
        }
        let other_names = self.names.iter().filter_map(|(name, entity)| Some((name, self.entities.get(entity)?)));
        let mut known: Vec<String> = Vec::new();
        for (known_name, entry) in self.entities.iter().chain(other_names) {
            let mut states: Vec<State> =
                entry.phases.iter().filter(|(phase, _)| fits(phase)).map(|(phase, _)| phase.state).collect();
            states.dedup();
            known.extend(states.iter().map(|state| format!("{known_name}({})", state.symbol())));
        }
        let near = match name.phase {
            Some(_) => nearest(&name.to_string(), known.iter().map(String::as_str), 3),
            None => nearest(&format!("{name}(g)"), known.iter().map(String::as_str), 3),
        };
        NameFault::Unknown { name: name.to_string(), near: near.into_iter().map(str::to_owned).collect() }
    }
}

impl Entry {
    /// The id of the one phase that fits; a form need not be named where there is only one.
    fn choose(&self, phase: &Phase, name: &SpeciesName) -> Result<&Arc<str>, NameFault> {
        let of_state: Vec<&(Phase, Arc<str>)> =
            self.phases.iter().filter(|(known, _)| known.state == phase.state).collect();
        let fits = |known: &Phase| match (&phase.form, &known.form) {
            (None, _) => true,
            (Some(wanted), Some(form)) => wanted.eq_ignore_ascii_case(form),
            (Some(_), None) => false,
        };
        let fitting: Vec<&(Phase, Arc<str>)> = of_state.iter().copied().filter(|(known, _)| fits(known)).collect();
        let ids = |phases: &[&(Phase, Arc<str>)]| phases.iter().map(|(_, id)| id.to_string()).collect();
        match fitting.as_slice() {
            [(_, only)] => Ok(only),
            [] if of_state.is_empty() => {
                let candidates = self.phases.iter().map(|(_, id)| id.to_string()).collect();
                Err(NameFault::PhaseNotOnRecord { name: name.to_string(), candidates })
            }
            [] => Err(NameFault::PhaseNotOnRecord { name: name.to_string(), candidates: ids(&of_state) }),
            several => Err(NameFault::SeveralForms { name: name.to_string(), candidates: ids(several) }),
        }
    }
}
