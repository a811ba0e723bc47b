//! Linear least squares by an orthogonal factor, A = QR with Householder reflections.
//!
//! min ‖A c − b‖:  R c = z with z = Qᵀb,  cov(c) = σ² R⁻¹R⁻ᵀ,  Σ(residuals²) = ‖b‖² − ‖z‖²
//!
//! The surprise: the components of z are uncorrelated and have one variance σ², whatever the columns of A are, so what is
//! computed from a fit rests on z and not on coefficients that all but cancel.
//! Source: Golub, Van Loan, Matrix Computations, 4th ed. (2013), sections 5.2 and 5.3 (from memory).

use crate::num::math;

/// A solved problem.
#[derive(Clone, Debug, PartialEq)]
pub struct LeastSquares {
    n: usize,
    /// Upper triangle, row by row.
    r: Vec<f64>,
    z: Vec<f64>,
    /// Sum of the squares of the residuals.
    pub residual: f64,
}

/// Column `column` of A is, within rounding, a combination of those before it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Dependent {
    pub column: usize,
}

/// Solves for `rows` of A, each with `n` numbers, and as many numbers `b`; at least n rows.
///
/// # Errors
/// The columns of A are not independent.
pub fn solve(rows: &[Vec<f64>], b: &[f64], n: usize) -> Result<LeastSquares, Dependent> {
    let m = rows.len();
    let (mut a, mut b): (Vec<Vec<f64>>, Vec<f64>) = (rows.to_vec(), b.to_vec());
    let length = |a: &[Vec<f64>], column: usize, from: usize| {
        let largest = a[from..].iter().map(|row| row[column].abs()).fold(0.0, f64::max);
        if largest == 0.0 {
            return 0.0;
        }
        let sum: f64 = a[from..].iter().map(|row| row[column] / largest).map(|x| x * x).sum();
        largest * math::sqrt(sum)
    };
    for k in 0..n {
        let whole = length(&a, k, 0);
        let norm = length(&a, k, k);
        // What is left of a dependent column is rounding of what was taken off it.
        if m < n || !norm.is_finite() || norm <= 16.0 * m as f64 * f64::EPSILON * whole || norm == 0.0 {
            return Err(Dependent { column: k });
        }
        let pivot = if a[k][k] > 0.0 { -norm } else { norm };
        // v = column - pivot e_k; H = 1 - 2 v vᵀ/(vᵀv)
        let v: Vec<f64> = (k..m).map(|i| if i == k { a[k][k] - pivot } else { a[i][k] }).collect();
        let square: f64 = v.iter().map(|x| x * x).sum();
        for column in k..n {
            let dot: f64 = v.iter().zip(&a[k..]).map(|(x, row)| x * row[column]).sum();
            for (x, row) in v.iter().zip(&mut a[k..]) {
                row[column] -= 2.0 * dot / square * x;
            }
        }
        let dot: f64 = v.iter().zip(&b[k..]).map(|(x, y)| x * y).sum();
        for (x, y) in v.iter().zip(&mut b[k..]) {
            *y -= 2.0 * dot / square * x;
        }
    }
    let r = (0..n * n).map(|at| if at % n >= at / n { a[at / n][at % n] } else { 0.0 }).collect();
    Ok(LeastSquares { n, r, residual: b[n..].iter().map(|x| x * x).sum(), z: b[..n].to_vec() })
}

impl LeastSquares {
    /// The uncorrelated components, each with the variance of one element of b.
    pub fn components(&self) -> &[f64] {
        &self.z
    }

    /// What a combination Σ φⱼ cⱼ of the coefficients is of the components: R⁻ᵀφ.
    pub fn weights(&self, phi: &[f64]) -> Vec<f64> {
        let mut q = vec![0.0; self.n];
        for j in 0..self.n {
            let known: f64 = (0..j).map(|i| self.r[i * self.n + j] * q[i]).sum();
            q[j] = (phi[j] - known) / self.r[j * self.n + j];
        }
        q
    }

    pub fn coefficients(&self) -> Vec<f64> {
        let mut c = vec![0.0; self.n];
        for i in (0..self.n).rev() {
            let known: f64 = (i + 1..self.n).map(|j| self.r[i * self.n + j] * c[j]).sum();
            c[i] = (self.z[i] - known) / self.r[i * self.n + i];
        }
        c
    }

    /// Row by row, for elements of b with variance 1.
    pub fn covariance(&self) -> Vec<f64> {
        let unit = |j: usize| (0..self.n).map(|i| f64::from(u8::from(i == j))).collect::<Vec<f64>>();
        let columns: Vec<Vec<f64>> = (0..self.n).map(|j| self.weights(&unit(j))).collect();
        let dot = |a: &[f64], b: &[f64]| a.iter().zip(b).map(|(x, y)| x * y).sum::<f64>();
        (0..self.n * self.n).map(|at| dot(&columns[at / self.n], &columns[at % self.n])).collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn straight(x: &[f64], y: &[f64]) -> LeastSquares {
        let rows: Vec<Vec<f64>> = x.iter().map(|&x| vec![1.0, x]).collect();
        solve(&rows, y, 2).unwrap()
    }

    #[test]
    fn a_straight_line_has_the_textbook_slope_and_variances() {
        let (x, y) = ([1.0, 2.0, 3.0, 4.0, 6.0], [2.1, 3.9, 6.2, 7.8, 12.1]);
        let fit = straight(&x, &y);
        let n = 5.0;
        let (sx, sy): (f64, f64) = (x.iter().sum(), y.iter().sum());
        let sxx: f64 = x.iter().map(|x| x * x).sum::<f64>() - sx * sx / n;
        let sxy: f64 = x.iter().zip(y).map(|(x, y)| x * y).sum::<f64>() - sx * sy / n;
        let (slope, c) = (sxy / sxx, fit.coefficients());
        // Bound: rounding of sums of five.
        assert!((c[1] - slope).abs() < 1e-13 && (c[0] - (sy - slope * sx) / n).abs() < 1e-13);
        let covariance = fit.covariance();
        assert!((covariance[3] - 1.0 / sxx).abs() < 1e-13);
        assert!((covariance[0] - (1.0 / n + (sx / n) * (sx / n) / sxx)).abs() < 1e-13);
        assert!((covariance[1] + sx / n / sxx).abs() < 1e-13 && covariance[1] == covariance[2]);
        let left: f64 = x.iter().zip(y).map(|(x, y)| y - c[0] - c[1] * x).map(|d| d * d).sum();
        assert!((fit.residual - left).abs() < 1e-13);
    }

    #[test]
    fn components_carry_every_combination() {
        let fit = straight(&[280.0, 300.0, 320.0, 340.0], &[75.1, 75.4, 75.2, 75.9]);
        let phi = [1.0, 310.0];
        let weights = fit.weights(&phi);
        let by_components: f64 = weights.iter().zip(fit.components()).map(|(q, z)| q * z).sum();
        let c = fit.coefficients();
        assert!((by_components - (c[0] + 310.0 * c[1])).abs() < 1e-11);
        let covariance = fit.covariance();
        let variance = covariance[0] + 2.0 * 310.0 * covariance[1] + 310.0 * 310.0 * covariance[3];
        let by_weights: f64 = weights.iter().map(|q| q * q).sum();
        assert!((by_weights - variance).abs() < 1e-11 * covariance[0], "{by_weights} {variance}");
    }

    #[test]
    fn columns_that_depend_on_each_other_are_found() {
        let rows: Vec<Vec<f64>> = (1..9).map(|x| vec![1.0, f64::from(x), 3.0 - 2.0 * f64::from(x)]).collect();
        assert_eq!(solve(&rows, &[1.0; 8], 3), Err(Dependent { column: 2 }));
        assert_eq!(solve(&rows[..1], &[1.0], 2), Err(Dependent { column: 0 }));
        let same = vec![vec![1.0, 300.0]; 4];
        assert_eq!(solve(&same, &[1.0; 4], 2), Err(Dependent { column: 1 }));
    }
}
