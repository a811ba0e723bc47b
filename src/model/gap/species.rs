//! Mistakes about one species of a reaction: its phase, its coefficient, its zero, its dataset, its digits.

use crate::data::dataset::Datum;
use crate::data::substance::Substance;
use crate::model::function::T_REFERENCE;
use crate::model::gap::candidate::{Candidate, Mistake};
use crate::model::gap::case::{Case, cited, is_gas};
use crate::model::gap::digits;
use crate::model::gather::{self, Contribution};
use crate::model::terms::Term;
use crate::source::Citation;

/// What each mistake about a species would do. `left_out` says what lacked data.
pub fn candidates(case: &Case, out: &mut Vec<Candidate>, left_out: &mut Vec<String>) {
    for at in 0..case.contributions.len() {
        phases(case, at, out);
        phase_changes(case, at, out);
        if case.terms.is_reaction() {
            coefficient(case, at, out);
        }
        if case.property.uses_formation() {
            zero_of_one(case, at, out);
            datasets(case, at, out);
            printed_digits(case, at, out);
        }
    }
    if case.property.uses_formation() {
        zero_of_all(case, out, left_out);
    }
}

/// Another phase of the same substance: its formation enthalpy alone, or altogether.
fn phases(case: &Case, at: usize, out: &mut Vec<Candidate>) {
    let data = case.cx.data();
    let term = &case.terms.terms()[at];
    let mistake = |other: &Substance| {
        let water = other.species.entity.name() == "H2O";
        let fluid = |substance: &Substance| matches!(substance.species.phase.to_string().as_str(), "l" | "g");
        if water && fluid(other) && fluid(&term.substance) { Mistake::WaterPhase } else { Mistake::Phase }
    };
    let whole_differs = case.t_k != T_REFERENCE || case.property != crate::model::property::Property::H;
    for other in data.phases_of(&term.substance) {
        let words = format!("{} was taken for {}, ν = {}", other.id(), term.substance.id(), term.nu);
        let Some(formation) = gather::formation_of(&other, &case.datasets[at], data) else { continue };
        let sources = cited([&formation, &case.contributions[at].formation]);
        // A phase that does not reach 298.15 K has no figure of its own there.
        let has_own = other.function.as_ref().is_none_or(|function| function.covers(T_REFERENCE));
        if case.property.uses_formation() && has_own {
            let with = case.with(at, |contribution| contribution.formation = formation.clone());
            let only = if whole_differs { ", by its formation enthalpy at 298.15 K" } else { "" };
            case.push(out, mistake(&other), format!("{words}{only}"), with, sources);
        }
        if whole_differs {
            let term = Term::of_tables(other.clone(), term.nu);
            let taken = gather::contribution(&term, &case.datasets[at], case.t_k, case.method.heat_capacity, case.cx);
            let Ok(taken) = taken else { continue };
            let figures = [Some(&taken.formation), taken.increment.as_ref(), taken.entropy.as_ref(), taken.cp.as_ref()];
            let sources = cited(figures.into_iter().flatten());
            let gas = f64::from(u8::from(is_gas(&other))) - f64::from(u8::from(is_gas(case.substance(at))));
            let mut contributions = case.contributions.clone();
            contributions[at] = taken;
            let with = case.evaluated(case.property, &contributions, case.delta_n() + term.nu * gas);
            case.push(out, mistake(&other), format!("{words}, altogether"), with, sources);
        }
    }
}

/// The heats of the changes of phase on the way to T left out, with the heat capacities of all phases taken.
fn phase_changes(case: &Case, at: usize, out: &mut Vec<Candidate>) {
    let Some(route) = case.route(at) else { return };
    let (id, nu) = (case.substance(at).id(), case.contributions[at].nu);
    let dh: f64 = route.changes().map(|transition| transition.dh).sum();
    let ds: f64 = route.changes().map(|transition| transition.ds).sum();
    let with = case.with(at, |contribution| {
        contribution.increment.iter_mut().for_each(|figure| figure.si -= dh);
        contribution.entropy.iter_mut().for_each(|figure| figure.si -= ds);
    });
    let words = format!("ΔtrsH of {id} was left out, {:.3} kJ/mol in all, ν = {nu}", dh / 1000.0);
    let sources: Vec<Citation> = route.changes().map(|transition| transition.citation.clone()).collect();
    case.push(out, Mistake::PhaseChange, words, with, sources);
}

/// ν off by one, dropped, doubled, or on the wrong side.
fn coefficient(case: &Case, at: usize, out: &mut Vec<Candidate>) {
    let (id, nu) = (case.substance(at).id(), case.contributions[at].nu);
    let size = nu.abs();
    let mut instead = vec![(0.0, "dropped"), (2.0 * nu, "doubled"), (-nu, "put on the wrong side")];
    instead.push((nu.signum() * (size + 1.0), "taken one too large"));
    if size > 1.0 {
        instead.push((nu.signum() * (size - 1.0), "taken one too small"));
    }
    let contribution = &case.contributions[at];
    let figures = [Some(&contribution.formation), contribution.increment.as_ref(), contribution.entropy.as_ref()];
    let sources = cited(figures.into_iter().flatten());
    for (wrong, words) in instead {
        let with = case.with(at, |contribution| contribution.nu = wrong);
        case.push(out, Mistake::Coefficient, format!("{id}, ν = {nu}, is {words}"), with, sources.clone());
    }
}

/// H(298.15 K) - H(0 K) of a species, with its source: of its dataset, else of its function.
fn to_zero_kelvin(case: &Case, at: usize) -> Option<(f64, Citation)> {
    let substance = case.substance(at);
    let record = substance.formation(&case.datasets[at]);
    let printed = record.and_then(|record| Some((record.h298_minus_h0.as_ref()?.value, record.citation.clone())));
    printed.or_else(|| {
        let function = substance.function.as_ref()?;
        Some((function.h298_minus_h0?, function.citation.clone()))
    })
}

fn shifted(contribution: &mut Contribution, by: f64) {
    contribution.formation.si += by;
}

/// The zero at 0 K for one species: its formation enthalpy there, or its increment from there.
fn zero_of_one(case: &Case, at: usize, out: &mut Vec<Candidate>) {
    let (id, nu) = (case.substance(at).id().to_owned(), case.contributions[at].nu);
    if let Some((increment, source)) = to_zero_kelvin(case, at) {
        for (by, words) in [
            (increment, "H(T) - H(0 K) was taken for H(T) - H(298.15 K)"),
            (-increment, "H(298.15 K) - H(0 K) was taken off"),
        ] {
            let with = case.with(at, |contribution| shifted(contribution, by));
            case.push(out, Mistake::ZeroKelvin, format!("{words} of {id}, ν = {nu}"), with, [source.clone()]);
        }
    }
    let record = case.substance(at).formation(&case.datasets[at]);
    let Some((record, at_zero)) = record.and_then(|record| Some((record, record.dhf_0.as_ref()?))) else { return };
    let by = |datum: &Datum| datum.value - record.dhf.value;
    let with = case.with(at, |contribution| shifted(contribution, by(at_zero)));
    let words = format!("the formation enthalpy of {id} at 0 K was taken for that at 298.15 K, ν = {nu}");
    case.push(out, Mistake::ZeroKelvin, words, with, [record.citation.clone()]);
}

/// The zero at 0 K for the whole reaction.
fn zero_of_all(case: &Case, out: &mut Vec<Candidate>, left_out: &mut Vec<String>) {
    let mut below = case.contributions.clone();
    let mut above = case.contributions.clone();
    let mut sources: Vec<Citation> = Vec::new();
    for at in 0..below.len() {
        let Some((increment, source)) = to_zero_kelvin(case, at) else {
            left_out.push(format!(
                "the reaction at 0 K: H(298.15 K) - H(0 K) of {} is not on record",
                case.substance(at).id()
            ));
            return;
        };
        shifted(&mut below[at], -increment);
        shifted(&mut above[at], increment);
        if !sources.contains(&source) {
            sources.push(source);
        }
    }
    let evaluated = |contributions: &[Contribution]| case.evaluated(case.property, contributions, case.delta_n());
    let words = "the reaction enthalpy at 0 K was taken for that at 298.15 K";
    case.push(out, Mistake::ZeroKelvin, words.to_owned(), evaluated(&below), sources.clone());
    let words = "increments from 0 K were joined to formation enthalpies at 298.15 K";
    case.push(out, Mistake::ZeroKelvin, words.to_owned(), evaluated(&above), sources.clone());
    if case.t_k != T_REFERENCE {
        below.iter_mut().for_each(|contribution| contribution.increment = None);
        let words = "the reaction enthalpy at 0 K was taken for that at T";
        case.push(out, Mistake::ZeroKelvin, words.to_owned(), evaluated(&below), sources);
    }
}

/// The formation enthalpy of one species from another dataset.
fn datasets(case: &Case, at: usize, out: &mut Vec<Candidate>) {
    let data = case.cx.data();
    let substance = &case.terms.terms()[at].substance;
    for dataset in data.datasets().iter().filter(|dataset| dataset.rank.is_some() && dataset.id != case.datasets[at]) {
        let Some(formation) = gather::formation_of(substance, &dataset.id, data) else { continue };
        let sources = cited([&formation]);
        let words = format!("the formation enthalpy of {} is that of {}", substance.id(), dataset.short);
        let with = case.with(at, |contribution| contribution.formation = formation);
        case.push(out, Mistake::MixedDatasets, words, with, sources);
    }
}

/// Two neighbouring digits of a printed formation enthalpy swapped.
fn printed_digits(case: &Case, at: usize, out: &mut Vec<Candidate>) {
    let formation = &case.contributions[at].formation;
    let Some(printed) = &formation.printed else { return };
    let id = case.substance(at).id();
    for swapped in digits::swapped(printed) {
        let Ok(kilojoules) = swapped.parse::<f64>() else { continue };
        let with = case.with(at, |contribution| contribution.formation.si = 1000.0 * kilojoules);
        let words = format!("the formation enthalpy of {id}, {printed} kJ/mol, was read as {swapped}");
        case.push(out, Mistake::Digits, words, with, cited([formation]));
    }
}
