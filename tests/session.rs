//! What a session does with cells, seen through [`Session`] alone: one test for each trap of the script engine, and
//! for what must hold when a cell fails.

use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use hessbook::fault::Fault;
use hessbook::render::Bundle;
use hessbook::session::outcome::{Completeness, Host};
use hessbook::session::{Session, on_big_stack};

/// A host that keeps what it gets.
#[derive(Default)]
struct Collected {
    out: String,
    err: String,
}

impl Host for Collected {
    fn write(&mut self, stderr: bool, text: &str) {
        if stderr { self.err.push_str(text) } else { self.out.push_str(text) }
    }

    fn show(&mut self, bundle: &Bundle, _id: Option<&str>) {
        self.out.push_str(bundle.plain());
    }

    fn update(&mut self, _bundle: &Bundle, _id: &str) {}
}

/// What one cell gave, as text.
#[derive(Debug)]
struct Ran {
    shown: String,
    out: String,
    err: String,
    fault: Option<Shown>,
}

/// A fault without what holds it on its thread.
#[derive(Debug)]
struct Shown {
    code: String,
    text: String,
}

impl From<Fault> for Shown {
    fn from(fault: Fault) -> Self {
        Shown { code: fault.code().to_owned(), text: fault.to_string() }
    }
}

impl Ran {
    fn code(&self) -> &str {
        self.fault.as_ref().map_or("", |fault| &fault.code)
    }

    fn text(&self) -> &str {
        self.fault.as_ref().map_or("", |fault| &fault.text)
    }
}

fn run_in(session: &mut Session, number: usize, code: &str) -> Ran {
    let mut host = Collected::default();
    let outcome = session.run_cell(&format!("cell-{number}"), code, &mut host);
    Ran {
        shown: outcome.shown.map(|bundle| bundle.plain().to_owned()).unwrap_or_default(),
        out: host.out,
        err: host.err,
        fault: outcome.result.err().map(Shown::from),
    }
}

fn session() -> Session {
    Session::new(Arc::new(AtomicBool::new(false)))
}

/// Runs the cells `cell-1`, `cell-2`, … in one session and gives what each of them gave.
fn run(cells: &[&str]) -> Vec<Ran> {
    on_big_stack(|| {
        let mut session = session();
        cells.iter().enumerate().map(|(index, code)| run_in(&mut session, index + 1, code)).collect()
    })
}

/// What the last of the cells shows; none of them may fail.
fn shown(cells: &[&str]) -> String {
    let ran = run(cells);
    for (cell, code) in ran.iter().zip(cells) {
        assert!(cell.fault.is_none(), "{code}\n{}", cell.text());
    }
    ran.last().map(|cell| cell.shown.clone()).unwrap_or_default()
}

/// Code of the fault of the last cell; the cells before it must succeed.
fn fault(cells: &[&str]) -> String {
    let ran = run(cells);
    for cell in &ran[..ran.len() - 1] {
        assert!(cell.fault.is_none(), "{}", cell.text());
    }
    ran.last().map(|cell| cell.code().to_owned()).unwrap_or_default()
}

/// Expressions with what they show, in one session.
fn shows(cases: &[(&str, &str)]) {
    let codes: Vec<&str> = cases.iter().map(|(code, _)| *code).collect();
    for (ran, (code, expected)) in run(&codes).iter().zip(cases) {
        assert_eq!(ran.shown, *expected, "{code}\n{}", ran.text());
    }
}

/// Cells with the code of the fault they end in.
fn refuses(cases: &[(&str, &str)]) {
    let codes: Vec<&str> = cases.iter().map(|(code, _)| *code).collect();
    for (ran, (code, expected)) in run(&codes).iter().zip(cases) {
        assert_eq!(ran.code(), *expected, "{code} showed {:?}, {}", ran.shown, ran.text());
        assert!(ran.shown.is_empty(), "{code} showed {}", ran.shown);
    }
}

// ---- numbers

#[test]
fn whole_numbers_divide_and_raise_to_numbers_with_a_point() {
    shows(&[
        ("3/2*8.314", "12.471"),
        ("1/2", "0.5"),
        ("6/2", "3.0"),
        ("2**-1", "0.5"),
        ("10**20", "1e20"),
        ("2**3", "8.0"),
        ("2**3**2", "512.0"),
        ("let a = 5; a /= 2; a", "2.5"),
        ("let a = 5; a **= 2; a", "25.0"),
        ("let a = [7]; a[0] /= 2; a", "[3.5]"),
        ("let m = #{n: 7}; m.n /= 2; m.n", "3.5"),
        ("let k = 7; let f = |x| k + x; k /= 2; f.call(0)", "3.5"),
        ("let a = 5; a += 0.5; a", "5.5"),
        ("7 % 4", "3"),
        ("-7 % 4", "-3"),
        ("7.5 % 2", "1.5"),
        ("1_000 + 1", "1001"),
    ]);
}

#[test]
fn comparisons_of_numbers_are_exact() {
    shows(&[
        ("1.38e-23 == 0.0", "false"),
        ("1.38e-23 > 0.0", "true"),
        ("1.38e-23 > 0", "true"),
        ("0 < 1.38e-23", "true"),
        ("1e-200 == 2e-200", "false"),
        ("1e-200 != 2e-200", "true"),
        ("0.1 + 0.2 == 0.3", "false"),
        ("0.1 + 0.2 <= 0.3", "false"),
        ("1.0 == 1", "true"),
        ("1 >= 1.0", "true"),
        ("9007199254740993 == 9007199254740992.0", "false"),
        ("9007199254740993 > 9007199254740992.0", "true"),
        ("9007199254740992.0 < 9007199254740993", "true"),
        ("[1e-30] == [2e-30]", "false"),
        ("[1.0, 2] == [1, 2.0]", "true"),
        ("1e-30 in [2e-30]", "false"),
        ("[3e-30, 1e-30].contains(1e-30)", "true"),
        ("#{a: 1e-30} == #{a: 2e-30}", "false"),
        ("[1e-30, 2e-30, 2e-30].dedup()", ""),
        ("let a = [1e-30, 2e-30, 2e-30]; a.dedup(); a", "[1e-30, 2e-30]"),
    ]);
}

#[test]
fn what_has_no_finite_value_is_refused() {
    refuses(&[
        ("1/0", "division-by-zero"),
        ("1/0.0", "division-by-zero"),
        ("1.0/0", "division-by-zero"),
        ("0.0/0.0", "division-by-zero"),
        ("5 % 0", "division-by-zero"),
        ("5.0 % 0.0", "division-by-zero"),
        ("0 ** -1", "division-by-zero"),
        ("let x = 1.0; x /= 0", "division-by-zero"),
        ("let x = 1; x %= 0", "division-by-zero"),
        ("sqrt(-1)", "not-a-real-number"),
        ("ln(-1.0)", "not-a-real-number"),
        ("ln(0)", "infinite-number"),
        ("log(-2, 10)", "not-a-real-number"),
        ("asin(2)", "not-a-real-number"),
        ("(-8) ** (1/3)", "not-a-real-number"),
        ("exp(1000)", "number-too-large"),
        ("1e300 * 1e300", "number-too-large"),
        ("let x = 1e300; x *= 1e300", "number-too-large"),
        ("1e308 + 1e308", "number-too-large"),
        ("atanh(1)", "infinite-number"),
        ("log(2, 1)", "infinite-number"),
        ("9223372036854775807 + 1", "whole-number-overflow"),
        ("let x = 9223372036854775807; x *= 2", "whole-number-overflow"),
        ("-9223372036854775807 - 2", "whole-number-overflow"),
        ("1e19.to_int()", "whole-number-overflow"),
        ("parse_float(\"inf\")", "not-a-number"),
        ("parse_float(\"NaN\")", "not-a-number"),
        ("parse_int(\"twelve\")", "not-a-number"),
        ("1e999", "number-out-of-range"),
        ("9999999999999999999", "whole-number-too-long"),
    ]);
}

#[test]
fn elementary_functions_take_whole_numbers_too() {
    shows(&[
        ("sqrt(16)", "4.0"),
        ("exp(0)", "1.0"),
        ("ln(1)", "0.0"),
        ("log(1000)", "3.0"),
        ("log(8, 2)", "3.0"),
        ("sin(0)", "0.0"),
        ("hypot(3, 4)", "5.0"),
        ("atan(0, 1)", "0.0"),
        ("16.sqrt()", "4.0"),
        ("5.floor()", "5"),
    ]);
}

#[test]
fn a_caret_is_not_a_power() {
    refuses(&[
        ("2^3", "caret-is-not-power"),
        ("2.0^3", "caret-is-not-power"),
        ("let x = 2; x ^= 3", "caret-is-not-power"),
        ("true ^ false", "caret-is-not-power"),
    ]);
}

#[test]
fn a_minus_before_a_power_is_refused_and_both_readings_can_be_written() {
    refuses(&[("-2**2", "minus-before-power"), ("let x = 3; 1 + -x**2", "minus-before-power")]);
    shows(&[("-(2**2)", "-4.0"), ("(-2)**2", "4.0"), ("let a = 10; a - 2**2", "6.0")]);
}

// ---- the language

#[test]
fn parameters_are_not_replaced_by_variables_of_the_notebook() {
    assert_eq!(shown(&["let R = 8.314; const K = 5;", "fn f(R) { R * 2 } f(1)"]), "2");
    assert_eq!(shown(&["const R = 8.314;", "let f = |R| R * 2.0; f.call(1.0)"]), "2.0");
    assert_eq!(shown(&["const R = 8.314; let s = 0; for R in 1..4 { s += R; } s"]), "6");
}

#[test]
fn names_may_have_letters_of_any_script() {
    assert_eq!(shown(&["let ΔrH = -37.6; fn größe(x) { x }", "größe(ΔrH)"]), "-37.6");
}

#[test]
fn unlike_kinds_are_neither_equal_nor_different() {
    refuses(&[
        ("1 == \"1\"", "unlike-kinds"),
        ("\"1\" != 1.0", "unlike-kinds"),
        ("true == 1", "unlike-kinds"),
        ("[1] == 1", "unlike-kinds"),
        ("#{} == []", "unlike-kinds"),
        ("1 < \"2\"", "unlike-kinds"),
        ("[1] < [2]", "no-such-comparison"),
        ("[1] == [\"1\"]", "unlike-kinds"),
        ("1 in [\"1\"]", "unlike-kinds"),
        ("(|x| x) == (|x| x)", "no-such-comparison"),
        ("() < 1", "order-of-nothing"),
        ("1 >= ()", "order-of-nothing"),
    ]);
    shows(&[
        ("() == ()", "true"),
        ("1 == ()", "false"),
        ("\"a\" != ()", "true"),
        ("[] == ()", "false"),
        ("'a' == \"a\"", "true"),
        ("\"a\" < 'b'", "true"),
        ("true == true", "true"),
        ("\"b\" >= \"a\"", "true"),
    ]);
}

#[test]
fn a_sum_with_a_text_begins_with_the_text() {
    shows(&[("\"a\" + 1", "\"a1\""), ("\"T = \" + 2.5", "\"T = 2.5\""), ("let s = \"a\"; s += 1; s", "\"a1\"")]);
    refuses(&[
        ("1 + \"a\"", "joined-to-text"),
        ("let n = 1; n += \"a\"", "joined-to-text"),
        ("() + \"a\"", "joined-to-text"),
        ("[1] + \"a\"", "joined-to-text"),
        ("\"10\" - \"1\"", "text-minus"),
        ("let s = \"10\"; s -= \"1\"", "text-minus"),
    ]);
}

#[test]
fn a_switch_is_refused_where_no_case_could_match() {
    shows(&[
        ("switch 3 { 3 => \"three\", _ => \"other\" }", "\"three\""),
        ("switch \"b\" { \"a\" => 1, \"b\" => 2 }", "2"),
        ("switch [1, \"a\"] { [1, \"a\"] => 1, _ => 2 }", "1"),
        ("fn f(x) { switch x + 1 { 2 => \"two\", _ => \"other\" } } f(1)", "\"two\""),
        ("let m = #{a: 4}; switch m.a { 0..3 => \"low\", 3..9 => \"high\" }", "\"high\""),
        ("switch () { () => 1 }", "1"),
    ]);
    refuses(&[
        ("switch 6/2 { 3 => \"three\", _ => \"other\" }", "not-switchable"),
        ("switch [1.0] { [1] => 1, _ => 2 }", "not-switchable"),
        ("switch |x| x { 1 => 1, _ => 2 }", "not-switchable"),
    ]);
}

#[test]
fn functions_of_the_library_cannot_be_replaced() {
    refuses(&[
        ("fn sqrt(x) { 1 }", "reserved-name"),
        ("let a = 1; fn parse_int(x) { }", "reserved-name"),
        ("fn len() { 3 }", "reserved-name"),
        ("fn sqrt(a, b, c) { 1 }", "reserved-name"),
        ("private fn ln(x) { x }", "reserved-name"),
    ]);
    // A variable of that name is another thing: functions are not looked up among variables.
    assert_eq!(shown(&["let sqrt = |x| 1; sqrt(4)"]), "2.0");
}

#[test]
fn what_depends_on_the_clock_or_runs_text_is_refused() {
    refuses(&[
        ("timestamp()", "reads-the-clock"),
        ("sleep(1)", "reads-the-clock"),
        ("sleep(0.1)", "reads-the-clock"),
        ("eval(\"1\")", "eval-refused"),
        ("import \"x\" as y;", "import-refused"),
        ("get_fn_metadata_list()", "shows-the-engine"),
        ("Fn(\"eval\").call(\"1\")", "eval-refused"),
    ]);
}

#[test]
fn json_is_read_without_losing_digits() {
    shows(&[("parse_json(\"[0.1, 1e-300, 3, \\\"a\\\"]\")", "[0.1, 1e-300, 3, \"a\"]")]);
    refuses(&[("parse_json(\"[1,\")", "not-json"), ("parse_json(\"[1e999]\")", "not-json")]);
}

#[test]
fn a_mistyped_entry_of_a_map_is_not_nothing() {
    refuses(&[("let m = #{mass: 1}; m.maas", "missing-entry"), ("let m = #{mass: 1}; m[\"maas\"]", "missing-entry")]);
}

#[test]
fn dedup_passes_errors_on() {
    refuses(&[
        ("let a = [1, \"1\"]; a.dedup()", "unlike-kinds"),
        ("let a = [|x| x, |y| y]; a.dedup()", "no-equality"),
        ("let a = [1, 2]; a.dedup(|x, y| throw \"no\")", "thrown"),
    ]);
    shows(&[("let a = [1, 1, 2, 3, 2]; a.dedup(|x, y| (x - y).abs() < 2); a", "[1, 3]")]);
}

#[test]
fn sort_passes_errors_on_and_takes_any_number_for_an_answer() {
    shows(&[
        ("let a = [2.5, 1.5, 2.0]; a.sort(|x, y| x - y); a", "[1.5, 2.0, 2.5]"),
        ("[3, 1, 2].order(|x, y| y - x)", "[3, 2, 1]"),
        ("[3, 1, 2].order_by(|x, y| x < y)", "[1, 2, 3]"),
        ("let a = [3, 1, 2]; a.sort_by(|x, y| 0); a", "[3, 1, 2]"),
        ("[3, 1, 2].order()", "[1, 2, 3]"),
    ]);
    refuses(&[
        ("let a = [3, 1, 2]; a.sort(|x, y| throw \"no\")", "thrown"),
        ("let a = [3, 1, 2]; a.sort(|x, y| \"less\")", "not-an-order"),
        ("[3, \"1\"].order(|x, y| x < y)", "unlike-kinds"),
        ("[3, 2.5].sort()", "unsortable"),
    ]);
}

#[test]
fn names_of_closures_never_show() {
    let cells = [
        "let f = |x| x; print(f); debug(f); f",
        "f.name",
        "`${[f]}`",
        "f.call(1, 2)",
        "[1].map(|a, b, c| a)",
        "[1].map(|x| throw \"stop\")",
        "[1].map(|x| x.nothing)",
        "print(#{f: |x| x})",
        "\"\" + f",
        "f + 1",
        "fn g(x) { x } g",
        "try { f.call(1, 2) } catch (e) { print(e.message); e }",
    ];
    for (ran, code) in run(&cells).iter().zip(cells) {
        let all = format!("{}{}{}{}", ran.shown, ran.out, ran.err, ran.text());
        assert!(!all.contains('$'), "{code}\n{all}");
        assert!(!all.is_empty(), "{code}");
    }
}

#[test]
fn maps_and_functions_come_in_one_order() {
    let first = shown(&["let m = #{c: 1, a: 2, b: 3}; m"]);
    assert_eq!(first, "#{a: 2, b: 3, c: 1}");
    assert_eq!(shown(&["#{c: 1, a: 2, b: 3}.keys()"]), "[\"a\", \"b\", \"c\"]");
}

// ---- cells as transactions

#[test]
fn a_failed_cell_leaves_nothing_behind() {
    let ran = run(&[
        "let k = 1; let list = [1, 2]; let map = #{a: [1]};",
        "k = 2; list.push(3); map.a[0] = 9; map.b = 1; let fresh = 1; fn helper() { 1 } throw \"stop\"",
        "[k, list, map]",
        "fresh",
        "helper()",
    ]);
    assert_eq!(ran[1].code(), "thrown");
    assert_eq!(ran[2].shown, "[1, [1, 2], #{a: [1]}]");
    assert_eq!(ran[3].code(), "unknown-variable");
    assert_eq!(ran[4].code(), "unknown-function");
}

#[test]
fn a_failed_cell_leaves_captured_variables_alone() {
    let ran = run(&[
        "let k = 1; let f = || k; let list = [10]; let held = #{inside: [|x| { list.push(x); list }]};",
        "k = 77; list.push(11); held.inside[0].call(12); throw 1",
        "[k, f.call(), list]",
        "k = 5; f.call()",
        "held.inside[0].call(13); list",
        "let g = || { k += 1; k }; g.call(); throw 1",
        "[k, f.call(), is_shared(k)]",
    ]);
    assert_eq!(ran[2].shown, "[1, 1, [10]]");
    // The link between the variable and its closure outlives the failure.
    assert_eq!(ran[3].shown, "5");
    assert_eq!(ran[4].shown, "[10, 13]");
    assert_eq!(ran[6].shown, "[5, 5, true]");
}

#[test]
fn closures_survive_into_later_cells() {
    assert_eq!(shown(&["let k = 2; let f = |x| x * k;", "k = 3;", "[1, 2].map(f)"]), "[3, 6]");
    assert_eq!(shown(&["fn outer(n) { |x| x + n }", "let add = outer(10);", "fn outer(n) { 0 }", "add.call(1)"]), "11");
}

#[test]
fn functions_can_be_redefined_and_old_callers_see_the_new_one() {
    let ran = run(&[
        "fn h(x) { x + 1 } fn caller(x) { h(x) } caller(1)",
        "fn h(x) { x + 100 }",
        "[h(1), caller(1)]",
        "fn h(x) { throw \"stop\" } caller(1)",
        "caller(1)",
        "let pointer = h; fn h(x) { 7 } pointer.call(1)",
        "[1, 2].map(h)",
        "fn h(a, b) { a + b } [h(1), h(1, 2)]",
    ]);
    assert_eq!(ran[0].shown, "2");
    assert_eq!(ran[2].shown, "[101, 101]");
    assert_eq!(ran[3].code(), "thrown");
    assert_eq!(ran[4].shown, "101");
    assert_eq!(ran[5].shown, "7");
    assert_eq!(ran[6].shown, "[7, 7]");
    assert_eq!(ran[7].shown, "[7, 3]");
}

#[test]
fn functions_work_on_what_stands_before_the_dot() {
    let ran = run(&[
        "fn twice() { this * 2 } 4.twice()",
        "let x = 5; x.twice()",
        "private fn hidden(x) { x } hidden(1)",
        "hidden(2)",
    ]);
    let shown: Vec<&str> = ran.iter().map(|cell| cell.shown.as_str()).collect();
    assert_eq!(shown, ["8", "10", "1", "2"]);
}

#[test]
fn results_do_not_depend_on_the_order_of_earlier_calls() {
    let cells = ["fn f() { 1 } fn h(x) { f() + x } fn h2(x) { f() + x }", "fn f() { 100 }"];
    assert_eq!(shown(&[cells[0], cells[1], "[h(1), h2(1), f()]"]), "[101, 101, 100]");
    assert_eq!(shown(&[cells[0], "h(1);", cells[1], "[h2(1), h(1), f()]"]), "[101, 101, 100]");
}

#[test]
fn functions_stay_callable_when_the_engine_is_built_anew() {
    on_big_stack(|| {
        let mut session = session();
        let start = "let k = 1; let keep = |x| x + k; fn steady(x) { [x].map(|y| y * 2)[0] }";
        assert!(run_in(&mut session, 0, start).fault.is_none());
        for number in 1..400 {
            let code = format!("fn changing() {{ {number} }} let list = [1, 2].map(|x| x + {number}); changing()");
            assert_eq!(run_in(&mut session, number, &code).shown, number.to_string());
        }
        let last = run_in(&mut session, 400, "k = 10; [keep.call(1), steady(4), changing(), list]");
        assert_eq!(last.shown, "[11, 8, 399, [400, 401]]", "{}", last.text());
        assert_eq!(run_in(&mut session, 401, "fn steady(x) { throw \"stop\" } steady(1)").code(), "thrown");
        assert_eq!(run_in(&mut session, 402, "[3].map(steady)").shown, "[6]");
    });
}

#[test]
fn repeated_definitions_do_not_pile_up() {
    let cells: Vec<String> = (0..50).map(|number| format!("let x = {number};")).collect();
    let mut cells: Vec<&str> = cells.iter().map(String::as_str).collect();
    cells.push("x");
    assert_eq!(shown(&cells), "49");
    // A second definition takes the place of the first, also where the first was constant.
    assert_eq!(shown(&["const C = 1;", "let C = 2; C = 3; C"]), "3");
}

#[test]
fn a_semicolon_at_the_end_keeps_the_value_to_itself() {
    shows(&[
        ("1 + 1", "2"),
        ("1 + 1;", ""),
        ("1 + 1; // done", ""),
        ("1 + 1 /* ; */", "2"),
        ("let a = 1", ""),
        ("()", ""),
    ]);
}

#[test]
fn an_evaluated_expression_keeps_nothing() {
    on_big_stack(|| {
        let mut session = session();
        run_in(&mut session, 1, "let k = 1; let f = || k;");
        let text = |session: &mut Session, code: &str| session.evaluate(code).map(|bundle| bundle.plain().to_owned());
        assert_eq!(text(&mut session, "k + 1"), Ok("2".to_owned()));
        assert_eq!(text(&mut session, "k = 50; f.call()"), Ok("50".to_owned()));
        assert_eq!(text(&mut session, "f.call()"), Ok("1".to_owned()));
        assert_eq!(text(&mut session, "fn extra() { 1 } let y = 2; print(3)"), Ok(String::new()));
        assert_eq!(run_in(&mut session, 2, "extra()").code(), "unknown-function");
        assert_eq!(run_in(&mut session, 3, "y").code(), "unknown-variable");
        assert_eq!(text(&mut session, "1/0").unwrap_err().code(), "division-by-zero");
    });
}

// ---- output

#[test]
fn output_goes_to_the_host_while_the_cell_runs() {
    struct StopAtThree {
        lines: usize,
        stop: Arc<AtomicBool>,
    }
    impl Host for StopAtThree {
        fn write(&mut self, _stderr: bool, text: &str) {
            assert_eq!(text, "more\n");
            self.lines += 1;
            if self.lines == 3 {
                self.stop.store(true, Ordering::Relaxed);
            }
        }

        fn show(&mut self, _bundle: &Bundle, _id: Option<&str>) {}

        fn update(&mut self, _bundle: &Bundle, _id: &str) {}
    }
    // If lines came only at the end, this loop would never end.
    let (lines, code) = on_big_stack(|| {
        let stop = Arc::new(AtomicBool::new(false));
        let mut session = Session::new(stop.clone());
        let mut host = StopAtThree { lines: 0, stop };
        let outcome = session.run_cell("cell-1", "loop { print(\"more\"); }", &mut host);
        (host.lines, outcome.result.unwrap_err().code())
    });
    assert_eq!((lines, code), (3, "interrupted"));
}

#[test]
fn print_and_debug_go_to_their_own_streams() {
    let ran = run(&[
        "print(1.5);\n  debug(\"a\");",
        "fn f() { debug(1) }",
        "f()",
        "print()",
        "print([\"a\", 0.1, #{b: 'c'}])",
    ]);
    assert_eq!(ran[0].out, "1.5\n");
    assert_eq!(ran[0].err, "cell-1, line 2, column 3: \"a\"\n");
    assert_eq!(ran[2].err, "cell-2, line 1, column 10: 1\n");
    assert_eq!(ran[3].out, "\n");
    assert_eq!(run(&["print(`${0.1 + 0.2} ${[1e-7]} ${()}`)"])[0].out, "0.30000000000000004 [1e-7] \n");
    assert_eq!(ran[4].out, "[\"a\", 0.1, #{b: 'c'}]\n");
}

// ---- limits

#[test]
fn an_interrupt_stops_loops_and_closures_and_cannot_be_caught() {
    for code in [
        "loop { }",
        "loop { try { loop { } } catch { } }",
        "[1].map(|x| { loop { } })",
        "fn f() { while true { 1 + 1; } } f()",
        "let a = [1, 2, 3]; a.dedup(|x, y| { loop { } })",
        "let a = [3, 1, 2]; a.sort(|x, y| { loop { } })",
    ] {
        let (first, second) = on_big_stack(|| {
            let stop = Arc::new(AtomicBool::new(false));
            let mut session = Session::new(stop.clone());
            let other = stop.clone();
            let timer = std::thread::spawn(move || {
                std::thread::sleep(std::time::Duration::from_millis(50));
                other.store(true, Ordering::Relaxed);
            });
            let first = run_in(&mut session, 1, code);
            timer.join().unwrap();
            stop.store(false, Ordering::Relaxed);
            (first.code().to_owned(), run_in(&mut session, 2, "1 + 1").shown)
        });
        assert_eq!((first.as_str(), second.as_str()), ("interrupted", "2"), "{code}");
    }
}

#[test]
fn hostile_cells_end_as_faults_of_the_cell() {
    on_big_stack(|| {
        let mut session = session();
        session.set_memory_limit(16 << 20);
        let cases = [
            "blob(100000000000000)",
            "blob(100000000000000, 1)",
            "let b = blob(); b.pad(100000000000000, 0)",
            "let s = \"x\"; s.pad(100000000000000, \"y\")",
            "let s = \"x\"; s.pad(100000000000000, 'y')",
            "let a = [1]; a.pad(100000000000000, 0)",
            "let s = \"x\"; loop { s += s; }",
            "let s = \"x\"; loop { s = s + s; }",
            "let s = \"x\"; loop { s = `${s}${s}`; }",
            "let a = [1]; loop { a += a; }",
            "let a = [1]; loop { a = a + a; }",
            "let a = [1]; loop { a.append(a); }",
            "let a = []; loop { a.push(1); }",
            "let a = [1]; loop { a = [a, a]; }",
            "let m = #{}; let i = 0; loop { m[`${i}`] = i; i += 1; }",
            "let s = \"ab\"; loop { s.replace(\"a\", \"aa\"); }",
            "let s = \"x\"; s.pad(3000000, 'x'); s.to_chars()",
            "let s = \"x\"; s.pad(3000000, 'x'); s.split(\"\")",
            "blob(8000000).to_array()",
            "let s = \"x\"; s.pad(1000000, 'x'); let a = [s]; loop { a.pad(2 * a.len(), s + \"\"); }",
        ];
        for (number, code) in cases.into_iter().enumerate() {
            let ran = run_in(&mut session, number, code);
            assert_eq!(ran.code(), "out-of-memory-limit", "{code}: {}{}", ran.text(), ran.shown);
        }
        assert_eq!(run_in(&mut session, 99, "let a = [1]; a.pad(1000, 2); a.len()").shown, "1000");
    });
}

#[test]
fn endless_recursion_ends_as_a_fault_of_the_cell() {
    refuses(&[
        ("fn f(x) { f(x) } f(1)", "calls-too-deep"),
        ("fn g(x) { [x].map(|y| g(y)) } g(1)", "calls-too-deep"),
        // The engine lends a captured variable to one user at a time.
        ("let f = (); f = |x| f.call(x); f.call(1)", "value-in-use"),
    ]);
    assert_eq!(shown(&["fn down(n) { if n == 0 { 0 } else { 1 + down(n - 1) } } down(400)"]), "400");
}

#[test]
fn long_sums_are_read() {
    let sum = vec!["x"; 400].join(" + ");
    assert_eq!(shown(&[&format!("fn f(x) {{ {sum} }} f(2)")]), "800");
}

// ---- faults

#[test]
fn a_script_catches_every_fault_in_one_form() {
    let cases = [
        ("1/0", "division-by-zero"),
        ("a_variable", "unknown-variable"),
        ("no_function(1)", "unknown-function"),
        ("sqrt(\"a\")", "wrong-arguments"),
        ("let a = [1]; a[5]", "index-out-of-range"),
        ("let m = #{a: 1}; m.b", "missing-entry"),
        ("5.nothing", "unknown-property"),
        ("let x = 5; x.nothing = 1", "read-only-property"),
        ("1 + [1]", "operator-mismatch"),
        ("[1][3/2]", "wrong-kind"),
        ("let x = true; x[\"a\"]", "not-indexable"),
        ("let x = 5; for i in x { }", "not-iterable"),
        ("let f = |x| x; f.call(1, 2)", "argument-count"),
        ("let x = 1; if x { }", "wrong-kind"),
        ("const C = [1]; C.push(2)", "constant-changed"),
        ("\"abc\"[9]", "index-out-of-range"),
        ("[1, \"a\"].sort()", "unsortable"),
        ("1 == \"1\"", "unlike-kinds"),
    ];
    for (code, expected) in cases {
        let uncaught = &run(&[code])[0];
        assert_eq!(uncaught.code(), expected, "{code}: {}", uncaught.text());
        let caught = shown(&[&format!(
            "let found = (); try {{ {code} }} catch (e) {{ found = [e.code, e.message, e.hint]; }} found"
        )]);
        assert!(caught.contains(&format!("\"{expected}\"")), "{code}: {caught}");
        let message = uncaught.text().lines().next().unwrap().replace('"', "\\\"");
        assert!(caught.contains(&message), "{code}: {caught} should say {message}");
        let inside = shown(&[&format!(
            "fn inner(x) {{ {code} }} let found = (); try {{ inner(1) }} catch (e) {{ found = [e.code, e.message]; }} found"
        )]);
        assert!(inside.contains(&format!("\"{expected}\"")), "inside a function, {code}: {inside}");
    }
}

#[test]
fn what_a_script_throws_it_catches_unchanged() {
    shows(&[
        ("let r = (); try { throw \"text\" } catch (e) { r = e; } r", "\"text\""),
        ("let r = (); try { throw #{code: \"mine\", n: 3} } catch (e) { r = e.n; } r", "3"),
        ("let r = (); try { throw 5 } catch { r = 1; } r", "1"),
    ]);
    let ran = run(&["throw #{code: \"too-hot\", message: \"the bath is at 90 degC\", hint: \"cool it\"}", "throw"]);
    assert_eq!(ran[0].text(), "too-hot: the bath is at 90 degC\n  at: cell-1, line 1, column 1\n  try: cool it");
    assert_eq!(ran[1].code(), "thrown");
    // Thrown again, a fault keeps its code.
    assert_eq!(fault(&["try { 1/0 } catch (e) { throw e }"]), "division-by-zero");
}

#[test]
fn a_panic_in_native_code_is_a_bug_and_the_session_goes_on() {
    struct Fragile;
    impl Host for Fragile {
        fn write(&mut self, _stderr: bool, _text: &str) {
            panic!("planned by this test");
        }

        fn show(&mut self, _bundle: &Bundle, _id: Option<&str>) {}

        fn update(&mut self, _bundle: &Bundle, _id: &str) {}
    }
    on_big_stack(|| {
        let mut session = session();
        run_in(&mut session, 1, "let k = 1; let f = || k;");
        let outcome = session.run_cell("cell-2", "k = 2; print(1)", &mut Fragile);
        let fault = outcome.result.unwrap_err();
        assert_eq!(fault.code(), "bug");
        assert!(fault.to_string().contains("planned by this test"), "{fault}");
        assert_eq!(run_in(&mut session, 3, "[k, f.call()]").shown, "[1, 1]");
        assert_eq!(run_in(&mut session, 4, "print(2)").out, "2\n");
    });
}

// ---- completeness

#[test]
fn a_front_end_learns_whether_a_cell_is_whole() {
    let session = session();
    let complete =
        ["", "1 + 1", "let a = 1;", "// c", "fn f(x) { x }", "`a ${b}`", "\"a\"", "-2**2", "/* a */", "x = (1)\n"];
    let incomplete = [
        "fn f(x) {",
        "(1 +",
        "1 +",
        "let a =",
        "let a = [1,\n",
        "/* open",
        "1 /* a /* b */",
        "`open",
        "`open ${1",
        "`open ${1}",
        "\"carried \\",
        "\"carried \\\n",
        "#\"raw",
        "if true {\n  1\n",
        "/// what follows is",
        "let a = 1;\n/// what follows is\n",
        "#{a: 1",
        "f(1,",
        "try { 1 }",
    ];
    let invalid =
        ["1 +* 2", "let 3 = a", ")", "\"open", "let a = 5 let b = 6", "fn f(x { x }", "a b", "/// doc\nlet x = 1"];
    for code in complete {
        assert_eq!(session.completeness(code), Completeness::Complete, "{code:?}");
    }
    for code in incomplete {
        assert_eq!(session.completeness(code), Completeness::Incomplete, "{code:?}");
    }
    for code in invalid {
        assert_eq!(session.completeness(code), Completeness::Invalid, "{code:?}");
    }
}
