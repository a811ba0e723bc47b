//! Message types, declared once, and how requests are read and messages written.
//!
//! [`MESSAGE_TYPES`] is the table: a type's name, the channels it is served on and its handler. Whatever must know
//! about message types (routing, the check that each has a recorded exchange) reads it. A type that is not in it is
//! answered with `busy` and `idle` alone.

use std::sync::atomic::{AtomicU64, Ordering};

use bytes::Bytes;
use chrono::{SecondsFormat, Utc};
use serde_json::{Map, Value, json};
use thiserror::Error;
use uuid::Uuid;

use crate::kernel::connection::Channel;
use crate::kernel::handle;
use crate::kernel::server::Process;
use crate::kernel::wire::{Envelope, Signer, WireError};
use crate::kernel::worker::Worker;

/// The version of the messaging protocol that is spoken. 5.5 would add the welcome message of an XPUB socket; the
/// one at hand lets a single stopped subscriber hold up all others, so the kernel keeps to PUB and to 5.4.
pub const PROTOCOL_VERSION: &str = "5.4";

/// What answers a request, and on which thread.
#[derive(Clone, Copy)]
pub enum Handler {
    /// Needs the request only; gives the content of the reply, as the next two do.
    Plain(fn(&Request) -> Value),
    /// Needs the worker's thread, where the session is.
    Worker(fn(&mut Worker, &Request) -> Value),
    /// Acts on the running kernel, at once and also while a cell runs.
    Process(fn(&Process, &Request) -> Value),
    /// Is never replied to; needs the worker's thread.
    Silent(fn(&mut Worker, &Request)),
}

/// One row of the table.
pub struct MessageType {
    pub name: &'static str,
    pub channels: &'static [Channel],
    pub handler: Handler,
}

const SHELL: &[Channel] = &[Channel::Shell];
const CONTROL: &[Channel] = &[Channel::Control];
const BOTH: &[Channel] = &[Channel::Shell, Channel::Control];

const fn row(name: &'static str, channels: &'static [Channel], handler: Handler) -> MessageType {
    MessageType { name, channels, handler }
}

/// Every message type that is served.
pub const MESSAGE_TYPES: &[MessageType] = &[
    row("kernel_info_request", BOTH, Handler::Plain(handle::kernel_info)),
    row("execute_request", SHELL, Handler::Worker(handle::execute)),
    row("is_complete_request", SHELL, Handler::Worker(handle::is_complete)),
    row("complete_request", SHELL, Handler::Worker(handle::complete)),
    row("inspect_request", SHELL, Handler::Worker(handle::inspect)),
    row("history_request", SHELL, Handler::Worker(handle::history)),
    row("comm_info_request", SHELL, Handler::Plain(handle::comm_info)),
    row("comm_open", SHELL, Handler::Silent(handle::comm_open)),
    row("comm_msg", SHELL, Handler::Silent(handle::comm_of_nobody)),
    row("comm_close", SHELL, Handler::Silent(handle::comm_of_nobody)),
    row("interrupt_request", CONTROL, Handler::Process(handle::interrupt)),
    // Deprecated on shell since 5.4, and still sent there.
    row("shutdown_request", BOTH, Handler::Process(handle::shutdown)),
];

/// The handler of a message type on a channel.
pub fn handler_of(name: &str, channel: Channel) -> Option<Handler> {
    let row = MESSAGE_TYPES.iter().find(|row| row.name == name && row.channels.contains(&channel))?;
    Some(row.handler)
}

/// Why a message with a good signature was put aside.
#[derive(Debug, Error)]
pub enum MessageError {
    #[error(transparent)]
    Wire(#[from] WireError),
    #[error("its {part} is not JSON: {reason}")]
    NotJson { part: &'static str, reason: serde_json::Error },
    #[error("its header has no msg_type")]
    NoMessageType,
}

/// A request, read.
#[derive(Debug)]
pub struct Request {
    /// Its place in the order of arrival on the shell channel.
    pub number: u64,
    pub channel: Channel,
    pub identities: Vec<Bytes>,
    /// The header byte for byte: replies carry it as their parent, with fields that we know nothing of.
    pub header: Bytes,
    pub msg_type: String,
    /// Which cell of a document the request is about, where the client says so.
    pub cell_id: Option<String>,
    pub content: Map<String, Value>,
}

impl Request {
    /// Checks and reads a received message. `number` is asked for only when the message is a good one.
    pub fn read(
        frames: Vec<Bytes>,
        signer: &Signer,
        channel: Channel,
        number: impl FnOnce() -> u64,
    ) -> Result<Request, MessageError> {
        let Envelope { identities, parts: [header, parent, metadata, content] } = Envelope::open(frames, signer)?;
        let fields = object("header", &header)?;
        object("parent header", &parent)?;
        let metadata = object("metadata", &metadata)?;
        let content = object("content", &content)?;
        let Some(Value::String(msg_type)) = fields.get("msg_type") else {
            return Err(MessageError::NoMessageType);
        };
        let msg_type = msg_type.clone();
        let cell_id = metadata.get("cellId").and_then(Value::as_str).map(str::to_owned);
        Ok(Request { number: number(), channel, identities, header, msg_type, cell_id, content })
    }

    /// A text of the content.
    pub fn text(&self, field: &str) -> Option<&str> {
        self.content.get(field)?.as_str()
    }

    /// A truth value of the content; absent or of another kind, `otherwise`.
    pub fn flag(&self, field: &str, otherwise: bool) -> bool {
        self.content.get(field).and_then(Value::as_bool).unwrap_or(otherwise)
    }

    /// A whole number of the content.
    pub fn integer(&self, field: &str) -> Option<i64> {
        self.content.get(field)?.as_i64()
    }
}

fn object(part: &'static str, text: &[u8]) -> Result<Map<String, Value>, MessageError> {
    serde_json::from_slice(text).map_err(|reason| MessageError::NotJson { part, reason })
}

/// Writes the kernel's messages. One per process: its `session` tells clients which kernel process speaks.
pub struct Author {
    signer: Signer,
    session: String,
    written: AtomicU64,
}

impl Author {
    pub fn new(key: &[u8]) -> Self {
        Author { signer: Signer::new(key), session: Uuid::new_v4().simple().to_string(), written: AtomicU64::new(0) }
    }

    pub fn signer(&self) -> &Signer {
        &self.signer
    }

    /// The frames of a reply to `request`. Its type follows from the request's in the whole protocol.
    pub fn reply(&self, request: &Request, content: &Value) -> Vec<Bytes> {
        let subject = request.msg_type.trim_end_matches("_request");
        self.write(request.identities.clone(), &format!("{subject}_reply"), &request.header, content)
    }

    /// The frames of a message to all; `parent` is the header of the request it belongs to.
    pub fn broadcast(&self, msg_type: &str, parent: &Bytes, content: &Value) -> Vec<Bytes> {
        // The topic, by which subscribers may choose, is the type's name.
        self.write(vec![Bytes::copy_from_slice(msg_type.as_bytes())], msg_type, parent, content)
    }

    fn write(&self, identities: Vec<Bytes>, msg_type: &str, parent: &Bytes, content: &Value) -> Vec<Bytes> {
        let count = self.written.fetch_add(1, Ordering::Relaxed);
        let header = json!({
            "msg_id": format!("{}-{count}", self.session),
            "session": self.session,
            "username": "kernel",
            "date": Utc::now().to_rfc3339_opts(SecondsFormat::Micros, true),
            "msg_type": msg_type,
            "version": PROTOCOL_VERSION,
        });
        let empty = Bytes::from_static(b"{}");
        let parts = [Bytes::from(header.to_string()), parent.clone(), empty, Bytes::from(content.to_string())];
        Envelope { identities, parts }.seal(&self.signer)
    }
}

/// The parent header of a message that no request asked for.
pub fn no_parent() -> Bytes {
    Bytes::from_static(b"{}")
}

#[cfg(test)]
mod tests {
    use super::*;

    fn read(parts: [&'static [u8]; 4]) -> Result<Request, MessageError> {
        let signer = Signer::new(b"k");
        let identities = vec![Bytes::from_static(b"peer")];
        let frames = Envelope { identities, parts: parts.map(Bytes::from_static) }.seal(&signer);
        Request::read(frames, &signer, Channel::Shell, || 7)
    }

    #[test]
    fn a_header_needs_its_type_and_nothing_else() {
        let request = read([b"{\"msg_type\":\"x\"}", b"{}", b"{}", b"{\"n\":3,\"t\":\"u\"}"]).unwrap();
        assert_eq!((request.number, request.msg_type.as_str()), (7, "x"));
        assert_eq!((request.integer("n"), request.text("t"), request.text("n")), (Some(3), Some("u"), None));
        assert!(matches!(read([b"{}", b"{}", b"{}", b"{}"]), Err(MessageError::NoMessageType)));
        assert!(matches!(read([b"{\"msg_type\":1}", b"{}", b"{}", b"{}"]), Err(MessageError::NoMessageType)));
    }

    #[test]
    fn every_part_must_be_an_object() {
        let good: [&[u8]; 4] = [b"{\"msg_type\":\"x\"}", b"{}", b"{}", b"{}"];
        for at in 0..4 {
            for junk in [&b""[..], b"{", b"[]", b"null", b"{}x", b"\xff", b"{\"a\": NaN}", b"{\"a\":\"\\ud800\"}"] {
                let mut parts = good;
                parts[at] = junk;
                assert!(matches!(read(parts), Err(MessageError::NotJson { .. })), "{at} {junk:?}");
            }
        }
    }

    #[test]
    fn names_are_declared_once() {
        for (at, row) in MESSAGE_TYPES.iter().enumerate() {
            assert!(MESSAGE_TYPES[..at].iter().all(|other| other.name != row.name), "{} twice", row.name);
        }
    }

    #[test]
    fn every_message_has_an_id_of_its_own_and_the_request_as_parent() {
        let author = Author::new(b"k");
        let request = read([b"{\"msg_type\":\"x_request\",\"later\":[1]}", b"{}", b"{}", b"{}"]).unwrap();
        let mut ids = Vec::new();
        for _ in 0..3 {
            let read = Envelope::open(author.reply(&request, &json!({"status": "ok"})), author.signer()).unwrap();
            assert_eq!(read.identities, request.identities);
            assert_eq!(read.parts[1], request.header);
            let header: Value = serde_json::from_slice(&read.parts[0]).unwrap();
            assert_eq!(header["msg_type"], "x_reply");
            ids.push(header["msg_id"].to_string());
        }
        ids.dedup();
        assert_eq!(ids.len(), 3);
    }
}
