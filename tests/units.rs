//! Unit texts against the rules of the SI Brochure, generated and computed here and not by the program.
//!
//! Each property runs 2,000 cases in a debug build and 100,000 in a release build, from the fixed seed [`SEED`]; a
//! failing case is printed shrunk.

use hessbook::fault::Explain;
use hessbook::units::parse::unit;
use hessbook::units::{
    Base, Dimension, Entity, UnitError, basis_words, reader_html, reader_latex, reader_text, unit_for,
};
use proptest::prelude::*;
use proptest::test_runner::{Config, RngAlgorithm, TestRng, TestRunner};

const SEED: [u8; 32] = *b"hessbook units, one fixed seed..";

fn check<S: Strategy>(strategy: &S, test: impl Fn(S::Value) -> Result<(), TestCaseError>) {
    let cases = if cfg!(debug_assertions) { 2_000 } else { 100_000 };
    let config = Config { cases, max_global_rejects: 10 * cases, failure_persistence: None, ..Config::default() };
    let mut runner = TestRunner::new_with_rng(config, TestRng::from_seed(RngAlgorithm::ChaCha, &SEED));
    if let Err(failure) = runner.run(strategy, test) {
        panic!("seed {:?}: {failure}", std::str::from_utf8(&SEED));
    }
}

/// SI Brochure, 9th ed. (2019), Table 7, from memory: symbol and power of ten.
const PREFIXES: [(&str, f64, i32); 21] = [
    ("", 1e0, 0),
    ("da", 1e1, 1),
    ("h", 1e2, 2),
    ("k", 1e3, 3),
    ("M", 1e6, 6),
    ("G", 1e9, 9),
    ("T", 1e12, 12),
    ("P", 1e15, 15),
    ("E", 1e18, 18),
    ("Z", 1e21, 21),
    ("Y", 1e24, 24),
    ("d", 1e-1, -1),
    ("c", 1e-2, -2),
    ("m", 1e-3, -3),
    ("µ", 1e-6, -6),
    ("n", 1e-9, -9),
    ("p", 1e-12, -12),
    ("f", 1e-15, -15),
    ("a", 1e-18, -18),
    ("z", 1e-21, -21),
    ("y", 1e-24, -24),
];

/// SI Brochure, 9th ed. (2019), Tables 2, 4 and 8, from memory: symbol, SI value, exponents of m, kg, s, A, K, cd and
/// mol, and whether prefixes attach.
const UNITS: [(&str, f64, [i8; 7], bool); 29] = [
    ("m", 1.0, [1, 0, 0, 0, 0, 0, 0], true),
    ("g", 1e-3, [0, 1, 0, 0, 0, 0, 0], true),
    ("s", 1.0, [0, 0, 1, 0, 0, 0, 0], true),
    ("A", 1.0, [0, 0, 0, 1, 0, 0, 0], true),
    ("K", 1.0, [0, 0, 0, 0, 1, 0, 0], true),
    ("cd", 1.0, [0, 0, 0, 0, 0, 1, 0], true),
    ("mol", 1.0, [0, 0, 0, 0, 0, 0, 1], true),
    ("rad", 1.0, [0; 7], true),
    ("Hz", 1.0, [0, 0, -1, 0, 0, 0, 0], true),
    ("N", 1.0, [1, 1, -2, 0, 0, 0, 0], true),
    ("Pa", 1.0, [-1, 1, -2, 0, 0, 0, 0], true),
    ("J", 1.0, [2, 1, -2, 0, 0, 0, 0], true),
    ("W", 1.0, [2, 1, -3, 0, 0, 0, 0], true),
    ("C", 1.0, [0, 0, 1, 1, 0, 0, 0], true),
    ("V", 1.0, [2, 1, -3, -1, 0, 0, 0], true),
    ("F", 1.0, [-2, -1, 4, 2, 0, 0, 0], true),
    ("Ω", 1.0, [2, 1, -3, -2, 0, 0, 0], true),
    ("S", 1.0, [-2, -1, 3, 2, 0, 0, 0], true),
    ("Wb", 1.0, [2, 1, -2, -1, 0, 0, 0], true),
    ("T", 1.0, [0, 1, -2, -1, 0, 0, 0], true),
    ("H", 1.0, [2, 1, -2, -2, 0, 0, 0], true),
    ("lx", 1.0, [-2, 0, 0, 0, 0, 1, 0], true),
    ("kat", 1.0, [0, 0, -1, 0, 0, 0, 1], true),
    ("min", 60.0, [0, 0, 1, 0, 0, 0, 0], false),
    ("h", 3600.0, [0, 0, 1, 0, 0, 0, 0], false),
    ("d", 86_400.0, [0, 0, 1, 0, 0, 0, 0], false),
    ("L", 1e-3, [3, 0, 0, 0, 0, 0, 0], true),
    ("t", 1e3, [0, 1, 0, 0, 0, 0, 0], false),
    ("eV", 1.602_176_634e-19, [2, 1, -2, 0, 0, 0, 0], true),
];

/// What is written in brackets, and the name it stands for.
const ENTITIES: [(&str, &str); 9] = [
    ("CH4", "CH4"),
    ("H2O(l)", "H2O"),
    ("rxn", "rxn"),
    ("feed", "feed"),
    ("Ca(OH)2", "Ca(OH)2"),
    ("SiO2(cr,alpha-quartz)", "SiO2"),
    ("acetic acid", "acetic acid"),
    ("SO4-2", "SO4-2"),
    ("e-", "e-"),
];

/// One factor: which unit and prefix, its power in halves, and what it is of.
#[derive(Clone, Copy, Debug)]
struct Factor {
    unit: usize,
    prefix: usize,
    halves: i32,
    entity: Option<usize>,
}

impl Factor {
    fn prefix(&self) -> (&'static str, f64, i32) {
        if UNITS[self.unit].3 { PREFIXES[self.prefix] } else { PREFIXES[0] }
    }

    fn entity(&self) -> Option<(&'static str, &'static str)> {
        let counts = matches!(UNITS[self.unit].0, "mol" | "g" | "t");
        self.entity.filter(|_| counts).map(|at| ENTITIES[at])
    }

    fn symbol(&self) -> String {
        let stem = format!("{}{}", self.prefix().0, UNITS[self.unit].0);
        self.entity().map_or(stem.clone(), |(written, _)| format!("{stem}[{written}]"))
    }

    fn value(&self) -> f64 {
        let one = UNITS[self.unit].1 * self.prefix().1;
        let mut power = if self.halves % 2 == 0 { 1.0 } else { one.sqrt() };
        for _ in 0..self.halves.abs() / 2 {
            power *= one;
        }
        if self.halves < 0 { 1.0 / power } else { power }
    }

    fn dim(&self) -> Dimension {
        let [m, kg, s, a, k, cd, mol] = UNITS[self.unit].2;
        let one = match (self.entity(), UNITS[self.unit].0) {
            (Some((_, name)), "mol") => Dimension::amount(Entity::named(name)),
            (Some((_, name)), _) => Dimension::mass(Entity::named(name)),
            (None, _) => {
                let moles = Dimension::amount(Entity::OPEN).powered(2 * i32::from(mol)).unwrap();
                Dimension::whole([m, kg, s, a, k, cd]).times(&moles)
            }
        };
        one.powered(self.halves).unwrap()
    }
}

fn factors() -> impl Strategy<Value = Vec<Factor>> {
    let power = prop_oneof![8 => (1..=4_i32).prop_map(|n| 2 * n), 1 => Just(1), 1 => Just(3)];
    let signed = (power, any::<bool>()).prop_map(|(halves, negative)| if negative { -halves } else { halves });
    let entity = prop::option::of(0..ENTITIES.len());
    let factor = (0..UNITS.len(), 0..PREFIXES.len(), signed, entity);
    let factor = factor.prop_map(|(unit, prefix, halves, entity)| Factor { unit, prefix, halves, entity });
    prop::collection::vec(factor, 1..5)
}

/// How a power is written.
#[derive(Clone, Copy, Debug)]
enum Raised {
    Caret,
    Stars,
    Brackets,
    Superscript,
}

/// How factors with negative powers are written.
#[derive(Clone, Copy, Debug)]
enum Line {
    NegativePowers,
    Brackets,
    Slashes,
}

fn style() -> impl Strategy<Value = (Raised, Line, &'static str)> {
    let raised =
        prop_oneof![Just(Raised::Caret), Just(Raised::Stars), Just(Raised::Brackets), Just(Raised::Superscript),];
    let line = prop_oneof![Just(Line::NegativePowers), Just(Line::Brackets), Just(Line::Slashes)];
    (raised, line, prop_oneof![Just(" "), Just("·"), Just("*"), Just(" ⋅ "), Just("\u{a0}")])
}

fn superscript(power: i32) -> String {
    let raise = |c: char| match c {
        '-' => '⁻',
        '1' => '¹',
        '2' => '²',
        '3' => '³',
        '4' => '⁴',
        other => panic!("{other} is not in any generated power"),
    };
    power.to_string().chars().map(raise).collect()
}

fn written(factor: &Factor, halves: i32, raised: Raised) -> String {
    let symbol = factor.symbol();
    match (halves, raised) {
        (2, _) => symbol,
        (odd, Raised::Caret) if odd % 2 != 0 => format!("{symbol}^{:.1}", f64::from(odd) / 2.0),
        (odd, _) if odd % 2 != 0 => format!("{symbol}^({odd}/2)"),
        (even, Raised::Caret) => format!("{symbol}^{}", even / 2),
        (even, Raised::Stars) => format!("{symbol}**{}", even / 2),
        (even, Raised::Brackets) => format!("{symbol}^({})", even / 2),
        (even, Raised::Superscript) => format!("{symbol}{}", superscript(even / 2)),
    }
}

fn text(factors: &[Factor], (raised, line, times): (Raised, Line, &str)) -> String {
    if matches!(line, Line::NegativePowers) {
        return factors.iter().map(|f| written(f, f.halves, raised)).collect::<Vec<_>>().join(times);
    }
    let side = |sign: i32| -> Vec<String> {
        let chosen = factors.iter().filter(|f| f.halves * sign > 0);
        chosen.map(|f| written(f, f.halves.abs(), raised)).collect()
    };
    let (over, under) = (side(1), side(-1));
    let over = if over.is_empty() { "1".to_owned() } else { over.join(times) };
    match (under.len(), line) {
        (0, _) => over,
        (1, _) | (_, Line::Slashes) => format!("{over}/{}", under.join("/")),
        _ => format!("{over}/({})", under.join(times)),
    }
}

#[test]
fn texts_by_the_rules_of_the_brochure_have_the_factor_and_dimension_they_say() {
    check(&(factors(), style()), |(factors, style)| {
        // Keeps every partial product of this test inside the range of a float.
        let tens: i32 = factors.iter().map(|f| (f.prefix().2.abs() + 20) * f.halves.abs() / 2 + 20).sum();
        prop_assume!(tens < 300);
        let text = text(&factors, style);
        let got = unit(&text).map_err(|error| TestCaseError::fail(format!("{text}: {error}")))?;
        let want: f64 = factors.iter().map(Factor::value).product();
        // Four units in the last place per factor, a squared factor counting as two: a rounded literal, a rounded
        // prefix and two products on this side make two, and the program's one or two divisions are below one.
        let powers: i32 = factors.iter().map(|f| (f.halves.abs() + 1) / 2).sum();
        prop_assert!(
            (got.factor / want - 1.0).abs() <= 4.0 * f64::EPSILON * f64::from(powers),
            "{text}: {} {want}",
            got.factor
        );
        let dim = factors.iter().fold(Dimension::none(), |dim, factor| dim.times(&factor.dim()));
        prop_assert_eq!(&got.dim, &dim, "{}", text);

        let again = unit(&got.text).map_err(|error| TestCaseError::fail(format!("{}: {error}", got.text)))?;
        prop_assert_eq!(again.factor.to_bits(), got.factor.to_bits(), "{} and {}", text, got.text);
        prop_assert_eq!(&again, &got);
        Ok(())
    });
}

#[test]
fn every_dimension_has_a_unit_to_print_in_that_parses_back() {
    check(&factors(), |factors| {
        let dim = factors.iter().fold(Dimension::none(), |dim, factor| dim.times(&factor.dim()));
        let printed = unit_for(&dim);
        prop_assert_eq!(&printed.dim, &dim);
        let again = unit(&printed.text).map_err(|error| TestCaseError::fail(format!("{}: {error}", printed.text)))?;
        prop_assert_eq!(&again, &printed);
        for shown in [reader_text(&printed), reader_html(&printed), reader_latex(&printed)] {
            prop_assert!(!shown.contains('['), "{}", shown);
        }
        let counted = !dim.entities().is_empty();
        prop_assert!(basis_words(&dim).is_some() || !counted);
        Ok(())
    });
}

fn explained(error: &UnitError) -> Result<(), TestCaseError> {
    prop_assert!(!error.to_string().is_empty() && !error.hint().is_empty() && !error.code().is_empty());
    Ok(())
}

/// A text either is refused with a way out or has machine text that parses back to the same unit.
fn sound(text: &str) -> Result<(), TestCaseError> {
    match unit(text) {
        Err(error) => explained(&error),
        Ok(read) => {
            let again = unit(&read.text).map_err(|error| TestCaseError::fail(format!("{}: {error}", read.text)))?;
            prop_assert_eq!(again.factor.to_bits(), read.factor.to_bits(), "{} and {}", text, read.text);
            prop_assert_eq!(again, read);
            Ok(())
        }
    }
}

#[test]
fn no_text_makes_the_parser_panic() {
    check(&any::<String>(), |text| sound(&text));
}

#[test]
fn no_heap_of_pieces_makes_the_parser_panic() {
    let piece = prop::sample::select(vec![
        "kJ", "mol", "m", "K", "degC", "degF", "cal", "kcal_th", "g", "kg", "1", "2", "0", "-1", "99999", "(", ")",
        "[", "]", "{", "}", "/", "*", "**", "^", "·", " ", "\u{a0}", "²", "⁻", "¹", "½", "CH4", "H2O(l)", "rxn", ".",
        "5", "°C", "µ", "Ω", "%", "_", "mol[", "^(1/2)", "^0.5", "kg[feed]", "e", "E_h", "\u{0}", "é", "\u{301}", "𝔪",
        "−",
    ]);
    check(&prop::collection::vec(piece, 0..24), |pieces| sound(&pieces.concat()));
}

#[test]
fn names_in_brackets_survive_the_round_trip() {
    let piece = prop::sample::select(vec![
        "C",
        "H",
        "OH",
        "2",
        "₂",
        "²",
        "⁻",
        "⁺",
        "^",
        "-",
        "+",
        "−",
        "(",
        ")",
        "(g)",
        "(cr,II)",
        "(aq, undissoc.)",
        " ",
        "[",
        "]",
        ",",
        "1",
        "g",
    ]);
    check(&prop::collection::vec(piece, 1..10), |pieces| {
        sound(&format!("kJ/mol[{}]", pieces.concat()))?;
        sound(&format!("g{{{}}}", pieces.concat()))
    });
}

#[test]
fn half_powers_and_whole_ones_meet() {
    let root = unit("J^(1/2)").unwrap();
    assert_eq!(root.dim.halves(Base::Metre), 2);
    assert_eq!(root.dim.powered(4).unwrap(), unit("J").unwrap().dim);
}

fn code(text: &str) -> &'static str {
    match unit(text) {
        Ok(unit) => panic!("{text} is read as {}", unit.text),
        Err(error) => {
            assert!(!error.hint().is_empty(), "{text}");
            error.code()
        }
    }
}

#[test]
fn what_could_be_two_units_is_refused_with_its_own_code() {
    let rows = [
        ("", "empty-unit"),
        ("  ", "empty-unit"),
        ("cal", "bare-calorie"),
        ("cal/g", "bare-calorie"),
        ("J/cal", "bare-calorie"),
        ("kcal/mol", "bare-calorie"),
        ("Mcal", "bare-calorie"),
        ("Cal", "capital-calorie"),
        ("Btu", "bare-btu"),
        ("BTU/(lb degF)", "bare-btu"),
        ("MMBtu/h", "btu-with-m"),
        ("M", "bare-molar"),
        ("mM/s", "bare-molar"),
        ("at", "bare-technical-atmosphere"),
        ("gal/min", "bare-gallon"),
        ("ton", "bare-ton"),
        ("hp", "bare-horsepower"),
        ("therm", "bare-therm"),
        ("psig", "gauge-pressure"),
        ("MPag", "gauge-pressure"),
        ("Nm3/h", "volume-at-conditions"),
        ("ppb", "parts-per-what"),
        ("mol%", "percent-of-what"),
        ("deg", "bare-degree"),
        ("J/mol K", "slash-then-product"),
        ("J/mol·K", "slash-then-product"),
        ("J/(mol) K^-1", "slash-then-product"),
        ("degC/min", "celsius-in-product"),
        ("J/(1/degC)", "celsius-in-product"),
        ("degC^2", "celsius-in-product"),
        ("degF ft", "fahrenheit-in-product"),
        ("J[CH4]", "entity-on-other-unit"),
        ("(mol)[CH4]", "entity-on-other-unit"),
        ("kat[CH4]", "entity-on-other-unit"),
        ("[CH4]", "entity-without-unit"),
        ("mol[]", "empty-entity"),
        ("mol[(g)]", "empty-entity"),
        ("mol[CH4", "unmatched-bracket"),
        ("mol{a]b}", "unmatched-bracket"),
        ("kJ/(mol", "unmatched-bracket"),
        ("kJ)", "unmatched-bracket"),
        ("kJ/", "missing-factor"),
        ("/K", "missing-factor"),
        ("()", "missing-factor"),
        ("kJ * / K", "missing-factor"),
        ("2 kJ", "number-in-unit"),
        ("1 K", "number-in-unit"),
        ("10^3 J", "number-in-unit"),
        ("m^", "unreadable-exponent"),
        ("m^-", "unreadable-exponent"),
        ("m^2^2", "unreadable-exponent"),
        ("m^(1/3)", "exponent-not-half"),
        ("(m^0.5)^0.5", "exponent-not-half"),
        ("m^0", "zero-exponent"),
        ("m^64", "exponent-too-large"),
        ("m^99999999999999999999", "exponent-too-large"),
        ("m^40 m^40", "exponent-too-large"),
        ("F^20", "exponent-too-large"),
        ("QJ^15", "unit-size-out-of-range"),
        ("s2", "exponent-without-caret"),
        ("kJ/mol CH4", "substance-outside-brackets"),
        ("kJ/(mol H2)", "substance-outside-brackets"),
        ("furlong", "unknown-unit"),
        ("kJ;", "strange-character-in-unit"),
        ("kJ-mol", "strange-character-in-unit"),
    ];
    let misses: Vec<String> = rows
        .iter()
        .filter(|(text, want)| code(text) != *want)
        .map(|(text, want)| format!("{text}: {} instead of {want}", code(text)))
        .collect();
    assert!(misses.is_empty(), "{}", misses.join("\n"));
    assert_eq!(code(&"(".repeat(400)), "unit-too-deep");
    assert_eq!(code(&"m ".repeat(600)), "unit-too-long");
    assert_eq!(code(&format!("(mol[{}] mol[{}])^(3/2)", "a".repeat(490), "b".repeat(490))), "unit-too-long");
}
