//! Compares a value with what was sealed or recorded of it: the verdict, the move with its causes, and what else changed.
//!
//! The surprise: a move is one at any size where a cell was edited, while other bits without another printed figure are
//! *same as printed*; and only moves by revised data or constants can be *within u*.

use crate::model::review::signed;
use crate::notebook::audit::{figure, lapsed};
use crate::notebook::causes::{Exchanged, Grounds};
use crate::notebook::parting;
use crate::notebook::seal::SealedValue;
use crate::notebook::skeleton::sealed_kind;
use crate::notebook::trial::Tried;
use crate::notebook::verdict::{Cause, CauseKind, Move, Outcome, Verdict, row_words};
use crate::quantity::round::{self, shortest};
use crate::render::report::{Assumption, Record};
use crate::units::{self, Unit, What};

/// A value beside its seal.
pub struct Compared<'a> {
    pub sealed: &'a SealedValue,
    pub now: &'a Tried,
    /// The value with the sealed records and constants, from which data and constants are exchanged.
    pub with_sealed_data: Option<&'a Tried>,
}

/// What became of a sealed value.
pub fn compare(compared: &Compared, grounds: &Grounds, shares: &[Exchanged]) -> Outcome {
    let Compared { sealed, now, .. } = compared;
    let record = &sealed.record;
    let mut base = Base::of(record, now);
    let (kind_then, kind_now) = (&sealed.kind, sealed_kind(now.value.kind()));
    if kind_then.what != kind_now.what {
        base.notes.push(format!("it was {}, and is {}", kind_then.what, kind_now.what));
        base.other_unit = true;
    }
    let reason = |id: &str, subject: &str| {
        sealed.decisions.iter().any(|one| one.id == id && one.subject == subject && one.reason.is_some())
    };
    let moved = base.by.filter(|_| base.differs()).map(|by| moved(compared, by, grounds, shares));
    let edited = moved
        .iter()
        .flat_map(|moved| &moved.causes)
        .any(|cause| matches!(cause.kind, CauseKind::Cell | CauseKind::Module | CauseKind::Seal));
    let within_u = moved.as_ref().is_some_and(is_within_u);
    base.outcome(record, now, moved, edited, within_u, &reason)
}

/// The same for a value that only its recorded output tells of.
pub fn against_record(record: &Record, now: &Tried) -> Outcome {
    let base = Base::of(record, now);
    let moved = base.by.filter(|_| base.differs()).map(|by| Move {
        by: shortest(by),
        shown: shown(now, &record.unit, by),
        causes: Vec::new(),
        remainder: shortest(by),
        remainder_shown: shown(now, &record.unit, by),
        u_of_changed: None,
        u_of_changed_shown: None,
        parts_at: None,
    });
    let reason = |id: &str, subject: &str| {
        let of = |row: &&Assumption| row.id == id && row.subject == subject;
        record
            .assumptions
            .iter()
            .find(of)
            .is_some_and(|row| row.dealt.as_ref().is_some_and(|d| d.contains("justified")))
    };
    base.outcome(record, now, moved, false, false, &reason)
}

/// What is the same and what is not, before causes.
struct Base {
    /// Value now minus value then, in the unit of then; none where the two cannot be compared.
    by: Option<f64>,
    same_value: bool,
    same_u: bool,
    other_unit: bool,
    notes: Vec<String>,
}

impl Base {
    fn of(record: &Record, now: &Tried) -> Base {
        let is = &now.report.record;
        let mut notes = Vec::new();
        let other_unit = record.unit != is.unit;
        if other_unit {
            notes.push(format!("it was in {}, and is in {}", record.unit, is.unit));
        }
        if number(record).is_none() {
            let value: String = record.value.chars().take(40).collect();
            notes.push(format!("the seal has `{value}` for its value, which is no number"));
        }
        let by = number(record).zip(in_unit_of(record, now)).map(|(then, now)| now - then);
        let same_u = record.u == is.u && record.u_coverage == is.u_coverage;
        if !same_u && !other_unit {
            let word = |u: &Option<String>| match u.as_deref().map(str::parse::<f64>) {
                Some(Ok(u)) => with_unit(&round::fixed(u, round::decimals_for(u)), &record.unit),
                _ => "not stated".to_owned(),
            };
            let (then, now) = (word(&record.u), word(&is.u));
            if record.u_coverage != is.u_coverage {
                notes.push(format!("u: {then} then, {now} now, and it covers other inputs"));
            } else if then != now {
                notes.push(format!("u: {then} then, {now} now"));
            }
        }
        if record.conditions != is.conditions {
            notes.push(format!("conditions: {} then, {} now", record.conditions, is.conditions));
        }
        Base { by, same_value: record.value == is.value && !other_unit, same_u, other_unit, notes }
    }

    /// Whether the move is too small to be seen in the printed digits. The printed text alone says nothing: it stands in the
    /// file like the number, and may not belong to it.
    fn prints_alike(&self, record: &Record, now: &Tried) -> bool {
        let digit = 2.0 * now.value.shown().half_digit_si / factor_of(&record.unit);
        self.by.is_some_and(|by| by.abs() <= digit.abs())
    }

    fn differs(&self) -> bool {
        !(self.same_value && self.same_u)
    }

    fn outcome(
        mut self,
        record: &Record,
        now: &Tried,
        moved: Option<Move>,
        edited: bool,
        within_u: bool,
        justified: &dyn Fn(&str, &str) -> bool,
    ) -> Outcome {
        let is = &now.report.record;
        let same_figures = !self.differs();
        let rows = changed_rows(record, is, same_figures);
        let logarithmic = now.value.kind().what == What::K;
        let lapses: Vec<String> = (record.assumptions.iter())
            .filter(|row| justified(&row.id, &row.subject))
            .filter_map(|row| {
                let same = |other: &&Assumption| other.id == row.id && other.subject == row.subject;
                let price = is.assumptions.iter().find(same)?;
                lapsed(record, row.price.as_deref(), is, price.price.as_deref(), logarithmic).then(|| {
                    let word = |row: &Assumption| row.price_shown.clone().unwrap_or_else(|| "no price".to_owned());
                    format!("justification of {} lapsed: {} at signing, {} now", row_words(row), word(row), word(price))
                })
            })
            .collect();
        let other_conditions = record.conditions != is.conditions;
        let verdict = if self.other_unit {
            Verdict::UnitOrBasisChanged
        } else if !same_figures && record.shown == is.shown && !edited && self.prints_alike(record, now) {
            Verdict::SameAsPrinted
        } else if !same_figures && within_u {
            Verdict::WithinU
        } else if !same_figures {
            Verdict::Moved
        } else {
            Verdict::Identical
        };
        let under = if !lapses.is_empty() {
            Verdict::JustificationLapsed
        } else if !rows.is_empty() || other_conditions {
            Verdict::AssumptionChanged
        } else {
            Verdict::Identical
        };
        self.notes.extend(lapses);
        self.notes.extend(rows);
        Outcome { verdict: verdict.max(under), figure: Some(figure(is)), moved, notes: self.notes }
    }
}

fn number(record: &Record) -> Option<f64> {
    record.value.parse().ok().filter(|value: &f64| value.is_finite())
}

/// The value in the unit of a record, where it can be.
pub fn in_unit_of(record: &Record, now: &Tried) -> Option<f64> {
    if record.unit == now.report.record.unit {
        return number(&now.report.record);
    }
    unit_of(&record.unit).filter(|unit| unit.dim == *now.value.dim()).map(|unit| unit.from_si(now.value.si()))
}

fn unit_of(text: &str) -> Option<Unit> {
    units::parse::unit(text).ok()
}

/// SI value of one of a unit, for differences.
pub fn factor_of(text: &str) -> f64 {
    unit_of(text).map_or(1.0, |unit| match unit.scale {
        units::Scale::Plain => unit.factor,
        units::Scale::Point { degrees, .. } => 1.0 / degrees,
    })
}

/// A difference for people: with the digits of the value, and never as a bare 0 where it is none.
pub fn shown(of: &Tried, unit: &str, by: f64) -> String {
    let half_digit = of.value.shown().half_digit_si / factor_of(unit);
    let rounded = signed(half_digit, by);
    let vanishes = !rounded.chars().any(|c| ('1'..='9').contains(&c));
    let number = if by != 0.0 && vanishes { format!("{by:+.1e}") } else { rounded };
    with_unit(&number, unit)
}

/// A number with its unit as people write it, without the basis.
fn with_unit(number: &str, unit: &str) -> String {
    let reader = unit_of(unit).map_or_else(|| unit.to_owned(), |unit| units::reader_text(&unit));
    format!("{number} {reader}").trim_end().to_owned()
}

/// Rows that came, went or have another status or decision; other prices where the value itself is the same.
fn changed_rows(then: &Record, now: &Record, with_prices: bool) -> Vec<String> {
    let find = |rows: &'_ [Assumption], like: &Assumption| {
        rows.iter().find(|row| row.id == like.id && row.subject == like.subject).cloned()
    };
    let mut notes = Vec::new();
    for row in &then.assumptions {
        let Some(is) = find(&now.assumptions, row) else {
            notes.push(format!("{}: was {}, is gone", row_words(row), row.status));
            continue;
        };
        if row.status != is.status {
            notes.push(format!("{}: was {}, is {}", row_words(row), row.status, is.status));
        }
        let word = |text: &Option<String>| text.clone().unwrap_or_else(|| "no price".to_owned());
        if with_prices && row.price_shown != is.price_shown {
            notes.push(format!(
                "{}: price {} then, {} now",
                row_words(row),
                word(&row.price_shown),
                word(&is.price_shown)
            ));
        }
        let decided = |dealt: &Option<String>| {
            dealt.clone().map(|text| text.split("; not corrected").next().unwrap_or("").to_owned())
        };
        if decided(&row.dealt) != decided(&is.dealt) {
            let word = |text: &Option<String>| text.clone().unwrap_or_else(|| "not dealt with".to_owned());
            notes.push(format!(
                "{}: the decision was \"{}\", and is \"{}\"",
                row_words(row),
                word(&row.dealt),
                word(&is.dealt)
            ));
        }
    }
    for row in &now.assumptions {
        if find(&then.assumptions, row).is_none() {
            notes.push(format!("{}: is new, {}", row_words(row), row.status));
        }
    }
    notes
}

fn is_within_u(moved: &Move) -> bool {
    let by_data = |cause: &Cause| matches!(cause.kind, CauseKind::Data | CauseKind::Constants);
    let number = |text: &str| text.parse::<f64>().ok();
    let by = number(&moved.by);
    !moved.causes.is_empty()
        && moved.causes.iter().all(by_data)
        && moved.u_of_changed.as_deref().and_then(number).zip(by).is_some_and(|(u, by)| by.abs() <= u)
}

/// The move with its causes: what the sealed records already explain, then data and constants one at a time.
fn moved(compared: &Compared, by: f64, grounds: &Grounds, shares: &[Exchanged]) -> Move {
    let Compared { sealed, now, with_sealed_data } = compared;
    let record = &sealed.record;
    let factor = factor_of(&record.unit);
    let mut causes = Vec::new();
    let mut told = 0.0;
    let mut cause = |kind: CauseKind, what: String, share: Option<f64>| {
        told += share.unwrap_or(0.0);
        causes.push(Cause {
            kind,
            what,
            share: share.map(shortest),
            shown: share.map(|share| shown(now, &record.unit, share)),
        });
    };
    let then = with_sealed_data.and_then(|then| Some((then, in_unit_of(record, then)?)));
    if let Some((then, value)) = then {
        let moved = value - number(record).unwrap_or(value);
        if moved != 0.0 || then.report.record.u != record.u {
            for (kind, what, share) in grounds.causes(sealed, then, moved) {
                cause(kind, what, share);
            }
        }
    }
    let mut variance = Some(0.0);
    for exchanged in shares {
        let Some((then, _)) = then else { break };
        let label = record.label.as_str();
        match exchanged.values.get(label) {
            Some((si, u)) if *si != then.value.si() || *u != then.value.spread().u() => {
                cause(exchanged.kind, exchanged.what.clone(), Some((si - then.value.si()) / factor));
            }
            Some(_) => continue,
            None => cause(
                exchanged.kind,
                format!("{}: with it alone the value could not be computed", exchanged.what),
                None,
            ),
        }
        variance = variance.zip(exchanged.variance(&then.value)).map(|(sum, one)| sum + one);
    }
    let remainder = by - told;
    // What is left by rounding of the differences is no remainder to speak of.
    let scale = number(record).unwrap_or(0.0).abs().max(by.abs());
    let remainder = if remainder.abs() <= 16.0 * f64::EPSILON * scale { 0.0 } else { remainder };
    let u = variance.filter(|_| !shares.is_empty()).map(|variance| variance.sqrt() / factor);
    Move {
        by: shortest(by),
        shown: shown(now, &record.unit, by),
        causes,
        remainder: shortest(remainder),
        remainder_shown: shown(now, &record.unit, remainder),
        u_of_changed_shown: u.map(|u| with_unit(&round::fixed(u, round::decimals_for(u)), &record.unit)),
        u_of_changed: u.map(shortest),
        parts_at: parting::parting(grounds.seal, sealed, &now.value),
    }
}
