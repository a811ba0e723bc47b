//! Exact small fractions, for counts of atoms and stoichiometric numbers.
//!
//! A [`Rational`] is always in lowest terms with a positive denominator, so equality is equality of its fields.
//! Every operation that could leave the range of `i64` returns `None` instead; none panics.

use std::cmp::Ordering;
use std::fmt;
use std::ops::Neg;
use std::str::FromStr;

/// A fraction of two `i64`, in lowest terms.
#[derive(Clone, Copy, PartialEq, Eq, Hash)]
pub struct Rational {
    numerator: i64,   // Invariant: never i64::MIN, so that the negative always exists.
    denominator: i64, // Invariant: positive, and coprime to the numerator.
}

impl Rational {
    pub const ZERO: Rational = Rational { numerator: 0, denominator: 1 };
    pub const ONE: Rational = Rational { numerator: 1, denominator: 1 };

    /// The fraction in lowest terms; `None` for a zero denominator or out of range.
    pub fn new(numerator: i64, denominator: i64) -> Option<Rational> {
        Rational::reduced(i128::from(numerator), i128::from(denominator))
    }

    fn reduced(numerator: i128, denominator: i128) -> Option<Rational> {
        if denominator == 0 {
            return None;
        }
        // Products of two i64 are far from the ends of i128, so the negations below cannot overflow.
        let divisor = gcd(numerator, denominator) * denominator.signum();
        let numerator = i64::try_from(numerator / divisor).ok()?;
        let denominator = i64::try_from(denominator / divisor).ok()?;
        (numerator != i64::MIN).then_some(Rational { numerator, denominator })
    }

    pub fn numerator(self) -> i64 {
        self.numerator
    }

    pub fn denominator(self) -> i64 {
        self.denominator
    }

    pub fn is_zero(self) -> bool {
        self.numerator == 0
    }

    pub fn is_negative(self) -> bool {
        self.numerator < 0
    }

    pub fn is_positive(self) -> bool {
        self.numerator > 0
    }

    pub fn is_integer(self) -> bool {
        self.denominator == 1
    }

    #[must_use]
    pub fn abs(self) -> Rational {
        Rational { numerator: self.numerator.abs(), denominator: self.denominator }
    }

    pub fn checked_add(self, other: Rational) -> Option<Rational> {
        let (a, b) = (i128::from(self.numerator), i128::from(self.denominator));
        let (c, d) = (i128::from(other.numerator), i128::from(other.denominator));
        Rational::reduced(a * d + c * b, b * d)
    }

    pub fn checked_sub(self, other: Rational) -> Option<Rational> {
        self.checked_add(-other)
    }

    pub fn checked_mul(self, other: Rational) -> Option<Rational> {
        Rational::reduced(
            i128::from(self.numerator) * i128::from(other.numerator),
            i128::from(self.denominator) * i128::from(other.denominator),
        )
    }

    /// `None` also for a division by zero.
    pub fn checked_div(self, other: Rational) -> Option<Rational> {
        Rational::reduced(
            i128::from(self.numerator) * i128::from(other.denominator),
            i128::from(self.denominator) * i128::from(other.numerator),
        )
    }

    /// The nearest double while numerator and denominator are below 2^53, as any count in chemistry is.
    pub fn to_f64(self) -> f64 {
        self.numerator as f64 / self.denominator as f64
    }

    /// Reads `12`, `0.5`, `.5`, `8/3` at the start of a text of ASCII digits; returns the value and the length read.
    /// `None` where no number starts there.
    pub fn read_prefix(text: &str) -> Option<(Result<Rational, NotRational>, usize)> {
        let bytes = text.as_bytes();
        let digits = |from: usize| bytes[from..].iter().take_while(|b| b.is_ascii_digit()).count();
        let whole = digits(0);
        let more = match bytes.get(whole) {
            Some(b'.') => digits(whole + 1),
            Some(b'/') if whole > 0 => digits(whole + 1),
            _ => 0,
        };
        let end = if more > 0 { whole + 1 + more } else { whole };
        (end > 0).then(|| (text[..end].parse(), end))
    }
}

/// Greatest common divisor, never zero unless both are.
pub fn gcd(a: i128, b: i128) -> i128 {
    let (mut a, mut b) = (a.unsigned_abs(), b.unsigned_abs());
    while b != 0 {
        (a, b) = (b, a % b);
    }
    i128::try_from(a).unwrap_or(1) // Only |i128::MIN| does not fit; not reducing is then still correct.
}

impl From<i32> for Rational {
    fn from(whole: i32) -> Self {
        Rational { numerator: i64::from(whole), denominator: 1 }
    }
}

impl Neg for Rational {
    type Output = Rational;

    fn neg(self) -> Rational {
        Rational { numerator: -self.numerator, denominator: self.denominator }
    }
}

impl Ord for Rational {
    fn cmp(&self, other: &Self) -> Ordering {
        let left = i128::from(self.numerator) * i128::from(other.denominator);
        left.cmp(&(i128::from(other.numerator) * i128::from(self.denominator)))
    }
}

impl PartialOrd for Rational {
    fn partial_cmp(&self, other: &Self) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}

/// Why a text is not a [`Rational`].
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum NotRational {
    /// Not of the form `12`, `0.5` or `8/3`.
    Malformed,
    /// Past the range of `i64`, or over zero.
    OutOfRange,
}

impl FromStr for Rational {
    type Err = NotRational;

    /// Reads `12`, `-12`, `0.5`, `.5` and `8/3`; a decimal is the exact fraction that its digits say.
    fn from_str(text: &str) -> Result<Self, NotRational> {
        let (negative, text) = text.strip_prefix('-').map_or((false, text), |rest| (true, rest));
        let digits = |part: &str| -> Result<i64, NotRational> {
            if part.is_empty() || !part.bytes().all(|b| b.is_ascii_digit()) {
                return Err(NotRational::Malformed);
            }
            part.parse().map_err(|_| NotRational::OutOfRange)
        };
        let value = if let Some((over, under)) = text.split_once('/') {
            Rational::new(digits(over)?, digits(under)?)
        } else if let Some((whole, decimals)) = text.split_once('.') {
            if decimals.is_empty() || !decimals.bytes().all(|b| b.is_ascii_digit()) {
                return Err(NotRational::Malformed);
            }
            let decimals = decimals.trim_end_matches('0');
            let all = digits(&format!("{}{decimals}", if whole.is_empty() { "0" } else { whole }))?;
            let places = u32::try_from(decimals.len()).map_err(|_| NotRational::OutOfRange)?;
            10_i64.checked_pow(places).and_then(|power| Rational::new(all, power))
        } else {
            Rational::new(digits(text)?, 1)
        };
        let value = value.ok_or(NotRational::OutOfRange)?;
        Ok(if negative { -value } else { value })
    }
}

/// `3` or `8/3`; parses back.
impl fmt::Display for Rational {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.denominator == 1 {
            write!(f, "{}", self.numerator)
        } else {
            write!(f, "{}/{}", self.numerator, self.denominator)
        }
    }
}

impl fmt::Debug for Rational {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        fmt::Display::fmt(self, f)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn r(text: &str) -> Rational {
        text.parse().unwrap()
    }

    #[test]
    fn lowest_terms_with_the_sign_above() {
        assert_eq!(Rational::new(6, -4).unwrap().to_string(), "-3/2");
        assert_eq!(Rational::new(0, -7), Some(Rational::ZERO));
        assert_eq!(Rational::new(1, 0), None);
    }

    #[test]
    fn decimals_are_exact_fractions() {
        assert_eq!(r("0.5"), r("1/2"));
        assert_eq!(r(".947"), Rational::new(947, 1000).unwrap());
        assert_eq!(r("2.500000000000000000000000"), r("5/2"));
        assert_eq!("1.".parse::<Rational>(), Err(NotRational::Malformed));
        assert_eq!("1/0".parse::<Rational>(), Err(NotRational::OutOfRange));
        assert_eq!("0.00000000000000000001".parse::<Rational>(), Err(NotRational::OutOfRange));
    }

    #[test]
    fn the_ends_of_the_range_give_none_and_never_panic() {
        let largest = Rational::new(i64::MAX, 1).unwrap();
        let smallest = Rational::new(1, i64::MAX).unwrap();
        assert_eq!(largest.checked_add(Rational::ONE), None);
        assert_eq!(largest.checked_mul(largest), None);
        assert_eq!(smallest.checked_mul(smallest), None);
        assert_eq!(largest.checked_mul(smallest), Some(Rational::ONE));
        assert_eq!(Rational::ONE.checked_div(Rational::ZERO), None);
        assert_eq!(Rational::new(i64::MIN, 1), None);
        assert_eq!(Rational::new(i64::MIN, i64::MIN), Some(Rational::ONE));
        assert_eq!(Rational::new(1, i64::MIN), None);
        assert!(smallest > Rational::ZERO && -largest < smallest);
    }

    #[test]
    fn a_prefix_stops_where_the_number_does() {
        let read = |text| Rational::read_prefix(text).map(|(value, length)| (value.unwrap(), length));
        assert_eq!(read("2H2O"), Some((r("2"), 1)));
        assert_eq!(read("1/2 N2"), Some((r("1/2"), 3)));
        assert_eq!(read("7.5O2"), Some((r("15/2"), 3)));
        assert_eq!(read("3.H2O"), Some((r("3"), 1)));
        assert_eq!(read("H2O"), None);
        assert_eq!(Rational::read_prefix("1/0").unwrap().0, Err(NotRational::OutOfRange));
    }
}
