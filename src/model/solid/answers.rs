//! What a crystal answers at a temperature, per mole of it: Cp°, Cv, S°, H(T) − H(T₀), G°(T) − H°(298.15 K).
//!
//! G°(T) − H°(298.15 K) = H(T) − H(298.15 K) − T S°(T)
//!
//! S from 0 K by the third law, without nuclear spin and isotope mixing. The pressure is p° = 1 bar, whose effect on a
//! crystal is left out. Source: as `solid/mod.rs`.

use std::collections::BTreeMap;
use std::rc::Rc;

use smallvec::SmallVec;

use crate::fault::Fault;
use crate::model::answer::Answer;
use crate::model::card::{Arg, Call, Card, Claim, Cx, Default, On, Sources, Takes, Value};
use crate::model::function::T_REFERENCE;
use crate::model::gather::{Figure, GatherError};
use crate::model::molecule::answers::{AT, Asked, BETWEEN, TEMPERATURE, written};
use crate::model::molecule::formation;
use crate::model::molecule::parameter::{self, Parameter};
use crate::model::molecule::power_fit;
use crate::model::molecule::shares::{Row, Shares};
use crate::model::property;
use crate::model::solid::error::SolidError;
use crate::model::solid::{Crystal, Functions, RANGE_K, claims, read};
use crate::model::thermo::{AtT, Thermo};
use crate::quantity::Quantity;
use crate::record::node::{Input, LeafKey, Node};
use crate::units::constants::STANDARD_PRESSURE;
use crate::units::{Base, Dimension, Kind, State, What, Zero};

/// The combination of the functions at T and at T₀ that is asked for.
fn combined(asked: Asked, at_t: Functions, at_0: Functions, t_k: f64) -> f64 {
    match asked {
        Asked::Cp => at_t.cp,
        Asked::Cv => at_t.cv,
        Asked::S => at_t.s,
        Asked::Increment => at_t.h - at_0.h,
        Asked::G => at_t.h - at_0.h - t_k * at_t.s,
    }
}

/// The crystal a call is asked of.
pub fn crystal_of(call: &Call) -> &Rc<Crystal> {
    match &call.args[0] {
        Value::Crystal(crystal) => crystal,
        other => unreachable!("{} is asked of a crystal, not of {}", call.card.id, other.sort()),
    }
}

/// The functions at a temperature within the range.
///
/// # Errors
/// It is outside, or the expansion given cannot be carried there.
pub fn functions(cx: &Cx, crystal: &Crystal, t_k: f64) -> Result<Functions, Fault> {
    let (t_min, t_max) = RANGE_K;
    if !(t_min..=t_max).contains(&t_k) {
        return Err(GatherError::Range { species: crystal.text().to_owned(), t_k, t_min, t_max }.into());
    }
    let at = crystal.functions(t_k, cx.constants().molar_gas.value);
    if at.cp.is_finite() && at.h.is_finite() {
        return Ok(at);
    }
    Err(SolidError::ExpansionTooLarge { crystal: crystal.text().to_owned(), t_k }.into())
}

fn start(call: &Call) -> Option<&Quantity> {
    match call.args.get(2) {
        Some(Value::Quantity(from)) => Some(from),
        _ => None,
    }
}

/// The answer to a call of a card of this file. The temperatures are inputs where `with_t` says so.
pub(super) fn value(cx: &Cx, call: &Rc<Call>, with_t: bool) -> Result<Quantity, Fault> {
    let crystal = crystal_of(call);
    let asked = Asked::of(call.card).unwrap_or_else(|| unreachable!("{} is no answer of a crystal", call.card.id));
    let (t_k, from_k) = (call.quantity(1).si(), start(call).map_or(T_REFERENCE, Quantity::si));
    let (at_t, at_0) = (functions(cx, crystal, t_k)?, functions(cx, crystal, from_k)?);
    let r = cx.constants().molar_gas.value;
    let from = if asked.needs_start() { crystal.derivatives(from_k, r) } else { Vec::new() };
    let mut inputs: SmallVec<[(Rc<Node>, f64); 2]> = SmallVec::new();
    for (nth, (node, change)) in crystal.derivatives(t_k, r).into_iter().enumerate() {
        // Both lists are of one crystal, in one order.
        let begun = from.get(nth).map_or_else(Functions::default, |(_, change)| *change);
        inputs.push((node, combined(asked, change, begun, t_k)));
    }
    // R is a factor of what the lattice brings, not of electrons.
    let of_r = |t_k: f64| crystal.by_r(t_k, r);
    let begun = if asked.needs_start() { of_r(from_k) } else { Functions::default() };
    inputs.push((Rc::clone(property::gas_constant(cx.constants()).node()), combined(asked, of_r(t_k), begun, t_k)));
    if with_t {
        let slope = match asked {
            Asked::Cp => at_t.cp_slope,
            Asked::Cv => crystal.cv_slope(t_k, r),
            Asked::S => at_t.cp / t_k,
            Asked::Increment => at_t.cp,
            Asked::G => -at_t.s,
        };
        inputs.push((property::as_argument(call.quantity(1)), slope));
        if let Some(from) = start(call) {
            inputs.push((property::as_argument(from), -at_0.cp));
        }
    }
    let zero = match asked {
        Asked::Increment => Some(Zero::From(from_k)),
        Asked::G => Some(Zero::From(T_REFERENCE)),
        _ => None,
    };
    let dim = asked.dimension(crystal.entity());
    let p_pa = Some(STANDARD_PRESSURE.value);
    let kind = Kind::in_state(asked.what(), State { zero, t_k: Some(t_k), p_pa, standard: true, reaction: false });
    let si = combined(asked, at_t, at_0, t_k);
    let step = Rc::clone(call);
    Ok(Quantity::from_step(si, dim, kind, inputs, step, cx.place.clone())?)
}

fn run(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    Ok(Value::Quantity(value(cx, call, true)?))
}

/// What each group of modes, the electrons and expansion bring.
fn check_line(cx: &Cx, call: &Call, value: &Quantity, sources: &mut Sources) -> String {
    let Some(asked) = Asked::of(call.card) else { return String::new() };
    let (crystal, r) = (crystal_of(call), cx.constants().molar_gas.value);
    let (t_k, from_k) = (call.quantity(1).si(), start(call).map_or(T_REFERENCE, Quantity::si));
    let of = |at: &dyn Fn(f64) -> Functions| combined(asked, at(t_k), at(from_k), t_k);
    let mut tag = |parameter: &Parameter| {
        parameter.citation().map_or_else(String::new, |citation| format!("[{}]", sources.number(citation)))
    };
    let mut figures = Vec::new();
    for modes in &crystal.modes {
        let at = |t: f64| {
            let share = modes.count * modes.spectrum.share(modes.theta.value / t);
            Functions { cv: r * share.cv, cp: r * share.cv, h: r * t * share.u, s: r * share.s, cp_slope: 0.0 }
        };
        figures.push((of(&at), tag(&modes.theta)));
    }
    if let Some(gamma) = &crystal.gamma {
        let at = |t: f64| {
            let cv = gamma.value * t;
            Functions { cv, cp: cv, h: 0.5 * cv * t, s: cv, cp_slope: 0.0 }
        };
        figures.push((of(&at), tag(gamma)));
    }
    if crystal.expansion.is_some() && asked != Asked::Cv {
        let others: f64 = figures.iter().map(|(figure, _)| figure).sum();
        figures.push((value.si() - others, String::new()));
    }
    written(asked, &figures, value)
}

/// A crystal in place of a table's record.
pub struct Own {
    crystal: Rc<Crystal>,
    formation: Option<Quantity>,
}

impl Own {
    /// # Errors
    /// Its formation enthalpy cannot be taken to 298.15 K.
    pub fn new(cx: &Cx, crystal: &Rc<Crystal>) -> Result<Own, Fault> {
        let call = Call { card: &FORMATION_ENTHALPY, args: vec![Value::Crystal(Rc::clone(crystal))] };
        Ok(Own { crystal: Rc::clone(crystal), formation: given_formation(cx, &Rc::new(call))? })
    }

    fn ask(&self, cx: &Cx, card: &'static Card, t_k: f64) -> Result<Figure, Fault> {
        let input = Input { u: Some(0.0), ..Input::of(LeafKey::Own("temperature of the reaction".into())) };
        let kind = Kind::of(What::TemperaturePoint);
        let t = Quantity::input(t_k, Dimension::base(Base::Kelvin), kind, input, None)?;
        let mut args = vec![Value::Crystal(Rc::clone(&self.crystal)), Value::Quantity(t)];
        args.resize(1 + card.args.len(), Value::Nothing);
        let value = value(cx, &Rc::new(Call { card, args }), false)?;
        Ok(Figure::of_nodes(value.si(), [(Rc::clone(value.node()), 1.0)]))
    }
}

impl Thermo for Own {
    fn range_k(&self) -> (f64, f64) {
        RANGE_K
    }

    fn at(&self, cx: &Cx, t_k: f64) -> Result<AtT, Fault> {
        Ok(AtT {
            cp: self.ask(cx, &HEAT_CAPACITY, t_k)?,
            increment: self.ask(cx, &ENTHALPY_INCREMENT, t_k)?,
            entropy: Some(self.ask(cx, &ENTROPY, t_k)?),
            cp_slope: functions(cx, &self.crystal, t_k)?.cp_slope,
        })
    }

    fn formation(&self) -> Option<Figure> {
        let value = self.formation.as_ref()?;
        Some(Figure::of_nodes(value.si(), [(Rc::clone(value.node()), 1.0)]))
    }
}

/// The formation enthalpy at 298.15 K, made by `call`; `None` where none was given.
fn given_formation(cx: &Cx, call: &Rc<Call>) -> Result<Option<Quantity>, Fault> {
    let crystal = crystal_of(call);
    formation::at_298(cx, call, crystal.formation.as_ref(), &crystal.substance.species, || {
        let own = functions(cx, crystal, T_REFERENCE)?.h;
        let by = crystal.derivatives(T_REFERENCE, cx.constants().molar_gas.value);
        Ok((own, by.into_iter().map(|(node, change)| (node, change.h)).collect()))
    })
}

const SOURCE: &str = "P. Debye, Ann. Phys. 39, 789 (1912); A. Einstein, Ann. Phys. 22, 180 (1907); W. Nernst, F. A. \
                      Lindemann, Z. Elektrochem. 17, 817 (1911); all from memory";

const CLAIMS: &[Claim] = &[
    Claim { id: "debye-model", test: claims::debye_model },
    Claim { id: "expansion-neglected", test: claims::expansion_neglected },
    Claim { id: "expansion-estimate", test: claims::expansion_estimate },
];

pub static CRYSTAL: Card = Card {
    id: "crystal.read",
    name: "crystal",
    on: On::Nothing,
    args: &[Arg {
        name: "definition",
        takes: Takes::Any,
        default: Default::Required,
        doc: "a map with `formula`, `debye` or `einstein` or both, and where known `electronic`, `expansivity`, `compressibility`, \
              `molar_volume`, or else `melting_point`, and `formation_enthalpy`",
    }],
    gives: "a crystal",
    doc: "A crystal by its characteristic temperatures, as temperatures or wavenumbers. Several share the modes with a count each, \
          `debye: [[\"320 K\", 3]], einstein: [[\"500 K\", 3]]`, three in all for each atom; one without a count takes what is left.",
    source: SOURCE,
    example: "crystal(#{ formula: \"NaCl\", debye: \"321 K\" })",
    claims: &[],
    alternatives: &[],
    run: |cx, call| match &call.args[0] {
        Value::Options(map) => Ok(Value::Crystal(Rc::new(read::crystal(cx, map)?))),
        other => {
            let (key, wanted, given) = ("definition".to_owned(), "a map", other.sort().to_owned());
            Err(SolidError::Sort { key, wanted, given }.into())
        }
    },
    check_line: None,
    caution: None,
};

macro_rules! answer_card {
    ($name:ident, $id:literal, $script:literal, $args:expr, $gives:literal, $doc:literal) => {
        pub static $name: Card = Card {
            id: $id,
            name: $script,
            on: On::Crystal,
            args: $args,
            gives: $gives,
            doc: $doc,
            source: SOURCE,
            example: concat!("crystal(#{ formula: \"NaCl\", debye: \"321 K\" }).", $script, "(\"450 degC\")"),
            claims: CLAIMS,
            alternatives: &[],
            run,
            check_line: Some(check_line),
            caution: None,
        };
    };
}

answer_card!(
    HEAT_CAPACITY,
    "crystal.heat-capacity",
    "heat_capacity",
    AT,
    "Cp per mole of the crystal",
    "Heat capacity at constant pressure: Cv, and what thermal expansion adds where it was given. Without it Cp is Cv."
);
answer_card!(
    HEAT_CAPACITY_V,
    "crystal.heat-capacity-v",
    "heat_capacity_v",
    AT,
    "Cv per mole of the crystal",
    "Heat capacity at constant volume, of lattice and electrons."
);
answer_card!(
    ENTROPY,
    "crystal.entropy",
    "entropy",
    AT,
    "S from 0 K per mole of the crystal",
    "Entropy from 0 K by the third law, without nuclear spin and isotope mixing."
);
answer_card!(
    ENTHALPY_INCREMENT,
    "crystal.enthalpy-increment",
    "enthalpy_increment",
    BETWEEN,
    "H(T) - H(from) per mole of the crystal",
    "Enthalpy taken up on heating, 298.15 K being the start unless another is given. Phase changes are not known to it."
);
answer_card!(
    GIBBS_ENERGY,
    "crystal.gibbs-energy",
    "gibbs_energy",
    AT,
    "G(T) - H(298.15 K) per mole of the crystal",
    "Gibbs energy counted from the enthalpy at 298.15 K: H(T) - H(298.15 K) - T S(T)."
);

formation::formation_card!(
    "crystal.formation-enthalpy",
    On::Crystal,
    "crystal",
    "crystal(#{ formula: \"NaCl\", debye: \"321 K\", formation_enthalpy: \"-411.3 kJ/mol\", formation_temperature: \"298.15 K\" }).formation_enthalpy()",
    |cx, call| match given_formation(cx, call)? {
        Some(value) => Ok(Value::Quantity(value)),
        None => Err(SolidError::NoFormation { crystal: crystal_of(call).text().to_owned() }.into()),
    }
);

pub static CLASSICAL_LIMIT: Card = Card {
    id: "crystal.classical-limit",
    name: "classical_limit",
    on: On::Crystal,
    args: &[],
    gives: "3R for each atom of the formula",
    doc: "What Cv of the lattice tends to when kT is far above every spacing of levels: the rule of Dulong and Petit.",
    source: "A. T. Petit, P. L. Dulong, Ann. Chim. Phys. 10, 395 (1819) (from memory)",
    example: "crystal(#{ formula: \"NaCl\", debye: \"321 K\" }).classical_limit()",
    claims: &[],
    alternatives: &[],
    run: |cx, call| {
        let crystal = crystal_of(call);
        let r = property::gas_constant(cx.constants());
        let modes = 3.0 * crystal.atoms();
        let inputs = SmallVec::from_iter([(Rc::clone(r.node()), modes)]);
        let (dim, kind) = (parameter::molar_capacity(crystal.entity()), Kind::of(What::Cv));
        let step = Rc::clone(call);
        Ok(Value::Quantity(Quantity::from_step(modes * r.si(), dim, kind, inputs, step, cx.place.clone())?))
    },
    check_line: None,
    caution: None,
};

pub static CONTRIBUTIONS: Card = Card {
    id: "crystal.contributions",
    name: "contributions",
    on: On::Crystal,
    args: &[TEMPERATURE],
    gives: "each part's share of Cp, and how far the lattice is from its classical limit",
    doc: "A table with a picture: Cp of each group of modes, of electrons and of expansion at T, the classical limit of the \
          modes, and S. Parts: `rows`, `T`, `heat_capacity`, `limit`, `temperatures`, `curves`.",
    source: SOURCE,
    example: "crystal(#{ formula: \"NaCl\", debye: \"321 K\" }).contributions(\"25 degC\")",
    claims: &[],
    alternatives: &[],
    run: |cx, call| {
        let crystal = crystal_of(call);
        let shares = contributions(cx, crystal, call.quantity(1).si())?;
        Ok(Value::Answer(Answer::Shares(Rc::new(shares))))
    },
    check_line: None,
    caution: None,
};

pub static POWER_FIT: Card = Card {
    id: "crystal.power-fit",
    name: "power_fit",
    on: On::Crystal,
    args: power_fit::INTERVAL,
    gives: "coefficients of a sum of powers of T, with its largest error",
    doc: "Fits Cp(T) of the crystal by a sum of powers of T, so that it can be used where only such sums are taken; the parts are \
          those of a molecule's fit. A range that begins in the cold wants many powers, or has a large error.",
    source: "least squares at Chebyshev points; any text of numerical analysis",
    example: "crystal(#{ formula: \"NaCl\", debye: \"321 K\" }).power_fit(\"298.15 K\", \"1000 K\", [-2, 0, 1])",
    claims: &[],
    alternatives: &[],
    run: |cx, call| {
        let (crystal, r) = (crystal_of(call), cx.constants().molar_gas.value);
        // Between two temperatures that have an answer all have one: what expansion adds grows with T.
        functions(cx, crystal, call.quantity(1).si())?;
        functions(cx, crystal, call.quantity(2).si())?;
        let at = functions(cx, crystal, T_REFERENCE)?;
        let (text, entity) = (crystal.text(), crystal.entity());
        let of = power_fit::Fitted { text, entity, cp_298: at.cp, s_298: at.s, r };
        of.answer(call, |all| all.iter().map(|t| crystal.functions(*t, r).cp / r).collect())
    },
    check_line: None,
    caution: None,
};

/// Points of each curve.
const POINTS: usize = 60;

fn contributions(cx: &Cx, crystal: &Crystal, t_k: f64) -> Result<Shares, Fault> {
    let r = cx.constants().molar_gas.value;
    let last = (2.0 * t_k).clamp(300.0, RANGE_K.1);
    let temperatures: Vec<f64> = (1..=POINTS).map(|nth| last * nth as f64 / POINTS as f64).collect();
    let at_t = functions(cx, crystal, t_k)?;
    functions(cx, crystal, last)?;
    let mut names: BTreeMap<String, usize> = BTreeMap::new();
    let mut rows = Vec::new();
    for modes in &crystal.modes {
        let theta = modes.theta.value;
        let at = |t: f64| modes.count * modes.spectrum.share(theta / t);
        let base = format!("{} modes after {}, {:.0} K", modes.count, modes.spectrum.word(), theta);
        let nth = names.entry(base.clone()).and_modify(|nth| *nth += 1).or_insert(1);
        let name = if *nth == 1 { base } else { format!("{base} ({nth})") };
        let share = at(t_k);
        let curve = temperatures.iter().map(|t| r * at(*t).cv).collect();
        rows.push(Row { name, cp: r * share.cv, limit: r * modes.count, s: r * share.s, curve });
    }
    if let Some(gamma) = &crystal.gamma {
        let gamma = gamma.value;
        let curve = temperatures.iter().map(|t| gamma * t).collect();
        rows.push(Row { name: "electrons".to_owned(), cp: gamma * t_k, limit: 0.0, s: gamma * t_k, curve });
    }
    if crystal.expansion.is_some() {
        let of = |t: f64| {
            let at = crystal.functions(t, r);
            at.cp - at.cv
        };
        let others: f64 = rows.iter().map(|row| row.s).sum();
        let curve = temperatures.iter().map(|t| of(*t)).collect();
        rows.push(Row { name: "expansion".to_owned(), cp: at_t.cp - at_t.cv, limit: 0.0, s: at_t.s - others, curve });
    }
    Ok(Shares { molecule: crystal.text().to_owned(), t_k, rows, temperatures })
}
