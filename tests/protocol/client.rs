//! A kernel process and a client of it, for the tests of the protocol.
//!
//! [`Client`] looks at every message it gets: signature, topic, header, and that all come from one session. Waiting
//! polls for up to a minute, so that a slow machine fails no test; what does not come by then fails with its name.

use std::fs;
use std::io::Read;
use std::net::TcpListener;
use std::path::{Path, PathBuf};
use std::process::{Child, Command, ExitStatus, Stdio};
use std::thread;
use std::time::{Duration, Instant};

use bytes::Bytes;
use serde_json::{Value, json};
use tempfile::TempDir;
use tokio::time::timeout;
use uuid::Uuid;
use zeromq::{DealerSocket, Socket, SocketRecv, SocketSend, SubSocket, ZmqMessage};

use hessbook::kernel::connection::Channel;
use hessbook::kernel::wire::{Envelope, Signer};

pub const KEY: &str = "a key of the tests";
const PATIENCE: Duration = Duration::from_secs(60);

/// A kernel process; killed when dropped.
pub struct Kernel {
    child: Child,
    pub connection: Value,
    folder: TempDir,
}

impl Kernel {
    /// Starts a kernel on free ports and waits until it answers.
    pub async fn start() -> (Kernel, Client) {
        Kernel::start_with(|_| {}).await
    }

    /// The same with a connection file that was changed before.
    pub async fn start_with(change: impl Fn(&mut Value)) -> (Kernel, Client) {
        // Between choosing free ports and binding them another process may take one: then others are chosen.
        for _ in 0..10 {
            let mut connection = tcp_connection();
            change(&mut connection);
            let mut kernel = Kernel::spawn(connection);
            if let Some(client) = kernel.client().await {
                return (kernel, client);
            }
        }
        panic!("the kernel did not start");
    }

    /// Starts a process without waiting for it.
    pub fn spawn(connection: Value) -> Kernel {
        let folder = tempfile::tempdir().expect("a folder for the connection file");
        let child = start_process(&connection, folder.path());
        Kernel { child, connection, folder }
    }

    /// Kills the process and starts another one with the same file.
    pub fn replace(&mut self) {
        self.child.kill().expect("the kernel can be killed");
        self.child.wait().expect("the kernel's status");
        self.child = start_process(&self.connection, self.folder.path());
    }

    /// A client that has been answered; nothing if the process ended before.
    pub async fn client(&mut self) -> Option<Client> {
        let end = Instant::now() + PATIENCE;
        while Instant::now() < end {
            if self.child.try_wait().expect("the kernel's status").is_some() {
                return None;
            }
            if let Ok(Some(client)) = timeout(Duration::from_secs(2), Client::connect(&self.connection)).await {
                return Some(client);
            }
        }
        panic!("the kernel does not answer");
    }

    pub fn pid(&self) -> u32 {
        self.child.id()
    }

    pub fn running(&mut self) -> bool {
        self.child.try_wait().expect("the kernel's status").is_none()
    }

    /// Waits for the end of the process; gives its status and what it said on stderr.
    pub fn end(&mut self) -> (ExitStatus, String) {
        let end = Instant::now() + PATIENCE;
        while Instant::now() < end {
            if let Some(status) = self.child.try_wait().expect("the kernel's status") {
                let mut said = String::new();
                self.child.stderr.take().expect("stderr").read_to_string(&mut said).expect("text on stderr");
                return (status, said);
            }
            thread::sleep(Duration::from_millis(10));
        }
        panic!("the kernel does not end");
    }
}

impl Drop for Kernel {
    fn drop(&mut self) {
        // It may have ended by itself.
        let _ = self.child.kill();
        let _ = self.child.wait();
    }
}

fn start_process(connection: &Value, folder: &Path) -> Child {
    let file: PathBuf = folder.join("connection.json");
    fs::write(&file, connection.to_string()).expect("the connection file");
    Command::new(env!("CARGO_BIN_EXE_hessbook"))
        .arg("kernel")
        .arg(file)
        .env_remove("JPY_PARENT_PID")
        .stdin(Stdio::null())
        .stderr(Stdio::piped())
        .spawn()
        .expect("the program can be started")
}

/// A connection file for ports that are free at the moment.
pub fn tcp_connection() -> Value {
    let holders: Vec<TcpListener> = (0..5).map(|_| TcpListener::bind(("127.0.0.1", 0)).expect("a port")).collect();
    let port = |at: usize| holders[at].local_addr().expect("its number").port();
    json!({
        "transport": "tcp", "ip": "127.0.0.1", "key": KEY, "signature_scheme": "hmac-sha256",
        "shell_port": port(0), "control_port": port(1), "stdin_port": port(2), "iopub_port": port(3), "hb_port": port(4),
    })
}

pub fn address(connection: &Value, field: &str) -> String {
    let transport = connection["transport"].as_str().expect("transport");
    let separator = if transport == "tcp" { ':' } else { '-' };
    format!("{transport}://{}{separator}{}", connection["ip"].as_str().expect("ip"), connection[field])
}

/// A message that a client received.
#[derive(Clone, Debug)]
pub struct Message {
    pub msg_type: String,
    pub parent: Value,
    pub content: Value,
}

impl Message {
    pub fn state(&self) -> Option<&str> {
        (self.msg_type == "status").then(|| self.content["execution_state"].as_str()).flatten()
    }
}

/// What came of one request.
#[derive(Debug, Default)]
pub struct Exchange {
    pub reply: Option<Message>,
    pub broadcasts: Vec<Message>,
}

impl Exchange {
    pub fn status(&self) -> &str {
        self.reply.as_ref().and_then(|reply| reply.content["status"].as_str()).unwrap_or("no reply")
    }

    /// Text printed on a stream.
    pub fn printed(&self, stream: &str) -> String {
        let texts = self.broadcasts.iter().filter(|message| message.content["name"] == stream);
        texts.filter_map(|message| message.content["text"].as_str()).collect()
    }
}

/// A client with sockets of its own.
pub struct Client {
    shell: DealerSocket,
    control: DealerSocket,
    iopub: SubSocket,
    pub signer: Signer,
    /// What was published and not yet asked for.
    published: Vec<Message>,
    /// The kernel's session id, from the first message on.
    pub session: Option<String>,
}

impl Client {
    /// Connects and waits until both a reply and a broadcast came.
    async fn connect(connection: &Value) -> Option<Client> {
        let mut shell = DealerSocket::new();
        let mut control = DealerSocket::new();
        let mut iopub = SubSocket::new();
        shell.connect(&address(connection, "shell_port")).await.ok()?;
        control.connect(&address(connection, "control_port")).await.ok()?;
        iopub.connect(&address(connection, "iopub_port")).await.ok()?;
        iopub.subscribe("").await.ok()?;
        let signer = Signer::new(connection["key"].as_str()?.as_bytes());
        let mut client = Client { shell, control, iopub, signer, published: Vec::new(), session: None };
        loop {
            let id = client.send(Channel::Control, "kernel_info_request", json!({})).await;
            client.reply_to(Channel::Control, &id).await;
            // The subscription may still be on its way: then this broadcast is lost, and the next is waited for.
            if timeout(Duration::from_millis(200), client.broadcast()).await.is_ok() {
                break;
            }
        }
        while timeout(Duration::from_millis(50), client.broadcast()).await.is_ok() {}
        client.published.clear();
        Some(client)
    }

    fn socket(&mut self, channel: Channel) -> &mut DealerSocket {
        match channel {
            Channel::Shell => &mut self.shell,
            Channel::Control => &mut self.control,
            other => panic!("no requests are sent on {other}"),
        }
    }

    /// Sends a request; gives its header, by which its answers are known.
    pub async fn send(&mut self, channel: Channel, msg_type: &str, content: Value) -> Value {
        self.send_with(channel, msg_type, json!({}), content).await
    }

    /// The same with metadata.
    pub async fn send_with(&mut self, channel: Channel, msg_type: &str, metadata: Value, content: Value) -> Value {
        let header = json!({
            "msg_id": Uuid::new_v4().to_string(), "session": "the client's", "username": "tester \u{1d4b5}",
            "date": "2026-01-01T00:00:00Z", "msg_type": msg_type, "version": "5.4", "a field": ["of our own", null],
        });
        let frames = self.sealed([header.to_string(), "{}".into(), metadata.to_string(), content.to_string()]);
        self.send_frames(channel, frames).await;
        header
    }

    pub fn sealed(&self, parts: [String; 4]) -> Vec<Bytes> {
        Envelope { identities: Vec::new(), parts: parts.map(Bytes::from) }.seal(&self.signer)
    }

    pub async fn send_frames(&mut self, channel: Channel, frames: Vec<Bytes>) {
        let message = ZmqMessage::try_from(frames).expect("frames to send");
        self.socket(channel).send(message).await.expect("the kernel is there");
    }

    /// The next reply on a channel, which must be to the request with this header.
    pub async fn reply_to(&mut self, channel: Channel, header: &Value) -> Message {
        let received = timeout(PATIENCE, self.socket(channel).recv()).await;
        let received = received.unwrap_or_else(|_| panic!("no reply to {}", header["msg_type"])).expect("a reply");
        let mut frames = received.into_vec();
        frames.insert(0, Bytes::new()); // the identity that a DEALER does not see
        let (_, message) = self.open(frames);
        assert_eq!(message.parent, *header, "a reply to something else: {message:?}");
        message
    }

    /// The next broadcast.
    pub async fn broadcast(&mut self) -> Message {
        let received = timeout(PATIENCE, self.iopub.recv()).await.expect("nothing is published").expect("a broadcast");
        let (topics, message) = self.open(received.into_vec());
        assert_eq!(topics, [message.msg_type.as_bytes()], "the topic is the message's type");
        self.published.push(message.clone());
        message
    }

    fn open(&mut self, frames: Vec<Bytes>) -> (Vec<Bytes>, Message) {
        let envelope = Envelope::open(frames, &self.signer).expect("a signed message");
        let [header, parent, _, content] =
            envelope.parts.map(|part| serde_json::from_slice::<Value>(&part).expect("JSON"));
        for field in ["msg_id", "session", "username", "date", "msg_type", "version"] {
            assert!(header[field].is_string(), "header.{field} is {}", header[field]);
        }
        let session = header["session"].as_str().expect("a session").to_owned();
        let known = self.session.get_or_insert_with(|| session.clone());
        assert_eq!(*known, session, "one process, one session");
        let msg_type = header["msg_type"].as_str().expect("a type").to_owned();
        (envelope.identities, Message { msg_type, parent, content })
    }

    /// Takes in broadcasts until one fits, which stays to be collected.
    pub async fn until(&mut self, what: &str, fits: impl Fn(&Message) -> bool) {
        while !self.published.iter().any(&fits) {
            let end = timeout(PATIENCE, self.broadcast()).await;
            end.unwrap_or_else(|_| panic!("{what} is not published"));
        }
    }

    /// All that comes of a request, up to its idle and, if one is expected, its reply.
    pub async fn finish(&mut self, channel: Channel, header: &Value, replied: bool) -> Exchange {
        let mine = |message: &Message| message.parent["msg_id"] == header["msg_id"];
        self.until(&format!("idle after {header}"), |message| mine(message) && message.state() == Some("idle")).await;
        let (broadcasts, others) = std::mem::take(&mut self.published).into_iter().partition(mine);
        self.published = others;
        let reply = match replied {
            true => Some(self.reply_to(channel, header).await),
            false => None,
        };
        Exchange { reply, broadcasts }
    }

    pub async fn execute(&mut self, code: &str) -> Exchange {
        let header = self.send(Channel::Shell, "execute_request", json!({"code": code})).await;
        self.finish(Channel::Shell, &header, true).await
    }

    /// Begins a cell that does not end and waits until it runs.
    pub async fn begin(&mut self, code: &str) -> Value {
        let header = self.send(Channel::Shell, "execute_request", json!({"code": code})).await;
        let id = header["msg_id"].clone();
        self.until("the input", move |message| message.msg_type == "execute_input" && message.parent["msg_id"] == id)
            .await;
        header
    }

    /// Which requests were published, in order: one entry for each run of messages with the same parent.
    pub fn parents_of(messages: &[Message]) -> Vec<&Value> {
        let mut parents: Vec<&Value> = messages.iter().map(|message| &message.parent["msg_id"]).collect();
        parents.dedup();
        parents
    }

    pub fn published(&self) -> &[Message] {
        &self.published
    }
}
