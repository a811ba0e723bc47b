//! The thread that owns the session and answers the shell channel, one request after the other.
//!
//! [`Worker`] sends everything of a request, from `busy` to `idle`. The session is built after the first request is
//! answered, so that a client hears from the kernel before engine and data exist. A panic costs the request it
//! happened in, never the thread.

use std::any::Any;
use std::collections::BTreeMap;
use std::io;
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::sync::Arc;
use std::sync::mpsc::{Receiver, Sender, TryRecvError, channel};
use std::thread;

use serde_json::{Value, json};

use crate::fault::Fault;
use crate::kernel::arrivals::Arrivals;
use crate::kernel::handle;
use crate::kernel::history::History;
use crate::kernel::message::{Handler, Request, handler_of};
use crate::kernel::outbox::Outbox;
use crate::session::Session;

/// Deep recursion in a script needs a deep stack. The memory is reserved, not used.
const STACK: usize = 256 * 1024 * 1024;

/// What the requests of the shell channel are answered from.
pub struct Worker {
    session: Option<Session>,
    /// Execution count of the last cell that counted.
    pub count: i64,
    /// Names of the cells that clients tell apart, by their ids.
    names: BTreeMap<String, String>,
    pub history: History,
    pub outbox: Outbox,
    pub arrivals: Arc<Arrivals>,
}

impl Worker {
    /// Starts the thread; it ends when the sender is dropped and the requests before that are answered.
    pub fn start(outbox: Outbox, arrivals: Arc<Arrivals>) -> io::Result<Sender<Request>> {
        let (sender, requests) = channel();
        // Built on its thread, which a session never leaves.
        let work = move || {
            let (names, history) = (BTreeMap::new(), History::default());
            Worker { session: None, count: 0, names, history, outbox, arrivals }.run(&requests);
        };
        thread::Builder::new().name("cells".to_owned()).stack_size(STACK).spawn(work)?;
        Ok(sender)
    }

    /// The name of the cell that was just counted.
    ///
    /// A cell that is run again keeps the name of its first run, which in a notebook run from top to bottom is its
    /// place among the code cells: what it reports replaces what it reported before, and what it typed is the same
    /// input. Without an id every run is a cell of its own.
    pub fn name_of_cell(&mut self, request: &Request) -> String {
        let name = format!("cell-{}", self.count);
        match &request.cell_id {
            Some(id) => self.names.entry(id.clone()).or_insert(name).clone(),
            None => name,
        }
    }

    /// The session, built now if it was not needed before.
    pub fn session(&mut self) -> &mut Session {
        self.session.get_or_insert_with(|| Session::new(self.arrivals.stop_flag()))
    }

    /// The session together with the way out, for a cell that prints while it runs.
    pub fn session_and_outbox(&mut self) -> (&mut Session, &Outbox) {
        let session = self.session.get_or_insert_with(|| Session::new(self.arrivals.stop_flag()));
        (session, &self.outbox)
    }

    fn run(&mut self, requests: &Receiver<Request>) {
        let mut answered = false;
        loop {
            let request = match requests.try_recv() {
                Ok(request) => request,
                Err(TryRecvError::Disconnected) => return,
                Err(TryRecvError::Empty) => {
                    if answered && self.session.is_none() {
                        // The client has its answer and thinks; a session that cannot be built says so to the
                        // first request that needs it.
                        let _ = guarded(|| {
                            self.session();
                        });
                    }
                    match requests.recv() {
                        Ok(request) => request,
                        Err(_) => return,
                    }
                }
            };
            self.answer(&request);
            answered = true;
        }
    }

    fn answer(&mut self, request: &Request) {
        self.outbox.broadcast("status", &request.header, &json!({"execution_state": "busy"}));
        if let Some(content) = self.content_of_reply(request) {
            self.outbox.reply(request, &content);
        }
        self.outbox.broadcast("status", &request.header, &json!({"execution_state": "idle"}));
    }

    fn content_of_reply(&mut self, request: &Request) -> Option<Value> {
        let handler = handler_of(&request.msg_type, request.channel)?;
        let answer = guarded(|| match handler {
            Handler::Plain(handle) => Some(handle(request)),
            Handler::Worker(handle) => Some(handle(self, request)),
            Handler::Silent(handle) => {
                handle(self, request);
                None
            }
            // These are answered on the thread of the sockets and never come here.
            Handler::Process(_) => None,
        });
        answer.unwrap_or_else(|fault| Some(handle::failure(&fault)))
    }
}

/// Runs `work`; a panic in it comes back as a fault that asks to be reported.
pub fn guarded<T>(work: impl FnOnce() -> T) -> Result<T, Fault> {
    catch_unwind(AssertUnwindSafe(work)).map_err(|panic| {
        Fault::new(
            "program-error",
            format!("the program broke one of its own rules: {}", text_of(panic.as_ref())),
            "save the notebook, restart the kernel, and report the cell that led here",
        )
    })
}

fn text_of(panic: &(dyn Any + Send)) -> &str {
    let text = panic.downcast_ref::<&str>().copied();
    text.or_else(|| panic.downcast_ref::<String>().map(String::as_str)).unwrap_or("no reason given")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_panic_becomes_a_fault_that_says_why() {
        let number = 3;
        for (fault, expected) in [
            (guarded(|| panic!("plain")).unwrap_err(), "plain"),
            (guarded(|| panic!("with {number}")).unwrap_err(), "with 3"),
        ] {
            let fault: Fault = fault;
            assert!(fault.message().ends_with(expected), "{fault}");
        }
        assert_eq!(guarded(|| 5), Ok(5));
    }
}
