//! One function per request: content in, content of the reply out.
//!
//! Fields that are absent or of another kind take the protocol's default where it has one; a request that makes no
//! sense without a field is replied to with an error. `busy`, the sending of the reply and `idle` are not done here.

use serde_json::{Map, Value, json};

use crate::fault::Fault;
use crate::kernel::history::Entry;
use crate::kernel::host::{CellHost, display};
use crate::kernel::message::{PROTOCOL_VERSION, Request};
use crate::kernel::server::Process;
use crate::kernel::worker::{Worker, guarded};
use crate::render::Bundle;
use crate::session::outcome::Completeness;

/// Version of the embedded language. The engine does not tell its own; a test compares this with the lock file.
const LANGUAGE_VERSION: &str = "1.27.0";

/// How many entries of the history a client may ask for: some ask for thousands and show dozens.
const MOST_ENTRIES: i64 = 10_000;

pub fn kernel_info(_: &Request) -> Value {
    let version = env!("CARGO_PKG_VERSION");
    json!({
        "status": "ok",
        "protocol_version": PROTOCOL_VERSION,
        "implementation": "hessbook",
        "implementation_version": version,
        "language_info": {
            "name": "rhai",
            "version": LANGUAGE_VERSION,
            "mimetype": "text/x-rhai",
            "file_extension": ".rhai",
            // Editors know no rhai; of the languages they know, Rust is the nearest.
            "codemirror_mode": "rust",
            "pygments_lexer": "rust",
        },
        "banner": format!("hessbook {version}: a notebook engine for thermochemistry"),
        "help_links": [{"text": "The rhai language", "url": "https://rhai.rs/book"}],
    })
}

pub fn execute(worker: &mut Worker, request: &Request) -> Value {
    let Some(code) = request.text("code") else { return malformed(request, "code", "a text") };
    let silent = request.flag("silent", false);
    let counted = !silent && request.flag("store_history", true);
    if !worker.arrivals.admit(request.number) {
        return json!({"status": "aborted"});
    }
    if counted {
        worker.count += 1;
    }
    let count = worker.count;
    if !silent {
        let input = json!({"code": code, "execution_count": count});
        worker.outbox.broadcast("execute_input", &request.header, &input);
    }
    // A cell that is not counted must not pass for the last one that was.
    let cell = if counted { worker.name_of_cell(request) } else { "uncounted-cell".to_owned() };
    let ran = run(worker, request, &cell, code, silent);
    if counted {
        let output = ran.as_ref().ok().and_then(Option::as_ref).map(|shown| shown.plain().to_owned());
        worker.history.push(Entry { line: count, input: code.to_owned(), output });
    }
    let mut reply = match ran {
        Ok(shown) => {
            if let (Some(shown), false) = (shown, silent) {
                let mut result = display(&shown);
                result["execution_count"] = count.into();
                worker.outbox.broadcast("execute_result", &request.header, &result);
            }
            json!({"status": "ok", "payload": [], "user_expressions": user_expressions(worker, request)})
        }
        Err(fault) => {
            let failure = failure(&fault);
            if !silent {
                let Value::Object(mut error) = failure.clone() else { unreachable!("a failure is an object") };
                error.remove("status");
                worker.outbox.broadcast("error", &request.header, &Value::Object(error));
                if request.flag("stop_on_error", true) {
                    // Clients send all cells at once and rely on the kernel to leave out those that wait; what they
                    // send after they have seen this reply runs.
                    worker.outbox.settle();
                    worker.arrivals.cancel_waiting();
                }
            }
            failure
        }
    };
    reply["execution_count"] = count.into();
    reply
}

/// Runs the code and gives what it shows.
fn run(worker: &mut Worker, request: &Request, cell: &str, code: &str, silent: bool) -> Result<Option<Bundle>, Fault> {
    // Clients read the execution count with an empty cell; that needs no session.
    if code.trim().is_empty() {
        return Ok(None);
    }
    let outcome = guarded(|| {
        let (session, outbox) = worker.session_and_outbox();
        session.run_cell(cell, code, &mut CellHost::new(outbox, &request.header, silent))
    })?;
    outcome.result.map(|()| outcome.shown)
}

/// Evaluates the expressions that came along. One that fails, fails alone and without noise.
fn user_expressions(worker: &mut Worker, request: &Request) -> Value {
    let Some(Value::Object(expressions)) = request.content.get("user_expressions") else { return json!({}) };
    let mut values = Map::new();
    for (name, expression) in expressions {
        let value = match expression.as_str() {
            Some(code) => guarded(|| worker.session().evaluate(code)).and_then(|value| value),
            None => Err(Fault::new(
                "user-expression-not-text",
                format!("the user expression {name} is no text but {expression}"),
                "send each expression as the text of its code",
            )),
        };
        let value = match value {
            Ok(bundle) => {
                let mut shown = display(&bundle);
                shown["status"] = "ok".into();
                shown
            }
            Err(fault) => failure(&fault),
        };
        values.insert(name.clone(), value);
    }
    Value::Object(values)
}

pub fn is_complete(worker: &mut Worker, request: &Request) -> Value {
    let Some(code) = request.text("code") else { return malformed(request, "code", "a text") };
    match worker.session().completeness(code) {
        Completeness::Complete => json!({"status": "complete"}),
        Completeness::Incomplete => json!({"status": "incomplete", "indent": indent_after(code)}),
        Completeness::Invalid => json!({"status": "invalid"}),
        Completeness::Unknown => json!({"status": "unknown"}),
    }
}

/// What the next line should begin with: as much as the last one, and one step more inside an open bracket.
fn indent_after(code: &str) -> String {
    let last = code.lines().last().unwrap_or("");
    let mut indent: String = last.chars().take_while(|character| character.is_whitespace()).collect();
    if last.trim_end().ends_with(['{', '(', '[']) {
        indent.push_str("    ");
    }
    indent
}

/// Answers validly and offers nothing: completions will come from the session, which knows names and cards.
pub fn complete(_: &mut Worker, request: &Request) -> Value {
    let cursor = cursor_of(request);
    json!({"status": "ok", "matches": [], "cursor_start": cursor, "cursor_end": cursor, "metadata": {}})
}

/// Answers validly and finds nothing: help will come from the session, as completions will.
pub fn inspect(_: &mut Worker, _: &Request) -> Value {
    json!({"status": "ok", "found": false, "data": {}, "metadata": {}})
}

/// The cursor in code points of the whole cell, moved into it where it lies outside.
fn cursor_of(request: &Request) -> usize {
    let length = request.text("code").map_or(0, |code| code.chars().count());
    match request.integer("cursor_pos").map(usize::try_from) {
        Some(Ok(cursor)) => cursor.min(length),
        Some(Err(_)) => 0,
        None => length,
    }
}

pub fn history(worker: &mut Worker, request: &Request) -> Value {
    let count = request.integer("n").map(|count| usize::try_from(count.clamp(0, MOST_ENTRIES)).unwrap_or(0));
    let entries = match request.text("hist_access_type") {
        Some("range") => worker.history.range(
            request.integer("session").unwrap_or(0),
            request.integer("start").unwrap_or(0),
            request.integer("stop"),
        ),
        Some("search") => {
            worker.history.search(request.text("pattern").unwrap_or("*"), count, request.flag("unique", false))
        }
        _ => worker.history.tail(count.unwrap_or(0)),
    };
    let output = request.flag("output", false);
    let entries: Vec<Value> = entries
        .into_iter()
        .map(|entry| match output {
            true => json!([entry.session(), entry.line, [entry.input, entry.output]]),
            false => json!([entry.session(), entry.line, entry.input]),
        })
        .collect();
    json!({"status": "ok", "history": entries})
}

/// There are no comms: results are shown as bundles.
pub fn comm_info(_: &Request) -> Value {
    json!({"status": "ok", "comms": {}})
}

/// No target is known, and the protocol wants a comm to an unknown one closed.
pub fn comm_open(worker: &mut Worker, request: &Request) {
    if let Some(id) = request.text("comm_id") {
        worker.outbox.broadcast("comm_close", &request.header, &json!({"comm_id": id, "data": {}}));
    }
}

/// Messages for a comm that does not exist are ignored.
pub fn comm_of_nobody(_: &mut Worker, _: &Request) {}

pub fn interrupt(process: &Process, _: &Request) -> Value {
    process.interrupt();
    json!({"status": "ok"})
}

pub fn shutdown(process: &Process, request: &Request) -> Value {
    process.end();
    json!({"status": "ok", "restart": request.flag("restart", false)})
}

/// The content of an error reply.
pub fn failure(fault: &Fault) -> Value {
    let text = fault.to_string();
    let traceback: Vec<&str> = text.lines().collect();
    json!({"status": "error", "ename": fault.code(), "evalue": fault.message(), "traceback": traceback})
}

fn malformed(request: &Request, field: &str, wanted: &str) -> Value {
    failure(&Fault::new(
        "malformed-request",
        format!("{} needs {field} to be {wanted}", request.msg_type),
        "report this to the maker of the notebook client",
    ))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_version_of_the_language_is_the_one_that_is_built_in() {
        let lock = include_str!("../../Cargo.lock");
        assert!(lock.contains(&format!("name = \"rhai\"\nversion = \"{LANGUAGE_VERSION}\"\n")));
    }

    #[test]
    fn an_open_bracket_indents_the_next_line() {
        assert_eq!(indent_after("if x {"), "    ");
        assert_eq!(indent_after("if x {\n  let y = ["), "      ");
        assert_eq!(indent_after("let x ="), "");
        assert_eq!(indent_after(""), "");
    }
}
