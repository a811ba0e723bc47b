//! How gases and condensed phases take up volume, and whether pressure matters.
//!
//! Every price is the difference of two values by the same code: ideal against virial, volume neglected against counted. The
//! surprise: a gas too dense for its second virial coefficient has no better value here, and its row is broken, not priced.

use std::sync::Arc;

use super::{Asked, asked, asked_anew};
use crate::chem::species::{Species, State as Aggregate};
use crate::data::substance::Substance;
use crate::model::card::{Call, Cx};
use crate::model::given::Given;
use crate::model::pressure::{self, AtPressure, Condensed, Matter};
use crate::model::property::{self, Property};
use crate::model::terms::Terms;
use crate::model::vapour;
use crate::quantity::{Quantity, round};
use crate::record::register::{Finding, Tested};
use crate::source::Citation;
use crate::units::constants::STANDARD_PRESSURE;

/// |B| p/(R T) from which the third virial coefficient is no longer small beside the second. Common practice, no source.
pub(super) const DENSE: f64 = 0.15;

/// No solid or liquid is lighter than this, kg/m³, but for a few light metals and cryogenic liquids; it bounds what 1 atm
/// instead of 1 bar can do to a phase whose volume is not on record. Common practice, no source.
const LIGHTEST: f64 = 400.0;

/// What functions are good to, J/mol, as their source claims: a step smaller than that is in no value.
const RESOLUTION: f64 = 1.0;

/// The species of a call at their pressures by another method than its own.
fn at_pressures(cx: &Cx, call: &Call, asked: &Asked) -> Option<Vec<AtPressure>> {
    let method = property::method_of(call, cx).ok()?;
    property::at_pressure(asked.terms, asked.t_k, &method, cx).ok()
}

/// Terms of one sort, each with its place among all.
pub(super) fn of(terms: &Terms, suits: impl Fn(&Species) -> bool) -> Vec<(usize, &Arc<Substance>, f64)> {
    let all = terms.terms().iter().enumerate();
    all.filter(|(_, term)| suits(&term.substance.species)).map(|(at, term)| (at, &term.substance, term.nu)).collect()
}

fn condensed(species: &Species) -> bool {
    !matches!(species.phase.state, Aggregate::Gas | Aggregate::Aqueous)
}

pub(super) fn names<'a>(all: impl IntoIterator<Item = &'a str>) -> String {
    all.into_iter().collect::<Vec<_>>().join(", ")
}

/// Gases sorted by what is known of them.
#[derive(Default)]
pub(super) struct Sorted<'a> {
    /// With |B| p/(R T).
    pub thin: Vec<(&'a Arc<Substance>, f64)>,
    /// With the reason.
    pub dense: Vec<(&'a str, String)>,
    /// With what is missing.
    pub lacking: Vec<(&'a str, String)>,
    pub citations: Vec<Citation>,
    pub estimated: bool,
}

pub(super) fn sorted<'a>(
    cx: &Cx,
    gases: &[(usize, &'a Arc<Substance>, f64)],
    at: &[AtPressure],
    t_k: f64,
) -> Sorted<'a> {
    let r = cx.constants().molar_gas.value;
    let mut sorted = Sorted::default();
    for (nth, substance, _) in gases {
        let (at, id) = (&at[*nth], substance.id());
        let Some(share) = at.share(t_k, r) else {
            sorted.lacking.push((id, at.lacks.clone().unwrap_or_else(|| "not on record".to_owned())));
            continue;
        };
        sorted.citations.extend(at.citation.clone());
        sorted.estimated |= at.estimated;
        let why = match vapour::saturation(cx, substance, t_k) {
            Some(p) if at.p_pa > p * (1.0 + 1e-9) => {
                format!("at {} bar it is above its vapour pressure of {} bar", bar(at.p_pa), bar(p))
            }
            _ if share > DENSE => {
                format!("|B|p/RT is {}, too dense for the virial route", round::significant(share, 2))
            }
            _ => {
                sorted.thin.push((substance, share));
                continue;
            }
        };
        sorted.dense.push((id, why));
    }
    sorted
}

fn bar(p_pa: f64) -> String {
    round::significant(p_pa / 1e5, 3)
}

pub(super) fn reasons(all: &[(&str, String)]) -> String {
    all.iter().map(|(id, why)| format!("{id}: {why}")).collect::<Vec<_>>().join("; ")
}

/// `ideal-gas`: against the second virial coefficients; broken where they cannot tell any more.
pub fn ideal_gas(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(asked) = asked(cx, call) else { return Vec::new() };
    let given = asked.method.given.as_ref();
    let gases = of(asked.terms, Species::is_gas);
    if gases.is_empty() || (given.is_none() && !asked.property.uses_gas_law()) {
        return Vec::new();
    }
    let by_virial = call.with_option("gas", "virial");
    let Some(at) = at_pressures(cx, &by_virial, &asked) else { return Vec::new() };
    let sorted = sorted(cx, &gases, &at, asked.t_k);
    let row = |subject: String, tested| Finding::known("ideal-gas", subject, value.node(), Some(asked.t_k), tested);
    let mut findings = Vec::new();
    if !sorted.lacking.is_empty() {
        let what = format!("no second virial coefficient: {}", reasons(&sorted.lacking));
        findings.push(row(names(sorted.lacking.iter().map(|(id, _)| *id)), Tested::Missing { what }));
    }
    if given.is_some_and(|given| given.virial) {
        return findings;
    }
    if !sorted.dense.is_empty() {
        let why = reasons(&sorted.dense);
        findings.push(row(names(sorted.dense.iter().map(|(id, _)| *id)), Tested::False { why, value: None }));
    }
    if !sorted.thin.is_empty() {
        let subject = names(sorted.thin.iter().map(|(substance, _)| substance.id()));
        let estimated = if sorted.estimated { ", in part by corresponding states" } else { "" };
        let how = format!("second virial coefficients{estimated}");
        let tested = if sorted.dense.is_empty() {
            match asked_anew(cx, by_virial) {
                Ok(value) => Tested::Better { value, how },
                Err(fault) => Tested::Missing { what: fault.message().to_owned() },
            }
        } else {
            // The whole by the virial route would be no better for the dense gases, so these are priced alone.
            let r = cx.constants().molar_gas.value;
            let part = |at: &AtPressure, matter| pressure::departure(asked.property, matter, asked.t_k, at.p_pa, r).si;
            let thin = |id: &str| sorted.thin.iter().any(|(substance, _)| substance.id() == id);
            let prices = gases.iter().filter(|(_, substance, _)| thin(substance.id())).map(|(nth, _, nu)| {
                let at = &at[*nth];
                nu * (part(at, &Matter::IdealGas) - part(at, &at.matter))
            });
            Tested::Given { price: prices.sum(), how: format!("against {how}") }
        };
        findings.push(Finding { sources: sorted.citations, ..row(subject, tested) });
    }
    findings
}

/// `second-virial`: broken where |B|p/RT passes 0.15, or above the vapour pressure.
pub fn second_virial(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(asked) = asked(cx, call) else { return Vec::new() };
    if !asked.method.given.as_ref().is_some_and(|given| given.virial) {
        return Vec::new();
    }
    let gases = of(asked.terms, Species::is_gas);
    let Some(at) = at_pressures(cx, &call.with_option("gas", "virial"), &asked) else { return Vec::new() };
    let sorted = sorted(cx, &gases, &at, asked.t_k);
    let row = |subject: String, tested| Finding::known("second-virial", subject, value.node(), Some(asked.t_k), tested);
    let mut findings = Vec::new();
    if !sorted.dense.is_empty() {
        let why = reasons(&sorted.dense);
        findings.push(row(names(sorted.dense.iter().map(|(id, _)| *id)), Tested::False { why, value: None }));
    }
    let (half, whole): (Vec<_>, Vec<_>) = sorted.thin.iter().partition(|(substance, _)| {
        gases.iter().any(|(nth, gas, _)| Arc::ptr_eq(gas, substance) && at[*nth].lacks.is_some())
    });
    if !half.is_empty() {
        let what = "dB/dT was not given and counts as 0".to_owned();
        findings.push(row(names(half.iter().map(|(substance, _)| substance.id())), Tested::Missing { what }));
    }
    if !whole.is_empty() {
        let share = |(substance, share): &(&Arc<Substance>, f64)| {
            format!("{} for {}", round::significant(*share, 2), substance.id())
        };
        let how = format!("|B|p/RT is {}", whole.iter().map(share).collect::<Vec<_>>().join(", "));
        let subject = names(whole.iter().map(|(substance, _)| substance.id()));
        findings.push(Finding { sources: sorted.citations.clone(), ..row(subject, Tested::True { how }) });
    }
    findings
}

/// `condensed-volume-neglected`: the pV of liquids and solids in U and A, against their volumes.
pub fn condensed_volume(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(asked) = asked(cx, call) else { return Vec::new() };
    if !asked.property.uses_gas_law() {
        return Vec::new();
    }
    volume_rows(cx, call, value, &asked, "condensed-volume-neglected")
}

/// `pressure-neglected`: the V dP of liquids and solids, against their volumes; untested where the volume is missing.
pub fn pressure_neglected(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(asked) = asked(cx, call) else { return Vec::new() };
    let Some(given) = &asked.method.given else { return Vec::new() };
    if asked.property.uses_gas_law() || asked.property == Property::Cp || given.total.is_none() {
        return Vec::new();
    }
    volume_rows(cx, call, value, &asked, "pressure-neglected")
}

fn volume_rows(cx: &Cx, call: &Call, value: &Quantity, asked: &Asked, id: &'static str) -> Vec<Finding> {
    let phases = of(asked.terms, |species| !species.is_gas());
    let counted = call.with_option("volume", "counted");
    let Some(at) = at_pressures(cx, &counted, asked) else { return Vec::new() };
    // The house reads ids where they are entered, so each is written out.
    let row = |subject: String, tested| match id {
        "pressure-neglected" => Finding::known("pressure-neglected", subject, value.node(), Some(asked.t_k), tested),
        _ => Finding::known("condensed-volume-neglected", subject, value.node(), Some(asked.t_k), tested),
    };
    let mut findings = Vec::new();
    let lacking: Vec<(&str, String)> =
        phases.iter().filter_map(|(nth, substance, _)| Some((substance.id(), at[*nth].lacks.clone()?))).collect();
    if !lacking.is_empty() {
        let what = reasons(&lacking);
        findings.push(row(names(lacking.iter().map(|(id, _)| *id)), Tested::Missing { what }));
    }
    if asked.method.given.as_ref().is_some_and(|given| given.volumes) {
        return findings;
    }
    let known = || phases.iter().filter(|(nth, ..)| matches!(at[*nth].matter, Matter::Condensed(_)));
    if known().next().is_some() {
        let subject = names(known().map(|(_, substance, _)| substance.id()));
        let sources = known().filter_map(|(nth, ..)| at[*nth].citation.clone()).collect();
        let tested = match asked_anew(cx, counted) {
            Ok(value) => Tested::Better { value, how: "their volumes".to_owned() },
            Err(fault) => Tested::Missing { what: fault.message().to_owned() },
        };
        findings.push(Finding { sources, ..row(subject, tested) });
    }
    findings
}

/// `constant-expansivity`: beyond the range of its data, against a volume that no longer moves with temperature.
pub fn constant_expansivity(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(asked) = asked(cx, call) else { return Vec::new() };
    if !asked.method.given.as_ref().is_some_and(|given| given.volumes) {
        return Vec::new();
    }
    let Some(at) = at_pressures(cx, call, &asked) else { return Vec::new() };
    let (r, mut price, mut beyond) = (cx.constants().molar_gas.value, 0.0, Vec::new());
    for (nth, substance, nu) in of(asked.terms, condensed) {
        let (Some(record), Matter::Condensed(c)) = (&substance.pressure.volume, at[nth].matter) else { continue };
        let (from, to) = record.use_range;
        if at[nth].citation.is_none() || (from <= asked.t_k && asked.t_k <= to) {
            continue;
        }
        let of = |matter| pressure::departure(asked.property, &matter, asked.t_k, at[nth].p_pa, r).si;
        let rigid = Matter::Condensed(Condensed { alpha: 0.0, ..c });
        price += nu * (of(Matter::Condensed(c)) - of(rigid));
        beyond.push((substance.id(), format!("expansivity and compressibility are those of {from} K to {to} K")));
    }
    if beyond.is_empty() {
        return Vec::new();
    }
    let how = format!("all that the expansion brings; {}", reasons(&beyond));
    let subject = names(beyond.iter().map(|(id, _)| *id));
    let tested = Tested::Given { price, how };
    vec![Finding::known("constant-expansivity", subject, value.node(), Some(asked.t_k), tested)]
}

/// `standard-pressure`: records for 1 atm that are used as those for 1 bar.
pub fn standard_pressure(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(asked) = asked(cx, call) else { return Vec::new() };
    if asked.property == Property::Cp {
        return Vec::new();
    }
    let (r, t_k) = (cx.constants().molar_gas.value, asked.t_k);
    let given = Given { volumes: true, ..Given::standard() };
    let (mut price, mut found, mut bounded) = (0.0, Vec::new(), false);
    for (_, substance, nu) in of(asked.terms, |_| true) {
        let Some(p_pa) = substance.function.as_ref().map(|function| function.p_standard_pa) else { continue };
        if p_pa == STANDARD_PRESSURE.value {
            continue;
        }
        let Ok(at) = pressure::resolve(substance, t_k, &given, r) else { continue };
        let matter = match at.matter {
            Matter::Untouched => {
                bounded = true;
                let v0 = {
                    let Ok(mass_g) = substance.species.composition.molar_mass_g_mol() else { continue };
                    mass_g / 1000.0 / LIGHTEST
                };
                Matter::Condensed(Condensed { v0, alpha: 0.0, kappa: 0.0, t0_k: t_k, p0_pa: p_pa })
            }
            known => known,
        };
        // U and A are counted from H° and G°, so that only the step in pressure is left of them.
        let of = |p_pa| pressure::departure(asked.property, &matter, t_k, p_pa, r).si;
        price += nu * (of(p_pa) - of(STANDARD_PRESSURE.value));
        found.push(substance.id());
    }
    if found.is_empty() {
        return Vec::new();
    }
    let energy = if asked.property == Property::S { price * t_k } else { price };
    if energy.abs() < RESOLUTION {
        return Vec::new();
    }
    if asked.property == Property::K {
        price *= -value.si() / (r * t_k);
    }
    let bound = if bounded {
        "; where no volume is on record, with a density of 400 kg/m3, which is as good as a bound"
    } else {
        ""
    };
    let how = format!("the step from 1 atm, for which the records are, to 1 bar{bound}");
    let tested = Tested::Given { price, how };
    vec![Finding::known("standard-pressure", names(found), value.node(), Some(t_k), tested)]
}

/// `unmixed`: several gases, or several liquids and solutes, on one side.
pub fn unmixed(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let Some(asked) = asked(cx, call) else { return Vec::new() };
    let Some(given) = &asked.method.given else { return Vec::new() };
    let mut findings = Vec::new();
    for state in [Aggregate::Gas, Aggregate::Liquid] {
        let fits = |species: &Species| {
            species.phase.state == state || (state == Aggregate::Liquid && species.phase.state == Aggregate::Aqueous)
        };
        let all = of(asked.terms, fits);
        let together = [1.0, -1.0].iter().any(|side| all.iter().filter(|(.., nu)| nu * side > 0.0).count() > 1);
        if !together {
            continue;
        }
        let subject = names(all.iter().map(|(_, substance, _)| substance.id()));
        let heat_only = matches!(asked.property, Property::H | Property::U | Property::Cp);
        let tested = match state {
            Aggregate::Gas if given.virial => {
                Tested::Missing { what: format!("no cross virial coefficients of {subject} are on record") }
            }
            Aggregate::Gas if heat_only => Tested::True { how: "ideal gases mix without heat".to_owned() },
            Aggregate::Gas if !given.partial.is_empty() => {
                Tested::True { how: "mixed as ideal gases, by their partial pressures".to_owned() }
            }
            Aggregate::Gas => Tested::Missing {
                what: "each gas is at the pressure of the whole; say `partial` for a mixture".to_owned(),
            },
            _ => Tested::Missing { what: format!("no heat of mixing of {subject} is on record") },
        };
        findings.push(Finding::known("unmixed", subject, value.node(), Some(asked.t_k), tested));
    }
    findings
}
