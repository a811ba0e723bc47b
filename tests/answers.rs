//! `compare` and `explain_gap` as cells use them: what is shown, in each form, and the parts that scripts go on with.
//!
//! Typed figures are invented unless a source stands beside them.

use std::sync::Arc;
use std::sync::atomic::AtomicBool;

use hessbook::render::Bundle;
use hessbook::session::outcome::Host;
use hessbook::session::{Session, on_big_stack};

struct Silent;

impl Host for Silent {
    fn write(&mut self, _stderr: bool, _text: &str) {}

    fn show(&mut self, _bundle: &Bundle, _id: Option<&str>) {}

    fn update(&mut self, _bundle: &Bundle, _id: &str) {}
}

fn run(code: &str) -> Bundle {
    let code = code.to_owned();
    on_big_stack(move || {
        let mut session = Session::new(Arc::new(AtomicBool::new(false)));
        let outcome = session.run_cell("cell-1", &code, &mut Silent);
        outcome.result.unwrap_or_else(|fault| panic!("{code}\n{fault}"));
        outcome.shown.unwrap_or_default()
    })
}

fn form(bundle: &Bundle, mime: &str) -> String {
    bundle.data.get(mime).and_then(|form| form.as_str()).unwrap_or("").to_owned()
}

#[test]
fn a_comparison_says_how_far_apart_in_units_and_in_u() {
    let shown = run("compare(\"-285.830(30) kJ/mol[H2O]\", \"-285.710(40) kJ/mol[H2O]\")");
    assert_eq!(
        shown.plain(),
        "they differ: 2.4 standard uncertainties of their difference apart, more than 2\n  \
           a      -285.830(30) kJ/mol, per mole of H2O\n  \
           b      -285.710(40) kJ/mol, per mole of H2O\n  \
           a - b  -0.120(50) kJ/mol, per mole of H2O\n  \
           of b   -0.042 %\n  \
           k      2.4"
    );
    let (html, latex) = (form(&shown, "text/html"), form(&shown, "text/latex"));
    assert!(html.contains("<td style=\"text-align:left\">-0.120(50) kJ/mol, per mole of H2O</td>"), "{html}");
    assert!(latex.contains("-0.120(50) kJ/mol") && latex.contains("they differ"), "{latex}");
}

#[test]
fn shared_inputs_cancel_in_a_comparison_and_are_counted() {
    let code = "let r = reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\"); let h = r.enthalpy(\"298.15 K\");\n\
                compare(h + q(\"1.00(1) kJ/mol[rxn]\"), h)";
    let shown = run(code);
    // 100 times the u of the one figure that is not common to both.
    assert!(shown.plain().contains("they differ: 100.0 standard uncertainties"), "{}", shown.plain());
    assert!(shown.plain().contains("in common  4 inputs"), "{}", shown.plain());
}

#[test]
fn parts_of_answers_are_values_to_go_on_with() {
    let rows = [
        ("let c = compare(\"10.0(3) kJ\", \"9.0(4) kJ\"); (c.difference * 2).value(\"kJ\")", "2.0"),
        ("compare(\"10.0(3) kJ\", \"9.0(4) kJ\").k", "2.0"),
        ("compare(\"10.0 kJ\", \"9.0 kJ\").k", ""),
        ("compare(\"10.0(3) kJ\", \"9.0(4) kJ\", 1).verdict.contains(\"differ\")", "true"),
        ("explain_gap(\"1.2500 kJ\", \"1250.0 kJ\").fits[0].id", "\"power-of-ten\""),
        ("explain_gap(\"1.2500 kJ\", \"1250.0 kJ\").fits[0].predicted", "1248.75"),
        ("explain_gap(\"1.2500 kJ\", \"1.2500 kJ\").fits.len()", "0"),
    ];
    for (code, wanted) in rows {
        assert_eq!(run(code).plain(), wanted, "{code}");
    }
}

#[test]
fn an_explained_gap_names_mistake_fit_chance_and_source() {
    let code = "let r = reaction(\"2 H2(g) + O2(g) -> 2 H2O(g)\");\n\
                explain_gap(r.enthalpy(\"298.15 K\"), \"-571.65 kJ/mol[rxn]\")";
    let shown = run(code);
    for wanted in [
        "gap b - a = -88.006 kJ/mol",
        "1. in b: H2O(l) was taken for H2O(g), ν = 2 (water-phase)",
        "within the rounding of the figures",
        "% of random gaps would fit one of the alternatives as well",
        "source: Active Thermochemical Tables",
    ] {
        let (text, html, latex) = (shown.plain(), form(&shown, "text/html"), form(&shown, "text/latex"));
        assert!(text.contains(wanted), "{wanted}\n{text}");
        assert!(html.contains(wanted.trim_start_matches("1. ")), "{wanted}\n{html}");
        assert!(latex.contains(&wanted.trim_start_matches("1. ").replace('%', "\\%")), "{wanted}\n{latex}");
    }
    let nothing = run("explain_gap(\"10.0(3) kJ\", \"10.4 kJ\")");
    assert!(nothing.plain().contains("no usual mistake is named"), "{}", nothing.plain());
    assert!(nothing.plain().contains("needs no mistake"), "{}", nothing.plain());
}

#[test]
fn values_of_a_substance_are_explained_and_answers_print_as_they_are_shown() {
    // CODATA Key Values 1989: formation enthalpy of H2O(l) -285.830(40) kJ/mol at 95 %.
    let code = "let w = substance(\"H2O(g)\").enthalpy(\"298.15 K\"); explain_gap(w, \"-285.830(20) kJ/mol[H2O]\")";
    let shown = run(code);
    assert!(shown.plain().contains("1. in b: H2O(l) was taken for H2O(g)"), "{}", shown.plain());
    assert_eq!(
        run(&format!("let w = {{ {code} }}; `${{w}}`")).plain().replace("\\n", "\n").trim_matches('"'),
        shown.plain()
    );
}
