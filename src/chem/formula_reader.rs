//! Reads the text of a formula, character by character.
//!
//! [`Reader`] is recursive descent over plain characters (lowered and raised digits already replaced); nesting and
//! length are bounded, and all arithmetic is checked. While it reads it rebuilds the text in the tables' style.

use std::iter;

use crate::chem::composition::Composition;
use crate::chem::element::Element;
use crate::chem::formula::{ChargeText, DEEPEST, Formula, FormulaError, LONGEST};
use crate::num::rational::{NotRational, Rational};

/// The digits that end a body, kept to judge a bare sign after them.
#[derive(Clone, Copy)]
struct LastCount {
    /// Range of the digits among the glyphs.
    start: usize,
    end: usize,
    of: Counted,
}

#[derive(Clone, Copy)]
enum Counted {
    Element(Element),
    Round,
    Square,
}

pub(super) struct Reader<'a> {
    text: &'a str,
    /// Plain characters with the position of the character they stand for. Raised text starts with a `^` of its own.
    glyphs: Vec<(char, usize)>,
    next: usize,
    body: String,
    last: Option<LastCount>,
    /// Elements and groups read at the top level.
    top_parts: usize,
}

impl<'a> Reader<'a> {
    pub(super) fn new(text: &'a str) -> Result<Self, FormulaError> {
        let text = text.trim();
        let length = text.chars().count();
        if length == 0 {
            return Err(FormulaError::Empty);
        }
        if length > LONGEST {
            return Err(FormulaError::TooLong { length });
        }
        let mut glyphs = Vec::with_capacity(length);
        let mut was_raised = false;
        for (c, position) in text.chars().zip(1..) {
            let raised = raised_to_plain(c);
            if raised.is_some() && !was_raised {
                glyphs.push(('^', position));
            }
            was_raised = raised.is_some();
            glyphs.push((raised.unwrap_or_else(|| lowered_to_plain(c)), position));
        }
        Ok(Reader { text, glyphs, next: 0, body: String::new(), last: None, top_parts: 0 })
    }

    fn peek_at(&self, at: usize) -> Option<char> {
        self.glyphs.get(at).map(|glyph| glyph.0)
    }

    fn peek(&self) -> Option<char> {
        self.peek_at(self.next)
    }

    fn position(&self, at: usize) -> usize {
        self.glyphs.get(at).map_or_else(|| self.text.chars().count() + 1, |glyph| glyph.1)
    }

    fn unexpected<T>(&self, expected: &'static str) -> Result<T, FormulaError> {
        let position = self.position(self.next);
        Err(FormulaError::Unexpected {
            text: self.text.to_owned(),
            position,
            expected,
            found: self.text.chars().nth(position - 1),
        })
    }

    fn too_large(&self, at: usize) -> FormulaError {
        FormulaError::TooLarge { text: self.text.to_owned(), position: self.position(at) }
    }

    fn slice(&self, start: usize, end: usize) -> String {
        self.glyphs[start..end].iter().map(|glyph| glyph.0).collect()
    }

    fn digits_end(&self, from: usize) -> usize {
        from + self.glyphs[from.min(self.glyphs.len())..].iter().take_while(|glyph| glyph.0.is_ascii_digit()).count()
    }

    /// End of a number that may hold a fraction bar or a point, as after the dot of an addition compound.
    fn number_end(&self, from: usize) -> usize {
        let whole = self.digits_end(from);
        let more = if whole > from && matches!(self.peek_at(whole), Some('/' | '.')) {
            self.digits_end(whole + 1)
        } else {
            whole
        };
        if more > whole + 1 { more } else { whole }
    }

    fn number(&self, start: usize, end: usize) -> Result<Rational, FormulaError> {
        let count = self.slice(start, end);
        match count.parse::<Rational>() {
            Ok(value) if value.is_zero() || (count.starts_with('0') && !count.starts_with("0.")) => {
                Err(FormulaError::ZeroCount { text: self.text.to_owned(), position: self.position(start), count })
            }
            Ok(value) => Ok(value),
            Err(NotRational::OutOfRange | NotRational::Malformed) => Err(self.too_large(start)),
        }
    }

    /// The whole text as one formula; `as_typed` refuses what people read in two ways.
    pub(super) fn formula(mut self, as_typed: bool) -> Result<Formula, FormulaError> {
        let mut composition = Composition::default();
        if self.peek() == Some('e') && matches!(self.peek_at(1), Some('-' | '^')) {
            self.next = 1;
            self.body.push('e');
            let charge = self.charge(false)?;
            if charge != -1 {
                self.next = 1;
                return self.unexpected("the single negative charge of an electron, e-");
            }
            return Ok(Formula { body: self.body, composition, charge, bare_sign_unclear: false });
        }
        self.sequence(0, Rational::ONE, &mut composition)?;
        while matches!(self.peek(), Some('.' | '·')) {
            self.addition(&mut composition)?;
        }
        let bare_sign_unclear = self.readings(1).or_else(|| self.readings(-1)).is_some();
        let charge = self.charge(as_typed)?;
        Ok(Formula { body: self.body, composition, charge, bare_sign_unclear })
    }

    /// Elements and bracketed groups, each with its count, until something else comes.
    fn sequence(&mut self, depth: usize, times: Rational, sum: &mut Composition) -> Result<(), FormulaError> {
        let first = self.next;
        loop {
            let start = self.next;
            match self.peek() {
                Some(c) if c.is_ascii_uppercase() => {
                    let element = self.element()?;
                    let count = self.count(Counted::Element(element))?;
                    let count = count.checked_mul(times).ok_or_else(|| self.too_large(start))?;
                    sum.add(element, count).ok_or_else(|| self.too_large(start))?;
                }
                Some(open @ ('(' | '[')) => {
                    if depth == DEEPEST {
                        return Err(FormulaError::TooDeep {
                            text: self.text.to_owned(),
                            position: self.position(start),
                        });
                    }
                    let mut group = Composition::default();
                    self.body.push(open);
                    self.next += 1;
                    self.sequence(depth + 1, Rational::ONE, &mut group)?;
                    let close = if open == '(' { ')' } else { ']' };
                    match self.peek() {
                        Some(c) if c == close => self.next += 1,
                        None => {
                            return Err(FormulaError::Unclosed {
                                text: self.text.to_owned(),
                                position: self.position(start),
                                open,
                            });
                        }
                        Some(_) if close == ')' => return self.unexpected("an element, a count or `)`"),
                        Some(_) => return self.unexpected("an element, a count or `]`"),
                    }
                    self.body.push(close);
                    let count = self.count(if open == '(' { Counted::Round } else { Counted::Square })?;
                    let count = count.checked_mul(times).ok_or_else(|| self.too_large(start))?;
                    sum.add_times(&group, count).ok_or_else(|| self.too_large(start))?;
                }
                _ if start == first => return self.unexpected("the symbol of an element, with its capital letter"),
                _ => return Ok(()),
            }
            if depth == 0 {
                self.top_parts += 1;
            }
        }
    }

    fn element(&mut self) -> Result<Element, FormulaError> {
        let start = self.next;
        let end = start + 1 + usize::from(self.peek_at(start + 1).is_some_and(|c| c.is_ascii_lowercase()));
        let symbol = self.slice(start, end);
        let Some(element) = Element::from_symbol(&symbol) else {
            // CL for Cl: the letter before or behind, made small, may give the symbol that was meant.
            let pair = |at: usize| {
                let pair = [self.peek_at(at)?, self.peek_at(at + 1)?.to_ascii_lowercase()];
                Element::from_symbol(&pair.iter().collect::<String>()).map(Element::symbol)
            };
            let guess = pair(start).or_else(|| pair(start.checked_sub(1)?));
            let (text, position) = (self.text.to_owned(), self.position(start));
            return Err(FormulaError::UnknownElement { text, position, symbol, guess });
        };
        self.body.push_str(&symbol);
        self.next = end;
        Ok(element)
    }

    /// The count behind an element or a group: nothing, `2`, `8/3`, `0.947`, or `1.95` at the end.
    fn count(&mut self, of: Counted) -> Result<Rational, FormulaError> {
        let start = self.next;
        let whole = self.digits_end(start);
        self.last = None;
        if whole == start {
            return Ok(Rational::ONE);
        }
        let end = match self.peek_at(whole) {
            Some('/') => self.number_end(start),
            Some('.') if self.point_is_decimal(start, whole)? => self.digits_end(whole + 1),
            _ => whole,
        };
        if end == whole {
            self.last = Some(LastCount { start, end, of });
        }
        let value = self.number(start, end)?;
        self.body.push_str(&self.slice(start, end));
        self.next = end;
        Ok(value)
    }

    /// Whether the point at `dot`, behind the digits from `start`, starts decimals or an addition compound.
    fn point_is_decimal(&self, start: usize, dot: usize) -> Result<bool, FormulaError> {
        let end = self.number_end(dot + 1);
        if end == dot + 1 {
            return Ok(false); // .H2O
        }
        if self.slice(start, dot) == "0" {
            return Ok(true); // Fe0.947O
        }
        let plain_digits = end == self.digits_end(dot + 1);
        let follows_water = ['H', 'D'].iter().any(|&h| {
            let expected = [Some(h), Some('2'), Some('O')];
            let behind = self.peek_at(end + 3);
            (0..3).all(|i| self.peek_at(end + i) == expected[i])
                && !behind.is_some_and(|c| c.is_ascii_lowercase() || c.is_ascii_digit())
        });
        if follows_water || !plain_digits {
            return Ok(false); // CuSO4.5H2O, CdSO4.8/3H2O
        }
        match self.peek_at(end) {
            Some(c) if c.is_ascii_uppercase() || matches!(c, '(' | '[') => {
                let (before, behind) = (self.slice(0, start), self.slice(end, self.glyphs.len()));
                let (whole, decimals) = (self.slice(start, dot), self.slice(dot + 1, end));
                let fraction = self.number(start, end)?;
                Err(FormulaError::UnclearPoint {
                    text: self.text.to_owned(),
                    readings: [
                        format!("{before}{whole}·{decimals}{behind}"),
                        format!("{before}{fraction}{behind}"), // 9/5 for 1.8
                    ],
                })
            }
            _ => Ok(true), // TiO1.95
        }
    }

    /// `.5H2O`, `·8/3H2O`, `.Al2O3`
    fn addition(&mut self, sum: &mut Composition) -> Result<(), FormulaError> {
        let dot = self.next;
        let start = dot + 1;
        let end = self.number_end(start);
        let times = if end == start { Rational::ONE } else { self.number(start, end)? };
        // Fe.947O means 0.947 Fe, and nobody adds a hundred molecules to one formula unit.
        if self.peek_at(dot) == Some('.') && times >= Rational::from(100) {
            let (before, behind) = (self.slice(0, dot), self.slice(end, self.glyphs.len()));
            let decimals = self.slice(start, end);
            return Err(FormulaError::UnclearPoint {
                text: self.text.to_owned(),
                readings: [format!("{before}·{decimals}{behind}"), format!("{before}0.{decimals}{behind}")],
            });
        }
        self.next = end;
        // The plain dot of the tables, unless a plain dot here would be unclear when read again.
        let unclear = end > start
            && self.last.is_some_and(|last| !matches!(self.point_is_decimal(last.start, dot), Ok(false)))
            || times >= Rational::from(100);
        self.body.push(if unclear { '·' } else { '.' });
        self.body.push_str(&self.slice(start, end));
        self.top_parts += 1;
        self.last = None;
        self.sequence(0, times, sum)
    }

    /// Nothing, `+`, `-`, `--`, `+2`, `^2+`, `^-2`, then the end.
    fn charge(&mut self, as_typed: bool) -> Result<i32, FormulaError> {
        let start = self.next;
        let caret = self.peek() == Some('^');
        if caret {
            self.next += 1;
        }
        let digits_first = self.next;
        self.next = if caret { self.digits_end(self.next) } else { self.next };
        let mut digits = (digits_first, self.next);
        let sign = match self.peek() {
            Some('+') => 1,
            Some('-') => -1,
            None if !caret => return Ok(0),
            _ if caret => return self.unexpected("a charge, as in ^2+"),
            _ => return self.unexpected("an element, a count, a charge or the end"),
        };
        let sign_char = self.peek();
        let signs =
            iter::successors(Some(self.next), |at| Some(at + 1)).take_while(|&at| self.peek_at(at) == sign_char);
        let signs = signs.count();
        self.next += signs;
        if digits.0 == digits.1 && signs == 1 {
            digits = (self.next, self.digits_end(self.next));
            self.next = digits.1;
        }
        if self.peek().is_some() || (signs > 1 && digits.0 < digits.1) {
            return self.unexpected("the end, behind the charge");
        }
        let size = if digits.0 < digits.1 {
            let number = self.number(digits.0, digits.1)?;
            i32::try_from(number.numerator()).map_err(|_| self.too_large(digits.0))?
        } else {
            i32::try_from(signs).map_err(|_| self.too_large(start))?
        };
        let bare = !caret && signs == 1 && digits.0 == digits.1;
        if let Some(readings) = self.readings(sign).filter(|_| bare && as_typed) {
            return Err(FormulaError::UnclearCharge { text: self.text.to_owned(), readings: Box::new(readings) });
        }
        Ok(sign * size)
    }

    /// Both readings of a bare sign behind the body's last digits, each described and as it should be written; `None`
    /// where only one makes sense.
    fn readings(&self, sign: i32) -> Option<[(String, String); 2]> {
        let LastCount { start, end, of } = self.last?;
        let digits = self.slice(start, end);
        let (atoms, last_digit) = digits.split_at(digits.len() - 1);
        let size: u8 = last_digit.parse().ok()?;
        let could_be_charge = match of {
            Counted::Element(element) if atoms.is_empty() && self.top_parts == 1 => {
                monatomic_ion_exists(element, sign, size) // Ca2+
            }
            Counted::Element(_) | Counted::Round if atoms.is_empty() => false, // NH4+, Al(OH)4-
            Counted::Square if atoms.is_empty() => (2..=8).contains(&size),    // [Fe(CN)6]4-
            _ => (2..=6).contains(&size), // SO42-; 1 is never written, and more than 6 does not occur
        };
        if !could_be_charge {
            return None;
        }
        let first = &self.body;
        let second = format!("{}{atoms}", first.strip_suffix(digits.as_str())?);
        let charge = sign * i32::from(size);
        Some([
            (format!("{first} with charge {sign:+}"), format!("{first}^{}", ChargeText(sign))),
            (format!("{second} with charge {charge:+}"), format!("{second}{}", ChargeText(charge))),
        ])
    }
}

/// Whether someone may mean a monatomic ion of that charge, so that `Ca2+`, `Fe3+` and `N3-` are unclear while `H2+`,
/// `I3-` and `O3-` can only be molecules: no cation has more charge than protons, and anions of more than one charge
/// reach the next noble gas.
fn monatomic_ion_exists(element: Element, sign: i32, size: u8) -> bool {
    let z = element.atomic_number();
    let to_noble_gas = [2, 10, 18, 36, 54, 86, 118].iter().find(|&&noble| noble >= z).map_or(0, |noble| noble - z);
    if sign > 0 { (2..=8).contains(&size) && size <= z } else { (2..=4).contains(&size) && size == to_noble_gas }
}

fn lowered_to_plain(c: char) -> char {
    match c {
        '₀'..='₉' => plain_digit(c, '₀'),
        '−' => '-',
        '⋅' | '•' => '·',
        _ => c,
    }
}

fn raised_to_plain(c: char) -> Option<char> {
    match c {
        '¹' => Some('1'),
        '²' => Some('2'),
        '³' => Some('3'),
        '⁰' | '⁴'..='⁹' => Some(plain_digit(c, '⁰')),
        '⁺' => Some('+'),
        '⁻' => Some('-'),
        _ => None,
    }
}

fn plain_digit(c: char, zero: char) -> char {
    char::from_digit((c as u32).wrapping_sub(zero as u32), 10).unwrap_or(c)
}
