//! Repeated readings: their mean as an input with a standard uncertainty of type A, and how two values are correlated.
//!
//! x̄ = Σ xₖ/n      u(x̄) = s/√n,  s² = Σ (xₖ − x̄)²/(n − 1),  ν = n − 1
//! r(x̄, z̄) = Σ (xₖ − x̄)(zₖ − z̄)/[(n − 1) s(x) s(z)]   for quantities that were read together
//!
//! | symbol | meaning                                      |
//! |--------|----------------------------------------------|
//! | xₖ, zₖ | the k-th reading of each quantity            |
//! | n, ν   | number of readings, degrees of freedom       |
//! | s, r   | sample standard deviation, correlation       |
//!
//! Assumes independent readings from one distribution. Readings that state an uncertainty of their own are refused: their
//! scatter does not show what all of them have in common. Source: JCGM 100:2008, clauses 4.2 and 5.2.3.

use std::collections::BTreeMap;
use std::rc::Rc;
use std::sync::Arc;

use smallvec::smallvec;
use thiserror::Error;

use crate::fault::{Explain, Fault};
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Sources, Takes, Value};
use crate::quantity::{Quantity, round, text};
use crate::record::correlation::Correlation;
use crate::record::evaluation::{Evaluation, Shape};
use crate::record::node::{Input, LeafKey};
use crate::record::spread::{self, Spread};
use crate::units::parse as unit_parse;

pub static READINGS: Card = Card {
    id: "uncertainty.readings",
    name: "readings",
    on: On::Nothing,
    args: &[
        Arg {
            name: "data",
            takes: Takes::Any,
            default: Default::Required,
            doc: "a list of readings, or a map of such lists by name for quantities read together",
        },
        Arg {
            name: "unit",
            takes: Takes::Any,
            default: Default::Absent,
            doc: "unit of bare numbers; for a map, one unit or a map of units by the same names",
        },
    ],
    gives: "the mean, an input with u = s/√n and n - 1 degrees of freedom; for a map, a map of means that are correlated",
    doc: "Evaluates repeated readings by their scatter (type A). Quantities that were read together, one of each at a time, \
          are given as a map, and their means keep the correlation that the readings show.",
    source: "JCGM 100:2008, clauses 4.2 and 5.2.3",
    example: "readings([5.007, 4.994, 5.005, 4.990, 4.999], \"V\")",
    claims: &[],
    alternatives: &[],
    run: evaluate,
    check_line: Some(check_line),
    caution: None,
};

pub static CORRELATION: Card = Card {
    id: "uncertainty.correlation",
    name: "correlation",
    on: On::Nothing,
    args: &[
        Arg { name: "a", takes: Takes::AnyQuantity, default: Default::Required, doc: "a value" },
        Arg { name: "b", takes: Takes::AnyQuantity, default: Default::Required, doc: "another, of any dimension" },
    ],
    gives: "their correlation coefficient, from -1 to 1",
    doc: "Correlation of two values, from the inputs they share and from inputs that are correlated.",
    source: "JCGM 100:2008, clause 5.2.2 and equation (F.1)",
    example: "correlation(q(\"12.5(3) kJ\"), q(\"25(3) nm\"))",
    claims: &[],
    alternatives: &[],
    run: |_, call| {
        let (a, b) = (call.quantity(0), call.quantity(1));
        if let Some(r) = spread::correlation_of(a.node(), b.node()) {
            return Ok(Value::Number(r));
        }
        let certain = [a, b].into_iter().find(|value| value.spread().u().is_none_or(|u| u == 0.0));
        Err(ReadingsError::NoCorrelation { value: certain.map_or_else(String::new, text::shown_plain) }.into())
    },
    check_line: None,
    caution: None,
};

/// Why readings cannot be evaluated.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum ReadingsError {
    #[error("`readings` wants a list, or a map of lists, not {given}")]
    Sort { given: String },
    #[error("{count} of {name} has no scatter to evaluate", count = readings(*count))]
    TooFew { name: String, count: usize },
    #[error("all {count} readings of {name} are {value}, so their scatter is hidden below the last digit")]
    AllEqual { name: String, count: usize, value: String },
    #[error("reading {nth} of {name} is a bare number, {number}, and no unit is given")]
    NoUnit { name: String, nth: usize, number: f64 },
    #[error("reading {nth} of {name} is {given}, which is no reading")]
    NotAReading { name: String, nth: usize, given: String },
    #[error(
        "reading {nth} of {name}, {reading}, states an uncertainty of its own, and `readings` takes the scatter alone"
    )]
    OwnUncertainty { name: String, nth: usize, reading: String },
    #[error("reading {nth} of {name} is in {other} and the first in {first}")]
    Unlike { name: String, nth: usize, first: String, other: String },
    #[error("{a} has {of_a} and {b} {of_b}, so they were not read together", of_a = readings(*count_a), of_b = count_b)]
    Unpaired { a: String, count_a: usize, b: String, count_b: usize },
    #[error("a unit is given for `{name}`, and the readings are of {known}")]
    UnitForNothing { name: String, known: String },
    #[error("the unit of readings is a text, not {given}")]
    UnitSort { given: String },
    #[error("{value} states no uncertainty, so it is correlated with nothing")]
    NoCorrelation { value: String },
}

fn readings(count: usize) -> String {
    if count == 1 { "1 reading".to_owned() } else { format!("{count} readings") }
}

impl Explain for ReadingsError {
    fn code(&self) -> &'static str {
        match self {
            ReadingsError::Sort { .. } => "readings-not-a-list",
            ReadingsError::TooFew { .. } => "readings-too-few",
            ReadingsError::AllEqual { .. } => "readings-all-equal",
            ReadingsError::NoUnit { .. } => "readings-without-unit",
            ReadingsError::NotAReading { .. } => "reading-not-a-quantity",
            ReadingsError::OwnUncertainty { .. } => "reading-with-uncertainty",
            ReadingsError::Unlike { .. } => "readings-differ-in-unit",
            ReadingsError::Unpaired { .. } => "readings-unpaired",
            ReadingsError::UnitForNothing { .. } => "readings-unit-for-nothing",
            ReadingsError::UnitSort { .. } => "readings-unit-not-a-text",
            ReadingsError::NoCorrelation { .. } => "correlation-without-uncertainty",
        }
    }

    fn hint(&self) -> String {
        match self {
            ReadingsError::Sort { .. } | ReadingsError::NotAReading { .. } => {
                "write `readings([5.007, 4.994, 5.005], \"V\")`, or `readings(#{V: [...], I: [...]})` for quantities \
                 read together"
                    .to_owned()
            }
            ReadingsError::TooFew { .. } => {
                "give two at least, or state the uncertainty: `q(\"5.007(3) V\")`".to_owned()
            }
            ReadingsError::AllEqual { value, .. } => {
                let number = value.split([' ', ',']).next().unwrap_or("");
                format!(
                    "state the bounds of what the last digit shows, half a unit of it, as in `q(\"{number} ± a unit, limits\")`"
                )
            }
            ReadingsError::NoUnit { .. } => {
                "name the unit after the list, `readings([...], \"mA\")`; that of a pure number is \"1\"".to_owned()
            }
            ReadingsError::OwnUncertainty { .. } => {
                "leave it out of the readings, and add what they have in common as a \
                 correction: `readings([...]) + q(\"0(2) mV\")`"
                    .to_owned()
            }
            ReadingsError::Unlike { .. } => "give all readings of one quantity in units of one dimension".to_owned(),
            ReadingsError::Unpaired { .. } => {
                "leave out the readings that have no partner, or evaluate each quantity alone with `readings([...])`"
                    .to_owned()
            }
            ReadingsError::UnitForNothing { .. } => "use the same names in both maps".to_owned(),
            ReadingsError::UnitSort { .. } => "write it as in `readings([...], \"mA\")`".to_owned(),
            ReadingsError::NoCorrelation { .. } => {
                "state an uncertainty for it, as in `q(\"25(3) nm\")`, or evaluate readings".to_owned()
            }
        }
    }
}

/// One quantity's readings.
struct Series {
    name: String,
    /// Its name in messages.
    worded: String,
    values: Vec<Quantity>,
    mean: Quantity,
    /// Sample standard deviation, in SI units.
    s: f64,
}

impl Series {
    fn count(&self) -> f64 {
        self.values.len() as f64
    }

    fn deviations(&self) -> impl Iterator<Item = f64> {
        self.values.iter().map(|value| value.si() - self.mean.si())
    }
}

fn evaluate(cx: &Cx, call: &Rc<Call>) -> Result<Value, Fault> {
    match &call.args[0] {
        Value::List(list) => {
            let unit = match &call.args[1] {
                Value::Nothing => None,
                other => Some(unit_text(other)?),
            };
            let series = [series(cx, String::new(), "the list".to_owned(), list, unit)?];
            let kept = Value::List(series[0].values.iter().cloned().map(Value::Quantity).collect());
            let mut means = means(cx, call, kept, &series, |_, count| format!("mean of {count} readings"))?;
            Ok(Value::Quantity(means.swap_remove(0)))
        }
        Value::Options(map) => {
            if let Value::Options(units) = &call.args[1]
                && let Some(name) = units.keys().find(|name| !map.contains_key(*name))
            {
                let known = map.keys().map(|name| format!("`{name}`")).collect::<Vec<_>>().join(", ");
                return Err(ReadingsError::UnitForNothing { name: name.clone(), known }.into());
            }
            let mut all = Vec::with_capacity(map.len());
            for (name, list) in map.iter() {
                let Value::List(list) = list else {
                    return Err(ReadingsError::Sort { given: format!("`{name}` as {}", list.sort()) }.into());
                };
                let unit = match &call.args[1] {
                    Value::Nothing => None,
                    Value::Options(units) => units.get(name).map(unit_text).transpose()?,
                    other => Some(unit_text(other)?),
                };
                all.push(series(cx, name.clone(), format!("`{name}`"), list, unit)?);
            }
            if let Some([first, other]) = all.windows(2).find(|pair| pair[0].values.len() != pair[1].values.len()) {
                return Err(ReadingsError::Unpaired {
                    a: first.worded.clone(),
                    count_a: first.values.len(),
                    b: other.worded.clone(),
                    count_b: other.values.len(),
                }
                .into());
            }
            let list = |one: &Series| Value::List(one.values.iter().cloned().map(Value::Quantity).collect());
            let kept = all.iter().map(|one| (one.name.clone(), list(one))).collect();
            let means = means(cx, call, Value::Options(Rc::new(kept)), &all, label_of)?;
            let named: BTreeMap<String, Value> =
                all.iter().map(|one| one.name.clone()).zip(means.into_iter().map(Value::Quantity)).collect();
            Ok(Value::Options(Rc::new(named)))
        }
        other => Err(ReadingsError::Sort { given: other.sort().to_owned() }.into()),
    }
}

fn unit_text(value: &Value) -> Result<&str, ReadingsError> {
    match value {
        Value::Text(unit) => Ok(unit),
        other => Err(ReadingsError::UnitSort { given: other.sort().to_owned() }),
    }
}

/// Reads and checks one list.
fn series(cx: &Cx, name: String, worded: String, list: &[Value], unit: Option<&str>) -> Result<Series, Fault> {
    let values: Vec<Quantity> =
        list.iter().zip(1..).map(|(item, nth)| reading(cx, &worded, nth, item, unit)).collect::<Result<_, Fault>>()?;
    if values.len() < 2 {
        return Err(ReadingsError::TooFew { name: worded, count: values.len() }.into());
    }
    if let Some(nth) = values.iter().position(|value| value.dim() != values[0].dim()) {
        let unit = |value: &Quantity| value.unit().text.to_string();
        let (first, other) = (unit(&values[0]), unit(&values[nth]));
        return Err(ReadingsError::Unlike { name: worded, nth: nth + 1, first, other }.into());
    }
    let mean = Quantity::mean(&values, None)?;
    let squares: f64 = values.iter().map(|value| value.si() - mean.si()).map(|d| d * d).sum();
    let s = (squares / (values.len() as f64 - 1.0)).sqrt();
    // Equal readings differ from their mean by rounding alone.
    if s <= 4.0 * f64::EPSILON * mean.si().abs() {
        let value = text::shown_plain(&values[0]);
        return Err(ReadingsError::AllEqual { name: worded, count: values.len(), value }.into());
    }
    Ok(Series { name, worded, values, mean, s })
}

fn reading(cx: &Cx, name: &str, nth: usize, item: &Value, unit: Option<&str>) -> Result<Quantity, Fault> {
    let place = || cx.place.clone();
    let value = match (item, unit) {
        (Value::Quantity(value), None) => value.clone(),
        (Value::Quantity(value), Some(unit)) => value.to(unit_parse::unit(unit)?)?,
        (Value::Number(number), Some(unit)) => {
            text::from_number(*number, unit_parse::unit(unit)?, place(), cx.next_ordinal())?
        }
        (Value::Number(number), None) => {
            return Err(ReadingsError::NoUnit { name: name.to_owned(), nth, number: *number }.into());
        }
        (Value::Text(written), unit) => {
            let value = text::parse(written, place(), cx.next_ordinal())?;
            match unit {
                // A text without a unit, as numbers are typed to keep their last zeros.
                Some(unit) if value.dim().is_none() && value.unit().factor == 1.0 => {
                    text::parse(&format!("{written} {unit}"), place(), cx.next_ordinal())?
                }
                Some(unit) => value.to(unit_parse::unit(unit)?)?,
                None => value,
            }
        }
        (other, _) => {
            let given = other.sort().to_owned();
            return Err(ReadingsError::NotAReading { name: name.to_owned(), nth, given }.into());
        }
    };
    match value.spread() {
        Spread::Full(0.0) | Spread::NotStated { .. } => Ok(value),
        Spread::Full(_) | Spread::Partial { .. } => {
            let reading = value.node().input().map_or_else(|| text::shown_plain(&value), Input::name);
            Err(ReadingsError::OwnUncertainty { name: name.to_owned(), nth, reading }.into())
        }
    }
}

/// The means as inputs of their own, which keep the readings in their history. `kept` are the readings as arguments.
fn means(
    cx: &Cx,
    call: &Rc<Call>,
    kept: Value,
    all: &[Series],
    label: impl Fn(&str, usize) -> String,
) -> Result<Vec<Quantity>, Fault> {
    let step = Rc::new(Call { card: call.card, args: vec![kept, call.args[1].clone()] });
    let keys: Vec<LeafKey> =
        all.iter().map(|_| LeafKey::Typed { place: cx.place.clone(), ordinal: cx.next_ordinal() }).collect();
    let correlation = correlated(all, &keys);
    let mut means = Vec::with_capacity(all.len());
    for (one, key) in all.iter().zip(keys) {
        let unit = one.values[0].unit();
        let evaluation =
            Evaluation { shape: Shape::Normal, dof: Some(one.count() - 1.0), correlation: correlation.clone() };
        let input = Input {
            u: Some(one.s / one.count().sqrt()),
            evaluated: evaluation.kept(),
            label: Some(label(&one.name, one.values.len()).into()),
            unit: Some(Arc::clone(&unit)),
            ..Input::of(key)
        };
        let (si, dim, kind) = (one.mean.si(), one.mean.dim().clone(), one.mean.kind().clone());
        let leaf = Quantity::input(si, dim.clone(), kind.clone(), input, cx.place.clone())?;
        let inputs = smallvec![(Rc::clone(leaf.node()), 1.0)];
        let mean = Quantity::from_step(si, dim, kind, inputs, Rc::clone(&step) as Rc<_>, cx.place.clone())?;
        means.push(mean.in_unit(Some(unit)));
    }
    Ok(means)
}

/// The name of an input from readings of several quantities.
fn label_of(name: &str, count: usize) -> String {
    format!("{name} ({count} readings)")
}

/// The sample correlation of quantities read together; nothing for one alone.
fn correlated(all: &[Series], keys: &[LeafKey]) -> Option<Arc<Correlation>> {
    if all.len() < 2 {
        return None;
    }
    let coefficient = |a: &Series, b: &Series| {
        let products: f64 = a.deviations().zip(b.deviations()).map(|(x, z)| x * z).sum();
        // Rounding may take readings that are proportional past 1 by a bit.
        (products / ((a.count() - 1.0) * a.s * b.s)).clamp(-1.0, 1.0)
    };
    let n = all.len();
    let r = |row: usize, column: usize| if row == column { 1.0 } else { coefficient(&all[row], &all[column]) };
    // From the lower half, so that both halves have the same bits.
    let r: Vec<f64> = (0..n * n).map(|at| r((at / n).max(at % n), (at / n).min(at % n))).collect();
    let made = Correlation::new(keys.to_vec(), r);
    Some(Arc::new(made.unwrap_or_else(|error| unreachable!("a sample correlation of readings: {error}"))))
}

/// The readings, their mean and what their scatter gives.
fn check_line(_: &Cx, call: &Call, value: &Quantity, _: &mut Sources) -> String {
    let label = value.node().inputs().first().and_then(|(leaf, _)| leaf.input()?.label.clone());
    let list = match &call.args[0] {
        Value::List(list) => Some(list),
        Value::Options(map) => map.iter().find_map(|(name, list)| match list {
            Value::List(list) if label.as_deref() == Some(&label_of(name, list.len())) => Some(list),
            _ => None,
        }),
        _ => None,
    };
    let Some(list) = list else { return String::new() };
    let unit = value.unit();
    // Twelve digits, since a unit's factor may leave noise in the last ones.
    let written = |x: f64| round::shortest(format!("{x:.11e}").parse().unwrap_or(x));
    let number = |one: &Value| match one {
        Value::Quantity(one) => Some(written(unit.from_si(one.si()))),
        _ => None,
    };
    let bracketed = |number: String| if number.starts_with('-') { format!("({number})") } else { number };
    let numbers: Vec<String> = list.iter().filter_map(number).map(bracketed).collect();
    let sum = match numbers.as_slice() {
        [first, second, third, .., last] if numbers.len() > MOST_SHOWN => {
            format!("{first} + {second} + {third} + … + {last}")
        }
        all => all.join(" + "),
    };
    let (n, u) = (numbers.len(), value.spread().u().unwrap_or(0.0) / unit.factor);
    format!(
        "({sum}) / {n} = {}; s = {}, u = s/√{n} = {}",
        round::significant(unit.from_si(value.si()), 8),
        round::significant(u * (n as f64).sqrt(), 4),
        round::significant(u, 4)
    )
}

/// Readings that a check line writes out.
const MOST_SHOWN: usize = 12;
