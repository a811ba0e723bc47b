//! One analyst's session: runs a cell to an outcome or to nothing.
//!
//! [`Session`] holds the variables and functions of the cells that succeeded. The surprise: it lives on one thread
//! (its values are counted without locks), and that thread must have a large stack: [`on_big_stack`].

pub mod cell;
pub mod closures;
pub mod outcome;

use std::collections::{BTreeMap, BTreeSet};
use std::path::PathBuf;
use std::rc::Rc;
use std::sync::Arc;
use std::sync::atomic::AtomicBool;

use rhai::{Dynamic, Engine, FnPtr, Module, Scope};

use crate::fault::Fault;
use crate::model::card::References;
use crate::model::review::Dealing;
use crate::render::Bundle;
use crate::render::report::Report;
use crate::script::literals::Literals;
use crate::script::state::{Loaded, Parameter, Reported, Shared};
use crate::script::token::{Ending, tokens};
use crate::script::{engine, modules, verbs, words};
use crate::units::constants;
use closures::SharedValues;
use outcome::{Completeness, Host, Outcome};

/// Memory that one cell may take beyond what the session holds when it starts.
const MEMORY_LIMIT: usize = 1 << 30;

/// Stack for evaluation: the deepest recursion that the engine allows needs a fraction of it also in debug builds,
/// and what is not used costs nothing.
const STACK: usize = 256 << 20;

/// Sets of functions that may pile up over those in use before the engine is built anew: each slows every cell a bit.
const SPARE_MODULES: usize = 64;

/// The functions of one cell that succeeded.
struct CellModule {
    functions: rhai::Shared<Module>,
    /// Names with numbers of arguments; closures apart.
    named: Vec<(String, usize)>,
    closures: BTreeSet<String>,
}

/// Variables, functions and shared state of the cells that succeeded.
pub struct Session {
    engine: Engine,
    shared: Shared,
    scope: Scope<'static>,
    modules: Vec<CellModule>,
    literals: Literals,
    /// Number of modules at which the next look for unused ones is due.
    rebuild_at: usize,
}

impl Session {
    /// `stop` ends the running cell when it becomes true; whoever sets it clears it.
    pub fn new(stop: Arc<AtomicBool>) -> Self {
        Session::with(stop, References::new(constants::current()))
    }

    /// A session whose formulas look up substances and constants there: other records, or another constant set.
    pub fn with(stop: Arc<AtomicBool>, references: References) -> Self {
        let shared = Shared::new(stop, MEMORY_LIMIT, references);
        let engine = engine::build(&shared);
        Session {
            engine,
            shared,
            scope: Scope::new(),
            modules: Vec::new(),
            literals: Literals::default(),
            rebuild_at: SPARE_MODULES,
        }
    }

    /// Sets what a cell may take beyond what the session holds when it starts; 1 GiB at first.
    pub fn set_memory_limit(&mut self, bytes: usize) {
        self.shared.set_memory_limit(bytes);
    }

    /// Runs one cell. `cell` names it in places and faults: `cell-3`, or the file name of a script. A cell that fails
    /// leaves the session as it was; what it wrote and showed before has reached the host.
    pub fn run_cell(&mut self, cell: &str, code: &str, host: &mut dyn Host) -> Outcome {
        match self.run(cell, code, host, cell::Keep::Everything) {
            Ok(shown) => Outcome { shown, result: Ok(()) },
            Err(fault) => Outcome { shown: None, result: Err(fault) },
        }
    }

    /// Evaluates an expression beside the cells, without keeping anything: a front end's `user_expressions`. What it
    /// prints is dropped.
    pub fn evaluate(&mut self, code: &str) -> Result<Bundle, Fault> {
        struct Silent;
        impl Host for Silent {
            fn write(&mut self, _stderr: bool, _text: &str) {}
            fn show(&mut self, _bundle: &Bundle, _id: Option<&str>) {}
            fn update(&mut self, _bundle: &Bundle, _id: &str) {}
        }
        let shown = self.run("expression", code, &mut Silent, cell::Keep::Nothing)?;
        Ok(shown.unwrap_or_else(|| Bundle::text("")))
    }

    /// Sets the folder in which a notebook's files are looked for; the process's own at first.
    pub fn set_folder(&mut self, folder: PathBuf) {
        self.shared.set_folder(folder);
    }

    /// Keeps the disk out: cells read these contents in place of the files of those names, and what they write is kept in
    /// memory. Other files are still read.
    pub fn set_apart(&mut self, files: BTreeMap<String, Arc<[u8]>>) {
        self.shared.beside.set_apart(files);
    }

    /// Every file beside the notebook that cells have read, with its content.
    pub fn files_read(&self) -> BTreeMap<String, Arc<[u8]>> {
        self.shared.beside.read()
    }

    /// The text of every module in use, by the name of its file.
    pub fn modules_used(&self) -> BTreeMap<String, Arc<[u8]>> {
        let state = self.shared.state();
        state.modules.values().map(|module| (module.file.clone(), Arc::clone(&module.bytes))).collect()
    }

    /// Datasets that cells have loaded, in the order in which they lie over each other.
    pub fn loaded(&self) -> Vec<Loaded> {
        self.shared.state().loaded.clone()
    }

    /// Sets declared parameters from outside, before the first cell runs.
    pub fn set_parameters(&mut self, settings: BTreeMap<String, String>) {
        self.shared.set_parameters(settings);
    }

    /// The declared parameters with the values in force.
    pub fn parameters(&self) -> Vec<Parameter> {
        self.shared.state().parameters.clone()
    }

    /// A fault for a parameter that was set from outside and that no cell has declared.
    pub fn unused_setting(&self) -> Option<Fault> {
        let declared: Vec<String> = self.parameters().into_iter().map(|parameter| parameter.name).collect();
        let unused = self.shared.set_names().into_iter().find(|name| !declared.contains(name))?;
        let hint = if declared.is_empty() {
            "declare it in a cell, as in `parameter(\"outlet\", \"450 degC\")`".to_owned()
        } else {
            format!("declared are {}", declared.join(", "))
        };
        Some(Fault::new("parameter-undeclared", format!("no cell declares a parameter `{unused}`"), hint))
    }

    /// Every reported result, its assumptions tested, with the decisions in force.
    pub fn reports(&self) -> Vec<Report> {
        verbs::reports(&self.shared)
    }

    /// The reported values themselves, with their history, in the order of [`Session::reports`].
    pub fn reported(&self) -> Vec<Reported> {
        self.shared.state().reports.clone()
    }

    /// What was decided about assumptions, in order.
    pub fn dealings(&self) -> Vec<Dealing> {
        self.shared.state().dealings.clone()
    }

    /// What formulas look up.
    pub fn references(&self) -> Rc<References> {
        self.shared.references()
    }

    /// Whether the text is a whole cell, for front ends that ask before running it.
    pub fn completeness(&self, code: &str) -> Completeness {
        match tokens(code).1 {
            // The engine takes an open comment for the end of the text.
            Ending::Comment | Ending::Template | Ending::CarriedText | Ending::RawText => {
                return Completeness::Incomplete;
            }
            Ending::BrokenText => return Completeness::Invalid,
            Ending::Clean => {}
        }
        let Err(error) = self.engine.compile(code) else { return Completeness::Complete };
        let position = error.position();
        let (last_line, last_column) = end_of(code);
        let at_end = position.line().is_none_or(|line| line > last_line)
            || (position.line() == Some(last_line) && position.position().is_some_and(|column| column > last_column));
        match error.err_type() {
            rhai::ParseErrorType::UnexpectedEOF => Completeness::Incomplete,
            // A comment that waits for its function.
            rhai::ParseErrorType::WrongDocComment if only_comment_follows(code, position.line()) => {
                Completeness::Incomplete
            }
            _ if at_end => Completeness::Incomplete,
            _ => Completeness::Invalid,
        }
    }

    /// Every value that the session keeps: what a failed cell must leave alone, and what may hold closures.
    fn values(&self) -> impl Iterator<Item = &Dynamic> {
        self.scope.iter_raw().map(|(_, _, value)| value)
    }

    /// Adds the functions of a cell: they win over older ones of the same name, also where those are called already.
    fn add_functions(&mut self, module: CellModule) {
        publish(&mut self.engine, &module);
        self.modules.push(module);
        if self.modules.len() >= self.rebuild_at {
            self.drop_unused_functions();
        }
        self.shared.set_defined(self.defined());
    }

    /// Names of the functions that cells have defined, with the numbers of arguments they take.
    fn defined(&self) -> BTreeMap<String, BTreeSet<usize>> {
        let mut defined: BTreeMap<String, BTreeSet<usize>> = BTreeMap::new();
        for (name, count) in self.modules.iter().flat_map(|module| &module.named) {
            defined.entry(name.clone()).or_default().insert(*count);
        }
        defined
    }

    /// Builds the engine anew with the modules that can still be called. The engine has no way to take one out.
    fn drop_unused_functions(&mut self) {
        let held = SharedValues::of(self.values());
        let mut newer: BTreeSet<(String, usize)> = BTreeSet::new();
        let mut used = Vec::new();
        for module in std::mem::take(&mut self.modules).into_iter().rev() {
            // A closure inside a function's body lies in that function's own module.
            let mut called = module.closures.iter().any(|closure| held.closures().contains(closure));
            for name in &module.named {
                called |= newer.insert(name.clone());
            }
            if called {
                used.push(module);
            }
        }
        used.reverse();
        self.engine = engine::build(&self.shared);
        self.literals.repeat(&mut self.engine, &self.shared);
        modules::repeat(&mut self.engine, &self.shared);
        for module in &used {
            publish(&mut self.engine, module);
        }
        self.modules = used;
        self.rebuild_at = 2 * self.modules.len() + SPARE_MODULES;
    }
}

/// Makes the functions of a cell callable, and their names usable as values in later cells: the engine itself knows a
/// name as a value in the defining cell only.
fn publish(engine: &mut Engine, module: &CellModule) {
    engine.register_global_module(module.functions.clone());
    let mut names = Module::new();
    for (name, _) in &module.named {
        if let Ok(pointer) = FnPtr::new(name.as_str()) {
            names.set_var(name.as_str(), pointer);
        }
    }
    if !module.named.is_empty() {
        engine.register_global_module(names.into());
    }
}

/// Last line of a text and the column of its last character there, both counted from 1.
fn end_of(code: &str) -> (usize, usize) {
    let line = code.matches('\n').count() + 1;
    let column = code.rsplit('\n').next().unwrap_or("").chars().count();
    (line, column)
}

/// Whether nothing but comments stands from a line on.
fn only_comment_follows(code: &str, line: Option<usize>) -> bool {
    let rest: Vec<&str> = code.lines().skip(line.unwrap_or(1).saturating_sub(1)).collect();
    tokens(&rest.join("\n")).0.is_empty()
}

/// Runs `work` on a thread whose stack carries the deepest recursion a script may reach. A panic goes on in the
/// caller. The kernel has such a thread of its own; the runner and tests call this.
pub fn on_big_stack<R: Send>(work: impl FnOnce() -> R + Send) -> R {
    std::thread::scope(|threads| {
        let thread = std::thread::Builder::new()
            .name("evaluation".to_owned())
            .stack_size(STACK)
            .spawn_scoped(threads, work)
            .expect("the system gives a thread with 256 MiB of address space");
        thread.join().unwrap_or_else(|panic| std::panic::resume_unwind(panic))
    })
}

/// Name of a function for the session: closures are known by what holds them.
fn is_named(name: &str) -> bool {
    !words::is_closure(name)
}

#[cfg(test)]
mod tests {
    use super::*;

    struct Silent;

    impl Host for Silent {
        fn write(&mut self, _stderr: bool, _text: &str) {}

        fn show(&mut self, _bundle: &Bundle, _id: Option<&str>) {}

        fn update(&mut self, _bundle: &Bundle, _id: &str) {}
    }

    #[test]
    fn a_name_defined_again_takes_one_place() {
        on_big_stack(|| {
            let mut session = Session::new(Arc::default());
            for number in 0..20 {
                let outcome =
                    session.run_cell("cell", &format!("let x = {number}; let x = x + 1; let y = x"), &mut Silent);
                assert_eq!(outcome.result, Ok(()));
            }
            assert_eq!(session.scope.len(), 2);
        });
    }

    #[test]
    fn functions_that_nothing_can_call_are_dropped() {
        on_big_stack(|| {
            let mut session = Session::new(Arc::default());
            for number in 0..10 * SPARE_MODULES {
                let outcome =
                    session.run_cell("cell", &format!("fn f() {{ {number} }} let g = |x| x + {number};"), &mut Silent);
                assert_eq!(outcome.result, Ok(()));
            }
            assert!(session.modules.len() < 2 * SPARE_MODULES, "{} modules are kept", session.modules.len());
        });
    }

    #[test]
    #[should_panic(expected = "planned by this test")]
    fn a_panic_on_the_big_stack_reaches_the_caller() {
        on_big_stack(|| panic!("planned by this test"));
    }
}
