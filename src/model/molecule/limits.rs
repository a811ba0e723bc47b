//! Cards that make a molecule, take it in another way, and ask for its limits and its ground state.
//!
//! Classical limit: Cp = R (5/2 + rotation + vibrations + ½ per torsion). Zero-point energy: ½ N_A Σ g hcν; of a diatomic
//! molecule N_A (½ωe − ¼ωexe). Source: equipartition; texts of statistical mechanics (from memory).

use std::rc::Rc;

use crate::fault::Fault;
use crate::model::card::{Arg, Call, Card, Claim, Cx, Default, On, Takes, Value};
use crate::model::molecule::answers::molecule_of;
use crate::model::molecule::error::MoleculeError;
use crate::model::molecule::parameter;
use crate::model::molecule::{Molecule, RANGE_K, read, shipped, table};
use crate::model::property::{self, Property};
use crate::model::statmech::gas::Part;
use crate::num::math;
use crate::quantity::{Quantity, round};
use crate::record::node::Node;
use crate::record::register::{Finding, Tested};
use crate::units::{Base, Dimension, Kind, What};

const SOURCE: &str = "equipartition; J. E. Mayer, M. G. Mayer, Statistical Mechanics (1940), chapter 6 (from memory)";

pub static MOLECULE: Card = Card {
    id: "molecule.read",
    name: "molecule",
    on: On::Nothing,
    args: &[Arg {
        name: "definition",
        takes: Takes::Any,
        default: Default::Required,
        doc: "the name of a molecule whose constants are shipped, or a map with `formula`, `rotational_constants`, \
              `symmetry_number` or `point_group`, `vibrations`, `torsions`, and others that a refusal lists",
    }],
    gives: "a gas molecule",
    doc: "A molecule by its constants, shipped or one's own. Wavenumbers of vibrations are given once each, degenerate ones as \
          pairs; `formation_enthalpy` with `formation_temperature` makes it usable in a reaction.",
    source: "IUPAC Green Book, 3rd ed., section 2.6 (notation; from memory)",
    example: "molecule(#{ formula: \"CO2\", point_group: \"Dinfh\", unit: \"cm^-1\", rotational_constants: [0.39022], \
              vibrations: [1333, [667, 2], 2349] })",
    claims: &[],
    alternatives: &[],
    run: |cx, call| {
        let molecule = match &call.args[0] {
            Value::Text(name) => shipped::molecule(cx, name)?,
            Value::Options(map) => read::molecule(cx, map)?,
            other => {
                let (key, wanted, given) = ("definition".to_owned(), "a name or a map", other.sort().to_owned());
                return Err(MoleculeError::Sort { key, wanted, given }.into());
            }
        };
        Ok(Value::Molecule(Rc::new(molecule)))
    },
    check_line: None,
    caution: None,
};

pub static MOLECULE_TABLE: Card = Card {
    id: "molecule.table",
    name: "molecule_table",
    on: On::Nothing,
    args: &[
        Arg {
            name: "table",
            takes: Takes::Text,
            default: Default::Required,
            doc: "the name of a file beside the notebook, or its text: CSV with the columns property, value, unit, degeneracy, or JSON \
                  with the keys of `molecule`",
        },
        Arg {
            name: "more",
            takes: Takes::Any,
            default: Default::Absent,
            doc: "a map with what the table does not say, by the keys of `molecule`",
        },
    ],
    gives: "a gas molecule",
    doc: "A molecule from the results of quantum chemistry. Rows of a CSV table have the properties formula, name, molar mass, \
          wavenumber, rotational constant, distortion constant, symmetry number, point group, multiplicity, energy or scale.",
    source: "columns of our own",
    example: "molecule_table(\"property,value,unit,degeneracy\\nformula,CO,,\\nrotational constant,57.9,GHz,\\nwavenumber,2143,cm^-1,1\\npoint group,Cinfv,,\")",
    claims: &[],
    alternatives: &[],
    run: |cx, call| {
        let mut map = table::map(call.text(0))?;
        match &call.args[1] {
            Value::Options(more) => map.extend(more.iter().map(|(key, value)| (key.clone(), value.clone()))),
            Value::Nothing => {}
            other => {
                let (key, wanted, given) = ("more".to_owned(), "a map", other.sort().to_owned());
                return Err(MoleculeError::Sort { key, wanted, given }.into());
            }
        }
        Ok(Value::Molecule(Rc::new(read::molecule(cx, &map)?)))
    },
    check_line: None,
    caution: None,
};

pub static TAKEN: Card = Card {
    id: "molecule.taken",
    name: "taken",
    on: On::Molecule,
    args: &[Arg {
        name: "how",
        takes: Takes::Options(crate::model::molecule::treatment::OPTIONS),
        default: Default::Required,
        doc: "the motions that are to be taken otherwise, as in #{ low_modes: \"grimme\" }",
    }],
    gives: "the same molecule, taken otherwise",
    doc: "Another treatment of the same molecule: every value it then gives has the approximation in its assumptions, with its \
          price.",
    source: SOURCE,
    example: "molecule(\"C2H6\").taken(#{ torsion: \"free\" })",
    claims: &[],
    alternatives: &[],
    run: |cx, call| {
        let molecule = molecule_of(call);
        let Value::Options(map) = &call.args[1] else { unreachable!("the argument was checked to be options") };
        Ok(Value::Molecule(Rc::new(molecule.taken(read::treatment_of(cx, map, *molecule.treatment())?))))
    },
    check_line: None,
    caution: None,
};

pub static CLASSICAL_LIMIT: Card = Card {
    id: "molecule.classical-limit",
    name: "classical_limit",
    on: On::Molecule,
    args: &[],
    gives: "Cp with every motion at its classical limit",
    doc: "What Cp tends to when kT is far above every spacing of levels: R (5/2 + 1 or 3/2 of rotation + 1 per vibration + 1/2 per \
          torsion). Electronic levels are left out.",
    source: SOURCE,
    example: "molecule(\"CO2\").classical_limit()",
    claims: &[Claim { id: "equipartition", test: limit_has_no_temperature }],
    alternatives: &[],
    run: |cx, call| {
        let molecule = molecule_of(call);
        let r = property::gas_constant(cx.constants());
        let limit = molecule.gas().classical_limit();
        let dim = parameter::molar_capacity(molecule.entity());
        let inputs = smallvec::SmallVec::from_iter([(Rc::clone(r.node()), limit)]);
        let step = Rc::clone(call);
        let kind = Kind::of(What::Cp);
        Ok(Value::Quantity(Quantity::from_step(limit * r.si(), dim, kind, inputs, step, cx.place.clone())?))
    },
    check_line: None,
    caution: None,
};

fn limit_has_no_temperature(_: &Cx, call: &Call, value: &Quantity) -> Vec<Finding> {
    let what =
        "a limit belongs to no temperature; `m.equipartition_temperature(\"1 %\")` says where it is reached".to_owned();
    let molecule = molecule_of(call);
    vec![Finding::known("equipartition", molecule.text(), value.node(), None, Tested::Missing { what })]
}

pub static EQUIPARTITION_TEMPERATURE: Card = Card {
    id: "molecule.equipartition-temperature",
    name: "equipartition_temperature",
    on: On::Molecule,
    args: &[Arg {
        name: "tolerance",
        takes: Takes::Quantity { unit: "%" },
        default: Default::Required,
        doc: "how far below its classical limit Cp may be, as a share of it: \"1 %\"",
    }],
    gives: "the temperature from which Cp is within the tolerance of its classical limit",
    doc: "Where equipartition becomes good enough. Electronic levels are left out, here as in the limit.",
    source: SOURCE,
    example: "molecule(\"SF6\").equipartition_temperature(\"5 %\")",
    claims: &[],
    alternatives: &[],
    run: |cx, call| {
        let molecule = molecule_of(call);
        let t_k = reached(molecule, call.quantity(1).si())?;
        let dim = Dimension::base(Base::Kelvin);
        let kind = Kind::of(What::TemperaturePoint);
        let step = Rc::clone(call);
        Ok(Value::Quantity(Quantity::from_step(t_k, dim, kind, smallvec::SmallVec::new(), step, cx.place.clone())?))
    },
    check_line: None,
    caution: None,
};

/// How far Cp is below its limit, as a share of it, without electrons and stretching, which have none.
fn short_of_limit(molecule: &Molecule, t_k: f64) -> f64 {
    let parts =
        || molecule.gas().parts.iter().filter(|part| !matches!(part, Part::Electronic(_) | Part::Stretching { .. }));
    let missing: f64 = parts().map(|part| part.limit() - part.share(t_k).cv).sum();
    missing / molecule.gas().classical_limit()
}

/// The lowest temperature above which the limit is kept to within `share`, found by halving on a scale of logarithms.
fn reached(molecule: &Molecule, share: f64) -> Result<f64, Fault> {
    let (lowest, highest) = RANGE_K;
    let far = short_of_limit(molecule, highest);
    if far > share {
        let percent = round::significant(100.0 * far, 2);
        let molecule = molecule.text().to_owned();
        return Err(MoleculeError::NeverClassical { molecule, t_k: highest, percent }.into());
    }
    let (mut low, mut high) = (math::ln(lowest), math::ln(highest));
    if short_of_limit(molecule, lowest) <= share {
        return Ok(lowest);
    }
    // Sixty halvings of ln 6000 are below a rounding.
    for _ in 0..60 {
        let middle = 0.5 * (low + high);
        if short_of_limit(molecule, math::exp(middle)) > share { low = middle } else { high = middle }
    }
    Ok(math::exp(high))
}

pub static ZERO_POINT: Card = Card {
    id: "molecule.zero-point-energy",
    name: "zero_point_energy",
    on: On::Molecule,
    args: &[],
    gives: "zero-point energy per mole",
    doc: "Half a quantum of each vibration, times `scale_zero_point` where it is given, else `scale`. Torsions are not counted. \
          From fundamentals it is too low by some per cent, since the harmonic wavenumbers are higher.",
    source: SOURCE,
    example: "molecule(\"CO2\").zero_point_energy()",
    claims: &[],
    alternatives: &[],
    run: |cx, call| energy(cx, call, false),
    check_line: None,
    caution: None,
};

pub static GROUND_STATE: Card = Card {
    id: "molecule.ground-state-energy",
    name: "ground_state_energy",
    on: On::Molecule,
    args: &[],
    gives: "electronic energy and zero-point energy per mole",
    doc: "The energy of quantum chemistry with the zero-point energy: H(0 K) on the scale of that calculation. Differences \
          between molecules of one method mean something, single values do not.",
    source: SOURCE,
    example: "molecule(#{ formula: \"Ar\", energy: \"-526.8 E_h\" }).ground_state_energy()",
    claims: &[],
    alternatives: &[],
    run: |cx, call| energy(cx, call, true),
    check_line: None,
    caution: None,
};

fn energy(cx: &Cx, call: &Rc<Call>, electrons: bool) -> Result<Value, Fault> {
    let molecule = molecule_of(call);
    let definition = molecule.definition();
    let (set, zero_point) = (cx.constants(), definition.zero_point());
    let r = set.molar_gas.value;
    let mut si = r * zero_point.value;
    let mut inputs: smallvec::SmallVec<[(Rc<Node>, f64); 2]> =
        zero_point.inputs.iter().map(|(node, by)| (Rc::clone(node), r * by)).collect();
    if electrons {
        let Some(given) = &definition.energy else {
            let (molecule, what) = (molecule.text().to_owned(), "energy");
            return Err(MoleculeError::NotGiven { molecule, what }.into());
        };
        let plain = Dimension::whole([2, 1, -2, 0, 0, 0]);
        if given.dim().without_basis() != plain {
            let given = crate::units::reader_text(&given.unit());
            let (key, wanted, example) = ("energy".to_owned(), "an energy", "`\"-188.59 E_h\"`");
            return Err(MoleculeError::Dimension { key, given, wanted, example }.into());
        }
        let per_mole = if *given.dim() == plain { set.avogadro.value } else { 1.0 };
        si += per_mole * given.si();
        inputs.push((Rc::clone(given.node()), per_mole));
    }
    let dim = property::dimension(Property::H, molecule.entity());
    let step = Rc::clone(call);
    Ok(Value::Quantity(Quantity::from_step(si, dim, Kind::PLAIN, inputs, step, cx.place.clone())?))
}
