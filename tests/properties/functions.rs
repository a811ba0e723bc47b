//! Every function of the catalogue: closed-form integrals against quadrature, slopes against differences, joins.

use std::sync::Arc;

use proptest::prelude::*;

use crate::{check, integral, near};
use hessbook::data::catalog::Catalog;
use hessbook::data::function::{Function, Interval};
use hessbook::model::function::{cp_slope, evaluate};
use hessbook::num::math::ln;

fn functions() -> Vec<Arc<Function>> {
    let all: Vec<_> = Catalog::shipped().substances().filter_map(|substance| substance.function.clone()).collect();
    assert_eq!(all.len(), 347, "the catalogue ships another number of functions");
    all
}

/// Sizes of the terms that H, S and Cp of one interval are summed from: rounding is of their order.
pub fn scales(function: &Function, interval: &Interval, t: f64) -> (f64, f64, f64) {
    let a = &interval.a;
    let powers = [1.0 / (t * t), 1.0 / t, 1.0, t, t * t, t * t * t, t * t * t * t];
    let cp: f64 = a.iter().zip(powers).map(|(a, power)| (a * power).abs()).sum();
    let r = function.r_of_source;
    let logarithms = ln(t) * (a[1].abs() + a[2].abs());
    (r * cp, r * (cp * t + logarithms * t.max(1.0) + interval.b[0].abs()), r * (cp + logarithms + interval.b[1].abs()))
}

pub const ROUNDING: f64 = 16.0 * f64::EPSILON;

/// Two temperatures inside one interval, by shares of it.
fn shares() -> impl Strategy<Value = (f64, f64)> {
    (0.0..1.0, 0.0..1.0)
}

#[test]
fn enthalpy_and_entropy_are_the_integrals_of_the_heat_capacity() {
    let all = functions();
    check(3, &shares(), |(first, second)| {
        for function in &all {
            for interval in &function.intervals {
                let at = |share: f64| interval.t_min + share * (interval.t_max - interval.t_min);
                // A temperature on the lower end belongs to the interval below, where the two may differ.
                let (low, high) = (at(first.min(second)).max(interval.t_min * (1.0 + 1e-9)), at(first.max(second)));
                let (start, end) = (evaluate(function, low), evaluate(function, high));
                let (_, h_size, s_size) = scales(function, interval, low);
                let (_, h_size_end, s_size_end) = scales(function, interval, high);
                let heat = integral(|t| evaluate(function, t).cp, low, high);
                let entropy = integral(|t| evaluate(function, t).cp / t, low, high);
                let name = |what: &str| format!("{what} of {} from {low} to {high} K", function.id);
                let allowed = heat.bound + ROUNDING * (h_size + h_size_end);
                near(&name("ΔH"), end.h - start.h, heat.value, allowed)?;
                let allowed = entropy.bound + ROUNDING * (s_size + s_size_end);
                near(&name("ΔS"), end.s - start.s, entropy.value, allowed)?;
            }
        }
        Ok(())
    });
}

#[test]
fn the_slope_of_the_heat_capacity_is_that_of_its_differences() {
    let all = functions();
    check(20, &(0.001..0.999), |share: f64| {
        for function in &all {
            for interval in &function.intervals {
                let t = interval.t_min + share * (interval.t_max - interval.t_min);
                // Not nearer to an end than h, so that both sides are in this interval. Two steps, h and h/2, give the
                // slope to fourth order and the size of what is left.
                let h = (1e-3 * t).min(0.4 * (t - interval.t_min)).min(0.4 * (interval.t_max - t));
                let cp = |t: f64| evaluate(function, t).cp;
                let wide = (cp(t + h) - cp(t - h)) / (2.0 * h);
                let narrow = (cp(t + 0.5 * h) - cp(t - 0.5 * h)) / h;
                let slope = (4.0 * narrow - wide) / 3.0;
                let rounding = ROUNDING * scales(function, interval, t).0 / h;
                let allowed = (narrow - wide).abs() + rounding;
                near(&format!("dCp/dT of {} at {t} K", function.id), cp_slope(function, t), slope, allowed)?;
            }
        }
        Ok(())
    });
}

#[test]
fn functions_are_continuous_at_their_joins_within_the_digits_of_the_report() {
    // The report gives its constants to ten digits; that leaves tenths of a J/mol in H and T S. Larger steps are the
    // report's own, and the record names the temperature.
    let mut misses = Vec::new();
    let mut joins = 0;
    for function in functions() {
        for pair in function.intervals.windows(2) {
            let t = pair[0].t_max;
            let width = 1e-9 * t;
            let (below, above) = (evaluate(&function, t - width), evaluate(&function, t + width));
            // Over 2 × width a continuous function changes by its slope, which Cp and Cp/T are.
            let moved = 2.0 * width * below.cp.abs().max(above.cp.abs());
            let warned = function.warnings.iter().any(|w| w.contains("steps") && w.contains(&format!("{t} K")));
            let steps = [
                ("H", (above.h - below.h).abs() - moved, 0.5),
                ("T S", t * (above.s - below.s).abs() - moved, 0.5),
                ("Cp", (above.cp - below.cp).abs(), 0.1),
            ];
            joins += 1;
            for (name, step, allowed) in steps {
                if step > allowed && !warned {
                    misses.push(format!("{name} of {} steps by {step} at {t} K", function.id));
                }
            }
            // The value at the join itself is one of the two sides.
            let at = evaluate(&function, t);
            assert!((at.h - below.h).abs() <= moved + 1e-6, "{} at {t} K", function.id);
        }
    }
    assert_eq!(joins, 279, "the catalogue ships functions with another number of joins");
    assert!(misses.is_empty(), "{}", misses.join("\n"));
}
