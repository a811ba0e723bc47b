//! A computed heat capacity as a sum of powers of T, to be handed on, with the largest error of the fit.
//!
//! Cp ≈ Σ cᵢ Tⁿⁱ, least squares over an interval; the constants of H and S follow from H(298.15 K) and S°(298.15 K).
//! The error is that of the sum against the molecule, and says nothing of the molecule itself.
//! Source: as `statmech/powers.rs`.

use std::rc::Rc;

use crate::fault::Fault;
use crate::model::answer::Answer;
use crate::model::card::{Arg, Call, Card, Default, On, Takes, Value};
use crate::model::function::T_REFERENCE;
use crate::model::molecule::answers::{self, molecule_of};
use crate::model::molecule::error::MoleculeError;
use crate::model::molecule::parameter;
use crate::model::statmech::powers;
use crate::quantity::{Quantity, round};
use crate::units::{Entity, Kind, What};

/// The powers of the nine-constant form.
const NINE: [i32; 7] = [-2, -1, 0, 1, 2, 3, 4];

/// Two ends, and the powers.
pub(in crate::model) const INTERVAL: &[Arg] = &[
    Arg { name: "from", takes: Takes::Temperature, default: Default::Required, doc: "lower end of the interval" },
    Arg { name: "to", takes: Takes::Temperature, default: Default::Required, doc: "upper end of the interval" },
    Arg {
        name: "powers",
        takes: Takes::Any,
        default: Default::Absent,
        doc: "list of whole powers of T; -2 to 4 unless given",
    },
];

pub static POWER_FIT: Card = Card {
    id: "molecule.power-fit",
    name: "power_fit",
    on: On::Molecule,
    args: INTERVAL,
    gives: "coefficients of a sum of powers of T, with its largest error",
    doc: "Fits Cp(T) of the molecule by a sum of powers of T, so that it can be used where only such sums are taken. Parts: \
          `powers`, `coefficients` in J/(mol K) per power of kelvin, `worst` (largest deviation of the fit), `worst_at`, \
          `entropy` and `heat_capacity` at 298.15 K.",
    source: "least squares at Chebyshev points; any text of numerical analysis",
    example: "molecule(\"CO2\").power_fit(\"298.15 K\", \"1500 K\")",
    claims: &[],
    alternatives: &[],
    run: |cx, call| {
        let molecule = molecule_of(call);
        answers::within(molecule, call.quantity(1).si())?;
        answers::within(molecule, call.quantity(2).si())?;
        let (gas, set) = (molecule.gas(), cx.constants());
        let reference = gas.functions(T_REFERENCE, set);
        let of = Fitted {
            text: molecule.text(),
            entity: molecule.entity(),
            cp_298: reference.cp,
            s_298: reference.s,
            r: set.molar_gas.value,
        };
        of.answer(call, |all| gas.cps(all))
    },
    check_line: None,
    caution: None,
};

/// What is fitted, beside its Cp/R.
pub(in crate::model) struct Fitted<'a> {
    pub text: &'a str,
    pub entity: Entity,
    /// J/(mol K)
    pub cp_298: f64,
    pub s_298: f64,
    /// J/(mol K)
    pub r: f64,
}

impl Fitted<'_> {
    /// The answer to a call with two ends and powers; `cps` gives Cp/R at each of some temperatures.
    pub(in crate::model) fn answer(self, call: &Rc<Call>, cps: impl Fn(&[f64]) -> Vec<f64>) -> Result<Value, Fault> {
        let powers = powers_of(&call.args[3])?;
        let ends = (call.quantity(1).si(), call.quantity(2).si());
        let dim = parameter::molar_capacity(self.entity);
        let fit = HandedOn::of(self, ends, &powers, cps)?;
        let (step, kind) = (Rc::clone(call), Kind::of(What::Cp));
        let worst = Quantity::from_step(fit.worst, dim, kind, smallvec::SmallVec::new(), step, None)?;
        Ok(Value::Answer(Answer::PowerFit(Rc::new(HandedOn { worst_value: Some(worst), ..fit }))))
    }
}

fn powers_of(given: &Value) -> Result<Vec<i32>, Fault> {
    let wrong = |given: &Value| {
        let (key, wanted) = ("powers".to_owned(), "a list of whole numbers from -4 to 8, as in [-2, 0, 1]");
        Fault::from(MoleculeError::Sort { key, wanted, given: given.sort().to_owned() })
    };
    match given {
        Value::Nothing => Ok(NINE.to_vec()),
        Value::List(list) if !list.is_empty() => list
            .iter()
            .map(|item| match item {
                Value::Number(n) if n.fract() == 0.0 && (-4.0..=8.0).contains(n) => Ok(*n as i32),
                other => Err(wrong(other)),
            })
            .collect(),
        other => Err(wrong(other)),
    }
}

/// A fit to be read and handed on.
pub struct HandedOn {
    pub molecule: String,
    pub powers: Vec<i32>,
    /// J/(mol K) per power of kelvin.
    pub coefficients: Vec<f64>,
    pub t_min_k: f64,
    pub t_max_k: f64,
    /// Fit less molecule where that is largest, J/(mol K).
    pub worst: f64,
    pub worst_at_k: f64,
    /// Cp and S° at 298.15 K of the molecule itself, J/(mol K).
    pub cp_298: f64,
    pub s_298: f64,
    worst_value: Option<Quantity>,
}

impl HandedOn {
    fn of(
        of: Fitted<'_>,
        ends: (f64, f64),
        powers: &[i32],
        cps: impl Fn(&[f64]) -> Vec<f64>,
    ) -> Result<HandedOn, Fault> {
        let (t_min_k, t_max_k) = (ends.0.min(ends.1), ends.0.max(ends.1));
        let fit = if t_min_k < t_max_k { powers::fit(powers, t_min_k, t_max_k, cps) } else { None };
        let Some(fit) = fit else {
            let named: Vec<String> = powers.iter().map(ToString::to_string).collect();
            let powers = named.join(", ");
            return Err(MoleculeError::Powers { powers, t_min: t_min_k, t_max: t_max_k }.into());
        };
        let r = of.r;
        Ok(HandedOn {
            molecule: of.text.to_owned(),
            powers: fit.powers,
            coefficients: fit.coefficients.iter().map(|a| r * a).collect(),
            t_min_k,
            t_max_k,
            worst: r * fit.worst,
            worst_at_k: fit.worst_at_k,
            cp_298: of.cp_298,
            s_298: of.s_298,
            worst_value: None,
        })
    }

    /// `2.5e1 T^0`, each term with its power, to ten digits.
    pub fn terms(&self) -> Vec<(i32, String)> {
        let text = |c: f64| round::shortest(round::significant(c, 10).parse().unwrap_or(c));
        self.powers.iter().zip(&self.coefficients).map(|(n, c)| (*n, text(*c))).collect()
    }

    pub(in crate::model) fn parts(&self) -> Vec<(&'static str, Value)> {
        let numbers = |all: &mut dyn Iterator<Item = f64>| Value::List(all.map(Value::Number).collect());
        let worst = self.worst_value.clone().map_or(Value::Number(self.worst), Value::Quantity);
        vec![
            ("powers", numbers(&mut self.powers.iter().map(|n| f64::from(*n)))),
            ("coefficients", numbers(&mut self.coefficients.iter().copied())),
            ("from", Value::Number(self.t_min_k)),
            ("to", Value::Number(self.t_max_k)),
            ("worst", worst),
            ("worst_at", Value::Number(self.worst_at_k)),
            ("heat_capacity", Value::Number(self.cp_298)),
            ("entropy", Value::Number(self.s_298)),
        ]
    }
}
