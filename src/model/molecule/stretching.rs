//! What rotation adds to the heat capacity by stretching the molecule, to first order in T.
//!
//! ln q = … + ρT, so U/RT = ρT and Cv/R = S/R = 2ρT; ρT is the mean of the distortion energy over kT, the angular momenta
//! being distributed as in a classical rigid top:
//!
//! linear: ρT = 2 D kT/B²
//! others: ρT = [Δ_J⟨J⁴⟩ + Δ_JK⟨J²J_z²⟩ + Δ_K⟨J_z⁴⟩ + 2δ_J⟨J²(J_x² − J_y²)⟩ + 2δ_K⟨J_z²(J_x² − J_y²)⟩]/kT
//!         ⟨J_i²⟩ = s_i = kT/2B_i, normal, each axis by itself; x, y, z are the axes of B, C, A where no two are alike
//! from wavenumbers: ρT = Σ_k ⟨(½ Σ a_k^{αβ} ω_α ω_β)²⟩/(2 λ_k kT), a_k the change of the moments of inertia along mode k
//!
//! | symbol            | unit | meaning                                                                     |
//! |-------------------|------|-----------------------------------------------------------------------------|
//! | B_i               | K    | rotational constants, as temperatures                                       |
//! | D, Δ_J, Δ_JK, Δ_K | K    | distortion constants, quartic, as temperatures; z is the axis of a symmetric top, else that of A |
//! | δ_J, δ_K          | K    | the other two of a top with no two B alike, in the A reduction              |
//! | λ_k               | s⁻²  | square of the angular frequency of mode k                                   |
//!
//! The a_k are not known from wavenumbers alone, but over all modes they add up to a function of the rotational constants,
//! |∇(ω·I·ω)|² = 4 ω² (ω·I·ω) less what turning the frame takes. So for a linear molecule with a single stretch that changes
//! its length, of two atoms or XYX, ρ is exact in a harmonic force field, D = 4B³/ν²; for all others it is bracketed by putting
//! everything into the lowest or the highest mode. Sextic and higher constants are left out. The next order of D alone adds
//! 15(ρT)² to Cv/R of a linear molecule, from ln q = ln ∫ exp(−y + εy²) dy = 2ε + 10ε², ε = DkT/B²; see [`RHO_T_MAX`].
//! Source: E. B. Wilson, J. Chem. Phys. 4, 526 (1936); D. Kivelson, E. B. Wilson, J. Chem. Phys. 20, 1575 (1952); constants as
//! defined by J. K. G. Watson, J. Chem. Phys. 46, 1935 (1967); all from memory. The sum over modes follows from completeness.

use smallvec::SmallVec;

use crate::model::molecule::definition::{Definition, Motion};
use crate::model::molecule::error::MoleculeError;
use crate::model::molecule::parameter::{self, Parameter};

pub const NAME: &str = "centrifugal stretching";

/// ρT above which first order is not enough: there the next order of a linear molecule, 15R(ρT)², is 0.1 J/(mol K), what
/// tables of heat capacities are commonly held to (common practice, no source).
pub const RHO_T_MAX: f64 = 0.028;

/// Largest part of a rotational constant that a distortion constant may be. That of H2 is 8e-4 and that of CH2, which bends
/// to a line easily, 0.03 (from memory); beyond, no series in J² describes the levels (common practice, no source).
const PART_MAX: f64 = 0.05;

/// ρ of the constants that someone gave; `None` where there are none.
///
/// # Errors
/// The molecule has another number of them.
pub fn given(motion: &Motion, given: &[Parameter]) -> Result<Option<Parameter>, MoleculeError> {
    if given.is_empty() {
        return Ok(None);
    }
    let (rho, wanted) = match motion {
        Motion::Polyatomic { top, .. } if top.len() == 1 => (of_constants(top, given), "a linear molecule has one, D"),
        Motion::Polyatomic { top, .. } => {
            let wanted = "a molecule that is not linear has Δ_J, Δ_JK and Δ_K, with δ_J and δ_K where no two rotational \
                          constants are alike; a spherical top has D alone";
            (of_constants(top, given), wanted)
        }
        Motion::Diatomic { .. } => (None, "the levels of a molecule with `we` follow from that, `Be` and `De`"),
        Motion::Atom => (None, "an atom does not rotate"),
    };
    let rho = rho.ok_or(MoleculeError::Distortion { given: given.len(), wanted })?;
    if let Motion::Polyatomic { top, .. } = motion {
        let largest = top.iter().fold(0.0_f64, |most, b| most.max(b.value));
        if let Some(constant) = given.iter().find(|d| d.value.abs() > PART_MAX * largest) {
            let (value, of) = (parameter::per_cm(constant.value), parameter::per_cm(largest));
            return Err(MoleculeError::DistortionLarge { value, of });
        }
    }
    Ok(Some(rho))
}

/// Whether constants of a top with no two B alike lack δ_J and δ_K.
pub fn lacks_delta(motion: &Motion, given: usize) -> bool {
    let Motion::Polyatomic { top, .. } = motion else { return false };
    given == 3
        && matches!(top.as_slice(), [a, b, c] if ![(a, b), (b, c), (c, a)].iter().any(|(p, q)| alike(p.value, q.value)))
}

/// ρ in 1/K of a molecule with these rotational and distortion constants; `None` where their numbers do not fit.
pub fn of_constants(top: &[Parameter], distortion: &[Parameter]) -> Option<Parameter> {
    match (top, distortion) {
        ([b], [d]) => {
            let per_d = 2.0 / (b.value * b.value);
            Some(gathered(per_d * d.value, &[(d, per_d), (b, -2.0 * per_d * d.value / b.value)]))
        }
        ([a, b, c], [j]) if alike(a.value, b.value) && alike(b.value, c.value) => {
            Some(of_top(top, [j, &zero(), &zero(), &zero(), &zero()]))
        }
        ([_, _, _], [j, jk, k]) => Some(of_top(top, [j, jk, k, &zero(), &zero()])),
        ([a, b, c], [j, jk, k, dj, dk]) if ![(a, b), (b, c), (c, a)].iter().any(|(p, q)| alike(p.value, q.value)) => {
            Some(of_top(top, [j, jk, k, dj, dk]))
        }
        _ => None,
    }
}

fn alike(a: f64, b: f64) -> bool {
    (a / b - 1.0).abs() < 1e-6
}

fn zero() -> Parameter {
    Parameter::exact(NAME, 0.0)
}

fn of_top(top: &[Parameter], [j, jk, k, dj, dk]: [&Parameter; 5]) -> Parameter {
    let b: Vec<f64> = top.iter().map(|b| b.value).collect();
    let z = axis(&b);
    let s: Vec<f64> = b.iter().map(|b| 0.5 / b).collect();
    let (sum, squares) = (s.iter().sum::<f64>(), s.iter().map(|s| s * s).sum::<f64>());
    let (j4, j2z2, z4) = (sum * sum + 2.0 * squares, s[z] * (sum + 2.0 * s[z]), 3.0 * s[z] * s[z]);
    // The axis of B is x and that of C is y.
    let (p, q) = ((z + 1) % 3, (z + 2) % 3);
    let (x, y) = if b[p] >= b[q] { (p, q) } else { (q, p) };
    let apart = s[x] - s[y];
    let (j2xy, z2xy) = (2.0 * (apart * sum + 2.0 * (s[x] * s[x] - s[y] * s[y])), 2.0 * s[z] * apart);
    let mut by = vec![(j, j4), (jk, j2z2), (k, z4), (dj, j2xy), (dk, z2xy)];
    for (nth, b) in top.iter().enumerate() {
        let of_z = if nth == z { sum + 4.0 * s[z] } else { 0.0 };
        let sign = f64::from(i8::from(nth == x) - i8::from(nth == y));
        let by_s = j.value * (2.0 * sum + 4.0 * s[nth])
            + jk.value * (s[z] + of_z)
            + k.value * if nth == z { 6.0 * s[z] } else { 0.0 }
            + 2.0 * dj.value * (apart + sign * (sum + 4.0 * s[nth]))
            + 2.0 * dk.value * if nth == z { apart } else { sign * s[z] };
        by.push((b, -2.0 * s[nth] * s[nth] * by_s));
    }
    let quartic = j.value * j4 + jk.value * j2z2 + k.value * z4;
    gathered(quartic + dj.value * j2xy + dk.value * z2xy, &by)
}

/// The axis whose quantum number the constants are written with: the one that differs from two alike, else that of A.
fn axis(b: &[f64]) -> usize {
    let odd = (0..3).find(|nth| alike(b[(nth + 1) % 3], b[(nth + 2) % 3]));
    odd.unwrap_or_else(|| (0..3).fold(0, |most, nth| if b[nth] > b[most] { nth } else { most }))
}

fn gathered(value: f64, by: &[(&Parameter, f64)]) -> Parameter {
    let inputs = by.iter().flat_map(|(parameter, by)| {
        parameter.inputs.iter().map(move |(node, own)| (std::rc::Rc::clone(node), own * by))
    });
    Parameter { name: NAME.to_owned(), value, inputs: inputs.collect::<SmallVec<_>>() }
}

/// ρ where the symmetry leaves one stretch that changes the length: of two atoms, or XYX, whose lower stretch keeps the middle
/// at rest. With the wavenumber it was taken from.
pub fn of_one_stretch(definition: &Definition) -> Option<(Parameter, f64)> {
    let Motion::Polyatomic { top, vibrations, .. } = &definition.motion else { return None };
    let [b] = top.as_slice() else { return None };
    let stretches: Vec<&Parameter> = vibrations.iter().filter(|(_, g)| *g == 1.0).map(|(nu, _)| nu).collect();
    let bends: Vec<f64> = vibrations.iter().filter(|(_, g)| *g != 1.0).map(|(_, g)| *g).collect();
    let stretch = match (stretches.as_slice(), bends.as_slice(), definition.symmetry_number) {
        ([only], [], _) => only,
        ([one, other], [2.0], 2.0) => {
            if one.value < other.value {
                one
            } else {
                other
            }
        }
        _ => return None,
    };
    let rho = 8.0 * b.value / (stretch.value * stretch.value);
    Some((gathered(rho, &[(b, rho / b.value), (stretch, -2.0 * rho / stretch.value)]), stretch.value))
}

/// The least and the most that ρ can be in a harmonic force field with these wavenumbers, 1/K.
pub fn bracket(definition: &Definition) -> Option<(f64, f64)> {
    let Motion::Polyatomic { top, vibrations, .. } = &definition.motion else { return None };
    let sum = over_all_modes(&top.iter().map(|b| b.value).collect::<Vec<f64>>())?;
    let ends = vibrations
        .iter()
        .fold((f64::INFINITY, 0.0_f64), |(low, high), (nu, _)| (low.min(nu.value), high.max(nu.value)));
    // Rotational constants that no rigid body has give no sum.
    (sum > 0.0 && ends.1 > 0.0).then(|| (sum / (ends.1 * ends.1), sum / (ends.0 * ends.0)))
}

/// ρν² if all modes had one ν: 4 ω²(ω·I·ω) averaged, less what turning the frame takes, over 8kT; in the unit of B.
fn over_all_modes(b: &[f64]) -> Option<f64> {
    match b {
        [b] => Some(8.0 * b),
        [x, y, z] => {
            let turned = |a: f64, b: f64, c: f64| (a - b) * (a - b) * c / (a * b);
            Some(5.0 * (x + y + z) - turned(*x, *y, *z) - turned(*y, *z, *x) - turned(*z, *x, *y))
        }
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::num::math;

    fn parameters(values: &[f64]) -> Vec<Parameter> {
        values.iter().map(|value| Parameter::exact("", *value)).collect()
    }

    #[test]
    fn a_linear_molecule_agrees_with_the_sum_over_its_levels() {
        // B and D of CO2 in kelvin, D a hundred times its own so that it can be told from rounding.
        let (b, d, t) = (0.5614, 1.9e-5, 400.0);
        let ln_q = |d: f64| {
            let term = |j: i32| {
                let jj = f64::from(j * (j + 1));
                f64::from(2 * j + 1) * math::exp(-(b * jj - d * jj * jj) / t)
            };
            math::ln((0..150).map(term).sum::<f64>())
        };
        let rho = of_constants(&parameters(&[b]), &parameters(&[d])).unwrap().value;
        // Bound: second order, some ten (ρT)², and B/T of ρT for the sum that is no integral.
        let exact = ln_q(d) - ln_q(0.0);
        assert!((rho * t / exact - 1.0).abs() < 10.0 * rho * t + b / t, "{} {exact}", rho * t);
    }

    #[test]
    fn a_symmetric_top_agrees_with_the_sum_over_its_levels() {
        // Oblate and prolate, in kelvin: E = B J(J+1) + (C − B) K² − Δ_J J²(J+1)² − Δ_JK J(J+1) K² − Δ_K K⁴.
        for (b, c) in [(1.43, 0.89), (0.6, 2.1)] {
            let (dj, djk, dk, t) = (2e-6, -3e-6, 2.5e-6, 600.0);
            let ln_q = |on: f64| {
                let mut q = 0.0;
                for j in 0..160_i32 {
                    for k in -j..=j {
                        let (jj, kk) = (f64::from(j * (j + 1)), f64::from(k * k));
                        let stretched = on * (dj * jj * jj + djk * jj * kk + dk * kk * kk);
                        q += f64::from(2 * j + 1) * math::exp(-(b * jj + (c - b) * kk - stretched) / t);
                    }
                }
                math::ln(q)
            };
            let exact = ln_q(1.0) - ln_q(0.0);
            let rho = of_constants(&parameters(&[b, c, b]), &parameters(&[dj, djk, dk])).unwrap().value;
            assert!((rho * t / exact - 1.0).abs() < 10.0 * rho * t + 2.0 * b.max(c) / t, "{} {exact}", rho * t);
        }
    }

    #[test]
    fn a_top_with_no_two_alike_agrees_with_the_sum_over_its_levels() {
        use nalgebra::DMatrix;
        // Water in kelvin, from memory. First order: the mean of the A-reduced operators over the levels of the rigid top.
        const C2: f64 = 1.438_777;
        let [a, b, c] = [27.877, 14.512, 9.285].map(|b| C2 * b);
        let d = [1.25e-3, -5.77e-3, 3.25e-2, 5.08e-4, 1.3e-3].map(|d| C2 * d);
        let (t, mut q, mut means) = (1000.0, 0.0, [0.0; 5]);
        for j in 0..38_i32 {
            let (jj, size) = (f64::from(j * (j + 1)), (2 * j + 1) as usize);
            let k = |n: usize| n as f64 - f64::from(j);
            let unit = DMatrix::<f64>::identity(size, size);
            let z2 = DMatrix::from_fn(size, size, |m, n| if m == n { k(m) * k(m) } else { 0.0 });
            // J_x² − J_y² is half of J₊² + J₋².
            let xy = DMatrix::from_fn(size, size, |m, n| {
                let low = k(m.min(n));
                let up = |k: f64| jj - k * (k + 1.0);
                if m.abs_diff(n) == 2 { 0.5 * math::sqrt(up(low) * up(low + 1.0)) } else { 0.0 }
            });
            let rigid = &unit * (0.5 * (b + c) * jj) + &z2 * (a - 0.5 * (b + c)) + &xy * (0.5 * (b - c));
            let terms =
                [&unit * (jj * jj), &z2 * jj, &z2 * &z2, &xy * (2.0 * jj), &z2 * &xy + &xy * &z2].map(|term| term / t);
            let levels = rigid.symmetric_eigen();
            for (energy, state) in levels.eigenvalues.iter().zip(levels.eigenvectors.column_iter()) {
                let weight = f64::from(2 * j + 1) * math::exp(-energy / t);
                q += weight;
                for (mean, term) in means.iter_mut().zip(&terms) {
                    *mean += weight * state.dot(&(term * state));
                }
            }
        }
        let rho_t = |d: &[f64]| of_constants(&parameters(&[a, b, c]), &parameters(d)).unwrap().value * t;
        let five: Vec<f64> = means.iter().zip(d).map(|(mean, d)| mean / q * d).collect();
        for (nth, exact) in five.iter().enumerate() {
            let mut alone = [0.0; 5];
            alone[nth] = d[nth];
            // Bound: a classical sum in place of one over levels, some B/T.
            let got = rho_t(&alone);
            assert!((got / exact - 1.0).abs() < 3.0 * a / t, "{nth}: {got} {exact}");
        }
        let (got, exact) = (rho_t(&d), five.iter().sum::<f64>());
        assert!((got / exact - 1.0).abs() < a / t, "{got} {exact}");
        let top = |by: [f64; 3]| [a * by[0], b * by[1], c * by[2]].map(|b| Parameter::exact("", b));
        let rho = |by| of_constants(&top(by), &parameters(&d)).unwrap().value;
        // As all B grow together, ρ falls with their square.
        assert!((rho([1.1, 1.1, 1.1]) * 1.1 * 1.1 / rho([1.0; 3]) - 1.0).abs() < 1e-12);
        // The order in which the B are written does not matter.
        let turned = of_constants(&parameters(&[c, a, b]), &parameters(&d)).unwrap().value * t;
        assert!((turned / got - 1.0).abs() < 1e-12);
    }

    #[test]
    fn measured_constants_lie_within_the_bracket_of_the_force_field() {
        // In cm⁻¹, from memory: G. Herzberg (1966) and later microwave work. CH4 has one constant, H2O and SO2 three.
        type Case = (&'static str, &'static [f64], &'static [f64], &'static [f64]);
        let cases: [Case; 3] = [
            ("CH4", &[5.2412, 5.2412, 5.2412], &[2917.0, 1534.0, 3019.0, 1306.0], &[1.1e-4]),
            ("H2O", &[27.877, 14.512, 9.285], &[3657.0, 1595.0, 3756.0], &[1.25e-3, -5.77e-3, 3.25e-2]),
            ("SO2", &[2.0274, 0.34417, 0.29353], &[1151.0, 518.0, 1362.0], &[2.2e-7, -3.9e-6, 8.6e-5]),
        ];
        for (name, b, nu, d) in cases {
            let rho = of_constants(&parameters(b), &parameters(d)).unwrap().value;
            let sum = over_all_modes(b).unwrap();
            let (high, low) = nu.iter().fold((0.0_f64, f64::INFINITY), |(high, low), nu| (high.max(*nu), low.min(*nu)));
            assert!(sum / (high * high) < rho && rho < sum / (low * low), "{name}: {rho}");
        }
    }

    /// Points with their masses, in pairs, so that the axes are the principal ones.
    const BODY: [([f64; 3], f64); 8] = [
        ([1.1, 0.0, 0.0], 1.0),
        ([-1.1, 0.0, 0.0], 1.0),
        ([0.0, 0.7, 0.0], 2.5),
        ([0.0, -0.7, 0.0], 2.5),
        ([0.0, 0.0, 1.6], 0.6),
        ([0.0, 0.0, -1.6], 0.6),
        ([0.4, 0.3, 0.5], 0.0),
        ([0.0, 0.0, 0.0], 3.0),
    ];

    /// ω·I·ω of points.
    fn form(points: &[[f64; 3]], w: [f64; 3]) -> f64 {
        let each = points.iter().zip(BODY).map(|(r, (_, m))| {
            let v = [w[1] * r[2] - w[2] * r[1], w[2] * r[0] - w[0] * r[2], w[0] * r[1] - w[1] * r[0]];
            m * (v[0] * v[0] + v[1] * v[1] + v[2] * v[2])
        });
        each.sum()
    }

    #[test]
    fn the_sum_over_all_modes_is_that_of_a_body_of_points() {
        let points: Vec<[f64; 3]> = BODY.iter().map(|(r, _)| *r).collect();
        let unit = |axis: usize| [0, 1, 2].map(|nth| if nth == axis { 1.0 } else { 0.0 });
        let inertia = [0, 1, 2].map(|axis| form(&points, unit(axis)));
        // Three points of Gauss and Hermite on each axis average a quartic exactly; kT = 1, so that ⟨ω²⟩ = 1/I.
        let nodes = [(0.0, 2.0 / 3.0), (math::sqrt(3.0), 1.0 / 6.0), (-math::sqrt(3.0), 1.0 / 6.0)];
        let (mut mean, h) = (0.0, 1e-5);
        for (x, wx) in nodes {
            for (y, wy) in nodes {
                for (z, wz) in nodes {
                    let w = [x, y, z];
                    let w = [0, 1, 2].map(|axis| w[axis] / math::sqrt(inertia[axis]));
                    let slope = |by: &dyn Fn(&mut Vec<[f64; 3]>, f64)| {
                        let at = |h: f64| {
                            let mut points = points.clone();
                            by(&mut points, h);
                            form(&points, w)
                        };
                        (at(h) - at(-h)) / (2.0 * h)
                    };
                    let mut squares = 0.0;
                    for (nth, (_, mass)) in BODY.iter().enumerate().filter(|(_, (_, mass))| *mass > 0.0) {
                        for axis in 0..3 {
                            let d = slope(&|points, h| points[nth][axis] += h);
                            squares += d * d / mass;
                        }
                    }
                    for (axis, own) in inertia.iter().enumerate() {
                        let d = slope(&|points, h| {
                            for r in points.iter_mut() {
                                let (a, b) = ((axis + 1) % 3, (axis + 2) % 3);
                                (r[a], r[b]) = (
                                    r[a] * math::cos(h) - r[b] * math::sin(h),
                                    r[a] * math::sin(h) + r[b] * math::cos(h),
                                );
                            }
                        });
                        squares -= d * d / own;
                    }
                    mean += wx * wy * wz * squares;
                }
            }
        }
        // With ħ = 1, B = 1/2I. Bound: central differences of quadratic forms, rounding over the step.
        let sum = over_all_modes(&inertia.map(|i| 0.5 / i)).unwrap();
        assert!((sum / (mean / 8.0) - 1.0).abs() < 1e-8, "{sum} {}", mean / 8.0);
    }

    #[test]
    fn derivatives_agree_with_differences() {
        let (top, distortion) = ([10.0, 9.0, 4.7], [7e-4, -2e-3, 3e-3]);
        let value = |top: &[f64], d: &[f64]| of_constants(&parameters(top), &parameters(d)).unwrap().value;
        for nth in 0..3 {
            let h = 1e-5 * top[nth];
            let moved = |by: f64| {
                let mut top = top;
                top[nth] += by;
                value(&top, &distortion)
            };
            let difference = (moved(h) - moved(-h)) / (2.0 * h);
            // The derivative itself, by a parameter that is its own input.
            let with = |nth: usize| {
                let mut all = parameters(&top);
                let own = crate::quantity::text::parse("1 K", None, 1).unwrap();
                all[nth].inputs.push((std::rc::Rc::clone(own.node()), 1.0));
                of_constants(&all, &parameters(&distortion)).unwrap().inputs[0].1
            };
            assert!((with(nth) / difference - 1.0).abs() < 1e-7, "{nth}");
        }
    }
}
