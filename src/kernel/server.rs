//! The thread of the sockets: receives, routes, sends, and never waits for a cell.
//!
//! [`serve`] runs a kernel to its end. Every socket has a task of its own that receives for ever, since a socket
//! that nobody polls never notices that its peers are gone. Requests of the shell channel go to the worker; control,
//! heartbeat and signals are answered here, also while a cell runs.

use std::io::{self, Write};
use std::sync::atomic::{AtomicBool, AtomicU32, Ordering};
use std::sync::mpsc::Sender;
use std::sync::{Arc, Mutex, PoisonError};
use std::time::Duration;

use bytes::Bytes;
use serde_json::{Value, json};
use thiserror::Error;
use tokio::runtime;
use tokio::signal::unix::{SignalKind, signal};
use tokio::sync::{Notify, mpsc};
use tokio::task::{self, JoinSet};
use tokio::time::{sleep, timeout};
use zeromq::{PubSocket, RouterRecvHalf, RouterSendHalf, RouterSocket, Socket, SocketRecv, SocketSend, ZmqMessage};

use crate::fault::Explain;
use crate::kernel::arrivals::Arrivals;
use crate::kernel::connection::{Channel, Connection, ConnectionError, Listener};
use crate::kernel::gate::Gate;
use crate::kernel::host::Streams;
use crate::kernel::message::{Author, Handler, Request, handler_of, no_parent};
use crate::kernel::outbox::{Outbox, Outgoing, QUEUE};
use crate::kernel::parent;
use crate::kernel::worker::Worker;

/// How long a client's full queue may hold up a reply to it before the reply is dropped.
const PATIENCE_WITH_A_CLIENT: Duration = Duration::from_millis(200);

/// How long a running cell may take to come to its end when the kernel ends. Managers use force after 2.5 s.
const LAST_CELL: Duration = Duration::from_millis(1500);

/// How long clients may take to fetch the last messages.
const LAST_MESSAGES: Duration = Duration::from_millis(500);

/// How many refused messages are reported on stderr.
const REPORTED_REFUSALS: u32 = 10;

/// Why a kernel does not run.
#[derive(Debug, Error)]
pub enum ServerError {
    #[error(transparent)]
    Connection(#[from] ConnectionError),
    #[error("cannot start the kernel's threads: {0}")]
    Start(#[source] io::Error),
    #[error("cannot adopt the socket of {channel}: {reason}")]
    Socket { channel: Channel, reason: String },
    #[error("{part} of the kernel broke off")]
    Broken { part: &'static str },
}

impl Explain for ServerError {
    fn code(&self) -> &'static str {
        match self {
            ServerError::Connection(error) => error.code(),
            ServerError::Start(_) => "kernel-start-failed",
            ServerError::Socket { .. } => "kernel-socket-failed",
            ServerError::Broken { .. } => "kernel-broken",
        }
    }

    fn hint(&self) -> String {
        match self {
            ServerError::Connection(error) => error.hint(),
            ServerError::Start(_) | ServerError::Socket { .. } => {
                "look at the limits of the account (threads, open files, memory) and start again".to_owned()
            }
            ServerError::Broken { .. } => "start the kernel again, and report the lines above".to_owned(),
        }
    }
}

/// The running kernel, as requests may act on it.
#[derive(Default)]
pub struct Process {
    arrivals: Arc<Arrivals>,
    ending: AtomicBool,
}

impl Process {
    /// Ends the running cell and cancels those that wait.
    pub fn interrupt(&self) {
        self.arrivals.interrupt();
    }

    /// Ends the kernel, once the reply that is being made has been sent.
    pub fn end(&self) {
        self.arrivals.close();
        self.ending.store(true, Ordering::SeqCst);
    }
}

/// Serves a client until it asks for the end, a signal does, or its process is gone.
pub fn serve(connection: &Connection) -> Result<(), ServerError> {
    let [shell, control, stdin, iopub, heartbeat] =
        [Channel::Shell, Channel::Control, Channel::Stdin, Channel::Iopub, Channel::Heartbeat]
            .map(|channel| connection.bind(channel));
    let listeners = [shell?, control?, stdin?, iopub?, heartbeat?];
    let runtime = runtime::Builder::new_current_thread().enable_all().build().map_err(ServerError::Start)?;
    let ended = runtime.block_on(run(connection, listeners));
    runtime.shutdown_background();
    connection.leave();
    ended
}

/// What the tasks of this thread share.
struct Office {
    author: Arc<Author>,
    process: Process,
    /// Broadcasts made on this thread. Without bound, since waiting here would be waiting for oneself.
    broadcasts: mpsc::UnboundedSender<Vec<Bytes>>,
    /// The way to the worker, which ends when this is taken away and what was sent before is answered.
    work: Mutex<Option<Sender<Request>>>,
    ended: Notify,
    refusals: AtomicU32,
}

impl Office {
    fn status(&self, parent: &Bytes, state: &str) {
        let content = json!({"execution_state": state});
        // An error means that the kernel is ending.
        let _ = self.broadcasts.send(self.author.broadcast("status", parent, &content));
    }

    /// Checks and reads what a socket received; what is refused leaves nothing but a line on stderr.
    fn read(&self, message: ZmqMessage, channel: Channel) -> Option<Request> {
        let number = || match channel {
            Channel::Shell => self.process.arrivals.number(),
            _ => 0,
        };
        match Request::read(message.into_vec(), self.author.signer(), channel, number) {
            Ok(request) => Some(request),
            Err(refusal) => {
                let count = self.refusals.fetch_add(1, Ordering::Relaxed);
                // A client that has closed our stderr is no reason to end.
                if count < REPORTED_REFUSALS {
                    let _ = writeln!(io::stderr(), "hessbook: a message on {channel} was put aside: {refusal}");
                } else if count == REPORTED_REFUSALS {
                    let _ = writeln!(io::stderr(), "hessbook: further messages that are put aside are not reported");
                }
                None
            }
        }
    }

    /// Answers a request on this thread.
    async fn answer(&self, request: &Request, handler: Option<Handler>, replies: &mut RouterSendHalf) {
        self.status(&request.header, "busy");
        let content: Option<Value> = match handler {
            Some(Handler::Plain(handle)) => Some(handle(request)),
            Some(Handler::Process(handle)) => {
                // The cells that a client sent before an interrupt may still lie in the socket of another channel.
                settle(&self.process.arrivals).await;
                Some(handle(&self.process, request))
            }
            // These belong to the worker, and to the shell channel.
            Some(Handler::Worker(_) | Handler::Silent(_)) | None => None,
        };
        if let Some(content) = content {
            send_to(replies, self.author.reply(request, &content)).await;
        }
        self.status(&request.header, "idle");
        if self.process.ending.load(Ordering::SeqCst) {
            self.ended.notify_one();
        }
    }

    /// Hands a request to the worker, unless the kernel is ending.
    fn pass_on(&self, request: Request) {
        if let Some(worker) = self.work.lock().unwrap_or_else(PoisonError::into_inner).as_ref() {
            // An error means that the worker broke off, which the main task notices.
            let _ = worker.send(request);
        }
    }

    fn dismiss_worker(&self) {
        self.work.lock().unwrap_or_else(PoisonError::into_inner).take();
    }
}

async fn run(connection: &Connection, listeners: [Listener; 5]) -> Result<(), ServerError> {
    // Before anything else: a signal that finds no handler kills the process.
    let mut interrupts = signal(SignalKind::interrupt()).map_err(ServerError::Start)?;
    let mut terminations = signal(SignalKind::terminate()).map_err(ServerError::Start)?;

    let gate = Gate::default();
    let [shell, control, stdin, iopub, heartbeat] = listeners;
    let (shell_replies, shell_requests) = adopt::<RouterSocket>(&gate, Channel::Shell, shell).await?.split();
    let (control_replies, control_requests) = adopt::<RouterSocket>(&gate, Channel::Control, control).await?.split();
    let stdin = adopt::<RouterSocket>(&gate, Channel::Stdin, stdin).await?;
    let heartbeat = adopt::<RouterSocket>(&gate, Channel::Heartbeat, heartbeat).await?;
    let iopub = adopt::<PubSocket>(&gate, Channel::Iopub, iopub).await?;

    let author = Arc::new(Author::new(connection.key()));
    let process = Process::default();
    let arrivals = process.arrivals.clone();
    let streams = Arc::new(Streams::default());
    let (queue, outgoing) = mpsc::channel(QUEUE);
    let weak_queue = queue.downgrade();
    let outbox = Outbox::new(author.clone(), queue, streams.clone());
    let work = Worker::start(outbox, arrivals.clone()).map_err(ServerError::Start)?;
    let (broadcasts, own_broadcasts) = mpsc::unbounded_channel();
    let office = Arc::new(Office {
        author: author.clone(),
        process,
        broadcasts,
        work: Mutex::new(Some(work)),
        ended: Notify::new(),
        refusals: AtomicU32::new(0),
    });

    office.status(&no_parent(), "starting");
    let mut tasks = JoinSet::new();
    tasks.spawn(serve_shell(office.clone(), shell_requests, shell_replies.clone()));
    tasks.spawn(serve_control(office.clone(), control_requests, control_replies));
    tasks.spawn(drop_input(stdin));
    tasks.spawn(beat(heartbeat));
    task::spawn(async move { streams.keep_flushed(&author, weak_queue).await });
    let mut sending = task::spawn(send_all(arrivals.clone(), iopub, shell_replies, outgoing, own_broadcasts));
    task::spawn(async move {
        while interrupts.recv().await.is_some() {
            settle(&arrivals).await;
            arrivals.interrupt();
        }
    });

    tokio::select! {
        () = office.ended.notified() => {}
        _ = terminations.recv() => {}
        () = parent::gone() => {}
        // Neither ends by itself. A kernel that is half there is worse than none: clients start it again.
        _ = &mut sending => return Err(ServerError::Broken { part: "the worker" }),
        Some(_) = tasks.join_next() => return Err(ServerError::Broken { part: "a socket" }),
    }
    office.process.end();
    office.dismiss_worker();
    // The worker ends when it has answered what it was given, and the sending task when it has sent that. A cell that
    // does not end in time is left behind. The sockets come back from the task, since dropping them loses messages.
    let sockets = timeout(LAST_CELL, sending).await;
    gate.empty(LAST_MESSAGES).await;
    drop(sockets);
    Ok(())
}

async fn adopt<S: Socket>(gate: &Gate, channel: Channel, listener: Listener) -> Result<S, ServerError> {
    let mut socket = S::new();
    let guarded = gate.guard(listener).map_err(ServerError::Start)?;
    let bound = socket.bind_listener(guarded).await;
    bound.map_err(|reason| ServerError::Socket { channel, reason: reason.to_string() })?;
    Ok(socket)
}

/// Waits until the requests that lie in the sockets have been numbered.
///
/// A message passes several tasks before it is numbered, and each sleep lets the runtime look at its sockets as often
/// as there is something to do. As long as a round brings new requests, another one follows; their number is bounded,
/// since a client may send without end.
async fn settle(arrivals: &Arrivals) {
    sleep(Duration::from_millis(1)).await;
    for _ in 0..50 {
        let before = arrivals.count();
        sleep(Duration::from_millis(1)).await;
        if arrivals.count() == before {
            return;
        }
    }
}

async fn serve_shell(office: Arc<Office>, mut requests: RouterRecvHalf, mut replies: RouterSendHalf) {
    loop {
        let Some(request) = receive(&mut requests, &office, Channel::Shell).await else { continue };
        match handler_of(&request.msg_type, Channel::Shell) {
            // A shutdown must not wait behind the cell that it is to end.
            handler @ Some(Handler::Process(_)) => office.answer(&request, handler, &mut replies).await,
            _ => office.pass_on(request),
        }
    }
}

async fn serve_control(office: Arc<Office>, mut requests: RouterRecvHalf, mut replies: RouterSendHalf) {
    loop {
        let Some(request) = receive(&mut requests, &office, Channel::Control).await else { continue };
        let handler = handler_of(&request.msg_type, Channel::Control);
        office.answer(&request, handler, &mut replies).await;
    }
}

async fn receive(requests: &mut RouterRecvHalf, office: &Office, channel: Channel) -> Option<Request> {
    match requests.recv().await {
        Ok(message) => office.read(message, channel),
        Err(_) => {
            pause().await;
            None
        }
    }
}

/// No cell asks for input, so whatever comes here is not asked for.
async fn drop_input(mut socket: RouterSocket) {
    loop {
        if socket.recv().await.is_err() {
            pause().await;
        }
    }
}

/// Sends back what comes. A ROUTER cannot be told from a REP by clients and stays well after malformed requests.
async fn beat(mut socket: RouterSocket) {
    loop {
        match socket.recv().await {
            Ok(message) => {
                // An error means that the client is gone.
                let _ = timeout(PATIENCE_WITH_A_CLIENT, socket.send(message)).await;
            }
            Err(_) => pause().await,
        }
    }
}

/// One peer's bad message may come back as an error of the socket: the loop goes on, and must not spin.
async fn pause() {
    sleep(Duration::from_millis(1)).await;
}

/// Sends what the worker and this thread made, until the worker is gone; then gives the sockets back.
async fn send_all(
    arrivals: Arc<Arrivals>,
    mut iopub: PubSocket,
    mut shell: RouterSendHalf,
    mut outgoing: mpsc::Receiver<Outgoing>,
    mut broadcasts: mpsc::UnboundedReceiver<Vec<Bytes>>,
) -> (PubSocket, RouterSendHalf) {
    loop {
        tokio::select! {
            biased;
            Some(frames) = broadcasts.recv() => publish(&mut iopub, frames).await,
            next = outgoing.recv() => match next {
                Some(Outgoing::Message { channel: Channel::Iopub, frames }) => publish(&mut iopub, frames).await,
                Some(Outgoing::Message { frames, .. }) => send_to(&mut shell, frames).await,
                Some(Outgoing::Settle(settled)) => {
                    settle(&arrivals).await;
                    // An error means that the worker does not wait any more.
                    let _ = settled.send(());
                }
                None => break,
            }
        }
    }
    while let Ok(frames) = broadcasts.try_recv() {
        publish(&mut iopub, frames).await;
    }
    (iopub, shell)
}

async fn publish(iopub: &mut PubSocket, frames: Vec<Bytes>) {
    if let Ok(message) = ZmqMessage::try_from(frames) {
        // PUB never fails and never waits: it drops what a subscriber does not take.
        let _ = iopub.send(message).await;
    }
}

async fn send_to(replies: &mut RouterSendHalf, frames: Vec<Bytes>) {
    if let Ok(message) = ZmqMessage::try_from(frames) {
        // An error means that the client is gone, a lapse that it does not read: its reply is dropped.
        let _ = timeout(PATIENCE_WITH_A_CLIENT, replies.send(message)).await;
    }
}
