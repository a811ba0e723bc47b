//! Long loops of arithmetic: memory stays bounded, and the result says the same as the closed form.
//!
//! Memory is what the program's own allocator counts on the thread, sampled inside the loop. All figures are invented.

use std::rc::Rc;
use std::sync::Arc;
use std::sync::atomic::AtomicBool;

use hessbook::quantity::{Quantity, text};
use hessbook::record::node;
use hessbook::render::Bundle;
use hessbook::script::memory;
use hessbook::session::outcome::Host;
use hessbook::session::{Session, on_big_stack};

const MANY: u64 = 1_000_000;
const FEW: u64 = 1_000;

fn q(text: &str, ordinal: u64) -> Quantity {
    text::parse(text, None, ordinal).unwrap()
}

/// `s = s + a*2`, with the most memory it took.
fn accumulated(passes: u64) -> (Quantity, [Quantity; 2], isize) {
    let (a, start) = (q("2.00(1) kJ", 1), q("1.00(2) kJ", 2));
    let (before, mut most) = (memory::held(), 0);
    let mut s = start.clone();
    for pass in 0..passes {
        s = s.plus(&a.scaled(2.0, None).unwrap(), None).unwrap();
        if pass % 64 == 0 {
            most = most.max(memory::held() - before);
        }
    }
    (s, [start, a], most)
}

/// The most a run may take: two runs of the longest kept length, one of them held by the loop's variable, with two nodes
/// a pass and as much again for the lists that folding works with.
const BOUND: isize = 2 * 2 * node_bytes() * hessbook::record::fold::LONGEST as isize;

const fn node_bytes() -> isize {
    // A node, the two counts of its Rc, and what the allocator of the test does not see.
    (size_of::<node::Node>() + 2 * size_of::<usize>()) as isize
}

#[test]
fn a_million_steps_take_no_more_memory_than_some_thousand_and_equal_the_closed_form() {
    let (few, _, most_of_few) = accumulated(FEW);
    let (s, [start, a], most) = accumulated(MANY);
    println!("peak: {FEW} passes {} kB, {MANY} passes {} kB, bound {} kB", most_of_few >> 10, most >> 10, BOUND >> 10);
    assert!(most < BOUND, "{most} bytes");
    drop(few);

    let closed = start.plus(&a.scaled(2.0 * MANY as f64, None).unwrap(), None).unwrap();
    let budget = |value: &Quantity| -> Vec<(String, f64)> {
        value.sensitivities().iter().map(|s| (s.input().unwrap().name(), s.derivative)).collect()
    };
    // Derivatives are whole numbers here, exact in any order of summation.
    assert_eq!(budget(&s), budget(&closed));
    // Bound: a million sums, each rounded to 2^-53 of at most 4e9 J.
    assert!((s.si() - closed.si()).abs() <= MANY as f64 * 4e9 * f64::EPSILON);
    let inputs = |value: &Quantity| -> Vec<String> {
        let history = node::history(value.node());
        let mut names: Vec<String> = history.iter().filter_map(|node| node.input()).map(|input| input.name()).collect();
        names.sort();
        names
    };
    assert_eq!(inputs(&s), inputs(&closed));
}

#[test]
fn the_value_is_the_one_that_plain_arithmetic_gives() {
    let (s, _, _) = accumulated(MANY / 10);
    let mut plain = 1000.0_f64;
    for _ in 0..MANY / 10 {
        plain += 2.0 * 2000.0;
    }
    assert_eq!(s.si().to_bits(), plain.to_bits());
}

#[test]
fn an_unfolded_history_is_dropped_without_the_stack() {
    // Every value held: nothing can be folded, and the list goes at once. Test threads have 2 MB of stack.
    let a = q("2.00(1) kJ", 1);
    let mut all = vec![q("1.00(2) kJ", 2)];
    for _ in 0..200_000 {
        let next = all.last().unwrap().plus(&a, None).unwrap();
        all.push(next);
    }
    let last = all.last().unwrap().clone();
    drop(all);
    assert_eq!(Rc::strong_count(last.node()), 1);
    drop(last);
}

#[derive(Default)]
struct Watching {
    most: isize,
    out: String,
    shown: Vec<String>,
}

impl Host for Watching {
    fn write(&mut self, _stderr: bool, text: &str) {
        if text.trim().is_empty() {
            self.most = self.most.max(memory::held());
        } else {
            self.out.push_str(text);
        }
    }

    fn show(&mut self, bundle: &Bundle, _id: Option<&str>) {
        self.shown.push(bundle.plain().to_owned());
    }

    fn update(&mut self, _bundle: &Bundle, _id: &str) {}
}

/// Runs a loop of a script over `passes`; it prints an empty line now and then, where memory is looked at.
fn looped(passes: u64, body: &str, after: &str) -> (Watching, isize) {
    let code = format!(
        "let a = q(\"2.00(1) kJ\"); let start = q(\"1.00(2) kJ\"); let s = start; let n = {passes};\n\
         for i in 0..n {{ {body} if i % 64 == 0 {{ print(\"\"); }} }}\n{after}"
    );
    on_big_stack(move || {
        let mut session = Session::new(Arc::new(AtomicBool::new(false)));
        let mut host = Watching::default();
        session.run_cell("cell-0", "1", &mut host).result.unwrap();
        let before = memory::held();
        let outcome = session.run_cell("cell-1", &code, &mut host);
        outcome.result.unwrap_or_else(|fault| panic!("{fault}"));
        let most = host.most - before;
        (host, most)
    })
}

#[test]
fn a_loop_of_a_script_is_bounded_too_and_reports_what_the_closed_form_reports() {
    let sum = "s = s + a*2;";
    let (_, few) = looped(FEW, sum, "");
    let (host, many) = looped(
        MANY,
        sum,
        "let closed = start + a*(2*n);\n\
         print((s - closed).uncertainty(\"kJ\")/closed.uncertainty(\"kJ\"));\n\
         report(\"loop\", s); report(\"closed\", closed);",
    );
    println!("script, peak: {FEW} passes {} kB, {MANY} passes {} kB", few >> 10, many >> 10);
    assert!(many < BOUND + few, "{many} bytes");
    let relative: f64 = host.out.trim().parse().unwrap();
    assert_eq!(relative, 0.0, "whole numbers as derivatives");
    let sources = |report: &str| report.split("sources").nth(1).unwrap_or("").to_owned();
    assert_eq!(sources(&host.shown[0]), sources(&host.shown[1]));
}

#[test]
fn a_monte_carlo_run_says_where_a_folded_run_stood_in_for_its_steps() {
    // Just past the limit, so that each draw computes a few steps and not thousands.
    let (linear, _) = looped(4_100, "s = s + a*2;", "print(s.monte_carlo());");
    assert!(linear.out.contains("two digits of u stable"), "{}", linear.out);
    assert!(!linear.out.contains("long runs of arithmetic"), "{}", linear.out);
    let (product, _) = looped(1_370, "s = s + s*0.0*(a/start);", "print(s.monte_carlo());");
    assert!(product.out.contains("it cannot be computed again: long runs of arithmetic"), "{}", product.out);
}

#[test]
fn figures_typed_in_a_loop_are_one_input_without_u_and_inputs_of_their_own_with_it() {
    let passes = 50_000;
    let (_, without) = looped(passes, "s = s + q(\"2.0 kJ\");", "");
    let (host, with) = looped(passes, "s = s + q(\"2.0(1) kJ\");", "print(s.uncertainty(\"kJ\"));");
    let each = with as f64 / passes as f64;
    println!(
        "script, peak of {passes} passes: {} kB without u, {} kB with u, {each:.0} B each",
        without >> 10,
        with >> 10
    );
    assert!(without < 2 * BOUND, "{without} bytes");
    // Each is evaluated anew and independent of the others, so u grows with the root of their number.
    let u: f64 = host.out.trim().parse().unwrap();
    assert!((u - f64::sqrt(passes as f64 * 0.01 + 0.0004)).abs() < 1e-9, "{u}");
    // That many inputs cannot be fewer: a row of the budget each. This bound is the size of an input with its text.
    assert!(each < 1000.0, "{each} bytes for each input");
}
