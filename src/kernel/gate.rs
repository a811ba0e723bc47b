//! A gate in front of the message library, which no oversized frame passes.
//!
//! The library sets memory aside for whatever length a frame announces, before it knows whom it talks to: nine bytes
//! from any program that finds the port abort the process (zeromq 0.7.0). So [`Gate`] takes the connections, looks at
//! the frame headers that go by, and hands the bytes on through a local socket that no client is told of. It also
//! knows what has not left yet, which the library does not tell.

use std::fs::Permissions;
use std::io;
use std::os::unix::fs::PermissionsExt;
use std::os::unix::net::UnixListener as StdUnixListener;
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::sync::atomic::{AtomicU64, AtomicUsize, Ordering};
use std::time::Duration;

use tempfile::TempDir;
use tokio::io::{AsyncRead, AsyncReadExt, AsyncWrite, AsyncWriteExt, split};
use tokio::net::{TcpListener, TcpStream, UnixListener, UnixStream};
use tokio::task;
use tokio::time::sleep;

use crate::kernel::connection::Listener;

/// What one message may announce in all. Cells are kilobytes; the largest that the tests send is 10 MB.
const LARGEST_MESSAGE: u64 = 256 * 1024 * 1024;

/// What a frame costs beside its bytes, so that endless empty frames count as well.
const FRAME_COST: u64 = 64;

/// Length of the greeting that opens a connection (ZMTP 3.0, RFC 23).
const GREETING: u64 = 64;

const BUFFER: usize = 16 * 1024;

/// Why a connection is cut.
#[derive(Debug, PartialEq, Eq)]
struct Oversized;

enum Expecting {
    Flags,
    /// The bytes of the length that are still to come, and the length so far.
    Length {
        left: u8,
        length: u64,
    },
    Body {
        left: u64,
    },
}

/// Follows the bytes of one connection from header to header.
struct Inspector {
    expecting: Expecting,
    /// Whether the present frame is followed by another one of its message.
    more: bool,
    /// What the message has announced so far.
    announced: u64,
}

impl Inspector {
    fn new() -> Self {
        Inspector { expecting: Expecting::Body { left: GREETING }, more: false, announced: 0 }
    }

    fn pass(&mut self, mut bytes: &[u8]) -> Result<(), Oversized> {
        while let Some((&first, rest)) = bytes.split_first() {
            self.expecting = match self.expecting {
                Expecting::Flags => {
                    bytes = rest;
                    self.more = first & 0b001 != 0;
                    Expecting::Length { left: if first & 0b010 != 0 { 8 } else { 1 }, length: 0 }
                }
                Expecting::Length { left, length } => {
                    bytes = rest;
                    let length = length << 8 | u64::from(first);
                    if left > 1 {
                        Expecting::Length { left: left - 1, length }
                    } else {
                        self.announced = self.announced.saturating_add(length).saturating_add(FRAME_COST);
                        if self.announced > LARGEST_MESSAGE {
                            return Err(Oversized);
                        }
                        self.body(length)
                    }
                }
                Expecting::Body { left } => {
                    let here = usize::try_from(left).unwrap_or(usize::MAX).min(bytes.len());
                    bytes = &bytes[here..];
                    self.body(left - here as u64)
                }
            };
        }
        Ok(())
    }

    fn body(&mut self, left: u64) -> Expecting {
        if left > 0 {
            return Expecting::Body { left };
        }
        if !self.more {
            self.announced = 0;
        }
        Expecting::Flags
    }
}

/// What is known of the bytes that go out.
#[derive(Default)]
struct Traffic {
    /// Connections that hold bytes which their client does not take.
    holding: AtomicUsize,
    /// How often bytes have gone out.
    moves: AtomicU64,
}

/// A local socket between the gate and the message library.
struct Passage {
    address: PathBuf,
    /// Where the socket lies, if it lies on disk; removed when the passage is closed.
    _folder: Option<TempDir>,
}

impl Passage {
    /// A name that is nowhere on disk, so that a kernel which is killed leaves nothing behind.
    #[cfg(target_os = "linux")]
    fn without_file() -> io::Result<(Passage, StdUnixListener)> {
        use std::os::linux::net::SocketAddrExt;
        use std::os::unix::net::SocketAddr;

        let name = format!("hessbook-{}", uuid::Uuid::new_v4().simple());
        let listener = StdUnixListener::bind_addr(&SocketAddr::from_abstract_name(&name)?)?;
        Ok((Passage { address: PathBuf::from(format!("\0{name}")), _folder: None }, listener))
    }

    /// A file in a folder that only this user may enter, for systems that know no other names.
    fn in_folder() -> io::Result<(Passage, StdUnixListener)> {
        let folder =
            tempfile::Builder::new().prefix("hessbook-").permissions(Permissions::from_mode(0o700)).tempdir()?;
        let address = folder.path().join("gate");
        let listener = StdUnixListener::bind(&address)?;
        Ok((Passage { address, _folder: Some(folder) }, listener))
    }

    fn open() -> io::Result<(Passage, StdUnixListener)> {
        #[cfg(target_os = "linux")]
        if let Ok(opened) = Passage::without_file() {
            return Ok(opened);
        }
        Passage::in_folder()
    }
}

/// Takes the connections of all channels.
#[derive(Default)]
pub struct Gate {
    traffic: Arc<Traffic>,
}

impl Gate {
    /// Takes the connections that come to `listener`; gives the listener for the message library.
    pub fn guard(&self, listener: Listener) -> io::Result<zeromq::Listener> {
        let (passage, behind) = Passage::open()?;
        let traffic = self.traffic.clone();
        match listener {
            Listener::Tcp(listener) => {
                listener.set_nonblocking(true)?;
                let listener = TcpListener::from_std(listener)?;
                task::spawn(async move {
                    loop {
                        let client = listener.accept().await.and_then(|(client, _)| without_delay(client));
                        admit(client, &passage.address, &traffic).await;
                    }
                });
            }
            Listener::Ipc(listener) => {
                listener.set_nonblocking(true)?;
                let listener = UnixListener::from_std(listener)?;
                task::spawn(async move {
                    loop {
                        let client = listener.accept().await.map(|(client, _)| client);
                        admit(client, &passage.address, &traffic).await;
                    }
                });
            }
        }
        Ok(behind.into())
    }

    /// Waits until nothing has gone out for a while and nothing is held; at most for `patience`.
    pub async fn empty(&self, patience: Duration) {
        let step = Duration::from_millis(10);
        let mut quiet = 0;
        let mut waited = Duration::ZERO;
        let mut moves = self.traffic.moves.load(Ordering::Relaxed);
        while quiet < 3 && waited < patience {
            sleep(step).await;
            waited += step;
            let now = self.traffic.moves.load(Ordering::Relaxed);
            let still = now == moves && self.traffic.holding.load(Ordering::Relaxed) == 0;
            quiet = if still { quiet + 1 } else { 0 };
            moves = now;
        }
    }
}

/// Small messages must not wait for company.
fn without_delay(client: TcpStream) -> io::Result<TcpStream> {
    client.set_nodelay(true)?;
    Ok(client)
}

async fn admit<C>(client: io::Result<C>, inner: &Path, traffic: &Arc<Traffic>)
where
    C: AsyncRead + AsyncWrite + Send + 'static,
{
    match client {
        Ok(client) => {
            let (inner, traffic) = (inner.to_owned(), traffic.clone());
            task::spawn(async move {
                // Whatever ends a connection, its end is all that the client sees of it.
                if let Ok(library) = UnixStream::connect(inner).await {
                    escort(client, library, &traffic).await;
                }
            });
        }
        // No more files, or a client that left at once: accepting goes on, without spinning.
        Err(_) => sleep(Duration::from_millis(10)).await,
    }
}

/// Carries bytes both ways until one side ends.
async fn escort(client: impl AsyncRead + AsyncWrite, library: UnixStream, traffic: &Traffic) {
    let (from_client, to_client) = split(client);
    let (from_library, to_library) = library.into_split();
    tokio::select! {
        _ = carry_in(from_client, to_library) => {}
        _ = carry_out(from_library, to_client, traffic) => {}
    }
}

async fn carry_in(mut from: impl AsyncRead + Unpin, mut to: impl AsyncWrite + Unpin) -> io::Result<()> {
    let mut buffer = vec![0; BUFFER];
    let mut inspector = Inspector::new();
    loop {
        let length = from.read(&mut buffer).await?;
        if length == 0 || inspector.pass(&buffer[..length]).is_err() {
            return Ok(());
        }
        to.write_all(&buffer[..length]).await?;
    }
}

async fn carry_out(
    mut from: impl AsyncRead + Unpin,
    mut to: impl AsyncWrite + Unpin,
    traffic: &Traffic,
) -> io::Result<()> {
    let mut buffer = vec![0; BUFFER];
    loop {
        let length = from.read(&mut buffer).await?;
        if length == 0 {
            return Ok(());
        }
        let _held = Held::new(traffic);
        to.write_all(&buffer[..length]).await?;
        traffic.moves.fetch_add(1, Ordering::Relaxed);
    }
}

/// Counts a connection as holding bytes for as long as it lives: also when the connection is cut meanwhile.
struct Held<'t>(&'t Traffic);

impl<'t> Held<'t> {
    fn new(traffic: &'t Traffic) -> Self {
        traffic.holding.fetch_add(1, Ordering::Relaxed);
        Held(traffic)
    }
}

impl Drop for Held<'_> {
    fn drop(&mut self) {
        self.0.holding.fetch_sub(1, Ordering::Relaxed);
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::io::{Read, Write};
    use std::os::unix::net::UnixStream as StdUnixStream;
    use tokio::runtime;

    fn greeted(frames: &[&[u8]]) -> Vec<u8> {
        let mut bytes = vec![0; 64];
        for frame in frames {
            bytes.extend_from_slice(frame);
        }
        bytes
    }

    fn long(flags: u8, length: u64) -> Vec<u8> {
        let mut header = vec![flags];
        header.extend_from_slice(&length.to_be_bytes());
        header
    }

    /// The verdict must not depend on how the bytes are cut into pieces.
    fn verdict(bytes: &[u8]) -> Result<(), Oversized> {
        let mut verdicts: Vec<Result<(), Oversized>> = [1, 2, 7, 64, bytes.len()]
            .map(|piece| {
                let mut inspector = Inspector::new();
                bytes.chunks(piece).try_for_each(|piece| inspector.pass(piece))
            })
            .into();
        verdicts.dedup();
        assert_eq!(verdicts.len(), 1, "{verdicts:?}");
        verdicts.remove(0)
    }

    #[test]
    fn messages_pass_and_lengths_beyond_all_memory_do_not() {
        let short = [0b001, 2, b'a', b'b'];
        let last = [0b000, 0];
        let command = [0b100, 3, 1, 2, 3];
        let mut middle = long(0b011, 300);
        middle.extend_from_slice(&[7; 300]);
        assert_eq!(verdict(&greeted(&[&command, &short, &middle, &last, &short, &last])), Ok(()));
        for length in [LARGEST_MESSAGE + 1, 1 << 40, 0x7f7f_7f7f_7f7f_7f7f, u64::MAX] {
            for flags in [0b010, 0b011, 0b110, 0xff] {
                assert_eq!(verdict(&greeted(&[&short, &last, &long(flags, length)])), Err(Oversized));
            }
        }
    }

    #[test]
    fn a_message_of_many_frames_is_counted_as_a_whole() {
        let third = long(0b011, LARGEST_MESSAGE / 3);
        let mut inspector = Inspector::new();
        inspector.pass(&[0; 64]).unwrap();
        let body = vec![0; usize::try_from(LARGEST_MESSAGE / 3).unwrap()];
        for _ in 0..2 {
            inspector.pass(&third).unwrap();
            inspector.pass(&body).unwrap();
        }
        assert_eq!(inspector.pass(&third), Err(Oversized));
    }

    #[test]
    fn endless_empty_frames_are_cut() {
        let mut inspector = Inspector::new();
        inspector.pass(&[0; 64]).unwrap();
        let frames = [0b001, 0].repeat(1000);
        let passed = (0..100_000).take_while(|_| inspector.pass(&frames).is_ok()).count();
        assert_eq!(passed as u64, LARGEST_MESSAGE / (1000 * FRAME_COST));
    }

    #[test]
    fn a_passage_connects_and_leaves_nothing_behind() {
        let runtime = runtime::Builder::new_current_thread().enable_all().build().unwrap();
        for (passage, listener) in [Passage::open().unwrap(), Passage::in_folder().unwrap()] {
            let mut carried = [0; 5];
            runtime.block_on(async {
                let mut inner = UnixStream::connect(&passage.address).await.unwrap();
                inner.write_all(b"bytes").await.unwrap();
            });
            listener.accept().unwrap().0.read_exact(&mut carried).unwrap();
            assert_eq!(&carried, b"bytes");
            let folder = passage._folder.as_ref().map(|folder| folder.path().to_owned());
            drop(passage);
            assert!(folder.is_none_or(|folder| !folder.exists()));
        }
    }

    #[test]
    fn bytes_pass_both_ways_until_a_header_is_oversized() {
        let folder = tempfile::tempdir().unwrap();
        let outside = folder.path().join("outside");
        let listener = Listener::Ipc(StdUnixListener::bind(&outside).unwrap());
        let runtime = runtime::Builder::new_current_thread().enable_all().build().unwrap();
        let gate = Gate::default();
        let guard = runtime.enter();
        let Ok(zeromq::Listener::Ipc(behind)) = gate.guard(listener) else { panic!("a local listener") };
        drop(guard);
        let talk = std::thread::spawn(move || {
            let mut client = StdUnixStream::connect(outside).unwrap();
            let (mut library, _) = behind.accept().unwrap();
            client.write_all(&greeted(&[&[0b000, 2, b'h', b'i']])).unwrap();
            let mut heard = [0; 68];
            library.read_exact(&mut heard).unwrap();
            assert_eq!(&heard[66..], b"hi");
            library.write_all(b"yes").unwrap();
            let mut answer = [0; 3];
            client.read_exact(&mut answer).unwrap();
            assert_eq!(&answer, b"yes");
            client.write_all(&long(0b010, 1 << 40)).unwrap();
            // Both ends are closed, and nothing of the header has passed.
            assert_eq!(library.read(&mut heard).unwrap(), 0);
            assert_eq!(client.read(&mut answer).unwrap_or(0), 0);
        });
        runtime.block_on(async {
            while !talk.is_finished() {
                sleep(Duration::from_millis(1)).await;
            }
            gate.empty(Duration::from_secs(60)).await;
        });
        talk.join().unwrap();
        assert_eq!(gate.traffic.holding.load(Ordering::Relaxed), 0);
    }
}
