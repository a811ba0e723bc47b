//! Rows far off the curve through their neighbours: what is left to ask of a table that has heat capacities alone.
//!
//! Each row is held against the cubic through the two rows on either side of it. The surprise: a wrong row spoils what its
//! neighbours are held against, so a row is doubted by leaving it out, and only if the rest is then many times smoother.
//! The more rows are left out, the smoother the rest is by choice alone, so more is asked then. How many times, and that a
//! quarter of the rows may be wrong, are common practice, no source.

use super::doctor::{Finding, Printed, Row, place, shown, swapped};

/// Fewer rows than these say nothing of each other.
pub const LEAST_ROWS: usize = 6;

/// A doubted row is this many times as far off as the worst of the rest, times the square of the number left out.
const TIMES: f64 = 5.0;

/// One at an end is extrapolated to, which goes wrong this many times as fast.
const AT_END: f64 = 3.0;

/// What the rest makes of a row, and by how much rounding of the rest may have shifted that.
struct Expected {
    cp: f64,
    rounding: f64,
    inside: bool,
}

/// Rows of which Cp does not fit its neighbours, by temperature.
pub fn of_heat_capacities(rows: &[Row]) -> Vec<Finding> {
    let mut kept: Vec<usize> = (0..rows.len()).collect();
    let mut left_out: Vec<usize> = Vec::new();
    let mut found = Vec::new();
    for _ in 0..rows.len() / 4 {
        if kept.len() < LEAST_ROWS {
            break;
        }
        // The row without which the rest is smoothest.
        let Some(at) = (0..kept.len())
            .min_by(|&a, &b| worst(rows, &without(&kept, a)).total_cmp(&worst(rows, &without(&kept, b))))
        else {
            break;
        };
        left_out.push(kept.remove(at));
        let count = left_out.len() as f64;
        let limit = TIMES * count * count * worst(rows, &kept);
        let told: Option<Vec<(usize, Finding)>> =
            left_out.iter().map(|&row| Some((row, far_off(rows, &kept, row, limit)?))).collect();
        // Two wrong rows of unlike size: the worse alone stands out already, and both do when both are left out.
        found = told.unwrap_or(found);
    }
    found.sort_by_key(|(row, _)| *row);
    found.into_iter().map(|(_, finding)| finding).collect()
}

fn without(kept: &[usize], at: usize) -> Vec<usize> {
    kept.iter().enumerate().filter(|(nth, _)| *nth != at).map(|(_, row)| *row).collect()
}

/// How far the worst row inside is off what the others make of it, beyond rounding.
fn worst(rows: &[Row], kept: &[usize]) -> f64 {
    (1..kept.len().saturating_sub(1))
        .filter_map(|at| {
            let expected = expected(rows, &without(kept, at), kept[at])?;
            Some((rows[kept[at]].cp.si - expected.cp).abs() - expected.rounding)
        })
        .fold(0.0, f64::max)
}

/// What is wrong with a row that is further off than the limit and rounding allow.
fn far_off(rows: &[Row], kept: &[usize], row: usize, limit: f64) -> Option<Finding> {
    let expected = expected(rows, kept, row)?;
    let limit = (limit + TIMES * expected.rounding) * if expected.inside { 1.0 } else { AT_END };
    if (rows[row].cp.si - expected.cp).abs() <= limit {
        return None;
    }
    let Printed { si, digit } = rows[row].cp;
    let likely = swapped(&rows[row].cp, expected.cp, limit, 1.0);
    Some(Finding {
        place: place(&rows[row]),
        what: format!("Cp = {} is far off the curve through its neighbours", shown(si, digit)),
        likely: Some(match likely {
            Some(figure) => format!("{figure}, two digits having changed places"),
            None => format!("about {}", shown(expected.cp, digit)),
        }),
    })
}

/// Lagrange's polynomial through the two kept rows on either side, or the two nearest where a side has none.
fn expected(rows: &[Row], kept: &[usize], row: usize) -> Option<Expected> {
    let above = kept.partition_point(|&other| other < row);
    let inside = above > 0 && above < kept.len();
    let range = match inside {
        true => above.saturating_sub(2)..(above + 2).min(kept.len()),
        false if above == 0 => 0..2.min(kept.len()),
        false => kept.len().saturating_sub(2)..kept.len(),
    };
    let (near, t) = (kept.get(range)?, rows[row].t_k);
    let (mut cp, mut rounding) = (0.0, 0.5 * rows[row].cp.digit);
    for &one in near {
        let others = near.iter().filter(|&&other| other != one);
        let weight: f64 = others.map(|&other| (t - rows[other].t_k) / (rows[one].t_k - rows[other].t_k)).product();
        cp += weight * rows[one].cp.si;
        rounding += 0.5 * weight.abs() * rows[one].cp.digit;
    }
    (near.len() > 1).then_some(Expected { cp, rounding, inside })
}

#[cfg(test)]
mod tests {
    use super::*;

    /// An invented liquid with Cp = 60 + 0.2 T + 1e-4 T², in rows of 20 K from 280 K, printed to 0.1.
    fn table(count: u32) -> Vec<Row> {
        let row = |n: u32| {
            let t_k = 280.0 + 20.0 * f64::from(n);
            let cp = ((60.0 + 0.2 * t_k + 1e-4 * t_k * t_k) / 0.1).round() * 0.1;
            Row { t_k, cp: Printed { si: cp, digit: 0.1 }, s: None, h: None }
        };
        (0..count).map(row).collect()
    }

    #[test]
    fn a_smooth_table_has_no_findings() {
        for count in [6, 7, 12, 40] {
            assert_eq!(of_heat_capacities(&table(count)), []);
        }
    }

    #[test]
    fn each_planted_row_is_found_wherever_it_stands_and_two_of_them_too() {
        for count in [7, 12] {
            for at in 0..count as usize {
                let mut rows = table(count);
                rows[at].cp.si *= 10.0;
                let found = of_heat_capacities(&rows);
                assert!(found.len() == 1 && found[0].place == place(&rows[at]), "{count}, {at}: {found:?}");
            }
        }
        let mut rows = table(12);
        // 136.0 at 380 K became 163.0, and a digit of another row was lost.
        let right = rows[5].cp.si;
        rows[5].cp.si += 27.0;
        rows[9].cp.si /= 10.0;
        let found = of_heat_capacities(&rows);
        assert_eq!(found.len(), 2, "{right}: {found:?}");
    }

    #[test]
    fn scatter_alone_is_no_finding() {
        // Scatter of ±0.6 % from a linear congruential generator (Knuth, MMIX, from memory), 200 tables.
        let mut state = 11_u64;
        for _ in 0..200 {
            let mut rows = table(12);
            for row in &mut rows {
                state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
                row.cp.si *= 1.0 + 0.012 * ((state >> 33) as f64 / f64::from(1_u32 << 31) - 0.5);
            }
            assert_eq!(of_heat_capacities(&rows), []);
        }
    }
}
