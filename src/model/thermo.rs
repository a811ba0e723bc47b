//! Whatever else may stand in a reaction beside a record of the shipped tables.
//!
//! [`Thermo`] is what a molecule, a crystal or a fit to one's own measurements answers, per mole of it and in one phase.
//! The surprise: its figures are made of nodes, not printed ones, so that the uncertainty of its inputs and the
//! assumptions of the steps that computed them reach every reaction it stands in.

use std::rc::Rc;

use smallvec::SmallVec;

use crate::data::dataset::DatasetId;
use crate::fault::Fault;
use crate::model::card::Cx;
use crate::model::fit::Fit;
use crate::model::gather::{Figure, FigureOrigin};
use crate::record::node::Node;

/// A substance that is not a record of a table.
pub trait Thermo {
    /// Lowest and highest temperature at which it answers, K.
    fn range_k(&self) -> (f64, f64);

    /// What it says at a temperature within its range.
    ///
    /// # Errors
    /// It cannot be computed there.
    fn at(&self, cx: &Cx, t_k: f64) -> Result<AtT, Fault>;

    /// Its formation enthalpy at 298.15 K, J/mol, where its author gave one.
    fn formation(&self) -> Option<Figure>;

    /// The fit it is, for what is asked of fits alone.
    fn fit(&self) -> Option<&Fit> {
        None
    }

    /// The one dataset beside which that formation enthalpy may stand; `None`: any.
    fn dataset(&self) -> Option<&DatasetId> {
        None
    }

    /// How it differs from the standard state, in words; `None` where it does not.
    fn condition(&self) -> Option<String> {
        None
    }
}

/// What one mole of a substance has at T.
pub struct AtT {
    /// J/(mol K)
    pub cp: Figure,
    /// H(T) - H(298.15 K), J/mol
    pub increment: Figure,
    /// J/(mol K), p° = 1 bar; `None` where it is not known.
    pub entropy: Option<Figure>,
    /// dCp/dT, J/(mol K²)
    pub cp_slope: f64,
}

impl Figure {
    /// A figure that follows from nodes: its value, and its derivatives with respect to them.
    pub fn of_nodes(si: f64, nodes: impl IntoIterator<Item = (Rc<Node>, f64)>) -> Figure {
        Figure { si, origin: FigureOrigin::Nodes(nodes.into_iter().collect()), printed: None }
    }

    /// The sum of some nodes.
    pub(super) fn sum_of_nodes(nodes: impl IntoIterator<Item = Rc<Node>>) -> Figure {
        let nodes: SmallVec<[(Rc<Node>, f64); 2]> = nodes.into_iter().map(|node| (node, 1.0)).collect();
        Figure::of_nodes(nodes.iter().map(|(node, _)| node.si()).sum(), nodes)
    }

    /// A weighted sum of figures that are made of nodes.
    pub(super) fn combined(parts: &[(&Figure, f64)]) -> Figure {
        let mut nodes: SmallVec<[(Rc<Node>, f64); 2]> = SmallVec::new();
        for (figure, weight) in parts {
            if let FigureOrigin::Nodes(own) = &figure.origin {
                nodes.extend(own.iter().map(|(node, slope)| (Rc::clone(node), slope * weight)));
            }
        }
        Figure::of_nodes(parts.iter().map(|(figure, weight)| weight * figure.si).sum(), nodes)
    }
}

#[cfg(test)]
mod tests {
    use std::cell::Cell;

    use super::*;
    use crate::model::card::References;
    use crate::model::gather::{HeatCapacity, Method};
    use crate::model::property::{self, Property};
    use crate::model::terms::{Term, Terms};
    use crate::num::math;
    use crate::quantity::text;
    use crate::units::{Entity, constants};

    /// An invented gas with Cp = c·T, H = c(T² − 298.15²)/2 and S = c·T, whose formation enthalpy was typed.
    struct Linear {
        c: f64,
        formation: Option<Rc<Node>>,
    }

    impl Thermo for Linear {
        fn range_k(&self) -> (f64, f64) {
            (250.0, 2000.0)
        }

        fn at(&self, _: &Cx, t_k: f64) -> Result<AtT, Fault> {
            let figure = |si| Figure::of_nodes(si, []);
            Ok(AtT {
                cp: figure(self.c * t_k),
                increment: figure(self.c * (t_k * t_k - 298.15 * 298.15) / 2.0),
                entropy: Some(figure(self.c * t_k)),
                cp_slope: self.c,
            })
        }

        fn formation(&self) -> Option<Figure> {
            let node = self.formation.as_ref()?;
            Some(Figure::of_nodes(node.si(), [(Rc::clone(node), 1.0)]))
        }
    }

    fn with_gas<T>(formation: Option<&str>, work: impl FnOnce(&Cx, &Terms) -> T) -> T {
        let (references, ordinal) = (References::new(constants::current()), Cell::new(0));
        let cx = Cx { references: &references, place: None, ordinal: &ordinal, halted: &|| None };
        let formation = formation.map(|written| Rc::clone(text::parse(written, None, 0).unwrap().node()));
        let own: Rc<dyn Thermo> = Rc::new(Linear { c: 0.1, formation });
        let term = |id: &str, nu| Term::of_tables(cx.data().find(id).unwrap(), nu);
        let terms =
            vec![Term { own: Some(own), ..term("CH4(g)", 1.0) }, term("C(cr,graphite)", -1.0), term("H2(g)", -2.0)];
        work(&cx, &Terms::new(terms, Entity::RXN, "invented".to_owned()))
    }

    #[test]
    fn a_substance_of_ones_own_stands_in_a_reaction_by_every_method() {
        let (t_k, cp_0) = (700.0, 0.1 * 298.15);
        let (span, ln_ratio) = (t_k - 298.15, math::ln(t_k / 298.15));
        let (h, s) = (0.1 * (t_k * t_k - 298.15 * 298.15) / 2.0, 0.1 * t_k);
        let middle = 0.1 * 0.5 * (t_k + 298.15);
        let expected = [
            (HeatCapacity::Full, h, s),
            (HeatCapacity::Constant, cp_0 * span, cp_0 + cp_0 * ln_ratio),
            // Cp is linear in T, so the value half-way and the mean of the ends give the integral of Cp itself.
            (HeatCapacity::Midpoint, h, cp_0 + middle * ln_ratio),
            (HeatCapacity::Mean, h, cp_0 + middle * ln_ratio),
            (HeatCapacity::Neglected, 0.0, cp_0),
        ];
        with_gas(Some("-70.00(5) kJ/mol"), |cx, terms| {
            let only = Terms::new(vec![terms.terms()[0].clone()], Entity::RXN, "invented".to_owned());
            for (heat_capacity, h, s) in expected {
                let method = Method { heat_capacity, ..Method::from_words(None, None, cx.data()).unwrap() };
                let at = |property| property::number(property, &only, t_k, &method, cx).unwrap();
                // Bound: rounding of sums near 7e4.
                assert!((at(Property::H) - (-70_000.0 + h)).abs() < 1e-9, "{heat_capacity:?}");
                assert!((at(Property::S) - s).abs() < 1e-12, "{heat_capacity:?}");
                assert!((at(Property::G) - (-70_000.0 + h - t_k * s)).abs() < 1e-9, "{heat_capacity:?}");
            }
        });
    }

    #[test]
    fn without_its_formation_enthalpy_it_has_no_reaction_enthalpy() {
        with_gas(None, |cx, terms| {
            let method = Method::from_words(None, None, cx.data()).unwrap();
            let fault = property::number(Property::H, terms, 700.0, &method, cx).unwrap_err();
            assert_eq!(fault.code(), "formation-not-covered");
        });
    }

    #[test]
    fn beyond_its_range_it_is_refused() {
        with_gas(Some("-70 kJ/mol"), |cx, terms| {
            let method = Method::from_words(None, None, cx.data()).unwrap();
            let fault = property::number(Property::H, terms, 2001.0, &method, cx).unwrap_err();
            assert_eq!(fault.code(), "temperature-out-of-range");
            assert!(fault.message().contains("2000 K"), "{fault}");
        });
    }
}
