//! What a molecule answers at a temperature, per mole of it: Cp°, Cv, S°, H(T) − H(T₀), G°(T) − H°(298.15 K).
//!
//! Cp = R (1 + Σ Cv/R)     S° = R Σ S/R     H(T) − H(T₀) = RT (1 + Σ U/RT) − RT₀ (1 + Σ U/RT₀)       sums over all parts
//! G°(T) − H°(298.15 K) = H(T) − H(298.15 K) − T S°(T)
//!
//! Ideal gas at p° = 1 bar; S without nuclear spin and without the mixing of isotopes, as tables have it. The uncertainty
//! is that of the constants given, by the derivatives of each share. Source: as `statmech/gas.rs`.

use std::ops::Range;
use std::rc::Rc;

use smallvec::SmallVec;

use crate::fault::Fault;
use crate::model::card::{Alternative, Arg, Call, Card, Claim, Cx, Default, On, Sources, Takes, Value};
use crate::model::function::T_REFERENCE;
use crate::model::gather::GatherError;
use crate::model::molecule::{Molecule, RANGE_K, claims, parameter};
use crate::model::property::{self, Property};
use crate::model::statmech::{Change, Share, translation};
use crate::quantity::{Quantity, round};
use crate::record::node::{Input, LeafKey, Node};
use crate::source::Citation;
use crate::units::constants::{ConstantSet, STANDARD_PRESSURE};
use crate::units::{Base, Dimension, Entity, Kind, State, What, Zero};

/// What is asked.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Asked {
    Cp,
    Cv,
    S,
    Increment,
    G,
}

impl Asked {
    /// What a card of a molecule or a crystal asks, if it is an answer at a temperature.
    pub fn of(card: &Card) -> Option<Asked> {
        let (family, name) = card.id.split_once('.')?;
        if !matches!(family, "molecule" | "crystal") {
            return None;
        }
        Some(match name {
            "heat-capacity" => Asked::Cp,
            "heat-capacity-v" => Asked::Cv,
            "entropy" => Asked::S,
            "enthalpy-increment" => Asked::Increment,
            "gibbs-energy" => Asked::G,
            _ => return None,
        })
    }

    pub(in crate::model) fn what(self) -> What {
        match self {
            Asked::Cp => What::Cp,
            Asked::Cv => What::Cv,
            Asked::S => What::S,
            Asked::Increment => What::H,
            Asked::G => What::G,
        }
    }

    /// Whether the answer is counted from a start.
    pub(in crate::model) fn needs_start(self) -> bool {
        matches!(self, Asked::Increment | Asked::G)
    }

    /// Per mole of an entity.
    pub(in crate::model) fn dimension(self, per: Entity) -> Dimension {
        match self {
            Asked::Cp | Asked::Cv | Asked::S => parameter::molar_capacity(per),
            Asked::Increment | Asked::G => property::dimension(Property::H, per),
        }
    }

    /// The unit that figures are written in beside the value, and what it is in SI units.
    pub(super) fn check_unit(self) -> (f64, &'static str) {
        match self {
            Asked::Increment | Asked::G => (1000.0, "kJ/mol"),
            _ => (1.0, "J/(K mol)"),
        }
    }

    /// The combination of the sums at T and at T₀ that is asked for, in units of R (times K).
    fn combined(self, at_t: Change, at_0: Change, t_k: f64, from_k: f64) -> f64 {
        match self {
            Asked::Cp | Asked::Cv => at_t.cv,
            Asked::S => at_t.s,
            Asked::Increment => t_k * at_t.u - from_k * at_0.u,
            Asked::G => t_k * (at_t.u - at_t.s) - from_k * at_0.u,
        }
    }
}

fn as_change(share: Share) -> Change {
    Change { cv: share.cv, u: share.u, s: share.s }
}

/// An answer in SI units, its derivatives with respect to the molecule's inputs, and those with respect to T and T₀.
pub struct Answered {
    pub si: f64,
    pub inputs: SmallVec<[(Rc<Node>, f64); 2]>,
    pub slopes: (f64, f64),
}

/// Computes an answer.
///
/// # Errors
/// A temperature is outside [`RANGE_K`].
pub fn answered(
    molecule: &Molecule,
    asked: Asked,
    t_k: f64,
    from_k: f64,
    set: &ConstantSet,
) -> Result<Answered, Fault> {
    within(molecule, t_k)?;
    within(molecule, from_k)?;
    let r = set.molar_gas.value;
    let pv = Share { u: 1.0, cv: if asked == Asked::Cv { 0.0 } else { 1.0 }, ..Share::default() };
    let (at_t, at_0) = (molecule.gas().share(t_k, set) + pv, molecule.gas().share(from_k, set) + pv);
    let si = r * asked.combined(as_change(at_t), as_change(at_0), t_k, from_k);
    let changes = molecule.derivatives(t_k);
    let from = if asked.needs_start() { molecule.derivatives(from_k) } else { vec![] };
    let mut inputs: SmallVec<[(Rc<Node>, f64); 2]> = SmallVec::with_capacity(changes.len() + 2);
    for (nth, (node, change)) in changes.into_iter().enumerate() {
        // Both lists are of one molecule, in one order.
        let start = from.get(nth).map_or_else(Change::default, |(_, change)| *change);
        let by = r * asked.combined(change, start, t_k, from_k);
        if by != 0.0 {
            inputs.push((node, by));
        }
    }
    inputs.push((Rc::clone(property::gas_constant(set).node()), si / r));
    let cp = r * at_t.cv;
    let slopes = match asked {
        Asked::Cp | Asked::Cv => (r * at_t.bend / t_k, 0.0),
        Asked::S => (cp / t_k, 0.0),
        Asked::Increment => (cp, -r * at_0.cv),
        Asked::G => (-r * at_t.s, 0.0),
    };
    Ok(Answered { si, inputs, slopes })
}

/// Fills in what a heat capacity over a grid needs no call each for, in SI units: the rows within [`RANGE_K`], bit for bit
/// what the single calls give.
pub(in crate::model) fn numbers(call: &Call, points_k: &[f64], out: &mut [f64], set: &ConstantSet) -> Range<usize> {
    let (Some(asked @ (Asked::Cp | Asked::Cv)), Some(Value::Molecule(molecule))) =
        (Asked::of(call.card), call.args.first())
    else {
        return 0..0;
    };
    let (t_min, t_max) = RANGE_K;
    let rows = points_k.partition_point(|t_k| *t_k < t_min)..points_k.partition_point(|t_k| *t_k <= t_max);
    let (r, pv) = (set.molar_gas.value, if asked == Asked::Cv { 0.0 } else { 1.0 });
    let cvs = molecule.gas().cvs(&points_k[rows.clone()]);
    out[rows.clone()].iter_mut().zip(cvs).for_each(|(out, cv)| *out = r * (cv + pv));
    rows
}

/// Refuses a temperature at which a molecule does not answer.
///
/// # Errors
/// As said.
pub fn within(molecule: &Molecule, t_k: f64) -> Result<(), Fault> {
    let (t_min, t_max) = RANGE_K;
    if (t_min..=t_max).contains(&t_k) {
        return Ok(());
    }
    Err(GatherError::Range { species: molecule.text().to_owned(), t_k, t_min, t_max }.into())
}

/// The molecule a call is asked of.
pub fn molecule_of(call: &Call) -> &Rc<Molecule> {
    match &call.args[0] {
        Value::Molecule(molecule) => molecule,
        other => unreachable!("{} is asked of a molecule, not of {}", call.card.id, other.sort()),
    }
}

/// The start of an increment, as it was given.
fn start(call: &Call) -> Option<&Quantity> {
    match call.args.get(2) {
        Some(Value::Quantity(from)) => Some(from),
        _ => None,
    }
}

fn start_k(call: &Call) -> f64 {
    start(call).map_or(T_REFERENCE, Quantity::si)
}

/// The answer to a call of a card of this file, as a value with its inputs. The temperatures are inputs where `with_t` says so.
///
/// # Errors
/// As [`answered`].
pub fn value(cx: &Cx, call: &Rc<Call>, with_t: bool) -> Result<Quantity, Fault> {
    let molecule = molecule_of(call);
    let asked = Asked::of(call.card).unwrap_or_else(|| unreachable!("{} is no answer of a molecule", call.card.id));
    let (t_k, from_k) = (call.quantity(1).si(), start_k(call));
    let Answered { si, mut inputs, slopes } = answered(molecule, asked, t_k, from_k, cx.constants())?;
    if with_t {
        inputs.push((property::as_argument(call.quantity(1)), slopes.0));
        if let Some(from) = start(call) {
            inputs.push((property::as_argument(from), slopes.1));
        }
    }
    let zero = match asked {
        Asked::Increment => Some(Zero::From(from_k)),
        Asked::G => Some(Zero::From(T_REFERENCE)),
        _ => None,
    };
    let p_pa = Some(STANDARD_PRESSURE.value);
    let kind = Kind::in_state(asked.what(), State { zero, t_k: Some(t_k), p_pa, standard: true, reaction: false });
    let step = Rc::clone(call);
    Ok(Quantity::from_step(si, asked.dimension(molecule.entity()), kind, inputs, step, cx.place.clone())?)
}

/// What a card of this file answers for a molecule at a temperature that is a condition of somebody else's step.
///
/// # Errors
/// As [`answered`].
pub fn at(cx: &Cx, card: &'static Card, molecule: &Rc<Molecule>, t_k: f64) -> Result<Quantity, Fault> {
    let input = Input { u: Some(0.0), ..Input::of(LeafKey::Own("temperature of the reaction".into())) };
    let kind = Kind::of(What::TemperaturePoint);
    let t = Quantity::input(t_k, Dimension::base(Base::Kelvin), kind, input, None)?;
    let mut args = vec![Value::Molecule(Rc::clone(molecule)), Value::Quantity(t)];
    args.resize(1 + card.args.len(), Value::Nothing);
    value(cx, &Rc::new(Call { card, args }), false)
}

fn run(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    Ok(Value::Quantity(value(cx, call, true)?))
}

/// Figures in SI units that add up to an answer, each with the number of its source behind it.
pub(in crate::model) fn written(asked: Asked, figures: &[(f64, String)], value: &Quantity) -> String {
    let (scale, unit) = asked.check_unit();
    let mut line = String::new();
    for &(figure, ref tag) in figures {
        let sign = match (line.is_empty(), figure < 0.0) {
            (true, false) => "",
            (true, true) => "-",
            (false, false) => " + ",
            (false, true) => " - ",
        };
        line.push_str(&format!("{sign}{}{tag}", round::fixed(figure.abs() / scale, 3)));
    }
    format!("{line} = {} {unit}", round::fixed(value.si() / scale, 3))
}

/// Vibrations beyond this number are one figure in a check line.
const MOST_FIGURES: usize = 8;

fn check_line(cx: &Cx, call: &Call, value: &Quantity, sources: &mut Sources) -> String {
    let Some(asked) = Asked::of(call.card) else { return String::new() };
    let (molecule, t_k, from_k) = (molecule_of(call), call.quantity(1).si(), start_k(call));
    let (set, r) = (cx.constants(), cx.constants().molar_gas.value);
    let of =
        |share: &dyn Fn(f64) -> Share| r * asked.combined(as_change(share(t_k)), as_change(share(from_k)), t_k, from_k);
    let pv = if asked == Asked::Cv { 0.0 } else { 1.0 };
    let moved = |t: f64| {
        let own = translation::share(molecule.gas().molar_mass_kg_mol, t, set);
        Share { cv: own.cv + pv, u: own.u + 1.0, ..own }
    };
    let mut tag =
        |citation: Option<&Citation>| citation.map_or_else(String::new, |c| format!("[{}]", sources.number(c)));
    // The mass enters S alone.
    let of_mass = if matches!(asked, Asked::S | Asked::G) { molecule.definition().mass.citation() } else { None };
    let mut figures = vec![(of(&moved), tag(of_mass))];
    let parts = &molecule.gas().parts;
    let each = parts.len() <= MOST_FIGURES;
    let mut rest: Option<(f64, String)> = None;
    for (part, citation) in parts.iter().zip(molecule.citations()) {
        let figure = of(&|t| part.share(t));
        match &mut rest {
            Some((sum, _)) if !each && part.is_vibration() => *sum += figure,
            None if !each && part.is_vibration() => rest = Some((figure, tag(citation))),
            _ => figures.push((figure, tag(citation))),
        }
    }
    figures.extend(rest);
    written(asked, &figures, value)
}

pub(in crate::model) const TEMPERATURE: Arg =
    Arg { name: "T", takes: Takes::Temperature, default: Default::Required, doc: "temperature: degC, degF or kelvin" };
/// What an answer takes: one temperature, or a grid of them.
pub(in crate::model) const AT: &[Arg] = &[Arg {
    name: "T",
    takes: Takes::Temperatures,
    default: Default::Required,
    doc: "temperature: degC, degF or kelvin; or a grid of temperatures, which gives a curve",
}];
pub(in crate::model) const BETWEEN: &[Arg] = &[
    Arg {
        name: "T",
        takes: Takes::Temperatures,
        default: Default::Required,
        doc: "end temperature; or a grid of them, which gives a curve",
    },
    Arg {
        name: "from",
        takes: Takes::Temperature,
        default: Default::Absent,
        doc: "start temperature; 298.15 K unless given",
    },
];

const CLAIMS: &[Claim] = &[
    Claim { id: "equipartition", test: claims::equipartition },
    Claim { id: "harmonic", test: claims::harmonic },
    Claim { id: "rigid-rotor", test: claims::rigid_rotor },
    Claim { id: "free-rotor", test: claims::free_rotor },
    Claim { id: "high-temperature-rotation", test: claims::high_temperature_rotation },
];
const ENTROPY_CLAIMS: &[Claim] = &[
    Claim { id: "equipartition", test: claims::equipartition },
    Claim { id: "harmonic", test: claims::harmonic },
    Claim { id: "rigid-rotor", test: claims::rigid_rotor },
    Claim { id: "free-rotor", test: claims::free_rotor },
    Claim { id: "high-temperature-rotation", test: claims::high_temperature_rotation },
    Claim { id: "symmetry-number", test: claims::symmetry_number },
];
const ALTERNATIVES: &[Alternative] = &[
    Alternative {
        id: "equipartition",
        words: "with every vibration and torsion at its classical limit",
        value: claims::with_equipartition,
    },
    Alternative {
        id: "raised-low-modes",
        words: "with vibrations below 100 cm⁻¹ raised to it, after Truhlar",
        value: claims::with_raised,
    },
    Alternative {
        id: "blended-low-modes",
        words: "with vibrations of low wavenumber blended with free rotors, after Grimme",
        value: claims::with_blended,
    },
    Alternative { id: "free-rotor", words: "with every torsion turning freely", value: claims::with_free_rotors },
    Alternative { id: "rigid-rotor", words: "with a rotor that does not stretch", value: claims::with_rigid_rotor },
];

const SOURCE: &str = "statistical mechanics of the ideal gas, as in J. E. Mayer, M. G. Mayer, Statistical Mechanics (1940), \
                      chapters 7 to 9 (from memory)";

macro_rules! answer_card {
    ($name:ident, $id:literal, $script:literal, $args:expr, $claims:expr, $gives:literal, $doc:literal) => {
        pub static $name: Card = Card {
            id: $id,
            name: $script,
            on: On::Molecule,
            args: $args,
            gives: $gives,
            doc: $doc,
            source: SOURCE,
            example: concat!("molecule(\"CO2\").", $script, "(\"450 degC\")"),
            claims: $claims,
            alternatives: ALTERNATIVES,
            run,
            check_line: Some(check_line),
            caution: None,
        };
    };
}

answer_card!(
    HEAT_CAPACITY,
    "molecule.heat-capacity",
    "heat_capacity",
    AT,
    CLAIMS,
    "Cp° per mole of the gas",
    "Heat capacity at constant pressure of the ideal gas, from the energy levels of its molecule."
);
answer_card!(
    HEAT_CAPACITY_V,
    "molecule.heat-capacity-v",
    "heat_capacity_v",
    AT,
    CLAIMS,
    "Cv per mole of the gas",
    "Heat capacity at constant volume of the ideal gas, Cp - R."
);
answer_card!(
    ENTROPY,
    "molecule.entropy",
    "entropy",
    AT,
    ENTROPY_CLAIMS,
    "S° per mole of the gas, without nuclear spin",
    "Standard entropy at 1 bar, without nuclear spin and the mixing of isotopes, as tables have it."
);
answer_card!(
    ENTHALPY_INCREMENT,
    "molecule.enthalpy-increment",
    "enthalpy_increment",
    BETWEEN,
    CLAIMS,
    "H(T) - H(from) per mole of the gas, zero: the gas itself at the start",
    "Enthalpy taken up on heating from 298.15 K, or from another temperature."
);
answer_card!(
    GIBBS_ENERGY,
    "molecule.gibbs-energy",
    "gibbs_energy",
    AT,
    ENTROPY_CLAIMS,
    "G°(T) - H°(298.15 K) per mole of the gas",
    "Gibbs energy counted from the enthalpy of the gas itself at 298.15 K: H(T) - H(298.15 K) - T S°(T), p° = 1 bar."
);

#[cfg(test)]
mod tests {
    use std::cell::Cell;
    use std::collections::BTreeMap;

    use super::*;
    use crate::model::card::{self, References};
    use crate::model::molecule::{read, shipped};
    use crate::units::constants;

    fn with_cx<T>(work: impl FnOnce(&Cx) -> T) -> T {
        let (references, ordinal) = (References::new(constants::current()), Cell::new(0));
        work(&Cx { references: &references, place: None, ordinal: &ordinal, halted: &|| None })
    }

    fn ask(cx: &Cx, molecule: &Rc<Molecule>, card: &'static Card, t: &str) -> Quantity {
        match card::call(cx, card, vec![Value::Molecule(Rc::clone(molecule)), Value::Text(t.into())]).unwrap() {
            Value::Quantity(value) => value,
            other => panic!("{} gives {}", card.id, other.sort()),
        }
    }

    /// An invented molecule of every sort of part, with one figure moved by a relative step.
    fn invented(cx: &Cx, moved: usize, step: f64) -> Rc<Molecule> {
        let figures = [2.0, 0.4, 0.3, 1500.0, 300.0, 80.0, 9.0, 700.0, 900.0, 0.97];
        let at = |nth: usize| figures[nth] * if nth == moved { 1.0 + step } else { 1.0 };
        let per_cm = |nth: usize| Value::Text(format!("{:.17e}(1) cm^-1", at(nth)).into());
        let list = |all: &[usize]| Value::List(all.iter().map(|nth| per_cm(*nth)).collect());
        let options = |all: Vec<(&str, Value)>| {
            Value::Options(Rc::new(all.into_iter().map(|(k, v)| (k.to_owned(), v)).collect::<BTreeMap<_, _>>()))
        };
        let torsion = options(vec![
            ("rotational_constant", per_cm(6)),
            ("barrier", per_cm(7)),
            ("symmetry_number", Value::Number(3.0)),
        ]);
        let level = |value: Value, g: f64| Value::List(vec![value, Value::Number(g)]);
        let map = options(vec![
            ("formula", Value::Text("XeF3".into())),
            ("symmetry_number", Value::Number(2.0)),
            ("rotational_constants", list(&[0, 1, 2])),
            ("vibrations", Value::List(vec![per_cm(3), level(per_cm(4), 3.0), per_cm(5)])),
            ("torsions", Value::List(vec![torsion])),
            ("electronic_levels", Value::List(vec![level(Value::Text("0 cm^-1".into()), 2.0), level(per_cm(8), 4.0)])),
            ("scale", Value::Number(at(9))),
        ]);
        let Value::Options(map) = map else { unreachable!() };
        Rc::new(read::molecule(cx, &map).unwrap())
    }

    #[test]
    fn answers_of_one_molecule_are_consistent() {
        with_cx(|cx| {
            let molecule = invented(cx, usize::MAX, 0.0);
            let at = |card: &'static Card, t: &str| ask(cx, &molecule, card, t).si();
            let r = constants::current().molar_gas.value;
            let close = |a: f64, b: f64, allowed: f64| assert!((a - b).abs() < allowed, "{a} {b}");
            // Bound: rounding of values near 1e2 and 1e4.
            close(at(&HEAT_CAPACITY, "500 K") - at(&HEAT_CAPACITY_V, "500 K"), r, 1e-12);
            close(at(&GIBBS_ENERGY, "500 K"), at(&ENTHALPY_INCREMENT, "500 K") - 500.0 * at(&ENTROPY, "500 K"), 1e-8);
            close(at(&ENTHALPY_INCREMENT, "298.15 K"), 0.0, 1e-9);
            // Bound: central differences over 2 × 0.5 K, h²/6 of a third derivative.
            let slope = |card| at(card, "500.5 K") - at(card, "499.5 K");
            close(slope(&ENTHALPY_INCREMENT), at(&HEAT_CAPACITY, "500 K"), 1e-4);
            close(500.0 * slope(&ENTROPY), at(&HEAT_CAPACITY, "500 K"), 1e-3);
            for card in [&HEAT_CAPACITY, &ENTROPY, &ENTHALPY_INCREMENT, &GIBBS_ENERGY] {
                let value = ask(cx, &molecule, card, "500.00(1) K");
                let of_t = value.sensitivities().into_iter().find(|s| s.leaf.si() == 500.0).unwrap();
                close(of_t.derivative, slope(card), 1e-4 * (1.0 + slope(card).abs()));
            }
        });
    }

    #[test]
    fn u_of_each_input_reaches_each_answer_as_differences_say() {
        with_cx(|cx| {
            let base = invented(cx, usize::MAX, 0.0);
            for card in [&HEAT_CAPACITY, &ENTROPY, &ENTHALPY_INCREMENT, &GIBBS_ENERGY] {
                let value = ask(cx, &base, card, "450 K");
                for nth in 0..9 {
                    let h = 1e-4;
                    let moved = |step: f64| ask(cx, &invented(cx, nth, step), card, "450 K").si();
                    let difference = (moved(h) - moved(-h)) / (2.0 * h);
                    // The input is found by its value: cm⁻¹ to m⁻¹ is a factor of 100.
                    let figure = [2.0, 0.4, 0.3, 1500.0, 300.0, 80.0, 9.0, 700.0, 900.0][nth] * 100.0;
                    let found = value.sensitivities().into_iter().find(|s| (s.leaf.si() / figure - 1.0).abs() < 1e-12);
                    let got = found.map_or(0.0, |s| s.derivative * figure);
                    // Bound: a relative step of 1e-4 leaves 1e-8 of a third derivative of up to 1e4 J/mol.
                    assert!((got - difference).abs() < 2e-4, "{} by {nth}: {got} {difference}", card.id);
                }
            }
        });
    }

    #[test]
    fn a_molecule_of_the_tables_has_the_entropy_of_argon_and_the_limits_of_carbon_dioxide() {
        with_cx(|cx| {
            let argon = Rc::new(shipped::molecule(cx, "Ar").unwrap());
            // CODATA Key Values for Thermodynamics (1989), table at the CODATA site: 154.846 ± 0.003 J/(mol K).
            assert!((ask(cx, &argon, &ENTROPY, "298.15 K").si() - 154.846).abs() < 0.003);
            let r = constants::current().molar_gas.value;
            let oxide = shipped::molecule(cx, "CO2").unwrap();
            assert_eq!(oxide.gas().classical_limit(), 7.5);
            // At 20 K vibrations are frozen, and rotation is above its limit by R (θ/T)²/45, 1.5e-4 J/(mol K).
            let cold = oxide.gas().functions(20.0, constants::current()).cp;
            assert!((cold - 3.5 * r).abs() < 2e-4, "{cold}");
        });
    }
}
