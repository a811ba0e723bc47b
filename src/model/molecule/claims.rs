//! Tests of what a computed heat capacity leans on: each priced by the same molecule taken in a better way.
//!
//! The surprise: whether a vibration is harmonic cannot be told from its fundamental. Where a published function of the
//! same gas is shipped, the whole gap to it stands as the price; where none is, the row is untested.

use std::rc::Rc;

use crate::model::card::{Call, Cx, Value};
use crate::model::function;
use crate::model::molecule::answers::{self, Asked, molecule_of};
use crate::model::molecule::definition::{Definition, Motion};
use crate::model::molecule::parameter::{self, Parameter};
use crate::model::molecule::treatment::{LowAs, TorsionAs, Treatment, VibrationAs};
use crate::model::molecule::{Molecule, shipped, stretching};
use crate::model::statmech::rotation::Sum;
use crate::num::math;
use crate::quantity::{Quantity, round};
use crate::record::node::{Input, LeafKey, Node};
use crate::record::register::{Finding, Tested};

/// The call with its molecule replaced.
fn anew(cx: &Cx, call: &Call, molecule: Molecule) -> Tested {
    anew_as(cx, call, molecule, String::new())
}

fn anew_as(cx: &Cx, call: &Call, molecule: Molecule, how: String) -> Tested {
    let mut args = call.args.clone();
    args[0] = Value::Molecule(Rc::new(molecule));
    match answers::value(cx, &Rc::new(Call { card: call.card, args }), true) {
        Ok(value) => Tested::Better { value: Rc::clone(value.node()), how },
        Err(fault) => Tested::Missing { what: fault.message().to_owned() },
    }
}

fn finding(id: &'static str, call: &Call, value: &Quantity, tested: Tested) -> Vec<Finding> {
    let t_k = match call.args.get(1) {
        Some(Value::Quantity(t)) => Some(t.si()),
        _ => None,
    };
    vec![found(id, molecule_of(call).text(), value, t_k, tested)]
}

/// One finding of an id that the caller has as a literal.
fn found(id: &'static str, subject: &str, value: &Quantity, t_k: Option<f64>, tested: Tested) -> Finding {
    Finding::known(id, subject, value.node(), t_k, tested)
}

fn with_words(tested: Tested, words: &str) -> Tested {
    match tested {
        Tested::Better { value, .. } => Tested::Better { value, how: words.to_owned() },
        other => other,
    }
}

/// `equipartition`: where vibrations were taken at their classical limit, against the oscillators.
pub fn equipartition(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let molecule = molecule_of(call);
    if molecule.treatment().vibration != VibrationAs::Equipartition {
        return Vec::new();
    }
    let better = molecule.taken(Treatment { vibration: VibrationAs::Levels, ..*molecule.treatment() });
    let tested = with_words(anew(cx, call, better), "quantised vibrations and torsions");
    finding("equipartition", call, value, tested)
}

/// `harmonic`: against the levels of a diatomic molecule, or a published function of the same gas.
pub fn harmonic(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let molecule = molecule_of(call);
    let treatment = molecule.treatment();
    let tested = match (&molecule.definition().motion, treatment.vibration) {
        (Motion::Atom, _) | (_, VibrationAs::Equipartition) | (Motion::Diatomic { .. }, VibrationAs::Levels) => {
            return Vec::new();
        }
        (Motion::Diatomic { .. }, VibrationAs::Harmonic) => {
            let better = molecule.taken(Treatment { vibration: VibrationAs::Levels, ..*treatment });
            with_words(anew(cx, call, better), "the sum over all levels of vibration and rotation")
        }
        (Motion::Polyatomic { vibrations, .. }, _) if vibrations.is_empty() => return Vec::new(),
        (Motion::Polyatomic { .. }, _) => published(cx, call).unwrap_or_else(|| Tested::Missing {
            what: format!(
                "only wavenumbers of {0} are known, no anharmonic constants, and no function of {0} that reaches here is \
                 shipped",
                molecule.text()
            ),
        }),
    };
    finding("harmonic", call, value, tested)
}

/// The same answer by the published function of the gas.
fn published(cx: &Cx, call: &Call) -> Option<Tested> {
    let molecule = molecule_of(call);
    let function = shipped::published(molecule)?;
    let asked = Asked::of(call.card)?;
    let t_k = call.quantity(1).si();
    let from_k = match call.args.get(2) {
        Some(Value::Quantity(from)) => from.si(),
        _ => function::T_REFERENCE,
    };
    let entropic = matches!(asked, Asked::S | Asked::G);
    if !(function.covers(t_k) && function.covers(from_k)) || (entropic && !function.zero.entropy) {
        return None;
    }
    let (at_t, at_0) = (function::evaluate(function, t_k), function::evaluate(function, from_k));
    let si = match asked {
        Asked::Cp => at_t.cp,
        Asked::Cv => at_t.cp - cx.constants().molar_gas.value,
        Asked::S => at_t.s,
        Asked::Increment => at_t.h - at_0.h,
        Asked::G => at_t.h - at_0.h - t_k * at_t.s,
    };
    let key = LeafKey::Datum {
        dataset: function.dataset.shared(),
        record: function.id.clone(),
        field: "published function",
        t_bits: t_k.to_bits(),
        way: "",
    };
    let input = Input { citation: Some(function.citation.clone()), ..Input::of(key) };
    let made = Quantity::input(si, call_dim(call, cx)?, crate::units::Kind::PLAIN, input, None).ok()?;
    let value: Rc<Node> = Rc::clone(made.node());
    let how = format!(
        "the published function of {} ({}), so the whole gap, whichever approximation it is of",
        molecule.text(),
        function.citation.source
    );
    Some(Tested::Better { value, how })
}

fn call_dim(call: &Call, cx: &Cx) -> Option<crate::units::Dimension> {
    let value = answers::value(cx, &Rc::new(Call { card: call.card, args: call.args.clone() }), false).ok()?;
    Some(value.dim().clone())
}

/// `rigid-rotor`: against the levels of a diatomic molecule, or against stretching by the constants that were given or that one
/// stretch of the molecule tells. For others what a harmonic force field allows stands in the row.
pub fn rigid_rotor(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let molecule = molecule_of(call);
    let (definition, treatment) = (molecule.definition(), molecule.treatment());
    let tested = match (&definition.motion, treatment.vibration) {
        (Motion::Atom, _) | (Motion::Diatomic { .. }, VibrationAs::Levels) => return Vec::new(),
        (Motion::Polyatomic { .. }, _) if definition.distortion.is_some() => {
            if treatment.stretched {
                return short_of(call, definition)
                    .map_or_else(Vec::new, |tested| finding("rigid-rotor", call, value, tested));
            }
            let better = molecule.taken(Treatment { stretched: true, ..*treatment });
            let words = if definition.lacks_delta {
                "a rotor that stretches by the distortion constants given, among which δ_J and δ_K are missing"
            } else {
                "a rotor that stretches by the distortion constants given"
            };
            with_words(anew(cx, call, better), words)
        }
        (Motion::Diatomic { .. }, _) => {
            let better = molecule.taken(Treatment { vibration: VibrationAs::Levels, ..*treatment });
            with_words(
                anew(cx, call, better),
                "the sum over all levels, in which rotation stretches the molecule and weakens with v",
            )
        }
        (Motion::Polyatomic { .. }, _) => match stretching::of_one_stretch(definition) {
            Some((rho, stretch_k)) => {
                let stretched = Definition { distortion: Some(rho), ..definition.clone() };
                let better = Molecule::new(stretched, Treatment { stretched: true, ..*treatment });
                let stretch = parameter::per_cm(stretch_k);
                anew_as(cx, call, better, format!("a rotor that stretches by D = 4B³/ν², ν being {stretch}"))
            }
            None => Tested::Missing { what: unstretched(cx, call, molecule) },
        },
    };
    finding("rigid-rotor", call, value, tested)
}

/// What the distortion constants that were given leave open: their next order, where it counts, and δ_J and δ_K.
fn short_of(call: &Call, definition: &Definition) -> Option<Tested> {
    let rho = definition.distortion.as_ref()?;
    let rho_t = rho.value * call.quantity(1).si();
    if rho_t.abs() > stretching::RHO_T_MAX {
        let [rho_t, most] = [rho_t, stretching::RHO_T_MAX].map(|value| round::significant(value, 2));
        let why = format!(
            "stretching is taken to first order, and rho T, what it adds to U/RT, is {rho_t}: above {most} the next order is \
             more than 0.1 J/(K mol) of Cp"
        );
        return Some(Tested::False { why, value: None });
    }
    definition.lacks_delta.then(|| Tested::Missing {
        what: "stretching is taken with Δ_J, Δ_JK and Δ_K alone; δ_J and δ_K, which a top with no two rotational constants \
               alike also has, are not known"
            .to_owned(),
    })
}

/// That no distortion constants are known, and what a harmonic force field would allow them to bring.
fn unstretched(cx: &Cx, call: &Call, molecule: &Molecule) -> String {
    let missing = format!("distortion constants of {} are not known", molecule.text());
    let definition = molecule.definition();
    let (Some((low, high)), Ok(rigid)) = (
        stretching::bracket(definition),
        answers::value(cx, &Rc::new(Call { card: call.card, args: call.args.clone() }), false),
    ) else {
        return missing;
    };
    let with = |rho: f64| -> Option<f64> {
        let distortion = Some(Parameter::exact(stretching::NAME, rho));
        // Also where a rotor was asked for that is rigid: the row says what that leaves out.
        let treatment = Treatment { stretched: true, ..*molecule.treatment() };
        let stretched = Molecule::new(Definition { distortion, ..definition.clone() }, treatment);
        let mut args = call.args.clone();
        args[0] = Value::Molecule(Rc::new(stretched));
        let value = answers::value(cx, &Rc::new(Call { card: call.card, args }), false).ok()?;
        Some(value.si() - rigid.si())
    };
    let (Some(low), Some(high), Some(asked)) = (with(low), with(high), Asked::of(call.card)) else { return missing };
    let (scale, unit) = asked.check_unit();
    let [low, high] = [low, high].map(|off| round::significant(off / scale, 2));
    format!("{missing}; any harmonic force field with these wavenumbers brings {low} to {high} {unit}")
}

/// `free-rotor`: against the torsion in its potential, or the oscillator that was blended with a rotor.
pub fn free_rotor(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let molecule = molecule_of(call);
    let treatment = molecule.treatment();
    let Motion::Polyatomic { torsions, .. } = &molecule.definition().motion else { return Vec::new() };
    let mut findings = Vec::new();
    if torsions.iter().any(|torsion| !torsion.has_barrier()) {
        let what = format!("no barrier to the internal rotation of {} was given", molecule.text());
        findings.extend(finding("free-rotor", call, value, Tested::Missing { what }));
    } else if !torsions.is_empty() && treatment.torsion == TorsionAs::Free {
        let better = molecule.taken(Treatment { torsion: TorsionAs::Hindered, ..*treatment });
        let tested = with_words(anew(cx, call, better), "the torsion in its potential, by diagonalisation");
        findings.extend(finding("free-rotor", call, value, tested));
    } else if treatment.low == LowAs::Blended {
        let better = molecule.taken(Treatment { low: LowAs::Harmonic, ..*treatment });
        let tested = with_words(anew(cx, call, better), "every vibration a harmonic oscillator");
        findings.extend(finding("free-rotor", call, value, tested));
    }
    findings
}

/// `high-temperature-rotation`: where the classical formula stood, against the sum over levels.
pub fn high_temperature_rotation(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let molecule = molecule_of(call);
    let treatment = molecule.treatment();
    let classical = match &molecule.definition().motion {
        Motion::Atom => false,
        Motion::Diatomic { .. } => {
            treatment.vibration != VibrationAs::Levels && treatment.rotation_of(true) == Sum::Classical
        }
        Motion::Polyatomic { top, .. } => treatment.rotation_of(top.len() == 1) == Sum::Classical,
    };
    if !classical {
        return Vec::new();
    }
    let better = molecule.taken(Treatment { rotation: Some(Sum::Levels), ..*treatment });
    let tested = with_words(anew(cx, call, better), "the sum over the levels of the rigid top");
    finding("high-temperature-rotation", call, value, tested)
}

/// Factors between two symmetry numbers that are mistaken for each other.
const FACTORS: [f64; 10] = [1.0 / 12.0, 1.0 / 6.0, 0.25, 1.0 / 3.0, 0.5, 2.0, 3.0, 4.0, 6.0, 12.0];

/// `symmetry-number`: against that of the point group, else against a published entropy.
pub fn symmetry_number(cx: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let molecule = molecule_of(call);
    let definition = molecule.definition();
    if matches!(definition.motion, Motion::Atom) {
        return Vec::new();
    }
    let sigma = definition.symmetry_number;
    let of = |number: f64| {
        let mut other = definition.clone();
        other.symmetry_number = number;
        Molecule::new(other, *molecule.treatment())
    };
    let tested = match &definition.by_group {
        Some((group, number)) if *number == sigma => {
            Tested::True { how: format!("{sigma} is the number of proper rotations of the point group {group}") }
        }
        Some((group, number)) => {
            let why = format!("the point group {group} has {number} proper rotations, and {sigma} was given");
            match anew(cx, call, of(*number)) {
                Tested::Better { value, .. } => Tested::False { why, value: Some(value) },
                _ => Tested::False { why, value: None },
            }
        }
        None => by_entropy(molecule, call, cx, &of),
    };
    finding("symmetry-number", call, value, tested)
}

/// Whether a published entropy speaks for the symmetry number: no usual mistake would bring S nearer to it.
fn by_entropy(molecule: &Rc<Molecule>, call: &Call, cx: &Cx, of: &dyn Fn(f64) -> Molecule) -> Tested {
    let sigma = molecule.definition().symmetry_number;
    let given = if molecule.definition().symmetry_given { "" } else { ", which was not given and taken as 1" };
    let (t_k, set) = (call.quantity(1).si(), cx.constants());
    let entropy = shipped::published(molecule).filter(|function| function.covers(t_k) && function.zero.entropy);
    let Some(function) = entropy else {
        let what = format!(
            "neither a point group nor a published entropy of {} to hold the symmetry number {sigma}{given} against",
            molecule.text()
        );
        return Tested::Missing { what };
    };
    let r = set.molar_gas.value;
    let gap = r * molecule.gas().share(t_k, set).s - function::evaluate(function, t_k).s;
    let nearest = FACTORS
        .into_iter()
        .filter(|factor| (sigma * factor).fract() == 0.0)
        .min_by(|a, b| (gap - r * math::ln(*a)).abs().total_cmp(&(gap - r * math::ln(*b)).abs()));
    match nearest {
        // S falls by R ln of the factor when the number is that much larger.
        Some(factor) if (gap - r * math::ln(factor)).abs() < gap.abs() => {
            let how = format!(
                "the symmetry number {} instead of {sigma}{given}, with which S is nearer to {}",
                sigma * factor,
                function.citation.source
            );
            with_words(anew(cx, call, of(sigma * factor)), &how)
        }
        _ => Tested::True {
            how: format!("S is nearer to {} with {sigma} than with any other number", function.citation.source),
        },
    }
}

fn alternative(cx: &Cx, call: &Call, change: impl FnOnce(&mut Treatment)) -> Option<f64> {
    let molecule = molecule_of(call);
    let mut treatment = *molecule.treatment();
    change(&mut treatment);
    if treatment == *molecule.treatment() {
        return None;
    }
    match anew(cx, call, molecule.taken(treatment)) {
        Tested::Better { value, .. } => Some(value.si()),
        _ => None,
    }
}

/// What equipartition would have given, where the molecule vibrates and was not taken so.
pub fn with_equipartition(cx: &Cx, call: &Call, value: &Quantity) -> Option<f64> {
    let vibrates = matches!(&molecule_of(call).definition().motion, Motion::Polyatomic { .. });
    let other =
        vibrates.then(|| alternative(cx, call, |treatment| treatment.vibration = VibrationAs::Equipartition))??;
    // At 298.15 K, where it starts from true values, S and G are those of the molecule.
    (other != value.si()).then_some(other)
}

/// A mode that the published treatments of low modes would change by much: up to three times their cut-off.
fn has_low_modes(call: &Call) -> bool {
    let molecule = molecule_of(call);
    let Motion::Polyatomic { vibrations, .. } = &molecule.definition().motion else { return false };
    let quantised = molecule.treatment().vibration != VibrationAs::Equipartition;
    quantised && vibrations.iter().any(|(mode, _)| mode.value < 3.0 * molecule.treatment().cut_off_k)
}

/// What a rigid rotor would have given, where distortion constants were given.
pub fn with_rigid_rotor(cx: &Cx, call: &Call, _: &Quantity) -> Option<f64> {
    let molecule = molecule_of(call);
    molecule.definition().distortion.as_ref()?;
    alternative(cx, call, |treatment| treatment.stretched = false)
}

/// What raised low modes would have given.
pub fn with_raised(cx: &Cx, call: &Call, value: &Quantity) -> Option<f64> {
    let other = has_low_modes(call).then(|| alternative(cx, call, |treatment| treatment.low = LowAs::Raised))??;
    // Nothing was below the cut-off.
    (other != value.si()).then_some(other)
}

/// What blended low modes would have given.
pub fn with_blended(cx: &Cx, call: &Call, _: &Quantity) -> Option<f64> {
    has_low_modes(call).then(|| alternative(cx, call, |treatment| treatment.low = LowAs::Blended))?
}

/// What free torsions would have given.
pub fn with_free_rotors(cx: &Cx, call: &Call, value: &Quantity) -> Option<f64> {
    let Motion::Polyatomic { torsions, .. } = &molecule_of(call).definition().motion else { return None };
    let hindered = torsions.iter().any(|torsion| torsion.has_barrier());
    let other = hindered.then(|| alternative(cx, call, |treatment| treatment.torsion = TorsionAs::Free))??;
    // At the classical limit it is the same.
    (other != value.si()).then_some(other)
}
