//! The unit to print a value in when nobody chose one, from its dimension alone.
//!
//! Main function: [`unit_for`]. The surprise: J/kg without saying of what is m²/s² to the algebra, so every value of
//! that dimension is printed as kJ/kg.

use crate::units::dimension::{Base, Dimension, Entity, Of};
use crate::units::parse;
use crate::units::table::lookup;
use crate::units::terms::{Term, Terms};
use crate::units::unit::{Scale, Unit};

/// Units tried in turn for what is left without kelvin and entities.
const HEADS: &[&str] = &["bar", "1/bar", "kJ/kg", "kW", "W/m^2", "W/m", "V", "C", "C m", "N", "N/m", "J s"];

/// Base units as the fallback writes them.
const SI: [(Base, &str); 6] = [
    (Base::Kilogram, "kg"),
    (Base::Metre, "m"),
    (Base::Second, "s"),
    (Base::Ampere, "A"),
    (Base::Kelvin, "K"),
    (Base::Candela, "cd"),
];

/// The unit to print a value of this dimension in. Its dimension is the given one, entities included.
pub fn unit_for(dim: &Dimension) -> Unit {
    let kelvin = dim.halves(Base::Kelvin);
    let kelvins = kelvin_to(kelvin);
    let core = dim.without_basis().over(&kelvins);
    let mut list = head(dim, &core).unwrap_or_else(|| si_product(&core));
    list.extend(term("K", None, kelvin));
    list.extend(entities(dim, &core));
    let unit = Terms::of(list).and_then(|terms| terms.unit());
    // Only a dimension at the very edge of its exponents has no such unit; SI units have no factor to overflow.
    unit.unwrap_or_else(|_| Unit { factor: 1.0, dim: dim.clone(), scale: Scale::Plain, text: dim.to_string().into() })
}

fn kelvin_to(halves: i8) -> Dimension {
    Dimension::base(Base::Kelvin).powered(halves.into()).unwrap_or_default()
}

/// The named unit for the part without kelvin and entities, if it has one.
fn head(dim: &Dimension, core: &Dimension) -> Option<Vec<Term>> {
    let total = dim.entities().is_empty();
    let per_mole = only_exponent(dim, Of::Amount) == Some(-2);
    let of_amount = only_exponent(dim, Of::Amount) == Some(2) && dim.entities().len() == 1;
    let per_kelvin = dim.halves(Base::Kelvin) != 0;
    let by_mass = dim.entities().iter().any(|e| e.0 == Of::Mass);
    let text = if is(core, "J") {
        // Heat capacities and entropies of a mole are tens of joules; of a kilogram, thousands.
        if per_kelvin && !by_mass { "J" } else { "kJ" }
    } else if is(core, "m^3") && per_mole {
        "cm^3"
    } else if is(core, "1/m^3") && of_amount {
        "1/L"
    } else if is(core, "1/m") && total && !per_kelvin {
        "1/cm"
    } else if is(core, "kg") && per_mole {
        "g"
    } else {
        HEADS.iter().find(|head| is(core, head))?
    };
    Some(known(text).list().to_vec())
}

fn is(core: &Dimension, text: &str) -> bool {
    known(text).unit().is_ok_and(|unit| unit.dim == *core)
}

fn known(text: &str) -> Terms {
    parse::terms(text).expect("the units named in this file are in the table")
}

/// The exponent of the one entity of that kind; `None` where there is none or several.
fn only_exponent(dim: &Dimension, of: Of) -> Option<i8> {
    let mut found = dim.entities().iter().filter(|e| e.0 == of);
    found.next().filter(|_| found.next().is_none()).map(|e| e.2)
}

fn si_product(core: &Dimension) -> Vec<Term> {
    SI.iter().filter_map(|&(base, symbol)| term(symbol, None, core.halves(base))).collect()
}

fn term(symbol: &str, of: Option<Entity>, halves: i8) -> Option<Term> {
    let spelled = lookup(symbol).expect("the units named in this file are in the table");
    (halves != 0).then(|| Term::new(spelled, of, halves.into()))
}

/// Amounts and masses with what they are of, by name.
fn entities(dim: &Dimension, core: &Dimension) -> Vec<Term> {
    // kg[X]/mol[X] is a molar mass, which everybody has in g/mol.
    let molar_mass = core.is_none()
        && only_exponent(dim, Of::Mass) == Some(2)
        && only_exponent(dim, Of::Amount) == Some(-2)
        && dim.halves(Base::Kelvin) == 0;
    let mut list = dim.entities().to_vec();
    list.sort_by_key(|&(of, entity, _)| (of, entity.name()));
    list.into_iter()
        .filter_map(|(of, entity, halves)| {
            let symbol = match of {
                Of::Amount => "mol",
                Of::Mass if molar_mass => "g",
                Of::Mass => "kg",
            };
            term(symbol, (!entity.is_open()).then_some(entity), halves)
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn each_kind_of_value_is_printed_as_the_trade_prints_it() {
        let rows = [
            ("J", "kJ"),
            ("J/mol[rxn]", "kJ/mol[rxn]"),
            ("J/kg[feed]", "kJ/kg[feed]"),
            ("J/mol", "kJ/mol"),
            ("J/kg", "kJ/kg"),
            ("J/K", "J/K"),
            ("J/(K mol[rxn])", "J/(K mol[rxn])"),
            ("J/(K mol[CH4])", "J/(K mol[CH4])"),
            ("J/(K^2 mol)", "J/(K^2 mol)"),
            ("J/(K kg[feed])", "kJ/(K kg[feed])"),
            ("J/(g K)", "kJ/(kg K)"),
            ("degR", "K"),
            ("1/K", "1/K"),
            ("Pa", "bar"),
            ("1/Pa", "1/bar"),
            ("Pa/K", "bar/K"),
            ("m^3/mol[H2O]", "cm^3/mol[H2O]"),
            ("m^3/(K mol[H2O])", "cm^3/(K mol[H2O])"),
            ("L", "m^3"),
            ("mol[NaCl]/m^3", "mol[NaCl]/L"),
            ("mol[NaCl]/kg[H2O]", "mol[NaCl]/kg[H2O]"),
            ("mol[H2O]/mol[rxn]", "mol[H2O]/mol[rxn]"),
            ("kg[H2O]/mol[H2O]", "g[H2O]/mol[H2O]"),
            ("kg/mol[H2O]", "g/mol[H2O]"),
            ("kg[feed]/s", "kg[feed]/s"),
            ("W", "kW"),
            ("W/K", "kW/K"),
            ("C/mol[e-]", "C/mol[e-]"),
            ("V", "V"),
            ("1/m", "1/cm"),
            ("D", "C m"),
            ("h", "s"),
            ("%", "1"),
            ("mol", "mol"),
            ("g/cm^3", "kg/m^3"),
            ("m^(1/2)", "m^(1/2)"),
        ];
        let misses: Vec<String> = rows
            .iter()
            .map(|&(written, want)| (written, want, unit_for(&parse::unit(written).unwrap().dim)))
            .filter(|(_, want, got)| *got.text != **want)
            .map(|(written, want, got)| format!("{written}: {} instead of {want}", got.text))
            .collect();
        assert!(misses.is_empty(), "{}", misses.join("\n"));
    }

    #[test]
    fn a_dimension_at_the_edge_still_has_a_text() {
        let edge = Dimension::whole([63, -63, 63, -63, 63, -63]);
        let unit = unit_for(&edge);
        assert_eq!(parse::unit(&unit.text).unwrap(), unit);
        assert_eq!(unit.dim, edge);
    }
}
