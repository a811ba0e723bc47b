//! A unit as it is written: rows of the table with their powers, above and below the fraction line.
//!
//! Main type: [`Terms`]; it knows its factor, its dimension and its machine text. The surprise: the order of the terms
//! is kept and the factor is computed from that order alone, so the same text always gives the same bits.

use std::fmt::Write;

use crate::units::dimension::{Base, Dimension, Entity, Of};
use crate::units::parse::MAX_BYTES;
use crate::units::table::{Prefix, Row, Spelled, lookup};
use crate::units::unit::{Scale, Unit};
use crate::units::unit_error::UnitError;

/// Powers are kept in halves within what a [`Dimension`] can hold.
const MOST_HALVES: i32 = i8::MAX as i32;

/// One factor of a unit: `kJ`, `mol[CH4]^-1`.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Term {
    pub row: &'static Row,
    pub prefix: Option<&'static Prefix>,
    /// What moles or mass are of. `None` is the open mole and the plain kilogram.
    pub of: Option<Entity>,
    /// The power, in halves, with its sign. Never 0.
    pub halves: i32,
}

impl Term {
    pub fn new(spelled: Spelled, of: Option<Entity>, halves: i32) -> Self {
        Term { row: spelled.row, prefix: spelled.prefix, of, halves }
    }

    /// `kJ` or `mol[CH4]`: the term without its power.
    pub fn stem(&self) -> String {
        let prefix = self.prefix.map_or("", |prefix| prefix.symbol);
        match self.of {
            Some(entity) => format!("{prefix}{}[{}]", self.row.symbol(), entity.name()),
            None => format!("{prefix}{}", self.row.symbol()),
        }
    }

    fn is_like(&self, other: &Term) -> bool {
        std::ptr::eq(self.row, other.row)
            && self.prefix == other.prefix
            && self.of == other.of
            && (self.halves > 0) == (other.halves > 0)
    }

    fn dim(&self) -> Option<Dimension> {
        let one = match (self.of, self.row.counts()) {
            (Some(entity), Some(Of::Amount)) => Dimension::amount(entity),
            (Some(entity), Some(Of::Mass)) => Dimension::mass(entity),
            _ => self.row.dim(),
        };
        one.powered(self.halves)
    }
}

/// A product of terms. Equal terms on the same side of the fraction line are one; `mol/mol` stays as it is.
#[derive(Clone, Debug, Default)]
pub(crate) struct Terms {
    terms: Vec<Term>,
}

impl Terms {
    pub fn of(terms: impl IntoIterator<Item = Term>) -> Result<Terms, UnitError> {
        let mut out = Terms::default();
        for term in terms {
            out.push(term)?;
        }
        // Above the line first, as the text has it: the factor must not depend on how the unit was first written.
        out.terms.sort_by_key(|term| term.halves < 0);
        Ok(out)
    }

    fn push(&mut self, term: Term) -> Result<(), UnitError> {
        let total = match self.terms.iter_mut().find(|known| known.is_like(&term)) {
            Some(known) => {
                known.halves = known.halves.saturating_add(term.halves);
                known.halves
            }
            None => {
                self.terms.push(term);
                term.halves
            }
        };
        if total.abs() > MOST_HALVES {
            return Err(UnitError::ExponentTooLarge { symbol: term.stem() });
        }
        Ok(())
    }

    pub fn list(&self) -> &[Term] {
        &self.terms
    }

    pub fn over(&self) -> impl Iterator<Item = &Term> + Clone {
        self.terms.iter().filter(|term| term.halves > 0)
    }

    pub fn under(&self) -> impl Iterator<Item = &Term> + Clone {
        self.terms.iter().filter(|term| term.halves < 0)
    }

    /// The unit; refused where its power or its size is past what the program holds.
    pub fn unit(&self) -> Result<Unit, UnitError> {
        let text = self.text();
        // Brackets to a power grow when they are multiplied out, and machine text must parse back.
        if text.len() > MAX_BYTES {
            return Err(UnitError::TooLong { bytes: text.len() });
        }
        let factor = self.factor();
        if !factor.is_normal() {
            return Err(UnitError::SizeOutOfRange { text });
        }
        Ok(Unit { factor, dim: self.dim()?, scale: self.scale()?, text: text.into() })
    }

    fn scale(&self) -> Result<Scale, UnitError> {
        let Some(point) = self.over().find(|term| term.row.ice.is_some()) else { return Ok(Scale::Plain) };
        match (point.row.ice, self.terms.len(), point.halves) {
            (Some(ice), 1, 2) => {
                let size = &point.row.size;
                Ok(Scale::Point { ice, degrees: size.denominator as f64 / size.numerator as f64 })
            }
            _ => Err(UnitError::PointInProduct {
                symbol: point.row.symbol(),
                interval: interval_symbol(point.row),
                text: self.text(),
                instead: self.with_intervals().text(),
            }),
        }
    }

    /// The same product with the intervals K and degR in the place of degC and degF.
    fn with_intervals(&self) -> Terms {
        let terms = self.terms.iter().map(|term| match lookup(interval_symbol(term.row)) {
            Some(interval) if term.row.ice.is_some() => Term { row: interval.row, ..*term },
            _ => *term,
        });
        Terms { terms: terms.collect() }
    }

    fn dim(&self) -> Result<Dimension, UnitError> {
        let mut dim = Dimension::none();
        for term in &self.terms {
            let too_large = || UnitError::ExponentTooLarge { symbol: term.stem() };
            let next = term.dim().ok_or_else(too_large)?;
            let sums = Base::ALL.map(|base| i32::from(dim.halves(base)) + i32::from(next.halves(base)));
            let counted = next.entities().iter().map(|e| i32::from(e.2) + i32::from(dim.exponent_of(e.0, e.1)));
            if sums.into_iter().chain(counted).any(|sum| sum.abs() > MOST_HALVES) {
                return Err(too_large());
            }
            dim = dim.times(&next);
        }
        Ok(dim)
    }

    fn factor(&self) -> f64 {
        let mut whole = Exact::ONE;
        let mut root = Exact::ONE;
        for term in &self.terms {
            let ten = term.row.size.ten + term.prefix.map_or(0, |prefix| prefix.ten);
            let (numerator, denominator) = (term.row.size.numerator, term.row.size.denominator);
            // A power of -1/2 is -1 and then 1/2.
            whole.multiply(numerator, denominator, ten, term.halves.div_euclid(2));
            root.multiply(numerator, denominator, ten, term.halves.rem_euclid(2));
        }
        whole.value() * root.value().sqrt()
    }

    /// Machine text, which parses back to the same terms.
    pub fn text(&self) -> String {
        let side = |terms: &mut dyn Iterator<Item = &Term>| {
            terms.map(|term| format!("{}{}", term.stem(), power(term.halves.abs()))).collect::<Vec<_>>()
        };
        let (over, under) = (side(&mut self.over()), side(&mut self.under()));
        let mut text = if over.is_empty() { "1".to_owned() } else { over.join(" ") };
        match under.as_slice() {
            [] => {}
            [one] => write!(text, "/{one}").expect("writing to a string cannot fail"),
            several => write!(text, "/({})", several.join(" ")).expect("writing to a string cannot fail"),
        }
        text
    }
}

/// `^3`, `^(1/2)`, or nothing for the power 1.
fn power(halves: i32) -> String {
    match halves {
        2 => String::new(),
        whole if whole % 2 == 0 => format!("^{}", whole / 2),
        odd => format!("^({odd}/2)"),
    }
}

/// What a degree of the scale is as a difference.
fn interval_symbol(row: &Row) -> &'static str {
    if row.symbol() == "degF" { "degR" } else { "K" }
}

/// A product of whole numbers and a power of ten, rounded once at the end where it fits 128 bits.
struct Exact {
    numerator: u128,
    denominator: u128,
    ten: i32,
    /// What no longer fitted; 1 in every unit of the trade.
    rest: f64,
}

impl Exact {
    const ONE: Exact = Exact { numerator: 1, denominator: 1, ten: 0, rest: 1.0 };

    fn multiply(&mut self, numerator: u64, denominator: u64, ten: i32, power: i32) {
        let (up, down) = if power < 0 { (denominator, numerator) } else { (numerator, denominator) };
        self.ten += ten * power;
        if up == 1 && down == 1 {
            return;
        }
        for _ in 0..power.unsigned_abs() {
            match (self.numerator.checked_mul(up.into()), self.denominator.checked_mul(down.into())) {
                (Some(n), Some(d)) => (self.numerator, self.denominator) = (n, d),
                _ => self.rest *= up as f64 / down as f64,
            }
        }
    }

    fn value(&self) -> f64 {
        let shared = common_divisor(self.numerator, self.denominator);
        let (mut n, mut d, mut ten) = (self.numerator / shared, self.denominator / shared, self.ten);
        // Twos and fives below the line are powers of ten, which keeps the last division the only rounding.
        for (prime, partner) in [(2, 5), (5, 2)] {
            while d % prime == 0 {
                let Some(more) = n.checked_mul(partner) else { break };
                (n, d, ten) = (more, d / prime, ten - 1);
            }
        }
        let value = if d == 1 { scaled(n, ten) } else { scaled(n, ten.max(0)) / scaled(d, (-ten).max(0)) };
        value * self.rest
    }
}

/// `digits × 10^ten`, correctly rounded: the standard library reads decimals exactly.
fn scaled(digits: u128, ten: i32) -> f64 {
    format!("{digits}e{ten}").parse().expect("digits, e and a whole number are a decimal")
}

fn common_divisor(a: u128, b: u128) -> u128 {
    let (mut a, mut b) = (a, b);
    while b != 0 {
        (a, b) = (b, a % b);
    }
    a
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::num::math;

    fn terms(list: &[(&str, i32)]) -> Terms {
        Terms::of(list.iter().map(|&(symbol, halves)| Term::new(lookup(symbol).unwrap(), None, halves))).unwrap()
    }

    #[test]
    fn factors_are_the_nearest_floats_to_the_exact_decimals() {
        // Each decimal is composed by hand from the sizes in the table; the literal is rounded once by the compiler.
        let rows: [(&[(&str, i32)], f64); 9] = [
            (&[("cm", 6)], 1e-6),
            (&[("cm", -2)], 100.0),
            (&[("kcal_th", 2), ("mol", -2)], 4184.0),
            (&[("Btu_IT", 2), ("lb", -2), ("degF", -2)], 4186.8),
            (&[("Btu_IT", 2), ("lbmol", -2)], 2.326),
            (&[("eV", 2)], 1.602_176_634e-19),
            (&[("ft", 2), ("lbf", 2)], 1.355_817_948_331_400_4),
            (&[("Torr", 2)], 133.322_368_421_052_63),
            (&[("uL", 2), ("umol", -2)], 1e-3),
        ];
        for (list, want) in rows {
            let terms = terms(list);
            assert_eq!(terms.factor().to_bits(), f64::to_bits(want), "{}", terms.text());
        }
    }

    #[test]
    fn a_square_root_of_a_unit_has_the_root_of_its_size() {
        assert_eq!(terms(&[("cm", 1)]).factor(), 0.1);
        assert_eq!(terms(&[("cm", -1)]).factor(), 10.0);
        assert_eq!(terms(&[("kJ", 3)]).text(), "kJ^(3/2)");
    }

    #[test]
    fn products_past_128_bits_still_have_a_size() {
        let long = terms(&[("cal_th", 40), ("lb", -20)]);
        // 4.184^20 / 0.45359237^10 from logarithms, a second route; 1e-12 bounds the rounding of exp and ln at this size.
        let want = math::exp(20.0 * math::ln(4.184) - 10.0 * math::ln(0.453_592_37));
        assert!((long.factor() / want - 1.0).abs() < 1e-12, "{} {want}", long.factor());
    }
}
