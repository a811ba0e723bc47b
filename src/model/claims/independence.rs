//! Whether the inputs of one table are independent of each other.

use std::collections::BTreeMap;

use crate::model::review::plural;
use crate::quantity::{Quantity, round};
use crate::record::node::LeafKey;
use crate::record::register::Tested;
use crate::units::reader_text;

/// `independent-inputs`: u with r = 0 between the rows of one table, against u with r = ±1 between them, whichever adds up.
/// Tables that state their coefficients are taken by them, and have nothing to be assumed. Gives what the row is about, and
/// the test; `None` where no two inputs with an uncertainty come from one table.
pub fn worst_correlation(value: &Quantity) -> Option<(String, Tested)> {
    let u = value.spread().u().filter(|u| *u > 0.0)?;
    let mut parts: BTreeMap<String, Vec<f64>> = BTreeMap::new();
    for sensitivity in value.sensitivities() {
        let (Some(input), Some(part)) = (sensitivity.input(), sensitivity.part()) else { continue };
        let LeafKey::Datum { dataset, field, .. } = &input.key else { continue };
        if part != 0.0 && input.evaluation().correlation.is_none() {
            parts.entry(format!("{} of {dataset}", plural(field))).or_default().push(part);
        }
    }
    parts.retain(|_, rows| rows.len() > 1);
    if parts.is_empty() {
        return None;
    }
    let squares = |rows: &[f64]| rows.iter().map(|part| part * part).sum::<f64>();
    let with = |joined: fn(&[f64]) -> f64| {
        let more: f64 = parts.values().map(|rows| joined(rows) * joined(rows) - squares(rows)).sum();
        f64::sqrt((u * u + more).max(0.0))
    };
    let worst = with(|rows| rows.iter().map(|part| part.abs()).sum());
    let alike = with(|rows| rows.iter().sum());
    // Nothing is left where all of it cancels.
    let alike = if alike < 1e-6 * u { 0.0 } else { alike };
    let unit = value.unit();
    let shown =
        |si: f64| format!("{} {}", round::significant(si / unit.factor, 2), reader_text(&unit)).trim_end().to_owned();
    let how = format!(
        "no coefficients are on record: u is {} with r = 0, {} with r = 1 between all of them, and {} where r = ±1 adds up most; the price \
         is that of u",
        shown(u),
        shown(alike),
        shown(worst)
    );
    let about = parts.keys().cloned().collect::<Vec<_>>().join(", ");
    Some((about, Tested::Spread { price: u - worst, how }))
}
