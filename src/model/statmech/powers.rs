//! A sum of powers of T that follows a computed heat capacity, to be handed on.
//!
//! Cp/R ≈ Σ aᵢ Tⁿⁱ        least squares at points that lie dense at both ends of the interval
//!
//! | symbol | unit | meaning                                                    |
//! |--------|------|------------------------------------------------------------|
//! | aᵢ     | K⁻ⁿ  | coefficients, one for each power nᵢ                         |
//!
//! The fit is done in τ = T/T(middle) with columns of unit length, by QR, and its error is read off a grid ten times as
//! dense as the points. Source: least squares as in any text of numerical analysis; the points are those of Chebyshev.

use nalgebra::{DMatrix, DVector};

use crate::num::math;

/// A fit with the largest deviation found, in the unit of Cp/R, and where it is.
#[derive(Clone, Debug, PartialEq)]
pub struct PowerFit {
    pub powers: Vec<i32>,
    pub coefficients: Vec<f64>,
    pub t_min_k: f64,
    pub t_max_k: f64,
    pub worst: f64,
    pub worst_at_k: f64,
}

/// Points that the fit is made at, for each power.
const POINTS_PER_POWER: usize = 12;
/// Points of the check between two of these.
const CHECKS: usize = 10;

/// A whole power of a positive number, by products.
fn power(t: f64, n: i32) -> f64 {
    let product = (0..n.unsigned_abs()).fold(1.0, |product, _| product * t);
    if n < 0 { 1.0 / product } else { product }
}

/// Fits `cps`, which gives Cp/R at some temperatures; `None` where the powers cannot be told apart on the interval.
pub fn fit(powers: &[i32], t_min_k: f64, t_max_k: f64, cps: impl Fn(&[f64]) -> Vec<f64>) -> Option<PowerFit> {
    let n = powers.len();
    let count = POINTS_PER_POWER * n.max(1);
    let (middle, half) = (0.5 * (t_min_k + t_max_k), 0.5 * (t_max_k - t_min_k));
    let angle = |nth: usize| std::f64::consts::PI * (nth as f64 + 0.5) / count as f64;
    let at: Vec<f64> = (0..count).map(|nth| middle - half * math::cos(angle(nth))).collect();
    let mut columns = DMatrix::from_fn(count, n, |row, column| power(at[row] / middle, powers[column]));
    let mut lengths = vec![0.0; n];
    for (column, length) in lengths.iter_mut().enumerate() {
        *length = math::sqrt(columns.column(column).iter().map(|x| x * x).sum());
        columns.column_mut(column).iter_mut().for_each(|x| *x /= *length);
    }
    let values = DVector::from_vec(cps(&at));
    let qr = columns.qr();
    let mut right = values;
    qr.q_tr_mul(&mut right);
    let right = right.rows(0, n).into_owned();
    // A diagonal of R near rounding: a column is a sum of the others.
    let r = qr.r();
    if (0..n).any(|k| r[(k, k)].abs() < 1e-13) {
        return None;
    }
    let scaled = r.solve_upper_triangular(&right)?;
    let coefficients: Vec<f64> = (0..n).map(|k| scaled[k] / lengths[k] * power(middle, -powers[k])).collect();
    let steps = CHECKS * count;
    let grid: Vec<f64> = (0..=steps).map(|nth| t_min_k + (t_max_k - t_min_k) * nth as f64 / steps as f64).collect();
    let mut fit = PowerFit { powers: powers.to_vec(), coefficients, t_min_k, t_max_k, worst: 0.0, worst_at_k: t_min_k };
    for (t, cp) in grid.iter().zip(cps(&grid)) {
        let off = fit.cp(*t) - cp;
        if off.abs() > fit.worst.abs() {
            (fit.worst, fit.worst_at_k) = (off, *t);
        }
    }
    Some(fit)
}

impl PowerFit {
    /// Cp/R by the fit.
    pub fn cp(&self, t_k: f64) -> f64 {
        self.powers.iter().zip(&self.coefficients).map(|(n, a)| a * power(t_k, *n)).sum()
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::num::oscillator;

    #[test]
    fn a_sum_of_powers_is_found_again() {
        let cp = |t: f64| 3.5 + 2e-3 * t - 4e4 / (t * t);
        let fit = fit(&[-2, 0, 1], 250.0, 1500.0, |all| all.iter().map(|t| cp(*t)).collect()).unwrap();
        // Bound: rounding of a well-scaled system of three columns.
        for (got, want) in fit.coefficients.iter().zip([-4e4, 3.5, 2e-3]) {
            assert!((got / want - 1.0).abs() < 1e-11, "{got} {want}");
        }
        assert!(fit.worst.abs() < 1e-12);
    }

    #[test]
    fn the_error_of_an_oscillator_is_found_where_it_is() {
        let cps = |all: &[f64]| all.iter().map(|t| oscillator::cv(1500.0 / t)).collect::<Vec<f64>>();
        let rough = fit(&[0, 1], 300.0, 1500.0, cps).unwrap();
        let fine = fit(&[-2, -1, 0, 1, 2, 3, 4], 300.0, 1500.0, cps).unwrap();
        assert!(fine.worst.abs() < 1e-2 * rough.worst.abs(), "{} {}", rough.worst, fine.worst);
        let off = rough.cp(rough.worst_at_k) - oscillator::cv(1500.0 / rough.worst_at_k);
        assert_eq!(off, rough.worst);
        assert!(fit(&[1, 1], 300.0, 1500.0, cps).is_none(), "one power twice");
    }
}
