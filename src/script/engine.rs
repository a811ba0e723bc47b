//! The script engine, set up so that numbers are safe with it.
//!
//! [`build`] makes an engine, [`compile`] reads a text for it. Each setting and each registration cures a wrong
//! answer or a silence that was seen with the engine as it comes; `tests/session.rs` holds one test per trap.

use std::sync::Once;

use rhai::module_resolvers::DummyModuleResolver;
use rhai::{AST, Dynamic, Engine, OptimizationLevel};

use crate::fault::{Fault, Place};
use crate::script::fault::translate_syntax;
use crate::script::prepare::{Prepared, prepare};
use crate::script::script_error::CALL_LEVELS;
use crate::script::state::{Halt, Shared};
use crate::script::{bind, compare, curves, fault, files, guards, numbers, operators, show, tables, verbs};

/// Nesting of expressions; the engine's default refuses a sum of sixty terms inside a function.
const EXPRESSION_DEPTH: usize = 512;

/// An engine for one session, with the whole library and nothing that cells define.
pub fn build(shared: &Shared) -> Engine {
    fix_hashing();
    let mut engine = Engine::new();
    configure(&mut engine);
    connect(&mut engine, shared);
    register_language(&mut engine, shared);
    register_library(&mut engine, shared);
    engine
}

/// The order in which the engine lists functions, and the names it makes up, follow its hashing seed. Without a fixed
/// one they differ from run to run. To be called before any engine is made, since a later change leaves an engine that
/// no longer finds its functions.
pub fn fix_hashing() {
    static ONCE: Once = Once::new();
    ONCE.call_once(|| {
        // An error says that a seed was set before, which is as good as this one.
        let _ = rhai::config::hashing::set_hashing_seed(Some([0x6865, 0x7373, 0x626f, 0x6f6b]));
    });
}

fn configure(engine: &mut Engine) {
    // At any other level the engine puts constants of the notebook in the place of parameters with the same name.
    engine.set_optimization_level(OptimizationLevel::None);
    // Fast operators would bypass every operator registered below.
    engine.set_fast_operators(false);
    engine.set_max_call_levels(CALL_LEVELS);
    engine.set_max_expr_depths(EXPRESSION_DEPTH, EXPRESSION_DEPTH);
    // Else a mistyped name of a map's entry is nothing, without a word.
    engine.set_fail_on_invalid_map_property(true);
    engine.disable_symbol("eval");
    engine.disable_symbol("import");
    engine.disable_symbol("export");
    engine.set_module_resolver(DummyModuleResolver::new());
}

/// Joins the engine to the session: who may stop it, and where its output goes.
fn connect(engine: &mut Engine, shared: &Shared) {
    engine.set_default_tag(Dynamic::from(shared.clone()));
    let watch = shared.clone();
    engine.on_progress(move |_| watch.halted().map(|halt: Halt| Dynamic::from(Fault::from(halt))));
    let out = shared.clone();
    engine.on_print(move |text| out.write(false, &format!("{text}\n")));
    let out = shared.clone();
    engine.on_debug(move |text, source, position| {
        let place = out.place(source.unwrap_or(""), position);
        let place = place.map(|place| format!("{place}: ")).unwrap_or_default();
        out.write(true, &format!("{place}{text}\n"));
    });
}

/// What makes the language itself safe.
fn register_language(engine: &mut Engine, shared: &Shared) {
    numbers::register(engine);
    compare::register(engine);
    guards::register(engine, shared);
    show::register(engine);
    fault::register(engine);
}

/// What the language is for: types and functions of the trade, one line per file that has some. They are registered
/// last, so that they may replace a form of the language where they know better.
fn register_library(engine: &mut Engine, shared: &Shared) {
    bind::register(engine, shared);
    operators::register(engine, shared);
    curves::register(engine, shared);
    verbs::register(engine, shared);
    files::register(engine, shared);
    tables::register(engine, shared);
}

/// Reads a text. `source` names it in places; positions that the engine reports for it go through `Shared::place`.
pub fn compile(engine: &Engine, shared: &Shared, source: &str, code: &str) -> Result<(AST, Prepared), Fault> {
    let prepared = prepare(code).map_err(|(misreading, line, column)| {
        let counted = |n: usize| u32::try_from(n).unwrap_or(u32::MAX);
        Fault::from(misreading).at(Some(Place { cell: source.into(), line: counted(line), column: counted(column) }))
    })?;
    shared.shifts_mut().note(source, &prepared);
    let mut ast = engine.compile(&prepared.text).map_err(|error| translate_syntax(&error, code, source, shared))?;
    // First of all: functions keep the name they have when they are shared.
    ast.set_source(source);
    Ok((ast, prepared))
}
