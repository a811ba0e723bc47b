//! Records of one's own: a JSON file beside a notebook, read into the records that the shipped tables are read into.
//!
//! The schema is told in the README. Figures are written as in a notebook, `"-285.830(20) kJ/mol"` or `"5.2 ± 0.4 kJ/mol,
//! k=2"`, so that the unit and the meaning of an uncertainty are said at each. The surprise: nothing is passed over in
//! silence, a field that is not known is refused like one that is missing.

use std::collections::BTreeMap;
use std::sync::Arc;

use crate::chem::formula::Formula;
use crate::chem::species::{SpeciesError, SpeciesName};
use crate::fault::Explain;
use crate::num::powers::Power;
use crate::source::{Citation, Embedded};
use crate::units::constants;

use super::catalog::{Catalog, T_REFERENCE_K};
use super::dataset::{Dataset, DatasetId, Datum, Table};
use super::form::{self, FORMS, Form, POWERS};
use super::formation::{Confirmation, Formation};
use super::function::{Function, Interval, Stated, Zero};
use super::lookup::NameFault;
use super::own_fault::{OwnFault, Problem};
use super::own_reader::{Measure, Spot};
use super::transition::{Transition, TransitionKind};
use super::tree::{Tree, shortened};

pub const SCHEMA: &str = "hessbook-records/1";

/// 1 bar, to which entropies of a file belong.
const P_STANDARD_PA: f64 = 1e5;

/// A file that was read, every record of it checked.
#[derive(Clone, Debug)]
pub struct Own {
    pub dataset: Dataset,
    pub functions: Vec<Arc<Function>>,
    pub formations: Vec<Arc<Formation>>,
    pub transitions: Vec<Arc<Transition>>,
    /// Id, formula and name of each record, in the order of the file.
    pub phases: Vec<OwnPhase>,
}

/// What is said of a phase besides its figures.
#[derive(Clone, Debug)]
pub struct OwnPhase {
    pub id: Arc<str>,
    pub formula: Arc<str>,
    pub name: Option<Arc<str>>,
}

/// Reads a file. `base` is what it will be laid over: its names are understood, and its phases can be joined to.
///
/// # Errors
/// The first thing in the file that cannot be used.
pub fn read(file: &Embedded<'_>, base: &Catalog) -> Result<Own, OwnFault> {
    let whole = |problem: Problem| OwnFault {
        file: file.path.to_owned(),
        record: String::new(),
        field: String::new(),
        problem: problem.into(),
    };
    let tree = Tree::read(file.bytes).map_err(|error| whole(Problem::NotJson { why: error.to_string() }))?;
    let page = Spot::whole(file.path, &tree);
    page.object()?;
    let found = page.tree.get("schema").map_or_else(|| "missing".to_owned(), Tree::words);
    if page.tree.get("schema") != Some(&Tree::Text(SCHEMA.to_owned())) {
        return Err(whole(Problem::Schema { found, wanted: SCHEMA }));
    }
    page.only(&["schema", "dataset", "title", "note", "records", "transitions"])?;
    let records = page.need("records", "a list of records")?.items()?;
    let mut reading = Reading { base, dataset: dataset(&page, file, records.len(), base)?, drafts: Vec::new() };
    let mut phases = Vec::new();
    let mut formations = Vec::new();
    for record in &records {
        let (phase, formation) = reading.record(record)?;
        if phases.iter().any(|known: &OwnPhase| known.id == phase.id) {
            return Err(record.fault(Problem::Twice));
        }
        phases.push(phase);
        formations.extend(formation.map(Arc::new));
    }
    let transitions = match page.member("transitions") {
        Some(list) => list.items()?,
        None => Vec::new(),
    };
    let read: Vec<Transition> = transitions.iter().map(|one| reading.transition(one)).collect::<Result<_, _>>()?;
    let joined = reading.joined(read, &transitions)?;
    let functions = reading.drafts.into_iter().map(|draft| Arc::new(draft.function)).collect();
    Ok(Own {
        dataset: reading.dataset,
        functions,
        formations,
        transitions: joined.into_iter().map(Arc::new).collect(),
        phases,
    })
}

fn dataset(page: &Spot<'_>, file: &Embedded<'_>, records: usize, base: &Catalog) -> Result<Dataset, OwnFault> {
    let head = page.need("dataset", "an object with `id`, `short`, `publication` and `terms`")?;
    head.object()?;
    head.only(&["id", "short", "publication", "terms", "extends", "note"])?;
    let id = head.need("id", "a short name such as \"larkmoor-2026\"")?;
    let is_name = |text: &str| {
        !text.is_empty() && text.chars().all(|c| c.is_ascii_lowercase() || c.is_ascii_digit() || "-.".contains(c))
    };
    if !is_name(id.text()?) || id.text()? == "mixed" {
        return Err(id.fault(Problem::Sort {
            found: id.tree.words(),
            wanted: "a short name of small letters, digits, points and hyphens",
        }));
    }
    let name = DatasetId::new(id.text()?);
    if base.dataset(&name).is_some() {
        return Err(id.fault(Problem::IdTaken { id: name.to_string() }));
    }
    let extends = match head.member("extends") {
        None => None,
        Some(extends) => {
            let wanted = DatasetId::new(extends.text()?);
            let known = base.datasets().iter().filter(|dataset| dataset.rank.is_some());
            if !known.clone().any(|dataset| dataset.id == wanted) {
                let known: Vec<String> = known.map(|dataset| format!("`{}`", dataset.id)).collect();
                return Err(extends.fault(Problem::Extends { id: wanted.to_string(), known: known.join(", ") }));
            }
            Some(wanted)
        }
    };
    let title: Arc<str> = match page.member("title") {
        Some(title) => title.text()?.into(),
        None => file.path.into(),
    };
    Ok(Dataset {
        id: name,
        short: head.need("short", "a name for lines of text, such as \"Larkmoor 2026\"")?.text()?.into(),
        publication: head.need("publication", "who published or measured the figures, and when")?.text()?.into(),
        terms: head.need("terms", "who may use the figures")?.text()?.into(),
        uncertainty: "stated at each figure".into(),
        divisor: None,
        // Before every shipped one, in the reactions that it serves.
        rank: Some(0),
        own: true,
        extends,
        tables: vec![Table { title, path: file.path.into(), sha256: file.sha256.into(), records }],
    })
}

/// A function whose zero of H and S may still have to be found by way of a transition.
struct Draft {
    function: Function,
    /// Both zeros are known, or no figure asks for them.
    settled: bool,
    /// Where its `heat_capacity` stands, for messages.
    fault_at: OwnFault,
}

struct Reading<'a> {
    base: &'a Catalog,
    dataset: Dataset,
    drafts: Vec<Draft>,
}

impl Reading<'_> {
    fn record(&mut self, spot: &Spot<'_>) -> Result<(OwnPhase, Option<Formation>), OwnFault> {
        spot.object()?;
        spot.only(&[
            "id",
            "name",
            "formula",
            "cas",
            "formation_enthalpy",
            "entropy",
            "heat_capacity",
            "source",
            "obtained",
            "note",
        ])?;
        let id = spot.need("id", "a formula or name with its phase, as CO2(g) or phenol(l)")?;
        let phase = self.phase(spot, &id)?;
        let citation = Citation::new(
            spot.need("source", "where the figures of this record were printed or measured")?.text()?,
            spot.text_or_nothing("obtained")?.unwrap_or_default(),
        );
        let formation = spot.figure("formation_enthalpy", Measure::FormationEnthalpy)?;
        let entropy = spot.figure("entropy", Measure::Entropy)?;
        let capacity = spot.member("heat_capacity");
        if formation.is_none() && capacity.is_none() {
            let what = "a record has it, or a `heat_capacity`, or both";
            return Err(spot.fault(Problem::Missing { name: "formation_enthalpy", what }));
        }
        if entropy.is_some() && formation.is_none() && capacity.is_none() {
            return Err(
                spot.fault(Problem::Missing { name: "formation_enthalpy", what: "an entropy alone serves nothing" })
            );
        }
        let cas = spot.text_or_nothing("cas")?.map(Arc::<str>::from);
        if let Some(capacity) = &capacity {
            let function = self.function(capacity, &phase, (formation.as_ref(), entropy.as_ref()), &citation)?;
            let settled = function.covers(T_REFERENCE_K) || (function.zero.enthalpy && function.zero.entropy);
            let (from_k, to_k) = (function.t_min, function.t_max);
            self.drafts.push(Draft { function, settled, fault_at: capacity.fault(Problem::Unjoined { from_k, to_k }) });
        }
        let formation = formation.map(|dhf| Formation {
            dataset: self.dataset.id.clone(),
            id: phase.id.clone(),
            formula: phase.formula.clone(),
            name: phase.name.clone(),
            cas,
            dhf,
            correlation: None,
            dhf_0: None,
            s: entropy,
            cp: None,
            h298_minus_h0: None,
            p_standard_pa: P_STANDARD_PA,
            confirmation: Confirmation::SingleSource,
            check: None,
            original_references: None,
            citation,
        });
        Ok((phase, formation))
    }

    /// The phase that a record is about: one on record by any of its names, or a new one.
    fn phase(&self, spot: &Spot<'_>, id: &Spot<'_>) -> Result<OwnPhase, OwnFault> {
        let text = id.text()?;
        let unusable = |why: String, hint: String| id.fault(Problem::Name { why, hint });
        let name: SpeciesName =
            text.parse().map_err(|error: SpeciesError| unusable(error.to_string(), error.hint()))?;
        let (base, known) = match self.base.find(text) {
            Ok(substance) => (None, Some(substance)),
            Err(NameFault::Unknown { .. }) => (Some(name.base.clone()), None),
            Err(NameFault::PhaseNotOnRecord { candidates, .. }) => {
                let other = candidates.first().and_then(|other| self.base.find(other).ok());
                (other.as_ref().map(|other| other.species.entity.name().to_owned()), other)
            }
            Err(fault) => return Err(unusable(fault.to_string(), fault.hint())),
        };
        let Some(phase) = &name.phase else {
            let hint = format!("write {text}(g), {text}(l) or {text}(cr)");
            return Err(unusable(format!("{text} has no phase"), hint));
        };
        let full: Arc<str> = match (&base, &known) {
            (Some(base), _) => SpeciesName { base: base.clone(), phase: Some(phase.clone()) }.to_string().into(),
            (None, Some(substance)) => substance.species.id.clone(),
            (None, None) => name.to_string().into(),
        };
        let written = spot.text_or_nothing("formula")?;
        let own = match (written, &known) {
            (Some(formula), _) => Formula::parse(formula).or_else(|_| Formula::parse_record(formula)),
            (None, Some(substance)) => {
                let formula = substance.function.as_ref().map(|function| function.formula.clone());
                let formula = formula.or_else(|| substance.formations.first().map(|first| first.formula.clone()));
                Formula::parse_record(&formula.unwrap_or_default())
            }
            (None, None) => Formula::parse(&name.base),
        };
        let in_formula = spot.member("formula");
        let own = own.map_err(|error| {
            let problem =
                Problem::Name { why: error.to_string(), hint: "give its `formula`, such as C7H8O".to_owned() };
            in_formula.as_ref().unwrap_or(id).fault(problem)
        })?;
        if let Some(known) = &known
            && (known.species.composition != *own.composition() || known.species.charge != own.charge())
        {
            let (own, known) = (own.composition().to_string(), known.species.composition.to_string());
            return Err(in_formula.as_ref().unwrap_or(id).fault(Problem::OtherAtoms { own, known }));
        }
        let name = spot.text_or_nothing("name")?.map(Arc::from);
        let name = name.or_else(|| known.as_ref().and_then(|known| known.name.clone()));
        let formula = own.reference_name().as_str().into();
        Ok(OwnPhase { id: full, formula, name })
    }

    fn function(
        &self,
        spot: &Spot<'_>,
        phase: &OwnPhase,
        (formation, entropy): (Option<&Datum>, Option<&Datum>),
        citation: &Citation,
    ) -> Result<Function, OwnFault> {
        spot.object()?;
        spot.only(&["form", "unit", "R", "u", "ranges", "note"])?;
        let word = spot.need("form", "the published form, such as \"maier-kelley\"")?;
        let form = Form::named(word.text()?);
        if form.is_none() && word.text()? != POWERS {
            let known: Vec<String> =
                FORMS.iter().map(|form| form.word).chain([POWERS]).map(|w| format!("`{w}`")).collect();
            let found = shortened(word.text()?);
            return Err(word.fault(Problem::Word { found, known: known.join(", ") }));
        }
        let over_r = form.is_some_and(|form| form.over_r);
        let factor = if over_r {
            if let Some(unit) = spot.member("unit") {
                let found = unit.tree.words();
                return Err(unit.fault(Problem::Sort {
                    found,
                    wanted: "no unit, since the form gives Cp/R; its gas constant goes into `R`",
                }));
            }
            match spot.figure("R", Measure::HeatCapacity)? {
                Some(r) => r.value,
                None => constants::current().molar_gas.value,
            }
        } else {
            spot.need("unit", "the unit of Cp, such as \"J/(mol K)\"")?.unit(Measure::HeatCapacity)?
        };
        let ranges = spot.need("ranges", "a list of ranges with `from`, `to` and `coefficients`")?.items()?;
        let mut intervals: Vec<Interval> = Vec::new();
        let mut with_constants = 0;
        for range in &ranges {
            let (interval, has_constants) = self.range(range, form)?;
            if let Some(last) = intervals.last()
                && last.t_max != interval.t_min
            {
                let why = format!("it begins at {} K, and the one before it ends at {} K", interval.t_min, last.t_max);
                return Err(range.fault(Problem::Range { why }));
            }
            with_constants += usize::from(has_constants);
            intervals.push(interval);
        }
        let (Some(first), Some(last)) = (intervals.first(), intervals.last()) else {
            return Err(spot.fault(Problem::Range { why: "there is no range".to_owned() }));
        };
        let (t_min, t_max) = (first.t_min, last.t_max);
        if with_constants != 0 && with_constants != intervals.len() {
            let why = "some ranges have constants of integration, and others have none".to_owned();
            return Err(spot.fault(Problem::Range { why }));
        }
        let covers = t_min <= T_REFERENCE_K && T_REFERENCE_K <= t_max;
        let mut zero = Zero { enthalpy: with_constants != 0, entropy: with_constants != 0 };
        let mut dhf_298 = formation.map_or(0.0, |datum| datum.value);
        if with_constants == 0 && covers {
            zero = Zero { enthalpy: formation.is_some(), entropy: entropy.is_some() };
            let s_298 = entropy.map_or(0.0, |datum| datum.value);
            intervals = form::anchored(intervals, T_REFERENCE_K, dhf_298 / factor, s_298 / factor);
        } else if let (true, None, Some(home)) = (
            with_constants != 0,
            formation,
            intervals.iter().find(|one| one.t_min <= T_REFERENCE_K && T_REFERENCE_K <= one.t_max),
        ) {
            dhf_298 = factor * home.h_and_s(T_REFERENCE_K).0;
        }
        Ok(Function {
            dataset: self.dataset.id.clone(),
            id: phase.id.clone(),
            name: phase.name.clone().unwrap_or_else(|| phase.id.clone()),
            formula: phase.formula.clone(),
            cas: None,
            intervals: intervals.into(),
            r_of_source: factor,
            t_min,
            t_max,
            dhf_298,
            zero,
            stated: Stated { entropy_298: entropy.cloned(), cp_relative_u: spot.relative_u("u")? },
            h298_minus_h0: None,
            warnings: Box::default(),
            is_reference_element: formation.is_some_and(Datum::is_convention),
            original_references: "".into(),
            p_standard_pa: P_STANDARD_PA,
            citation: citation.clone(),
        })
    }

    fn range(&self, spot: &Spot<'_>, form: Option<&'static Form>) -> Result<(Interval, bool), OwnFault> {
        spot.object()?;
        spot.only(&["from", "to", "coefficients", "note"])?;
        let from = spot.need("from", "the lower end, such as \"273 K\"")?.temperature()?;
        let to = spot.need("to", "the upper end, such as \"1200 K\"")?.temperature()?;
        if from >= to {
            return Err(spot.fault(Problem::Range { why: format!("it runs from {from} K to {to} K") }));
        }
        let Some(form) = form else {
            let list = spot.need("coefficients", "a list of objects with `power` and `factor`")?.items()?;
            let mut powers = Vec::new();
            for item in &list {
                item.object()?;
                item.only(&["power", "factor"])?;
                let exponent = item.need("power", "the exponent of T in kelvin")?.number()?;
                if exponent.abs() > 20.0 {
                    return Err(
                        item.fault(Problem::Range { why: format!("{exponent} is no power of a heat capacity") })
                    );
                }
                powers.push(Power { exponent, factor: item.need("factor", "the coefficient")?.number()? });
            }
            return Ok((form::of_powers((from, to), powers, 1.0), false));
        };
        let given = spot.need("coefficients", "an object with the letters of the form")?;
        given.object()?;
        let mut allowed: Vec<&'static str> = form.terms.iter().map(|(letter, _)| *letter).collect();
        allowed.extend(form.constants.iter().flat_map(|(h, s)| [*h, *s]));
        if form.word == "shomate" {
            allowed.push("H"); // Printed beside the others; H - H(298.15 K) needs it, H does not.
        }
        given.only(&allowed)?;
        let number = |letter: &'static str| given.need(letter, "a number; 0 where the term is not used")?.number();
        let coefficients: Vec<f64> = form.terms.iter().map(|(letter, _)| number(letter)).collect::<Result<_, _>>()?;
        let constants = match form.constants {
            Some((h, s)) if given.member(h).is_some() || given.member(s).is_some() => Some((number(h)?, number(s)?)),
            _ => None,
        };
        Ok((form.interval((from, to), &coefficients, constants), constants.is_some()))
    }

    fn transition(&self, spot: &Spot<'_>) -> Result<Transition, OwnFault> {
        spot.object()?;
        spot.only(&["from", "to", "kind", "temperature", "enthalpy", "source", "obtained", "note"])?;
        let end = |name: &'static str| -> Result<Arc<str>, OwnFault> {
            let end = spot.need(name, "the id of a phase, as in a record")?;
            let text = end.text()?;
            let own = self.drafts.iter().map(|draft| &draft.function.id).find(|id| &***id == text);
            let id = own.cloned().or_else(|| Some(self.base.find(text).ok()?.species.id.clone()));
            id.ok_or_else(|| {
                let why = format!("no heat capacity of {} is at hand", shortened(text));
                end.fault(Problem::Transition { why })
            })
        };
        let (from, to) = (end("from")?, end("to")?);
        let word = spot.need("kind", "`fusion` or `solid-solid`")?;
        let kind = match word.text()? {
            "fusion" => TransitionKind::Fusion,
            "solid-solid" => TransitionKind::SolidSolid,
            other => {
                let (found, known) = (shortened(other), "`fusion`, `solid-solid`".to_owned());
                return Err(word.fault(Problem::Word { found, known }));
            }
        };
        let t_k = spot.need("temperature", "such as \"341.2 K\"")?.temperature()?;
        let missing = || spot.fault(Problem::Missing { name: "enthalpy", what: "such as \"15.2(3) kJ/mol\"" });
        let dh = spot.figure("enthalpy", Measure::Enthalpy)?.ok_or_else(missing)?.value;
        let citation = Citation::new(
            spot.need("source", "where it was printed or measured")?.text()?,
            spot.text_or_nothing("obtained")?.unwrap_or_default(),
        );
        Ok(Transition {
            dataset: self.dataset.id.clone(),
            id: format!("{from} -> {to}").into(),
            kind,
            from,
            to,
            t_k,
            dh,
            ds: dh / t_k,
            dcp: 0.0,
            check: "".into(),
            note: None,
            original_references: "".into(),
            citation,
        })
    }

    /// Gives functions that do not reach 298.15 K their zero by way of transitions, and the transitions their ΔCp.
    fn joined(&mut self, mut transitions: Vec<Transition>, spots: &[Spot<'_>]) -> Result<Vec<Transition>, OwnFault> {
        let places: BTreeMap<Arc<str>, usize> =
            self.drafts.iter().enumerate().map(|(at, draft)| (draft.function.id.clone(), at)).collect();
        // Each round settles at least one, or it was the last.
        loop {
            let mut moved = false;
            for transition in &transitions {
                let ends = [(&transition.from, &transition.to, 1.0), (&transition.to, &transition.from, -1.0)];
                for (known, wanted, sign) in ends {
                    let Some(&at) = places.get(wanted) else { continue };
                    if self.drafts[at].settled {
                        continue;
                    }
                    let Some((h, s, zero)) = self.settled_at(known, &places, transition.t_k) else { continue };
                    let draft = &mut self.drafts[at];
                    if !draft.function.covers(transition.t_k) {
                        continue;
                    }
                    let factor = draft.function.r_of_source;
                    let (h, s) = (h + sign * transition.dh, s + sign * transition.ds);
                    let intervals = std::mem::take(&mut draft.function.intervals).into_vec();
                    let intervals = form::anchored(intervals, transition.t_k, h / factor, s / factor);
                    draft.function.intervals = intervals.into();
                    draft.function.zero = zero;
                    draft.settled = true;
                    moved = true;
                }
            }
            if !moved {
                break;
            }
        }
        if let Some(draft) = self.drafts.iter().find(|draft| !draft.settled) {
            return Err(draft.fault_at.clone());
        }
        for (transition, spot) in transitions.iter_mut().zip(spots) {
            let cp = |id: &Arc<str>| -> Result<f64, OwnFault> {
                let own = places.get(id).map(|&at| &self.drafts[at].function);
                let substance = self.base.find(id).ok();
                let function = own.or_else(|| substance.as_ref().and_then(|one| one.function.as_deref()));
                let Some(function) = function else {
                    return Err(spot.fault(Problem::Transition { why: format!("no heat capacity of {id} is at hand") }));
                };
                if !function.covers(transition.t_k) {
                    let (from, to, t) = (function.t_min, function.t_max, transition.t_k);
                    let why = format!("it is at {t} K, and the heat capacity of {id} runs from {from} K to {to} K");
                    return Err(spot.fault(Problem::Transition { why }));
                }
                Ok(function.cp_plainly(transition.t_k))
            };
            transition.dcp = cp(&transition.to)? - cp(&transition.from)?;
        }
        Ok(transitions)
    }

    /// H and S of a phase whose zero is known, at a temperature within its range.
    fn settled_at(&self, id: &str, places: &BTreeMap<Arc<str>, usize>, t_k: f64) -> Option<(f64, f64, Zero)> {
        let of = |function: &Function| {
            let home = function.intervals.iter().find(|one| one.t_min <= t_k && t_k <= one.t_max)?;
            let (h, s) = home.h_and_s(t_k);
            Some((function.r_of_source * h, function.r_of_source * s, function.zero))
        };
        match places.get(id) {
            Some(&at) => self.drafts.get(at).filter(|draft| draft.settled).and_then(|draft| of(&draft.function)),
            None => of(self.base.find(id).ok()?.function.as_deref()?),
        }
    }
}
