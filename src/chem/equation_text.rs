//! The text of a reaction equation, taken apart: arrow, sides, terms, coefficients. No chemistry yet.
//!
//! [`EquationText`] is the result. Two characters have two trades: `+` joins terms and is a charge, and digits in front
//! are a coefficient or part of a name (`2 propane(g)`, `2-propanol(g)`). The rules are at [`plus_role`] and
//! [`WrittenTerm`]; what they leave open is refused.

use crate::chem::species::{SpeciesError, SpeciesName, ends_in_phase, starts_with_phase};
use crate::fault::{Explain, Fault};
use crate::num::rational::{NotRational, Rational};

const LONGEST: usize = 4000;

/// A reaction equation as written.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct EquationText {
    pub left: Vec<WrittenTerm>,
    pub right: Vec<WrittenTerm>,
}

/// One term as written: perhaps a coefficient, and the name of a species.
///
/// A number with a space, a `*` or brackets (`2 H2O(l)`, `2*H2O(l)`, `(1/2) O2(g)`) is a coefficient. A number glued to
/// what follows is tried as part of the name first (`2H-pyran(g)`), then as a coefficient (`2H2O(l)`); before `-` or
/// `,` it is always part of the name (`2-propanol(g)`, `1,3-butadiene(g)`).
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum WrittenTerm {
    Plain(SpeciesName),
    Coefficient(Rational, SpeciesName),
    Glued { whole: SpeciesName, coefficient: Rational, rest: SpeciesName },
}

impl WrittenTerm {
    /// The coefficient and what `find` makes of the name, which is given without superfluous spaces.
    pub fn resolve<T>(&self, find: &dyn Fn(&str) -> Result<T, Fault>) -> Result<(Rational, T), Fault> {
        match self {
            WrittenTerm::Plain(name) => Ok((Rational::ONE, find(&name.to_string())?)),
            WrittenTerm::Coefficient(coefficient, name) => Ok((*coefficient, find(&name.to_string())?)),
            WrittenTerm::Glued { whole, coefficient, rest } => match find(&whole.to_string()) {
                Ok(found) => Ok((Rational::ONE, found)),
                Err(_) => Ok((*coefficient, find(&rest.to_string())?)),
            },
        }
    }
}

/// Why a text is no reaction equation.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum EquationTextError {
    #[error("an equation of {length} characters is longer than the {LONGEST} that are read")]
    TooLong { length: usize },
    #[error("{text:?} has no arrow between reactants and products")]
    NoArrow { text: String },
    #[error("{text:?} has more than one arrow: {first} and {second}")]
    SeveralArrows { text: String, first: String, second: String },
    #[error("{text:?} has the arrow {arrow}, which points to the left")]
    BackwardArrow { text: String, arrow: String },
    #[error("in {text:?}, {before}{dashes}> can be {before} with an arrow or {before}- with an arrow")]
    UnclearArrow { text: String, before: String, dashes: String },
    #[error("the {side} side of {text:?} is empty")]
    EmptySide { text: String, side: &'static str },
    #[error("in {text:?} a + has no species {place}")]
    EmptyTerm { text: String, place: &'static str },
    #[error("in {term:?} there is a number but no species")]
    NoSpecies { term: String },
    #[error("in {text:?} the + after {before} can be the charge of {before}+ or join {before} and {after}")]
    UnclearPlus { text: String, before: String, after: String },
    #[error("in {term:?} there is a minus sign between or before species")]
    Minus { term: String },
    #[error("in {term:?} the coefficient is zero")]
    ZeroCoefficient { term: String },
    #[error("in {term:?} the coefficient is too large, or its denominator is zero")]
    CoefficientOutOfRange { term: String },
    #[error("in {term:?} there are two numbers, {first} and {second}, before one species")]
    TwoCoefficients { term: String, first: Rational, second: Rational },
    #[error(transparent)]
    Species(#[from] SpeciesError),
}

impl Explain for EquationTextError {
    fn code(&self) -> &'static str {
        match self {
            EquationTextError::TooLong { .. } => "equation-too-long",
            EquationTextError::NoArrow { .. } => "no-arrow",
            EquationTextError::SeveralArrows { .. } => "several-arrows",
            EquationTextError::BackwardArrow { .. } => "backward-arrow",
            EquationTextError::UnclearArrow { .. } => "unclear-arrow",
            EquationTextError::EmptySide { .. } => "empty-side",
            EquationTextError::EmptyTerm { .. } => "plus-without-species",
            EquationTextError::NoSpecies { .. } => "coefficient-without-species",
            EquationTextError::UnclearPlus { .. } => "unclear-plus",
            EquationTextError::Minus { .. } => "minus-between-species",
            EquationTextError::ZeroCoefficient { .. } => "zero-coefficient",
            EquationTextError::CoefficientOutOfRange { .. } => "coefficient-out-of-range",
            EquationTextError::TwoCoefficients { .. } => "two-coefficients",
            EquationTextError::Species(error) => error.code(),
        }
    }

    fn hint(&self) -> String {
        match self {
            EquationTextError::TooLong { .. } => "write the reaction in several steps and add their results".to_owned(),
            EquationTextError::NoArrow { .. } => {
                "write reactants -> products, as in CO(g) + H2O(g) -> CO2(g) + H2(g); = and <=> are read as well"
                    .to_owned()
            }
            EquationTextError::SeveralArrows { .. } => "write each step as a reaction of its own".to_owned(),
            EquationTextError::BackwardArrow { .. } => "write the reactants on the left and the arrow as ->".to_owned(),
            EquationTextError::UnclearArrow { before, .. } => {
                format!("put a space before the arrow: {before} -> or {before}- ->")
            }
            EquationTextError::EmptySide { .. } => "write at least one species on each side of the arrow".to_owned(),
            EquationTextError::EmptyTerm { .. } => {
                "leave the + out, or write the missing species; a charge stands close behind its formula, as in Na+(aq)"
                    .to_owned()
            }
            EquationTextError::NoSpecies { .. } => {
                "write the species behind its coefficient, as in 2 H2O(l)".to_owned()
            }
            EquationTextError::UnclearPlus { before, after, .. } => {
                format!("put a space on both sides of the joining +: {before} + {after} or {before}+ + {after}")
            }
            EquationTextError::Minus { .. } => {
                "write a species that is used up on the left and one that is formed on the right, each with a positive \
                 coefficient"
                    .to_owned()
            }
            EquationTextError::ZeroCoefficient { .. } => "leave the species out if it takes no part".to_owned(),
            EquationTextError::CoefficientOutOfRange { .. } => "write coefficients such as 2, 0.5 or 1/2".to_owned(),
            EquationTextError::TwoCoefficients { first, second, .. } => match first.checked_add(*second) {
                Some(sum) => format!("write one coefficient, {sum} if the sum is meant"),
                None => "write one coefficient".to_owned(),
            },
            EquationTextError::Species(error) => error.hint(),
        }
    }
}

impl EquationText {
    /// Takes an equation apart. Every name is checked for its brackets and its phase, none is looked up.
    pub fn parse(text: &str) -> Result<EquationText, EquationTextError> {
        let text = text.trim().replace('−', "-");
        let length = text.chars().count();
        if length > LONGEST {
            return Err(EquationTextError::TooLong { length });
        }
        let arrows = find_arrows(&text)?;
        let written = |at: &(usize, usize)| text[at.0..at.1].to_owned();
        if let Some(backward) = arrows.iter().find(|arrow| !is_forward(&text[arrow.0..arrow.1])) {
            return Err(EquationTextError::BackwardArrow { arrow: written(backward), text });
        }
        match arrows.as_slice() {
            [] => Err(EquationTextError::NoArrow { text }),
            [only] => {
                let side = |part: &str, side: &'static str| {
                    if part.trim().is_empty() {
                        return Err(EquationTextError::EmptySide { text: text.clone(), side });
                    }
                    split_terms(part)?.into_iter().map(read_term).collect()
                };
                Ok(EquationText { left: side(&text[..only.0], "left")?, right: side(&text[only.1..], "right")? })
            }
            [first, second, ..] => {
                Err(EquationTextError::SeveralArrows { first: written(first), second: written(second), text })
            }
        }
    }
}

fn is_forward(arrow: &str) -> bool {
    !arrow.starts_with('<') || arrow.ends_with('>')
}

/// Byte ranges of the arrows: `->` and `=>` with any number of dashes, `=`, `<=>`, `<->`, and the arrows of print.
fn find_arrows(text: &str) -> Result<Vec<(usize, usize)>, EquationTextError> {
    let mut arrows = Vec::new();
    let mut at = 0;
    while let Some(c) = text[at..].chars().next() {
        if "→⟶⇒⇌⇋⇄↔⟷".contains(c) {
            arrows.push((at, at + c.len_utf8()));
            at += c.len_utf8();
            continue;
        }
        let open = usize::from(c == '<');
        let dash = if text[at + open..].starts_with('=') { '=' } else { '-' };
        let shaft = text[at + open..].chars().take_while(|&c| c == dash).count();
        let end = at + open + shaft;
        let head = usize::from(text[end..].starts_with('>'));
        if shaft > 0 && (dash == '=' || open + head > 0) {
            let charge = if dash == '-' && open == 0 && shaft > 1 { charge_before_arrow(text, at, end)? } else { 0 };
            arrows.push((at + charge, end + head));
            at = end + head;
        } else {
            at += c.len_utf8().max(shaft);
        }
    }
    Ok(arrows)
}

/// Whether the first of several dashes is a charge: never behind a space, a phase (`H2(g)-->`) or a whole charge
/// (`Na+-->`), always behind the electron's e; elsewhere nobody can tell.
fn charge_before_arrow(text: &str, at: usize, end: usize) -> Result<usize, EquationTextError> {
    let before = &text[..at];
    let word = before.rsplit([' ', '+', '\t']).next().unwrap_or("");
    let whole_charge = before.trim_end_matches(|c: char| c.is_ascii_digit()).ends_with(['+', '-']);
    if before.is_empty() || before.ends_with([' ', '\t', '⁺', '⁻']) || whole_charge || ends_in_phase(before) {
        return Ok(0);
    }
    if word.trim_start_matches(|c: char| c.is_ascii_digit()) == "e" {
        return Ok(1);
    }
    Err(EquationTextError::UnclearArrow {
        text: text.to_owned(),
        before: word.to_owned(),
        dashes: text[at..end].to_owned(),
    })
}

/// Splits one side at the plus signs that join terms.
fn split_terms(side: &str) -> Result<Vec<&str>, EquationTextError> {
    let mut terms = Vec::new();
    let mut start = 0;
    let mut depth = 0_usize;
    for (at, c) in side.char_indices() {
        match c {
            '(' | '[' => depth += 1,
            ')' | ']' => depth = depth.saturating_sub(1),
            '+' if depth == 0 => match plus_role(&side[start..at], &side[at + 1..]) {
                PlusRole::Joins => {
                    terms.push(side[start..at].trim());
                    start = at + 1;
                }
                PlusRole::Charges => {}
                PlusRole::Unclear => {
                    return Err(EquationTextError::UnclearPlus {
                        text: side.trim().to_owned(),
                        before: side[start..at].trim().to_owned(),
                        after: side[at + 1..].split(" + ").next().unwrap_or("").trim().to_owned(),
                    });
                }
            },
            _ => {}
        }
    }
    terms.push(side[start..].trim());
    let last = terms.len() - 1;
    match terms.iter().position(|term| term.is_empty()) {
        None => Ok(terms),
        Some(at) => Err(EquationTextError::EmptyTerm {
            text: side.trim().to_owned(),
            place: if at == last { "after it" } else { "before it" },
        }),
    }
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum PlusRole {
    Joins,
    Charges,
    Unclear,
}

/// What a plus sign does between the `before` of its own term and the `after`.
///
/// - Behind a phase or a space it joins.
/// - Behind a caret with or without digits (`Ca^2+`) it is a charge.
/// - Otherwise it is close behind a formula. It is a charge if nothing, a phase, or another plus follows, digits of the
///   charge and spaces skipped (`Na+ + Cl-`, `Ca+2(aq)`, `Na++Cl-`). It joins if what follows close behind starts a
///   term (`H2+O2`, `H2+2H2O`). With a space only behind it, before a term, both are possible.
fn plus_role(before: &str, after: &str) -> PlusRole {
    if before.ends_with(char::is_whitespace) || before.is_empty() || ends_in_phase(before) {
        return PlusRole::Joins;
    }
    if before.trim_end_matches(|c: char| c.is_ascii_digit()).ends_with('^') {
        return PlusRole::Charges;
    }
    let behind_digits = after.trim_start_matches(|c: char| c.is_ascii_digit());
    let next = behind_digits.trim_start();
    if next.is_empty() || next.starts_with('+') || starts_with_phase(next) {
        PlusRole::Charges
    } else if behind_digits.len() > next.len() {
        PlusRole::Unclear
    } else {
        PlusRole::Joins
    }
}

/// One term: its coefficient, if it has one, and its name.
fn read_term(term: &str) -> Result<WrittenTerm, EquationTextError> {
    if term.starts_with('-') || term.contains(" - ") {
        return Err(EquationTextError::Minus { term: term.to_owned() });
    }
    let Some((coefficient, rest)) = read_coefficient(term)? else {
        return Ok(WrittenTerm::Plain(term.parse()?));
    };
    let starred = rest.trim_start().strip_prefix(['*', '·', '×']);
    let name = starred.unwrap_or(rest).trim_start();
    if name.is_empty() {
        return Err(EquationTextError::NoSpecies { term: term.to_owned() });
    }
    let stands_apart = starred.is_some() || term.starts_with('(') || rest.starts_with(char::is_whitespace);
    if !stands_apart && rest.starts_with(['-', ',', '\'']) {
        return Ok(WrittenTerm::Plain(term.parse()?));
    }
    if coefficient.is_zero() {
        return Err(EquationTextError::ZeroCoefficient { term: term.to_owned() });
    }
    if stands_apart {
        if let Some((second, behind)) = read_coefficient(name)?
            && (behind.starts_with(char::is_whitespace) || behind.is_empty())
        {
            return Err(EquationTextError::TwoCoefficients { term: term.to_owned(), first: coefficient, second });
        }
        return Ok(WrittenTerm::Coefficient(coefficient, name.parse()?));
    }
    Ok(WrittenTerm::Glued { whole: term.parse()?, coefficient, rest: name.parse()? })
}

/// A number at the start, `2`, `0.5`, `1/2`, `½`, `1½` or one of them in round brackets, and what comes behind it.
fn read_coefficient(term: &str) -> Result<Option<(Rational, &str)>, EquationTextError> {
    let out_of_range = || EquationTextError::CoefficientOutOfRange { term: term.to_owned() };
    if let Some((inside, rest)) = term.strip_prefix('(').and_then(|rest| rest.split_once(')')) {
        return Ok(match read_coefficient(inside.trim())? {
            Some((value, "")) => Some((value, rest)),
            _ => None,
        });
    }
    let (whole, rest) = match Rational::read_prefix(term) {
        Some((Ok(value), length)) => (Some(value), &term[length..]),
        Some((Err(NotRational::OutOfRange | NotRational::Malformed), _)) => return Err(out_of_range()),
        None => (None, term),
    };
    let mut behind = rest.chars();
    match behind.next().and_then(vulgar_fraction) {
        Some(fraction) if whole.is_none_or(Rational::is_integer) => {
            let value = whole.unwrap_or(Rational::ZERO).checked_add(fraction).ok_or_else(out_of_range)?;
            Ok(Some((value, behind.as_str())))
        }
        _ => Ok(whole.map(|value| (value, rest))),
    }
}

fn vulgar_fraction(c: char) -> Option<Rational> {
    let (over, under) = match c {
        '½' => (1, 2),
        '⅓' => (1, 3),
        '⅔' => (2, 3),
        '¼' => (1, 4),
        '¾' => (3, 4),
        '⅕' => (1, 5),
        '⅖' => (2, 5),
        '⅗' => (3, 5),
        '⅘' => (4, 5),
        '⅙' => (1, 6),
        '⅚' => (5, 6),
        '⅛' => (1, 8),
        '⅜' => (3, 8),
        '⅝' => (5, 8),
        '⅞' => (7, 8),
        _ => return None,
    };
    Rational::new(over, under)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Terms as `coefficient name`, a glued one as `whole|coefficient name`.
    fn side(terms: &[WrittenTerm]) -> String {
        let one = |term: &WrittenTerm| match term {
            WrittenTerm::Plain(name) => name.to_string(),
            WrittenTerm::Coefficient(coefficient, name) => format!("{coefficient} {name}"),
            WrittenTerm::Glued { whole, coefficient, rest } => format!("{whole}|{coefficient} {rest}"),
        };
        terms.iter().map(one).collect::<Vec<_>>().join(" & ")
    }

    fn read(text: &str) -> (String, String) {
        let read = EquationText::parse(text).unwrap_or_else(|error| panic!("{text}: {error}"));
        (side(&read.left), side(&read.right))
    }

    #[test]
    fn coefficients_and_names_that_start_with_digits() {
        let rows = [
            ("2 H2O(l)", "2 H2O(l)"),
            ("2H2O(l)", "2H2O(l)|2 H2O(l)"),
            ("2*H2O(l)", "2 H2O(l)"),
            ("2 * H2O(l)", "2 H2O(l)"),
            ("(1/2) O2(g)", "1/2 O2(g)"),
            ("1/2 O2(g)", "1/2 O2(g)"),
            ("1/2O2(g)", "1/2O2(g)|1/2 O2(g)"),
            ("½ O2(g)", "1/2 O2(g)"),
            ("1½O2(g)", "1½O2(g)|3/2 O2(g)"),
            ("0.5 O2(g)", "1/2 O2(g)"),
            ("7.5 O2(g)", "15/2 O2(g)"),
            ("2-propanol(g)", "2-propanol(g)"),
            ("2 2-propanol(g)", "2 2-propanol(g)"),
            ("1,3-butadiene(g)", "1,3-butadiene(g)"),
            ("2,2,4-trimethylpentane(g)", "2,2,4-trimethylpentane(g)"),
            ("3 2-methylbutane(l)", "3 2-methylbutane(l)"),
            ("2 propane(g)", "2 propane(g)"),
            ("2 e-", "2 e-"),
            ("(NH4)2SO4(cr)", "(NH4)2SO4(cr)"),
            ("L-(+)-tartaric acid(cr)", "L-(+)-tartaric acid(cr)"),
        ];
        for (term, expected) in rows {
            assert_eq!(read(&format!("{term} -> X(g)")).0, expected, "{term}");
        }
    }

    #[test]
    fn plus_signs_join_or_are_charges() {
        let rows = [
            ("Na+(aq) + Cl-(aq)", "Na+(aq) & Cl-(aq)"),
            ("Na+(aq)+Cl-(aq)", "Na+(aq) & Cl-(aq)"),
            ("A(g)+B(g)", "A(g) & B(g)"),
            ("A(g)+ B(g)", "A(g) & B(g)"),
            ("A(g) +B(g)", "A(g) & B(g)"),
            ("A(g)+2-propanol(g)", "A(g) & 2-propanol(g)"),
            ("H2+O2", "H2 & O2"),
            ("H2+2H2O", "H2 & 2H2O|2 H2O"),
            ("H2+1/2O2", "H2 & 1/2O2|1/2 O2"),
            ("Na+ + Cl-", "Na+ & Cl-"),
            ("Na++Cl-", "Na+ & Cl-"),
            ("Ca+2 + 2 Cl-", "Ca+2 & 2 Cl-"),
            ("SO4-2+Ca+2", "SO4-2 & Ca+2"),
            ("Ca+2(aq)+SO4-2(aq)", "Ca+2(aq) & SO4-2(aq)"),
            ("Ca^2++SO4^2-", "Ca^2+ & SO4^2-"),
            ("Ca^+2+SO4^-2", "Ca^+2 & SO4^-2"),
            ("Ca++ + CO3--", "Ca++ & CO3--"),
            ("e-+H+", "e- & H+"),
            ("CO2+(NH4)2S", "CO2 & (NH4)2S"),
            ("(+)-limonene(l) + O2(g)", "(+)-limonene(l) & O2(g)"),
        ];
        for (left, expected) in rows {
            assert_eq!(read(&format!("{left} -> X(g)")), (expected.to_owned(), "X(g)".to_owned()), "{left}");
            assert_eq!(read(&format!("X(g) = {left}")).1, expected, "{left}");
        }
    }

    #[test]
    fn arrows_of_all_kinds() {
        for arrow in ["->", "-->", "--->", "=>", "=", "==", "<=>", "<->", "<-->", "→", "⟶", "⇌", "↔"] {
            for text in [format!("A(g) {arrow} B(g)"), format!("A(g){arrow}B(g)")] {
                assert_eq!(read(&text), ("A(g)".to_owned(), "B(g)".to_owned()), "{text}");
            }
        }
        assert_eq!(read("Cl- -> Cl + e-").0, "Cl-");
        assert_eq!(read("Ag+ + e-->Ag").0, "Ag+ & e-");
        assert_eq!(read("Na+-->X").0, "Na+");
        assert_eq!(read("Cl->Cl").0, "Cl");
    }

    #[test]
    fn faults_name_what_is_wrong() {
        let rows = [
            ("CO(g) + H2O(g)", "no-arrow"),
            ("", "no-arrow"),
            ("A(g) -> B(g) -> C(g)", "several-arrows"),
            ("A(g) <- B(g)", "backward-arrow"),
            ("A(g) <= B(g)", "backward-arrow"),
            ("H2O2-->H2O", "unclear-arrow"),
            ("-> B(g)", "empty-side"),
            ("A(g) ->", "empty-side"),
            ("A(g) + + B(g) -> C(g)", "plus-without-species"),
            ("A(g) + -> C(g)", "plus-without-species"),
            ("+ A(g) -> C(g)", "plus-without-species"),
            ("H2+ O2 -> X(g)", "unclear-plus"),
            ("H2+2 O2 -> X(g)", "unclear-plus"),
            ("A(g) - B(g) -> C(g)", "minus-between-species"),
            ("A - B -> C(g)", "minus-between-species"),
            ("-2 A(g) -> C(g)", "minus-between-species"),
            ("0 A(g) -> C(g)", "zero-coefficient"),
            ("1/0 A(g) -> C(g)", "coefficient-out-of-range"),
            ("99999999999999999999 A(g) -> C(g)", "coefficient-out-of-range"),
            ("1 1/2 O2(g) -> C(g)", "two-coefficients"),
            ("2 -> C(g)", "coefficient-without-species"),
            ("H2(g) O2(g) -> H2O(g)", "stray-text"),
            ("H2O(l) -> H2O(g) at 373 K", "stray-text"),
            ("Ca(OH(cr) -> X(g)", "unpaired-bracket"),
        ];
        for (text, code) in rows {
            let error = EquationText::parse(text).expect_err(text);
            assert_eq!(error.code(), code, "{text}: {error}");
            assert!(!error.hint().is_empty() && !error.to_string().is_empty());
        }
        assert_eq!(EquationText::parse(&"A".repeat(4001)).unwrap_err().code(), "equation-too-long");
        let unclear = EquationText::parse("H2+ O2 + N2 -> X(g)").unwrap_err();
        assert_eq!(unclear.hint(), "put a space on both sides of the joining +: H2 + O2 or H2+ + O2");
        let two = EquationText::parse("1 1/2 O2(g) -> C(g)").unwrap_err();
        assert_eq!(two.hint(), "write one coefficient, 3/2 if the sum is meant");
    }
}
