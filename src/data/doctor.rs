//! The table doctor: what is likely wrong with figures of heat capacity, enthalpy and entropy, and which figure was meant.
//!
//! A table is held against ΔH = ∫Cp dT and ΔS = ∫(Cp/T) dT between neighbouring rows, a function against its own joins and
//! against bounds of Cp, and a record against others of the same substance. The surprise: a single wrong figure spoils two
//! neighbouring intervals in a way of its own, equal and opposite for H and S, alike for Cp, which tells the three apart.
//!
//! Bounds of Cp, for crystals and liquids above 250 K: 4 to 60 J/(mol K) per atom; for gases from 5/2 R in all (monatomic) to
//! 60 J/(mol K) per atom. Common practice, no source; diamond has 6.1 and gaseous methane 8.

use crate::num::pchip::Pchip;

use super::roughness;

/// Something that is likely wrong.
#[derive(Clone, Debug, PartialEq)]
pub struct Finding {
    /// Where: a row, a range, a field.
    pub place: String,
    /// What is wrong with it.
    pub what: String,
    /// The figure or the cause that would mend it.
    pub likely: Option<String>,
}

/// One row of a printed table, in SI units, with the size of one unit in the last printed digit.
#[derive(Clone, Debug, PartialEq)]
pub struct Row {
    pub t_k: f64,
    pub cp: Printed,
    pub s: Option<Printed>,
    /// Counted from anywhere.
    pub h: Option<Printed>,
}

/// A printed figure.
#[derive(Clone, Debug, PartialEq)]
pub struct Printed {
    pub si: f64,
    pub digit: f64,
}

/// Calories in joules.
const CALORIE: f64 = 4.184;

/// What is likely wrong with a table; `per` says in which unit a figure is shown: SI over that.
pub fn of_table(rows: &[Row]) -> Vec<Finding> {
    let mut findings = Vec::new();
    if let Some(finding) = order(rows) {
        return vec![finding];
    }
    for row in rows.iter().filter(|row| row.cp.si <= 0.0) {
        findings.push(Finding {
            place: place(row),
            what: format!("Cp is {}, and a stable phase takes up heat", row.cp.si),
            likely: Some(format!("{} with its sign the other way", -row.cp.si)),
        });
    }
    if !findings.is_empty() || rows.len() < 4 {
        return findings;
    }
    if is_heat_capacity_alone(rows) {
        return roughness::of_heat_capacities(rows);
    }
    let curve = Pchip::new(rows.iter().map(|row| row.t_k).collect(), rows.iter().map(|row| row.cp.si).collect());
    let kept = |of: fn(&Row) -> Option<&Printed>, over_t: bool| -> Option<Vec<Step>> {
        rows.windows(2)
            .map(|pair| {
                let (low, high) = (of(&pair[0])?, of(&pair[1])?);
                let (t0, t1) = (pair[0].t_k, pair[1].t_k);
                let integral = curve.integral(t0, t1, over_t).value;
                let scale = if over_t { (t1 - t0) / (0.5 * (t0 + t1)) } else { t1 - t0 };
                // Half a digit of each figure, and a part of what the curvature of Cp makes.
                let straight = 0.5 * (pair[0].cp.si + pair[1].cp.si) * scale;
                let rounding = 0.5 * (low.digit + high.digit) + 0.5 * scale * pair[0].cp.digit.max(pair[1].cp.digit);
                let noise = 1.5 * rounding + 0.3 * (integral - straight).abs();
                Some(Step { change: high.si - low.si, integral, noise })
            })
            .collect()
    };
    let by_h = kept(|row| row.h.as_ref(), false);
    let by_s = kept(|row| row.s.as_ref(), true);
    for (name, steps) in [("H", &by_h), ("S", &by_s)] {
        let Some(steps) = steps else { continue };
        if let Some(finding) = unit_slip(name, steps) {
            return vec![finding];
        }
    }
    findings.extend(single_figures(rows, by_h.as_deref(), by_s.as_deref()));
    findings
}

/// Whether no identity can be asked of it.
fn is_heat_capacity_alone(rows: &[Row]) -> bool {
    let all = |of: fn(&Row) -> Option<&Printed>| rows.iter().all(|row| of(row).is_some());
    !all(|row| row.h.as_ref()) && !all(|row| row.s.as_ref())
}

/// What a table does not have, so that less was asked of it.
pub fn less_checked(rows: &[Row]) -> Option<&'static str> {
    match is_heat_capacity_alone(rows) {
        true if rows.len() < roughness::LEAST_ROWS => {
            Some("not checked but for order and sign: Cp alone, in too few rows to hold them against each other")
        }
        true => Some("Cp alone, so each row was held against its neighbours and against no H or S"),
        false if rows.len() < 4 => Some("not checked but for order and sign: too few rows"),
        false => None,
    }
}

/// What a table says of one interval, and what its heat capacities make of it.
struct Step {
    change: f64,
    integral: f64,
    noise: f64,
}

impl Step {
    fn off(&self) -> f64 {
        self.change - self.integral
    }

    fn is_off(&self) -> bool {
        self.off().abs() > self.noise
    }
}

pub(super) fn place(row: &Row) -> String {
    format!("row at {} K", row.t_k)
}

fn order(rows: &[Row]) -> Option<Finding> {
    let at = (1..rows.len()).find(|&at| rows[at].t_k <= rows[at - 1].t_k)?;
    let (before, after) = (rows[at - 1].t_k, rows[at].t_k);
    let swapped = {
        let mut t: Vec<f64> = rows.iter().map(|row| row.t_k).collect();
        t.swap(at - 1, at);
        t.windows(2).all(|pair| pair[0] < pair[1])
    };
    Some(Finding {
        place: format!("row at {after} K"),
        what: format!("it follows the row at {before} K, and temperatures ascend"),
        likely: swapped.then(|| "these two rows have changed places".to_owned()),
    })
}

/// A factor of 4.184 between what the two sides of an identity say, over most of the table.
fn unit_slip(name: &str, steps: &[Step]) -> Option<Finding> {
    let mut ratios: Vec<f64> = steps.iter().map(|step| step.change / step.integral).collect();
    ratios.sort_by(f64::total_cmp);
    let middle = ratios[ratios.len() / 2];
    let near = |factor: f64| (middle / factor - 1.0).abs() < 0.03;
    let likely = if near(CALORIE) {
        format!("Cp is in calories, or {name} in joules where Cp is taken for calories")
    } else if near(1.0 / CALORIE) {
        format!("{name} is in calories, where Cp is in joules")
    } else {
        return None;
    };
    Some(Finding {
        place: "the whole table".to_owned(),
        what: format!("{name} changes by {middle:.3} times what Cp makes of it"),
        likely: Some(likely),
    })
}

/// Rows of which one figure does not fit its neighbours; the worst first, and none beside a worse one, which it suffers from.
fn single_figures(rows: &[Row], by_h: Option<&[Step]>, by_s: Option<&[Step]>) -> Vec<Finding> {
    let mut suspects: Vec<(f64, usize, Finding)> = Vec::new();
    for (at, row) in rows.iter().enumerate() {
        let around = |steps: Option<&[Step]>| -> Option<Around> {
            let steps = steps?;
            let (before, after) = (at.checked_sub(1).and_then(|at| steps.get(at))?, steps.get(at)?);
            let noise = before.noise.max(after.noise);
            (before.is_off() && after.is_off()).then(|| Around { before: before.off(), after: after.off(), noise })
        };
        let (h, s) = (around(by_h), around(by_s));
        let worst = [&h, &s].into_iter().flatten().map(Around::size).fold(0.0, f64::max);
        let mut told = |name: &str, printed: &Printed, wanted: f64, noise: f64, per: f64| {
            let figure = swapped(printed, wanted, noise, per);
            let likely = match figure {
                Some(figure) => format!("{figure}, two digits having changed places"),
                None => format!("about {}", shown(wanted / per, printed.digit / per)),
            };
            let what = format!("{name} = {} does not fit its neighbours", shown(printed.si / per, printed.digit / per));
            suspects.push((worst, at, Finding { place: place(row), what, likely: Some(likely) }));
        };
        let cp = |around: &Around, factor: f64| {
            let span = rows[at + 1].t_k - rows[at - 1].t_k;
            // ∫Cp is too large by the error of Cp over half of both intervals, so the change seems too small by it.
            let error = 2.0 * (around.before + around.after) / span * factor;
            (error, (4.0 * around.noise / span * factor).max(0.3 * error.abs()))
        };
        match (&h, &s) {
            (Some(h), _) if h.opposite() && s.as_ref().is_none_or(|s| !s.alike()) => {
                if let Some(printed) = &row.h {
                    told("H", printed, printed.si - h.before, h.noise, 1000.0);
                }
            }
            (_, Some(s)) if s.opposite() && h.as_ref().is_none_or(|h| !h.alike()) => {
                if let Some(printed) = &row.s {
                    told("S", printed, printed.si - s.before, s.noise, 1.0);
                }
            }
            (Some(h), _) if h.alike() => {
                let (error, noise) = cp(h, 1.0);
                told("Cp", &row.cp, row.cp.si + error, noise, 1.0);
            }
            (None, Some(s)) if s.alike() => {
                let (error, noise) = cp(s, row.t_k);
                told("Cp", &row.cp, row.cp.si + error, noise, 1.0);
            }
            _ => {}
        }
    }
    suspects.sort_by(|a, b| b.0.total_cmp(&a.0));
    let mut kept: Vec<(usize, Finding)> = Vec::new();
    for (_, at, finding) in suspects {
        if kept.iter().all(|(known, _)| known.abs_diff(at) > 2) {
            kept.push((at, finding));
        }
    }
    kept.into_iter().map(|(_, finding)| finding).collect()
}

/// The intervals on both sides of a row, both off.
struct Around {
    before: f64,
    after: f64,
    noise: f64,
}

impl Around {
    fn size(&self) -> f64 {
        (self.before.abs() + self.after.abs()) / self.noise
    }

    fn opposite(&self) -> bool {
        self.before * self.after < 0.0 && (self.before + self.after).abs() <= 2.0 * self.noise
    }

    fn alike(&self) -> bool {
        self.before * self.after > 0.0
    }
}

pub(super) fn shown(value: f64, digit: f64) -> String {
    let decimals = crate::quantity::round::decimals_of_digit(digit);
    crate::quantity::round::fixed(value, decimals.max(0))
}

/// The figure with two neighbouring digits in the other order that comes nearest to what is wanted, within the noise.
pub fn swapped(printed: &Printed, wanted: f64, noise: f64, per: f64) -> Option<String> {
    let text = shown(printed.si / per, printed.digit / per);
    let digits: Vec<char> = text.chars().collect();
    let places: Vec<usize> = (0..digits.len()).filter(|&at| digits[at].is_ascii_digit()).collect();
    let candidates = places.windows(2).filter_map(|pair| {
        let mut other = digits.clone();
        other.swap(pair[0], pair[1]);
        let other: String = other.into_iter().collect();
        let value: f64 = other.parse().ok()?;
        (other != text).then_some((other, (value * per - wanted).abs()))
    });
    let best = candidates.min_by(|a, b| a.1.total_cmp(&b.1))?;
    (best.1 <= noise.max(1.5 * printed.digit)).then_some(best.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// An invented liquid with Cp = 60 + 0.2 T, in rows of 20 K, printed to 0.01, 0.001 and 1 J.
    fn table() -> Vec<Row> {
        (0..12)
            .map(|n| {
                let t = 280.0 + 20.0 * f64::from(n);
                let rounded = |x: f64, digit: f64| Printed { si: (x / digit).round() * digit, digit };
                let h = 60.0 * (t - 298.15) + 0.1 * (t * t - 298.15 * 298.15);
                let s = 150.0 + 60.0 * crate::num::math::ln(t / 298.15) + 0.2 * (t - 298.15);
                Row { t_k: t, cp: rounded(60.0 + 0.2 * t, 0.01), s: Some(rounded(s, 0.001)), h: Some(rounded(h, 1.0)) }
            })
            .collect()
    }

    fn planted(change: impl FnOnce(&mut Vec<Row>)) -> Vec<Finding> {
        let mut rows = table();
        change(&mut rows);
        of_table(&rows)
    }

    #[test]
    fn a_sound_table_has_no_findings() {
        assert_eq!(of_table(&table()), []);
    }

    #[test]
    fn each_planted_error_is_found_and_what_was_meant_is_named() {
        let named = |findings: Vec<Finding>, place: &str, words: &str| {
            let fits = |one: &Finding| {
                one.place == place && one.likely.as_deref().is_some_and(|likely| likely.contains(words))
            };
            assert!(findings.len() == 1 && fits(&findings[0]), "{place}, {words}: {findings:?}");
        };
        // H(360 K) is 7.782 kJ/mol and Cp(380 K) 136.00 J/(mol K): two digits in the other order.
        named(planted(|rows| rows[4].h.as_mut().unwrap().si = 7872.0), "row at 360 K", "7.782");
        named(planted(|rows| rows[5].cp.si = 163.0), "row at 380 K", "136.0");
        let s = table()[6].s.clone().unwrap().si;
        named(planted(|rows| rows[6].s.as_mut().unwrap().si = s + 9.0), "row at 400 K", "1");
        named(planted(|rows| rows.swap(3, 4)), "row at 340 K", "changed places");
        named(planted(|rows| rows[7].cp.si *= -1.0), "row at 420 K", "sign");
        named(planted(|rows| rows.iter_mut().for_each(|row| row.cp.si /= CALORIE)), "the whole table", "calories");
    }
}
