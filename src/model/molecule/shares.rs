//! What each motion brings to Cp at one temperature, how far each is from its classical limit, and the same over T.
//!
//! An answer to be read and to be taken parts of, `m.contributions(T).rows`. The electrons have no limit: their row says
//! how much, and not how much of what.

use std::collections::BTreeMap;
use std::rc::Rc;

use crate::fault::Fault;
use crate::model::answer::Answer;
use crate::model::card::{Card, Cx, On, Value};
use crate::model::molecule::answers::{self, TEMPERATURE, molecule_of};
use crate::model::molecule::{Molecule, RANGE_K};

pub static CONTRIBUTIONS: Card = Card {
    id: "molecule.contributions",
    name: "contributions",
    on: On::Molecule,
    args: &[TEMPERATURE],
    gives: "each motion's share of Cp, and how far it is from its classical limit",
    doc: "A table with a picture: Cp of translation (with the R of constant pressure), rotation, each vibration, torsions and \
          electrons at T, each motion's classical limit, and S. Parts: `rows`, `T`, `heat_capacity`, `limit`, `temperatures`, \
          `curves`.",
    source: "equipartition; J. E. Mayer, M. G. Mayer, Statistical Mechanics (1940), chapter 6 (from memory)",
    example: "molecule(\"CO2\").contributions(\"450 degC\")",
    claims: &[],
    alternatives: &[],
    run: |cx, call| {
        let molecule = molecule_of(call);
        let shares = Shares::of(cx, molecule, call.quantity(1).si())?;
        Ok(Value::Answer(Answer::Shares(Rc::new(shares))))
    },
    check_line: None,
    caution: None,
};

/// One motion.
pub struct Row {
    pub name: String,
    /// J/(mol K)
    pub cp: f64,
    /// Of Cp, J/(mol K)
    pub limit: f64,
    /// J/(mol K)
    pub s: f64,
    /// Cp at [`Shares::temperatures`], J/(mol K).
    pub curve: Vec<f64>,
}

/// The table of one molecule at one temperature.
pub struct Shares {
    pub molecule: String,
    pub t_k: f64,
    pub rows: Vec<Row>,
    /// K, from the lowest of interest to twice T or 1500 K.
    pub temperatures: Vec<f64>,
}

/// Points of each curve.
const POINTS: usize = 100;

impl Shares {
    fn of(cx: &Cx, molecule: &Molecule, t_k: f64) -> Result<Shares, Fault> {
        answers::within(molecule, t_k)?;
        let (set, r) = (cx.constants(), cx.constants().molar_gas.value);
        let (first, last) = (50.0_f64.min(t_k), (2.0 * t_k).clamp(1500.0, RANGE_K.1));
        let at = |nth: usize| first + (last - first) * nth as f64 / (POINTS - 1) as f64;
        let temperatures: Vec<f64> = (0..POINTS).map(at).collect();
        let gas = molecule.gas();
        let moved = crate::model::statmech::translation::share(gas.molar_mass_kg_mol, t_k, set);
        let mut rows = vec![Row {
            name: "translation, with R".to_owned(),
            cp: 2.5 * r,
            limit: 2.5 * r,
            s: r * moved.s,
            curve: vec![2.5 * r; POINTS],
        }];
        for (part, name) in gas.parts.iter().zip(molecule.names()) {
            let share = part.share(t_k);
            let curve = temperatures.iter().map(|t| r * part.share(*t).cv).collect();
            let name = name.to_owned();
            rows.push(Row { name, cp: r * share.cv, limit: r * part.limit(), s: r * share.s, curve });
        }
        Ok(Shares { molecule: molecule.text().to_owned(), t_k, rows, temperatures })
    }

    /// Cp, J/(mol K)
    pub fn cp(&self) -> f64 {
        self.rows.iter().map(|row| row.cp).sum()
    }

    /// Its classical limit, J/(mol K), without electrons.
    pub fn limit(&self) -> f64 {
        self.rows.iter().map(|row| row.limit).sum()
    }

    pub fn s(&self) -> f64 {
        self.rows.iter().map(|row| row.s).sum()
    }

    pub(in crate::model) fn parts(&self) -> Vec<(&'static str, Value)> {
        let number = Value::Number;
        let list = |all: &[f64]| Value::List(all.iter().copied().map(Value::Number).collect());
        let entry = |row: &Row| {
            let of_limit = if row.limit > 0.0 { number(row.cp / row.limit) } else { Value::Nothing };
            let entries = [
                ("name", Value::Text(row.name.as_str().into())),
                ("heat_capacity", number(row.cp)),
                ("limit", number(row.limit)),
                ("of_limit", of_limit),
                ("share", number(row.cp / self.cp())),
                ("entropy", number(row.s)),
            ];
            options(entries)
        };
        let curve =
            |row: &Row| options([("name", Value::Text(row.name.as_str().into())), ("values", list(&row.curve))]);
        vec![
            ("rows", Value::List(self.rows.iter().map(entry).collect())),
            ("T", number(self.t_k)),
            ("heat_capacity", number(self.cp())),
            ("limit", number(self.limit())),
            ("temperatures", list(&self.temperatures)),
            ("curves", Value::List(self.rows.iter().map(curve).collect())),
        ]
    }
}

fn options<const N: usize>(entries: [(&str, Value); N]) -> Value {
    let map: BTreeMap<String, Value> = entries.into_iter().map(|(name, value)| (name.to_owned(), value)).collect();
    Value::Options(Rc::new(map))
}
