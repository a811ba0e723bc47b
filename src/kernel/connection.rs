//! The connection file: where a kernel listens, and the key that signs its messages.
//!
//! [`Connection`] is the file, checked; [`Connection::bind`] takes the five addresses or says which one is taken.
//! The file belongs to the client: it is read once and neither changed nor removed. Fields we do not know are left
//! alone, since clients add their own.

use std::fmt;
use std::fs;
use std::io;
use std::net::TcpListener;
use std::os::unix::fs::FileTypeExt;
use std::os::unix::net::{UnixListener, UnixStream};
use std::path::{Path, PathBuf};

use serde_json::{Map, Value};
use thiserror::Error;

use crate::fault::Explain;

/// The only signature scheme served.
const SCHEME: &str = "hmac-sha256";

/// The five sockets of a kernel.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Channel {
    Shell,
    Control,
    Stdin,
    Iopub,
    Heartbeat,
}

impl Channel {
    const ALL: [Channel; 5] = [Channel::Shell, Channel::Control, Channel::Stdin, Channel::Iopub, Channel::Heartbeat];

    fn port_field(self) -> &'static str {
        match self {
            Channel::Shell => "shell_port",
            Channel::Control => "control_port",
            Channel::Stdin => "stdin_port",
            Channel::Iopub => "iopub_port",
            Channel::Heartbeat => "hb_port",
        }
    }
}

impl fmt::Display for Channel {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.port_field().trim_end_matches("_port"))
    }
}

/// Why a kernel cannot take up the place that its connection file names.
#[derive(Debug, Error)]
pub enum ConnectionError {
    #[error("cannot read the connection file {}: {reason}", path.display())]
    Unreadable { path: PathBuf, reason: io::Error },
    #[error("the connection file is not JSON: {reason}")]
    NotJson { reason: serde_json::Error },
    #[error("the connection file holds no object but {found}")]
    NotAnObject { found: &'static str },
    #[error("the connection file has no usable {field}: it needs {wanted} and has {found}")]
    BadField { field: &'static str, wanted: &'static str, found: String },
    #[error("cannot listen on {address} for {channel}: {reason}")]
    AddressTaken { channel: Channel, address: String, reason: io::Error },
}

impl Explain for ConnectionError {
    fn code(&self) -> &'static str {
        match self {
            ConnectionError::Unreadable { .. } => "connection-file-unreadable",
            ConnectionError::NotJson { .. } => "connection-file-not-json",
            ConnectionError::NotAnObject { .. } => "connection-file-not-an-object",
            ConnectionError::BadField { .. } => "connection-field-unusable",
            ConnectionError::AddressTaken { .. } => "address-taken",
        }
    }

    fn hint(&self) -> String {
        match self {
            ConnectionError::Unreadable { .. } => {
                "start the kernel from a notebook client, which writes this file and passes its path".to_owned()
            }
            ConnectionError::NotJson { .. } | ConnectionError::NotAnObject { .. } => {
                "pass the file that the notebook client wrote, whole and unedited".to_owned()
            }
            ConnectionError::BadField { field, wanted, .. } => format!("give {field} {wanted}"),
            ConnectionError::AddressTaken { .. } => {
                "end the program that listens there, or let the client choose other ports".to_owned()
            }
        }
    }
}

/// An address that is taken.
#[derive(Debug)]
pub enum Listener {
    Tcp(TcpListener),
    Ipc(UnixListener),
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Transport {
    Tcp,
    Ipc,
}

/// What a connection file says, checked.
#[derive(Clone, Debug)]
pub struct Connection {
    transport: Transport,
    /// A host address, or the stem of a socket path where the transport is `ipc`.
    ip: String,
    /// In the order of [`Channel::ALL`].
    ports: [u16; 5],
    key: Vec<u8>,
}

impl Connection {
    /// Reads and checks the file at `path`.
    pub fn read(path: &Path) -> Result<Connection, ConnectionError> {
        let text = fs::read(path).map_err(|reason| ConnectionError::Unreadable { path: path.to_owned(), reason })?;
        Connection::parse(&text)
    }

    /// Checks the text of a connection file.
    pub fn parse(text: &[u8]) -> Result<Connection, ConnectionError> {
        let fields = match serde_json::from_slice(text).map_err(|reason| ConnectionError::NotJson { reason })? {
            Value::Object(fields) => fields,
            other => return Err(ConnectionError::NotAnObject { found: kind_of(&other) }),
        };
        let transport = match text_field(&fields, "transport", "\"tcp\" or \"ipc\"")?.as_str() {
            "tcp" => Transport::Tcp,
            "ipc" => Transport::Ipc,
            other => return Err(unusable("transport", "\"tcp\" or \"ipc\"", other)),
        };
        let ip = text_field(&fields, "ip", "an address or a path")?;
        let mut ports = [0; 5];
        for (port, channel) in ports.iter_mut().zip(Channel::ALL) {
            *port = port_field(&fields, channel.port_field())?;
        }
        // Absent means the default of the protocol. Another scheme is refused: replies signed otherwise than the
        // client expects would be dropped there without a word.
        let scheme = match fields.get("signature_scheme") {
            None => SCHEME.to_owned(),
            Some(_) => text_field(&fields, "signature_scheme", SCHEME)?,
        };
        if scheme != SCHEME {
            return Err(unusable("signature_scheme", SCHEME, &scheme));
        }
        let key = text_field(&fields, "key", "a text, empty to switch signing off")?.into_bytes();
        Ok(Connection { transport, ip, ports, key })
    }

    /// The key of the signatures; empty where signing is off.
    pub fn key(&self) -> &[u8] {
        &self.key
    }

    /// Takes the address of one channel.
    pub fn bind(&self, channel: Channel) -> Result<Listener, ConnectionError> {
        let taken = |address: String| move |reason| ConnectionError::AddressTaken { channel, address, reason };
        let port = self.ports[channel as usize];
        match self.transport {
            Transport::Tcp => {
                let listener = TcpListener::bind((self.ip.as_str(), port));
                Ok(Listener::Tcp(listener.map_err(taken(format!("{}:{port}", self.ip)))?))
            }
            Transport::Ipc => {
                let path = self.socket_path(channel);
                let address = path.display().to_string();
                remove_if_deserted(&path).map_err(taken(address.clone()))?;
                Ok(Listener::Ipc(UnixListener::bind(&path).map_err(taken(address))?))
            }
        }
    }

    /// Removes the socket files, which would otherwise stay behind.
    pub fn leave(&self) {
        if self.transport == Transport::Ipc {
            for channel in Channel::ALL {
                // A file that somebody else removed already is no loss.
                let _ = fs::remove_file(self.socket_path(channel));
            }
        }
    }

    fn socket_path(&self, channel: Channel) -> PathBuf {
        PathBuf::from(format!("{}-{}", self.ip, self.ports[channel as usize]))
    }
}

/// A kernel that was killed leaves its socket files, and a restart uses the same paths: such a file is removed, one
/// that a living process listens on is not.
fn remove_if_deserted(path: &Path) -> io::Result<()> {
    match fs::symlink_metadata(path) {
        Ok(found) if found.file_type().is_socket() => {}
        Ok(_) | Err(_) => return Ok(()), // bind says what is wrong with it
    }
    match UnixStream::connect(path) {
        Err(reason) if reason.kind() == io::ErrorKind::ConnectionRefused => fs::remove_file(path),
        _ => Err(io::ErrorKind::AddrInUse.into()),
    }
}

fn kind_of(value: &Value) -> &'static str {
    match value {
        Value::Null => "null",
        Value::Bool(_) => "a truth value",
        Value::Number(_) => "a number",
        Value::String(_) => "a text",
        Value::Array(_) => "a list",
        Value::Object(_) => "an object",
    }
}

fn unusable(field: &'static str, wanted: &'static str, found: &str) -> ConnectionError {
    ConnectionError::BadField { field, wanted, found: format!("\"{found}\"") }
}

fn text_field(
    fields: &Map<String, Value>,
    field: &'static str,
    wanted: &'static str,
) -> Result<String, ConnectionError> {
    match fields.get(field) {
        Some(Value::String(text)) => Ok(text.clone()),
        Some(other) => Err(ConnectionError::BadField { field, wanted, found: other.to_string() }),
        None => Err(ConnectionError::BadField { field, wanted, found: "nothing".to_owned() }),
    }
}

fn port_field(fields: &Map<String, Value>, field: &'static str) -> Result<u16, ConnectionError> {
    // Port 0 would be a free port that no client could find out.
    let port = fields.get(field).and_then(Value::as_u64).and_then(|port| u16::try_from(port).ok());
    match port {
        Some(port) if port > 0 => Ok(port),
        _ => {
            let found = fields.get(field).map_or_else(|| "nothing".to_owned(), Value::to_string);
            Err(ConnectionError::BadField { field, wanted: "a port from 1 to 65535", found })
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use serde_json::json;

    fn file(changes: &[(&str, Value)]) -> Vec<u8> {
        let mut file = json!({
            "transport": "tcp", "ip": "127.0.0.1", "shell_port": 1, "control_port": 2, "stdin_port": 3,
            "iopub_port": 4, "hb_port": 5, "key": "abc", "signature_scheme": "hmac-sha256", "kernel_name": "x",
        });
        for (field, value) in changes {
            file[*field] = value.clone();
        }
        serde_json::to_vec(&file).unwrap()
    }

    #[test]
    fn fields_of_the_clients_own_are_left_alone() {
        let connection = Connection::parse(&file(&[("later", json!({"x": [1, null]}))])).unwrap();
        assert_eq!(connection.key(), b"abc");
        assert_eq!(connection.ports, [1, 2, 3, 4, 5]);
    }

    #[test]
    fn what_cannot_be_served_is_refused_naming_the_field() {
        for (field, value) in [
            ("shell_port", json!("x")),
            ("hb_port", json!(70_000)),
            ("iopub_port", json!(0)),
            ("stdin_port", json!(-1)),
            ("transport", json!("pigeon")),
            ("signature_scheme", json!("hmac-sha512")),
            ("signature_scheme", json!(7)),
            ("key", json!(null)),
            ("ip", json!([])),
        ] {
            let refusal = Connection::parse(&file(&[(field, value.clone())])).unwrap_err();
            assert!(refusal.to_string().contains(field), "{field} {value}: {refusal}");
            assert_eq!(refusal.code(), "connection-field-unusable");
            assert!(!refusal.hint().is_empty());
        }
    }

    #[test]
    fn what_is_no_connection_file_is_refused() {
        assert_eq!(Connection::parse(b"").unwrap_err().code(), "connection-file-not-json");
        assert_eq!(Connection::parse(b"{\"shell_port\": 5").unwrap_err().code(), "connection-file-not-json");
        assert_eq!(Connection::parse(b"[]").unwrap_err().code(), "connection-file-not-an-object");
        assert_eq!(Connection::parse(b"{}").unwrap_err().code(), "connection-field-unusable");
    }

    #[test]
    fn a_taken_port_is_named_with_its_channel() {
        let holder = TcpListener::bind(("127.0.0.1", 0)).unwrap();
        let port = holder.local_addr().unwrap().port();
        let connection = Connection::parse(&file(&[("iopub_port", json!(port))])).unwrap();
        let refusal = connection.bind(Channel::Iopub).unwrap_err();
        assert!(refusal.to_string().contains(&format!("127.0.0.1:{port} for iopub")), "{refusal}");
    }

    #[test]
    fn a_deserted_socket_file_is_replaced_and_a_living_one_is_not() {
        let folder = tempfile::tempdir().unwrap();
        let stem = folder.path().join("s");
        let connection =
            Connection::parse(&file(&[("transport", json!("ipc")), ("ip", json!(stem.to_str().unwrap()))])).unwrap();
        let first = connection.bind(Channel::Shell).unwrap();
        assert_eq!(connection.bind(Channel::Shell).unwrap_err().code(), "address-taken");
        drop(first);
        assert!(connection.socket_path(Channel::Shell).exists());
        connection.bind(Channel::Shell).unwrap();
        connection.leave();
        assert!(!connection.socket_path(Channel::Shell).exists());
    }
}
