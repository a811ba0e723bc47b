//! The cards of the properties in `property`: how each is asked, what it leans on, and the figures it was computed from.

use std::rc::Rc;

use crate::fault::Fault;
use crate::model::card::{Alternative, Arg, Call, Card, Claim, Cx, Default, On, Sources, Takes, Value};
use crate::model::check_line;
use crate::model::claims;
use crate::model::gather::{self, Contribution, Figure, HeatCapacity};
use crate::model::given::{CONSTANTS, GAS, GivenError, PARTIAL, PRESSURE, VOLUME};
use crate::model::pressure;
use crate::model::property::{self, Property};
use crate::model::shortcut::ABOUT;
use crate::quantity::Quantity;

fn run(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let asked = Property::of(call.card).unwrap_or_else(|| unreachable!("{} is a property's card", call.card.id));
    let method = property::method_of(call, cx)?;
    if asked == Property::K && method.given.is_some() {
        return Err(GivenError::ConstantAtPressure.into());
    }
    Ok(Value::Quantity(property::quantity(asked, call, &method, cx)?))
}

/// The figures of the calculation, each with the number of its source.
fn check_line(cx: &Cx, call: &Call, value: &Quantity, sources: &mut Sources) -> String {
    let Some(asked) = Property::of(call.card) else { return String::new() };
    let (Some(terms), t_k) = (call.terms(), call.quantity(1).si()) else { return String::new() };
    let Ok(method) = property::method_of(call, cx) else { return String::new() };
    let Ok(contributions) = gather::contributions(terms, t_k, &method, cx) else { return String::new() };
    let plain = |si: f64| format!("{si:.3}");
    let Ok(at) = property::at_pressure(terms, t_k, &method, cx) else { return String::new() };
    let r = &cx.constants().molar_gas;
    // What pressure brings to H, G or S, per species; pV stands for itself.
    let by_pressure = |property: Option<Property>, sources: &mut Sources| {
        let mut terms_of = Vec::new();
        for (at, term) in at.iter().zip(terms.terms()) {
            let si = match property {
                Some(property) => pressure::departure(property, &at.matter, t_k, at.p_pa, r.value).si,
                None => at.p_pa * pressure::volume(&at.matter, t_k, at.p_pa, r.value),
            };
            let figure = if property == Some(Property::S) || property == Some(Property::Cp) { si } else { si / 1000.0 };
            if si != 0.0 {
                let source = at.citation.as_ref().map_or_else(String::new, |c| format!("[{}]", sources.number(c)));
                let shown = if figure < 0.0 { format!("({figure:.4})") } else { format!("{figure:.4}") };
                terms_of.push((term.nu, shown + source.as_str()));
            }
        }
        signed_sum(terms_of)
    };
    let with_pressure =
        |line: String, property: Property, sources: &mut Sources| match by_pressure(Some(property), sources) {
            none if none.is_empty() => line,
            one if one.starts_with('(') && one.matches('(').count() == 1 => format!("{line} + {one}"),
            terms_of => format!("{line} + ({terms_of})"),
        };
    let enthalpy = |sources: &mut Sources| {
        let formation = sum_of(&contributions, sources, |c| Some(&c.formation), check_line::kilo);
        let increments = sum_of(&contributions, sources, |c| c.increment.as_ref(), check_line::kilo);
        let whole =
            |sum: String| if sum.starts_with('(') && contributions.len() == 1 { sum } else { format!("({sum})") };
        if increments.is_empty() { formation } else { format!("({formation}) + {}", whole(increments)) }
    };
    let entropies = |sources: &mut Sources| sum_of(&contributions, sources, |c| c.entropy.as_ref(), plain);
    let result = format!("{:.3} kJ/mol", value.si() / 1000.0);
    let per_kelvin = format!("{:.3} J/(K mol)", value.si());
    // pV: by Δn(gas) for standard values, by the volume of each species at a pressure.
    let pv = |sources: &mut Sources| {
        if !at.is_empty() {
            return format!("({})", by_pressure(None, sources));
        }
        let source = sources.number(&r.citation());
        let delta_n = terms.delta_n_gas();
        let delta_n = if delta_n < 0.0 { format!("({delta_n})") } else { delta_n.to_string() };
        format!("{delta_n} × {:.8e}[{source}] × {t_k}", r.value / 1000.0)
    };
    let gibbs = |sources: &mut Sources| {
        let (enthalpy, entropies) = (enthalpy(sources), entropies(sources));
        with_pressure(format!("{enthalpy} - {t_k} × ({entropies}) / 1000"), Property::G, sources)
    };
    match asked {
        Property::H => {
            let line = enthalpy(sources);
            format!("{} = {result}", with_pressure(line, Property::H, sources))
        }
        Property::U => {
            let line = enthalpy(sources);
            let line = with_pressure(line, Property::H, sources);
            format!("{line} - {} = {result}", pv(sources))
        }
        Property::G => format!("{} = {result}", gibbs(sources)),
        Property::A => {
            let line = gibbs(sources);
            format!("{line} - {} = {result}", pv(sources))
        }
        Property::S => {
            let line = entropies(sources);
            format!("{} = {per_kelvin}", with_pressure(line, Property::S, sources))
        }
        Property::Cp => {
            let line = sum_of(&contributions, sources, |c| c.cp.as_ref(), plain);
            format!("{} = {per_kelvin}", with_pressure(line, Property::Cp, sources))
        }
        Property::K => {
            let gibbs = gibbs(sources);
            let source = sources.number(&r.citation());
            format!("exp(-({gibbs}) / ({:.8e}[{source}] × {t_k})) = {:.6e}", r.value / 1000.0, value.si())
        }
    }
}

/// `-393.51[1] + 0[1] - (-110.53)[1]`: terms in the order written, signs as a calculator takes them.
fn sum_of<'a>(
    contributions: &'a [Contribution],
    sources: &mut Sources,
    pick: impl Fn(&'a Contribution) -> Option<&'a Figure>,
    show: impl Fn(f64) -> String,
) -> String {
    let picked = contributions.iter().filter_map(|contribution| {
        Some((contribution.nu, check_line::figures_of(pick(contribution)?, sources, &show)))
    });
    signed_sum(picked)
}

/// Stoichiometric numbers with figures as shown.
fn signed_sum(figures: impl IntoIterator<Item = (f64, String)>) -> String {
    let mut line = String::new();
    for (nu, shown) in figures {
        line.push_str(match (line.is_empty(), nu < 0.0) {
            (true, false) => "",
            (true, true) => "-",
            (false, false) => " + ",
            (false, true) => " - ",
        });
        if nu.abs() != 1.0 {
            line.push_str(&format!("{} × ", nu.abs()));
        }
        line.push_str(&shown);
    }
    line
}

pub(super) const HEAT_CAPACITY_OPTION: Arg = Arg {
    name: "heat_capacity",
    takes: Takes::Word(HeatCapacity::WORDS),
    default: Default::Absent,
    doc: "how Cp is taken between 298.15 K and T: integrated in full, or held at one value",
};
pub(super) const FORMATION_OPTION: Arg = Arg {
    name: "formation",
    takes: Takes::Text,
    default: Default::Absent,
    doc: "the dataset of formation enthalpies, such as \"codata-1989\", or \"mixed\"",
};

const TEMPERATURE: Arg = Arg {
    name: "T",
    takes: Takes::Temperatures,
    default: Default::Required,
    doc: "temperature: degC, degF or kelvin; with a grid of temperatures the answer is a curve",
};

const fn options(known: &'static [Arg]) -> Arg {
    Arg { name: "options", takes: Takes::Options(known), default: Default::NoOptions, doc: "how it is to be computed" }
}

pub(super) const ARGS: &[Arg] = &[
    TEMPERATURE,
    options(&[HEAT_CAPACITY_OPTION, ABOUT, FORMATION_OPTION, PRESSURE, GAS, VOLUME, PARTIAL, CONSTANTS]),
];
const ARGS_WITHOUT_FORMATION: &[Arg] =
    &[TEMPERATURE, options(&[HEAT_CAPACITY_OPTION, ABOUT, PRESSURE, GAS, VOLUME, PARTIAL, CONSTANTS])];
/// A pure substance has no partial pressure.
const SUBSTANCE_ARGS: &[Arg] =
    &[TEMPERATURE, options(&[HEAT_CAPACITY_OPTION, ABOUT, FORMATION_OPTION, PRESSURE, GAS, VOLUME, CONSTANTS])];
const SUBSTANCE_ARGS_WITHOUT_FORMATION: &[Arg] =
    &[TEMPERATURE, options(&[HEAT_CAPACITY_OPTION, ABOUT, PRESSURE, GAS, VOLUME, CONSTANTS])];

const CONSTANT_HEAT_CAPACITY: Claim = Claim { id: "constant-heat-capacity", test: claims::constant_heat_capacity };
const STABLE_PHASE: Claim = Claim { id: "stable-phase", test: claims::stable_phase };
const FORMATION_DATASET: Claim = Claim { id: "formation-dataset", test: claims::formation_dataset };
const IDEAL_GAS: Claim = Claim { id: "ideal-gas", test: claims::ideal_gas };
const CONDENSED_VOLUME: Claim = Claim { id: "condensed-volume-neglected", test: claims::condensed_volume };
const SECOND_VIRIAL: Claim = Claim { id: "second-virial", test: claims::second_virial };
const PRESSURE_NEGLECTED: Claim = Claim { id: "pressure-neglected", test: claims::pressure_neglected };
const EXPANSIVITY: Claim = Claim { id: "constant-expansivity", test: claims::constant_expansivity };
const STANDARD: Claim = Claim { id: "standard-pressure", test: claims::standard_pressure };
const SATURATED: Claim = Claim { id: "saturated-vapour-ideal", test: claims::saturated_leg };
const UNMIXED: Claim = Claim { id: "unmixed", test: claims::unmixed };

const AQUEOUS: Claim = Claim { id: "aqueous-heat-capacity", test: claims::aqueous_heat_capacity };
const MONOMER_VAPOUR: Claim = Claim { id: "monomer-vapour", test: claims::monomer_vapour };
const NO_DECOMPOSITION: Claim = Claim { id: "no-decomposition", test: claims::no_decomposition };
const FIT_QUALITY: Claim = Claim { id: "fit-quality", test: claims::fit_quality };

const ENTHALPY_CLAIMS: &[Claim] = &[
    CONSTANT_HEAT_CAPACITY,
    AQUEOUS,
    STABLE_PHASE,
    FORMATION_DATASET,
    IDEAL_GAS,
    SECOND_VIRIAL,
    PRESSURE_NEGLECTED,
    EXPANSIVITY,
    STANDARD,
    UNMIXED,
    SATURATED,
    MONOMER_VAPOUR,
    NO_DECOMPOSITION,
    FIT_QUALITY,
];
const ENERGY_CLAIMS: &[Claim] = &[
    CONSTANT_HEAT_CAPACITY,
    AQUEOUS,
    STABLE_PHASE,
    FORMATION_DATASET,
    IDEAL_GAS,
    SECOND_VIRIAL,
    PRESSURE_NEGLECTED,
    EXPANSIVITY,
    STANDARD,
    UNMIXED,
    MONOMER_VAPOUR,
    NO_DECOMPOSITION,
    FIT_QUALITY,
];
const GAS_LAW_CLAIMS: &[Claim] = &[
    CONSTANT_HEAT_CAPACITY,
    AQUEOUS,
    STABLE_PHASE,
    FORMATION_DATASET,
    IDEAL_GAS,
    SECOND_VIRIAL,
    CONDENSED_VOLUME,
    EXPANSIVITY,
    STANDARD,
    UNMIXED,
    MONOMER_VAPOUR,
    NO_DECOMPOSITION,
    FIT_QUALITY,
];
const ENTROPY_CLAIMS: &[Claim] = &[
    CONSTANT_HEAT_CAPACITY,
    AQUEOUS,
    STABLE_PHASE,
    IDEAL_GAS,
    SECOND_VIRIAL,
    PRESSURE_NEGLECTED,
    EXPANSIVITY,
    STANDARD,
    UNMIXED,
    MONOMER_VAPOUR,
    NO_DECOMPOSITION,
    FIT_QUALITY,
];

const SHORTCUTS: &[Alternative] = &[
    Alternative {
        id: "constant-heat-capacity",
        words: "with ΔCp held at its value at 298.15 K",
        value: claims::with_constant_heat_capacity,
    },
    Alternative {
        id: "midpoint",
        words: "with ΔCp held at its value half-way",
        value: claims::with_midpoint_heat_capacity,
    },
    Alternative {
        id: "mean", words: "with ΔCp held at the mean of both ends", value: claims::with_mean_heat_capacity
    },
    Alternative { id: "no-correction", words: "with the value at 298.15 K", value: claims::without_correction },
    Alternative {
        id: "missed-phase-change",
        words: "with the changes of phase left out, Cp of the phase as written held on",
        value: claims::with_missed_phase_change,
    },
    Alternative {
        id: "internal-energy-for-enthalpy",
        words: "with ΔrU in place of ΔrH",
        value: claims::with_internal_energy,
    },
    Alternative {
        id: "enthalpy-for-internal-energy", words: "with ΔrH in place of ΔrU", value: claims::with_enthalpy
    },
    Alternative {
        id: "standard-pressure",
        words: "with gases counted from 1 atm, as in tables before 1982",
        value: claims::with_atmosphere,
    },
];

const SOURCE: &str = "definitions of the state functions; IUPAC Green Book, 3rd ed., section 2.11 (from memory)";

macro_rules! property_card {
    ($on:expr, $of:literal, $name:ident, $id:literal, $script:literal, $args:expr, $claims:expr, $gives:literal, $doc:literal) => {
        pub static $name: Card = Card {
            id: $id,
            name: $script,
            on: $on,
            args: $args,
            gives: $gives,
            doc: $doc,
            source: SOURCE,
            example: concat!($of, ".", $script, "(\"450 degC\")"),
            claims: $claims,
            alternatives: SHORTCUTS,
            run,
            check_line: Some(check_line),
            caution: None,
        };
    };
}

macro_rules! reaction_card {
    ($($rest:tt)*) => {
        property_card!(On::Reaction, "reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\")", $($rest)*);
    };
}

macro_rules! substance_card {
    ($($rest:tt)*) => {
        property_card!(On::Substance, "substance(\"CO2(g)\")", $($rest)*);
    };
}

reaction_card!(
    ENTHALPY,
    "reaction.enthalpy",
    "enthalpy",
    ARGS,
    ENTHALPY_CLAIMS,
    "ΔrH° per mole of reaction as written",
    "Reaction enthalpy at T. ΔrH°(T) = Σ ν [ΔfH°(298.15 K) + H(T) - H(298.15 K)], each species pure, in its standard \
     state, p° = 1 bar; formation enthalpies from one dataset. Recorded changes between condensed phases on the way are \
     included."
);
reaction_card!(
    INTERNAL_ENERGY,
    "reaction.internal-energy",
    "internal_energy",
    ARGS,
    GAS_LAW_CLAIMS,
    "ΔrU° per mole of reaction as written",
    "Reaction internal energy at T. ΔrU°(T) = ΔrH°(T) - Δn(gas) R T, gases ideal, condensed volumes neglected."
);
reaction_card!(
    GIBBS_ENERGY,
    "reaction.gibbs-energy",
    "gibbs_energy",
    ARGS,
    ENERGY_CLAIMS,
    "ΔrG° per mole of reaction as written",
    "Reaction Gibbs energy at T. ΔrG°(T) = ΔrH°(T) - T ΔrS°(T), p° = 1 bar."
);
reaction_card!(
    HELMHOLTZ_ENERGY,
    "reaction.helmholtz-energy",
    "helmholtz_energy",
    ARGS,
    GAS_LAW_CLAIMS,
    "ΔrA° per mole of reaction as written",
    "Reaction Helmholtz energy at T. ΔrA°(T) = ΔrG°(T) - Δn(gas) R T, gases ideal, condensed volumes neglected."
);
reaction_card!(
    ENTROPY,
    "reaction.entropy",
    "entropy",
    ARGS_WITHOUT_FORMATION,
    ENTROPY_CLAIMS,
    "ΔrS° per mole of reaction as written",
    "Reaction entropy at T. ΔrS°(T) = Σ ν S°(T), third-law entropies without nuclear spin, p° = 1 bar."
);
reaction_card!(
    HEAT_CAPACITY,
    "reaction.heat-capacity",
    "heat_capacity",
    ARGS_WITHOUT_FORMATION,
    ENTROPY_CLAIMS,
    "ΔrCp° per mole of reaction as written",
    "Reaction heat capacity at T. ΔrCp°(T) = Σ ν Cp°(T)."
);
reaction_card!(
    EQUILIBRIUM_CONSTANT,
    "reaction.equilibrium-constant",
    "equilibrium_constant",
    ARGS,
    ENERGY_CLAIMS,
    "K°, a pure number on p° = 1 bar",
    "Standard equilibrium constant at T. K°(T) = exp(-ΔrG°(T)/RT), p° = 1 bar; its uncertainty lives in ln K°. It depends \
     on temperature only."
);

substance_card!(
    SUBSTANCE_ENTHALPY,
    "substance.enthalpy",
    "enthalpy",
    SUBSTANCE_ARGS,
    ENERGY_CLAIMS,
    "H° per mole of the substance, zero: the elements at 298.15 K",
    "Enthalpy at T, counted from the elements at 298.15 K. H°(T) = ΔfH°(298.15 K) + H(T) - H(298.15 K)."
);
substance_card!(
    SUBSTANCE_INTERNAL_ENERGY,
    "substance.internal-energy",
    "internal_energy",
    SUBSTANCE_ARGS,
    GAS_LAW_CLAIMS,
    "U° per mole of the substance",
    "Internal energy at T, counted from the elements at 298.15 K. U°(T) = H°(T) - R T for a gas, taken as ideal; condensed volumes neglected."
);
substance_card!(
    SUBSTANCE_GIBBS_ENERGY,
    "substance.gibbs-energy",
    "gibbs_energy",
    SUBSTANCE_ARGS,
    ENERGY_CLAIMS,
    "G° per mole of the substance",
    "Gibbs energy at T, H counted from the elements at 298.15 K. G°(T) = H°(T) - T S°(T), p° = 1 bar."
);
substance_card!(
    SUBSTANCE_HELMHOLTZ_ENERGY,
    "substance.helmholtz-energy",
    "helmholtz_energy",
    SUBSTANCE_ARGS,
    GAS_LAW_CLAIMS,
    "A° per mole of the substance",
    "Helmholtz energy at T, H counted from the elements at 298.15 K. A°(T) = G°(T) - R T for a gas, taken as ideal; condensed volumes neglected."
);
substance_card!(
    SUBSTANCE_ENTROPY,
    "substance.entropy",
    "entropy",
    SUBSTANCE_ARGS_WITHOUT_FORMATION,
    ENTROPY_CLAIMS,
    "S° per mole of the substance",
    "Third-law entropy at T, without nuclear spin, p° = 1 bar."
);
substance_card!(
    SUBSTANCE_HEAT_CAPACITY,
    "substance.heat-capacity",
    "heat_capacity",
    SUBSTANCE_ARGS_WITHOUT_FORMATION,
    ENTROPY_CLAIMS,
    "Cp° per mole of the substance",
    "Heat capacity at constant pressure at T."
);
