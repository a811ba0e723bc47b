//! One cell as a transaction: all of it is kept, or nothing.
//!
//! `Session::run` compiles, refuses what must not be defined, runs in a copy of the variables and commits. The
//! surprise: values that closures share are the one thing a copy does not protect; `closures.rs` writes them back.

use std::any::Any;
use std::collections::BTreeSet;
use std::panic::{AssertUnwindSafe, catch_unwind};

use rhai::{AST, Dynamic, EvalAltResult, Module};

use crate::fault::{Fault, Place};
use crate::render::Bundle;
use crate::script::fault::{Site, raise, translate};
use crate::script::script_error::{ReservedName, ScriptError};
use crate::script::token::tokens;
use crate::script::{engine, modules, show};
use crate::session::closures::SharedValues;
use crate::session::outcome::Host;
use crate::session::{CellModule, Session, is_named};

/// What of a run that succeeds stays in the session.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(super) enum Keep {
    Everything,
    Nothing,
}

impl Session {
    /// Runs a text and gives what it shows.
    pub(super) fn run(
        &mut self,
        cell: &str,
        code: &str,
        host: &mut dyn Host,
        keep: Keep,
    ) -> Result<Option<Bundle>, Fault> {
        self.literals.provide(&mut self.engine, &self.shared, code);
        let (ast, prepared) = engine::compile(&self.engine, &self.shared, cell, code)?;
        self.refuse_reserved_names(&ast, cell, code)?;

        let mut scope = self.scope.clone();
        let shared_values = SharedValues::of(self.values());
        let state = self.shared.state().clone();
        let mut known = self.defined();
        for (name, count) in named_functions(&ast) {
            known.entry(name).or_default().insert(count);
        }
        self.shared.set_defined(known);
        self.shared.enter(cell);
        self.shared.start_cell();

        let quiet = prepared.quiet;
        let mut touched = Vec::new();
        let Session { engine, shared, literals, .. } = self;
        // Unwind safety: what the cell may leave half done is `scope`, dropped below, and what is put back below.
        let run = || {
            catch_unwind(AssertUnwindSafe(|| -> Result<Option<Bundle>, Box<EvalAltResult>> {
                modules::provide(engine, shared, literals, (cell, code), &mut touched).map_err(raise)?;
                let value = engine.eval_ast_with_scope::<Dynamic>(&mut scope, &ast)?;
                Ok(if quiet || value.is_unit() { None } else { Some(show::bundle_of(&value)) })
            }))
        };
        let ended = shared.host.lend(host, run);
        let result = match ended {
            Ok(Ok(shown)) => self.shared.halt().map_or(Ok(shown), |halt| {
                Err(Fault::from(halt).at(Some(Place { cell: cell.into(), line: 0, column: 0 })))
            }),
            Ok(Err(error)) => {
                let site = Site { cell, shared: &self.shared, scope: Some(&scope) };
                Err(translate(*error, site))
            }
            Err(panic) => Err(Fault::from(ScriptError::Bug { what: panic_text(panic.as_ref()) }).at(Some(Place {
                cell: cell.into(),
                line: 0,
                column: 0,
            }))),
        };
        let result = match result {
            Ok(shown) if keep == Keep::Everything => {
                let written = self.shared.writes.commit(&self.shared.beside).map(|()| shown);
                written.map_err(|error| Fault::from(error).at(Some(Place { cell: cell.into(), line: 0, column: 0 })))
            }
            other => other,
        };
        if result.is_ok() && keep == Keep::Everything {
            // Without this, `let x` again and again would grow the variables.
            self.scope = scope.clone_visible();
            match cell_module(&ast) {
                Some(module) => self.add_functions(module),
                None => self.shared.set_defined(self.defined()),
            }
        } else {
            drop(scope);
            shared_values.restore();
            self.shared.restore(state);
            modules::take_back(&mut self.engine, &self.shared, &touched);
            self.shared.set_defined(self.defined());
        }
        result
    }

    fn refuse_reserved_names(&self, ast: &AST, cell: &str, code: &str) -> Result<(), Fault> {
        for (name, _) in named_functions(ast) {
            if self.shared.library().holds(&name) {
                let place = Some(definition_of(&name, code, cell));
                return Err(Fault::from(ReservedName { name }).at(place));
            }
        }
        Ok(())
    }
}

/// Names of the functions that a text defines, with their numbers of arguments, in the order of their names.
fn named_functions(ast: &AST) -> BTreeSet<(String, usize)> {
    ast.iter_functions()
        .filter(|function| is_named(function.name))
        .map(|function| (function.name.to_owned(), function.params.len()))
        .collect()
}

/// The functions of a text as a module; `None` when it has none.
fn cell_module(ast: &AST) -> Option<CellModule> {
    if !ast.has_functions() {
        return None;
    }
    let closures = ast.iter_functions().map(|function| function.name).filter(|name| !is_named(name));
    Some(CellModule {
        functions: AsRef::<rhai::Shared<Module>>::as_ref(ast).clone(),
        named: named_functions(ast).into_iter().collect(),
        closures: closures.map(str::to_owned).collect(),
    })
}

/// Where a text says `fn name`; the cell as a whole where it says it in another way.
fn definition_of(name: &str, code: &str, cell: &str) -> Place {
    let (tokens, _) = tokens(code);
    let found = tokens.windows(2).find(|pair| pair[0].is("fn") && pair[1].is(name));
    let counted = |n: usize| u32::try_from(n).unwrap_or(u32::MAX);
    let (line, column) = found.map_or((0, 0), |pair| (counted(pair[1].line), counted(pair[1].column)));
    Place { cell: cell.into(), line, column }
}

fn panic_text(panic: &(dyn Any + Send)) -> String {
    let text = panic.downcast_ref::<&str>().copied().or_else(|| panic.downcast_ref::<String>().map(String::as_str));
    text.unwrap_or("it gave no text").to_owned()
}
