//! Equilibrium of a few reactions among the contents, gases ideal, condensed species pure.
//!
//! Σ ν (g/RT + ln a) = 0 for each reaction        a = n/N · p/p°, or n R T/(V p°); 1 for condensed species
//!
//! The reactions are rewritten so that each forms one scarce species from plentiful ones, and each in turn is brought to
//! equilibrium by a bracketed root in its extent, again and again until nothing moves: the Gibbs energy (the Helmholtz energy
//! at constant volume) is convex in the extents, so this descends to its one minimum. Two reactions that share a trace of one
//! species can hardly move one at a time, so pairs are moved together too.
//! Source: conditions of chemical equilibrium, IUPAC Green Book, 3rd ed., section 2.11.1; choice of plentiful components, Smith
//! and Missen, Chemical Reaction Equilibrium Analysis (1982) (both from memory).

use std::convert::Infallible;

use crate::num::{math, root};

/// What is held while the reactions go on.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Held {
    /// p/p°
    Pressure(f64),
    /// R T/(V p°), per mole
    Volume(f64),
}

/// Amounts with their Gibbs energies.
pub struct Mixture {
    pub n: Vec<f64>,
    pub gas: Vec<bool>,
    /// g/RT of the pure species at p°.
    pub g_rt: Vec<f64>,
    pub held: Held,
}

/// Sweeps after which it is given up; a few tens do.
const SWEEPS: usize = 500;
/// Relative to all moles: extents nearer than that move no figure that is shown, and doubles resolve no much nearer ones.
const SETTLED: f64 = 1e-14;
/// A coefficient that is left over from elimination.
const NOTHING: f64 = 1e-9;
/// Stands for no moles at all, whose logarithm would be infinite.
const TRACE: f64 = 1e-300;

impl Mixture {
    fn total_gas(&self, nu: &[f64], extent: f64) -> f64 {
        let moles = (0..self.n.len()).filter(|&i| self.gas[i]).map(|i| self.n[i] + nu[i] * extent);
        moles.sum::<f64>().max(TRACE)
    }

    /// Affinity with its sign turned, over RT: grows with the extent.
    fn drive(&self, nu: &[f64], extent: f64) -> f64 {
        let ln_scale = match self.held {
            Held::Pressure(p) => math::ln(p / self.total_gas(nu, extent)),
            Held::Volume(per_mole) => math::ln(per_mole),
        };
        let mut drive = 0.0;
        for (i, &nu_i) in nu.iter().enumerate().filter(|(_, nu_i)| **nu_i != 0.0) {
            drive += nu_i * self.g_rt[i];
            if self.gas[i] {
                drive += nu_i * (math::ln((self.n[i] + nu_i * extent).max(TRACE)) + ln_scale);
            }
        }
        drive
    }

    /// The extent that brings one reaction to equilibrium from where the amounts are.
    pub fn extent(&self, nu: &[f64]) -> f64 {
        let (mut low, mut high) = (f64::NEG_INFINITY, f64::INFINITY);
        for (n, nu) in self.n.iter().zip(nu) {
            if *nu > 0.0 {
                low = low.max(-n / nu);
            } else if *nu < 0.0 {
                high = high.min(-n / nu);
            }
        }
        if !(low < high && (high - low).is_finite()) {
            return 0.0;
        }
        let Ok(found) = root::bracketed(|x| Ok::<f64, Infallible>(self.drive(nu, x)), low, high, 0.0);
        match found {
            Ok(root) => root.x,
            // Nothing but condensed species to hold it back: it goes to an end.
            Err(ends) => {
                if ends.at_high <= 0.0 {
                    high
                } else {
                    low
                }
            }
        }
    }

    /// The same reactions, combined so that each has one scarce species that no other has.
    fn rewritten(&self, changes: &[Vec<f64>]) -> Vec<Vec<f64>> {
        let mut scarce: Vec<usize> = (0..self.n.len()).collect();
        scarce.sort_by(|a, b| self.n[*a].total_cmp(&self.n[*b]));
        let (mut rows, mut done) = (changes.to_vec(), 0);
        for species in scarce {
            let size = |row: &Vec<f64>| row[species].abs();
            let Some(pivot) = (done..rows.len()).max_by(|a, b| size(&rows[*a]).total_cmp(&size(&rows[*b]))) else {
                break;
            };
            if size(&rows[pivot]) < NOTHING {
                continue;
            }
            rows.swap(done, pivot);
            let by = rows[done][species];
            rows[done].iter_mut().for_each(|nu| *nu /= by);
            let own = rows[done].clone();
            for (_, row) in rows.iter_mut().enumerate().filter(|(at, _)| *at != done) {
                let times = row[species];
                if times != 0.0 {
                    row.iter_mut().zip(&own).for_each(|(nu, own)| *nu -= times * own);
                    row.iter_mut().filter(|nu| nu.abs() < NOTHING).for_each(|nu| *nu = 0.0);
                }
            }
            done += 1;
        }
        rows.truncate(done);
        rows
    }

    /// Brings all reactions to equilibrium; gives false where they did not settle.
    pub fn settle(&mut self, changes: &[Vec<f64>]) -> bool {
        let scale: f64 = self.n.iter().sum();
        let pairs = pairs(changes);
        for _ in 0..SWEEPS {
            let mut moved = 0.0_f64;
            for nu in self.rewritten(changes).iter().chain(&pairs) {
                let extent = self.extent(nu);
                for (n, nu) in self.n.iter_mut().zip(nu) {
                    *n = (*n + nu * extent).max(0.0);
                }
                moved = moved.max(extent.abs());
            }
            if moved <= SETTLED * scale {
                return true;
            }
        }
        false
    }
}

/// Every two of the reactions, combined so that a species they share drops out.
fn pairs(changes: &[Vec<f64>]) -> Vec<Vec<f64>> {
    let mut pairs: Vec<Vec<f64>> = Vec::new();
    for (nth, one) in changes.iter().enumerate() {
        for other in &changes[..nth] {
            for (a, b) in one.iter().zip(other).filter(|(a, b)| **a != 0.0 && **b != 0.0) {
                let combined: Vec<f64> = one.iter().zip(other).map(|(x, y)| x * b - y * a).collect();
                if combined.iter().any(|nu| *nu != 0.0) {
                    pairs.push(combined);
                }
            }
        }
    }
    pairs
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn one_reaction_settles_where_its_quadratic_says() {
        // A2 -> 2 A at p: K = 4 x² p/(1 - x²), in closed form x = √(K/(K + 4 p)).
        for (k, p) in [(1.0, 1.0), (1e-8, 1.0), (1e6, 50.0), (0.3, 0.01)] {
            let ln_k = math::ln(k);
            let mut mixture =
                Mixture { n: vec![2.0, 0.0], gas: vec![true; 2], g_rt: vec![ln_k, 0.0], held: Held::Pressure(p) };
            assert!(mixture.settle(&[vec![-1.0, 2.0]]));
            let x = f64::sqrt(k / (k + 4.0 * p));
            // Bound: the extent is found to a few doubles of the bracket, which is 2 wide.
            assert!((mixture.n[1] / 4.0 - x).abs() < 1e-13, "{k} {p}: {} {x}", mixture.n[1] / 4.0);
        }
    }

    #[test]
    fn at_constant_volume_each_gas_has_its_own_pressure() {
        // A2 -> 2 A in a vessel: K = p(A)²/p(A2), p = n per_mole, solved as a quadratic in x.
        let (k, per_mole) = (0.5, 2.0);
        let mut mixture = Mixture {
            n: vec![1.0, 0.0],
            gas: vec![true; 2],
            g_rt: vec![math::ln(k), 0.0],
            held: Held::Volume(per_mole),
        };
        assert!(mixture.settle(&[vec![-1.0, 2.0]]));
        // 4 x² per_mole = k (1 - x)
        let (a, b) = (4.0 * per_mole, k);
        let x = (-b + f64::sqrt(b * b + 4.0 * a * b)) / (2.0 * a);
        assert!((mixture.n[1] / 2.0 - x).abs() < 1e-14, "{} {x}", mixture.n[1] / 2.0);
    }

    #[test]
    fn coupled_reactions_settle_where_each_is_at_equilibrium() {
        // A -> B + C and D -> E + C share C. Whatever order they are taken in, the same amounts come out, and each drive is 0.
        let g_rt = vec![0.0, 1.0, 0.5, 0.0, 0.3];
        let changes = [vec![-1.0, 1.0, 1.0, 0.0, 0.0], vec![0.0, 0.0, 1.0, -1.0, 1.0]];
        let settled = |order: [usize; 2]| {
            let mut mixture = Mixture {
                n: vec![1.0, 0.0, 0.0, 2.0, 0.0],
                gas: vec![true; 5],
                g_rt: g_rt.clone(),
                held: Held::Pressure(3.0),
            };
            assert!(mixture.settle(&order.map(|nth| changes[nth].clone())));
            for nu in &changes {
                assert!(mixture.drive(nu, 0.0).abs() < 1e-10, "{}", mixture.drive(nu, 0.0));
            }
            mixture.n
        };
        let (one, other) = (settled([0, 1]), settled([1, 0]));
        assert!(one.iter().zip(&other).all(|(a, b)| (a - b).abs() < 1e-11), "{one:?} {other:?}");
    }

    #[test]
    fn a_trace_that_two_reactions_share_does_not_hold_them_up() {
        // A = B + D and E = C + D with D a trace: together B + E = A + C, with K = 1 by the figures, so (A C)/(B E) = 1. From
        // B = E = 1 and A = C = 0 half of each goes, in closed form.
        let changes = [vec![-1.0, 1.0, 0.0, 1.0, 0.0], vec![0.0, 0.0, 1.0, 1.0, -1.0]];
        let g_rt = vec![0.0, 0.0, 0.0, 80.0, 0.0];
        let mut mixture =
            Mixture { n: vec![0.0, 1.0, 0.0, 0.0, 1.0], gas: vec![true; 5], g_rt, held: Held::Pressure(1.0) };
        assert!(mixture.settle(&changes));
        for n in [mixture.n[0], mixture.n[1], mixture.n[2], mixture.n[4]] {
            assert!((n - 0.5).abs() < 1e-12, "{:?}", mixture.n);
        }
    }

    #[test]
    fn what_only_condensed_species_hold_back_goes_to_an_end() {
        let mut mixture =
            Mixture { n: vec![1.0, 0.0], gas: vec![false; 2], g_rt: vec![0.0, -1.0], held: Held::Pressure(1.0) };
        assert!(mixture.settle(&[vec![-1.0, 1.0]]));
        assert_eq!(mixture.n, [0.0, 1.0]);
    }
}
