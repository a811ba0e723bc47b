//! Uncertainty as users type and see it, against published examples: the annex H of JCGM 100:2008 (GUM), its rounding
//! rule, and limits known in closed form.

use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use hessbook::render::Bundle;
use hessbook::session::outcome::Host;
use hessbook::session::{Session, on_big_stack};

/// A host that keeps what is shown.
#[derive(Default)]
struct Shown(Vec<String>);

impl Host for Shown {
    fn write(&mut self, _stderr: bool, _text: &str) {}

    fn show(&mut self, bundle: &Bundle, _id: Option<&str>) {
        self.0.push(bundle.plain().to_owned());
    }

    fn update(&mut self, _bundle: &Bundle, _id: &str) {}
}

/// What a cell shows at its end, and what it shows before; it must not fail.
fn run(code: &str) -> (Bundle, Vec<String>) {
    let code = code.to_owned();
    on_big_stack(move || {
        let mut session = Session::new(Arc::new(AtomicBool::new(false)));
        let mut host = Shown::default();
        let outcome = session.run_cell("cell-1", &code, &mut host);
        if let Err(fault) = outcome.result {
            panic!("{code}\n{fault}");
        }
        (outcome.shown.unwrap_or_default(), host.0)
    })
}

fn plain(code: &str) -> String {
    run(code).0.plain().to_owned()
}

/// The numbers of an array that a cell ends in.
fn numbers(code: &str) -> Vec<f64> {
    let text = plain(code);
    let inside = text.trim_start_matches('[').trim_end_matches(']').replace('\n', " ");
    inside
        .split(',')
        .map(str::trim)
        .filter(|one| !one.is_empty())
        .map(|one| one.parse().unwrap_or_else(|_| panic!("`{one}` in {text} is no number")))
        .collect()
}

/// Fails with all rows that are off, each with its source.
fn compare(source: &str, rows: &[(&str, f64, f64, f64)]) {
    let misses: Vec<String> = rows
        .iter()
        .filter(|(_, got, want, allowed)| (got - want).abs() > *allowed)
        .map(|(what, got, want, allowed)| format!("{what}: {got}, {source} has {want} ± {allowed}"))
        .collect();
    assert!(misses.is_empty(), "{}", misses.join("\n"));
}

fn fault(code: &str) -> String {
    let code = code.to_owned();
    on_big_stack(move || {
        let mut session = Session::new(Arc::new(AtomicBool::new(false)));
        let outcome = session.run_cell("cell-1", &code, &mut Shown::default());
        outcome.result.err().map_or_else(String::new, |fault| fault.code().to_owned())
    })
}

/// The components of an end-gauge's length, JCGM 100:2008, table H.1 (from memory).
const END_GAUGE: &str = r#"
let standard = q("50.000623(25) mm, dof=18");
let comparator = q("215.0(9.7) nm, dof=25.6");
let expansion = q("0.0(2.9) nm, dof=50");
let temperature = q("0.0(16.6) nm, dof=2");
let length = standard + comparator + expansion + temperature;
"#;

#[test]
fn the_end_gauge_of_annex_h1_has_its_uncertainty_degrees_of_freedom_and_factor() {
    let found = numbers(&format!(
        "{END_GAUGE} let e = length.expanded(0.99);
        [length.uncertainty(\"nm\"), e.dof, e.k, e.U.value(\"nm\"), length.value(\"mm\")]"
    ));
    let source = "JCGM 100:2008, H.1 (from memory)";
    // As printed: u to 1 nm, k to two decimals. ν_eff is printed as 16. U = 93 nm follows from the rounded u, 2.92 × 32 nm,
    // so it is good to 2.92 × 0.5 nm.
    compare(
        source,
        &[
            ("u", found[0], 32.0, 0.5),
            ("degrees of freedom", found[1], 16.0, 0.0),
            ("k at 99 %", found[2], 2.92, 0.005),
            ("U", found[3], 93.0, 1.5),
            ("length", found[4], 50.000_838, 5e-7),
        ],
    );
    let shown = plain(&format!("{END_GAUGE} length.expanded(0.99)"));
    assert_eq!(
        shown,
        "(50.000838 ± 0.000093) mm, k = 2.92 (99 %, Student's t for 16 of 16.8 effective degrees of freedom)"
    );
}

#[test]
fn the_budget_of_the_end_gauge_ranks_its_components() {
    let text = plain(&format!("{END_GAUGE} length.budget()"));
    let lines: Vec<&str> = text.lines().collect();
    assert_eq!(lines[0], "uncertainty budget of 50.000838(32) mm");
    // Variances 625, 275.56, 94.09 and 8.41 nm² of 1003.06 nm².
    for (line, (name, share)) in lines[2..].iter().zip([
        ("50.000623(25) mm, dof=18", "62 %"),
        ("0.0(16.6) nm, dof=2", "27 %"),
        ("215.0(9.7) nm, dof=25.6", "9.4 %"),
        ("0.0(2.9) nm, dof=50", "0.8 %"),
    ]) {
        assert!(line.trim().starts_with(name) && line.contains(share), "{name}: {line}");
    }
    assert!(text.contains("cell-1, line 2, column"), "{text}");
    assert!(text.ends_with("u = 0.000032 mm\n  16.8 effective degrees of freedom"), "{text}");
    let (bundle, _) = run(&format!("{END_GAUGE} length.budget()"));
    let html = bundle.data["text/html"].as_str().unwrap();
    assert_eq!((html.matches("<tr>").count(), html.matches("<th ").count()), (5, 9), "{html}");
    let parts = numbers(&format!(
        "{END_GAUGE} let b = length.budget(); [b.inputs[0].share, b.inputs.len(), b.u.value(\"nm\")]"
    ));
    compare("the shares above", &[("share", parts[0], 625.0 / 1003.06, 1e-9), ("inputs", parts[1], 4.0, 0.0)]);
}

/// Five simultaneous readings of voltage, current and phase angle, JCGM 100:2008, table H.2 (from memory; they reproduce
/// the printed results).
const IMPEDANCE: &str = r#"
let V = [5.007, 4.994, 5.005, 4.990, 4.999];
let I = [19.663, 19.639, 19.640, 19.685, 19.678];
let phi = [1.0456, 1.0438, 1.0468, 1.0428, 1.0433];
let read = readings(#{V: V, I: I, phi: phi}, #{V: "V", I: "mA", phi: "rad"});
let R = (read.V / read.I * cos(read.phi)).to("ohm");
let X = (read.V / read.I * sin(read.phi)).to("ohm");
let Z = (read.V / read.I).to("ohm");
"#;

#[test]
fn the_impedance_of_annex_h2_has_its_values_uncertainties_and_correlations() {
    assert_eq!(plain(&format!("{IMPEDANCE} [R, X, Z]")), "[127.732(71) Ω, 219.85(30) Ω, 254.26(24) Ω]");
    let found = numbers(&format!(
        r#"{IMPEDANCE} [
            R.value("ohm"), X.value("ohm"), Z.value("ohm"),
            R.uncertainty("ohm"), X.uncertainty("ohm"), Z.uncertainty("ohm"),
            correlation(R, X), correlation(R, Z), correlation(X, Z),
            correlation(read.V, read.I), correlation(read.V, read.phi), correlation(read.I, read.phi),
            read.V.uncertainty("V"), read.I.uncertainty("mA"), read.phi.uncertainty("rad")]"#
    ));
    let half = 0.000_5 + 1e-9; // Half a unit of the third decimal, to which all of these are printed.
    compare(
        "JCGM 100:2008, tables H.2 and H.3 (from memory)",
        &[
            ("R", found[0], 127.732, half),
            ("X", found[1], 219.847, half),
            ("Z", found[2], 254.260, half),
            ("u(R)", found[3], 0.071, half),
            // The printed figure is that of H.2.4, 0.2955 before rounding; first derivatives give 0.2956.
            ("u(X)", found[4], 0.295, half + 0.000_1),
            ("u(Z)", found[5], 0.236, half),
            ("r(R, X)", found[6], -0.588, half),
            ("r(R, Z)", found[7], -0.485, half),
            ("r(X, Z)", found[8], 0.993, half),
            ("r(V, I)", found[9], -0.36, 0.005),
            ("r(V, φ)", found[10], 0.86, 0.005),
            ("r(I, φ)", found[11], -0.65, 0.005),
            ("u(V)", found[12], 0.003_2, 0.000_05),
            ("u(I)", found[13], 0.009_5, 0.000_05),
            ("u(φ)", found[14], 0.000_75, 0.000_005),
        ],
    );
}

#[test]
fn results_of_each_set_of_readings_give_the_same_and_keep_the_degrees_of_freedom() {
    // JCGM 100:2008, H.2.4, approach 2: a result from each set. The means differ in second order only (from memory).
    let found = numbers(&format!(
        r#"{IMPEDANCE}
        let sets = [];
        let reactances = [];
        for k in 0..5 {{
            sets.push(V[k].V / I[k].mA * cos(phi[k]));
            reactances.push(V[k].V / I[k].mA * sin(phi[k]));
        }}
        let each = readings(sets);
        [each.value("ohm"), each.uncertainty("ohm"), each.expanded(0.95).k, each.expanded(0.95).dof,
            readings(reactances).uncertainty("ohm")]"#
    ));
    let rows = [
        ("R", found[0], 127.732, 0.000_5),
        ("u(R)", found[1], 0.071, 0.000_5),
        ("k for 4 degrees of freedom, table G.2", found[2], 2.78, 0.005),
        ("degrees of freedom", found[3], 4.0, 0.0),
        ("u(X)", found[4], 0.295, 0.000_5),
    ];
    compare("JCGM 100:2008, table H.4 (from memory)", &rows);
    assert_eq!(fault(&format!("{IMPEDANCE} R.expanded(0.95)")), "effective-freedom-of-correlated");
}

#[test]
fn results_are_rounded_as_clause_7_2_6_says() {
    let rounded = [
        // The clause's own examples (from memory): 10.057 62 Ω with 27 mΩ to 10.058 Ω; 28.05 kHz as u to 28 kHz; 10.47 mΩ as u,
        // which it lets one round up to 11, goes to the nearest here.
        ("q(\"1.05762 ± 0.01047 ohm, k=1\")", "1.058(10) Ω"),
        ("q(\"10.05762(2700) ohm\")", "10.058(27) Ω"),
        ("q(\"1234567 ± 28050 Hz, k=1\").to(\"kHz\")", "1235(28) kHz"),
        // Half-way cases go to the even digit, by the double's own value: 0.125 and 2.5 are exactly half-way.
        ("q(\"0.125 ± 0.25 m, k=1\")", "0.12(25) m"),
        ("q(\"0.375 ± 0.25 m, k=1\")", "0.38(25) m"),
        ("q(\"5 ± 12.5 m, k=1\")", "5(12) m"),
        // u that rounds up to three digits is taken with one place less.
        ("q(\"12.34567 ± 0.0996 m, k=1\")", "12.35(10) m"),
    ];
    for (code, want) in rounded {
        assert_eq!(plain(code), want, "{code}");
    }
}

#[test]
fn shared_inputs_and_correlated_inputs_cancel_as_they_should() {
    // x − x, and a mean minus itself by another road.
    assert_eq!(plain(&format!("{IMPEDANCE} (Z - Z).uncertainty(\"ohm\")")), "0.0");
    let found = numbers(&format!(
        "{IMPEDANCE} let gap = (R ** 2 + X ** 2) ** 0.5 - Z; [gap.value(\"ohm\"), gap.uncertainty(\"ohm\"), correlation(Z, Z)]"
    ));
    // sin² + cos² = 1, so the difference is nothing but rounding of numbers near 254.
    compare(
        "sin² + cos² = 1",
        &[("gap", found[0], 0.0, 1e-12), ("u", found[1], 0.0, 1e-7), ("r", found[2], 1.0, 1e-15)],
    );
    assert_eq!(plain(&format!("{IMPEDANCE} agrees(R, X, 2)")), "false");
    // Readings that move together leave a difference known better than either.
    let together = "let m = readings(#{a: [1.0, 2.0, 3.0], b: [1.1, 2.1, 3.1]}, \"V\");";
    let found = numbers(&format!("{together} [(m.b - m.a).uncertainty(\"V\"), (m.a + m.b).uncertainty(\"V\")]"));
    // s = 1 V for each, so u = 1/√3 V; r = 1.
    compare(
        "r = 1",
        &[("u of the difference", found[0], 0.0, 1e-7), ("u of the sum", found[1], 2.0 / 3.0_f64.sqrt(), 1e-12)],
    );
}

#[test]
fn a_monte_carlo_run_agrees_with_closed_forms() {
    // Normal x with mean 2 and u 0.3: x² has mean m² + u², variance 4 m²u² + 2 u⁴ (moments of the normal distribution).
    let found = numbers(
        "let run = (q(\"2.0(3) m\") ** 2).monte_carlo(#{seed: 7});
        [run.mean.value(\"m^2\"), run.u.value(\"m^2\"), run.u_linear, run.draws, run.seed]",
    );
    let exact = (4.0 * 4.0 * 0.09 + 2.0 * 0.0081_f64).sqrt();
    // δ is half a unit of the second digit of u, 1.2 m².
    let delta = 0.05;
    compare(
        "moments of the normal distribution",
        &[
            ("mean", found[0], 4.09, delta),
            ("u", found[1], exact, delta),
            ("u by first derivatives", found[2], 1.2, delta),
            ("seed", found[4], 7.0, 0.0),
        ],
    );
    assert!(found[3] >= 20_000.0);
    // The sum of two equal rectangular inputs is triangular: 95 % lie within ±(1 − √0.05) of twice the half-width.
    let found = numbers(
        "let a = q(\"0 ± 1.5 m, limits\"); let b = q(\"0 ± 1.5 m, limits\");
        let run = (a + b).monte_carlo(); [run.low.value(\"m\"), run.high.value(\"m\"), run.u.value(\"m\")]",
    );
    let end = 3.0 * (1.0 - 0.05_f64.sqrt());
    compare(
        "the triangular distribution",
        &[("low", found[0], -end, delta), ("high", found[1], end, delta), ("u", found[2], 1.5_f64.sqrt(), delta)],
    );
}

#[test]
fn four_rectangular_inputs_have_the_interval_of_jcgm_101_9_2_3() {
    // JCGM 101:2008, 9.2.3 (from memory): four rectangular inputs of u = 1 give 95 % within ±3.88 (Monte Carlo, and
    // 2√3 [2 − (3/5)^(1/4)] in closed form), where first derivatives give ±3.92.
    let found = numbers(
        "let sum = q(\"0(0) m\");
        for k in 0..4 { sum += q(\"0 ± 1.7320508075688772 m, limits\"); }
        let run = sum.monte_carlo(); [run.high.value(\"m\"), run.low.value(\"m\"), sum.expanded(0.95).U.value(\"m\")]",
    );
    let closed = 2.0 * 3.0_f64.sqrt() * (2.0 - 0.6_f64.powf(0.25));
    compare("the closed form", &[("closed form", closed, 3.88, 0.005)]);
    // u = 2.0 m, so δ = 0.05 m.
    compare(
        "JCGM 101:2008, 9.2.3 (from memory)",
        &[("high", found[0], closed, 0.05), ("low", found[1], -closed, 0.05), ("linear", found[2], 3.92, 0.005)],
    );
}

#[test]
fn a_seed_gives_the_same_draws_again_and_stands_in_the_answer() {
    let of = |seed: u32| plain(&format!("q(\"2.0(1) bar\").monte_carlo(#{{seed: {seed}}})"));
    assert_eq!(of(3), of(3));
    assert_ne!(of(3), of(4));
    assert!(of(3).contains("draws, seed 3, two digits of u stable"), "{}", of(3));
    // Too few draws for two digits are said to be too few.
    let few = plain("q(\"99.0(9.9) m\").monte_carlo(#{draws: 20000})");
    assert!(few.contains("20000 draws, seed 1, two digits of u not yet stable"), "{few}");
}

#[test]
fn whether_first_derivatives_suffice_is_a_row_where_it_was_asked() {
    let report = |code: &str| run(code).1.join("\n");
    let bent = report("let x = q(\"0.10(8) m\") ** 2; report(\"area\", x.tested(\"linear-propagation\"))");
    assert!(bent.contains("strained  linear-propagation"), "{bent}");
    assert!(bent.contains("seed 1: u = "), "{bent}");
    let straight =
        report("let x = 3 * q(\"2.00(4) m\"); report(\"length\", x.tested(\"linear-propagation\", #{seed: 5}))");
    // The same draws on both roads: a linear value shows no difference at all.
    assert!(straight.contains("holds     linear-propagation  0 m"), "{straight}");
    // Student's t widens the draws, which is no fault of the derivatives.
    let few = report(
        "report(\"mean\", (2 * readings([1.0, 2.0, 1.2, 1.9, 1.1, 2.1, 1.3, 1.8], \"m\")).tested(\"linear-propagation\"))",
    );
    assert!(few.contains("holds     linear-propagation  0 m"), "{few}");
    // Nothing is said of a value that was computed from it, and nothing where nobody asked.
    let later = report("let x = (q(\"2.0(3) m\") ** 2).tested(\"linear-propagation\"); report(\"twice\", 2 * x)");
    assert!(!later.contains("linear-propagation"), "{later}");
}

#[test]
fn an_equilibrium_constant_has_its_interval_in_its_logarithm() {
    let shift = "let r = reaction(\"N2(g) + 3 H2(g) -> 2 NH3(g)\"); let K = r.equilibrium_constant(\"500 K\");";
    let found = numbers(&format!(
        "{shift} let e = K.expanded(0.95); let run = K.monte_carlo();
        [K.value(\"1\"), K.uncertainty(\"1\"), e.low.value(\"1\"), e.high.value(\"1\"), run.low.value(\"1\"), run.high.value(\"1\")]"
    ));
    let (k, u) = (found[0], found[1]);
    let half_width = 1.959_964 * u / k;
    compare(
        "ln K ± k u(K)/K",
        &[
            ("low", found[2].ln(), k.ln() - half_width, 1e-6),
            ("high", found[3].ln(), k.ln() + half_width, 1e-6),
            // The draws are stable to half a unit of the second digit of u(ln K), at most 5 % of it.
            ("low of the draws", found[4].ln(), k.ln() - half_width, 0.05 * u / k),
            ("high of the draws", found[5].ln(), k.ln() + half_width, 0.05 * u / k),
        ],
    );
    let shown = plain(&format!("{shift} K.expanded(0.95)"));
    assert!(shown.starts_with("lg K° = ") && shown.contains("\n  K° from "), "{shown}");
}

#[test]
fn what_is_not_known_is_said_with_every_answer() {
    let partial = "let x = q(\"12.5(3) kJ\") + q(\"3.1 kJ\");";
    assert!(plain(&format!("{partial} x.budget()")).contains("3.1 kJ  not stated"));
    assert!(plain(&format!("{partial} x.budget()")).contains("u = 0.30 kJ, of the stated part alone"));
    assert!(
        plain(&format!("{partial} x.expanded(0.95)"))
            .contains("of the stated part alone: no u stated for typed values")
    );
    assert!(plain(&format!("{partial} x.monte_carlo()")).contains("held, since no u is stated: typed values"));
    let bounded = plain("q(\"2 ± 1 bar, limits\").expanded(0.95)");
    assert!(bounded.contains("is rectangular: the value is not near to normal"), "{bounded}");
}

#[test]
fn a_price_that_widens_a_value_stands_in_its_budget_and_is_drawn_between_its_bounds() {
    let widened = "let r = reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\");
        let dH = r.enthalpy(\"450 degC\", #{ heat_capacity: \"constant\" });
        let wide = dH.widened(\"constant-heat-capacity\");";
    let text = plain(&format!("{widened} wide.budget()"));
    let first = text.lines().nth(2).unwrap_or_default();
    assert!(first.trim().starts_with("constant-heat-capacity (") && first.contains("rectangular"), "{text}");
    let found = numbers(&format!(
        "{widened} let run = wide.monte_carlo(); [run.u.value(\"kJ/mol\"), wide.uncertainty(\"kJ/mol\"), run.draws]"
    ));
    // Stable to half a unit of the second digit of u, at most 5 % of it.
    compare("the law of propagation, for a sum", &[("u", found[0], found[1], 0.05 * found[1])]);
}

#[test]
fn readings_keep_their_check_line_and_their_places() {
    let (_, shown) =
        run("report(\"voltage\", readings([\"5.007\", \"4.994\", \"5.005\", \"4.990\", \"4.999\"], \"V\"))");
    assert!(
        shown[0].contains("(5.007 + 4.994 + 5.005 + 4.99 + 4.999) / 5 = 4.9990000; s = 0.007176, u = s/√5 = 0.003209"),
        "{}",
        shown[0]
    );
    assert_eq!(plain("readings([\"24.9 degC\", \"25.1 degC\"])"), "25.00(10) °C");
}

#[test]
fn widths_on_a_temperature_scale_are_counted_in_its_degrees_and_given_in_kelvin() {
    let (fahrenheit, celsius) = ("q(\"77.0(5) degF\")", "q(\"25.00(5) degC\")");
    assert!(plain(&format!("{fahrenheit}.expanded(0.95)")).starts_with("(77.00 ± 0.98) °F, k = 1.96"));
    assert!(plain(&format!("{celsius}.expanded(0.95)")).starts_with("(25.000 ± 0.098) °C, k = 1.96"));
    assert!(plain(&format!("{celsius}.monte_carlo()")).starts_with("25.000(50) °C, 95 % from 24.9"));
    let budget = plain(&format!("{fahrenheit}.budget()"));
    assert!(budget.contains("77.00 °F  0.28 K"), "{budget}");
    let found = numbers(&format!(
        "let e = {fahrenheit}.expanded(0.95); let run = {fahrenheit}.monte_carlo();
        [e.U.value(\"K\"), e.low.value(\"degF\"), run.u.value(\"K\"), run.mean.value(\"degF\")]"
    ));
    // The draws are stable to half a unit of the second digit of u = 0.50 °F.
    compare(
        "5/9 K to the degree Fahrenheit",
        &[
            ("U", found[0], 1.959_964 * 0.5 / 1.8, 1e-6),
            ("low", found[1], 77.0 - 1.959_964 * 0.5, 1e-6),
            ("u of the draws", found[2], 0.5 / 1.8, 0.005 / 1.8),
            ("mean of the draws", found[3], 77.0, 0.005),
        ],
    );
}

#[test]
fn a_long_run_stops_when_told_to() {
    let code = "let x = q(\"99.0(9.9) m\"); for k in 0..1000 { x = x + 0.001 * x; } x.monte_carlo()";
    let stopped = on_big_stack(move || {
        let stop = Arc::new(AtomicBool::new(false));
        let mut session = Session::new(Arc::clone(&stop));
        let watch = std::thread::spawn(move || {
            std::thread::sleep(std::time::Duration::from_millis(300));
            stop.store(true, Ordering::Relaxed);
        });
        let outcome = session.run_cell("cell-1", code, &mut Shown::default());
        watch.join().expect("the watch only waits");
        outcome.result.err().map(|fault| fault.code().to_owned())
    });
    assert_eq!(stopped.as_deref(), Some("interrupted"));
}
