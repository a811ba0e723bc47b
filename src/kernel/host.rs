//! What a running cell talks to: printed text in batches, pictures and reports at once.
//!
//! [`CellHost`] is the kernel's [`Host`]. Printed text waits in [`Streams`] for 64 KB or 50 ms, since servers drop
//! messages past 1,000 a second; the clock of the socket thread sends it when the cell is silent for longer. A cell
//! has an [`Allowance`], and what goes beyond it is left out with a notice.

use std::sync::{Mutex, PoisonError, TryLockError};
use std::time::Duration;

use bytes::Bytes;
use serde_json::{Value, json};
use tokio::sync::{Notify, mpsc};

use crate::kernel::connection::Channel;
use crate::kernel::message::{Author, no_parent};
use crate::kernel::outbox::{Outbox, Outgoing};
use crate::render::Bundle;
use crate::session::outcome::Host;

/// Printed text is sent when this much of it waits.
const BATCH: usize = 64 * 1024;

/// Printed text waits no longer than this.
const PATIENCE: Duration = Duration::from_millis(50);

/// What one cell may print, in bytes. A usual server lets 3 MB pass within three seconds and drops the rest, errors
/// and results with it; below that everything arrives.
const PRINTED: usize = 2_000_000;

/// How often one cell may show something or change between stdout and stderr: a usual server lets 3,000 messages
/// pass within three seconds.
const SHOWN: usize = 1_000;

/// What the things that one cell shows may take up, in bytes: messages wait in memory for slow clients.
const SHOWN_BYTES: usize = 50_000_000;

#[derive(Debug, PartialEq, Eq)]
struct Piece {
    stderr: bool,
    text: String,
}

struct Waiting {
    /// Header of the request that the text belongs to.
    parent: Bytes,
    pieces: Vec<Piece>,
    size: usize,
}

/// Printed text that waits to be sent, in the order of writing.
pub struct Streams {
    waiting: Mutex<Waiting>,
    written: Notify,
}

impl Default for Streams {
    fn default() -> Self {
        let waiting = Waiting { parent: no_parent(), pieces: Vec::new(), size: 0 };
        Streams { waiting: Mutex::new(waiting), written: Notify::new() }
    }
}

impl Streams {
    /// Adds text; true when there is enough for a batch.
    fn write(&self, parent: &Bytes, stderr: bool, text: &str) -> bool {
        // The lock is poisoned only by a failed allocation; the text in it is whole at every step.
        let mut waiting = self.waiting.lock().unwrap_or_else(PoisonError::into_inner);
        if waiting.pieces.is_empty() {
            waiting.parent = parent.clone();
            self.written.notify_one();
        }
        waiting.size += text.len();
        match waiting.pieces.last_mut() {
            Some(last) if last.stderr == stderr => last.text.push_str(text),
            _ => waiting.pieces.push(Piece { stderr, text: text.to_owned() }),
        }
        waiting.size >= BATCH
    }

    /// Sends all that waits. The lock is held while sending, so that the clock cannot send later text first.
    pub fn flush(&self, author: &Author, mut send: impl FnMut(Vec<Bytes>)) {
        let mut waiting = self.waiting.lock().unwrap_or_else(PoisonError::into_inner);
        let pieces = std::mem::take(&mut waiting.pieces);
        waiting.size = 0;
        for piece in pieces {
            send(stream(author, &waiting.parent, &piece));
        }
    }

    /// Sends what a silent cell printed. Runs on the thread of the sockets, which must not wait: neither for the
    /// lock, whose holder may be waiting for this very thread to empty the queue, nor for room in the queue.
    pub async fn keep_flushed(&self, author: &Author, queue: mpsc::WeakSender<Outgoing>) {
        loop {
            self.written.notified().await;
            tokio::time::sleep(PATIENCE).await;
            loop {
                // The worker is gone when its end of the queue is.
                let Some(queue) = queue.upgrade() else { return };
                if self.flush_without_waiting(author, &queue) {
                    break;
                }
                tokio::time::sleep(PATIENCE).await;
            }
        }
    }

    fn flush_without_waiting(&self, author: &Author, queue: &mpsc::Sender<Outgoing>) -> bool {
        let mut waiting = match self.waiting.try_lock() {
            Ok(waiting) => waiting,
            Err(TryLockError::Poisoned(poisoned)) => poisoned.into_inner(),
            Err(TryLockError::WouldBlock) => return false,
        };
        let mut pieces = std::mem::take(&mut waiting.pieces).into_iter();
        waiting.size = 0;
        while let Ok(place) = queue.try_reserve() {
            let Some(piece) = pieces.next() else { return true };
            place.send(Outgoing::Message { channel: Channel::Iopub, frames: stream(author, &waiting.parent, &piece) });
        }
        waiting.pieces = pieces.collect();
        waiting.size = waiting.pieces.iter().map(|piece| piece.text.len()).sum();
        waiting.pieces.is_empty()
    }
}

fn stream(author: &Author, parent: &Bytes, piece: &Piece) -> Vec<Bytes> {
    let name = if piece.stderr { "stderr" } else { "stdout" };
    author.broadcast("stream", parent, &json!({"name": name, "text": piece.text}))
}

/// What a cell may still put out.
struct Allowance {
    printed: usize,
    shown: usize,
    shown_bytes: usize,
    on_stderr: bool,
    spent: bool,
}

impl Allowance {
    fn of_one_cell() -> Self {
        Allowance { printed: PRINTED, shown: SHOWN, shown_bytes: SHOWN_BYTES, on_stderr: false, spent: false }
    }

    /// How much of the text may still be printed.
    fn print<'t>(&mut self, stderr: bool, text: &'t str) -> &'t str {
        if stderr != self.on_stderr {
            self.on_stderr = stderr;
            self.shown = self.shown.saturating_sub(1);
        }
        if self.spent || self.shown == 0 {
            return "";
        }
        let mut end = text.len().min(self.printed);
        while !text.is_char_boundary(end) {
            end -= 1;
        }
        self.printed -= end;
        &text[..end]
    }

    fn show(&mut self, size: usize) -> bool {
        if self.spent || self.shown == 0 || size > self.shown_bytes {
            return false;
        }
        self.shown -= 1;
        self.shown_bytes -= size;
        true
    }
}

/// The host of one cell.
pub struct CellHost<'a> {
    outbox: &'a Outbox,
    parent: &'a Bytes,
    /// A silent request is run without anything being sent to all.
    silent: bool,
    allowance: Allowance,
}

impl<'a> CellHost<'a> {
    pub fn new(outbox: &'a Outbox, parent: &'a Bytes, silent: bool) -> Self {
        CellHost { outbox, parent, silent, allowance: Allowance::of_one_cell() }
    }

    fn print(&self, stderr: bool, text: &str) {
        if !text.is_empty() && self.outbox.streams().write(self.parent, stderr, text) {
            self.outbox.flush();
        }
    }

    fn display(&mut self, msg_type: &'static str, bundle: &Bundle, id: Option<&str>) {
        if self.silent {
            return;
        }
        let mut content = display(bundle);
        if let Some(id) = id {
            content["transient"] = json!({"display_id": id});
        }
        if self.allowance.show(content.to_string().len()) {
            self.outbox.broadcast(msg_type, self.parent, &content);
        } else {
            self.cut();
        }
    }

    /// Says once that the rest is left out.
    fn cut(&mut self) {
        if !self.allowance.spent {
            self.allowance.spent = true;
            self.print(true, &notice());
        }
    }
}

impl Host for CellHost<'_> {
    fn write(&mut self, stderr: bool, text: &str) {
        if self.silent {
            return;
        }
        let allowed = self.allowance.print(stderr, text);
        self.print(stderr, allowed);
        if allowed.len() < text.len() {
            self.cut();
        }
    }

    fn show(&mut self, bundle: &Bundle, id: Option<&str>) {
        self.display("display_data", bundle, id);
    }

    fn update(&mut self, bundle: &Bundle, id: &str) {
        self.display("update_display_data", bundle, Some(id));
    }
}

fn notice() -> String {
    format!(
        "\n[the rest of this cell's output is left out; a cell may print {} MB and show {SHOWN} things of {} MB in all]\n  \
         try: print a summary, or spread the work over several cells\n",
        PRINTED / 1_000_000,
        SHOWN_BYTES / 1_000_000
    )
}

/// A bundle as messages carry it.
pub fn display(bundle: &Bundle) -> Value {
    json!({"data": bundle.data, "metadata": {}})
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_cut_never_falls_inside_a_character() {
        let mut allowance = Allowance { printed: 5, ..Allowance::of_one_cell() };
        assert_eq!(allowance.print(false, "ab\u{1d41a}c"), "ab");
        assert_eq!(allowance.print(false, "cde f"), "cde");
    }

    #[test]
    fn changing_streams_counts_as_showing() {
        let mut allowance = Allowance { shown: 2, ..Allowance::of_one_cell() };
        assert_eq!(allowance.print(false, "a"), "a");
        assert_eq!(allowance.print(true, "b"), "b");
        assert_eq!(allowance.print(false, "c"), "");
        assert!(!allowance.show(1));
    }

    #[test]
    fn text_keeps_the_order_of_writing_across_streams() {
        let streams = Streams::default();
        let parent = no_parent();
        for (stderr, text) in [(false, "a"), (false, "b"), (true, "c"), (false, "d")] {
            assert!(!streams.write(&parent, stderr, text));
        }
        let pieces = &streams.waiting.lock().unwrap().pieces;
        let piece = |stderr, text: &str| Piece { stderr, text: text.to_owned() };
        assert_eq!(*pieces, [piece(false, "ab"), piece(true, "c"), piece(false, "d")]);
    }

    #[test]
    fn the_clock_leaves_what_finds_no_room_and_never_waits() {
        let author = Author::new(b"k");
        let streams = Streams::default();
        let (queue, mut received) = mpsc::channel(1);
        for stderr in [false, true, false] {
            streams.write(&no_parent(), stderr, "x");
        }
        assert!(!streams.flush_without_waiting(&author, &queue));
        assert_eq!(streams.waiting.lock().unwrap().pieces.len(), 2);
        let held = streams.waiting.lock().unwrap();
        assert!(!streams.flush_without_waiting(&author, &queue));
        drop(held);
        let mut sent = 0;
        while received.try_recv().is_ok() {
            sent += 1;
            streams.flush_without_waiting(&author, &queue);
        }
        assert_eq!(sent, 3);
    }
}
