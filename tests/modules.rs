//! Modules beside a notebook: what a cell may use of them, where their faults and steps say they are, and that a cell that
//! fails leaves none behind.

use std::path::Path;
use std::sync::Arc;

use hessbook::fault::Fault;
use hessbook::render::Bundle;
use hessbook::session::outcome::Host;
use hessbook::session::{Session, on_big_stack};

#[derive(Default)]
struct Heard(String);

impl Host for Heard {
    fn write(&mut self, _stderr: bool, text: &str) {
        self.0.push_str(text);
    }

    fn show(&mut self, _bundle: &Bundle, _id: Option<&str>) {}

    fn update(&mut self, _bundle: &Bundle, _id: &str) {}
}

/// A folder with modules, and a session in it.
struct Bench {
    folder: tempfile::TempDir,
    session: Session,
    cells: usize,
    heard: Heard,
}

impl Bench {
    fn with(files: &[(&str, &str)]) -> Bench {
        let folder = tempfile::tempdir().unwrap();
        let mut session = Session::new(Arc::default());
        session.set_folder(folder.path().to_path_buf());
        let bench = Bench { folder, session, cells: 0, heard: Heard::default() };
        files.iter().for_each(|(name, text)| bench.write(name, text));
        bench
    }

    fn write(&self, name: &str, text: &str) {
        std::fs::write(self.path().join(name), text).unwrap();
    }

    fn path(&self) -> &Path {
        self.folder.path()
    }

    fn cell(&mut self, code: &str) -> Result<String, Fault> {
        self.cells += 1;
        let outcome = self.session.run_cell(&format!("cell-{}", self.cells), code, &mut self.heard);
        outcome.result.map(|()| outcome.shown.map(|bundle| bundle.plain().to_owned()).unwrap_or_default())
    }

    fn ok(&mut self, code: &str) -> String {
        self.cell(code).unwrap_or_else(|fault| panic!("{code}\n{fault}"))
    }
}

const PLANT: &str = "
// A figure of the invented plant.
const LOSS = q(\"2.0(1) kJ\", \"invented\");

// Heat that goes in, with what is lost on the way.
fn duty(n, dh) {
    n * dh + loss()
}

private fn loss() { global::LOSS }

fn fails(x) {
    let y = 1;
    duty(q(\"1 mol\"), x)
}
";

fn on<R: Send>(work: impl FnOnce() -> R + Send) -> R {
    on_big_stack(work)
}

#[test]
fn a_function_and_a_constant_of_a_file_beside_the_notebook_are_there_without_an_import() {
    on(|| {
        let mut bench = Bench::with(&[("plant.rhai", PLANT)]);
        // 2 mol at 3 kJ/mol and 2 kJ lost.
        assert_eq!(bench.ok("plant::duty(q(\"2 mol\"), q(\"3 kJ/mol\")).value(\"kJ\")"), "8.0");
        // The constant is evaluated once: it cancels against itself, as the same figure must.
        assert_eq!(
            bench.ok("(plant::duty(exact(\"0 mol\"), exact(\"3 kJ/mol\")) - plant::LOSS).uncertainty(\"kJ\")"),
            "0.0"
        );
        // In a function of a cell, in a later cell, and handed on as a value.
        bench.ok("fn twice(x) { plant::duty(x, q(\"3 kJ/mol\")) + plant::duty(x, q(\"3 kJ/mol\")) }");
        assert_eq!(bench.ok("twice(q(\"2 mol\")).value(\"kJ\")"), "16.0");
        assert_eq!(
            bench.ok("[q(\"1 mol\"), q(\"2 mol\")].map(|n| plant::duty(n, q(\"1 kJ/mol\")).value(\"kJ\"))"),
            "[3.0, 4.0]"
        );
        // A unit behind a number is known in a module that is the first to write it.
        bench.write("hot.rhai", "fn bath() { 451.0.K }");
        assert_eq!(bench.ok("hot::bath().value(\"K\")"), "451.0");
        let fault = bench.cell("plant::loss()").unwrap_err();
        assert_eq!((fault.code(), fault.hint()), ("unknown-in-module", "did you mean plant::LOSS?"));
    });
}

#[test]
fn a_step_made_in_a_module_says_so() {
    on(|| {
        let mut bench = Bench::with(&[("plant.rhai", PLANT)]);
        let derivation = bench.ok("plant::duty(q(\"2 mol\"), q(\"3 kJ/mol\")).derivation()");
        assert!(derivation.contains("plant.rhai, line 7"), "{derivation}");
        assert!(derivation.contains("plant.rhai, line 3"), "the constant: {derivation}");
        assert!(derivation.contains("cell-1, line 1"), "the arguments: {derivation}");
    });
}

#[test]
fn a_fault_in_a_module_names_file_and_line_and_the_cell_that_called() {
    on(|| {
        let mut bench =
            Bench::with(&[("plant.rhai", PLANT), ("upper.rhai", "fn upper_duty(x) {\n  plant::fails(x)\n}")]);
        let fault = bench.cell("let a = 1;\nupper::upper_duty(q(\"3 K\"))").unwrap_err();
        let place = fault.place().unwrap();
        assert_eq!((&*place.cell, place.line), ("plant.rhai", 7), "{fault}");
        let text = fault.to_string();
        for part in [
            "in: duty, called at plant.rhai, line 14",
            "in: fails, called at upper.rhai, line 2",
            "in: upper_duty, called at cell-1, line 2",
        ] {
            assert!(text.contains(part), "{part} is not in\n{text}");
        }
    });
}

#[test]
fn a_failed_cell_leaves_no_module_behind() {
    on(|| {
        let mut bench = Bench::with(&[("plant.rhai", PLANT)]);
        bench.cell("plant::LOSS; throw \"planned\"").unwrap_err();
        assert!(bench.session.modules_used().is_empty());
        bench.ok("plant::LOSS");
        assert_eq!(bench.session.modules_used().keys().collect::<Vec<_>>(), ["plant.rhai"]);
        // Neither does one that was changed and used by a cell that fails.
        bench.write("plant.rhai", "fn other() { 7 }");
        bench.cell("plant::other(); throw \"planned\"").unwrap_err();
        assert_eq!(*bench.session.modules_used()["plant.rhai"], *PLANT.as_bytes());
        bench.write("plant.rhai", PLANT);
        assert_eq!(bench.ok("plant::LOSS.value(\"kJ\")"), "2.0");
        // And an expression beside the cells keeps nothing at all.
        let mut bench = Bench::with(&[("plant.rhai", PLANT)]);
        bench.session.evaluate("plant::LOSS").unwrap();
        assert!(bench.session.modules_used().is_empty());
    });
}

#[test]
fn a_file_that_changed_is_used_as_it_stands_and_the_output_says_so() {
    on(|| {
        let mut bench = Bench::with(&[
            ("low.rhai", "const A = 1;\nfn a() { global::A }"),
            ("top.rhai", "const B = low::A;\nfn b() { low::a() + global::B }"),
        ]);
        bench.ok("fn sum() { top::b() }");
        assert_eq!(bench.ok("sum()"), "2");
        assert_eq!(bench.heard.0, "");
        bench.write("low.rhai", "const A = 5;\nfn a() { global::A }");
        // Its constant was computed from the changed one, so the module above is read again as well.
        assert_eq!(bench.ok("sum()"), "10");
        assert!(
            bench.heard.0.starts_with("low.rhai was changed since cell-1 loaded it: from cell-3 on"),
            "{}",
            bench.heard.0
        );
        assert!(!bench.heard.0.contains("top.rhai"));
        let told = bench.heard.0.len();
        assert_eq!(bench.ok("sum()"), "10");
        assert_eq!(bench.heard.0.len(), told, "it is said once");
        // A file that was taken away is missed where it is named.
        std::fs::remove_file(bench.path().join("low.rhai")).unwrap();
        assert_eq!(bench.cell("low::a()").unwrap_err().code(), "unknown-module");
    });
}

#[test]
fn a_cell_that_names_a_module_which_is_not_there_does_not_begin() {
    on(|| {
        let mut bench = Bench::with(&[("plant.rhai", PLANT)]);
        let fault = bench.cell("print(\"begun\");\ntry { plants::LOSS } catch { }").unwrap_err();
        assert_eq!((fault.code(), fault.place().unwrap().line), ("unknown-module", 2));
        assert!(fault.hint().starts_with("did you mean plant,"), "{}", fault.hint());
        assert_eq!(bench.heard.0, "");
    });
}

#[test]
fn a_circle_is_named() {
    on(|| {
        let mut bench = Bench::with(&[
            ("a.rhai", "fn f() { b::f() }"),
            ("b.rhai", "fn f() { c::f() }"),
            ("c.rhai", "fn f() {\n b::f() }"),
            ("own.rhai", "fn f() { own::g() }\nfn g() { 1 }"),
        ]);
        let fault = bench.cell("a::f()").unwrap_err();
        assert_eq!(
            (fault.code(), fault.message()),
            ("module-circle", "modules use each other in a circle: b -> c -> b")
        );
        assert!(
            fault.to_string().contains("at: c.rhai, line 2")
                && fault.to_string().contains("module a, called at cell-1")
        );
        let fault = bench.cell("own::f()").unwrap_err();
        assert_eq!(fault.code(), "module-circle");
        assert!(fault.hint().contains("bare names"));
    });
}

#[test]
fn a_module_sees_itself_and_the_library_and_nothing_of_the_cells() {
    on(|| {
        let mut bench = Bench::with(&[
            ("m.rhai", "fn f() { helper() }"),
            ("n.rhai", "fn f() { x }"),
            ("a.rhai", "fn f(x) { Fn(\"helper\").call(x) }"),
            ("b.rhai", "fn f(x) { x.helper() }"),
            ("c.rhai", "fn f(x) { let name = \"helper\"; Fn(name).call() }"),
            (
                "o.rhai",
                "fn f() { shift_of(\"450 degC\") }\nfn shift_of(T) {\n  reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\").enthalpy(T) }",
            ),
        ]);
        bench.ok("let x = 1; fn helper() { 1 } fn helper(x) { x }");
        assert_eq!(bench.cell("m::f()").unwrap_err().code(), "module-calls-outside");
        // Nor in ways that the engine resolves only when they run.
        for by in ["a", "b", "c"] {
            assert_eq!(bench.cell(&format!("{by}::f(1)")).unwrap_err().code(), "module-calls-outside", "{by}");
        }
        let fault = bench.cell("n::f()").unwrap_err();
        assert_eq!((fault.code(), &*fault.place().unwrap().cell), ("unknown-variable", "n.rhai"));
        let direct = bench.ok("reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\").enthalpy(\"450 degC\").value(\"J/mol\")");
        assert_eq!(bench.ok("o::f().value(\"J/mol\")"), direct);
    });
}

#[test]
fn what_a_method_assumes_stands_in_the_report_of_the_cell() {
    on(|| {
        let mut bench = Bench::with(&[(
            "plant.rhai",
            "// Heat to the cooler.\nfn duty(x) {\n  assume(x, \"no-fouling\", \"the cooler is clean\", \"0.4 kJ\")\n}",
        )]);
        bench.ok("report(\"duty\", plant::duty(q(\"12.5(3) kJ\")))");
        let reports = bench.session.reports();
        let row = reports[0].record.assumptions.iter().find(|row| row.id == "no-fouling").unwrap();
        assert!(row.price.as_deref().is_some_and(|price| price == "0.4"), "{row:?}");
    });
}

#[test]
fn many_cells_with_functions_do_not_lose_a_module() {
    on(|| {
        let mut bench = Bench::with(&[("plant.rhai", PLANT)]);
        bench.ok("fn kept() { plant::LOSS.value(\"kJ\") }");
        // The engine is built anew after some dozens of cells with functions.
        for number in 0..200 {
            bench.ok(&format!("fn f() {{ {number} }}"));
        }
        assert_eq!(bench.ok("kept()"), "2.0");
    });
}

#[test]
fn the_methods_of_the_demo_plant_say_what_they_rest_on_and_compute_what_they_say() {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("notebooks");
    let text = std::fs::read_to_string(folder.join("plant.rhai")).unwrap();
    for item in hessbook::script::module_text::read("plant.rhai", &text).unwrap() {
        let parts =
            if item.arguments.is_some() { vec!["Derivation:", "Conditions:", "Source:"] } else { vec!["Source:"] };
        for part in parts {
            assert!(item.comment.lines().any(|line| line.starts_with(part)), "{}: {part}", item.name);
        }
    }
    on(|| {
        let mut bench = Bench::with(&[]);
        bench.session.set_folder(folder);
        // With one route alone a mole takes up the enthalpy of its reaction; half-way it is the mean of both.
        bench.ok("let T = \"500 K\"; let n = exact(\"1 mol[methanol]/s\");
            let one = reaction(\"CO(g) + 2 H2(g) -> methanol(g)\").enthalpy(T).value(\"kJ/mol\");
            let other = reaction(\"CO2(g) + 3 H2(g) -> methanol(g) + H2O(g)\").enthalpy(T).value(\"kJ/mol\");
            let duty = |x| plant::reactor_duty(n, x, T).value(\"kW\");
            for pair in [[duty.call(0), one], [duty.call(1), other], [duty.call(0.5), (one + other) / 2]] {
                // A few products and sums of doubles.
                require((pair[0] - pair[1]).abs() < 1e-12 * pair[1].abs(), `${pair}`);
            }");
        bench.ok("let loss = plant::shell_loss(q(\"64 degC\"), q(\"21 degC\")).value(\"W\");
            // 18.5 W/K times 43 K.
            require((loss - 795.5).abs() < 1e-9, `${loss}`)");
        // 1 kg of water from 20 to 30 degC takes up 41.8 kJ: cp is 4.18 kJ/(kg K) there, to the digits given (IAPWS-95, from
        // memory: 4.184 at 20 degC, 4.180 at 30 degC).
        bench.ok("let duty = plant::cooling_duty(exact(\"1 kg[H2O]/s\"), exact(\"20 degC\"), exact(\"30 degC\"));
            require((duty.value(\"kW\") - 41.8).abs() < 0.05, `${duty}`)");
    });
}
