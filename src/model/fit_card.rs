//! How measured heat capacities are fitted and interpolated in a script.

use std::collections::BTreeMap;
use std::rc::Rc;
use std::sync::Arc;

use crate::chem::composition::Composition;
use crate::chem::species::{Phase, Species, State};
use crate::data::form::Form;
use crate::data::substance::Substance;
use crate::fault::Fault;
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Takes, Value};
use crate::model::fit::{self, Fit, Row, Way};
use crate::model::fit_error::FitError;
use crate::model::gather::FigureOrigin;
use crate::model::stated::entropy_dim;
use crate::model::substance::PureSubstance;
use crate::model::table::{Column, Table};
use crate::model::tabulated;
use crate::model::terms::{Stand, Term};
use crate::num::lsq;
use crate::num::math;
use crate::quantity::{Quantity, text};
use crate::record::spread::Spread;
use crate::source::Citation;
use crate::units::{Dimension, Entity, Kind, Of, What};

const TABLE: Arg = Arg {
    name: "table",
    takes: Takes::Any,
    default: Default::Required,
    doc: "rows of T and Cp: a table with columns `T`, `Cp` and, where they are stated, `u(Cp)`; or a map of two lists",
};

const OPTIONS: Arg = Arg {
    name: "options",
    takes: Takes::Options(&[
        Arg {
            name: "entropy",
            takes: Takes::Quantity { unit: "J/(mol K)" },
            default: Default::Absent,
            doc: "the entropy at 298.15 K, without which there is no Gibbs energy",
        },
        Arg {
            name: "formation_enthalpy",
            takes: Takes::Quantity { unit: "kJ/mol" },
            default: Default::Absent,
            doc: "the formation enthalpy at 298.15 K, where no dataset has it",
        },
        Arg {
            name: "extrapolate",
            takes: Takes::Temperature,
            default: Default::Absent,
            doc: "a temperature beyond the rows to which the fit may be carried; the register calls that broken",
        },
    ]),
    default: Default::NoOptions,
    doc: "what belongs to the substance besides, and how far the fit may be carried",
};

pub static FIT_HEAT_CAPACITY: Card = Card {
    id: "fit.terms",
    name: "fit_heat_capacity",
    on: On::Nothing,
    args: &[
        TABLE,
        Arg {
            name: "terms",
            takes: Takes::Any,
            default: Default::Required,
            doc: "exponents of T, as [0, 1, -2], or a published form, as \"maier-kelley\"",
        },
        OPTIONS,
    ],
    gives: "a substance with the fitted heat capacity",
    doc: "Fits a sum of powers of T to measured heat capacities by weighted least squares, Cp = Σ c (T/298.15 K)^n. \
          Shown, it gives coefficients, χ² and residuals. Enthalpy and entropy from it carry the covariance of the fit. Beyond \
          the rows it is refused unless `extrapolate` asks for it.",
    source: "JCGM 100:2008, clauses 5.2 and H.3; Golub, Van Loan, Matrix Computations, 4th ed. (2013) (from memory)",
    example: "fit_heat_capacity(#{ T: [q(\"290 K\"), q(\"300 K\"), q(\"310 K\")], Cp: [q(\"75.1(2) J/(mol K)\"), \
              q(\"75.4(2) J/(mol K)\"), q(\"75.2(2) J/(mol K)\")] }, [0])",
    claims: &[],
    alternatives: &[],
    run: |cx, call| by_terms(cx, call),
    check_line: None,
    caution: None,
};

pub static INTERPOLATE_HEAT_CAPACITY: Card = Card {
    id: "fit.shape",
    name: "interpolate_heat_capacity",
    on: On::Nothing,
    args: &[TABLE, OPTIONS],
    gives: "a substance with the interpolated heat capacity",
    doc: "Interpolates measured heat capacities by cubics that keep the shape of the points: between two of them nothing is \
          higher or lower than both. Enthalpy and entropy from it carry the uncertainty of each point.",
    source: "F. N. Fritsch, R. E. Carlson, SIAM J. Numer. Anal. 17 (1980) 238; F. N. Fritsch, J. Butland, SIAM J. Sci. Stat. \
             Comput. 5 (1984) 300 (from memory)",
    example: "interpolate_heat_capacity(#{ T: [q(\"290 K\"), q(\"300 K\"), q(\"310 K\")], Cp: [q(\"75.1(2) J/(mol K)\"), \
              q(\"75.4(2) J/(mol K)\"), q(\"75.2(2) J/(mol K)\")] })",
    claims: &[],
    alternatives: &[],
    run: |cx, call| by_shape(cx, call),
    check_line: None,
    caution: None,
};

/// The figures of a table or a map, by column.
struct Measured {
    name: Rc<str>,
    citation: Citation,
    rows: Vec<Row>,
}

fn measured(cx: &Cx, value: &Value) -> Result<Measured, Fault> {
    if let Value::Table(table) = value {
        return of_table(table);
    }
    let Value::Options(map) = value else {
        return Err(FitError::Table { given: value.sort().to_owned() }.into());
    };
    let name: Rc<str> = "the map".into();
    let column = |wanted: &str, what: &'static str| {
        let there = map.keys().map(|key| format!("`{key}`")).collect::<Vec<_>>().join(", ");
        let missing = || FitError::Column { name: name.to_string(), what, there };
        match map.get(wanted) {
            Some(Value::List(list)) => list.iter().map(|one| figure(cx, one)).collect::<Result<Vec<Quantity>, Fault>>(),
            _ => Err(missing().into()),
        }
    };
    let (temperatures, capacities) = (column("T", "list `T`")?, column("Cp", "list `Cp`")?);
    let cited = capacities.iter().find_map(|one| one.node().input().and_then(|input| input.citation.clone()));
    let citation = cited.unwrap_or_else(|| Citation::new("typed in the notebook", ""));
    let rows = rows(&name, &temperatures, capacities)?;
    Ok(Measured { name, citation, rows })
}

/// The rows of a table: its columns `T` and `Cp`.
fn of_table(table: &Table) -> Result<Measured, Fault> {
    let column = |wanted: &str, what: &'static str| {
        let there = table.columns().iter().map(|one| format!("`{}`", one.name)).collect::<Vec<_>>().join(", ");
        let found = table.columns().iter().find(|one| &*one.name == wanted);
        found.ok_or(FitError::Column { name: table.name.to_string(), what, there })
    };
    let (t, cp) = (column("T", "column `T`")?, column("Cp", "column `Cp`")?);
    let all = |column: &Rc<Column>| (0..column.len()).map(|row| column.value(row)).collect::<Vec<Quantity>>();
    let rows = rows(&table.name, &all(t), all(cp))?;
    Ok(Measured { name: table.name.clone(), citation: cp.citation().clone(), rows })
}

fn figure(cx: &Cx, value: &Value) -> Result<Quantity, Fault> {
    match value {
        Value::Quantity(quantity) => Ok(quantity.clone()),
        Value::Text(written) => Ok(text::parse(written, cx.place.clone(), cx.next_ordinal())?),
        other => Err(FitError::Table { given: format!("a list with {}", other.sort()) }.into()),
    }
}

fn rows(name: &str, temperatures: &[Quantity], capacities: Vec<Quantity>) -> Result<Vec<Row>, FitError> {
    let name = || name.to_owned();
    if temperatures.len() != capacities.len() {
        let (temperatures, capacities) = (temperatures.len(), capacities.len());
        return Err(FitError::Lengths { name: name(), temperatures, capacities });
    }
    let mut rows = Vec::with_capacity(capacities.len());
    for (row, (t, cp)) in (1..).zip(temperatures.iter().zip(capacities)) {
        let unit = |quantity: &Quantity| quantity.unit().text.to_string();
        let what = t.kind().what;
        if !what.is_temperature() || what == What::TemperatureDifference || t.si() <= 0.0 {
            return Err(FitError::Unit { name: name(), row, found: unit(t), what: "a temperature" });
        }
        if t.spread().u().is_some_and(|u| u > 0.0) {
            return Err(FitError::Temperature { name: name(), row });
        }
        if *cp.dim() != entropy_dim()
            && cp.dim().bindings_to(&entropy_dim()).len() != 1
            && entropy_dim().bindings_to(cp.dim()).len() != 1
        {
            return Err(FitError::Unit { name: name(), row, found: unit(&cp), what: "a molar heat capacity" });
        }
        // What states none is not known to be exact.
        let u = match cp.spread() {
            Spread::Full(u) => Some(u),
            Spread::Partial { .. } | Spread::NotStated { .. } => None,
        };
        if u == Some(0.0) {
            return Err(FitError::Exact { name: name(), row });
        }
        let before = rows.first().and_then(|first: &Row| named_mole(first.cp.dim()));
        if before.is_some_and(|before| named_mole(cp.dim()).is_some_and(|named| named != before)) {
            let what = "a heat capacity per mole of what the first row is of";
            return Err(FitError::Unit { name: name(), row, found: unit(&cp), what });
        }
        rows.push(Row { t_k: t.si(), cp, u });
    }
    let stated = rows.iter().filter(|row| row.u.is_some()).count();
    if stated != 0 && stated != rows.len() {
        return Err(FitError::SomeUncertain { name: name(), stated, rows: rows.len() });
    }
    Ok(rows)
}

/// What the moles of a molar quantity are of, where its unit says so.
fn named_mole(dim: &Dimension) -> Option<Entity> {
    let of = dim.entities().iter().find(|(of, _, halves)| *of == Of::Amount && *halves == -2);
    of.map(|(_, entity, _)| *entity).filter(|entity| *entity != Entity::OPEN && *entity != Entity::RXN)
}

fn exponents(value: &Value) -> Result<Vec<f64>, FitError> {
    let refused = |given: &str| FitError::Terms { given: given.to_owned() };
    let exponents: Vec<f64> = match value {
        Value::List(list) if list.is_empty() => return Err(refused("an empty list")),
        Value::List(list) => list
            .iter()
            .map(|one| match one {
                Value::Number(number) if number.abs() <= 20.0 => Ok(*number),
                Value::Number(number) => Err(refused(&format!("{number}"))),
                other => Err(refused(&format!("a list with {}", other.sort()))),
            })
            .collect::<Result<_, _>>()?,
        Value::Text(word) => match Form::named(word) {
            Some(form) => form.terms.iter().map(|(_, exponent)| *exponent).collect(),
            None => return Err(refused(&format!("`{word}`"))),
        },
        other => return Err(refused(other.sort())),
    };
    for (nth, exponent) in exponents.iter().enumerate() {
        if exponents[..nth].contains(exponent) {
            return Err(FitError::TermTwice { exponent: *exponent });
        }
    }
    Ok(exponents)
}

fn by_terms(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let Measured { name, citation, rows } = measured(cx, &call.args[0])?;
    let exponents = exponents(&call.args[1])?;
    let stated = rows.first().is_some_and(|row| row.u.is_some());
    // The scatter of what is met exactly says nothing.
    let needed = exponents.len() + usize::from(!stated);
    if rows.len() < needed {
        let (rows, terms, name) = (rows.len(), exponents.len(), name.to_string());
        return Err(FitError::TooFew { name, rows, terms, needed }.into());
    }
    let weighted: Vec<Vec<f64>> = rows
        .iter()
        .map(|row| fit::terms_at(&exponents, row.t_k).iter().map(|term| term / row.u.unwrap_or(1.0)).collect())
        .collect();
    let measured: Vec<f64> = rows.iter().map(|row| row.cp.si() / row.u.unwrap_or(1.0)).collect();
    let solved = lsq::solve(&weighted, &measured, exponents.len())
        .map_err(|dependent| FitError::Dependent { name: name.to_string(), exponent: exponents[dependent.column] })?;
    let freedom = (rows.len() - exponents.len()) as f64;
    let (sigma, dof, chi_square) = if stated {
        (1.0, None, Some(solved.residual))
    } else {
        (math::sqrt(solved.residual / freedom), Some(freedom), None)
    };
    let components = fit::components(cx, &name, &solved, (sigma, dof), &citation)?;
    let way = Way::Terms { exponents, solved, components, sigma, chi_square };
    Ok(own(call, name, rows, way))
}

fn by_shape(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    let Measured { name, rows, .. } = measured(cx, &call.args[0])?;
    if rows.len() < 3 {
        return Err(FitError::TooFew { name: name.to_string(), rows: rows.len(), terms: 3, needed: 3 }.into());
    }
    if let Some(row) = (1..rows.len()).find(|&row| rows[row].t_k <= rows[row - 1].t_k) {
        let (t_k, before_k, name) = (rows[row].t_k, rows[row - 1].t_k, name.to_string());
        return Err(FitError::NotAscending { name, row: row + 1, t_k, before_k }.into());
    }
    let way = Way::Shape(fit::shape(&rows).unwrap_or_else(|| unreachable!("the rows were seen to ascend")));
    Ok(own(call, name, rows, way))
}

/// The fit as a substance of its own, which has no name until it stands in a reaction.
fn own(call: &Call, name: Rc<str>, rows: Vec<Row>, way: Way) -> Value {
    let options: BTreeMap<String, Value> = match call.args.last() {
        Some(Value::Options(options)) => BTreeMap::clone(options),
        _ => BTreeMap::new(),
    };
    let option = |name: &str| match options.get(name) {
        Some(Value::Quantity(quantity)) => Some(quantity.clone()),
        _ => None,
    };
    // Figures per mole of something named are answered per mole of it; a unit that names nothing leaves the sample.
    let entity = rows.iter().find_map(|row| named_mole(row.cp.dim())).unwrap_or_else(|| Entity::named("sample"));
    let fit = Fit {
        name: name.clone(),
        rows: rows.into(),
        // A shape between points says nothing of what lies beyond them.
        beyond_k: option("extrapolate").map(|t| t.si()).filter(|_| matches!(way, Way::Terms { .. })),
        way,
        entropy_298: option("entropy"),
        formation: option("formation_enthalpy"),
    };
    let species = Species {
        id: format!("sample of {name}").into(),
        entity,
        composition: Composition::default(),
        charge: 0,
        phase: Phase::of(State::Crystal),
    };
    let substance = Substance {
        species,
        name: None,
        cas: None,
        function: None,
        pressure: std::default::Default::default(),
        formations: Vec::new(),
    };
    let term = Term { own: Some(Rc::new(fit)), ..Term::of_tables(Arc::new(substance), 1.0) };
    Value::Substance(Rc::new(PureSubstance::answered_by(term)))
}

/// A measured heat capacity under the name that an equation has for it, with the entropy at 298.15 K that is on record of
/// that substance, unless the fit was given one.
///
/// # Errors
/// The name means no substance, or the value is a record of the tables itself.
pub(super) fn stand(cx: &Cx, name: &str, own: &PureSubstance) -> Result<Stand, Fault> {
    let Some(thermo) = own.thermo() else {
        return Err(FitError::NotOwn { name: name.to_owned(), given: own.text().to_owned() }.into());
    };
    let substance = match cx.data().find(name) {
        Ok(substance) => substance,
        Err(_) => Arc::new(Substance { species: cx.data().species(name)?, ..own.record().as_ref().clone() }),
    };
    let Some(fit) = thermo.fit() else { return Ok(Stand { substance, thermo: Rc::clone(thermo) }) };
    let entropy = match tabulated::entropy(&substance).map(|figure| (figure.si, figure.origin)) {
        Some((si, FigureOrigin::Input(input))) => Some(Quantity::input(si, entropy_dim(), Kind::PLAIN, *input, None)?),
        _ => None,
    };
    Ok(Stand { substance, thermo: Rc::new(fit.standing_for(entropy)) })
}
