//! Heat capacities of one's own measurement: a weighted fit, or an interpolation that keeps the shape of the points.
//!
//! Fit:            Cp(T) = Σⱼ cⱼ (T/298.15 K)^nⱼ, Σ [Cpᵢ − Cp(Tᵢ)]²/uᵢ² least        u(cⱼ), r(cⱼ, cₖ) from R⁻¹R⁻ᵀ
//! Interpolation:  Cp(T) between the points, rising where they rise                   u from each point
//!
//! H(T) − H(298.15 K) = ∫ Cp dT and S(T) = S(298.15 K) + ∫ Cp/T dT, in closed form for both.
//!
//! | symbol | unit      | meaning                                                                        |
//! |--------|-----------|--------------------------------------------------------------------------------|
//! | Cpᵢ, uᵢ | J/(mol K) | measured heat capacity and its standard uncertainty, one row                   |
//! | nⱼ     | 1         | exponents of the terms                                                         |
//! | χ²     | 1         | Σ of squared residuals over uᵢ²; n − p, the degrees of freedom, is expected    |
//!
//! Assumes that the rows are independent of each other. Where no row states u, the scatter about the fit gives it, with n − p
//! degrees of freedom. The surprise: what goes on from a fit are its uncorrelated components (`num::lsq`), which is the
//! covariance of the coefficients without their cancellation.
//! Source: JCGM 100:2008, clauses 5.2 and H.3; Golub, Van Loan, Matrix Computations, 4th ed. (2013)
//! (from memory).

use std::rc::Rc;

use crate::fault::Fault;
use crate::model::card::Cx;
use crate::model::function::T_REFERENCE;
use crate::model::gather::Figure;
use crate::model::stated::entropy_dim;
use crate::model::thermo::{AtT, Thermo};
use crate::num::lsq::LeastSquares;
use crate::num::pchip::{Pchip, Traced};
use crate::num::powers::Power;
use crate::quantity::Quantity;
use crate::record::evaluation::Evaluation;
use crate::record::node::{Input, LeafKey, Node};
use crate::source::Citation;

use super::fit_error::FitError;

/// One measured heat capacity.
#[derive(Clone)]
pub struct Row {
    pub t_k: f64,
    pub cp: Quantity,
    /// Standard uncertainty, J/(mol K); `None` where the row states none.
    pub u: Option<f64>,
}

/// How Cp is taken from the rows.
#[derive(Clone)]
pub enum Way {
    Terms {
        exponents: Vec<f64>,
        solved: LeastSquares,
        /// The uncorrelated components of the fit as inputs.
        components: Vec<Rc<Node>>,
        /// What one component is uncertain by: 1 where the rows state u, else the scatter.
        sigma: f64,
        /// χ², where the rows state u.
        chi_square: Option<f64>,
    },
    Shape(Pchip),
}

/// A measured heat capacity as a substance that answers.
#[derive(Clone)]
pub struct Fit {
    /// Where the rows come from, in words: `cp.csv`.
    pub name: Rc<str>,
    pub rows: Rc<[Row]>,
    pub way: Way,
    /// Highest or lowest temperature to which it may be carried beyond the rows, K.
    pub beyond_k: Option<f64>,
    pub entropy_298: Option<Quantity>,
    pub formation: Option<Quantity>,
}

/// The basis of the terms at T, and its integrals.
fn basis(exponents: &[f64], of: impl Fn(Power) -> f64) -> Vec<f64> {
    exponents
        .iter()
        .map(|&exponent| of(Power { exponent, factor: Power { exponent, factor: 1.0 }.value(1.0 / T_REFERENCE) }))
        .collect()
}

/// The terms at one temperature, as a row of the problem.
pub fn terms_at(exponents: &[f64], t_k: f64) -> Vec<f64> {
    basis(exponents, |power| power.value(t_k))
}

/// The components of a solved fit as inputs.
///
/// # Errors
/// One is not finite.
pub fn components(
    cx: &Cx,
    name: &str,
    solved: &LeastSquares,
    (sigma, dof): (f64, Option<f64>),
    citation: &Citation,
) -> Result<Vec<Rc<Node>>, Fault> {
    let count = solved.components().len();
    let mut nodes = Vec::with_capacity(count);
    for (nth, &z) in (1..).zip(solved.components()) {
        let evaluation = Evaluation { dof, ..Evaluation::UNSTATED };
        let input = Input {
            u: Some(sigma),
            evaluated: evaluation.kept(),
            label: Some(format!("heat capacity fitted to {name}, component {nth} of {count}").into()),
            citation: Some(citation.clone()),
            ..Input::of(LeafKey::Typed { place: cx.place.clone(), ordinal: cx.next_ordinal() })
        };
        let dim = if dof.is_some() { entropy_dim() } else { crate::units::Dimension::none() };
        nodes.push(Rc::clone(Quantity::input(z, dim, crate::units::Kind::PLAIN, input, cx.place.clone())?.node()));
    }
    Ok(nodes)
}

/// What is asked at one temperature.
enum Asked {
    Cp(f64),
    Slope(f64),
    /// ∫ Cp dT, or ∫ Cp/T dT, from 298.15 K.
    Integral(f64, bool),
}

impl Fit {
    /// Lowest and highest measured temperature, K.
    pub fn measured(&self) -> (f64, f64) {
        let t = || self.rows.iter().map(|row| row.t_k);
        (t().fold(f64::INFINITY, f64::min), t().fold(f64::NEG_INFINITY, f64::max))
    }

    /// Cp of the fit at T, in J/(mol K), wherever T is.
    pub fn cp(&self, t_k: f64) -> f64 {
        self.figure(&Asked::Cp(t_k)).si
    }

    /// The interpolation through the same rows, where they allow one.
    pub fn by_shape(&self) -> Option<Fit> {
        let way = Way::Shape(shape(&self.rows)?);
        Some(Fit { way, ..self.clone() })
    }

    /// Degrees of freedom of a fit.
    pub fn freedom(&self) -> usize {
        match &self.way {
            Way::Terms { exponents, .. } => self.rows.len() - exponents.len(),
            Way::Shape(_) => 0,
        }
    }

    /// The same with entropy and formation enthalpy of what it stands for, unless its author gave them.
    #[must_use]
    pub fn standing_for(&self, entropy_298: Option<Quantity>) -> Fit {
        Fit { entropy_298: self.entropy_298.clone().or(entropy_298), ..self.clone() }
    }

    fn figure(&self, asked: &Asked) -> Figure {
        match &self.way {
            Way::Terms { exponents, solved, components, .. } => {
                let phi = match *asked {
                    Asked::Cp(t_k) => basis(exponents, |power| power.value(t_k)),
                    Asked::Slope(t_k) => basis(exponents, |power| power.slope(t_k)),
                    Asked::Integral(t_k, false) => {
                        basis(exponents, |power| power.integral(t_k) - power.integral(T_REFERENCE))
                    }
                    Asked::Integral(t_k, true) => {
                        basis(exponents, |power| power.integral_over_x(t_k) - power.integral_over_x(T_REFERENCE))
                    }
                };
                let weights = solved.weights(&phi);
                let si = weights.iter().zip(components).map(|(weight, node)| weight * node.si()).sum();
                Figure::of_nodes(si, components.iter().cloned().zip(weights))
            }
            Way::Shape(pchip) => {
                let traced: Traced = match *asked {
                    Asked::Cp(t_k) => pchip.value(t_k),
                    Asked::Slope(t_k) => pchip.slope(t_k),
                    Asked::Integral(t_k, over_t) => pchip.integral(T_REFERENCE, t_k, over_t),
                };
                let nodes = self.rows.iter().map(|row| Rc::clone(row.cp.node())).zip(traced.partials);
                Figure::of_nodes(traced.value, nodes.filter(|(_, weight)| *weight != 0.0))
            }
        }
    }
}

/// The interpolation through rows in order of temperature; at least three, no temperature twice.
pub fn shape(rows: &[Row]) -> Option<Pchip> {
    let ascends = rows.windows(2).all(|pair| pair[0].t_k < pair[1].t_k);
    (rows.len() >= 3 && ascends)
        .then(|| Pchip::new(rows.iter().map(|row| row.t_k).collect(), rows.iter().map(|row| row.cp.si()).collect()))
}

impl Thermo for Fit {
    fn range_k(&self) -> (f64, f64) {
        let (low, high) = self.measured();
        let beyond = self.beyond_k.unwrap_or(low);
        (low.min(beyond), high.max(beyond))
    }

    fn at(&self, _: &Cx, t_k: f64) -> Result<AtT, Fault> {
        let (low, high) = self.range_k();
        // Increments count from 298.15 K, so they run to there as well.
        if !(low <= T_REFERENCE && T_REFERENCE <= high) {
            return Err(FitError::Reference { name: self.name.to_string(), low, high }.into());
        }
        let since = self.figure(&Asked::Integral(t_k, true));
        let entropy = self.entropy_298.as_ref().map(|s_298| {
            let start = Figure::of_nodes(s_298.si(), [(Rc::clone(s_298.node()), 1.0)]);
            Figure::combined(&[(&start, 1.0), (&since, 1.0)])
        });
        Ok(AtT {
            cp: self.figure(&Asked::Cp(t_k)),
            increment: self.figure(&Asked::Integral(t_k, false)),
            entropy,
            cp_slope: self.figure(&Asked::Slope(t_k)).si,
        })
    }

    fn formation(&self) -> Option<Figure> {
        let given = self.formation.as_ref()?;
        Some(Figure::of_nodes(given.si(), [(Rc::clone(given.node()), 1.0)]))
    }

    fn fit(&self) -> Option<&Fit> {
        Some(self)
    }
}
