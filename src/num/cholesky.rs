//! The lower triangular factor of a symmetric matrix without negative eigenvalues.
//!
//! Correlation matrices of few readings, and such with r = ±1, are singular; that is no fault here: the column of a pivot
//! that vanishes is zero.

/// L with L Lᵀ = `matrix` (row by row, `n` × `n`); `None` where the matrix has a negative eigenvalue.
pub fn factor(matrix: &[f64], n: usize) -> Option<Vec<f64>> {
    // Rounding leaves pivots of a singular matrix at about n ε, and by |a_ij|² ≤ a_ii a_jj the entries beside them at √(n ε).
    let pivot_noise = 16.0 * n as f64 * f64::EPSILON;
    let entry_noise = pivot_noise.sqrt();
    let mut l = vec![0.0; n * n];
    for j in 0..n {
        let row = |i: usize, l: &[f64]| (0..j).map(|k| l[i * n + k] * l[j * n + k]).sum::<f64>();
        let pivot = matrix[j * n + j] - row(j, &l);
        let vanishes = pivot.abs() <= pivot_noise;
        if !vanishes && pivot < 0.0 {
            return None;
        }
        for i in j..n {
            let entry = matrix[i * n + j] - row(i, &l);
            if !vanishes {
                l[i * n + j] = entry / pivot.sqrt();
            } else if entry.abs() > entry_noise {
                return None;
            }
        }
    }
    Some(l)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn squared(l: &[f64], n: usize) -> Vec<f64> {
        (0..n * n).map(|at| (0..n).map(|k| l[at / n * n + k] * l[at % n * n + k]).sum()).collect()
    }

    #[test]
    fn the_factor_gives_the_matrix_back_also_when_it_is_singular() {
        let regular = [1.0, -0.36, 0.86, -0.36, 1.0, -0.65, 0.86, -0.65, 1.0];
        let singular = [1.0, -1.0, 0.6, -1.0, 1.0, -0.6, 0.6, -0.6, 1.0];
        for matrix in [regular, singular] {
            let l = factor(&matrix, 3).unwrap();
            for (back, given) in squared(&l, 3).iter().zip(matrix) {
                assert!((back - given).abs() < 4.0 * f64::EPSILON, "{back} {given}");
            }
        }
    }

    #[test]
    fn a_matrix_that_no_quantities_can_have_is_refused() {
        // a and b agree, b and c agree, and a and c are opposed.
        assert_eq!(factor(&[1.0, 0.9, -0.9, 0.9, 1.0, 0.9, -0.9, 0.9, 1.0], 3), None);
        assert_eq!(factor(&[1.0, 1.0, 0.0, 1.0, 1.0, 0.5, 0.0, 0.5, 1.0], 3), None);
    }
}
