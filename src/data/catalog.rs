//! All substances on record, found by name.
//!
//! [`Catalog`] is plain data, shared by all sessions and built once per process. It merges the records of the datasets
//! by substance: two ids that name one substance are one entry, by the table of names. A [watched](Catalog::watched) one
//! remembers what it was asked for, so that a seal can keep the records that a notebook used.

use std::collections::{BTreeMap, BTreeSet};
use std::sync::{Arc, LazyLock, Mutex, PoisonError};

use crate::chem::element::{AtomicWeight, Element};
use crate::chem::formula::Formula;
use crate::chem::species::{Species, SpeciesName, State};
use crate::fault::Fault;
use crate::record::correlation::Correlation;
use crate::record::node::LeafKey;
use crate::source::{Embedded, STDLIB};
use crate::units::dimension::Entity;

use super::dataset::{Dataset, DatasetId, TableFault};
use super::formation::{self, Coefficients, Formation};
use super::function::Function;
use super::lookup::{Lookup, NameFault};
use super::molecule::Constants;
use super::names::Names;
use super::pressure;
use super::records::element_entity;
use super::substance::Substance;
use super::tables::Tables;
use super::transition::Transition;

/// The temperature of the tables of formation properties, K.
pub const T_REFERENCE_K: f64 = 298.15;

static SHIPPED: LazyLock<Arc<Catalog>> = LazyLock::new(|| {
    Arc::new(Catalog::from_files(STDLIB).expect("the shipped tables are read by the tests of this file"))
});

/// The records of a set of tables.
#[derive(Debug)]
pub struct Catalog {
    contents: Arc<Contents>,
    /// Entities that were asked for, where someone wants to know.
    asked: Option<Arc<Mutex<BTreeSet<Arc<str>>>>>,
}

#[derive(Debug)]
pub(super) struct Contents {
    pub datasets: Vec<Dataset>,
    pub substances: BTreeMap<Arc<str>, Arc<Substance>>,
    /// Substance id to its transitions, by temperature.
    pub transitions: BTreeMap<Arc<str>, Vec<Arc<Transition>>>,
    /// Substance id to the constants of its molecule.
    pub molecules: BTreeMap<Arc<str>, Arc<Constants>>,
    pub names: Arc<Names>,
    pub lookup: Lookup,
    pub weights: Arc<BTreeMap<Element, AtomicWeight>>,
}

/// What is being gathered on one substance.
#[derive(Default)]
pub(super) struct Gathered {
    pub function: Option<Arc<Function>>,
    pub formations: Vec<Arc<Formation>>,
    pub pressure: pressure::Constants,
}

impl Catalog {
    /// The tables built into the program.
    pub fn shipped() -> Arc<Catalog> {
        SHIPPED.clone()
    }

    /// The tables among some files; a dataset whose file is missing is simply not there.
    pub fn from_files(files: &[Embedded<'_>]) -> Result<Catalog, TableFault> {
        let Tables {
            datasets,
            functions,
            mut formations,
            coefficients,
            transitions,
            pressure,
            molecules,
            names,
            weights,
        } = Tables::read(files)?;
        let id = |record: &Arc<str>| names.same.get(record).unwrap_or(record).clone();
        for group in coefficients {
            correlate(group, &mut formations, id)?;
        }
        let mut gathered: BTreeMap<Arc<str>, Gathered> = BTreeMap::new();
        for function in functions {
            let entry = gathered.entry(id(&function.id)).or_default();
            entry.function = Some(Arc::new(function));
        }
        for formation in formations {
            let entry = gathered.entry(id(&formation.id)).or_default();
            entry.formations.push(Arc::new(formation));
        }
        // A figure for a substance without other records has nothing to stand beside.
        for critical in pressure.critical {
            if let Some(entry) = gathered.get_mut(&id(&critical.id)) {
                entry.pressure.critical = Some(Arc::new(critical));
            }
        }
        for virial in pressure.virial {
            if let Some(entry) = gathered.get_mut(&id(&virial.id)) {
                entry.pressure.virial = Some(Arc::new(virial));
            }
        }
        for volume in pressure.volume {
            if let Some(entry) = gathered.get_mut(&id(&volume.id)) {
                entry.pressure.volume = Some(Arc::new(volume));
            }
        }
        for vapour in pressure.vapour {
            if let Some(entry) = gathered.get_mut(&id(&vapour.id)) {
                entry.pressure.vapour = Some(Arc::new(vapour));
            }
        }
        let listed = names.preferred();
        let mut substances = BTreeMap::new();
        for (id, mut found) in gathered {
            if let Some(function) = &found.function
                && function.covers(T_REFERENCE_K)
                && !found.formations.iter().any(|formation| formation.dataset == function.dataset)
            {
                found.formations.push(Arc::new(Formation::of_function(function)));
            }
            let rank = |dataset: &DatasetId| datasets.iter().position(|known| known.id == *dataset);
            found.formations.sort_by_key(|formation| rank(&formation.dataset));
            substances.insert(id.clone(), Arc::new(substance(&id, found, &listed)?));
        }
        let mut by_substance: BTreeMap<Arc<str>, Vec<Arc<Transition>>> = BTreeMap::new();
        for mut transition in transitions {
            transition.from = id(&transition.from);
            transition.to = id(&transition.to);
            let transition = Arc::new(transition);
            by_substance.entry(transition.from.clone()).or_default().push(transition.clone());
            if transition.to != transition.from {
                by_substance.entry(transition.to.clone()).or_default().push(transition);
            }
        }
        for transitions in by_substance.values_mut() {
            transitions.sort_by(|left, right| left.t_k.total_cmp(&right.t_k));
        }
        let lookup = Lookup::new(&names, substances.values().map(|substance: &Arc<Substance>| &**substance));
        let molecules = molecules.into_iter().map(|one| (id(&one.id), Arc::new(one))).collect();
        let (names, weights) = (Arc::new(names), Arc::new(weights));
        let contents = Contents { datasets, substances, transitions: by_substance, molecules, names, lookup, weights };
        Ok(Catalog { contents: Arc::new(contents), asked: None })
    }

    /// The same catalogue, which remembers what it is asked for.
    #[must_use]
    pub fn watched(&self) -> Catalog {
        Catalog { contents: Arc::clone(&self.contents), asked: Some(Arc::default()) }
    }

    pub(super) fn contents(&self) -> &Contents {
        &self.contents
    }

    /// Another catalogue, which is watched as this one is.
    pub(super) fn watched_alike(&self, contents: Contents) -> Catalog {
        // One memory for both: what a cell asked before it laid records over counts too.
        Catalog { contents: Arc::new(contents), asked: self.asked.clone() }
    }

    /// The entities a watched catalogue was asked for.
    pub fn asked(&self) -> BTreeSet<Arc<str>> {
        let asked = self.asked.as_ref().map(|asked| asked.lock().unwrap_or_else(PoisonError::into_inner).clone());
        asked.unwrap_or_default()
    }

    /// The standard atomic weight of an element, where it has one on record.
    pub fn atomic_weight(&self, element: Element) -> Option<&AtomicWeight> {
        self.note(&element_entity(element.symbol()));
        self.contents.weights.get(&element)
    }

    /// Remembers that an entity was asked for.
    fn note(&self, entity: &str) {
        if let Some(asked) = &self.asked {
            let mut asked = asked.lock().unwrap_or_else(PoisonError::into_inner);
            if !asked.contains(entity) {
                asked.insert(entity.into());
            }
        }
    }

    /// The one substance that a text such as `CO2(g)`, `water(l)` or `C(cr,graphite)` names.
    pub fn find(&self, text: &str) -> Result<Arc<Substance>, NameFault> {
        let contents = &self.contents;
        let found = match contents.substances.get(text) {
            Some(substance) => substance,
            None => &contents.substances[contents.lookup.find(text)?],
        };
        self.note(found.species.entity.name());
        Ok(found.clone())
    }

    /// The species that a text names, for an equation: of a substance on record, or from its formula alone.
    ///
    /// A formula whose atoms a substance on record has is refused unless it names that substance, since an isomer
    /// may be meant.
    pub fn species(&self, text: &str) -> Result<Species, Fault> {
        match self.find(text) {
            Ok(substance) => Ok(substance.species.clone()),
            Err(unknown @ (NameFault::Unknown { .. } | NameFault::PhaseNotOnRecord { .. })) => {
                Species::from_formula(text).map_err(|_| unknown.into())
            }
            Err(fault) => Err(fault.into()),
        }
    }

    /// Other phases of a substance, among which it may not be the stable one. A solution is not a phase of its solute.
    pub fn phases_of(&self, substance: &Substance) -> Vec<Arc<Substance>> {
        let dissolved = |species: &Species| species.phase.state == State::Aqueous;
        if dissolved(&substance.species) {
            return Vec::new();
        }
        let others = self.contents.substances.values().filter(|other| {
            other.species.entity == substance.species.entity
                && other.id() != substance.id()
                && !dissolved(&other.species)
        });
        others.cloned().collect()
    }

    /// The transitions that a phase takes part in, by temperature; those within its function have it at both ends.
    pub fn transitions_of(&self, substance: &Substance) -> &[Arc<Transition>] {
        self.contents.transitions.get(substance.id()).map_or(&[], Vec::as_slice)
    }

    /// The phase whose function covers 298.15 K and whose enthalpy scale the function of `substance` continues:
    /// itself, or what transitions lead to. A formation enthalpy of that phase is the one to join to the function.
    pub fn reference_phase(&self, substance: &Arc<Substance>) -> Option<Arc<Substance>> {
        let mut seen: Vec<Arc<Substance>> = vec![substance.clone()];
        let mut at = 0;
        while let Some(phase) = seen.get(at).cloned() {
            if phase.function.as_ref()?.covers(T_REFERENCE_K) {
                return Some(phase);
            }
            for transition in self.transitions_of(&phase) {
                for id in [&transition.from, &transition.to] {
                    if !seen.iter().any(|known| known.id() == &**id) {
                        seen.extend(self.contents.substances.get(id).cloned());
                    }
                }
            }
            at += 1;
        }
        None
    }

    /// The constants of a gas's molecule.
    pub fn molecule(&self, substance: &Substance) -> Option<&Arc<Constants>> {
        self.contents.molecules.get(substance.id())
    }

    /// All molecules on record, by id.
    pub fn molecules(&self) -> impl Iterator<Item = &Arc<Constants>> {
        self.contents.molecules.values()
    }

    /// Substances whose id or name holds a text, upper and lower case alike: those that start with it first.
    pub fn search(&self, text: &str) -> Vec<Arc<Substance>> {
        let wanted = text.to_lowercase();
        let mut found: Vec<(bool, &Arc<Substance>)> = Vec::new();
        for substance in self.contents.substances.values() {
            let id = substance.id().to_lowercase();
            let name = substance.name.as_deref().unwrap_or_default().to_lowercase();
            if id.contains(&wanted) || name.contains(&wanted) {
                found.push((!id.starts_with(&wanted) && !name.starts_with(&wanted), substance));
            }
        }
        found.sort_by_key(|&(later, _)| later); // stable, so by id within each half
        found.into_iter().map(|(_, substance)| substance.clone()).collect()
    }

    /// All substances, by id.
    pub fn substances(&self) -> impl Iterator<Item = &Arc<Substance>> {
        self.contents.substances.values()
    }

    /// In order of precedence of their formation enthalpies.
    pub fn datasets(&self) -> &[Dataset] {
        &self.contents.datasets
    }

    pub fn dataset(&self, id: &DatasetId) -> Option<&Dataset> {
        self.contents.datasets.iter().find(|dataset| dataset.id == *id)
    }

    /// A dataset and those that it extends, nearest first.
    pub fn with_extended<'a>(&'a self, id: &'a DatasetId) -> impl Iterator<Item = &'a DatasetId> {
        // A dataset extends one that was there before it, so this ends.
        std::iter::successors(Some(id), |id| self.dataset(id)?.extends.as_ref())
    }
}

/// Joins correlation coefficients to the formation enthalpies they are of. `id` is the name a substance goes by.
fn correlate(
    group: Coefficients,
    formations: &mut [Formation],
    id: impl Fn(&Arc<str>) -> Arc<str>,
) -> Result<(), TableFault> {
    let Coefficients { dataset, path, records, r } = group;
    let unusable = |why: String| TableFault::Correlation { path: path.clone(), why };
    let is_of = |formation: &Formation, record: &Arc<str>| formation.dataset == dataset && formation.id == *record;
    if let Some(unknown) = records.iter().find(|record| !formations.iter().any(|one| is_of(one, record))) {
        return Err(unusable(format!("it has no record {unknown}")));
    }
    let key = |record| LeafKey::Datum {
        dataset: dataset.shared(),
        record: id(record),
        field: formation::FIELD,
        t_bits: 0,
        way: "",
    };
    let made = Correlation::new(records.iter().map(key).collect(), r).map_err(|error| unusable(error.to_string()))?;
    let made = Arc::new(made);
    for formation in formations.iter_mut().filter(|one| records.iter().any(|record| is_of(one, record))) {
        if formation.correlation.replace(Arc::clone(&made)).is_some() {
            return Err(unusable(format!("{} is in two groups", formation.id)));
        }
    }
    Ok(())
}

/// Makes a substance of its records.
pub(super) fn substance(
    id: &Arc<str>,
    found: Gathered,
    listed: &BTreeMap<&str, &Arc<str>>,
) -> Result<Substance, TableFault> {
    let function = found.function.as_ref();
    let formations = || found.formations.iter();
    let unreadable = |why: String| TableFault::Name { record: id.to_string(), why };
    let name: SpeciesName = id.parse().map_err(|error| unreadable(format!("{error}")))?;
    let text = function.map(|f| &f.formula).or_else(|| formations().map(|f| &f.formula).next());
    let formula =
        Formula::parse_record(text.map_or("", |text| text)).map_err(|error| unreadable(format!("{error}")))?;
    let words = function.map(|f| f.name.clone());
    let words = words.or_else(|| formations().find_map(|f| f.name.clone()));
    let cas = function.and_then(|f| f.cas.clone());
    Ok(Substance {
        species: Species {
            id: id.clone(),
            entity: Entity::named(&name.base),
            composition: formula.composition().clone(),
            charge: formula.charge(),
            phase: name.phase.ok_or_else(|| unreadable("it has no phase".to_owned()))?,
        },
        name: words.or_else(|| listed.get(&*name.base).map(|&name| name.clone())),
        cas: cas.or_else(|| formations().find_map(|f| f.cas.clone())),
        formations: found.formations,
        function: found.function,
        pressure: found.pressure,
    })
}
