//! A reaction enthalpy at a million temperatures with its provenance, beside numpy on the same polynomials in one run.
//!
//! `benches/sweep.py` evaluates the polynomials for whole arrays. Both use one core. The surprise: only the sums are
//! compared here, never times; a ratio that is below its aim is for a person to judge, on a machine that does nothing else.

use std::cell::Cell;
use std::hint::black_box;
use std::io::Write;
use std::process::{Command, Stdio};
use std::rc::Rc;
use std::time::Instant;

use hessbook::model::card::{self, Cx, References, Value};
use hessbook::model::grid::GRID;
use hessbook::model::property_card::{ENTHALPY, EQUILIBRIUM_CONSTANT, GIBBS_ENERGY};
use hessbook::model::reaction::REACTION;
use hessbook::units::constants;

#[path = "shared/polynomials.rs"]
mod polynomials;
use polynomials::species;

const POINTS: usize = 1_000_000;
const REPEATS: u32 = 9;
const FROM: f64 = 300.0;
const TO: f64 = 2000.0;
const SHIFT: &str = "CO(g) + H2O(g) -> CO2(g) + H2(g)";

const PYTHON: &str = ".venv/bin/python";
const SETUP: &str = "`tests/client/run` sets it up";

/// Seconds of the fastest run of numpy, the sum of its values, and its version.
fn numpy(description: &str) -> Result<(f64, f64, String), String> {
    let mut python = Command::new(PYTHON);
    // One core, as here: a library behind numpy may start threads.
    python.args(["benches/sweep.py", &REPEATS.to_string()]).env("OMP_NUM_THREADS", "1");
    let spawned = python.stdin(Stdio::piped()).stdout(Stdio::piped()).stderr(Stdio::piped()).spawn();
    let mut child = spawned.map_err(|e| format!("{PYTHON}: {e}; {SETUP}"))?;
    let mut input = child.stdin.take().expect("it was piped");
    input.write_all(description.as_bytes()).map_err(|e| e.to_string())?;
    drop(input);
    let output = child.wait_with_output().map_err(|e| e.to_string())?;
    let text = String::from_utf8_lossy(&output.stdout).into_owned();
    let mut words = text.split_whitespace();
    let numbers = (words.next().and_then(|w| w.parse().ok()), words.next().and_then(|w| w.parse().ok()), words.next());
    match numbers {
        (Some(seconds), Some(sum), Some(version)) => Ok((seconds, sum, version.to_owned())),
        _ => Err(format!("{}; {SETUP}", String::from_utf8_lossy(&output.stderr).lines().last().unwrap_or("no word"))),
    }
}

fn main() {
    let (references, ordinal) = (References::new(constants::current()), Cell::new(0));
    let cx = Cx { references: &references, place: None, ordinal: &ordinal, halted: &|| None };
    let asked = |result: Result<Value, hessbook::fault::Fault>| result.unwrap_or_else(|fault| panic!("{fault}"));
    let reaction = asked(card::call(&cx, &REACTION, vec![Value::Text(SHIFT.into())]));
    let ends = [FROM, TO].map(|t_k| Value::Text(format!("{t_k} K").into()));
    let [from, to] = ends;
    let grid = asked(card::call(&cx, &GRID, vec![from, to, Value::Number(POINTS as f64)]));
    let mut sum = 0.0;
    let best = |card: &'static card::Card, sum: &mut f64| {
        let mut best = f64::INFINITY;
        for _ in 0..REPEATS {
            let start = Instant::now();
            let curve = match asked(card::call(&cx, card, vec![reaction.clone(), grid.clone()])) {
                Value::Curve(curve) => black_box(Rc::clone(&curve)),
                other => panic!("a curve was asked for, not {}", other.sort()),
            };
            best = best.min(start.elapsed().as_secs_f64());
            *sum = curve.numbers().iter().sum();
        }
        best
    };
    let (gibbs, constant) = (best(&GIBBS_ENERGY, &mut sum), best(&EQUILIBRIUM_CONSTANT, &mut sum));
    let ours = best(&ENTHALPY, &mut sum);
    let print = |name: &str, seconds: f64| {
        println!("  {name:<44}{:>9.2} ms  {:>8.1} ns a point", seconds * 1e3, seconds * 1e9 / POINTS as f64);
    };
    println!("\n{SHIFT} at {POINTS} temperatures from {FROM} K to {TO} K, best of {REPEATS}");
    print("ΔrH°, one call with provenance", ours);
    print("ΔrG°", gibbs);
    print("K°", constant);
    let grid = serde_json::json!({ "from": FROM, "to": TO, "points": POINTS, "species": species(&reaction, &cx) });
    match numpy(&grid.to_string()) {
        Err(why) => println!("  nothing to compare with: {why}"),
        Ok((seconds, theirs, version)) => {
            print(&format!("ΔrH°, numpy {version} on the same polynomials"), seconds);
            // Unlike sums would mean unlike work. Bound: a million terms of 4e4 J/mol, each from parts of 1e5 rounded alike.
            assert!((sum / theirs - 1.0).abs() < 1e-11, "the sum is {sum} here and {theirs} there");
            println!("  {:<44}{:>9.2}     (aim: 1 or more)", "times as fast as numpy", seconds / ours);
        }
    }
}
