//! Figures of a function whose author states uncertainties: of its entropy at 298.15 K, and of Cp as one factor for all T.
//!
//! ΔH = f ∫ Cp dT and S(T) = S(298.15 K) + f ∫ Cp/T dT, with f = 1 ± u. One factor is one input at every temperature, so
//! what it brings to H and to S stays together in G, and cancels in differences.

use std::rc::Rc;

use crate::data::function::Function;
use crate::data::substance::Substance;
use crate::fault::Fault;
use crate::model::function::{self, T_REFERENCE};
use crate::model::gather::{self, Contribution, Figure, FigureOrigin};
use crate::quantity::Quantity;
use crate::record::evaluation::Evaluation;
use crate::record::node::{Input, LeafKey, Node};
use crate::units::{Base, Dimension, Entity, Kind};

fn per_mole(dim: &Dimension) -> Dimension {
    dim.over(&Dimension::amount(Entity::OPEN))
}

pub(super) fn energy_dim() -> Dimension {
    per_mole(&Dimension::whole([2, 1, -2, 0, 0, 0]))
}

pub(super) fn entropy_dim() -> Dimension {
    energy_dim().over(&Dimension::base(Base::Kelvin))
}

/// The same contribution, with what the function's author states.
///
/// # Errors
/// A figure is not finite.
pub(super) fn applied(of: Contribution, function: &Function, record: &Substance) -> Result<Contribution, Fault> {
    let stated = &function.stated;
    if stated.entropy_298.is_none() && stated.cp_relative_u.is_none() {
        return Ok(of);
    }
    let increment = of.increment.map(|figure| scaled(figure, function, record, energy_dim())).transpose()?;
    let cp = of.cp.map(|figure| scaled(figure, function, record, entropy_dim())).transpose()?;
    let entropy = match (of.entropy, &stated.entropy_298) {
        (Some(figure), Some(datum)) if function.covers(T_REFERENCE) => {
            let key = LeafKey::Datum {
                dataset: function.dataset.shared(),
                record: record.species.id.clone(),
                field: gather::ENTROPY,
                t_bits: 0,
                way: "",
            };
            let evaluation = Evaluation { shape: datum.shape, dof: datum.dof, correlation: None };
            let citation = Some(function.citation.clone());
            let digit = Some(datum.last_place);
            let input = Input { u: datum.u, evaluated: evaluation.kept(), digit, citation, ..Input::of(key) };
            let anchor = Quantity::input(datum.value, entropy_dim(), Kind::PLAIN, input, None)?;
            let s_298 = function::evaluate(function, T_REFERENCE).s;
            let since = Figure { si: figure.si - s_298, ..figure.clone() };
            let mut nodes = vec![(Rc::clone(anchor.node()), 1.0)];
            if since.si != 0.0 {
                match scaled(since, function, record, entropy_dim())?.origin {
                    FigureOrigin::Nodes(more) => nodes.extend(more),
                    FigureOrigin::Input(input) => nodes.push((leaf(figure.si - s_298, *input)?, 1.0)),
                }
            }
            Some(Figure::of_nodes(figure.si, nodes))
        }
        (figure, _) => figure,
    };
    Ok(Contribution { increment, cp, entropy, ..of })
}

/// A figure drawn from the function, times the factor that Cp is uncertain by.
///
/// # Errors
/// A figure is not finite.
pub(super) fn scaled(figure: Figure, function: &Function, record: &Substance, dim: Dimension) -> Result<Figure, Fault> {
    let (Some(u), FigureOrigin::Input(input)) = (function.stated.cp_relative_u, &figure.origin) else {
        return Ok(figure);
    };
    let key = LeafKey::Datum {
        dataset: function.dataset.shared(),
        record: record.species.id.clone(),
        field: gather::HEAT_CAPACITY,
        t_bits: 0,
        way: "as a whole",
    };
    let factor = Input { u: Some(u), citation: Some(function.citation.clone()), ..Input::of(key) };
    let factor = Quantity::input(1.0, Dimension::none(), Kind::PLAIN, factor, None)?;
    // All that is said of its uncertainty is in the factor.
    let drawn = Input { u: Some(0.0), ..Input::clone(input) };
    let drawn = Quantity::input(figure.si, dim, Kind::PLAIN, drawn, None)?;
    Ok(Figure::of_nodes(figure.si, [(Rc::clone(drawn.node()), 1.0), (Rc::clone(factor.node()), figure.si)]))
}

fn leaf(si: f64, input: Input) -> Result<Rc<Node>, Fault> {
    Ok(Rc::clone(Quantity::input(si, entropy_dim(), Kind::PLAIN, input, None)?.node()))
}
