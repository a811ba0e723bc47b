//! `x.derivation()`: every step once, in order, with figures that agree with the report, and honest where it is folded.
//!
//! Figures typed here are invented.

use std::sync::Arc;
use std::sync::atomic::AtomicBool;

use hessbook::render::Bundle;
use hessbook::session::outcome::Host;
use hessbook::session::{Session, on_big_stack};

#[derive(Default)]
struct Kept(Vec<Bundle>);

impl Host for Kept {
    fn write(&mut self, _stderr: bool, _text: &str) {}

    fn show(&mut self, bundle: &Bundle, _id: Option<&str>) {
        self.0.push(bundle.clone());
    }

    fn update(&mut self, _bundle: &Bundle, _id: &str) {}
}

/// What cells showed, each in turn, and what the last one gave.
fn run(cells: &[&str]) -> (Vec<Bundle>, Bundle) {
    let cells: Vec<String> = cells.iter().map(|cell| (*cell).to_owned()).collect();
    on_big_stack(move || {
        let mut session = Session::new(Arc::new(AtomicBool::new(false)));
        let (mut host, mut last) = (Kept::default(), Bundle::default());
        for (index, code) in cells.iter().enumerate() {
            let outcome = session.run_cell(&format!("cell-{}", index + 1), code, &mut host);
            outcome.result.unwrap_or_else(|fault| panic!("{code}\n{fault}"));
            last = outcome.shown.unwrap_or_default();
        }
        (host.0, last)
    })
}

fn form(bundle: &Bundle, mime: &str) -> String {
    bundle.data.get(mime).and_then(|form| form.as_str()).unwrap_or("").to_owned()
}

const SHIFT: &str =
    "let shift = reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\");\nlet dH = shift.enthalpy(\"450 degC\");";

/// The numbers of the steps shown: a line that begins with a number after four spaces.
fn step_numbers(text: &str) -> Vec<usize> {
    let steps = text.split("\n  steps\n").nth(1).unwrap_or("").split("\n  sources").next().unwrap_or("");
    let own = steps.lines().filter_map(|line| line.strip_prefix("    ").filter(|rest| !rest.starts_with(' ')));
    own.filter_map(|line| line.split_whitespace().next()?.parse().ok()).collect()
}

#[test]
fn steps_inputs_places_and_sources_stand_in_the_order_of_calculation() {
    let (_, shown) =
        run(&[SHIFT, "fn scaled(x) {\n    x * 2\n}\nlet y = scaled(dH) + q(\"12.5(3) kJ/mol[rxn]\");\ny.derivation()"]);
    let text = shown.plain();
    assert_eq!(step_numbers(text), [1, 2, 3], "{text}");
    for wanted in [
        "1  enthalpy of CO(g) + H2O(g) -> CO2(g) + H2(g), T = i9 (450 °C), at cell-1, line 2",
        "ΔrH°(T) = Σ ν [ΔfH°(298.15 K) + H(T) - H(298.15 K)] [6]",
        "ν                   1       stoichiometric numbers as written, positive for products",
        "from i1 to i9",
        "2  2 × step 1, at cell-2, line 2",
        "3  step 2 + i10, at cell-2, line 4",
        "i9   450 degC",
        "i10  12.5(3) kJ/mol[rxn]",
        "typed at cell-2, line 4",
    ] {
        assert!(text.contains(wanted), "{wanted}\n{text}");
    }
    assert!(text.find("i1 ").unwrap() < text.find("enthalpy of CO(g)").unwrap());
}

#[test]
fn figures_and_source_numbers_are_those_of_the_report() {
    let (reports, shown) = run(&[SHIFT, "report(\"shift enthalpy\", dH);\ndH.derivation()"]);
    let (report, derivation) = (reports[0].plain(), shown.plain());
    let check = report.lines().find_map(|line| line.trim().strip_prefix("check")).unwrap().trim();
    assert!(!check.is_empty() && derivation.contains(check), "{check}\n{derivation}");
    let source = |text: &str, number: &str| {
        let line = text.lines().map(str::trim).rfind(|line| line.starts_with(number));
        line.map(ToOwned::to_owned).unwrap_or_default()
    };
    for number in ["[1]", "[2]", "[3]", "[4]", "[5]", "[6]"] {
        assert_eq!(source(report, number), source(derivation, number));
        assert!(source(report, number).len() > 10, "{report}");
    }
}

#[test]
fn a_check_line_shows_the_calculation_behind_what_only_hands_a_value_on() {
    let check = |code: &str| {
        let (reports, _) = run(&[&format!("{code};\nassumptions()")]);
        let report = reports[0].plain();
        report.lines().find_map(|line| line.trim().strip_prefix("check")).unwrap_or_default().trim().to_owned()
    };
    // 2 mol/s times 50 kJ/mol is 100 kW, whatever is attached to it and however it is shown.
    let product = "let p = q(\"2 mol/s\") * q(\"50 kJ/mol[NH3]\");";
    let assumed =
        check(&format!("{product} report(\"p\", assume(p.to(\"kW\"), \"no-loss\", \"nothing is lost\", \"1 kW\"))"));
    assert_eq!(assumed, "2 mol/s × 50 kJ/mol = 100 kW");
    let ammonia = "let h = reaction(\"N2(g) + 3 H2(g) -> 2 NH3(g)\").enthalpy(\"298.15 K\");";
    let per = check(&format!("{ammonia} report(\"p\", h.per(\"H2\").to(\"kcal_th/mol\"))"));
    // ΔfH° of NH3 is -45.558 kJ/mol (ATcT 1.112), so ΔrH° -91.116, over 3 -30.372, over 4.184 -7.25908.
    for part in ["(-45.558)[1]", "(-91.116) kJ/mol / 3 = (-30.372) kJ/mol = (-7.2590", "kcal_th/mol"] {
        assert!(per.contains(part), "{part} is not in {per}");
    }
}

#[test]
fn a_step_that_two_others_use_is_one_step_and_symbols_are_explained_once() {
    let code = "let half = dH * 0.5;\n(half + half * half / q(\"2.0(1) kJ/mol[rxn]\")).derivation()";
    let (_, shown) = run(&[SHIFT, code]);
    let text = shown.plain();
    assert_eq!(step_numbers(text).len(), 5, "{text}");
    assert_eq!(text.matches("0.5 × step 1").count(), 1);
    assert!(text.contains("step 2 × step 2"), "{text}");

    let (_, shown) = run(&[SHIFT, "(dH - shift.enthalpy(\"450 degC\", #{heat_capacity: \"constant\"})).derivation()"]);
    let text = shown.plain();
    assert_eq!(text.matches("stoichiometric numbers as written").count(), 1, "{text}");
    assert!(text.contains("symbols as in step 1") && text.contains("heat_capacity: constant"), "{text}");
}

/// `steps 5 to 26 not shown`
fn hidden(text: &str) -> Vec<(usize, usize)> {
    let ends = |line: &str| {
        let rest = line.trim().strip_prefix("… steps ")?;
        let (first, rest) = rest.split_once(" to ")?;
        Some((first.parse().ok()?, rest.split(' ').next()?.parse().ok()?))
    };
    text.lines().filter_map(ends).collect()
}

#[test]
fn every_step_is_shown_or_counted() {
    let cases = [
        ("let s = dH; for i in 0..12 { s = s + dH; }", "s.derivation()", 13, 0),
        ("let s = dH; for i in 0..40 { s = s + dH; }", "s.derivation()", 41, 1),
        ("let s = dH; for i in 0..90 { s = s + shift.enthalpy(\"450 degC\"); }", "s.derivation()", 181, 1),
        ("let s = dH; for i in 0..90 { s = s + shift.enthalpy(\"450 degC\"); }", "s.derivation(10)", 181, 1),
        ("let s = dH; for i in 0..90 { s = s + shift.enthalpy(\"450 degC\"); }", "s.derivation(500)", 181, 0),
    ];
    for (make, show, steps, gaps) in cases {
        let (_, shown) = run(&[SHIFT, &format!("{make} {show}")]);
        let text = shown.plain();
        let (mut numbers, hidden) = (step_numbers(text), hidden(text));
        assert_eq!(hidden.len(), gaps, "{make} {show}\n{text}");
        hidden.iter().for_each(|&(first, last)| numbers.extend(first..=last));
        numbers.sort_unstable();
        assert_eq!(numbers, (1..=steps).collect::<Vec<_>>(), "{make} {show}\n{text}");
    }
}

#[test]
fn steps_folded_in_the_graph_are_counted_and_inputs_beyond_the_limit_too() {
    let loops = "let s = dH; for i in 0..5000 { s = s + dH*2; } s.derivation()";
    let (_, shown) = run(&[SHIFT, loops]);
    let text = shown.plain();
    let folded = text.lines().find(|line| line.contains("steps of arithmetic, kept as a sum of its inputs")).unwrap();
    assert!(!folded.contains("at least"), "{folded}");
    // Between the step's number and the word: digits in groups.
    let counted = folded.trim().split_once("  ").unwrap().1.split(" steps").next().unwrap();
    let counted: usize = counted.chars().filter(char::is_ascii_digit).collect::<String>().parse().unwrap();
    // All operations of the loop, one formula step, and the folded run itself as one step.
    let last = *step_numbers(text).last().unwrap();
    assert_eq!(counted + last, 2 * 5000 + 2, "{text}");

    let many = "let s = q(\"0 kJ\"); for i in 0..100 { s = s + q(`${i}.0(1) kJ`); } s.derivation(20)";
    let (_, shown) = run(&[many]);
    assert!(shown.plain().contains("… 81 more inputs not shown"), "{}", shown.plain());
}

#[test]
fn nothing_of_the_users_becomes_markup() {
    let odd = "assume(q(\"1.0(1) kJ\"), \"no-heat-loss\", \"<img src=x> & $x_1$ {\\\\evil}\", \"0.1 kJ\").derivation()";
    let (_, shown) = run(&[odd]);
    let html = form(&shown, "text/html");
    assert!(html.contains("&lt;img src=x&gt; &amp; $x_1$") && !html.contains("<img"), "{html}");
    let latex = form(&shown, "text/latex");
    assert!(latex.contains("\\$x\\_1\\$ \\{\\textbackslash{}evil\\}"), "{latex}");
    assert!(latex.starts_with("$$\\begin{array}") && latex.ends_with("\\end{array}$$"));
    let open = latex.replace("\\{", "").replace("\\}", "");
    assert_eq!(open.matches('{').count(), open.matches('}').count());
}

#[test]
fn the_three_forms_say_the_same() {
    let (_, shown) = run(&[SHIFT, "(dH * 2).derivation()"]);
    let (html, latex) = (form(&shown, "text/html"), form(&shown, "text/latex"));
    for wanted in ["-110.525(13) kJ/mol", "2 × step 1", "at cell-1, line 2", "Active Thermochemical Tables"] {
        let bare = wanted.trim_start_matches("at ");
        assert!(
            shown.plain().contains(wanted) && html.contains(bare) && latex.contains(wanted),
            "{wanted}\n{html}\n{latex}"
        );
    }
    assert!(latex.contains(r"\Delta_\mathrm{r}H^\circ(T)=\sum\nu"), "{latex}");
}

#[test]
fn a_typed_value_alone_has_no_steps() {
    let (_, shown) = run(&["q(\"-285.830(20) kJ/mol[H2O]\").derivation()"]);
    assert_eq!(
        shown.plain(),
        "derivation of -285.830(20) kJ/mol, per mole of H2O\n  inputs\n    i1  -285.830(20) kJ/mol[H2O]  typed at cell-1, line 1"
    );
}
