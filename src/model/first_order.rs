//! The heat capacity taken to first order about a temperature of one's choice: a Taylor expansion of H that stops there.
//!
//! H(T) − H(298.15 K) = [H(T₀) − H(298.15 K)] + Cp(T₀) (T − T₀)       S(T) = S(T₀) + Cp(T₀) ln(T/T₀)
//!
//! | symbol | unit      | meaning                                                                      |
//! |--------|-----------|------------------------------------------------------------------------------|
//! | T₀     | K         | where the expansion starts; what stands in square brackets is exact there    |
//! | Cp     | J/(mol K) | heat capacity at T₀, held between T₀ and T                                   |
//!
//! About 298.15 K it is the heat capacity held at its value there. The surprise: its figures are sums of two inputs, the full
//! integral to T₀ and Cp at T₀, so that what they share with other values cancels as it should.
//! Source: definition of Cp; Taylor's theorem (from memory).

use smallvec::SmallVec;

use crate::data::dataset::DatasetId;
use crate::fault::Fault;
use crate::model::card::Cx;
use crate::model::gather::{self, Contribution, Figure, HeatCapacity, Slopes};
use crate::model::property::{self, Property};
use crate::model::terms::Term;
use crate::num::math;

/// What a term contributes at `t_k` by an expansion about `about_k`.
///
/// # Errors
/// A figure is missing at either temperature: an expansion is no leave to go beyond the data.
pub(super) fn contribution(
    term: &Term,
    dataset: &DatasetId,
    t_k: f64,
    about_k: f64,
    cx: &Cx,
) -> Result<Contribution, Fault> {
    let at = |t_k| gather::contribution(term, dataset, t_k, HeatCapacity::Full, cx);
    let (there, start) = (at(t_k)?, at(about_k)?);
    let Some(cp) = start.cp else { return Ok(there) };
    let (span, ln_ratio) = (t_k - about_k, math::ln(t_k / about_k));
    let increment = start.increment.as_ref();
    let increment = sum(increment.map(|own| (own, 1.0, Property::H)), (&cp, span, Property::Cp))?;
    let entropy = match &start.entropy {
        Some(own) => Some(sum(Some((own, 1.0, Property::S)), (&cp, ln_ratio, Property::Cp))?),
        None => None,
    };
    let slopes = Slopes { increment: cp.si, entropy: cp.si / t_k, cp: 0.0 };
    let (nu, formation) = (start.nu, start.formation);
    Ok(Contribution { nu, formation, increment: Some(increment), entropy, cp: Some(cp), slopes })
}

/// A weighted sum; the property says which dimension a figure has.
fn sum(first: Option<(&Figure, f64, Property)>, second: (&Figure, f64, Property)) -> Result<Figure, Fault> {
    let (mut si, mut nodes) = (0.0, SmallVec::new());
    for (figure, weight, property) in first.into_iter().chain([second]) {
        si += weight * figure.si;
        property::enter(&mut nodes, figure, weight, property)?;
    }
    Ok(Figure::of_nodes(si, nodes))
}
