//! The worker: a process that audits the notebooks it is told, one after the other, and can be lost without harm.
//!
//! It reads the order from the first line of its input, a path from each further line, and writes one line for each. All
//! are JSON. The surprise: the input is listened to while a notebook runs, and the process ends with it, so that no worker
//! outlives the program that started it, whatever its notebook does.

use std::io::{self, BufRead, Write};
use std::path::PathBuf;
use std::sync::Arc;
use std::sync::atomic::AtomicBool;
use std::sync::mpsc;

use serde::{Deserialize, Serialize};

use crate::archive::order::Order;
use crate::fault::Fault;

/// What a worker is told first.
#[derive(Serialize, Deserialize)]
pub(super) struct Start {
    pub order: Order,
    pub memory_limit_mib: u64,
}

/// The stack on which a notebook is evaluated, which is set aside as a whole, and what threads and their start take.
const BESIDE_MIB: u64 = 256 + 32;

/// Serves until the input ends.
///
/// # Errors
/// The first line is no order, or what it names cannot be read; nobody listens.
pub fn serve() -> Result<(), Fault> {
    // Ctrl-C in a terminal reaches the whole group. The program that started this one decides what becomes of the worker.
    // Where no handler can be set, a worker that dies with its parent is no loss.
    let _ = signal_hook::flag::register(signal_hook::consts::SIGINT, Arc::new(AtomicBool::new(false)));
    let mut lines = io::stdin().lock().lines();
    let first = lines.next().and_then(Result::ok).unwrap_or_default();
    let start: Start = serde_json::from_str(&first).map_err(|error| no_order(&error))?;
    limit_memory(start.memory_limit_mib);
    let prepared = start.order.prepared()?;
    let (paths, told) = mpsc::channel::<PathBuf>();
    std::thread::spawn(move || {
        let _ends = Ends;
        for path in told {
            let audit = prepared.done_with(&path);
            let line = serde_json::to_string(&audit).unwrap_or_else(|e| unreachable!("an audit is plain texts: {e}"));
            let mut out = io::stdout().lock();
            if writeln!(out, "{line}").and_then(|()| out.flush()).is_err() {
                std::process::exit(1);
            }
        }
    });
    for line in lines.map_while(Result::ok) {
        match serde_json::from_str::<PathBuf>(&line).map(|path| paths.send(path)) {
            Ok(Ok(())) => {}
            _ => break,
        }
    }
    std::process::exit(0)
}

/// Ends the process with the thread that audits: a panic is told on stderr, and nobody need wait for an audit any more.
struct Ends;

impl Drop for Ends {
    fn drop(&mut self) {
        std::process::exit(101);
    }
}

fn no_order(error: &serde_json::Error) -> Fault {
    Fault::new(
        "no-audit-order",
        format!("the first line of the input is no order for an audit: {error}"),
        "use `hessbook audit`, which starts its workers itself",
    )
}

/// A notebook that wants more memory loses its worker instead of troubling the machine.
fn limit_memory(mib: u64) {
    let bytes = address_space() + ((mib + BESIDE_MIB) << 20);
    if let Err(error) = rlimit::setrlimit(rlimit::Resource::AS, bytes, bytes) {
        let _ = writeln!(io::stderr(), "memory is not limited: {error}");
    }
}

/// What the program takes before it has read a notebook, in bytes.
fn address_space() -> u64 {
    // The first figure counts pages, which have 4 KiB or more; a system without the file gets a guess.
    let pages = std::fs::read_to_string("/proc/self/statm").ok();
    let pages = pages.and_then(|text| text.split(' ').next()?.parse::<u64>().ok());
    pages.map_or(256 << 20, |pages| pages * 4096)
}
