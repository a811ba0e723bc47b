//! The characteristic temperature that a crystal's measured heat capacity tells.
//!
//! min over θ of Σ w [R n d(θ/T) − Cv]²     w = 1/u² where every point states its u, else 1
//! ∂θ/∂Cv(i) = w g(i) / Σ w g²     g = R n ∂d(θ/T)/∂θ
//!
//! | symbol | unit      | meaning                                                   |
//! |--------|-----------|-----------------------------------------------------------|
//! | n      | 1         | modes, 3 for each atom of the formula                     |
//! | d      | 1         | Debye's or Einstein's function of one mode                |
//! | Cv     | J/(mol K) | measured; Cp less T V α²/κ and less γT of the electrons   |
//!
//! One point gives the θ that hits it. Source: least squares; as `solid/mod.rs` for the functions.

use std::rc::Rc;

use smallvec::SmallVec;

use crate::chem::formula::Formula;
use crate::fault::Fault;
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Takes, Value};
use crate::model::property;
use crate::model::solid::Spectrum;
use crate::model::solid::error::SolidError;
use crate::num::root;
use crate::quantity::{Quantity, round, text};
use crate::record::node::Node;
use crate::units::{Base, Dimension, Kind, What, parse as unit_parse, reader_text};

/// Where θ is looked for, K.
const SEARCHED: (f64, f64) = (0.1, 2e4);

const ARGS: &[Arg] = &[
    Arg { name: "formula", takes: Takes::Text, default: Default::Required, doc: "a formula, without phase: \"Cu\"" },
    Arg {
        name: "points",
        takes: Takes::Any,
        default: Default::Required,
        doc: "pairs of Cv and T, as in [[\"16.1 J/(K mol)\", \"100 K\"]]; a u that all state weights them",
    },
];

macro_rules! fit_card {
    ($name:ident, $id:literal, $script:literal, $who:literal, $spectrum:expr) => {
        pub static $name: Card = Card {
            id: $id,
            name: $script,
            on: On::Nothing,
            args: ARGS,
            gives: concat!("the ", $who, " temperature"),
            doc: concat!(
                "Fits a ",
                $who,
                " temperature to heat capacities at constant volume, by least squares, with the uncertainty that the points \
                 bring. The fit does not test the model: ask the crystal for its heat capacity at other temperatures."
            ),
            source: "least squares; P. Debye, Ann. Phys. 39, 789 (1912), A. Einstein, Ann. Phys. 22, 180 (1907) (from memory)",
            example: concat!($script, "(\"Cu\", [[\"16.1 J/(K mol)\", \"100 K\"], [\"22.6 J/(K mol)\", \"200 K\"]])"),
            claims: &[],
            alternatives: &[],
            run: |cx, call| fitted(cx, call, $spectrum),
            check_line: None,
            caution: None,
        };
    };
}

fit_card!(DEBYE_TEMPERATURE, "crystal.debye-temperature", "debye_temperature", "Debye", Spectrum::Debye);
fit_card!(EINSTEIN_TEMPERATURE, "crystal.einstein-temperature", "einstein_temperature", "Einstein", Spectrum::Einstein);

struct Point {
    cv: Quantity,
    t: Quantity,
    weight: f64,
}

fn fitted(cx: &Cx, call: &Rc<Call>, spectrum: Spectrum) -> Result<Value, Fault> {
    let formula = Formula::parse(call.text(0))?;
    let atoms: f64 = formula.composition().iter().map(|(_, count)| count.to_f64()).sum();
    let r = property::gas_constant(cx.constants());
    let limit = 3.0 * atoms * r.si();
    let points = points(cx, call)?;
    for point in &points {
        let (cv, t_k) = (point.cv.si(), point.t.si());
        if !(cv > 0.0 && cv < limit && t_k > 0.0) {
            let (crystal, given) = (formula.to_string(), round::shortest(cv));
            let limit = round::fixed(limit, 2);
            return Err(SolidError::NoTemperature { crystal, t_k, given, limit }.into());
        }
    }
    let share = |theta: f64, point: &Point| spectrum.share(theta / point.t.si());
    // ∂Cv/∂θ = −(bend)/θ, since d depends on θ/T alone.
    let slope = |theta: f64, point: &Point| -limit * share(theta, point).bend / theta;
    let downhill = |theta: f64| -> Result<f64, Fault> {
        let of = |point: &Point| point.weight * slope(theta, point) * (limit * share(theta, point).cv - point.cv.si());
        // Over the slopes' own size, which spans hundreds of powers of ten between hot and cold.
        let size: f64 = points.iter().map(|point| point.weight * slope(theta, point).abs()).sum();
        Ok(if size > 0.0 { points.iter().map(of).sum::<f64>() / size } else { -limit })
    };
    let found = root::bracketed(downhill, SEARCHED.0, SEARCHED.1, 1e-9)?;
    let Ok(found) = found else {
        let (crystal, given) = (formula.to_string(), round::shortest(points[0].cv.si()));
        let (t_k, limit) = (points[0].t.si(), round::fixed(limit, 2));
        return Err(SolidError::NoTemperature { crystal, t_k, given, limit }.into());
    };
    let theta = found.x;
    let curvature: f64 = points.iter().map(|point| point.weight * slope(theta, point) * slope(theta, point)).sum();
    let mut inputs: SmallVec<[(Rc<Node>, f64); 2]> = SmallVec::new();
    let mut by_r = 0.0;
    for point in &points {
        let by_cv = point.weight * slope(theta, point) / curvature;
        let at = share(theta, point);
        inputs.push((Rc::clone(point.cv.node()), by_cv));
        // The model's Cv moves with T and with R, and θ the other way.
        inputs.push((property::as_argument(&point.t), -by_cv * limit * at.bend / point.t.si()));
        by_r -= by_cv * limit * at.cv / r.si();
    }
    inputs.push((Rc::clone(r.node()), by_r));
    let (dim, kind) = (Dimension::base(Base::Kelvin), Kind::of(What::OpenTemperature));
    let step = Rc::clone(call);
    Ok(Value::Quantity(Quantity::from_step(theta, dim, kind, inputs, step, cx.place.clone())?))
}

fn points(cx: &Cx, call: &Call) -> Result<Vec<Point>, Fault> {
    let sort = |given: &Value| -> Fault {
        let wanted = "pairs of Cv and T, as in [[\"16.1 J/(K mol)\", \"100 K\"]]";
        SolidError::Sort { key: "points".to_owned(), wanted, given: given.sort().to_owned() }.into()
    };
    let quantity = |value: &Value| match value {
        Value::Quantity(value) => Ok(value.clone()),
        Value::Text(written) => Ok(text::parse(written, cx.place.clone(), cx.next_ordinal())?),
        other => Err(sort(other)),
    };
    let Value::List(list) = &call.args[1] else { return Err(sort(&call.args[1])) };
    let mut points = Vec::with_capacity(list.len());
    for item in list {
        let Value::List(pair) = item else { return Err(sort(item)) };
        let [cv, t] = pair.as_slice() else { return Err(sort(item)) };
        let (cv, t) = (quantity(cv)?, quantity(t)?);
        let wanted = [("Cv", &cv, unit_parse::unit("J/(K mol)")?.dim), ("T", &t, unit_parse::unit("K")?.dim)];
        for (key, given, dim) in wanted {
            if given.dim().without_basis() != dim.without_basis() {
                let (key, given) = (key.to_owned(), reader_text(&given.unit()));
                let (wanted, example) =
                    ("a heat capacity per mole, and T a temperature", "`[\"16.1 J/(K mol)\", \"100 K\"]`");
                return Err(SolidError::Dimension { key, given, wanted, example }.into());
            }
        }
        points.push(Point { cv, t, weight: 1.0 });
    }
    if points.is_empty() {
        return Err(sort(&call.args[1]));
    }
    let stated: Option<Vec<f64>> = points.iter().map(|point| point.cv.spread().u().filter(|u| *u > 0.0)).collect();
    if let Some(stated) = stated {
        points.iter_mut().zip(stated).for_each(|(point, u)| point.weight = 1.0 / (u * u));
    }
    Ok(points)
}
