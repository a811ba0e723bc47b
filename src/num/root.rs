//! A root of a function between two ends of unlike sign.
//!
//! The interpolate, truncate and project method of Oliveira and Takahashi, ACM Trans. Math. Softw. 47 (2020) 5 (from memory):
//! never slower than bisection by more than one step, and mostly as fast as the secant. The surprise: the answer is a
//! bracket, since a function with a jump has no root there; who asks must look at the residual.

/// Where a function changes its sign.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Root {
    /// The end of the bracket where the function is nearer to nothing.
    pub x: f64,
    pub low: f64,
    pub high: f64,
    /// The function at `x`.
    pub residual: f64,
}

/// The function at both ends of an interval, where it has no change of sign.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct NoChange {
    pub at_low: f64,
    pub at_high: f64,
}

/// Finds where `f` changes its sign between `low` and `high`, to a bracket as narrow as `width`, or as doubles allow.
///
/// # Errors
/// The function's own, at the first value it refuses.
pub fn bracketed<E>(
    mut f: impl FnMut(f64) -> Result<f64, E>,
    low: f64,
    high: f64,
    width: f64,
) -> Result<Result<Root, NoChange>, E> {
    let (mut a, mut b) = (low, high);
    let (mut at_a, mut at_b) = (f(a)?, f(b)?);
    if at_a == 0.0 || at_b == 0.0 {
        let (x, residual) = if at_a == 0.0 { (a, at_a) } else { (b, at_b) };
        return Ok(Ok(Root { x, low: x, high: x, residual }));
    }
    // Also refuses what is no number.
    if !(at_a * at_b < 0.0 || (at_a < 0.0) != (at_b < 0.0) && (at_a + at_b).is_finite()) {
        return Ok(Err(NoChange { at_low: at_a, at_high: at_b }));
    }
    let epsilon = (0.5 * width).max(2.0 * f64::EPSILON * a.abs().max(b.abs())).max(f64::MIN_POSITIVE);
    // How many bisections would do, and the slack that the method may take over them.
    let mut reach = 2.0 * epsilon;
    while reach < b - a {
        reach *= 2.0;
    }
    let mut radius = reach - 0.5 * (b - a);
    let strength = 0.2 / (b - a);
    while b - a > 2.0 * epsilon {
        let middle = 0.5 * (a + b);
        let secant = (at_b * a - at_a * b) / (at_b - at_a);
        let towards = if middle >= secant { 1.0 } else { -1.0 };
        let truncation = strength * (b - a) * (b - a);
        let truncated = if truncation <= (middle - secant).abs() { secant + towards * truncation } else { middle };
        let projected = if (truncated - middle).abs() <= radius { truncated } else { middle - towards * radius };
        let x = if projected > a && projected < b { projected } else { middle };
        if x <= a || x >= b {
            break; // No double lies between the ends.
        }
        let at_x = f(x)?;
        if at_x == 0.0 {
            return Ok(Ok(Root { x, low: x, high: x, residual: 0.0 }));
        }
        if (at_x < 0.0) == (at_a < 0.0) {
            (a, at_a) = (x, at_x);
        } else {
            (b, at_b) = (x, at_x);
        }
        radius *= 0.5;
    }
    let (x, residual) = if at_a.abs() <= at_b.abs() { (a, at_a) } else { (b, at_b) };
    Ok(Ok(Root { x, low: a, high: b, residual }))
}

#[cfg(test)]
mod tests {
    use std::convert::Infallible;

    use super::*;

    fn root(f: impl Fn(f64) -> f64, low: f64, high: f64) -> (Root, usize) {
        let mut calls = 0;
        let counted = |x| {
            calls += 1;
            Ok::<f64, Infallible>(f(x))
        };
        let Ok(found) = bracketed(counted, low, high, 0.0);
        (found.unwrap(), calls)
    }

    #[test]
    fn roots_are_found_to_the_last_digits_in_either_direction() {
        // Known in closed form: √2, and 1 of a function that is flat there. Bound: four doubles.
        let (found, calls) = root(|x| x * x - 2.0, 0.0, 2.0);
        assert!((found.x - f64::sqrt(2.0)).abs() < 1e-15 && found.high - found.low < 1e-14, "{found:?}");
        assert!(calls < 60, "{calls} evaluations, and bisection takes 54");
        let (found, _) = root(|x| 2.0 - x * x, 0.0, 2.0);
        assert!((found.x - f64::sqrt(2.0)).abs() < 1e-15, "{found:?}");
        let (found, _) = root(|x| (x - 1.0) * (x - 1.0) * (x - 1.0), -3.0, 40.0);
        assert!((found.x - 1.0).abs() < 1e-5, "{found:?}");
    }

    #[test]
    fn a_jump_is_bracketed_and_its_residual_tells() {
        let (found, _) = root(|x| if x < 0.3 { -1.0 } else { 2.0 }, 0.0, 1.0);
        assert!(found.low < 0.3 && 0.3 <= found.high && found.high - found.low < 1e-14, "{found:?}");
        assert_eq!(found.residual, -1.0);
    }

    #[test]
    fn without_a_change_of_sign_the_ends_are_told() {
        let Ok(found) = bracketed(|x| Ok::<f64, Infallible>(x * x + 1.0), -1.0, 2.0, 0.0);
        assert_eq!(found, Err(NoChange { at_low: 2.0, at_high: 5.0 }));
        let Ok(found) = bracketed(|_| Ok::<f64, Infallible>(f64::NAN), -1.0, 2.0, 0.0);
        assert!(found.is_err());
    }
}
