//! Modules: in-house methods in files beside a notebook, used as `plant::duty(x)` from `plant.rhai`.
//!
//! [`provide`] looks at what a cell is about to use and loads it, with what that uses in turn; nothing is imported by
//! hand. The surprise: before every cell each module in use is compared with its file, and one that was changed is loaded
//! again with all that rest on it, so that a live session never goes on with a text that no longer stands in the folder; the
//! output of the cell says so.

use std::collections::{BTreeMap, BTreeSet};
use std::rc::Rc;
use std::sync::Arc;

use rhai::{Dynamic, Engine, Module, Scope};

use crate::fault::{Fault, Place};
use crate::script::fault::{Site, translate};
use crate::script::literals::Literals;
use crate::script::module_text::{self, ENDING, Item, ModuleRefusal, Use};
use crate::script::script_error::{ReservedName, ScriptError};
use crate::script::state::Shared;
use crate::script::{engine, files, words};
use crate::source::sha256;

/// A module in use.
#[derive(Clone, Debug)]
pub struct LoadedModule {
    pub file: String,
    pub bytes: Arc<[u8]>,
    /// The cell that loaded it as it is here.
    cell: Rc<str>,
    /// Digest of its text and of the texts of all modules that it uses.
    stamp: String,
    items: Rc<[Item]>,
    functions: rhai::Shared<Module>,
}

impl LoadedModule {
    /// Functions and constants that a cell may use.
    pub fn open(&self) -> impl Iterator<Item = &Item> {
        self.items.iter().filter(|item| !item.private)
    }

    pub fn has_constant(&self, name: &str) -> bool {
        self.items.iter().any(|item| item.name == name && item.arguments.is_none())
    }
}

/// Makes the modules that a cell names callable, and looks whether those in use are still what their files say. What was
/// loaded is entered in `touched`, also when this fails.
///
/// # Errors
/// A module is not there, is not readable as one, or uses itself by way of others.
pub fn provide(
    engine: &mut Engine,
    shared: &Shared,
    literals: &mut Literals,
    (cell, code): (&str, &str),
    touched: &mut Vec<String>,
) -> Result<(), Fault> {
    let named = module_text::uses(code);
    let in_use: Vec<String> = shared.state().modules.keys().cloned().collect();
    if named.is_empty() && in_use.is_empty() {
        return Ok(());
    }
    let mut loader = Loader { engine, shared, literals, touched, cell, stamps: BTreeMap::new(), path: Vec::new() };
    for one in &named {
        loader.named(one, cell)?;
    }
    for name in in_use {
        // A cell that does not name it can still reach it through a function, so its file counts as long as it is there.
        if files::module_bytes(shared, &file_of(&name)).is_ok() {
            loader.load(&name)?;
        }
    }
    Ok(())
}

/// Takes back what a failed cell has loaded: the state is the earlier one already, the engine follows it.
pub fn take_back(engine: &mut Engine, shared: &Shared, touched: &[String]) {
    for name in touched {
        let before = shared.state().modules.get(name).map(|module| module.functions.clone());
        // The engine has no way to forget a name; one without functions is loaded before it can be used again.
        engine.register_static_module(name, before.unwrap_or_else(|| Module::new().into()));
    }
}

/// Teaches an engine built anew what the one before knew.
pub fn repeat(engine: &mut Engine, shared: &Shared) {
    for (name, module) in &shared.state().modules {
        engine.register_static_module(name, module.functions.clone());
    }
}

/// The file of a module.
pub fn file_of(name: &str) -> String {
    format!("{name}{ENDING}")
}

struct Loader<'a> {
    engine: &'a mut Engine,
    shared: &'a Shared,
    literals: &'a mut Literals,
    touched: &'a mut Vec<String>,
    cell: &'a str,
    /// Of the modules that were looked at for this cell.
    stamps: BTreeMap<String, String>,
    /// Modules being loaded, each used by the one before it.
    path: Vec<String>,
}

fn counted(n: usize) -> u32 {
    u32::try_from(n).unwrap_or(u32::MAX)
}

impl Loader<'_> {
    /// Loads a module that a text names, and gives its stamp.
    fn named(&mut self, one: &Use, source: &str) -> Result<String, Fault> {
        let place = Some(Place { cell: source.into(), line: counted(one.line), column: counted(one.column) });
        self.load(&one.name).map_err(|fault| match fault.place() {
            None => fault.at(place),
            Some(_) => fault.within(format!("module {}", one.name), place),
        })
    }

    fn load(&mut self, name: &str) -> Result<String, Fault> {
        if let Some(known) = self.stamps.get(name) {
            return Ok(known.clone());
        }
        if let Some(first) = self.path.iter().position(|known| known == name) {
            let mut names = self.path[first..].to_vec();
            names.push(name.to_owned());
            return Err(ModuleRefusal::Circle { names }.into());
        }
        let file = file_of(name);
        let bytes = files::module_bytes(self.shared, &file)?;
        let text = match std::str::from_utf8(&bytes) {
            Ok(text) => text.strip_prefix('\u{feff}').unwrap_or(text).to_owned(),
            Err(_) => return Err(ModuleRefusal::NotText { file }.into()),
        };
        self.path.push(name.to_owned());
        let mut stamps = sha256(&bytes);
        for one in module_text::uses(&text) {
            stamps.push_str(&self.named(&one, &file)?);
        }
        self.path.pop();
        let stamp = sha256(stamps.as_bytes());
        let before = self.shared.state().modules.get(name).map(|module| {
            let changed = *module.bytes != *bytes;
            (module.stamp.clone(), changed.then(|| Rc::clone(&module.cell)))
        });
        if before.as_ref().is_none_or(|(known, _)| *known != stamp) {
            self.touched.push(name.to_owned());
            let (functions, items) = self.made(&file, &text)?;
            self.engine.register_static_module(name, functions.clone());
            if let Some((_, Some(cell))) = before {
                self.shared.write(
                    true,
                    &format!(
                        "{file} was changed since {cell} loaded it: from {} on it is used as it stands now, and values \
                         made before are from the earlier text\n",
                        self.cell
                    ),
                );
            }
            let loaded = LoadedModule {
                file,
                bytes: bytes.into(),
                cell: self.cell.into(),
                stamp: stamp.clone(),
                items: items.into(),
                functions,
            };
            self.shared.state_mut().modules.insert(name.to_owned(), loaded);
        }
        self.stamps.insert(name.to_owned(), stamp.clone());
        Ok(stamp)
    }

    /// Reads a module's text, evaluates its constants, and makes its functions callable.
    fn made(&mut self, file: &str, text: &str) -> Result<(rhai::Shared<Module>, Vec<Item>), Fault> {
        let at = |line: usize, column: usize| {
            Some(Place { cell: file.into(), line: counted(line), column: counted(column) })
        };
        let refused =
            |(refusal, line, column): (ModuleRefusal, usize, usize)| Fault::from(refusal).at(at(line, column));
        self.literals.provide(self.engine, self.shared, text);
        let (ast, _) = engine::compile(self.engine, self.shared, file, text)?;
        let items = module_text::read(file, text).map_err(refused)?;
        let library = self.shared.library();
        if let Some(item) = items.iter().find(|item| item.arguments.is_some() && library.holds(&item.name)) {
            return Err(Fault::from(ReservedName { name: item.name.clone() }).at(at(item.line, 0)));
        }
        if let Some((function, line, column)) = module_text::calls_outside(text, |name| library.holds(name)) {
            let own = items.iter().filter(|item| item.arguments.is_some()).map(|item| item.name.as_str());
            let near = words::nearest(&function, library.names().chain(own)).map(str::to_owned);
            let refusal = ModuleRefusal::CallsOutside { file: file.to_owned(), function, near };
            return Err(Fault::from(refusal).at(at(line, column)));
        }
        let failed =
            |error: Box<rhai::EvalAltResult>| translate(*error, Site { cell: file, shared: self.shared, scope: None });
        let mut scope = Scope::new();
        // A module's last statement is a definition, and gives nothing.
        let _: Dynamic = self.engine.eval_ast_with_scope(&mut scope, &ast).map_err(failed)?;
        let constants: BTreeSet<&str> =
            items.iter().filter(|item| item.arguments.is_none()).map(|item| item.name.as_str()).collect();
        // The engine throws the values of a module's statements away. They are kept, so that each figure is evaluated once:
        // the same figure read twice would be two inputs that know nothing of each other.
        let (mut kept, mut stub) = (Scope::new(), String::new());
        let mut values: Vec<(&str, Dynamic)> = Vec::new();
        for constant in constants {
            let Some(value) = scope.get(constant).map(Dynamic::flatten_clone) else { continue };
            kept.push_constant_dynamic(format!("kept_{constant}"), value.clone());
            stub.push_str(&format!("const {constant} = kept_{constant};"));
            values.push((constant, value));
        }
        let stub = self.engine.compile(&stub).map_err(|error| failed(Box::new(error.into())))?;
        let mut whole = stub.merge(&ast.clone_functions_only());
        whole.set_source(file);
        let mut module = Module::eval_ast_as_new(kept, &whole, self.engine).map_err(failed)?;
        for (constant, value) in values {
            module.set_var(constant, value);
        }
        module.set_id(file);
        module.build_index();
        Ok((module.into(), items))
    }
}

/// What is wrong with the name of a function or constant behind `module::`.
pub fn not_in_module(shared: &Shared, module: &str, name: &str, given: Option<usize>) -> ScriptError {
    let state = shared.state();
    let Some(loaded) = state.modules.get(module) else {
        return ScriptError::UnknownModule { name: module.to_owned(), near: None };
    };
    let open: Vec<&Item> = loaded.open().collect();
    let whole = |name: &str| format!("{module}::{name}");
    let counts: Vec<usize> =
        open.iter().filter(|item| item.name == name).filter_map(|item| item.arguments.as_ref().map(Vec::len)).collect();
    if let (false, Some(given)) = (counts.is_empty(), given) {
        let takes = counts.into_iter().map(|number| crate::script::script_error::count(number, "argument")).collect();
        return ScriptError::ArgumentCount { name: whole(name), given, takes };
    }
    let near = words::nearest(name, open.iter().map(|item| item.name.as_str())).map(whole);
    let has = open.iter().map(|item| item.name.clone()).collect();
    ScriptError::UnknownInModule { file: loaded.file.clone(), name: name.to_owned(), near, has }
}
