//! Published figures against what the program gives: every row of `tests/reference/*.json`, worst first.
//!
//! A row names its source, how the figure was obtained, and what bounds its tolerance; `tests/reference/README.md` says
//! how to read a failed run. All rows run before anything fails.

mod asking;
#[path = "reference/formula.rs"]
mod formula;

use std::collections::{BTreeMap, BTreeSet};
use std::path::Path;
use std::rc::Rc;
use std::sync::Arc;

use serde::Deserialize;

use asking::Desk;
use formula::Term;
use hessbook::data::catalog::{Catalog, T_REFERENCE_K};
use hessbook::data::dataset::DatasetId;
use hessbook::fault::Fault;
use hessbook::model::card::{self, Card, Value};
use hessbook::model::molecule::{read, shipped, table};
use hessbook::model::reaction::REACTION;
use hessbook::model::substance::SUBSTANCE;
use hessbook::model::{CARDS, function};
use hessbook::num::math;
use hessbook::quantity::{Quantity, text};
use hessbook::render::Bundle;
use hessbook::session::outcome::Host;
use hessbook::session::{Session, on_big_stack};
use hessbook::units::{self, parse as unit_parse};

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Page {
    about: String,
    rows: Vec<Row>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Row {
    id: String,
    /// The publication.
    source: String,
    /// How the figure was obtained: read, from memory, from a copy.
    obtained: String,
    what: What,
    /// As printed.
    expected: String,
    unit: String,
    tolerance: String,
    /// What bounds the tolerance, in words.
    bound: String,
    /// Why the figure differs, where it is known to.
    #[serde(default)]
    remark: String,
}

#[derive(Deserialize)]
#[serde(tag = "ask", rename_all = "kebab-case", deny_unknown_fields)]
enum What {
    /// A property of a reaction, by its card; with `less_at`, minus the same at another temperature.
    Reaction {
        equation: String,
        property: String,
        t: String,
        #[serde(default)]
        options: BTreeMap<String, String>,
        less_at: Option<String>,
        #[serde(default)]
        figure: Figure,
    },
    /// A formula by its card, asked of a reaction, of a substance, or of nothing; with `less`, minus the same with other
    /// arguments.
    Formula {
        card: String,
        reaction: Option<String>,
        on: Option<String>,
        args: Vec<serde_json::Value>,
        less: Option<Vec<serde_json::Value>>,
    },
    /// A property of one substance by its function, per mole of it.
    Function { species: String, property: FunctionOf, t: String, less_at: Option<String> },
    /// A property of a molecule by its card, made of a name or a map; `h-from-0` is H(T) - H(0 K).
    Molecule { of: serde_json::Value, property: String, t: String, less_at: Option<String> },
    /// Arithmetic on typed quantities.
    Arithmetic {
        given: BTreeMap<String, String>,
        formula: String,
        #[serde(default)]
        figure: Figure,
    },
    /// What a cell gives, as the number that it ends with.
    Cell { code: String },
    /// What a reader is shown of a typed quantity.
    Shown { text: String, figure: ShownAs },
    /// One row per record that has both: the function at 298.15 K, less the figure printed in Table B of the same report.
    EveryTableB { column: FunctionOf },
    /// One row per transition on record: its enthalpy by the reaction of the two phases, less the record's.
    EveryTransition,
    /// One row per substance that two datasets have: the difference of their formation enthalpies, in units of 2 u. The
    /// known misses are listed with the difference in kJ/mol, and must still miss by it.
    EveryPair { datasets: [String; 2], known: BTreeMap<String, Known> },
    /// The same for the entropies of functions, in J/(mol K), against those that a dataset prints with their u.
    EveryEntropy { dataset: String, known: BTreeMap<String, Known> },
}

#[derive(Clone, Copy, Default, Deserialize)]
#[serde(rename_all = "kebab-case")]
enum Figure {
    #[default]
    Value,
    /// The standard uncertainty.
    U,
    /// The decimal logarithm.
    Lg,
}

#[derive(Clone, Copy, Deserialize)]
#[serde(rename_all = "kebab-case")]
enum FunctionOf {
    HeatCapacity,
    Entropy,
    /// H(T) - H(298.15 K) + ΔfH°(298.15 K).
    Enthalpy,
    /// H(298.15 K) - H(0 K), a figure of the record.
    Increment0,
}

#[derive(Clone, Copy, Deserialize)]
#[serde(rename_all = "kebab-case")]
enum ShownAs {
    Value,
    U,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Known {
    difference: String,
    why: String,
}

/// One comparison that was made.
struct Outcome {
    name: String,
    got: Result<f64, String>,
    expected: f64,
    tolerance: f64,
}

impl Outcome {
    /// How much of the tolerance is used; a fault uses more than all of it.
    fn share(&self) -> f64 {
        match &self.got {
            Ok(got) => {
                let off = (got - self.expected).abs();
                if off == 0.0 { 0.0 } else { off / self.tolerance }
            }
            Err(_) => f64::INFINITY,
        }
    }

    fn line(&self, row: &Row) -> String {
        let got = self.got.as_ref().map_or_else(ToString::to_string, ToString::to_string);
        let Outcome { name, expected, tolerance, .. } = self;
        format!("{:8.4}  {name}: {got}, published {expected} ± {tolerance} {}", self.share(), row.unit)
    }
}

fn number(text: &str) -> f64 {
    text.parse().unwrap_or_else(|_| panic!("`{text}` is no number"))
}

fn pages() -> Vec<(String, Page)> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/reference");
    let entries = std::fs::read_dir(&folder).unwrap().map(|entry| entry.unwrap().path());
    let mut paths: Vec<_> = entries.filter(|path| path.extension().is_some_and(|end| end == "json")).collect();
    paths.sort();
    let page = |path: &Path| {
        let name = path.file_name().unwrap().to_string_lossy().into_owned();
        let read = serde_json::from_slice(&std::fs::read(path).unwrap());
        let page = read.unwrap_or_else(|error| panic!("{name}: {error}"));
        (name, page)
    };
    paths.iter().map(|path| page(path)).collect()
}

#[test]
fn every_row_gives_the_published_figure() {
    let desk = Desk::new();
    let pages = pages();
    let mut lines: Vec<(f64, String)> = Vec::new();
    let mut misses: Vec<(f64, String)> = Vec::new();
    for row in pages.iter().flat_map(|(_, page)| &page.rows) {
        let outcomes = outcomes(&desk, row);
        assert!(!outcomes.is_empty(), "{} compares nothing", row.id);
        for outcome in outcomes {
            let (share, line) = (outcome.share(), outcome.line(row));
            if share > 1.0 {
                let Row { source, obtained, bound, remark, .. } = row;
                let why = format!("\n    source: {source} ({obtained})\n    bound: {bound} {remark}");
                misses.push((share, format!("{line}{why}")));
            }
            lines.push((share, line));
        }
    }
    let ordered = |lines: &mut Vec<(f64, String)>| {
        lines.sort_by(|a, b| b.0.total_cmp(&a.0));
        lines.iter().map(|(_, line)| line.as_str()).collect::<Vec<_>>().join("\n")
    };
    println!("   share  {} comparisons, worst first", lines.len());
    println!("{}", ordered(&mut lines));
    assert!(misses.is_empty(), "{} of {} miss:\n{}", misses.len(), lines.len(), ordered(&mut misses));
}

#[test]
fn every_row_says_where_its_figure_is_from_and_what_bounds_its_tolerance() {
    let mut seen = BTreeSet::new();
    for (name, page) in pages() {
        assert!(page.about.len() > 20, "{name} does not say what it is about");
        for row in page.rows {
            let Row { id, source, obtained, bound, .. } = &row;
            assert!(seen.insert(id.clone()), "{name}: the id {id} occurs twice");
            for (field, said) in [("source", source), ("obtained", obtained), ("bound", bound)] {
                assert!(said.len() > 3, "{name}: {id} has no {field}");
            }
            assert!(number(&row.tolerance) > 0.0, "{name}: {id} allows nothing");
        }
    }
}

fn outcomes(desk: &Desk, row: &Row) -> Vec<Outcome> {
    match &row.what {
        What::EveryTableB { column } => every_table_b(row, *column),
        What::EveryTransition => every_transition(desk, row),
        What::EveryPair { datasets, known } => every_pair(row, datasets, known),
        What::EveryEntropy { dataset, known } => every_entropy(row, dataset, known),
        _ => {
            let got = one(desk, row).map_err(|fault| format!("refused, {fault}"));
            let (expected, tolerance) = (number(&row.expected), number(&row.tolerance));
            vec![Outcome { name: row.id.clone(), got, expected, tolerance }]
        }
    }
}

fn one(desk: &Desk, row: &Row) -> Result<f64, Fault> {
    match &row.what {
        What::Reaction { equation, property, t, options, less_at, figure } => {
            let options: Vec<(&str, &str)> =
                options.iter().map(|(name, word)| (name.as_str(), word.as_str())).collect();
            let at = |t: &str| {
                let value = desk.ask(card(property), equation, t, &options)?;
                figure_of(&value, *figure, &row.unit)
            };
            // Reaction values of two temperatures do not meet as quantities, so their figures are subtracted.
            let less = less_at.as_ref().map_or(Ok(0.0), |t| at(t))?;
            Ok(at(t)? - less)
        }
        What::Formula { card, reaction, on, args, less } => {
            let asked = |args: &[serde_json::Value]| -> Result<f64, Fault> {
                let receiver = match (reaction, on) {
                    (Some(equation), _) => Some((&REACTION, equation)),
                    (_, Some(species)) => Some((&SUBSTANCE, species)),
                    _ => None,
                };
                let mut given = Vec::new();
                if let Some((reader, text)) = receiver {
                    given.push(card::call(&desk.cx(), reader, vec![Value::Text(text.as_str().into())])?);
                }
                given.extend(args.iter().map(argument));
                let found = CARDS.iter().find(|one| one.id == card).unwrap_or_else(|| panic!("no card is {card}"));
                match card::call(&desk.cx(), found, given)? {
                    Value::Quantity(value) => figure_of(&value, Figure::Value, &row.unit),
                    other => panic!("{card} gives {}", other.sort()),
                }
            };
            let less = less.as_ref().map_or(Ok(0.0), |args| asked(args))?;
            Ok(asked(args)? - less)
        }
        What::Function { species, property, t, less_at } => {
            let at = |t: &str| {
                let t_k = text::parse(t, None, 0)?.si();
                Ok::<f64, Fault>(by_function(species, *property, t_k))
            };
            let less = less_at.as_ref().map_or(Ok(0.0), |t| at(t))?;
            Ok((at(t)? - less) / unit_parse::unit(&row.unit)?.factor)
        }
        What::Molecule { of, property, t, less_at } => {
            let at = |t: &str| of_molecule(desk, of, property, t, &row.unit);
            let less = less_at.as_ref().map_or(Ok(0.0), |t| at(t))?;
            Ok(at(t)? - less)
        }
        What::Arithmetic { given, formula, figure } => {
            let mut named = BTreeMap::new();
            for (ordinal, (name, written)) in given.iter().enumerate() {
                named.insert(name.as_str(), text::parse(written, None, ordinal as u64)?);
            }
            match formula::evaluate(formula, &named)? {
                Term::Quantity(value) => figure_of(&value, *figure, &row.unit),
                Term::Number(_) => panic!("{} computes with bare numbers only", row.id),
            }
        }
        What::Cell { code } => cell(code),
        What::Shown { text: written, figure } => {
            let value = text::parse(written, None, 0)?;
            Ok(shown_figure(&value, *figure))
        }
        What::EveryTableB { .. } | What::EveryTransition | What::EveryPair { .. } | What::EveryEntropy { .. } => {
            unreachable!("not one row")
        }
    }
}

/// An argument as a script would give it.
fn argument(json: &serde_json::Value) -> Value {
    match json {
        serde_json::Value::String(text) => Value::Text(text.as_str().into()),
        serde_json::Value::Object(map) => {
            Value::Options(Rc::new(map.iter().map(|(name, value)| (name.clone(), argument(value))).collect()))
        }
        other => panic!("{other} is no argument"),
    }
}

/// In `unit`; the molecule is made of its name, or of the keys of its map.
fn of_molecule(desk: &Desk, of: &serde_json::Value, property: &str, t: &str, unit: &str) -> Result<f64, Fault> {
    let cx = desk.cx();
    let molecule = match of {
        serde_json::Value::String(name) => shipped::molecule(&cx, name)?,
        map => read::molecule(&cx, &table::map(&map.to_string())?)?,
    };
    if property == "h-from-0" {
        let t_k = text::parse(t, None, 0)?.si();
        return Ok(molecule.gas().functions(t_k, cx.constants()).h / unit_parse::unit(unit)?.factor);
    }
    let id = format!("molecule.{property}");
    let card = CARDS.iter().find(|card| card.id == id).unwrap_or_else(|| panic!("no card has the id {id}"));
    match card::call(&cx, card, vec![Value::Molecule(Rc::new(molecule)), Value::Text(t.into())])? {
        Value::Quantity(value) => figure_of(&value, Figure::Value, unit),
        other => panic!("{id} gives {}", other.sort()),
    }
}

/// A cell of a fresh session that ends with a bare number.
fn cell(code: &str) -> Result<f64, Fault> {
    let code = code.to_owned();
    on_big_stack(move || {
        let outcome = Session::new(Arc::default()).run_cell("cell-1", &code, &mut Silent);
        outcome.result?;
        let shown = outcome.shown.unwrap_or_default();
        Ok(number(shown.plain()))
    })
}

struct Silent;

impl Host for Silent {
    fn write(&mut self, _stderr: bool, _text: &str) {}

    fn show(&mut self, _bundle: &Bundle, _id: Option<&str>) {}

    fn update(&mut self, _bundle: &Bundle, _id: &str) {}
}

fn card(name: &str) -> &'static Card {
    CARDS.iter().find(|card| card.name == name).unwrap_or_else(|| panic!("no card is named {name}"))
}

fn figure_of(value: &Quantity, figure: Figure, unit: &str) -> Result<f64, Fault> {
    let value = value.to(unit_parse::unit(unit)?)?;
    let unit = value.unit();
    Ok(match figure {
        Figure::Value => unit.from_si(value.si()),
        Figure::Lg => math::log10(unit.from_si(value.si())),
        Figure::U => value.spread().u().unwrap_or_else(|| panic!("no u is known of {value:?}")) / unit.factor,
    })
}

/// A figure as printed: the number before the brackets, or what the brackets say in the printed unit.
fn shown_figure(value: &Quantity, figure: ShownAs) -> f64 {
    let shown = value.shown().number;
    let (number_text, rest) = shown.split_once('(').unwrap_or_else(|| panic!("{shown} has no brackets"));
    let digits = rest.strip_suffix(')').unwrap_or_else(|| panic!("{shown} goes on behind the brackets"));
    match figure {
        ShownAs::Value => number(number_text),
        ShownAs::U => {
            let decimals = number_text.split_once('.').map_or(0, |(_, after)| after.len());
            number(&format!("{digits}e-{decimals}"))
        }
    }
}

/// In J/mol or J/(mol K).
fn by_function(species: &str, property: FunctionOf, t_k: f64) -> f64 {
    let substance = Catalog::shipped().find(species).unwrap_or_else(|error| panic!("{error}"));
    let of = substance.function.as_ref().unwrap_or_else(|| panic!("{species} has no function"));
    assert!(of.covers(t_k), "{t_k} K is outside the range of {species}");
    let at_t = function::evaluate(of, t_k);
    match property {
        FunctionOf::HeatCapacity => at_t.cp,
        FunctionOf::Entropy => at_t.s,
        FunctionOf::Enthalpy => at_t.h,
        FunctionOf::Increment0 => of.h298_minus_h0.unwrap_or_else(|| panic!("{species} has no H(298.15 K) - H(0)")),
    }
}

fn every_table_b(row: &Row, column: FunctionOf) -> Vec<Outcome> {
    let report = DatasetId::new("nasa-tp-2002-211556");
    let factor = unit_parse::unit(&row.unit).unwrap().factor;
    let mut all = Vec::new();
    for substance in Catalog::shipped().substances() {
        let (Some(of), Some(printed)) = (&substance.function, substance.formation(&report)) else { continue };
        // Where the table leaves a phase out, the catalogue repeats the function's own figure, which would test nothing.
        if !of.covers(T_REFERENCE_K) || printed.s.is_none() {
            continue;
        }
        let datum = match column {
            FunctionOf::HeatCapacity => printed.cp.as_ref(),
            FunctionOf::Entropy => printed.s.as_ref(),
            FunctionOf::Enthalpy => Some(&printed.dhf),
            FunctionOf::Increment0 if of.h298_minus_h0.is_none() => None,
            FunctionOf::Increment0 => printed.h298_minus_h0.as_ref(),
        };
        let Some(datum) = datum else { continue };
        all.push(Outcome {
            name: format!("{} {substance}", row.id),
            got: Ok(by_function(substance.id(), column, T_REFERENCE_K) / factor),
            expected: number(&row.expected) + datum.value / factor,
            tolerance: number(&row.tolerance),
        });
    }
    all
}

fn every_transition(desk: &Desk, row: &Row) -> Vec<Outcome> {
    let catalog = Catalog::shipped();
    let factor = unit_parse::unit(&row.unit).unwrap().factor;
    let mut all: BTreeMap<&str, Outcome> = BTreeMap::new();
    for transition in catalog.substances().flat_map(|substance| catalog.transitions_of(substance)) {
        if transition.from == transition.to {
            continue; // Within one function, so there is no reaction.
        }
        let equation = format!("{} -> {}", transition.from, transition.to);
        let value = desk.ask(card("enthalpy"), &equation, &format!("{} K", transition.t_k), &[]);
        all.entry(&transition.id).or_insert_with(|| Outcome {
            name: format!("{} {}", row.id, transition.id),
            got: value.map(|value| value.si() / factor).map_err(|fault| format!("refused, {fault}")),
            expected: number(&row.expected) + transition.dh / factor,
            tolerance: number(&row.tolerance),
        });
    }
    all.into_values().collect()
}

/// Two figures of one substance, in the unit that a known difference is listed in.
struct Pair {
    substance: String,
    difference: f64,
    /// How far apart they may be.
    allowed: f64,
}

fn every_pair(row: &Row, datasets: &[String; 2], known: &BTreeMap<String, Known>) -> Vec<Outcome> {
    let [first, second] = datasets.each_ref().map(|id| DatasetId::new(id.as_str()));
    let mut pairs = Vec::new();
    for substance in Catalog::shipped().substances() {
        let (Some(a), Some(b)) = (substance.formation(&first), substance.formation(&second)) else { continue };
        if a.dhf.is_convention() && b.dhf.is_convention() {
            continue; // Zero in both, by convention.
        }
        let (Some(u_a), Some(u_b)) = (a.dhf.u, b.dhf.u) else { panic!("{substance} states no u in one of them") };
        let difference = (a.dhf.value - b.dhf.value) / 1000.0;
        let allowed = 2.0 * f64::sqrt(u_a * u_a + u_b * u_b) / 1000.0;
        pairs.push(Pair { substance: substance.to_string(), difference, allowed });
    }
    compared(row, &pairs, known)
}

fn every_entropy(row: &Row, dataset: &str, known: &BTreeMap<String, Known>) -> Vec<Outcome> {
    let dataset = DatasetId::new(dataset);
    let mut pairs = Vec::new();
    for substance in Catalog::shipped().substances() {
        let covered = substance.function.as_ref().is_some_and(|of| of.covers(T_REFERENCE_K));
        let printed = substance.formation(&dataset).and_then(|formation| formation.s.as_ref());
        let (true, Some(printed)) = (covered, printed) else { continue };
        let u = printed.u.unwrap_or_else(|| panic!("{substance} states no u"));
        let difference = by_function(substance.id(), FunctionOf::Entropy, T_REFERENCE_K) - printed.value;
        // The report prints three decimals, and most rows of CODATA two or three.
        let allowed = 2.0 * u + 0.5 * printed.last_place + 0.000_5;
        pairs.push(Pair { substance: substance.to_string(), difference, allowed });
    }
    compared(row, &pairs, known)
}

fn compared(row: &Row, pairs: &[Pair], known: &BTreeMap<String, Known>) -> Vec<Outcome> {
    for substance in known.keys() {
        let still = pairs.iter().any(|pair| pair.substance == *substance && pair.difference.abs() > pair.allowed);
        assert!(still, "{}: {substance} is listed as a known miss and is none", row.id);
    }
    let outcome = |pair: &Pair| match known.get(&pair.substance) {
        None => Outcome {
            name: format!("{} {}", row.id, pair.substance),
            got: Ok(pair.difference / pair.allowed),
            expected: number(&row.expected),
            tolerance: number(&row.tolerance),
        },
        Some(Known { difference, why }) => {
            let decimals = difference.split_once('.').map_or(0, |(_, after)| after.len());
            Outcome {
                name: format!("{} {}, known to miss ({why})", row.id, pair.substance),
                got: Ok(pair.difference),
                expected: number(difference),
                tolerance: 0.5 * number(&format!("1e-{decimals}")),
            }
        }
    };
    pairs.iter().map(outcome).collect()
}

#[test]
fn a_basis_that_would_change_the_meaning_of_a_figure_is_refused() {
    // Heating values per mole of methane and per mole of reaction are the same number here, and must not be mixed.
    let desk = Desk::new();
    let burnt = desk.ask(card("enthalpy"), "CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(l)", "25 degC", &[]).unwrap();
    assert_eq!(units::basis_words(burnt.dim()).as_deref(), Some("per mole of reaction as written"));
    assert!(figure_of(&burnt, Figure::Value, "kJ/mol[CH4]").is_err());
}
