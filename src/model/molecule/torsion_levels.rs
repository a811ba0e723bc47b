//! The levels of a molecule's internal rotations, as spectroscopists list them.
//!
//! H = −F d²/dφ² + V(φ), solved in waves (`statmech/hindered.rs`); energies from the lowest level, as wavenumbers E/hc.

use std::rc::Rc;

use smallvec::SmallVec;

use crate::fault::Fault;
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Takes, Value};
use crate::model::molecule::answers::molecule_of;
use crate::model::molecule::definition::{GivenTorsion, Motion};
use crate::model::molecule::error::MoleculeError;
use crate::model::molecule::parameter;
use crate::quantity::Quantity;
use crate::record::node::Node;
use crate::units::Kind;

pub static TORSION_LEVELS: Card = Card {
    id: "molecule.torsion-levels",
    name: "torsion_levels",
    on: On::Molecule,
    args: &[Arg {
        name: "count",
        takes: Takes::Number,
        default: Default::Number(8.0),
        doc: "how many levels of each torsion",
    }],
    gives: "a list for each torsion, with its lowest levels as wavenumbers from the lowest of them",
    doc: "The energy levels of each internal rotation in its potential, degenerate ones each by itself, with the uncertainty that F \
          and the potential bring.",
    source: "Schrödinger's equation of a plane rotor; K. S. Pitzer, W. D. Gwinn, J. Chem. Phys. 10, 428 (1942) (from memory)",
    example: "molecule(\"C2H6\").torsion_levels(7)",
    claims: &[],
    alternatives: &[],
    run,
    check_line: None,
    caution: None,
};

fn run(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let molecule = molecule_of(call);
    let count = match call.args[1] {
        Value::Number(count) => count,
        _ => 8.0,
    };
    if !(count >= 1.0 && count.fract() == 0.0) {
        let (key, given) = ("count".to_owned(), crate::quantity::round::shortest(count));
        return Err(MoleculeError::Sort { key, wanted: "a whole number from 1", given }.into());
    }
    let torsions: &[GivenTorsion] = match &molecule.definition().motion {
        Motion::Polyatomic { torsions, .. } => torsions,
        _ => &[],
    };
    if torsions.is_empty() {
        return Err(MoleculeError::NotGiven { molecule: molecule.text().to_owned(), what: "torsion" }.into());
    }
    let of = |torsion| levels(cx, call, torsion, count as usize).map(Value::List);
    Ok(Value::List(torsions.iter().map(of).collect::<Result<_, Fault>>()?))
}

fn levels(cx: &Cx, call: &Rc<Call>, of: &GivenTorsion, count: usize) -> Result<Vec<Value>, Fault> {
    let (solved, per_kelvin) = (of.torsion(), 1.0 / cx.constants().second_radiation.value);
    let parameters = || std::iter::once(&of.f).chain(&of.cosines).chain(&of.sines);
    let level = |(level, slopes): (&crate::model::statmech::levels::Level, &Vec<f64>)| {
        let inputs: SmallVec<[(Rc<Node>, f64); 2]> = parameters()
            .zip(slopes)
            .flat_map(|(parameter, slope)| {
                parameter.inputs.iter().map(move |(node, by)| (Rc::clone(node), per_kelvin * slope * by))
            })
            .collect();
        let (si, step) = (per_kelvin * level.e_k, Rc::clone(call));
        let value = Quantity::from_step(si, parameter::wavenumber(), Kind::PLAIN, inputs, step, cx.place.clone())?;
        Ok(Value::Quantity(value))
    };
    solved.levels().iter().zip(solved.slopes()).take(count).map(level).collect()
}
