//! A catalogue with records of one's own laid over it.
//!
//! What stands below is not changed: [`Catalog::overlaid`] gives a new catalogue that shares its records. Two rules decide
//! what a record of one's own takes the place of, and [`Precedence`] tells each case. A heat capacity stands in the place of
//! the shipped one of the same phase. A formation enthalpy hides nothing: its dataset is one more, before the shipped ones,
//! for the reactions that have one of its substances.

use std::collections::BTreeMap;
use std::sync::Arc;

use super::catalog::{self, Catalog, Contents, Gathered, T_REFERENCE_K};
use super::dataset::{Datum, TableFault};
use super::function::Function;
use super::lookup::Lookup;
use super::own::Own;
use super::substance::Substance;
use super::transition::Transition;

/// A datum that two sources have.
#[derive(Clone, Debug, PartialEq)]
pub struct Precedence {
    /// Id of the phase.
    pub id: Arc<str>,
    /// `formation enthalpy`, `heat capacity` or `transition`.
    pub what: &'static str,
    /// The own figure, in words.
    pub own: String,
    /// The other one.
    pub other: String,
    /// Short name of the dataset of the other.
    pub dataset: Arc<str>,
    /// Own minus other, over the root sum of both standard uncertainties; absent where one states none.
    pub in_u: Option<f64>,
    /// Whether the other can no longer be reached.
    pub hides: bool,
}

impl Catalog {
    /// This catalogue with records laid over it, and what they stand before.
    ///
    /// # Errors
    /// A record names no species.
    pub fn overlaid(&self, own: &Own) -> Result<(Catalog, Vec<Precedence>), TableFault> {
        let base = self.contents();
        let mut told = Vec::new();
        let mut datasets = base.datasets.clone();
        datasets.insert(0, own.dataset.clone());
        let mut substances = base.substances.clone();
        let listed = base.names.preferred();
        let formula = |id: &str| own.phases.iter().find(|phase| *phase.id == *id);
        let mut ids: Vec<&Arc<str>> = own.phases.iter().map(|phase| &phase.id).collect();
        ids.sort();
        for id in ids {
            let known = base.substances.get(id);
            let mut found = known.map_or_else(Gathered::default, |known| Gathered {
                function: known.function.clone(),
                formations: known.formations.clone(),
                pressure: known.pressure.clone(),
            });
            for formation in own.formations.iter().filter(|formation| formation.id == *id) {
                told.extend(known.iter().flat_map(|known| &known.formations).map(|other| Precedence {
                    id: id.clone(),
                    what: "formation enthalpy",
                    own: in_words(&formation.dhf),
                    other: in_words(&other.dhf),
                    dataset: self.dataset(&other.dataset).map_or_else(|| "".into(), |dataset| dataset.short.clone()),
                    in_u: distance(&formation.dhf, &other.dhf),
                    hides: false,
                }));
                found.formations.insert(0, formation.clone());
            }
            if let Some(function) = own.functions.iter().find(|function| function.id == *id) {
                if let Some(other) = &found.function {
                    told.push(self.hidden(function, other));
                }
                found.function = Some(function.clone());
            }
            let mut made = catalog::substance(id, found, &listed)?;
            if let Some(name) = formula(id).and_then(|phase| phase.name.clone()) {
                made.name.get_or_insert(name);
            }
            substances.insert(id.clone(), Arc::new(made));
        }
        self.rebase(own, &mut substances);
        let mut transitions = base.transitions.clone();
        for transition in &own.transitions {
            let same = |other: &Arc<Transition>| other.from == transition.from && other.to == transition.to;
            for end in [&transition.from, &transition.to] {
                let of_end = transitions.entry(end.clone()).or_default();
                if let Some(other) = of_end.iter().find(|other| same(other))
                    && *end == transition.from
                {
                    told.push(Precedence {
                        id: format!("{} -> {}", transition.from, transition.to).into(),
                        what: "transition",
                        own: format!("{:.3} kJ/mol at {} K", transition.dh / 1000.0, transition.t_k),
                        other: format!("{:.3} kJ/mol at {} K", other.dh / 1000.0, other.t_k),
                        dataset: self.dataset(&other.dataset).map_or_else(|| "".into(), |known| known.short.clone()),
                        in_u: None,
                        hides: true,
                    });
                }
                of_end.retain(|other| !same(other));
                of_end.push(transition.clone());
                of_end.sort_by(|left, right| left.t_k.total_cmp(&right.t_k));
            }
        }
        let lookup = Lookup::new(&base.names, substances.values().map(|substance: &Arc<Substance>| &**substance));
        let contents = Contents {
            datasets,
            substances,
            transitions,
            molecules: base.molecules.clone(),
            names: base.names.clone(),
            lookup,
            weights: base.weights.clone(),
        };
        Ok((self.watched_alike(contents), told))
    }

    fn hidden(&self, own: &Function, other: &Function) -> Precedence {
        let cp = |function: &Function| match function.covers(T_REFERENCE_K) {
            true => format!("{:.2} J/(mol K) at 298.15 K", function.cp_plainly(T_REFERENCE_K)),
            false => format!("{} K to {} K", function.t_min, function.t_max),
        };
        Precedence {
            id: own.id.clone(),
            what: "heat capacity",
            own: cp(own),
            other: cp(other),
            dataset: self.dataset(&other.dataset).map_or_else(|| "".into(), |dataset| dataset.short.clone()),
            in_u: None,
            hides: true,
        }
    }

    /// Phases that continue the enthalpy scale of a phase whose function was replaced are moved along with it, so that their
    /// enthalpy counted from that phase at 298.15 K stays what their own table says.
    fn rebase(&self, own: &Own, substances: &mut BTreeMap<Arc<str>, Arc<Substance>>) {
        for (id, substance) in &self.contents().substances {
            let Some(function) = substance.function.as_ref().filter(|function| !function.covers(T_REFERENCE_K)) else {
                continue;
            };
            let Some(reference) = self.reference_phase(substance) else { continue };
            let replaced = own.functions.iter().find(|one| *one.id == *reference.id() && one.covers(T_REFERENCE_K));
            let (Some(replaced), Some(before)) = (replaced, &reference.function) else { continue };
            if own.functions.iter().any(|one| one.id == *id) {
                continue;
            }
            let shift = replaced.h_plainly(T_REFERENCE_K) - before.h_plainly(T_REFERENCE_K);
            let mut moved = Function::clone(function);
            for interval in &mut moved.intervals {
                interval.b[0] += shift / moved.r_of_source;
            }
            moved.dhf_298 += shift;
            moved.zero.enthalpy &= replaced.zero.enthalpy;
            let other = Substance { function: Some(Arc::new(moved)), ..Substance::clone(substance) };
            substances.insert(id.clone(), Arc::new(other));
        }
    }
}

/// A figure with its uncertainty, in kJ/mol.
fn in_words(datum: &Datum) -> String {
    let u = match datum.u {
        Some(u) => format!(", u = {:.3}", u / 1000.0),
        None => ", u not stated".to_owned(),
    };
    format!("{:.3} kJ/mol{u}", datum.value / 1000.0)
}

/// How far two figures are apart in units of the standard uncertainty of their difference.
fn distance(left: &Datum, right: &Datum) -> Option<f64> {
    let (a, b) = (left.u?, right.u?);
    let u = crate::num::math::sqrt(a * a + b * b);
    (u > 0.0).then(|| (left.value - right.value) / u)
}
