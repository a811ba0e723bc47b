//! The kernel as its clients meet it: a process, real sockets on loopback, every message looked at.
//!
//! The files beside `protocol/client.rs` are recorded exchanges: requests that are sent at once, each with the content
//! of its reply and all that must be published for it, in order. `"*"` stands for any content; neighbouring pieces
//! of one stream count as one, since batches depend on time.

#[path = "protocol/client.rs"]
mod client;

use std::collections::BTreeSet;
use std::fs;
use std::io::Write;
use std::net::TcpStream;
use std::path::{Path, PathBuf};
use std::process::Command;

use bytes::Bytes;
use serde_json::{Value, json};
use tokio::runtime;
use zeromq::{ReqSocket, Socket, SocketRecv, SocketSend};

use client::{Client, Exchange, Kernel, Message, address, tcp_connection};
use hessbook::kernel::connection::Channel;
use hessbook::kernel::message::MESSAGE_TYPES;
use hessbook::kernel::wire::{DELIMITER, Signer};

fn run(test: impl Future<Output = ()>) {
    runtime::Builder::new_current_thread().enable_all().build().expect("a runtime").block_on(test);
}

fn recordings() -> Vec<(PathBuf, Value)> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/protocol");
    let mut files: Vec<PathBuf> = fs::read_dir(folder).unwrap().map(|entry| entry.unwrap().path()).collect();
    let named = |file: &Path| file.file_name().unwrap().to_string_lossy().into_owned();
    files.retain(|file| named(file).ends_with(".json") && !named(file).starts_with("snippets"));
    files.sort();
    assert!(!files.is_empty());
    let read = |file: &PathBuf| {
        let text = fs::read_to_string(file).unwrap();
        serde_json::from_str(&text).unwrap_or_else(|reason| panic!("{}: {reason}", file.display()))
    };
    files.iter().map(|file| (file.clone(), read(file))).collect()
}

fn channel_of(request: &Value) -> Channel {
    match request["on"].as_str() {
        Some("shell") => Channel::Shell,
        Some("control") => Channel::Control,
        other => panic!("a request on {other:?}"),
    }
}

/// What differs between what was expected and what came; `"*"` fits everything.
fn difference(path: &str, expected: &Value, found: &Value) -> Option<String> {
    match (expected, found) {
        (Value::String(any), _) if any == "*" => None,
        (Value::Object(expected), Value::Object(found)) => {
            let names = |fields: &serde_json::Map<String, Value>| fields.keys().cloned().collect::<BTreeSet<_>>();
            if names(expected) != names(found) {
                return Some(format!("{path} has the fields {:?}, not {:?}", names(found), names(expected)));
            }
            expected.iter().find_map(|(name, value)| difference(&format!("{path}.{name}"), value, &found[name]))
        }
        (Value::Array(expected), Value::Array(found)) if expected.len() == found.len() => {
            let pairs = expected.iter().zip(found).enumerate();
            pairs.into_iter().find_map(|(at, (expected, found))| difference(&format!("{path}[{at}]"), expected, found))
        }
        _ if expected == found => None,
        _ => Some(format!("{path} is {found}, not {expected}")),
    }
}

/// Broadcasts as recordings have them: neighbouring pieces of one stream joined.
fn recorded(broadcasts: &[Message]) -> Value {
    let mut joined: Vec<(String, Value)> = Vec::new();
    for Message { msg_type, content, .. } in broadcasts {
        if let Some((last_type, last)) = joined.last_mut()
            && msg_type == "stream"
            && last_type == "stream"
            && last["name"] == content["name"]
        {
            let text = format!("{}{}", last["text"].as_str().unwrap(), content["text"].as_str().unwrap());
            last["text"] = text.into();
            continue;
        }
        joined.push((msg_type.clone(), content.clone()));
    }
    json!(joined)
}

fn check(what: &str, request: &Value, exchange: &Exchange) {
    let found = recorded(&exchange.broadcasts);
    let differs = difference("broadcasts", &request["broadcasts"], &found);
    assert!(differs.is_none(), "{what}: {}\n{found:#}", differs.unwrap());
    for message in &exchange.broadcasts {
        assert!(message.parent["a field"].is_array(), "{what}: the parent header is not whole: {}", message.parent);
    }
    if let Some(reply) = &exchange.reply {
        let expected_type = request["send"].as_str().unwrap().replace("_request", "_reply");
        assert_eq!(reply.msg_type, expected_type, "{what}");
        let differs = difference("reply", &request["reply"], &reply.content);
        assert!(differs.is_none(), "{what}: {}\n{:#}", differs.unwrap(), reply.content);
    }
}

#[test]
fn recorded_exchanges_go_as_recorded() {
    run(async {
        for (file, recording) in recordings() {
            let name = file.file_stem().unwrap().to_string_lossy().into_owned();
            let (mut kernel, mut client) = Kernel::start().await;
            for (at, step) in recording["steps"].as_array().unwrap().iter().enumerate() {
                let requests = step.as_array().unwrap();
                let mut headers = Vec::new();
                for request in requests {
                    let content = request["content"].clone();
                    let msg_type = request["send"].as_str().unwrap();
                    headers.push(client.send(channel_of(request), msg_type, content).await);
                }
                // Everything of one request is published before anything of the next.
                let last = headers.last().unwrap()["msg_id"].clone();
                client
                    .until("the last idle", |message| {
                        message.parent["msg_id"] == last && message.state() == Some("idle")
                    })
                    .await;
                let sent: Vec<&Value> = headers.iter().map(|header| &header["msg_id"]).collect();
                assert_eq!(Client::parents_of(client.published()), sent, "{name}, step {at}: order");
                for (request, header) in requests.iter().zip(&headers) {
                    let exchange = client.finish(channel_of(request), header, !request["reply"].is_null()).await;
                    check(&format!("{name}, step {at}, {}", request["send"]), request, &exchange);
                }
            }
            match recording["ends"].as_bool() {
                Some(true) => assert!(kernel.end().0.success(), "{name}: the kernel ends well"),
                _ => assert!(kernel.running(), "{name}: the kernel runs on"),
            }
        }
    });
}

#[test]
fn every_message_type_has_a_recorded_exchange_on_each_of_its_channels() {
    let mut recorded = BTreeSet::new();
    for (_, recording) in recordings() {
        for request in recording["steps"].as_array().unwrap().iter().flat_map(|step| step.as_array().unwrap()) {
            recorded.insert((request["send"].as_str().unwrap().to_owned(), channel_of(request).to_string()));
        }
    }
    for row in MESSAGE_TYPES {
        for channel in row.channels {
            let exchange = (row.name.to_owned(), channel.to_string());
            assert!(recorded.contains(&exchange), "no file in tests/protocol has {} on {channel}", row.name);
        }
    }
}

#[test]
fn messages_with_bad_signatures_or_too_few_frames_leave_no_trace() {
    run(async {
        let (_kernel, mut client) = Kernel::start().await;
        let cell = r#"{"code":"print(\"not to be run\")"}"#;
        let header = |msg_type| json!({"msg_id": "x", "msg_type": msg_type}).to_string();
        let parts =
            |client: &Client, msg_type| client.sealed([header(msg_type), "{}".into(), "{}".into(), cell.into()]);
        let good = parts(&client, "execute_request");
        let mut bad: Vec<Vec<Bytes>> = (1..good.len()).map(|length| good[..length].to_vec()).collect();
        for (frame, bytes) in [(1, &b""[..]), (1, b"00"), (1, &[0xff; 64]), (5, b"{\"code\":\"1\"}"), (0, b"<ids|msg>")]
        {
            let mut frames = good.clone();
            frames[frame] = Bytes::copy_from_slice(bytes);
            bad.push(frames);
        }
        bad.push(vec![Bytes::new()]);
        bad.push(vec![Bytes::from_static(DELIMITER); 9]);
        let own = std::mem::replace(&mut client.signer, Signer::new(b"another key"));
        bad.push(parts(&client, "shutdown_request"));
        client.signer = own;
        for channel in [Channel::Shell, Channel::Control] {
            for frames in bad.clone() {
                client.send_frames(channel, frames).await;
            }
        }
        // Whatever came of them would have been published before this.
        let exchange = client.execute("1 + 1").await;
        assert_eq!(exchange.reply.unwrap().content["execution_count"], 1);
        assert_eq!(client.published().len(), 0, "{:?}", client.published());
    });
}

#[test]
fn signed_messages_that_make_no_sense_leave_the_kernel_well() {
    run(async {
        let (_kernel, mut client) = Kernel::start().await;
        let header = json!({"msg_id": "x", "msg_type": "execute_request"}).to_string();
        let deep = format!("{{\"x\":{}1{}}}", "[".repeat(100_000), "]".repeat(100_000));
        for junk in ["", "{", "[]", "null", "3", "{}x", deep.as_str()] {
            for at in 0..4 {
                let mut parts = [header.clone(), "{}".to_owned(), "{}".to_owned(), "{}".to_owned()];
                parts[at] = junk.to_owned();
                let frames = client.sealed(parts);
                client.send_frames(Channel::Shell, frames).await;
            }
        }
        assert_eq!(client.execute("1 + 1").await.status(), "ok");
    });
}

#[test]
fn an_announced_length_beyond_all_memory_costs_the_connection_alone() {
    run(async {
        let (mut kernel, mut client) = Kernel::start().await;
        let mut greeting = b"\xff\0\0\0\0\0\0\0\x00\x7f\x03\0NULL".to_vec();
        greeting.resize(64, 0);
        for length in [0x7f7f_7f7f_7f7f_7f7f_u64, 1 << 45, 1 << 40] {
            for field in ["shell_port", "iopub_port", "hb_port"] {
                let port = u16::try_from(kernel.connection[field].as_u64().unwrap()).unwrap();
                let mut stream = TcpStream::connect(("127.0.0.1", port)).unwrap();
                stream.write_all(&greeting).unwrap();
                stream.write_all(&[0b010]).unwrap();
                stream.write_all(&length.to_be_bytes()).unwrap();
                // The kernel cuts the connection; until then it may send its own greeting.
                let cut = std::io::copy(&mut stream, &mut std::io::sink());
                drop(cut);
            }
        }
        assert_eq!(client.execute("1 + 1").await.status(), "ok");
        assert!(kernel.running());
    });
}

#[test]
fn an_interrupt_ends_the_cell_and_those_behind_it_and_keeps_the_variables() {
    run(async {
        let (_kernel, mut client) = Kernel::start().await;
        client.execute("let kept = 41;").await;
        let running = client.begin("loop { }").await;
        let waiting = client.send(Channel::Shell, "execute_request", json!({"code": "print(\"no\")"})).await;
        let interrupt = client.send(Channel::Control, "interrupt_request", json!({})).await;
        assert_eq!(client.finish(Channel::Control, &interrupt, true).await.status(), "ok");
        assert_eq!(client.finish(Channel::Shell, &running, true).await.status(), "error");
        let waiting = client.finish(Channel::Shell, &waiting, true).await;
        assert_eq!((waiting.status(), waiting.broadcasts.len()), ("aborted", 2));
        let later = client.execute("kept + 1").await;
        assert_eq!(later.broadcasts[2].content["data"]["text/plain"], "42", "{later:?}");
    });
}

#[test]
fn a_cell_that_is_run_again_keeps_its_name_and_may_report_again() {
    run(async {
        let (_kernel, mut client) = Kernel::start().await;
        let mut places = Vec::new();
        for (id, code) in [
            ("a", "report(\"heat\", q(\"1 kJ\"));"),
            ("a", "report(\"heat\", q(\"2 kJ\"));"),
            ("b", "report(\"heat\", q(\"3 kJ\"));"),
            ("a", "throw \"on purpose\""),
        ] {
            let header =
                client.send_with(Channel::Shell, "execute_request", json!({"cellId": id}), json!({"code": code})).await;
            let reply = client.finish(Channel::Shell, &header, true).await.reply.unwrap().content;
            let traceback = reply["traceback"].to_string();
            places.push(match reply["status"].as_str() {
                Some("ok") => "ok",
                _ if traceback.contains("at: cell-1,") => "cell-1",
                _ if traceback.contains("at: cell-3,") => "cell-3",
                _ => panic!("{reply}"),
            });
        }
        assert_eq!(places, ["ok", "ok", "cell-3", "cell-1"]);
    });
}

#[test]
fn a_signal_interrupts_an_endless_print_and_never_kills() {
    run(async {
        let (mut kernel, mut client) = Kernel::start().await;
        let header = client.begin("loop { print(\"tick\") }").await;
        client.until("printed text", |message| message.msg_type == "stream").await;
        let sent = Command::new("kill").arg("-INT").arg(kernel.pid().to_string()).status().unwrap();
        assert!(sent.success());
        let exchange = client.finish(Channel::Shell, &header, true).await;
        assert_eq!(exchange.status(), "error");
        assert!(exchange.printed("stdout").starts_with("tick\ntick\n"));
        assert!(kernel.running());
        assert_eq!(client.execute("1 + 1").await.status(), "ok");
    });
}

#[test]
fn text_appears_while_the_cell_that_printed_it_still_runs() {
    run(async {
        let (_kernel, mut client) = Kernel::start().await;
        let header = client.begin("print(\"first\"); loop { }").await;
        client.until("the first line", |message| message.content["text"] == "first\n").await;
        let interrupt = client.send(Channel::Control, "interrupt_request", json!({})).await;
        client.finish(Channel::Control, &interrupt, true).await;
        assert_eq!(client.finish(Channel::Shell, &header, true).await.printed("stdout"), "first\n");
    });
}

#[test]
fn endless_output_is_cut_with_a_notice_and_the_next_cell_prints_again() {
    run(async {
        let (_kernel, mut client) = Kernel::start().await;
        let exchange = client.execute("for i in 0..300000 { print(\"a line of some length\") }").await;
        assert_eq!(exchange.status(), "ok");
        assert_eq!(exchange.printed("stdout").len(), 2_000_000);
        let notice = exchange.printed("stderr");
        assert_eq!(notice.matches("left out").count(), 1, "{notice}");
        assert!(notice.contains("2 MB") && notice.contains("try:"), "{notice}");
        let streams = exchange.broadcasts.iter().filter(|message| message.msg_type == "stream").count();
        assert!(streams < 1000, "{streams} messages: a server would drop some");
        assert_eq!(client.execute("print(\"again\")").await.printed("stdout"), "again\n");
    });
}

#[test]
fn a_kernel_that_is_shut_down_while_busy_sends_its_last_messages_and_ends_well() {
    run(async {
        let (mut kernel, mut client) = Kernel::start().await;
        let running = client.begin("print(\"last words\"); loop { }").await;
        client.until("the text", |message| message.content["text"] == "last words\n").await;
        let waiting = client.send(Channel::Shell, "execute_request", json!({"code": "1"})).await;
        let shutdown = client.send(Channel::Control, "shutdown_request", json!({"restart": false})).await;
        assert_eq!(client.finish(Channel::Control, &shutdown, true).await.status(), "ok");
        let running = client.finish(Channel::Shell, &running, true).await;
        assert_eq!((running.status(), running.printed("stdout").as_str()), ("error", "last words\n"));
        assert_eq!(client.finish(Channel::Shell, &waiting, true).await.status(), "aborted");
        let (status, said) = kernel.end();
        assert!(status.success(), "{status}: {said}");
        assert_eq!(said, "");
    });
}

#[test]
fn a_new_process_takes_up_the_same_ports_while_a_client_is_connected() {
    run(async {
        let (mut kernel, mut client) = Kernel::start().await;
        client.execute("let kept = 41;").await;
        kernel.replace();
        let mut next = kernel.client().await.expect("the new process runs");
        assert_ne!(next.session, client.session);
        let exchange = next.execute("kept + 1").await;
        assert_eq!(exchange.status(), "error", "the new process knows the old one's variables");
        assert_eq!(exchange.reply.unwrap().content["execution_count"], 1);
    });
}

#[test]
fn a_taken_port_is_said_and_ends_the_process() {
    let connection = tcp_connection();
    let port = connection["iopub_port"].as_u64().unwrap();
    let _holder = std::net::TcpListener::bind(("127.0.0.1", u16::try_from(port).unwrap())).unwrap();
    let (status, said) = Kernel::spawn(connection).end();
    assert_eq!(status.code(), Some(2), "{said}");
    assert!(said.contains(&format!("127.0.0.1:{port} for iopub")) && said.contains("try:"), "{said}");
}

#[test]
fn unsigned_messages_are_served_where_the_key_is_empty() {
    run(async {
        let (_kernel, mut client) = Kernel::start_with(|connection| connection["key"] = "".into()).await;
        assert_eq!(client.execute("1 + 1").await.status(), "ok");
    });
}

#[test]
fn local_sockets_are_served_and_taken_up_again_after_a_kill() {
    run(async {
        let folder = tempfile::tempdir().unwrap();
        let stem = folder.path().join("s").to_string_lossy().into_owned();
        let (mut kernel, mut client) = Kernel::start_with(|connection| {
            connection["transport"] = "ipc".into();
            connection["ip"] = stem.clone().into();
        })
        .await;
        assert_eq!(client.execute("1 + 1").await.status(), "ok");
        kernel.replace();
        let mut next = kernel.client().await.expect("the new process runs");
        let shutdown = next.send(Channel::Control, "shutdown_request", json!({})).await;
        next.finish(Channel::Control, &shutdown, true).await;
        assert!(kernel.end().0.success());
        assert_eq!(fs::read_dir(folder.path()).unwrap().count(), 0, "socket files stay behind");
    });
}

#[test]
fn the_heart_beats_while_a_cell_runs() {
    run(async {
        let (kernel, mut client) = Kernel::start().await;
        let header = client.begin("loop { }").await;
        let mut heart = ReqSocket::new();
        heart.connect(&address(&kernel.connection, "hb_port")).await.unwrap();
        for beat in [&b"ping"[..], b"\0", &[7; 5000]] {
            heart.send(Bytes::from_static(beat).into()).await.unwrap();
            assert_eq!(heart.recv().await.unwrap().into_vec(), [beat]);
        }
        let interrupt = client.send(Channel::Control, "interrupt_request", json!({})).await;
        client.finish(Channel::Control, &interrupt, true).await;
        assert_eq!(client.finish(Channel::Shell, &header, true).await.status(), "error");
    });
}
