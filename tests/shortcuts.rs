//! Temperatures that `valid_to` gives, by a second route: quadrature of Cp from the constants as printed, roots by bisection.
//!
//! Nothing of the program but the answers under test is used: the constants are read from the shipped file here, Cp is summed
//! here, and its integral is a Gauss-Legendre rule instead of the closed form.

use std::cell::Cell;
use std::collections::BTreeMap;

use hessbook::model::answer::Answer;
use hessbook::model::card::{self, Cx, References, Value};
use hessbook::model::reaction::REACTION;
use hessbook::model::shortcut::VALID_TO;
use hessbook::units::constants;

const T_0: f64 = 298.15;
/// J/mol
const TOLERANCE: f64 = 1000.0;

/// Ranges of temperature with the seven factors of Cp/R, and R of the source.
struct Gas {
    r: f64,
    intervals: Vec<(f64, f64, Vec<f64>)>,
}

impl Gas {
    fn cp(&self, t: f64) -> f64 {
        let (_, _, a) = self.intervals.iter().find(|(_, to, _)| t <= *to).expect("within the record");
        let powers = (-2..=4).map(|n| t.powi(n));
        self.r * a.iter().zip(powers).map(|(a, power)| a * power).sum::<f64>()
    }
}

fn gases() -> BTreeMap<String, Gas> {
    let path = concat!(env!("CARGO_MANIFEST_DIR"), "/stdlib/data/nasa-tp-2002-211556-functions.json");
    let page: serde_json::Value = serde_json::from_slice(&std::fs::read(path).unwrap()).unwrap();
    let number = |value: &serde_json::Value| value.as_f64().unwrap();
    let r = number(&page["r_j_mol_k"]);
    let record = |record: &serde_json::Value| {
        let interval = |range: &serde_json::Value| {
            let a = range["a"].as_array().unwrap().iter().map(number).collect();
            (number(&range["t"][0]), number(&range["t"][1]), a)
        };
        let intervals = record["intervals"].as_array().unwrap().iter().map(interval).collect();
        (record["id"].as_str().unwrap().to_owned(), Gas { r, intervals })
    };
    page["records"].as_array().unwrap().iter().map(record).collect()
}

/// Nodes and weights of the Gauss-Legendre rule of 12 points on -1 to 1, by Newton's method on the polynomial.
fn rule() -> Vec<(f64, f64)> {
    const N: usize = 12;
    let legendre = |x: f64| {
        let (mut before, mut now) = (1.0, x);
        for k in 2..=N {
            let k = k as f64;
            (before, now) = (now, ((2.0 * k - 1.0) * x * now - (k - 1.0) * before) / k);
        }
        (now, N as f64 * (x * now - before) / (x * x - 1.0))
    };
    let node = |i: usize| {
        let mut x = (std::f64::consts::PI * (i as f64 + 0.75) / (N as f64 + 0.5)).cos();
        for _ in 0..50 {
            let (p, slope) = legendre(x);
            x -= p / slope;
        }
        let (_, slope) = legendre(x);
        (x, 2.0 / ((1.0 - x * x) * slope * slope))
    };
    (0..N).map(node).collect()
}

struct Route {
    terms: Vec<(f64, Gas)>,
    rule: Vec<(f64, f64)>,
}

impl Route {
    fn cp(&self, t: f64) -> f64 {
        self.terms.iter().map(|(nu, gas)| nu * gas.cp(t)).sum()
    }

    /// The integral of ΔCp from 298.15 K, in pieces that end where the functions are joined, at 1000 K.
    fn increment(&self, t: f64) -> f64 {
        let piece = |from: f64, to: f64| -> f64 {
            let (middle, half) = (0.5 * (from + to), 0.5 * (to - from));
            self.rule.iter().map(|(x, w)| w * half * self.cp(middle + half * x)).sum()
        };
        let joins = [T_0, 500.0, 1000.0, 2000.0, 4000.0, 6000.0];
        let ends = joins.windows(2).map(|pair| (pair[0], pair[1].min(t)));
        ends.filter(|(from, to)| to > from).map(|(from, to)| piece(from, to)).sum()
    }

    fn without(&self, t: f64) -> f64 {
        self.increment(t).abs() - TOLERANCE
    }

    fn constant(&self, t: f64) -> f64 {
        (self.increment(t) - self.cp(T_0) * (t - T_0)).abs()
    }

    /// Where a function of T first changes its sign above a temperature, if it does below 2000 K.
    fn root(from: f64, of: impl Fn(f64) -> f64) -> Option<f64> {
        let mut low = from;
        let sign = of(low) > 0.0;
        while low < 2000.0 {
            if (of(low + 1.0) > 0.0) == sign {
                low += 1.0;
                continue;
            }
            let (mut low, mut high) = (low, low + 1.0);
            while high - low > 1e-4 {
                let middle = 0.5 * (low + high);
                if (of(middle) > 0.0) == sign { low = middle } else { high = middle }
            }
            return Some(low);
        }
        None
    }
}

type Intervals = Vec<(f64, f64)>;
type Row = (&'static str, &'static [(f64, &'static str)]);

/// Species with their numbers, as written by hand.
const REACTIONS: [Row; 6] = [
    ("1/2 N2(g) + 3/2 H2(g) -> NH3(g)", &[(-0.5, "N2(g)"), (-1.5, "H2(g)"), (1.0, "NH3(g)")]),
    ("CH4(g) + H2O(g) -> CO(g) + 3 H2(g)", &[(-1.0, "CH4(g)"), (-1.0, "H2O(g)"), (1.0, "CO(g)"), (3.0, "H2(g)")]),
    ("CO(g) + H2O(g) -> CO2(g) + H2(g)", &[(-1.0, "CO(g)"), (-1.0, "H2O(g)"), (1.0, "CO2(g)"), (1.0, "H2(g)")]),
    ("CO(g) + 1/2 O2(g) -> CO2(g)", &[(-1.0, "CO(g)"), (-0.5, "O2(g)"), (1.0, "CO2(g)")]),
    ("CO2(g) + 4 H2(g) -> CH4(g) + 2 H2O(g)", &[(-1.0, "CO2(g)"), (-4.0, "H2(g)"), (1.0, "CH4(g)"), (2.0, "H2O(g)")]),
    ("CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(g)", &[(-1.0, "CH4(g)"), (-2.0, "O2(g)"), (1.0, "CO2(g)"), (2.0, "H2O(g)")]),
];

/// Intervals within 1 kJ/mol, and those in which the shortcut is worse than none.
fn answered(cx: &Cx, equation: &str, shortcut: &str) -> (Intervals, Intervals) {
    let reaction = card::call(cx, &REACTION, vec![Value::Text(equation.into())]).unwrap();
    let given = vec![reaction, Value::Text(shortcut.into()), Value::Text("1 kJ/mol".into())];
    match card::call(cx, &VALID_TO, given).unwrap() {
        Value::Answer(Answer::Validity(validity)) => (validity.intervals.clone(), validity.worse_than_none.clone()),
        other => panic!("{}", other.sort()),
    }
}

#[test]
fn each_temperature_is_found_again_by_quadrature_to_a_tenth_of_a_kelvin() {
    let (references, ordinal) = (References::new(constants::current()), Cell::new(0));
    let cx = Cx { references: &references, place: None, ordinal: &ordinal, halted: &|| None };
    let (mut misses, mut compared) = (Vec::new(), 0);
    for (equation, species) in REACTIONS {
        let mut all = gases();
        let terms = species.iter().map(|(nu, id)| (*nu, all.remove(*id).expect("the record is shipped"))).collect();
        let route = Route { terms, rule: rule() };
        let mut compare = |what: &str, got: Option<f64>, wanted: Option<f64>| {
            compared += 1;
            // 0.1 K is asked for; the rule itself is good to 1e-9 of an increment, the bisection to 1e-4 K.
            let fits = match (got, wanted) {
                (Some(got), Some(wanted)) => (got - wanted).abs() <= 0.1,
                (got, wanted) => got.is_none() && wanted.is_none(),
            };
            if !fits {
                misses.push(format!("{equation}, {what}: {got:?} K, by quadrature {wanted:?} K"));
            }
        };
        let (within, _) = answered(&cx, equation, "no-correction");
        let first = Route::root(T_0, |t| route.without(t));
        compare("without correction to", Some(within[0].1), first);
        let again = first.and_then(|t| Route::root(t + 1e-3, |t| route.without(t)));
        compare("inside again from", within.iter().map(|i| i.0).find(|t| (T_0..2000.0).contains(t)), again);
        if let Some(again) = again {
            let end = Route::root(again + 1e-3, |t| route.without(t));
            compare("inside again to", within.iter().find(|i| i.0 > T_0).map(|i| i.1), end);
        }
        let (within, worse) = answered(&cx, equation, "constant-heat-capacity");
        compare("constant to", Some(within[0].1), Route::root(T_0, |t| route.constant(t) - TOLERANCE));
        // Just above 298.15 K the constant is the better one.
        let from = Route::root(T_0 + 1.0, |t| route.constant(t) - route.increment(t).abs());
        compare("worse than none from", worse.iter().map(|i| i.0).find(|t| (T_0..2000.0).contains(t)), from);
    }
    assert!(misses.is_empty(), "{}", misses.join("\n"));
    assert!(compared >= 24, "{compared}");
}
