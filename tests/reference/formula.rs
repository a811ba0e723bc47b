//! Arithmetic on quantities written as a formula, for worked examples of textbooks.
//!
//! Every step goes through the operations of `Quantity`; bare numbers combine as they do in scripts. Grammar: sums of
//! products of powers, brackets, `exp(x)`, `ln(x)`, names and plain decimals.

use std::collections::BTreeMap;

use hessbook::fault::Fault;
use hessbook::quantity::{Mismatch, Quantity};

#[derive(Clone)]
pub enum Term {
    Number(f64),
    Quantity(Quantity),
}

/// The value of a formula, with the names it uses.
pub fn evaluate(formula: &str, given: &BTreeMap<&str, Quantity>) -> Result<Term, Fault> {
    let mut reader = Reader { rest: formula.trim(), given };
    let value = reader.sum()?;
    assert!(reader.rest.is_empty(), "`{}` of `{formula}` is left over", reader.rest);
    Ok(value)
}

struct Reader<'a> {
    rest: &'a str,
    given: &'a BTreeMap<&'a str, Quantity>,
}

impl Reader<'_> {
    fn takes(&mut self, mark: char) -> bool {
        match self.rest.strip_prefix(mark) {
            Some(rest) => {
                self.rest = rest.trim_start();
                true
            }
            None => false,
        }
    }

    fn sum(&mut self) -> Result<Term, Fault> {
        let mut left = self.product()?;
        loop {
            if self.takes('+') {
                left = plus(left, self.product()?)?;
            } else if self.takes('-') {
                left = minus(left, self.product()?)?;
            } else {
                return Ok(left);
            }
        }
    }

    fn product(&mut self) -> Result<Term, Fault> {
        let mut left = self.power()?;
        loop {
            if self.takes('*') {
                left = times(left, self.power()?)?;
            } else if self.takes('/') {
                left = over(left, self.power()?)?;
            } else {
                return Ok(left);
            }
        }
    }

    /// `x ^ 2`, `x ^ -1`: the exponent is a plain decimal.
    fn power(&mut self) -> Result<Term, Fault> {
        let base = self.atom()?;
        if !self.takes('^') {
            return Ok(base);
        }
        let sign = if self.takes('-') { -1.0 } else { 1.0 };
        let Term::Number(exponent) = self.atom()? else { panic!("the exponent is a plain decimal") };
        let Term::Quantity(base) = base else { panic!("the base of a power is a quantity") };
        Ok(Term::Quantity(base.power(sign * exponent, None)?))
    }

    fn atom(&mut self) -> Result<Term, Fault> {
        if self.takes('-') {
            return Ok(times(Term::Number(-1.0), self.power()?)?);
        }
        if self.takes('(') {
            let inner = self.sum()?;
            assert!(self.takes(')'), "a bracket is open before `{}`", self.rest);
            return Ok(inner);
        }
        let end = self.rest.find(|c: char| !(c.is_alphanumeric() || c == '_' || c == '.')).unwrap_or(self.rest.len());
        let (word, rest) = self.rest.split_at(end);
        self.rest = rest.trim_start();
        if let Ok(number) = word.parse() {
            return Ok(Term::Number(number));
        }
        if matches!(word, "exp" | "ln") {
            let Term::Quantity(inner) = self.atom()? else { panic!("{word} is taken of a quantity") };
            return Ok(Term::Quantity(if word == "exp" { inner.exp(None)? } else { inner.ln(None)? }));
        }
        Ok(Term::Quantity(self.given.get(word).unwrap_or_else(|| panic!("`{word}` is not given")).clone()))
    }
}

fn plus(left: Term, right: Term) -> Result<Term, Mismatch> {
    Ok(match (left, right) {
        (Term::Number(a), Term::Number(b)) => Term::Number(a + b),
        (Term::Number(a), Term::Quantity(b)) | (Term::Quantity(b), Term::Number(a)) => {
            Term::Quantity(b.shifted(a, None)?)
        }
        (Term::Quantity(a), Term::Quantity(b)) => Term::Quantity(a.plus(&b, None)?),
    })
}

fn minus(left: Term, right: Term) -> Result<Term, Mismatch> {
    Ok(match (left, right) {
        (Term::Quantity(a), Term::Quantity(b)) => Term::Quantity(a.minus(&b, None)?),
        (left, Term::Number(b)) => plus(left, Term::Number(-b))?,
        (left, Term::Quantity(b)) => plus(left, Term::Quantity(b.negated(None)?))?,
    })
}

fn times(left: Term, right: Term) -> Result<Term, Mismatch> {
    Ok(match (left, right) {
        (Term::Number(a), Term::Number(b)) => Term::Number(a * b),
        (Term::Number(a), Term::Quantity(b)) | (Term::Quantity(b), Term::Number(a)) => {
            Term::Quantity(b.scaled(a, None)?)
        }
        (Term::Quantity(a), Term::Quantity(b)) => Term::Quantity(a.times(&b, None)?),
    })
}

fn over(left: Term, right: Term) -> Result<Term, Mismatch> {
    Ok(match (left, right) {
        (Term::Number(a), Term::Number(b)) => Term::Number(a / b),
        (Term::Number(a), Term::Quantity(b)) => Term::Quantity(b.reciprocal(a, None)?),
        (Term::Quantity(a), Term::Number(b)) => Term::Quantity(a.scaled(1.0 / b, None)?),
        (Term::Quantity(a), Term::Quantity(b)) => Term::Quantity(a.over(&b, None)?),
    })
}
