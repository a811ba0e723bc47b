//! The one way out of the worker's thread.
//!
//! [`Outbox`] puts everything that belongs to a request into one bounded queue, so that it leaves in the order in
//! which it was made. Whoever fills the queue waits; the thread of the sockets never does.

use std::sync::Arc;
use std::sync::mpsc::{SyncSender, sync_channel};

use bytes::Bytes;
use serde_json::Value;
use tokio::sync::mpsc;

use crate::kernel::connection::Channel;
use crate::kernel::host::Streams;
use crate::kernel::message::{Author, Request};

/// How many messages may wait for the sockets. With streams in pieces of 64 KB this bounds the memory of a queue
/// that is not emptied to some 16 MB.
pub const QUEUE: usize = 256;

/// What the worker hands to the thread of the sockets.
pub enum Outgoing {
    Message {
        channel: Channel,
        frames: Vec<Bytes>,
    },
    /// Asks to be told when every request that lies in the sockets has been received and numbered.
    Settle(SyncSender<()>),
}

/// The worker's end of the queue.
pub struct Outbox {
    author: Arc<Author>,
    queue: mpsc::Sender<Outgoing>,
    streams: Arc<Streams>,
}

impl Outbox {
    pub fn new(author: Arc<Author>, queue: mpsc::Sender<Outgoing>, streams: Arc<Streams>) -> Self {
        Outbox { author, queue, streams }
    }

    pub fn streams(&self) -> &Streams {
        &self.streams
    }

    /// Sends a message to all, as part of the request whose header is `parent`; printed text goes first.
    pub fn broadcast(&self, msg_type: &str, parent: &Bytes, content: &Value) {
        self.flush();
        self.send(Channel::Iopub, self.author.broadcast(msg_type, parent, content));
    }

    /// Sends the reply to who asked; printed text goes first.
    pub fn reply(&self, request: &Request, content: &Value) {
        self.flush();
        self.send(request.channel, self.author.reply(request, content));
    }

    /// Sends the printed text that is waiting.
    pub fn flush(&self) {
        self.streams.flush(&self.author, |frames| self.send(Channel::Iopub, frames));
    }

    /// Waits until the requests that clients have sent so far are received.
    pub fn settle(&self) {
        let (settled, wait) = sync_channel(1);
        if self.queue.blocking_send(Outgoing::Settle(settled)).is_ok() {
            // An error means that the sockets are gone: then nothing more will arrive.
            let _ = wait.recv();
        }
    }

    fn send(&self, channel: Channel, frames: Vec<Bytes>) {
        // An error means that the kernel is ending and the sockets are gone; nobody is left to hear of it.
        let _ = self.queue.blocking_send(Outgoing::Message { channel, frames });
    }
}
