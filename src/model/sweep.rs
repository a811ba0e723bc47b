//! A property of a reaction at many temperatures in one pass, bit for bit what the single calls give.
//!
//! The closed forms of `function` over a sorted grid: ln T once for all species, the constants of an interval once for all
//! points in it, and no memory per point. The order of the additions is that of [`property::evaluate`], which this must
//! never leave: `tests/properties/curves.rs` compares the bits. The surprise: only what every record says of itself is done
//! here; where a phase changes on the way, a pressure is given, or a substance of one's own stands in the reaction, the
//! single call is asked.

use std::ops::Range;

use crate::data::function::{Function, Interval};
use crate::model::card::Cx;
use crate::model::function::{self, T_REFERENCE};
use crate::model::gather::{self, HeatCapacity, Method};
use crate::model::property::Property;
use crate::model::terms::Terms;
use crate::num::math;

/// Points that are worked on together: few enough for the fastest memory, many enough for the constants to be worth it.
const BLOCK: usize = 256;

/// One term with what is the same for all points.
struct Line<'a> {
    nu: f64,
    /// J/mol
    formation: f64,
    /// H(298.15 K) on the scale of the function, J/mol.
    h_298: f64,
    function: &'a Function,
}

/// Fills in what can be done in one pass of the values at sorted `points_k`, in SI units, and says which rows that is. A
/// value that is no finite number leaves all rows to the single calls, which say why.
pub fn numbers(
    property: Property,
    terms: &Terms,
    method: &Method,
    points_k: &[f64],
    out: &mut [f64],
    cx: &Cx,
) -> Range<usize> {
    pass(property, terms, method, points_k, out, cx).unwrap_or(0..0)
}

fn pass(
    property: Property,
    terms: &Terms,
    method: &Method,
    points_k: &[f64],
    out: &mut [f64],
    cx: &Cx,
) -> Option<Range<usize>> {
    if method.heat_capacity != HeatCapacity::Full || method.given.is_some() {
        return None;
    }
    let lines = lines(terms, method, cx)?;
    let (low, high) = lines.iter().fold((0.0, f64::INFINITY), |(low, high): (f64, f64), line| {
        (low.max(line.function.t_min), high.min(line.function.t_max))
    });
    let rows = points_k.partition_point(|t_k| *t_k < low)..points_k.partition_point(|t_k| *t_k <= high);
    if rows.is_empty() {
        return None;
    }
    let (r, delta_n) = (cx.constants().molar_gas.value, terms.delta_n_gas());
    let out = &mut out[rows.clone()];
    out.fill(0.0);
    for (points, out) in points_k[rows.clone()].chunks(BLOCK).zip(out.chunks_mut(BLOCK)) {
        if (cx.halted)().is_some() {
            return None; // The single calls will say so.
        }
        let mut logarithms = [0.0; BLOCK];
        for (ln_t, t_k) in logarithms.iter_mut().zip(points) {
            *ln_t = math::ln(*t_k);
        }
        for line in &lines {
            line.add(property, points, &logarithms, out);
        }
        if property.uses_gas_law() {
            for (si, t_k) in out.iter_mut().zip(points) {
                *si -= delta_n * r * t_k;
            }
        }
        if property == Property::K {
            for (si, t_k) in out.iter_mut().zip(points) {
                let k = math::exp(-*si / (r * t_k));
                *si = if k >= f64::MIN_POSITIVE { k } else { f64::NAN };
            }
        }
    }
    out.iter().all(|si| si.is_finite()).then_some(rows)
}

/// The terms, where all of them are plain records with all figures of their own.
fn lines<'a>(terms: &'a Terms, method: &Method, cx: &Cx) -> Option<Vec<Line<'a>>> {
    let datasets = gather::datasets_for(terms, &method.formation, cx.data()).ok()?;
    let line = |(term, dataset): (&'a crate::model::terms::Term, _)| {
        let function = term.substance.function.as_deref().filter(|_| term.own.is_none())?;
        let plain = function.zero.enthalpy && function.zero.entropy;
        let stated = function.stated.entropy_298.is_some() || function.stated.cp_relative_u.is_some();
        let powers = function.intervals.iter().any(|interval| !interval.more.is_empty());
        if !plain || stated || powers || !function.covers(T_REFERENCE) {
            return None;
        }
        let formation = gather::term_formation(term, dataset, cx.data())?.si;
        Some(Line { nu: term.nu, formation, h_298: function::evaluate(function, T_REFERENCE).h, function })
    };
    terms.terms().iter().zip(&datasets).map(line).collect()
}

impl Line<'_> {
    /// Adds what the term contributes at each of the points, interval by interval.
    fn add(&self, property: Property, points: &[f64], logarithms: &[f64; BLOCK], out: &mut [f64]) {
        let mut from = 0;
        for (nth, interval) in self.function.intervals.iter().enumerate() {
            let last = nth + 1 == self.function.intervals.len();
            // A join belongs to the lower interval, as in `function::evaluate`.
            let to = if last { points.len() } else { points.partition_point(|t_k| *t_k <= interval.t_max) };
            if to > from {
                let (points, logarithms, out) = (&points[from..to], &logarithms[from..to], &mut out[from..to]);
                self.add_in(interval, property, points, logarithms, out);
                from = to;
            }
        }
    }

    fn add_in(&self, interval: &Interval, property: Property, points: &[f64], logarithms: &[f64], out: &mut [f64]) {
        let (nu, r, formation, h_298) = (self.nu, self.function.r_of_source, self.formation, self.h_298);
        let (cp, h, s) = (function::cp_of(interval), function::h_of(interval), function::s_of(interval));
        let each = points.iter().zip(logarithms).zip(out);
        match property {
            Property::Cp => each.for_each(|((t, _), out)| *out += nu * (r * cp(*t))),
            Property::S => each.for_each(|((t, ln_t), out)| *out += nu * (r * s(*t, *ln_t))),
            Property::H | Property::U => each.for_each(|((t, ln_t), out)| {
                *out += nu * formation;
                *out += nu * (r * h(*t, *ln_t) - h_298);
            }),
            Property::G | Property::A | Property::K => each.for_each(|((t, ln_t), out)| {
                *out += nu * formation;
                *out += nu * (r * h(*t, *ln_t) - h_298);
                *out += -t * nu * (r * s(*t, *ln_t));
            }),
        }
    }
}
