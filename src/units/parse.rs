//! The text of a unit, as in print, to a [`Unit`]: `kJ mol^-1`, `kJ·mol⁻¹`, `J/(K mol)`, `mol[NaCl]/kg[H2O]`.
//!
//! Division is left-associative: `J/K/mol` is J/(K mol). The surprise: `J/K mol` is refused, since print uses it both
//! ways; so is everything else that two readers could take for two units. No text makes this panic or run long.

use crate::units::dimension::Entity;
use crate::units::entity_name::entity;
use crate::units::exponent::{halves, is_minus, superscript};
use crate::units::near_miss::near;
use crate::units::refused::refused;
use crate::units::table::lookup;
use crate::units::terms::{Term, Terms};
use crate::units::unit::Unit;
use crate::units::unit_error::UnitError;

/// Longest text that is read, and longest machine text of a unit.
pub const MAX_BYTES: usize = 1000;

/// Deepest nesting of parentheses.
pub const MAX_DEPTH: usize = 16;

/// The unit that a text names.
pub fn unit(text: &str) -> Result<Unit, UnitError> {
    terms(text)?.unit()
}

/// The product of two units, written as one fraction.
pub fn product(left: &Unit, right: &Unit) -> Result<Unit, UnitError> {
    joined(left, right, 2)
}

/// One unit over another, written as one fraction.
pub fn quotient(over: &Unit, under: &Unit) -> Result<Unit, UnitError> {
    joined(over, under, -2)
}

/// A unit to the power `halves / 2`.
pub fn power(unit: &Unit, halves: i32) -> Result<Unit, UnitError> {
    if halves == 0 {
        return Err(UnitError::ZeroExponent { symbol: unit.text.to_string() });
    }
    Terms::of(raised(terms(&unit.text)?.list(), halves, &unit.text)?)?.unit()
}

/// The unit with its open moles made moles of `entity`: `kcal_th/mol` for CH4 is `kcal_th/mol[CH4]`.
pub fn bound(unit: &Unit, entity: Entity) -> Result<Unit, UnitError> {
    let named = (!entity.is_open()).then_some(entity);
    let open = |term: &Term| term.of.is_none() && term.row.moles == 1 && term.row.counts().is_some();
    let list: Vec<Term> = terms(&unit.text)?
        .list()
        .iter()
        .map(|term| if open(term) { Term { of: named, ..*term } } else { *term })
        .collect();
    Terms::of(list)?.unit()
}

fn joined(left: &Unit, right: &Unit, halves: i32) -> Result<Unit, UnitError> {
    let mut list = terms(&left.text)?.list().to_vec();
    list.extend(raised(terms(&right.text)?.list(), halves, &right.text)?);
    Terms::of(list)?.unit()
}

/// The factors that a text names.
pub(crate) fn terms(text: &str) -> Result<Terms, UnitError> {
    if text.len() > MAX_BYTES {
        return Err(UnitError::TooLong { bytes: text.len() });
    }
    let mut reader = Reader { text, at: 0 };
    reader.spaces();
    if reader.peek().is_none() {
        return Err(UnitError::Empty);
    }
    let list = reader.sequence(0)?;
    match reader.peek() {
        None => Terms::of(list),
        Some(bracket) => Err(UnitError::UnmatchedBracket { bracket }),
    }
}

fn raised(list: &[Term], halves: i32, written: &str) -> Result<Vec<Term>, UnitError> {
    let raise = |term: &Term| match term.halves.checked_mul(halves) {
        Some(product) if product % 2 == 0 => Ok(Term { halves: product / 2, ..*term }),
        Some(_) => {
            let exponent = format!("{halves}/2");
            Err(UnitError::ExponentNotHalf { symbol: written.to_owned(), exponent })
        }
        None => Err(UnitError::ExponentTooLarge { symbol: written.to_owned() }),
    };
    list.iter().map(raise).collect()
}

/// What stands between two factors.
#[derive(Clone, Copy, PartialEq)]
enum Joint {
    Times,
    Over,
}

/// One factor as written, for the two readings of a text that has them.
struct Piece<'a> {
    joint: Joint,
    written: &'a str,
}

struct Reader<'a> {
    text: &'a str,
    /// Always at the start of a character.
    at: usize,
}

impl<'a> Reader<'a> {
    fn peek(&self) -> Option<char> {
        self.text[self.at..].chars().next()
    }

    fn after_peek(&self) -> Option<char> {
        self.text[self.at..].chars().nth(1)
    }

    fn skip(&mut self) {
        self.at += self.peek().map_or(0, char::len_utf8);
    }

    fn take_while(&mut self, wanted: impl Fn(char) -> bool) -> &'a str {
        let from = self.at;
        while self.peek().is_some_and(&wanted) {
            self.skip();
        }
        &self.text[from..self.at]
    }

    fn spaces(&mut self) {
        self.take_while(char::is_whitespace);
    }

    /// Factors up to the end or to a closing bracket, which is left standing.
    fn sequence(&mut self, depth: usize) -> Result<Vec<Term>, UnitError> {
        let mut list: Vec<Term> = Vec::new();
        let mut pieces: Vec<Piece<'a>> = Vec::new();
        let from = self.at;
        let mut joint = Joint::Times;
        let mut divided = false;
        let mut ambiguous = false;
        let mut beside = None;
        loop {
            self.spaces();
            match self.peek() {
                None | Some(')') => {
                    let beside = beside.or(self.peek()).or(self.text[..self.at].chars().last());
                    return Err(UnitError::MissingFactor { beside: beside.unwrap_or('/') });
                }
                Some(c) if joint_of(c).is_some() => return Err(UnitError::MissingFactor { beside: c }),
                Some(_) => {}
            }
            let start = self.at;
            let holder = list.last().filter(|_| joint == Joint::Times).copied();
            let factor = self.factor(depth, pieces.is_empty(), holder)?;
            pieces.push(Piece { joint, written: &self.text[start..self.at] });
            list.extend(raised(&factor, if joint == Joint::Over { -2 } else { 2 }, "")?);
            self.spaces();
            let Some(next) = self.peek() else { break };
            match joint_of(next) {
                Some(found) => {
                    self.skip();
                    (joint, beside) = (found, Some(next));
                }
                None if next == ')' => break,
                None => (joint, beside) = (Joint::Times, None),
            }
            divided |= joint == Joint::Over;
            ambiguous |= divided && joint == Joint::Times;
        }
        if ambiguous {
            let text = self.text[from..self.at].trim().to_owned();
            return Err(UnitError::SlashThenProduct { text, below: read_below(&pieces), above: read_above(&pieces) });
        }
        Ok(list)
    }

    /// One factor with its power. `holder` is the unit before it, which may be what a stray substance belongs to.
    fn factor(&mut self, depth: usize, first: bool, holder: Option<Term>) -> Result<Vec<Term>, UnitError> {
        match self.peek() {
            Some('(') => self.group(depth),
            Some(c) if c.is_ascii_digit() => self.one(first),
            Some(c) if in_symbol(c) => self.symbol(holder),
            Some('[' | '{') => {
                let (entity, _) = self.brackets()?;
                Err(UnitError::EntityWithoutUnit { entity: entity.to_owned() })
            }
            Some(bracket @ (']' | '}')) => Err(UnitError::UnmatchedBracket { bracket }),
            Some(character) => Err(UnitError::StrangeCharacter { character }),
            None => Err(UnitError::Empty),
        }
    }

    fn group(&mut self, depth: usize) -> Result<Vec<Term>, UnitError> {
        if depth == MAX_DEPTH {
            return Err(UnitError::TooDeep);
        }
        let from = self.at;
        self.skip();
        let list = self.sequence(depth + 1)?;
        if self.peek() != Some(')') {
            return Err(UnitError::UnmatchedBracket { bracket: '(' });
        }
        self.skip();
        let written = &self.text[from..self.at];
        if matches!(self.peek(), Some('[' | '{')) {
            let (entity, _) = self.brackets()?;
            return Err(UnitError::EntityOnOtherUnit { symbol: written.to_owned(), entity: entity.to_owned() });
        }
        match self.exponent(written)? {
            Some(halves) => raised(&list, halves, written),
            None => Ok(list),
        }
    }

    /// The 1 in `1/K`; every other number is refused.
    fn one(&mut self, first: bool) -> Result<Vec<Term>, UnitError> {
        let number = self.take_while(|c| c.is_ascii_digit() || c == '.');
        self.spaces();
        let ends = matches!(self.peek(), None | Some(')')) || self.peek().and_then(joint_of) == Some(Joint::Over);
        if number == "1" && first && ends {
            return Ok(Vec::new());
        }
        Err(UnitError::NumberInUnit { number: number.to_owned() })
    }

    fn symbol(&mut self, holder: Option<Term>) -> Result<Vec<Term>, UnitError> {
        let from = self.at;
        let symbol = self.take_while(in_symbol);
        if let Some((entry, prefix)) = refused(symbol) {
            return Err(UnitError::Refused {
                entry,
                written: symbol.to_owned(),
                prefix,
                before: self.text[..from].to_owned(),
                after: self.text[self.at..].to_owned(),
            });
        }
        let mut term = match (lookup(symbol), squared_length(symbol)) {
            (Some(spelled), _) => Term::new(spelled, None, 2),
            (None, Some(term)) => return Ok(vec![term]),
            (None, None) => return Err(self.unknown(symbol, holder)),
        };
        // A space may stand before the bracket; what the bracket holds cannot be a factor of its own.
        let end = self.at;
        self.spaces();
        if matches!(self.peek(), Some('[' | '{')) {
            let (written, name) = self.brackets()?;
            if term.row.counts().is_none() {
                return Err(UnitError::EntityOnOtherUnit { symbol: symbol.to_owned(), entity: written.to_owned() });
            }
            term.of = Some(name.ok_or(UnitError::EmptyEntity { symbol: symbol.to_owned() })?);
        } else {
            self.at = end;
        }
        if let Some(halves) = self.exponent(symbol)? {
            term.halves = halves;
        }
        Ok(vec![term])
    }

    fn unknown(&mut self, symbol: &str, holder: Option<Term>) -> UnitError {
        let stem = symbol.trim_end_matches(|c: char| c.is_ascii_digit());
        let near = near(symbol);
        if let Some(holder) = holder.filter(|term| term.of.is_none() && term.row.counts().is_some())
            && (near.is_empty() || looks_like_formula(symbol))
        {
            let rest = self.rest_of_name();
            let substance = format!("{symbol}{rest}");
            return UnitError::SubstanceOutsideBrackets { substance, holder: holder.stem() };
        }
        if stem.len() < symbol.len() && lookup(stem).is_some() {
            let meant = format!("{stem}^{}", &symbol[stem.len()..]);
            return UnitError::ExponentWithoutCaret { written: symbol.to_owned(), meant };
        }
        UnitError::Unknown { symbol: symbol.to_owned(), near }
    }

    /// What follows the letters in a substance's name: a charge, a group, a phase, up to a bracket that is not its own.
    fn rest_of_name(&mut self) -> &'a str {
        let from = self.at;
        let mut depth = 0_usize;
        while let Some(c) = self.peek() {
            match c {
                '(' => depth += 1,
                ')' if depth > 0 => depth -= 1,
                '+' | '-' | ',' => {}
                _ if in_symbol(c) => {}
                _ => break,
            }
            self.skip();
        }
        &self.text[from..self.at]
    }

    /// `[name]` or `{name}`: what stands inside, and the entity it names. Brackets may nest inside a name.
    fn brackets(&mut self) -> Result<(&'a str, Option<Entity>), UnitError> {
        let open = self.peek().unwrap_or('[');
        let close = if open == '{' { '}' } else { ']' };
        let unmatched = |bracket| UnitError::UnmatchedBracket { bracket };
        self.skip();
        let from = self.at;
        let mut depth = 1_usize;
        loop {
            match self.peek() {
                None => return Err(unmatched(open)),
                Some(c) if c == open => depth += 1,
                Some(c) if c == close => depth -= 1,
                Some(character) if character.is_control() => return Err(UnitError::StrangeCharacter { character }),
                Some(_) => {}
            }
            if depth == 0 {
                break;
            }
            self.skip();
        }
        let inside = &self.text[from..self.at];
        self.skip();
        // Machine text has square brackets, so a name must balance them even where braces held it.
        if open == '{' {
            let mut level = 0_i32;
            for c in inside.chars() {
                level += i32::from(c == '[') - i32::from(c == ']');
                if level < 0 {
                    return Err(unmatched(']'));
                }
            }
            if level != 0 {
                return Err(unmatched('['));
            }
        }
        Ok((inside, entity(inside)))
    }

    /// The power after a factor, in halves; `None` where there is none.
    fn exponent(&mut self, symbol: &str) -> Result<Option<i32>, UnitError> {
        let unreadable = || UnitError::UnreadableExponent { symbol: symbol.to_owned() };
        let halves = match (self.peek(), self.after_peek()) {
            (Some(c), _) if superscript(c).is_some() || matches!(c, '⁺' | '⁻') => self.raised_digits(symbol)?,
            // `J K-1`, as plain text copied from print has it. A digit without its sign is refused elsewhere.
            (Some(c), Some(digit)) if is_minus(c) && digit.is_ascii_digit() => self.number(symbol, false)?,
            _ => {
                let end = self.at;
                self.spaces();
                if self.peek() == Some('^') {
                    self.skip();
                } else if self.text[self.at..].starts_with("**") {
                    self.at += "**".len();
                } else {
                    self.at = end;
                    return Ok(None);
                }
                self.spaces();
                self.exponent_after_caret(symbol)?
            }
        };
        match self.peek() {
            Some(c) if c == '^' || in_symbol(c) || superscript(c).is_some() || c == '.' => Err(unreadable()),
            _ if halves == 0 => Err(UnitError::ZeroExponent { symbol: symbol.to_owned() }),
            _ => Ok(Some(halves)),
        }
    }

    fn exponent_after_caret(&mut self, symbol: &str) -> Result<i32, UnitError> {
        let close = match self.peek() {
            Some('(') => ')',
            Some('{') => '}',
            _ => return self.number(symbol, false),
        };
        self.skip();
        self.spaces();
        let halves = self.number(symbol, true)?;
        self.spaces();
        if self.peek() != Some(close) {
            return Err(UnitError::UnreadableExponent { symbol: symbol.to_owned() });
        }
        self.skip();
        Ok(halves)
    }

    fn raised_digits(&mut self, symbol: &str) -> Result<i32, UnitError> {
        let negative = self.peek() == Some('⁻');
        if negative || self.peek() == Some('⁺') {
            self.skip();
        }
        let digits = self.take_while(|c| superscript(c).is_some());
        let digits: String = digits.chars().filter_map(superscript).collect();
        halves(negative, &digits, "", "", symbol)
    }

    /// `-1`, `0.5`, and in brackets `1/2`: outside them a slash is a fraction line.
    fn number(&mut self, symbol: &str, bracketed: bool) -> Result<i32, UnitError> {
        let negative = self.peek().is_some_and(is_minus);
        if negative || self.peek() == Some('+') {
            self.skip();
        }
        let digits = |reader: &mut Self| reader.take_while(|c| c.is_ascii_digit());
        let whole = digits(self);
        let (mut decimals, mut divisor) = ("", "");
        if self.peek() == Some('.') && self.after_peek().is_some_and(|c| c.is_ascii_digit()) {
            self.skip();
            decimals = digits(self);
        } else if bracketed && self.peek() == Some('/') {
            self.skip();
            divisor = digits(self);
            if divisor.is_empty() {
                return Err(UnitError::UnreadableExponent { symbol: symbol.to_owned() });
            }
        }
        halves(negative, whole, decimals, divisor, symbol)
    }
}

fn in_symbol(c: char) -> bool {
    c.is_alphabetic() || c.is_ascii_digit() || matches!(c, '_' | '°' | '%' | '℃' | '℉')
}

/// `cm3`, `ft2`: a digit after a length is its power, as plain text copied from print has it. After other units it may
/// be part of a formula: `H2` is no square henry.
fn squared_length(symbol: &str) -> Option<Term> {
    let power = symbol.chars().last()?.to_digit(10).filter(|digit| matches!(digit, 2 | 3))?;
    let spelled = lookup(&symbol[..symbol.len() - 1])?;
    let metres = spelled.row.moles == 0 && spelled.row.bases == [1, 0, 0, 0, 0, 0];
    metres.then(|| Term::new(spelled, None, 2 * power as i32))
}

fn joint_of(c: char) -> Option<Joint> {
    match c {
        '·' | '⋅' | '∙' | '×' | '*' => Some(Joint::Times),
        '/' | '∕' | '⁄' => Some(Joint::Over),
        _ => None,
    }
}

/// Capitals, small letters and digits in the order of a formula, and more than one letter could explain away.
fn looks_like_formula(symbol: &str) -> bool {
    let capitals = symbol.chars().filter(char::is_ascii_uppercase).count();
    let digits = symbol.chars().filter(char::is_ascii_digit).count();
    symbol.starts_with(|c: char| c.is_ascii_uppercase())
        && symbol.chars().all(|c| c.is_ascii_alphanumeric())
        && (capitals > 1 || digits > 0)
}

/// Everything after a slash, up to the next one, below its line.
fn read_below(pieces: &[Piece<'_>]) -> String {
    let mut runs: Vec<Vec<&str>> = vec![Vec::new()];
    for piece in pieces {
        if piece.joint == Joint::Over {
            runs.push(Vec::new());
        }
        if let Some(run) = runs.last_mut() {
            run.push(piece.written);
        }
    }
    let shown = runs.iter().enumerate().map(|(i, run)| match run.as_slice() {
        [one] => (*one).to_owned(),
        several if i == 0 => several.join(" "),
        several => format!("({})", several.join(" ")),
    });
    shown.collect::<Vec<_>>().join("/")
}

/// Each slash dividing by its one next factor only.
fn read_above(pieces: &[Piece<'_>]) -> String {
    let side = |joint| pieces.iter().filter(move |piece| piece.joint == joint).map(|piece| piece.written);
    let over: Vec<&str> = side(Joint::Times).filter(|written| *written != "1").collect();
    let under: Vec<&str> = side(Joint::Over).collect();
    match under.as_slice() {
        [one] => format!("{}/{one}", over.join(" ")),
        several => format!("{}/({})", over.join(" "), several.join(" ")),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::fault::Explain;
    use crate::units::dimension::{Base, Dimension};
    use crate::units::unit::Scale;

    #[test]
    fn the_forms_of_print_are_one_unit() {
        let groups: [(&str, &[&str]); 9] = [
            (
                "kJ/mol",
                &[
                    "kJ mol^-1",
                    "kJ·mol⁻¹",
                    "kJ mol⁻¹",
                    "kJ*mol**-1",
                    "kJ mol-1",
                    "kJ mol^{-1}",
                    "kJ⋅mol^(−1)",
                    "(kJ)/(mol)",
                ],
            ),
            (
                "J/(K mol)",
                &["J/K/mol", "J K^-1 mol^-1", "J·K⁻¹·mol⁻¹", "J / ( K · mol )", "J\u{a0}K−1\u{2009}mol−1", "(J/K)/mol"],
            ),
            ("1/cm", &["cm^-1", "cm⁻¹", "cm-1", "1/cm", "(cm)^-1"]),
            ("m^3", &["m³", "m3", "m^3.0", "m^(6/2)", "m m^2"]),
            ("m^(1/2)", &["m^0.5", "m**(1/2)", "(m)^0.5"]),
            ("umol", &["µmol", "μmol"]),
            ("angstrom", &["Å", "\u{212B}"]),
            ("ohm", &["Ω", "\u{2126}"]),
            ("mol[CH4]/kg[H2O]", &["mol{CH4}/kg{H2O}", "mol [CH4(g)] / kg[H2O(l)]", "mol[CH4] kg[H2O]^-1"]),
        ];
        for (machine, written) in groups {
            let want = unit(machine).unwrap();
            assert_eq!(*want.text, *machine);
            for text in written {
                assert_eq!(unit(text).unwrap_or_else(|error| panic!("{text}: {error}")), want, "{text}");
            }
        }
    }

    #[test]
    fn both_readings_of_a_slash_and_a_product_are_units() {
        for text in ["J/mol K", "1/K mol", "kJ/mol·K/s", "kg m/s Pa mol", "J/(mol) K^-1"] {
            let Err(UnitError::SlashThenProduct { below, above, .. }) = unit(text) else { panic!("{text}") };
            let (below, above) = (unit(&below).unwrap(), unit(&above).unwrap());
            assert_ne!(below.dim, above.dim, "{text}");
        }
    }

    #[test]
    fn degrees_are_points_alone_and_intervals_below_the_line() {
        assert_eq!(unit("degC").unwrap().scale, Scale::Point { ice: 0.0, degrees: 1.0 });
        assert_eq!(unit("°F").unwrap().scale, Scale::Point { ice: 32.0, degrees: 1.8 });
        let per_degree = unit("J/(g degC)").unwrap();
        assert_eq!((per_degree.factor, per_degree.scale), (1000.0, Scale::Plain));
        assert_eq!(per_degree.dim, unit("J/(kg K)").unwrap().dim);
        assert_eq!(unit("1/degF").unwrap().factor, 1.8);
    }

    #[test]
    fn products_of_units_are_written_as_one_fraction() {
        let of = |text| unit(text).unwrap();
        let molar = quotient(&of("kcal_th"), &of("mol[CH4]")).unwrap();
        assert_eq!((&*molar.text, molar.factor), ("kcal_th/mol[CH4]", 4184.0));
        assert_eq!(&*product(&molar, &of("mol[CH4]/mol[rxn]")).unwrap().text, "kcal_th mol[CH4]/(mol[CH4] mol[rxn])");
        assert_eq!(&*power(&of("m^2"), 1).unwrap().text, "m");
        assert_eq!(power(&of("m"), 0).unwrap_err().code(), "zero-exponent");
        assert_eq!(product(&of("degC"), &of("m")).unwrap_err().code(), "celsius-in-product");
        assert_eq!(&*quotient(&of("1"), &of("K")).unwrap().text, "1/K");
    }

    #[test]
    fn binding_names_the_open_moles_and_leaves_the_rest() {
        let methane = Entity::named("CH4");
        let bound_to = |text| bound(&unit(text).unwrap(), methane).unwrap().text;
        assert_eq!(&*bound_to("kcal_th/mol"), "kcal_th/mol[CH4]");
        assert_eq!(&*bound_to("Btu_IT/lbmol"), "Btu_IT/lbmol[CH4]");
        assert_eq!(&*bound_to("mol/mol[rxn]"), "mol[CH4]/mol[rxn]");
        assert_eq!(&*bound_to("kJ/kg"), "kJ/kg");
        let unit = unit("kcal_th/mol").unwrap();
        assert_eq!(bound(&unit, methane).unwrap().dim, unit.dim.bind(methane));
    }

    #[test]
    fn moles_know_what_they_are_of() {
        let of = |text| unit(text).unwrap().dim;
        assert_eq!(of("mol"), Dimension::amount(Entity::OPEN));
        assert_eq!(of("mol[rxn]"), Dimension::amount(Entity::RXN));
        assert_eq!(of("mol[e-]"), Dimension::amount(Entity::ELECTRON));
        assert_eq!(of("mol[H+]"), Dimension::amount(Entity::PROTON));
        assert_eq!(of("kg"), Dimension::base(Base::Kilogram));
        assert_eq!(of("lb[feed]"), Dimension::mass(Entity::named("feed")));
        assert_eq!(of("mol[Ca(OH)2]"), Dimension::amount(Entity::named("Ca(OH)2")));
        assert_eq!(of("mol[[Fe(CN)6]-4]"), Dimension::amount(Entity::named("[Fe(CN)6]-4")));
    }
}
