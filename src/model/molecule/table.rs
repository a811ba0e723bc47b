//! A molecule from a plain table of quantum-chemical results: CSV with columns of our own, or JSON with the keys of
//! `molecule`.
//!
//! ```text
//! property,value,unit,degeneracy
//! formula,CO2,,
//! point group,Dinfh,,
//! rotational constant,11.70,GHz,
//! wavenumber,667.4,cm^-1,2
//! wavenumber,1388.2,cm^-1,1
//! wavenumber,2349.1,cm^-1,1
//! energy,-188.5909,E_h,
//! ```
//!
//! Each figure names its unit; empty lines and lines that begin with `#` are passed over. The surprise: nothing is read
//! from a file here, the text comes from whoever has it; the script takes a name for a file of the notebook's folder.

use std::collections::BTreeMap;
use std::rc::Rc;

use crate::model::card::Value;
use crate::model::molecule::error::MoleculeError;

const HEADING: [&str; 4] = ["property", "value", "unit", "degeneracy"];

/// The table as the map that `molecule` reads.
///
/// # Errors
/// It is no such table.
pub fn map(text: &str) -> Result<BTreeMap<String, Value>, MoleculeError> {
    if text.trim_start().starts_with('{') {
        let value: serde_json::Value =
            serde_json::from_str(text).map_err(|error| MoleculeError::Table { why: error.to_string() })?;
        let Value::Options(map) = of_json(value) else { unreachable!("a text in braces is a map") };
        return Ok(map.as_ref().clone());
    }
    csv(text)
}

fn of_json(value: serde_json::Value) -> Value {
    match value {
        serde_json::Value::Null => Value::Nothing,
        serde_json::Value::Bool(flag) => Value::Flag(flag),
        serde_json::Value::Number(number) => Value::Number(number.as_f64().unwrap_or(f64::NAN)),
        serde_json::Value::String(text) => Value::Text(text.as_str().into()),
        serde_json::Value::Array(list) => Value::List(list.into_iter().map(of_json).collect()),
        serde_json::Value::Object(map) => {
            Value::Options(Rc::new(map.into_iter().map(|(key, value)| (key, of_json(value))).collect()))
        }
    }
}

fn csv(text: &str) -> Result<BTreeMap<String, Value>, MoleculeError> {
    let lines = (1..).zip(text.lines()).filter(|(_, line)| !line.trim().is_empty() && !line.trim().starts_with('#'));
    let mut lines = lines.map(|(nth, line)| (nth, line, line.split(',').map(str::trim).collect::<Vec<&str>>()));
    let heading = lines.next().map(|(_, _, cells)| cells).unwrap_or_default();
    if heading != HEADING {
        return Err(MoleculeError::Table { why: format!("its first line is `{}`", heading.join(",")) });
    }
    let mut map: BTreeMap<String, Value> = BTreeMap::new();
    let mut lists: BTreeMap<&str, Vec<Value>> = BTreeMap::new();
    for (line, whole, cells) in lines {
        let wrong = |why: &str| MoleculeError::TableLine { line, text: whole.trim().to_owned(), why: why.to_owned() };
        if cells.len() > HEADING.len() {
            return Err(wrong("has more than four cells"));
        }
        let cell = |at: usize| cells.get(at).copied().unwrap_or("");
        let (property, value, unit, degeneracy) = (cell(0), cell(1), cell(2), cell(3));
        if value.is_empty() {
            return Err(wrong("has no value"));
        }
        let figure = || {
            if unit.is_empty() {
                Err(wrong("names no unit"))
            } else {
                Ok(Value::Text(format!("{value} {unit}").into()))
            }
        };
        let number =
            |text: &str| text.parse().map(Value::Number).map_err(|_| wrong("has no number where one is wanted"));
        let mut once = |key: &str, value: Value| match map.insert(key.to_owned(), value) {
            Some(_) => Err(wrong("says again what a line above has said")),
            None => Ok(()),
        };
        match property {
            "formula" | "name" => once(property, Value::Text(value.into()))?,
            "point group" => once("point_group", Value::Text(value.into()))?,
            "symmetry number" => once("symmetry_number", number(value)?)?,
            "multiplicity" => once("multiplicity", number(value)?)?,
            "scale" => once("scale", Value::Text(value.into()))?,
            "molar mass" => once("molar_mass", figure()?)?,
            "energy" => once("energy", figure()?)?,
            "distortion constant" => lists.entry("distortion").or_default().push(figure()?),
            "rotational constant" => lists.entry("rotational_constants").or_default().push(figure()?),
            "wavenumber" => {
                let modes = lists.entry("vibrations").or_default();
                match degeneracy {
                    "" | "1" => modes.push(figure()?),
                    more => modes.push(Value::List(vec![figure()?, number(more)?])),
                }
            }
            _ => return Err(wrong("has a property that is none of the known ones")),
        }
    }
    map.extend(lists.into_iter().map(|(key, list)| (key.to_owned(), Value::List(list))));
    Ok(map)
}
