//! Vapours whose molecules pair: the equilibrium of a vapour with its dimer, at T and the standard pressure.
//!
//! 2 M(g) ⇌ D(g)       K = exp(−ΔG°/RT)       x = 2/(1 + √(1 + 4K))       n = (1 − x)/(2 − x)
//! H − H(M) = n ΔH°       G − G(M) = RT ln x       S − S(M) = [n ΔH° − RT ln x]/T
//! Cp − Cp(M) = n ΔCp° + ΔH° dn/dT
//!
//! | symbol | unit      | meaning                                                                     |
//! |--------|-----------|-----------------------------------------------------------------------------|
//! | Δ      |           | of D less twice M, by the functions of both                                 |
//! | x      | 1         | mole fraction of M among the molecules that are there                       |
//! | n      | 1         | moles of D per mole of M as written; 2n of it is in pairs                   |
//! | H, G   | J/mol     | of the vapour as it is, per mole of M as written; G is RT ln x off, since the |
//! |        |           | chemical potential of the unpaired M is that of all of it                   |
//! | S, Cp  | J/(mol K) | the same                                                                    |
//!
//! Molecules of both sorts are taken as ideal gases. The surprise: K° of a reaction is defined for the unpaired vapour, so
//! nothing of this concerns it.
//! Source: equilibrium of ideal gases; JANAF Thermochemical Tables on associating vapours (both from memory).

use std::rc::Rc;
use std::sync::Arc;

use smallvec::SmallVec;

use crate::data::catalog::Catalog;
use crate::data::dataset::DatasetId;
use crate::data::substance::Substance;
use crate::fault::Fault;
use crate::model::card::Cx;
use crate::model::function;
use crate::model::gather::{self, Contribution, Figure, HeatCapacity};
use crate::model::property::{self, Property};
use crate::model::terms::Term;
use crate::model::thermo::{AtT, Thermo};
use crate::num::math;
use crate::quantity::Quantity;
use crate::record::node::{Input, LeafKey, Node};
use crate::units::{Entity, Kind};

/// Vapours that pair, with their dimers on record. Chemically different molecules of twice the composition, such as ethane
/// beside methyl, are no association.
const DIMERS: [(&str, &str); 3] =
    [("acetic acid(g)", "acetic acid dimer(g)"), ("formic acid(g)", "formic acid dimer(g)"), ("NO2(g)", "N2O4(g)")];

/// Vapours known to associate, of whose associated forms no function is shipped.
const WITHOUT_RECORD: [&str; 3] = ["HF(g)", "AlCl3(g)", "NaCl(g)"];

/// What is on record of how a vapour associates.
pub enum Associates {
    No,
    WithoutRecord,
    Into(Arc<Substance>),
}

/// Whether a substance is a vapour that associates.
pub fn of(substance: &Substance, data: &Catalog) -> Associates {
    if WITHOUT_RECORD.contains(&substance.id()) {
        return Associates::WithoutRecord;
    }
    match DIMERS.iter().find(|(monomer, _)| *monomer == substance.id()) {
        Some((_, dimer)) => data.find(dimer).map_or(Associates::WithoutRecord, Associates::Into),
        None => Associates::No,
    }
}

/// The vapour as it is at T and the standard pressure, less the unpaired vapour, per mole of it as written.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Pairing {
    /// Moles of dimer.
    pub n: f64,
    /// J/mol
    pub h: f64,
    /// J/mol
    pub g: f64,
    /// J/(mol K)
    pub s: f64,
    /// J/(mol K)
    pub cp: f64,
}

impl Pairing {
    /// `r` in J/(mol K). `None` where a function does not reach T.
    pub fn at(monomer: &Substance, dimer: &Substance, t_k: f64, r: f64) -> Option<Pairing> {
        let reaches = |substance: &Substance| {
            let function = substance.function.as_ref().filter(|function| function.covers(t_k));
            function.map(|function| function::evaluate(function, t_k))
        };
        let (one, two) = (reaches(monomer)?, reaches(dimer)?);
        let (dh, ds, dcp) = (two.h - 2.0 * one.h, two.s - 2.0 * one.s, two.cp - 2.0 * one.cp);
        let rt = r * t_k;
        let k = math::exp(-(dh - t_k * ds) / rt);
        let x = 2.0 / (1.0 + f64::sqrt(1.0 + 4.0 * k));
        let n = (1.0 - x) / (2.0 - x);
        // K x² + x = 1, so dx/dK = −x²/(1 + 2Kx); dK/dT = K ΔH/(RT²).
        let by_t = k * dh / (rt * t_k) * (x * x / (1.0 + 2.0 * k * x)) / ((2.0 - x) * (2.0 - x));
        let (h, g) = (n * dh, rt * math::ln(x));
        Some(Pairing { n, h, g, s: (h - g) / t_k, cp: n * dcp + dh * by_t })
    }
}

/// A vapour as it is at one temperature, in place of the unpaired one in a property.
pub struct Paired {
    unpaired: Term,
    dataset: DatasetId,
    /// Of the unpaired vapour in that dataset.
    formation: Figure,
    pairing: Pairing,
    dimer: Arc<Substance>,
    t_k: f64,
    /// What the enthalpy scale is moved by, J/mol: also by the moles of gas lost, where the property counts pV.
    shift: f64,
    /// Whether Cp is taken as it is at T; a heat capacity held from elsewhere has no share in the equilibrium.
    in_full: bool,
}

impl Paired {
    pub fn new(
        unpaired: &Term,
        dimer: Arc<Substance>,
        pairing: Pairing,
        dataset: DatasetId,
        t_k: f64,
        (property, mode): (Property, HeatCapacity),
        cx: &Cx,
    ) -> Paired {
        // S and Cp contain no formation enthalpy, and none is looked up for them.
        let formation = match property.uses_formation() {
            true => gather::term_formation(unpaired, &dataset, cx.data())
                .unwrap_or_else(|| unreachable!("the dataset was found to have it")),
            false => Figure::of_nodes(0.0, []),
        };
        let r = cx.constants().molar_gas.value;
        // Of n dimers n molecules are lost, and Δn(gas) R T counts them as if they were there.
        let lost = if property.uses_gas_law() { pairing.n * r * t_k } else { 0.0 };
        let (unpaired, shift, in_full) = (unpaired.clone(), pairing.h + lost, mode == HeatCapacity::Full);
        let unpaired = Term { nu: 1.0, ..unpaired };
        Paired { unpaired, dataset, formation, pairing, dimer, t_k, shift, in_full }
    }

    fn plain(&self, cx: &Cx, t_k: f64) -> Result<Contribution, Fault> {
        gather::contribution(&self.unpaired, &self.dataset, t_k, HeatCapacity::Full, cx)
    }

    /// What pairing changes, as an input of its own: the functions of the dimer state no uncertainty.
    fn changed(&self, si: f64, way: &'static str, property: Property) -> Result<Rc<Node>, Fault> {
        let dim = property::dimension(property, Entity::OPEN);
        let key = LeafKey::Datum {
            dataset: self.dimer.function.as_ref().map_or_else(|| "".into(), |function| function.dataset.shared()),
            record: self.unpaired.substance.species.id.clone(),
            field: "association",
            t_bits: self.t_k.to_bits(),
            way,
        };
        let citation = self.dimer.function.as_ref().map(|function| function.citation.clone());
        let digit = Some(if matches!(property, Property::S | Property::Cp) { 0.001 } else { 1.0 });
        let input = Input { digit, citation, ..Input::of(key) };
        Ok(Rc::clone(Quantity::input(si, dim, Kind::PLAIN, input, None)?.node()))
    }

    fn sum(&self, plain: &Figure, property: Property, change: Option<(f64, &'static str)>) -> Result<Figure, Fault> {
        let mut nodes = SmallVec::new();
        property::enter(&mut nodes, plain, 1.0, property)?;
        let mut si = plain.si;
        if let Some((by, way)) = change {
            si += by;
            nodes.push((self.changed(by, way, property)?, 1.0));
        }
        Ok(Figure::of_nodes(si, nodes))
    }
}

impl Thermo for Paired {
    fn range_k(&self) -> (f64, f64) {
        self.unpaired.substance.function.as_ref().map_or((self.t_k, self.t_k), |f| (f.t_min, f.t_max))
    }

    fn at(&self, cx: &Cx, t_k: f64) -> Result<AtT, Fault> {
        let plain = self.plain(cx, t_k)?;
        let none = || Figure::of_nodes(0.0, []);
        let cp = plain.cp.unwrap_or_else(none);
        let here = self.in_full && t_k == self.t_k;
        let entropy = match &plain.entropy {
            Some(own) => Some(self.sum(own, Property::S, Some((self.pairing.s, "entropy")))?),
            None => None,
        };
        Ok(AtT {
            cp: self.sum(&cp, Property::Cp, here.then_some((self.pairing.cp, "heat capacity")))?,
            increment: plain.increment.unwrap_or_else(none),
            entropy,
            cp_slope: plain.slopes.cp,
        })
    }

    fn dataset(&self) -> Option<&DatasetId> {
        Some(&self.dataset)
    }

    fn condition(&self) -> Option<String> {
        Some(format!("{} in equilibrium with {}", self.unpaired.substance.id(), self.dimer.id()))
    }

    fn formation(&self) -> Option<Figure> {
        // The whole change of enthalpy stands here, since an increment from 298.15 K is none at 298.15 K itself.
        self.sum(&self.formation, Property::H, Some((self.shift, "enthalpy"))).ok()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const R: f64 = 8.314_462_618;

    fn pairing(monomer: &str, dimer: &str, t_k: f64) -> Pairing {
        let data = Catalog::shipped();
        Pairing::at(&data.find(monomer).unwrap(), &data.find(dimer).unwrap(), t_k, R).unwrap()
    }

    #[test]
    fn nitrogen_dioxide_pairs_as_its_equilibrium_constant_has_it() {
        // K°(2 NO2 = N2O4) at 298.15 K is 6.75, from ΔrG° = -4.73 kJ/mol of the NBS tables of 1982 (from memory); so the mole
        // fraction of NO2 at 1 bar is 0.32. Bound: 0.3 kJ/mol between tables, which moves x by 0.015.
        let found = pairing("NO2(g)", "N2O4(g)", 298.15);
        let x = (1.0 - 2.0 * found.n) / (1.0 - found.n);
        let wanted = 2.0 / (1.0 + f64::sqrt(1.0 + 4.0 * 6.75));
        assert!((x - wanted).abs() < 0.015, "{x} and {wanted}");
    }

    #[test]
    fn the_changes_obey_the_laws_of_an_equilibrium() {
        // Central differences over 0.02 K are off by h²/6 of a third derivative, below 1e-6 relative here.
        for (monomer, dimer) in DIMERS {
            for t_k in [320.0, 450.0, 600.0] {
                let at = |t| pairing(monomer, dimer, t);
                let (low, here, high) = (at(t_k - 0.01), at(t_k), at(t_k + 0.01));
                let close = |what: &str, got: f64, wanted: f64| {
                    assert!(
                        (got - wanted).abs() < 1e-5 * (1.0 + wanted.abs()),
                        "{monomer} {t_k} K {what}: {got} {wanted}"
                    );
                };
                close("(∂G/∂T)p = -S", (high.g - low.g) / 0.02, -here.s);
                close("(∂H/∂T)p = Cp", (high.h - low.h) / 0.02, here.cp);
                close("G = H - TS", here.h - t_k * here.s, here.g);
                // The vapour settles where G is least: more or less pairing costs. Per mole of M, m free and n pairs.
                let data = Catalog::shipped();
                let g = |id: &str| {
                    let substance = data.find(id).unwrap();
                    function::evaluate(substance.function.as_ref().unwrap(), t_k).g(t_k)
                };
                let (one, two) = (g(monomer), g(dimer));
                let total = |n: f64| {
                    let (m, all) = (1.0 - 2.0 * n, 1.0 - n);
                    let mixing = m * math::ln(m / all) + n * math::ln(n / all);
                    m * one + n * two + R * t_k * mixing - one
                };
                close("least G", total(here.n), here.g);
                assert!(total(here.n * 0.99) > here.g && total(here.n * 1.01) > here.g, "{monomer} at {t_k} K");
            }
        }
    }
}
