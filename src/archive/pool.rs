//! The processes that audit an archive: one for each core, each with one notebook at a time.
//!
//! [`Pool::run`] hands out paths and takes audits back. A worker that dies, is overdue or says too much costs the notebook
//! it held, which becomes a row of its own, and is replaced.

use std::io::{BufRead, BufReader, Read, Write};
use std::path::{Path, PathBuf};
use std::process::{Child, ChildStdin, Command, ExitStatus, Stdio};
use std::sync::atomic::{AtomicBool, AtomicUsize, Ordering};
use std::sync::mpsc::{self, Receiver, RecvTimeoutError};
use std::sync::{Arc, Mutex, PoisonError};
use std::time::{Duration, Instant};

use thiserror::Error;

use crate::archive::order::Order;
use crate::archive::worker::Start;
use crate::fault::{Explain, Fault};
use crate::notebook::audit::could_not_run;
use crate::notebook::verdict::{Against, NotebookAudit};

/// How an archive is worked on.
#[derive(Clone, Debug)]
pub struct Pool {
    /// Processes at a time.
    pub jobs: usize,
    /// For one notebook.
    pub time_limit: Duration,
    /// For one notebook.
    pub memory_limit_mib: u64,
    /// This program.
    pub program: PathBuf,
}

/// One notebook, audited or lost.
#[derive(Clone, Debug, PartialEq)]
pub struct Done {
    /// Its position in the list.
    pub nth: usize,
    pub audit: NotebookAudit,
    /// No audit was made: its worker was lost. Another try may fare better.
    pub lost: bool,
}

/// Why a notebook has no audit.
#[derive(Clone, Debug, PartialEq, Eq, Error)]
pub enum Loss {
    #[error("its audit was not done within {seconds} s and was ended")]
    Overdue { seconds: u64 },
    #[error("the process that audited it wanted more than {mib} MiB of memory")]
    Memory { mib: u64 },
    #[error("the process that audited it ended: {how}")]
    Died { how: String },
    #[error("its audit is longer than {mib} MiB")]
    TooLong { mib: u64 },
    #[error("no process could be started to audit it: {why}")]
    NotStarted { why: String },
}

impl Explain for Loss {
    fn code(&self) -> &'static str {
        match self {
            Loss::Overdue { .. } => "audit-overdue",
            Loss::Memory { .. } => "audit-out-of-memory",
            Loss::Died { .. } => "audit-process-lost",
            Loss::TooLong { .. } => "audit-too-long",
            Loss::NotStarted { .. } => "audit-process-not-started",
        }
    }

    fn hint(&self) -> String {
        match self {
            Loss::Overdue { .. } => {
                "look for a loop without end in its cells, or give it longer with --time-limit SECONDS".to_owned()
            }
            Loss::Memory { .. } => "look at what its cells gather, or allow more with --memory-limit MIB".to_owned(),
            Loss::Died { .. } => "run it by itself with `hessbook run`, and report what you see".to_owned(),
            Loss::TooLong { .. } => "report fewer results in one notebook".to_owned(),
            Loss::NotStarted { .. } => "check the limits of processes and memory of this account".to_owned(),
        }
    }
}

/// The longest line that is taken from a worker.
const MOST_REPLY: u64 = 64 << 20;

/// Audits by one worker before it makes way for a fresh one: constant sets and names of bases live as long as a process.
const MOST_AUDITS: usize = 500;

/// How often a waiting slot looks whether it should stop.
const LOOK: Duration = Duration::from_millis(50);

impl Pool {
    /// Audits the notebooks and hands each outcome to `take`, in the order in which they are done. Ends early where `stop`
    /// is set or `take` refuses; no worker is left then.
    ///
    /// # Errors
    /// What `take` gives.
    pub fn run(
        &self,
        order: &Order,
        paths: &[(usize, PathBuf)],
        stop: &AtomicBool,
        take: &mut dyn FnMut(Done) -> Result<(), Fault>,
    ) -> Result<(), Fault> {
        let (next, refused) = (AtomicUsize::new(0), AtomicBool::new(false));
        let stopped = || stop.load(Ordering::Relaxed) || refused.load(Ordering::Relaxed);
        std::thread::scope(|threads| {
            // Few outcomes wait at a time, so that memory does not grow with the archive.
            let (done, outcomes) = mpsc::sync_channel::<Done>(self.jobs);
            for slot in 0..self.jobs.clamp(1, paths.len().max(1)) {
                let (done, next, stopped) = (done.clone(), &next, &stopped);
                let work = move || {
                    let mut worker = None;
                    while let Some((nth, path)) = paths.get(next.fetch_add(1, Ordering::Relaxed)) {
                        let Some(outcome) = self.one(&mut worker, order, path, stopped) else { break };
                        let (audit, lost) = match outcome {
                            Ok(audit) => (audit, false),
                            Err(loss) => (lost(path, loss), true),
                        };
                        if done.send(Done { nth: *nth, audit, lost }).is_err() {
                            break;
                        }
                    }
                };
                // Where the system gives fewer threads than asked for, those that there are do the work.
                match std::thread::Builder::new().spawn_scoped(threads, work) {
                    Err(why) if slot == 0 => return Err(Loss::NotStarted { why: why.to_string() }.into()),
                    Err(_) => break,
                    Ok(_) => {}
                }
            }
            drop(done);
            for outcome in outcomes {
                if let Err(fault) = take(outcome) {
                    refused.store(true, Ordering::Relaxed);
                    return Err(fault);
                }
            }
            Ok(())
        })
    }

    /// One notebook by the worker of a slot, which is started and replaced as needed; none where the work was stopped.
    fn one(
        &self,
        slot: &mut Option<Worker>,
        order: &Order,
        path: &Path,
        stopped: &dyn Fn() -> bool,
    ) -> Option<Result<NotebookAudit, Loss>> {
        if stopped() {
            return None;
        }
        let worker = match slot.take().filter(|worker| worker.audits < MOST_AUDITS) {
            Some(worker) => slot.insert(worker),
            None => match Worker::start(self, order) {
                Ok(worker) => slot.insert(worker),
                Err(why) => return Some(Err(Loss::NotStarted { why: why.to_string() })),
            },
        };
        let deadline = Instant::now() + self.time_limit;
        worker.audits += 1;
        // A worker that is gone shows in its replies.
        let _ = worker.tell(path);
        let loss = loop {
            match worker.replies.recv_timeout(LOOK.min(deadline.saturating_duration_since(Instant::now()))) {
                Ok(Reply::Line(line)) => match serde_json::from_str(&line) {
                    Ok(audit) => return Some(Ok(audit)),
                    Err(error) => break Loss::Died { how: format!("what it said is no audit: {error}") },
                },
                Ok(Reply::TooLong) => break Loss::TooLong { mib: MOST_REPLY >> 20 },
                Err(RecvTimeoutError::Timeout) if stopped() => {
                    *slot = None;
                    return None;
                }
                Err(RecvTimeoutError::Timeout) if Instant::now() >= deadline => {
                    break Loss::Overdue { seconds: self.time_limit.as_secs() };
                }
                Err(RecvTimeoutError::Timeout) => {}
                Err(RecvTimeoutError::Disconnected) if stopped() => {
                    *slot = None;
                    return None;
                }
                Err(RecvTimeoutError::Disconnected) => break worker.how_it_ended(self.memory_limit_mib),
            }
        };
        *slot = None;
        Some(Err(loss))
    }
}

/// The row of a notebook whose worker was lost.
fn lost(path: &Path, loss: Loss) -> NotebookAudit {
    could_not_run(&path.display().to_string(), Against::Nothing, "the audit", &loss.into())
}

/// One process. It is killed when it is dropped.
struct Worker {
    child: Child,
    input: ChildStdin,
    replies: Receiver<Reply>,
    /// The end of what it wrote to its stderr.
    said: Arc<Mutex<Vec<u8>>>,
    listener: Option<std::thread::JoinHandle<()>>,
    audits: usize,
}

enum Reply {
    Line(String),
    TooLong,
}

impl Worker {
    fn start(pool: &Pool, order: &Order) -> std::io::Result<Worker> {
        let mut child = Command::new(&pool.program)
            .arg("audit-worker")
            // One heap for all threads: each further one sets address space aside, which the memory limit counts.
            .env("MALLOC_ARENA_MAX", "1")
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()?;
        let (Some(input), Some(output), Some(errors)) = (child.stdin.take(), child.stdout.take(), child.stderr.take())
        else {
            unreachable!("the three were asked for")
        };
        let (reply, replies) = mpsc::sync_channel(1);
        std::thread::Builder::new().spawn(move || {
            let mut output = BufReader::new(output);
            while let Some(read) = next_reply(&mut output) {
                if reply.send(read).is_err() {
                    break;
                }
            }
        })?;
        let said = Arc::new(Mutex::new(Vec::new()));
        let heard = Arc::clone(&said);
        let listener = std::thread::Builder::new().spawn(move || listen(errors, &heard))?;
        let mut worker = Worker { child, input, replies, said, listener: Some(listener), audits: 0 };
        let start = Start { order: order.clone(), memory_limit_mib: pool.memory_limit_mib };
        serde_json::to_writer(&worker.input, &start)?;
        writeln!(worker.input)?;
        Ok(worker)
    }

    fn tell(&mut self, path: &Path) -> std::io::Result<()> {
        let mut line = serde_json::to_vec(&path.to_string_lossy())?;
        line.push(b'\n');
        self.input.write_all(&line)
    }

    /// Why it said nothing more.
    fn how_it_ended(&mut self, memory_limit_mib: u64) -> Loss {
        let status = self.child.wait();
        if let Some(listener) = self.listener.take() {
            let _ = listener.join();
        }
        let said = self.said.lock().unwrap_or_else(PoisonError::into_inner);
        let said = String::from_utf8_lossy(&said);
        // The words of Rust's runtime and of the standard library's error, and those for a thread's stack.
        if ["memory allocation of", "Cannot allocate memory", "out of memory"].iter().any(|words| said.contains(words))
        {
            return Loss::Memory { mib: memory_limit_mib };
        }
        let how = status.map_or_else(|error| error.to_string(), |status| status_words(&status));
        let last = said.lines().rfind(|line| !line.trim().is_empty()).unwrap_or_default();
        Loss::Died { how: if last.is_empty() { how } else { format!("{how}, saying `{last}`") } }
    }
}

impl Drop for Worker {
    fn drop(&mut self) {
        // It may be gone already.
        let _ = self.child.kill();
        let _ = self.child.wait();
    }
}

fn status_words(status: &ExitStatus) -> String {
    #[cfg(unix)]
    if let Some(signal) = std::os::unix::process::ExitStatusExt::signal(status) {
        return match signal_hook::low_level::signal_name(signal) {
            Some(name) => format!("signal {name}"),
            None => format!("signal {signal}"),
        };
    }
    status.to_string()
}

/// The next line; none at the end.
fn next_reply(output: &mut impl BufRead) -> Option<Reply> {
    let mut line = Vec::new();
    let read = output.by_ref().take(MOST_REPLY).read_until(b'\n', &mut line).ok()?;
    match line.pop() {
        None => None,
        Some(b'\n') => String::from_utf8(line).ok().map(Reply::Line),
        Some(_) if read as u64 == MOST_REPLY => Some(Reply::TooLong),
        // The process ended in the middle of a line.
        Some(_) => None,
    }
}

/// Keeps the last of what a process says, so that it never waits for a reader.
fn listen(mut errors: impl Read, heard: &Mutex<Vec<u8>>) {
    const MOST: usize = 4096;
    let mut piece = [0; MOST];
    while let Ok(count @ 1..) = errors.read(&mut piece) {
        let mut heard = heard.lock().unwrap_or_else(PoisonError::into_inner);
        heard.extend_from_slice(&piece[..count]);
        let over = heard.len().saturating_sub(MOST);
        heard.drain(..over);
    }
}
