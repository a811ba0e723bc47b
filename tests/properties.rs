//! Laws that every value must keep, on generated quantities, reactions and temperatures.
//!
//! Cases come from one fixed seed, printed when a law is broken, with the case shrunk. What is compared with is worked out
//! here by another road: quadrature against closed forms, differences against partials, counts of atoms by hand.

mod asking;
#[path = "properties/curves.rs"]
mod curves;
#[path = "properties/functions.rs"]
mod functions;
#[path = "properties/pressure.rs"]
mod pressure;
#[path = "properties/prices.rs"]
mod prices;
#[path = "properties/quantities.rs"]
mod quantities;
#[path = "properties/reactions.rs"]
mod reactions;

use proptest::prelude::*;
use proptest::test_runner::{Config, RngAlgorithm, TestRng, TestRunner};

const SEED: [u8; 32] = *b"hessbook laws, one fixed seed...";

/// Runs a law on `debug` cases in a debug build, a hundred times as many in a release build.
fn check<S: Strategy>(debug: u32, strategy: &S, law: impl Fn(S::Value) -> Result<(), TestCaseError>) {
    let cases = if cfg!(debug_assertions) { debug } else { 100 * debug };
    let config = Config { cases, max_global_rejects: 20 * cases, failure_persistence: None, ..Config::default() };
    let mut runner = TestRunner::new_with_rng(config, TestRng::from_seed(RngAlgorithm::ChaCha, &SEED));
    if let Err(failure) = runner.run(strategy, law) {
        panic!("seed {:?}: {failure}", std::str::from_utf8(&SEED));
    }
}

/// Fails a case, with both numbers, unless they are within `allowed` of each other.
fn near(what: &str, got: f64, wanted: f64, allowed: f64) -> Result<(), TestCaseError> {
    prop_assert!((got - wanted).abs() <= allowed, "{what}: {got} and {wanted} differ by more than {allowed:e}");
    Ok(())
}

/// An integral with a bound on its error: five-point Gauss quadrature on 32 panels, and the difference to 16.
struct Integral {
    value: f64,
    bound: f64,
}

/// Nodes and weights: zeros of the Legendre polynomial of degree 5, in closed form.
fn integral(of: impl Fn(f64) -> f64, from: f64, to: f64) -> Integral {
    let root = |sign: f64| f64::sqrt(5.0 + sign * 2.0 * f64::sqrt(10.0 / 7.0)) / 3.0;
    let weight = |sign: f64| (322.0 + sign * 13.0 * f64::sqrt(70.0)) / 900.0;
    let (inner, outer) = ((root(-1.0), weight(1.0)), (root(1.0), weight(-1.0)));
    let mut largest: f64 = 0.0;
    let mut on = |panels: usize| -> f64 {
        let half = 0.5 * (to - from) / panels as f64;
        let panel = |i: usize| {
            let middle = from + half * (2 * i + 1) as f64;
            let mut pair = |(node, weight): (f64, f64)| {
                let (left, right) = (of(middle - half * node), of(middle + half * node));
                largest = largest.max(left.abs()).max(right.abs());
                weight * (left + right)
            };
            half * (pair(inner) + pair(outer) + 128.0 / 225.0 * of(middle))
        };
        (0..panels).map(panel).sum()
    };
    let (coarse, value) = (on(16), on(32));
    // Tenth order: the finer rule is about a thousand times better than the difference, so that bounds it; and rounding.
    Integral { value, bound: (value - coarse).abs() + 64.0 * f64::EPSILON * largest * (to - from).abs() }
}
