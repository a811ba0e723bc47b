//! Piecewise cubic interpolation that keeps the shape of its points: it rises where they rise and has no bumps between them.
//!
//! Between two points the Hermite cubic of their values y and slopes d. At an inner point, with steps h and differences δ,
//! d = 0 where δ changes its sign, else the harmonic mean (w₁+w₂)/(w₁/δ₁ + w₂/δ₂), w₁ = 2h₂ + h₁, w₂ = h₂ + 2h₁.
//!
//! At an end, the three-point slope, cut where it would turn back. The surprise: the slopes are not linear in y, so the
//! derivatives with respect to the points go through them.
//! Sources: F. N. Fritsch, R. E. Carlson, SIAM J. Numer. Anal. 17 (1980) 238; F. N. Fritsch, J. Butland, SIAM J. Sci. Stat.
//! Comput. 5 (1984) 300 (both from memory).

use crate::num::math;

/// The interpolant.
#[derive(Clone, Debug, PartialEq)]
pub struct Pchip {
    x: Vec<f64>,
    y: Vec<f64>,
    slopes: Vec<f64>,
    /// For each slope its derivatives with respect to the values of up to three neighbouring points.
    partials: Vec<Vec<(usize, f64)>>,
}

/// A number and its derivatives with respect to the values of the points.
#[derive(Clone, Debug, PartialEq)]
pub struct Traced {
    pub value: f64,
    pub partials: Vec<f64>,
}

/// What is asked of the interpolant.
#[derive(Clone, Copy)]
enum Of {
    Value,
    Slope,
}

impl Pchip {
    /// Through at least three points in strictly ascending order of x.
    pub fn new(x: Vec<f64>, y: Vec<f64>) -> Pchip {
        let n = x.len();
        let mut slopes = Vec::with_capacity(n);
        let mut partials = Vec::with_capacity(n);
        for k in 0..n {
            let (slope, of_points) = if k == 0 {
                end(&x, &y, [0, 1, 2])
            } else if k == n - 1 {
                end(&x, &y, [n - 1, n - 2, n - 3])
            } else {
                inner(&x, &y, k)
            };
            slopes.push(slope);
            partials.push(of_points);
        }
        Pchip { x, y, slopes, partials }
    }

    pub fn range(&self) -> (f64, f64) {
        (self.x[0], self.x[self.x.len() - 1])
    }

    pub fn value(&self, x: f64) -> Traced {
        self.at(x, Of::Value)
    }

    pub fn slope(&self, x: f64) -> Traced {
        self.at(x, Of::Slope)
    }

    /// ∫ y dx, or ∫ y/x dx, from one x to another within the range.
    pub fn integral(&self, from: f64, to: f64, over_x: bool) -> Traced {
        if to < from {
            let back = self.integral(to, from, over_x);
            return Traced { value: -back.value, partials: back.partials.iter().map(|one| -one).collect() };
        }
        let (mut of_y, mut of_slopes) = (vec![0.0; self.x.len()], vec![0.0; self.x.len()]);
        for k in 0..self.x.len() - 1 {
            let (low, high) = (from.max(self.x[k]), to.min(self.x[k + 1]));
            if low < high {
                let h = self.x[k + 1] - self.x[k];
                let (t0, t1) = ((low - self.x[k]) / h, (high - self.x[k]) / h);
                let moments = if over_x { moments_over(t0, t1, self.x[k] / h) } else { moments(t0, t1) };
                let scale = if over_x { 1.0 } else { h };
                let weights = hermite(moments, h);
                for (at, (y, d)) in [(k, (weights[0], weights[1])), (k + 1, (weights[2], weights[3]))] {
                    of_y[at] += scale * y;
                    of_slopes[at] += scale * d;
                }
            }
        }
        self.traced(of_y, &of_slopes)
    }

    fn at(&self, x: f64, of: Of) -> Traced {
        let k = self.x.partition_point(|&known| known <= x).clamp(1, self.x.len() - 1) - 1;
        let h = self.x[k + 1] - self.x[k];
        let t = (x - self.x[k]) / h;
        let weights = match of {
            Of::Value => hermite([1.0, t, t * t, t * t * t], h),
            Of::Slope => hermite([0.0, 1.0, 2.0 * t, 3.0 * t * t], h).map(|weight| weight / h),
        };
        let (mut of_y, mut of_slopes) = (vec![0.0; self.x.len()], vec![0.0; self.x.len()]);
        (of_y[k], of_slopes[k], of_y[k + 1], of_slopes[k + 1]) = (weights[0], weights[1], weights[2], weights[3]);
        self.traced(of_y, &of_slopes)
    }

    /// A linear form of values and slopes, with the slopes traced to the values.
    fn traced(&self, of_y: Vec<f64>, of_slopes: &[f64]) -> Traced {
        let dot = |weights: &[f64], numbers: &[f64]| weights.iter().zip(numbers).map(|(w, x)| w * x).sum::<f64>();
        let value = dot(&of_y, &self.y) + dot(of_slopes, &self.slopes);
        let mut partials = of_y;
        for (weight, of_points) in of_slopes.iter().zip(&self.partials) {
            for &(point, derivative) in of_points {
                partials[point] += weight * derivative;
            }
        }
        Traced { value, partials }
    }
}

/// ∫ tⁿ dt, n = 0 to 3.
fn moments(t0: f64, t1: f64) -> [f64; 4] {
    [1, 2, 3, 4].map(|n| {
        let power = |t: f64| (0..n).fold(1.0, |product, _| product * t);
        (power(t1) - power(t0)) / f64::from(n)
    })
}

/// ∫ tⁿ/(t + r) dt, n = 0 to 3, by Jₙ = (t₁ⁿ − t₀ⁿ)/n − r Jₙ₋₁.
fn moments_over(t0: f64, t1: f64, r: f64) -> [f64; 4] {
    let plain = moments(t0, t1);
    let j0 = math::ln_1p((t1 - t0) / (t0 + r));
    let j1 = plain[0] - r * j0;
    let j2 = plain[1] - r * j1;
    [j0, j1, j2, plain[2] - r * j2]
}

/// Weights of y₀, d₀, y₁, d₁ where tⁿ has these values.
fn hermite(t: [f64; 4], h: f64) -> [f64; 4] {
    [t[0] - 3.0 * t[2] + 2.0 * t[3], h * (t[1] - 2.0 * t[2] + t[3]), 3.0 * t[2] - 2.0 * t[3], h * (t[3] - t[2])]
}

fn inner(x: &[f64], y: &[f64], k: usize) -> (f64, Vec<(usize, f64)>) {
    let (h1, h2) = (x[k] - x[k - 1], x[k + 1] - x[k]);
    let (a, b) = ((y[k] - y[k - 1]) / h1, (y[k + 1] - y[k]) / h2);
    if a * b <= 0.0 {
        return (0.0, Vec::new());
    }
    let (w1, w2) = (2.0 * h2 + h1, h2 + 2.0 * h1);
    let slope = (w1 + w2) / (w1 / a + w2 / b);
    let by_a = slope * slope / (w1 + w2) * w1 / (a * a);
    let by_b = slope * slope / (w1 + w2) * w2 / (b * b);
    (slope, vec![(k - 1, -by_a / h1), (k, by_a / h1 - by_b / h2), (k + 1, by_b / h2)])
}

/// At the first of three points, the others one and two steps inside.
fn end(x: &[f64], y: &[f64], [p, q, r]: [usize; 3]) -> (f64, Vec<(usize, f64)>) {
    let (h1, h2) = (x[q] - x[p], x[r] - x[q]);
    let (a, b) = ((y[q] - y[p]) / h1, (y[r] - y[q]) / h2);
    let (by_a, by_b) = ((2.0 * h1 + h2) / (h1 + h2), -h1 / (h1 + h2));
    let slope = by_a * a + by_b * b;
    if slope * a <= 0.0 {
        (0.0, Vec::new())
    } else if a * b <= 0.0 && slope.abs() > 3.0 * a.abs() {
        (3.0 * a, vec![(p, -3.0 / h1), (q, 3.0 / h1)])
    } else {
        (slope, vec![(p, -by_a / h1), (q, by_a / h1 - by_b / h2), (r, by_b / h2)])
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const X: [f64; 6] = [280.0, 300.0, 310.0, 335.0, 360.0, 400.0];
    const Y: [f64; 6] = [75.0, 75.2, 75.9, 76.1, 78.0, 77.5];

    fn pchip(y: [f64; 6]) -> Pchip {
        Pchip::new(X.to_vec(), y.to_vec())
    }

    #[test]
    fn it_goes_through_its_points_and_never_beyond_two_neighbours() {
        let it = pchip(Y);
        for (x, y) in X.into_iter().zip(Y) {
            assert!((it.value(x).value - y).abs() < 1e-12);
        }
        for k in 0..5 {
            let (low, high) = (Y[k].min(Y[k + 1]), Y[k].max(Y[k + 1]));
            for step in 0..=50 {
                let y = it.value(X[k] + (X[k + 1] - X[k]) * f64::from(step) / 50.0).value;
                assert!(low - 1e-12 <= y && y <= high + 1e-12, "{y} between {low} and {high}");
            }
        }
    }

    #[test]
    fn integrals_agree_with_quadrature_and_slopes_with_differences() {
        let it = pchip(Y);
        // Simpson over 4000 steps of each piece; exact for cubics, and 1e-12 for the other.
        let by_rule = |from: f64, to: f64, f: &dyn Fn(f64) -> f64| {
            let cuts: Vec<f64> =
                [from].into_iter().chain(X.into_iter().filter(|&x| from < x && x < to)).chain([to]).collect();
            let piece = |a: f64, b: f64| {
                let step = (b - a) / 4000.0;
                let weight = |n: usize| if n == 0 || n == 4000 { 1.0 } else { [2.0, 4.0][n % 2] };
                (0..=4000).map(|n| weight(n) * f(a + n as f64 * step)).sum::<f64>() * step / 3.0
            };
            cuts.windows(2).map(|pair| piece(pair[0], pair[1])).sum::<f64>()
        };
        for (from, to) in [(280.0, 400.0), (298.15, 352.0), (305.0, 307.0)] {
            let plain = it.integral(from, to, false).value;
            let over = it.integral(from, to, true).value;
            assert!((plain - by_rule(from, to, &|x| it.value(x).value)).abs() < 1e-8, "{from} {to}");
            assert!((over - by_rule(from, to, &|x| it.value(x).value / x)).abs() < 1e-10, "{from} {to}");
            assert_eq!(it.integral(to, from, false).value, -plain);
        }
        for x in [283.0, 305.0, 350.0, 390.0] {
            let central = (it.value(x + 1e-4).value - it.value(x - 1e-4).value) / 2e-4;
            assert!((it.slope(x).value - central).abs() < 1e-8);
        }
    }

    #[test]
    fn derivatives_by_the_points_agree_with_differences() {
        for k in 0..6 {
            let moved = |by: f64| {
                let mut y = Y;
                y[k] += by;
                pchip(y)
            };
            let of: [fn(&Pchip) -> f64; 3] = [
                |it| it.value(321.0).value,
                |it| it.integral(298.15, 380.0, false).value,
                |it| it.integral(290.0, 390.0, true).value,
            ];
            let own = [
                pchip(Y).value(321.0).partials[k],
                pchip(Y).integral(298.15, 380.0, false).partials[k],
                pchip(Y).integral(290.0, 390.0, true).partials[k],
            ];
            for (f, own) in of.into_iter().zip(own) {
                let central = (f(&moved(1e-6)) - f(&moved(-1e-6))) / 2e-6;
                assert!((own - central).abs() < 1e-6 * (1.0 + central.abs()), "{k}: {own} {central}");
            }
        }
    }
}
