//! What defending a number costs: the same work in Rust, in a script, and in Python, printed as ratios of one run.
//!
//! The work is the loop `s = s + a * 2` and the reading of u at its end. `benches/peers.py` does it in Python, once
//! with an uncertainty alone and once with a unit as well. The surprise: only results are compared here, never times; a
//! figure that is worse than its aim is for a person to judge, on a machine that does nothing else.

use std::cell::Cell;
use std::collections::BTreeMap;
use std::hint::black_box;
use std::process::Command;
use std::sync::Arc;
use std::time::Instant;

use hessbook::model::card::{self, Cx, References, Value};
use hessbook::model::property_card::ENTHALPY;
use hessbook::model::reaction::REACTION;
use hessbook::quantity::{Quantity, text};
use hessbook::render::Bundle;
use hessbook::session::outcome::Host;
use hessbook::session::{Session, on_big_stack};
use hessbook::units::constants;

const PASSES: u32 = 20_000;
/// Each run of ours takes a few milliseconds, so that a single disturbance would last through several.
const REPEATS: u32 = 25;
const PEER_REPEATS: u32 = 7;
const CALLS: u32 = 100_000;

/// Invented values; `peers.py` has the same.
const A: &str = "12.34(5) kJ/mol";
const S: &str = "0.0(1) kJ/mol";
const B: &str = "2.50(1) mol";
const SHIFT: &str = "CO(g) + H2O(g) -> CO2(g) + H2(g)";

const PYTHON: &str = ".venv/bin/python";
const SETUP: &str = "`tests/client/run` sets it up";

/// The time of one pass in seconds, and the u that came out.
#[derive(Clone, Copy)]
struct Row {
    seconds: f64,
    u: f64,
}

/// The fastest of several runs: the others were disturbed by something that is not the work.
fn best(repeats: u32, passes: u32, mut work: impl FnMut() -> f64) -> Row {
    let mut row = Row { seconds: f64::INFINITY, u: 0.0 };
    for _ in 0..repeats {
        let start = Instant::now();
        row.u = black_box(work());
        row.seconds = row.seconds.min(start.elapsed().as_secs_f64() / f64::from(passes));
    }
    row
}

fn q(written: &str, ordinal: u64) -> Quantity {
    text::parse(written, None, ordinal).unwrap_or_else(|e| panic!("{written}: {e}"))
}

fn u_of(value: &Quantity) -> f64 {
    value.spread().u().expect("every input states its u") / value.unit().factor
}

fn native() -> [Row; 3] {
    let (a, s, b) = (q(A, 1), q(S, 2), q(B, 3));
    let sum = |step: &dyn Fn(&Quantity) -> Quantity| {
        let mut sum = s.clone();
        for _ in 0..PASSES {
            sum = step(&sum);
        }
        u_of(&sum)
    };
    let fits = "the units fit";
    let twice = || sum(&|s| s.plus(&a.scaled(2.0, None).expect(fits), None).expect(fits));
    let once = || sum(&|s| s.plus(&a, None).expect(fits));
    let product = || {
        let mut last = None;
        for _ in 0..PASSES {
            last = Some(black_box(a.times(&b, None).expect(fits)));
        }
        u_of(&last.expect("there was a pass"))
    };
    [best(REPEATS, PASSES, twice), best(REPEATS, PASSES, once), best(REPEATS, PASSES, product)]
}

struct Quiet;

impl Host for Quiet {
    fn write(&mut self, _stderr: bool, _text: &str) {}
    fn show(&mut self, _bundle: &Bundle, _id: Option<&str>) {}
    fn update(&mut self, _bundle: &Bundle, _id: &str) {}
}

/// Runs a cell; the number it shows, if it shows one.
fn cell(session: &mut Session, code: &str) -> f64 {
    let outcome = session.run_cell("bench", code, &mut Quiet);
    if let Err(fault) = outcome.result {
        panic!("{fault}");
    }
    outcome.shown.and_then(|shown| shown.plain().trim().parse().ok()).unwrap_or(f64::NAN)
}

fn script() -> Row {
    let mut session = Session::new(Arc::default());
    let code = format!(
        "let a = q(\"{A}\"); let s = q(\"{S}\"); for i in 0..{PASSES} {{ s = s + a * 2; }} s.uncertainty(\"kJ/mol\")"
    );
    best(REPEATS, PASSES, || cell(&mut session, &code))
}

/// One reaction enthalpy with its provenance: natively, and of many calls through the script.
fn enthalpy() -> [Row; 2] {
    let (references, ordinal) = (References::new(constants::current()), Cell::new(0));
    let cx = Cx { references: &references, place: None, ordinal: &ordinal, halted: &|| None };
    let asked = |result: Result<Value, hessbook::fault::Fault>| result.unwrap_or_else(|fault| panic!("{fault}"));
    let reaction = asked(card::call(&cx, &REACTION, vec![Value::Text(SHIFT.into())]));
    let t = Value::Quantity(q("450 degC", 0));
    let passes = 1000;
    let one = best(REPEATS, passes, || {
        let mut sum = 0.0;
        for _ in 0..passes {
            match asked(card::call(&cx, &ENTHALPY, vec![reaction.clone(), t.clone()])) {
                Value::Quantity(value) => sum += value.si(),
                other => panic!("an enthalpy is {}", other.sort()),
            }
        }
        sum
    });
    let mut session = Session::new(Arc::default());
    cell(&mut session, &format!("let r = reaction(\"{SHIFT}\"); let T = q(\"450 degC\"); r.enthalpy(T);"));
    let many = best(1, CALLS, || cell(&mut session, &format!("for i in 0..{CALLS} {{ r.enthalpy(T); }}")));
    [one, many]
}

/// The rows of `peers.py` by name, or why there are none.
fn peers() -> Result<BTreeMap<String, Row>, String> {
    let mut python = Command::new(PYTHON);
    python.args(["benches/peers.py", &PASSES.to_string(), &PEER_REPEATS.to_string()]);
    let output = python.output().map_err(|e| format!("{PYTHON}: {e}; {SETUP}"))?;
    if !output.status.success() {
        let text = String::from_utf8_lossy(&output.stderr);
        return Err(format!("{}; {SETUP}", text.lines().last().unwrap_or("no word from peers.py")));
    }
    let text = String::from_utf8_lossy(&output.stdout);
    let row = |line: &str| {
        let mut words = line.split_whitespace();
        let (name, seconds, u) = (words.next()?, words.next()?.parse::<f64>().ok()?, words.next()?.parse().ok()?);
        Some((name.to_owned(), Row { seconds: seconds / f64::from(PASSES), u }))
    };
    text.lines().map(|line| row(line).ok_or_else(|| format!("peers.py says `{line}`"))).collect()
}

fn print(name: &str, row: Row) {
    println!("  {name:<44}{:>9.3} µs", row.seconds * 1e6);
}

/// One line of ratios: ours, theirs, and how many times faster we aim to be.
fn ratio(name: &str, ours: Row, theirs: Row, aim: &str) {
    // Unlike results would mean unlike work. Bound: both add 20,000 terms, each rounded by at most 1.2e-16 of the sum.
    assert!((ours.u / theirs.u - 1.0).abs() < 1e-11, "{name}: u is {} here and {} there", ours.u, theirs.u);
    println!("  {name:<44}{:>9.1} {aim:>9}", theirs.seconds / ours.seconds);
}

fn main() {
    let measured = on_big_stack(|| {
        let start = best(REPEATS, 1, || {
            black_box(Session::new(Arc::default()));
            0.0
        });
        (native(), script(), enthalpy(), start)
    });
    let ([twice, once, product], script, [one, many], start) = measured;
    println!("\ntime of one pass; {PASSES} passes of `s = s + a * 2` and u at the end, best of several");
    print("native", twice);
    print("native, `s = s + a` alone", once);
    print("native, `a * b` alone", product);
    print("script", script);
    match peers() {
        Err(why) => println!("  nothing to compare with: {why}"),
        Ok(rows) => {
            for (name, row) in &rows {
                print(&format!("Python, {}", name.replace('-', ", ")), *row);
            }
            println!("\ntimes as fast as{:>30} {:>9} {:>9}", "", "measured", "aim");
            for (peer, aims) in [("uncertainties", ["25", "3"]), ("pint", ["100", "10"])] {
                let with = if peer == "pint" { "pint carrying uncertainties" } else { "uncertainties alone" };
                let theirs = |row: &str| rows[&format!("{peer}-{row}")];
                ratio(&format!("{with}: native"), twice, theirs("loop"), aims[0]);
                ratio(&format!("{with}: native, add"), once, theirs("add"), "");
                ratio(&format!("{with}: native, multiply"), product, theirs("multiply"), "");
                ratio(&format!("{with}: script"), script, theirs("loop"), aims[1]);
            }
        }
    }
    println!("\nΔrH° of {SHIFT} at 450 degC, with provenance");
    print("one call, native", one);
    print(&format!("one of {CALLS} calls in a script"), many);
    println!("\nstart of the engine");
    print("a session with the whole library", start);
}
