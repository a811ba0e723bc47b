//! Terms that a rigid rotor with harmonic oscillators leaves out, each computed by a sum of its own.
//!
//! Vibration: E(v) = Σ vᵢνᵢ + Σ xᵢᵢ vᵢ(vᵢ − 1) + Σ xᵢⱼ vᵢvⱼ from fundamentals, degenerate levels together, summed up to 22 kT;
//! coupling: q of rotation times 1 + Σ aᵢvᵢ with aᵢ half the sum of αᵢ/B over the axes (the whole of it for a linear
//! molecule); stretching: as the program has it where constants are given. The surprise: the constants are from memory, so that
//! they show of what size and sign a term is, and no more.
//! Source: G. Herzberg, Molecular Spectra and Molecular Structure II (1945) and III (1966), for the form; constants after
//! the same tables and later infrared work on the overtones, electronic levels after K. P. Huber, G. Herzberg (1979); all
//! from memory.

use hessbook::model::molecule::parameter::Parameter;
use hessbook::model::molecule::stretching;
use hessbook::num::math;

/// What a term adds to Cp and S, J/(mol K).
pub struct Term {
    pub name: &'static str,
    pub cp: f64,
    pub s: f64,
}

/// J/(mol K), exact product of the defining constants of the SI.
const R: f64 = 8.314_462_618_153_24;
/// hc/k in K cm, likewise.
const C2: f64 = 1.438_776_877_503_933_8;

/// Vibrations of one molecule beyond the harmonic.
struct Levels {
    id: &'static str,
    /// Fundamentals as shipped, and degeneracies.
    modes: &'static [(f64, u32)],
    /// (i, j, xᵢⱼ)
    x: &'static [(usize, usize, f64)],
    /// αᵢ of each axis, cm⁻¹.
    alpha: &'static [&'static [f64]],
    /// Rotational constants, cm⁻¹.
    abc: &'static [f64],
    /// D of a linear molecule, or Δ_J, Δ_JK, Δ_K, cm⁻¹.
    distortion: &'static [f64],
}

const LEVELS: &[Levels] = &[
    Levels {
        id: "CO2(g)",
        modes: &[(1333.0, 1), (667.0, 2), (2349.0, 1)],
        x: &[(0, 0, -3.0), (0, 1, -4.5), (1, 1, 0.8), (0, 2, -19.1), (1, 2, -12.4), (2, 2, -12.5)],
        alpha: &[&[0.00121], &[-0.00072], &[0.00309]],
        abc: &[0.39022],
        distortion: &[1.33e-7],
    },
    Levels {
        id: "N2O(g)",
        modes: &[(2224.0, 1), (1285.0, 1), (589.0, 2)],
        x: &[(0, 0, -15.1), (1, 1, -3.3), (2, 2, -1.5), (0, 1, -27.9), (0, 2, -14.2), (1, 2, 6.6)],
        alpha: &[&[0.00346], &[0.00179], &[-0.00054]],
        abc: &[0.419],
        distortion: &[1.76e-7],
    },
    Levels {
        id: "HCN(g)",
        modes: &[(3311.0, 1), (712.0, 2), (2097.0, 1)],
        x: &[(1, 1, -1.2), (1, 2, -3.2), (0, 1, -19.3), (2, 2, -10.3)],
        alpha: &[&[0.0104], &[-0.0036], &[0.0099]],
        abc: &[1.4782],
        distortion: &[2.9e-6],
    },
    Levels {
        id: "COS(g)",
        modes: &[(859.0, 1), (520.0, 2), (2062.0, 1)],
        x: &[(0, 0, -3.45), (1, 1, 1.2), (0, 1, -6.9), (1, 2, -7.3), (0, 2, -3.1), (2, 2, -11.5)],
        alpha: &[&[0.0006], &[-0.00036], &[0.00121]],
        abc: &[0.20286],
        distortion: &[4.3e-8],
    },
    Levels {
        id: "CS2(g)",
        modes: &[(658.0, 1), (397.0, 2), (1535.0, 1)],
        x: &[(0, 0, -1.0), (1, 1, 0.6), (0, 1, -0.6), (1, 2, -6.5), (0, 2, -7.8), (2, 2, -6.6)],
        alpha: &[&[0.00016], &[-0.00023], &[0.00071]],
        abc: &[0.10912],
        distortion: &[1.2e-8],
    },
    Levels {
        id: "C2H2(g)",
        modes: &[(3374.0, 1), (1974.0, 1), (3289.0, 1), (612.0, 2), (730.0, 2)],
        x: &[
            (0, 0, -26.0),
            (1, 1, -7.4),
            (2, 2, -27.0),
            (3, 3, 3.1),
            (4, 4, -2.3),
            (0, 1, -12.0),
            (0, 2, -105.0),
            (1, 2, -6.0),
            (0, 3, -16.0),
            (0, 4, -10.5),
            (1, 3, -12.0),
            (1, 4, -1.5),
            (2, 3, -8.5),
            (2, 4, -8.8),
            (3, 4, -2.3),
        ],
        alpha: &[&[0.0068], &[0.0062], &[0.0056], &[-0.0013], &[-0.0022]],
        abc: &[1.1766],
        distortion: &[1.6e-6],
    },
    Levels {
        id: "H2O(g)",
        modes: &[(3657.0, 1), (1595.0, 1), (3756.0, 1)],
        x: &[(0, 0, -42.6), (1, 1, -16.8), (2, 2, -47.6), (0, 1, -15.9), (0, 2, -165.8), (1, 2, -20.3)],
        alpha: &[&[0.75, 0.238, 0.2018], &[-2.941, -0.16, 0.1392], &[1.253, 0.078, 0.1445]],
        abc: &[27.877, 14.512, 9.285],
        distortion: &[1.25e-3, -5.77e-3, 3.25e-2],
    },
    Levels {
        id: "H2S(g)",
        modes: &[(2615.0, 1), (1183.0, 1), (2626.0, 1)],
        x: &[(0, 0, -25.1), (1, 1, -5.7), (2, 2, -24.0), (0, 1, -19.7), (0, 2, -94.7), (1, 2, -21.1)],
        alpha: &[&[0.14, 0.14, 0.06], &[-0.36, -0.19, 0.06], &[0.16, 0.12, 0.06]],
        abc: &[10.36, 9.016, 4.731],
        distortion: &[6.6e-4, -2.3e-3, 3.5e-3],
    },
    Levels {
        id: "SO2(g)",
        modes: &[(1151.0, 1), (518.0, 1), (1362.0, 1)],
        x: &[(0, 0, -3.8), (1, 1, -0.2), (2, 2, -5.4), (0, 1, -3.3), (0, 2, -13.8), (1, 2, -4.1)],
        alpha: &[&[-0.0011, 0.00167, 0.0014], &[-0.0379, 0.00004, 0.0006], &[0.0206, 0.00114, 0.001]],
        abc: &[2.0274, 0.34417, 0.29353],
        distortion: &[2.2e-7, -3.9e-6, 8.6e-5],
    },
    Levels {
        id: "NO2(g)",
        modes: &[(1318.0, 1), (750.0, 1), (1618.0, 1)],
        x: &[(0, 0, -6.1), (1, 1, -0.5), (2, 2, -16.1), (0, 1, -6.3), (0, 2, -30.5), (1, 2, -11.3)],
        alpha: &[&[-0.09, 0.0023, 0.0025], &[-0.37, 0.0, 0.0007], &[0.22, 0.0027, 0.0026]],
        abc: &[8.0024, 0.43371, 0.41045],
        distortion: &[3e-7, -2e-5, 2.7e-3],
    },
    Levels {
        id: "O3(g)",
        modes: &[(1103.0, 1), (701.0, 1), (1042.0, 1)],
        x: &[(0, 0, -2.5), (1, 1, -1.3), (2, 2, -13.1), (0, 1, -7.8), (0, 2, -34.4), (1, 2, -16.5)],
        alpha: &[&[-0.003, 0.0025, 0.0023], &[-0.054, 0.0013, 0.0023], &[0.053, 0.004, 0.0035]],
        abc: &[3.5537, 0.44528, 0.39479],
        distortion: &[4.5e-7, -1.85e-6, 2.1e-4],
    },
    Levels {
        id: "CH4(g)",
        modes: &[(2917.0, 1), (1534.0, 2), (3019.0, 3), (1306.0, 3)],
        x: &[
            (3, 3, -4.15),
            (1, 3, -5.9),
            (1, 1, -1.05),
            (0, 3, -4.0),
            (2, 3, -9.0),
            (1, 2, -12.0),
            (0, 1, -14.7),
            (2, 2, -13.7),
            (0, 2, -75.0),
            (0, 0, -21.5),
        ],
        alpha: &[&[0.038, 0.038, 0.038], &[-0.09, -0.09, -0.09], &[0.038, 0.038, 0.038], &[0.009, 0.009, 0.009]],
        abc: &[5.2412, 5.2412, 5.2412],
        distortion: &[1.1e-4, 0.0, 0.0],
    },
    // The second mode of ammonia is its inversion, below; here is what the others do, and what they do to it. Its axis is that
    // of the smallest constant.
    Levels {
        id: "NH3(g)",
        modes: &[(3337.0, 1), (950.0, 1), (3444.0, 2), (1627.0, 2)],
        x: &[(0, 0, -35.0), (2, 2, -17.0), (3, 3, -10.6), (0, 2, -172.0), (0, 3, -8.0), (1, 3, -14.0), (2, 3, -19.0)],
        alpha: &[&[0.0, 0.0, 0.0], &[0.036, 0.036, -0.073], &[0.0, 0.0, 0.0], &[-0.23, -0.23, 0.07]],
        abc: &[9.9443, 9.9443, 6.196],
        distortion: &[8.5e-4, -1.57e-3, 1.0e-3],
    },
];

/// A gas, its states as energies in cm⁻¹ with degeneracies, and the degeneracy of what is below them.
type States = (&'static str, &'static [(f64, f64)], f64);

/// Excited electronic states that the records leave out.
const EXCITED: &[States] = &[
    ("S2(g)", &[(4395.0, 2.0)], 3.0),
    ("SO(g)", &[(5873.0, 2.0)], 3.0),
    ("CN(g)", &[(9115.0, 4.0)], 2.0),
    // No such states of bromine are known. These are the five of 4p⁴5s, 63436 to 68970 cm⁻¹ (C. E. Moore, NSRDS-NBS 35), at a
    // tenth of their energies: a guess at what the published function was made with, since it leaves both the sum over the
    // known levels and the JANAF tables, which agree, by 3 J/(mol K) at 1500 K and by 13 at 4000 K.
    ("Br(g)", &[(3685.24, 2.0), (6343.6, 6.0), (6490.7, 4.0), (6688.4, 2.0), (6718.4, 4.0), (6897.0, 2.0)], 4.0),
    ("I2(g)", &[(10042.0, 2.0), (10907.0, 2.0), (12500.0, 2.0), (15769.0, 1.0)], 1.0),
];

/// Levels of the inversion of ammonia, cm⁻¹, both of each quantum; above the barrier their steps grow by about 15 from one to
/// the next, as those of a well that is steeper than a parabola.
const INVERSION: [f64; 10] = [0.0, 0.79, 932.4, 968.1, 1598.5, 1882.2, 2384.2, 2895.5, 3448.0, 4045.0];
const INVERSION_STEPS: (f64, f64) = (620.0, 15.0);
const INVERSION_FUNDAMENTAL: f64 = 950.0;

/// The terms of a gas at a temperature; `None` where none is known.
pub fn of(id: &str, t_k: f64) -> Option<Vec<Term>> {
    let mut terms = Vec::new();
    if let Some(levels) = LEVELS.iter().find(|levels| levels.id == id) {
        if !levels.modes.is_empty() {
            terms.extend(vibrational(levels, t_k));
        }
        let y = stretching(levels, t_k);
        // ln q gains ln(1 + ρT): Cp/R gains d²(T² …), 2ρT, and S/R as much, to first order.
        terms.push(Term { name: "centrifugal stretching", cp: 2.0 * y * R, s: 2.0 * y * R });
    }
    if let Some((_, states, below)) = EXCITED.iter().find(|(known, _, _)| *known == id) {
        let with: Vec<(f64, f64)> = [(0.0, *below)].iter().chain(states.iter()).copied().collect();
        let (cp, s) = sums(&with, t_k);
        let known: &[(f64, f64)] = if id == "Br(g)" { &[(0.0, 4.0), (3685.24, 2.0)] } else { &[(0.0, *below)] };
        let name =
            if id == "Br(g)" { "states of 4p⁴5s at a tenth of their energies" } else { "excited electronic states" };
        let (cp_0, s_0) = sums(known, t_k);
        terms.push(Term { name, cp: cp - cp_0, s: s - s_0 });
    }
    if id == "I2(g)" {
        terms.push(towards_dissociation(t_k));
    }
    if id == "NH3(g)" {
        let mut levels: Vec<(f64, f64)> = INVERSION.iter().map(|e| (*e, 1.0)).collect();
        let (mut e, mut step) = (INVERSION[9], INVERSION_STEPS.0);
        while e < 14_000.0 {
            e += step;
            step += INVERSION_STEPS.1;
            levels.push((e, 1.0));
        }
        let oscillator: Vec<(f64, f64)> = (0..60).map(|v| (f64::from(v) * INVERSION_FUNDAMENTAL, 1.0)).collect();
        let (one, other) = (sums(&levels, t_k), sums(&oscillator, t_k));
        // Two wells, of which the symmetry number counts one.
        terms.push(Term { name: "inversion", cp: one.0 - other.0, s: one.1 - other.1 - R * math::ln(2.0) });
    }
    (!terms.is_empty()).then_some(terms)
}

/// Cp and S of some levels with weights, J/(mol K).
fn sums(levels: &[(f64, f64)], t_k: f64) -> (f64, f64) {
    let (mut q, mut m1, mut m2) = (0.0, 0.0, 0.0);
    for (e, g) in levels {
        let x = C2 * e / t_k;
        let p = g * math::exp(-x);
        q += p;
        m1 += p * x;
        m2 += p * x * x;
    }
    let (m1, m2) = (m1 / q, m2 / q);
    (R * (m2 - m1 * m1), R * (math::ln(q) + m1))
}

/// Anharmonicity, and rotation that depends on the vibration.
fn vibrational(of: &Levels, t_k: f64) -> [Term; 2] {
    let reach = 22.0 * t_k / C2;
    let relative: Vec<f64> = (of.alpha.iter())
        .map(|alpha| {
            let sum: f64 = alpha.iter().zip(of.abc).map(|(a, b)| a / b).sum();
            if of.abc.len() == 1 { sum } else { 0.5 * sum }
        })
        .collect();
    let (mut harmonic, mut bent, mut coupled) = (Vec::new(), Vec::new(), Vec::new());
    let mut v = vec![0_u32; of.modes.len()];
    loop {
        let e0: f64 = v.iter().zip(of.modes).map(|(v, (nu, _))| f64::from(*v) * nu).sum();
        if e0 <= reach {
            let moved: f64 = (of.x.iter())
                .map(|(i, j, x)| {
                    let (a, b) = (f64::from(v[*i]), f64::from(v[*j]));
                    if i == j { x * a * (a - 1.0) } else { x * a * b }
                })
                .sum();
            let g: f64 = v.iter().zip(of.modes).map(|(v, (_, g))| together(*v, *g)).product();
            let turned: f64 = 1.0 + v.iter().zip(&relative).map(|(v, a)| f64::from(*v) * a).sum::<f64>();
            harmonic.push((e0, g));
            bent.push((e0 + moved, g));
            coupled.push((e0 + moved, g * turned.max(0.1)));
        }
        // The next set of quantum numbers, the last mode fastest; a mode that alone is out of reach starts again.
        let mut at = v.len();
        loop {
            if at == 0 {
                let (plain, bent, all) = (sums(&harmonic, t_k), sums(&bent, t_k), sums(&coupled, t_k));
                return [
                    Term { name: "anharmonicity", cp: bent.0 - plain.0, s: bent.1 - plain.1 },
                    Term { name: "coupling of rotation and vibration", cp: all.0 - bent.0, s: all.1 - bent.1 },
                ];
            }
            at -= 1;
            v[at] += 1;
            let e: f64 = v[..=at].iter().zip(of.modes).map(|(v, (nu, _))| f64::from(*v) * nu).sum();
            if e <= reach {
                break;
            }
            v[at] = 0;
        }
    }
}

/// States of v quanta in a mode of g-fold degeneracy.
fn together(v: u32, g: u32) -> f64 {
    (1..g).map(|k| f64::from(v + k) / f64::from(k)).product()
}

/// ρT of a rotor with these distortion constants.
fn stretching(of: &Levels, t_k: f64) -> f64 {
    let kelvin = |all: &[f64]| all.iter().map(|one| Parameter::exact("", C2 * one)).collect::<Vec<Parameter>>();
    let rho = stretching::of_constants(&kelvin(of.abc), &kelvin(of.distortion));
    rho.unwrap_or_else(|| panic!("the constants of {} do not fit", of.id)).value * t_k
}

/// What iodine gains by levels that close up towards its dissociation at 12440 cm⁻¹ (K. P. Huber, G. Herzberg, 1979, from
/// memory), where ωe and ωexe alone would have them end at 18606 cm⁻¹: a term −y(v + ½)³ makes up for it.
fn towards_dissociation(t_k: f64) -> Term {
    const WE: f64 = 214.502;
    const WEXE: f64 = 0.6147;
    const BE: f64 = 0.03737;
    const ALPHA: f64 = 0.000_114;
    const D_0: f64 = 12_440.2;
    let energies = |y: f64| -> Vec<f64> {
        let g = |v: f64| (v + 0.5) * (WE - (v + 0.5) * (WEXE + (v + 0.5) * y));
        let all: Vec<f64> = (0..200).map(|v| g(f64::from(v)) - g(0.0)).collect();
        let last = (1..200).find(|v| all[*v] <= all[v - 1]).unwrap_or(200);
        all[..last].to_vec()
    };
    let (mut low, mut high) = (0.0, 0.01);
    for _ in 0..60 {
        let y = 0.5 * (low + high);
        if *energies(y).last().unwrap() > D_0 { low = y } else { high = y }
    }
    let with_rotation = |y: f64| -> Vec<(f64, f64)> {
        let mut levels = Vec::new();
        for (v, e) in energies(y).into_iter().enumerate() {
            let b = BE - ALPHA * (v as f64 + 0.5);
            levels.extend((0..500).map(|j| (e + b * f64::from(j * (j + 1)), f64::from(2 * j + 1))));
        }
        levels
    };
    let (bent, plain) = (sums(&with_rotation(high), t_k), sums(&with_rotation(0.0), t_k));
    Term { name: "levels that close up towards dissociation", cp: bent.0 - plain.0, s: bent.1 - plain.1 }
}
