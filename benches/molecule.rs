//! What a computed heat capacity costs: one Cp of a molecule of 30 modes, and a sweep of 1e5 temperatures, beside the same
//! sums in numpy in one run.
//!
//! `benches/peers_molecule.py` does the sweep in two ways, all modes at once and mode by mode, and the faster one counts. The
//! surprise: only results are compared here, never times; a figure that is worse than its aim is for a person to judge, on a
//! machine that does nothing else.

use std::hint::black_box;
use std::process::Command;
use std::time::Instant;

use hessbook::model::statmech::gas::{Gas, Part};
use hessbook::model::statmech::rotation::{Sum, Top};
use hessbook::model::statmech::vibration::LowModes;
use hessbook::units::constants;

const MODES: u32 = 30;
const POINTS: u32 = 100_000;
const REPEATS: u32 = 25;

const PYTHON: &str = ".venv/bin/python";
const SETUP: &str = "`tests/client/run` sets it up";

/// Invented wavenumbers, evenly from 150 to 3195 cm⁻¹; the script has the same.
fn molecule() -> Gas {
    let per_cm = 100.0 * constants::current().second_radiation.value;
    let theta = |nth: u32| per_cm * (150.0 + 105.0 * f64::from(nth));
    let mode = |nth| Part::Vibration { theta_k: theta(nth), degeneracy: 1.0, low: LowModes::Harmonic };
    let rotation =
        Part::Rotation { top: Top::Nonlinear { abc_k: [0.4, 0.2, 0.15] }, symmetry_number: 1.0, sum: Sum::Classical };
    let parts = [rotation].into_iter().chain((0..MODES).map(mode)).collect();
    Gas { molar_mass_kg_mol: 0.1, parts }
}

fn temperatures() -> Vec<f64> {
    (0..POINTS).map(|nth| 200.0 + 0.028 * f64::from(nth)).collect()
}

/// The fastest of several runs in seconds, and what it gave.
fn best(mut work: impl FnMut() -> f64) -> (f64, f64) {
    let (mut seconds, mut result) = (f64::INFINITY, 0.0);
    for _ in 0..REPEATS {
        let start = Instant::now();
        result = black_box(work());
        seconds = seconds.min(start.elapsed().as_secs_f64());
    }
    (seconds, result)
}

/// The time of the faster sweep in numpy in seconds, and the sum of its values.
fn numpy() -> Result<(f64, f64), String> {
    let mut python = Command::new(PYTHON);
    python.args(["benches/peers_molecule.py", &MODES.to_string(), &POINTS.to_string(), &REPEATS.to_string()]);
    let output = python.output().map_err(|e| format!("{PYTHON}: {e}; {SETUP}"))?;
    if !output.status.success() {
        let text = String::from_utf8_lossy(&output.stderr);
        return Err(format!("{}; {SETUP}", text.lines().last().unwrap_or("no word from peers_molecule.py")));
    }
    let text = String::from_utf8_lossy(&output.stdout);
    let rows = text.lines().filter_map(|line| {
        let mut words = line.split_whitespace().skip(1);
        Some((words.next()?.parse::<f64>().ok()?, words.next()?.parse::<f64>().ok()?))
    });
    rows.min_by(|a, b| a.0.total_cmp(&b.0)).ok_or_else(|| format!("peers_molecule.py says `{text}`"))
}

fn main() {
    let (gas, t_k) = (molecule(), temperatures());
    let passes = 1000;
    let (single, _) = best(|| (0..passes).map(|nth| gas.cp(300.0 + f64::from(nth))).sum());
    let (all, _) = best(|| {
        let at = |nth| gas.functions(300.0 + f64::from(nth), constants::current()).cp;
        (0..passes).map(at).sum()
    });
    let (sweep, sum) = best(|| gas.cps(&t_k).iter().sum());
    println!("\na gas molecule of {MODES} modes, best of {REPEATS}");
    println!("  one Cp                                     {:>9.3} µs   aim 2", 1e6 * single / f64::from(passes));
    println!("  Cp, H, S and dCp/dT together               {:>9.3} µs", 1e6 * all / f64::from(passes));
    println!("  Cp at {POINTS} temperatures                 {:>9.3} ms", 1e3 * sweep);
    match numpy() {
        Err(why) => println!("  nothing to compare with: {why}"),
        Ok((seconds, theirs)) => {
            // Unlike results would mean unlike work. Bound: sums of 1e5 values of 30 terms, each rounded by 1e-16.
            assert!((sum / theirs - 1.0).abs() < 1e-11, "{sum} here and {theirs} in numpy");
            println!("  the same in numpy                          {:>9.3} ms", 1e3 * seconds);
            println!("  times as fast as numpy                     {:>9.2}      aim 1", seconds / sweep);
        }
    }
}
