//! What functions of the host share while cells run: the session's own state, the host, the stop flag.
//!
//! [`Shared`] is the handle that every registered function may keep a clone of. The surprise: [`State`] is copied
//! before each cell and put back when the cell fails, so whatever must vanish with a failed cell belongs in it and
//! must not share mutable insides between copies.

use std::cell::{Cell, OnceCell, Ref, RefCell, RefMut};
use std::collections::{BTreeMap, BTreeSet};
use std::fmt;
use std::path::PathBuf;
use std::rc::Rc;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use rhai::{NativeCallContext, Position};

use crate::data::catalog::Catalog;
use crate::data::own::Own;
use crate::fault::{Explain, Fault, Place};
use crate::model::card::References;
use crate::model::review::Dealing;
use crate::quantity::Quantity;
use crate::render::Bundle;
use crate::script::files::Beside;
use crate::script::host::{Host, HostSlot};
use crate::script::modules::LoadedModule;
use crate::script::prepare::Shifts;
use crate::script::tables::Writes;
use crate::script::words::Library;
use crate::script::{engine, memory};

/// The part of a session that functions of the host change. Committed with a cell that succeeds, else put back.
#[derive(Clone, Debug, Default)]
pub struct State {
    /// The cell being run, or the last one that was.
    pub cell: Rc<str>,
    /// How many inputs the session has numbered so far. Never taken back to 0: one number is one evaluation, or two readings
    /// made by one function would be taken for one figure.
    ordinal: u64,
    /// Reported results, in the order of their first report.
    pub reports: Vec<Reported>,
    /// What was decided about assumptions, in order.
    pub dealings: Vec<Dealing>,
    /// Declared inputs, in order.
    pub parameters: Vec<Parameter>,
    /// Datasets read beside the notebook, in the order in which they lie over each other.
    pub loaded: Vec<Loaded>,
    /// Modules in use, by name.
    pub modules: BTreeMap<String, LoadedModule>,
    /// What formulas look up once datasets were loaded: shared, and never changed inside.
    overlay: Option<Rc<References>>,
}

/// A dataset read beside the notebook.
#[derive(Clone, Debug)]
pub struct Loaded {
    pub cell: Rc<str>,
    /// As the cell named it.
    pub file: String,
    pub own: Rc<Own>,
    /// The file as it was read, for a seal.
    pub bytes: Rc<[u8]>,
}

/// A reported result.
#[derive(Clone, Debug)]
pub struct Reported {
    pub label: String,
    pub value: Quantity,
    pub cell: Rc<str>,
}

/// A declared input with the value in force.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Parameter {
    pub name: String,
    pub written: String,
    /// Whether it was set from outside.
    pub set: bool,
    pub cell: Rc<str>,
}

impl State {
    /// The state as a cell finds it.
    pub fn enter(&mut self, cell: &str) {
        self.cell = cell.into();
        // A cell that is run again says anew what it reports and declares; what it no longer says is gone.
        self.reports.retain(|one| &*one.cell != cell);
        self.parameters.retain(|one| &*one.cell != cell);
        self.dealings.retain(|one| one.cell != cell);
        let before = self.loaded.len();
        self.loaded.retain(|one| &*one.cell != cell);
        if self.loaded.len() != before {
            self.overlay = None; // Laid anew by `Shared::enter`.
        }
    }

    /// The next number, from 1.
    pub fn next_ordinal(&mut self) -> u64 {
        self.ordinal += 1;
        self.ordinal
    }

    /// Numbers up to this one were given out elsewhere.
    pub fn skip_ordinals_to(&mut self, last: u64) {
        self.ordinal = self.ordinal.max(last);
    }
}

/// Why a cell was ended from outside.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Halt {
    Interrupted,
    OutOfMemory { limit: usize },
}

impl fmt::Display for Halt {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Halt::Interrupted => write!(f, "the cell was interrupted; nothing of it was kept"),
            Halt::OutOfMemory { limit } => {
                write!(f, "the cell wants more than {} MiB of memory; nothing of it was kept", limit >> 20)
            }
        }
    }
}

impl Explain for Halt {
    fn code(&self) -> &'static str {
        match self {
            Halt::Interrupted => "interrupted",
            Halt::OutOfMemory { .. } => "out-of-memory-limit",
        }
    }

    fn hint(&self) -> String {
        match self {
            Halt::Interrupted => "run it again when you want its result".to_owned(),
            Halt::OutOfMemory { .. } => {
                "look for a list or text that grows without end, or split the work over several cells".to_owned()
            }
        }
    }
}

/// Handle on what a session shares with the functions it registers. Clones are the same thing.
#[derive(Clone)]
pub struct Shared {
    state: Rc<RefCell<State>>,
    pub host: HostSlot,
    /// What the running cell will have written.
    pub writes: Writes,
    pub beside: Beside,
    stop: Arc<AtomicBool>,
    references: Rc<References>,
    folder: Rc<RefCell<PathBuf>>,
    /// Values of parameters that were set from outside, by name.
    settings: Rc<RefCell<BTreeMap<String, String>>>,
    shifts: Rc<RefCell<Shifts>>,
    /// The source that places were last asked of, since every step of arithmetic asks for one.
    source: Rc<RefCell<Arc<str>>>,
    /// Functions that cells have defined, with the numbers of arguments they take.
    defined: Rc<RefCell<BTreeMap<String, BTreeSet<usize>>>>,
    library: Rc<OnceCell<Library>>,
    limit: Rc<Cell<usize>>,
    /// Level of [`memory::held`] that ends the running cell.
    ceiling: Rc<Cell<isize>>,
    /// Why the running cell was told to end: a native function that swallows errors must not swallow this one.
    halt: Rc<Cell<Option<Halt>>>,
}

impl Shared {
    /// `stop` ends the running cell when it becomes true; `limit` is the memory a cell may take, in bytes.
    pub fn new(stop: Arc<AtomicBool>, limit: usize, references: References) -> Self {
        Shared {
            state: Rc::default(),
            host: HostSlot::default(),
            writes: Writes::default(),
            beside: Beside::default(),
            stop,
            references: Rc::new(references),
            folder: Rc::default(),
            settings: Rc::default(),
            shifts: Rc::default(),
            source: Rc::new(RefCell::new("".into())),
            defined: Rc::default(),
            library: Rc::default(),
            limit: Rc::new(Cell::new(limit)),
            ceiling: Rc::new(Cell::new(isize::MAX)),
            halt: Rc::default(),
        }
    }

    /// What formulas look up.
    pub fn references(&self) -> Rc<References> {
        self.state.borrow().overlay.clone().unwrap_or_else(|| Rc::clone(&self.references))
    }

    /// The state as a cell finds it.
    pub fn enter(&self, cell: &str) {
        self.state_mut().enter(cell);
        let loaded = self.state().loaded.clone();
        if loaded.is_empty() || self.state().overlay.is_some() {
            return;
        }
        let mut catalog: Option<Catalog> = None;
        for one in &loaded {
            let base = catalog.as_ref().unwrap_or_else(|| self.references.catalog());
            // It was laid over a larger catalogue before, which held all that this one holds.
            if let Ok((next, _)) = base.overlaid(&one.own) {
                catalog = Some(next);
            }
        }
        let references = catalog.map(|catalog| References::of(Arc::new(catalog), self.references.constants));
        self.state_mut().overlay = references.map(Rc::new);
    }

    /// Lays a dataset over what formulas look up; `catalog` is what that gives.
    pub fn lay_over(&self, loaded: Loaded, catalog: Catalog) {
        let references = References::of(Arc::new(catalog), self.references.constants);
        let mut state = self.state_mut();
        state.loaded.push(loaded);
        state.overlay = Some(Rc::new(references));
    }

    /// The folder of the notebook, from which the names of files count.
    pub fn folder(&self) -> PathBuf {
        self.folder.borrow().clone()
    }

    pub fn set_folder(&self, folder: PathBuf) {
        self.folder.replace(folder);
    }

    /// What a parameter was set to from outside.
    pub fn setting(&self, name: &str) -> Option<String> {
        self.settings.borrow().get(name).cloned()
    }

    /// Names of all parameters set from outside.
    pub fn set_names(&self) -> Vec<String> {
        self.settings.borrow().keys().cloned().collect()
    }

    /// Sets parameters from outside, in place of all that were set before.
    pub fn set_parameters(&self, settings: BTreeMap<String, String>) {
        self.settings.replace(settings);
    }

    pub fn state(&self) -> Ref<'_, State> {
        self.state.borrow()
    }

    pub fn state_mut(&self) -> RefMut<'_, State> {
        self.state.borrow_mut()
    }

    /// Puts an earlier state back.
    pub fn restore(&self, earlier: State) {
        self.state.replace(earlier);
    }

    /// Shows something in the output of the running cell, at once.
    pub fn show(&self, bundle: &Bundle, id: Option<&str>) {
        self.host.with(|host: &mut dyn Host| host.show(bundle, id));
    }

    /// Changes what was shown under an id, wherever it stands.
    pub fn update(&self, bundle: &Bundle, id: &str) {
        self.host.with(|host: &mut dyn Host| host.update(bundle, id));
    }

    /// Writes to the output of the running cell, at once.
    pub fn write(&self, stderr: bool, text: &str) {
        self.host.with(|host: &mut dyn Host| host.write(stderr, text));
    }

    /// Why the running cell must end now, if it must. Cheap: asked before every step of a script, and to be asked
    /// by every native loop that may take longer than a millisecond.
    pub fn halted(&self) -> Option<Halt> {
        let halt = if self.stop.load(Ordering::Relaxed) {
            Halt::Interrupted
        } else if memory::held() > self.ceiling.get() {
            Halt::OutOfMemory { limit: self.limit.get() }
        } else {
            return None;
        };
        self.halt.set(Some(halt));
        Some(halt)
    }

    /// Why the cell that ran was told to end, whatever became of that.
    pub fn halt(&self) -> Option<Halt> {
        self.halt.get()
    }

    /// Refuses `bytes` that would pass the limit, for functions that take much memory in one step: between steps
    /// [`Shared::halted`] is asked, within one nobody is.
    pub fn room_for(&self, bytes: usize) -> Result<(), Halt> {
        let after = isize::try_from(bytes).ok().and_then(|bytes| memory::held().checked_add(bytes));
        if after.is_some_and(|after| after <= self.ceiling.get()) {
            Ok(())
        } else {
            Err(Halt::OutOfMemory { limit: self.limit.get() })
        }
    }

    /// Changes what a cell may take, from the next cell on.
    pub fn set_memory_limit(&self, bytes: usize) {
        self.limit.set(bytes);
    }

    /// Counts memory from here: the start of a cell, which nobody has told to end yet.
    pub fn start_cell(&self) {
        self.halt.set(None);
        self.writes.forget();
        self.ceiling.set(memory::held().saturating_add_unsigned(self.limit.get()));
    }

    /// Every function of the library. Gathered at the first question, since only mistakes and definitions ask.
    pub fn library(&self) -> &Library {
        self.library.get_or_init(|| Library::of(&engine::build(self)))
    }

    /// Replaces what is known of the functions that cells have defined.
    pub fn set_defined(&self, defined: BTreeMap<String, BTreeSet<usize>>) {
        self.defined.replace(defined);
    }

    /// The numbers of arguments that a function of a cell takes, if there is such a function.
    pub fn defined(&self, name: &str) -> Option<Vec<usize>> {
        self.defined.borrow().get(name).map(|counts| counts.iter().copied().collect())
    }

    pub fn defined_names(&self) -> Vec<String> {
        self.defined.borrow().keys().cloned().collect()
    }

    /// The module that was read from a file of this name, if it is in use.
    pub fn module_of(&self, file: &str) -> Option<String> {
        let state = self.state.borrow();
        state.modules.iter().find(|(_, module)| module.file == file).map(|(name, _)| name.clone())
    }

    pub fn shifts_mut(&self) -> RefMut<'_, Shifts> {
        self.shifts.borrow_mut()
    }

    /// A position in a prepared text as a place in the text that the user wrote.
    pub fn place(&self, source: &str, position: Position) -> Option<Place> {
        let line = position.line()?;
        let column = self.shifts.borrow().written(source, line, position.position().unwrap_or(0));
        let counted = |n: usize| u32::try_from(n).unwrap_or(u32::MAX);
        Some(Place { cell: self.source(source), line: counted(line), column: counted(column) })
    }

    fn source(&self, name: &str) -> Arc<str> {
        let mut last = self.source.borrow_mut();
        if **last != *name {
            *last = name.into();
        }
        Arc::clone(&last)
    }

    /// The session a running native function belongs to, and the place it was called from.
    pub fn of(context: &NativeCallContext<'_>) -> Option<Shared> {
        context.tag().and_then(|tag| tag.read_lock::<Shared>().map(|shared| shared.clone()))
    }
}

/// The place a native function was called from.
pub fn place_of(context: &NativeCallContext<'_>) -> Option<Place> {
    let shared = context.tag()?.read_lock::<Shared>()?;
    shared.place(context.call_source().unwrap_or(""), context.call_position())
}

/// A fault that a native function raises, at the place it was called from.
pub fn fault_at(context: &NativeCallContext<'_>, fault: impl Into<Fault>) -> Fault {
    fault.into().at(place_of(context))
}

#[cfg(test)]
mod tests {
    use rhai::Dynamic;

    use super::*;
    use crate::script::fault::raise;
    use crate::units::constants;

    #[derive(Default)]
    struct Shows(Vec<String>);

    impl Host for Shows {
        fn write(&mut self, _stderr: bool, _text: &str) {}

        fn show(&mut self, bundle: &Bundle, _id: Option<&str>) {
            self.0.push(bundle.plain().to_owned());
        }

        fn update(&mut self, _bundle: &Bundle, _id: &str) {}
    }

    #[test]
    fn a_native_function_reaches_place_state_and_host() {
        let shared = Shared::new(Arc::default(), 1 << 30, References::new(constants::current()));
        let mut engine = engine::build(&shared);
        let inside = shared.clone();
        engine.register_fn("number_here", move |context: NativeCallContext<'_>| {
            let ordinal = inside.state_mut().next_ordinal();
            let place = place_of(&context).map(|place| place.to_string()).unwrap_or_default();
            inside.show(&Bundle::text(format!("{ordinal} at {place}")), None);
        });
        // Text is inserted behind `catch (e) {`, and the column is still the one that was written.
        let code = "number_here();\ntry { 1 } catch (e) { 2 } number_here()";
        let (ast, _) = engine::compile(&engine, &shared, "cell-4", code).unwrap();
        let mut host = Shows::default();
        shared.start_cell();
        shared.state_mut().enter("cell-4");
        assert!(shared.host.lend(&mut host, || engine.eval_ast::<Dynamic>(&ast)).is_ok());
        assert_eq!(host.0, ["1 at cell-4, line 1, column 1", "2 at cell-4, line 2, column 27"]);
        assert_eq!(&*shared.state().cell, "cell-4");
        shared.state_mut().enter("cell-5");
        assert_eq!(shared.state_mut().next_ordinal(), 3, "numbers are not given out twice");
    }

    #[test]
    fn a_native_fault_knows_where_it_was_raised_even_when_caught() {
        let shared = Shared::new(Arc::default(), 1 << 30, References::new(constants::current()));
        let mut engine = engine::build(&shared);
        engine.register_fn("refuse", |context: NativeCallContext<'_>| -> Result<Dynamic, Box<rhai::EvalAltResult>> {
            Err(raise(fault_at(&context, Fault::new("some-code", "no", "go on"))))
        });
        let code = "let place = \"\"; try { refuse() } catch (e) { place = e.place; } place";
        let (ast, _) = engine::compile(&engine, &shared, "cell-1", code).unwrap();
        assert_eq!(engine.eval_ast::<String>(&ast).unwrap(), "cell-1, line 1, column 23");
    }
}
