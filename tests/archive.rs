//! The audit of an archive as a user starts it: processes that are lost, audits that are stopped and gone on with, shards.

use std::path::PathBuf;
use std::process::{Child, Command, Output, Stdio};
use std::time::{Duration, Instant};

use serde_json::{Value, json};

/// An archive in a folder of its own.
struct Archive(tempfile::TempDir);

impl Archive {
    fn new() -> Archive {
        Archive(tempfile::tempdir().unwrap())
    }

    fn path(&self, name: &str) -> PathBuf {
        self.0.path().join(name)
    }

    fn text(&self, name: &str) -> String {
        self.path(name).display().to_string()
    }

    fn file(&self, name: &str, bytes: &[u8]) {
        std::fs::create_dir_all(self.path(name).parent().unwrap()).unwrap();
        std::fs::write(self.path(name), bytes).unwrap();
    }

    /// A notebook of one cell, sealed.
    fn sealed(&self, name: &str, cell: &str) {
        self.file(name, notebook(cell).as_bytes());
        let output = hessbook(&["seal", &self.text(name)]);
        assert!(output.status.success(), "{output:?}");
    }

    /// A sealed notebook with another text in its cell.
    fn edited(&self, name: &str, cell: &str) {
        self.sealed(name, "report(\"energy\", q(\"1.0(1) kJ\"))");
        let mut tree: Value = serde_json::from_slice(&std::fs::read(self.path(name)).unwrap()).unwrap();
        tree["cells"][0]["source"] = json!(cell);
        self.file(name, tree.to_string().as_bytes());
    }

    /// Audits the whole folder.
    fn audit(&self, more: &[&str]) -> Output {
        let folder = self.0.path().display().to_string();
        let args: Vec<&str> = ["audit", &folder].into_iter().chain(more.iter().copied()).collect();
        hessbook(&args)
    }
}

fn notebook(cell: &str) -> String {
    json!({
        "cells": [{"cell_type": "code", "id": "a", "metadata": {}, "source": cell, "execution_count": null, "outputs": []}],
        "metadata": {}, "nbformat": 4, "nbformat_minor": 5,
    })
    .to_string()
}

fn energy(n: usize) -> String {
    format!("report(\"energy\", q(\"{n}.5(1) kJ\"))")
}

fn command(args: &[&str]) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_hessbook"));
    command.args(args);
    command
}

fn hessbook(args: &[&str]) -> Output {
    command(args).output().unwrap()
}

fn out(output: &Output) -> String {
    String::from_utf8_lossy(&output.stdout).into_owned()
}

fn err(output: &Output) -> String {
    String::from_utf8_lossy(&output.stderr).into_owned()
}

/// The part of a report that is about one notebook: its line, and those under it.
fn about<'a>(text: &'a str, name: &str) -> &'a str {
    let start = text.find(&format!("{name}: ")).unwrap_or_else(|| panic!("nothing about {name} in\n{text}"));
    let rest = &text[start..];
    let end =
        rest.match_indices('\n').find(|(at, _)| !rest[at + 1..].starts_with(' ')).map_or(rest.len(), |(at, _)| at);
    &rest[..end]
}

/// Processes that a process started.
fn children(of: u32) -> Vec<u32> {
    let mut found = Vec::new();
    for entry in std::fs::read_dir("/proc").unwrap().flatten() {
        let Ok(pid) = entry.file_name().to_string_lossy().parse::<u32>() else { continue };
        let Ok(stat) = std::fs::read_to_string(entry.path().join("stat")) else { continue };
        let after = stat.rsplit(") ").next().unwrap_or_default();
        if after.split(' ').nth(1) == Some(&of.to_string()) && !after.starts_with('Z') {
            found.push(pid);
        }
    }
    found
}

/// Waits until something is there, for no longer than a minute: a start on a busy machine.
fn wait_for<T>(what: &str, mut look: impl FnMut() -> Option<T>) -> T {
    let deadline = Instant::now() + Duration::from_secs(60);
    loop {
        if let Some(found) = look() {
            return found;
        }
        assert!(Instant::now() < deadline, "waited for {what} in vain");
        std::thread::sleep(Duration::from_millis(10));
    }
}

fn signal(pid: u32, name: &str) {
    assert!(Command::new("kill").args([&format!("-{name}"), &pid.to_string()]).status().unwrap().success());
}

/// Starts an audit whose text nobody reads.
fn start(args: &[&str]) -> Child {
    command(args).stdout(Stdio::piped()).stderr(Stdio::piped()).spawn().unwrap()
}

#[test]
fn what_does_not_end_or_takes_too_much_costs_its_own_row_only() {
    let archive = Archive::new();
    archive.sealed("a-good.ipynb", &energy(1));
    archive.edited("b-endless.ipynb", "loop {}");
    archive.edited(
        "c-greedy.ipynb",
        "let all = []; let piece = \"0123456789\"; loop { piece += piece; all.push(piece); }",
    );
    archive.edited("d-failing.ipynb", "report(\"energy\", q(\"1 kJ\") + q(\"1 K\"))");
    archive.sealed("e-good.ipynb", &energy(2));
    let output = archive.audit(&["--time-limit", "10", "--memory-limit", "128", "--jobs", "2"]);
    let text = out(&output);
    assert_eq!(output.status.code(), Some(2), "{text}\n{}", err(&output));
    for good in ["a-good.ipynb", "e-good.ipynb"] {
        assert!(about(&text, good).contains("same"), "{text}");
    }
    let endless = about(&text, "b-endless.ipynb");
    assert!(endless.contains("was not done within 10 s") && endless.contains("--time-limit"), "{endless}");
    assert!(about(&text, "c-greedy.ipynb").contains("could not run"), "{text}");
    assert!(about(&text, "d-failing.ipynb").contains("could not run"), "{text}");
}

#[test]
fn a_process_that_dies_is_named_and_replaced() {
    let archive = Archive::new();
    archive.edited("a-endless.ipynb", "loop {}");
    archive.sealed("b-good.ipynb", &energy(1));
    let folder = archive.0.path().display().to_string();
    let audit = start(&["audit", "--jobs", "1", &folder]);
    let worker = wait_for("a worker", || children(audit.id()).first().copied());
    // It is in its loop, or reads its order still; either way it has not given an audit.
    std::thread::sleep(Duration::from_millis(300));
    signal(worker, "KILL");
    let output = audit.wait_with_output().unwrap();
    let text = out(&output);
    assert_eq!(output.status.code(), Some(2), "{text}");
    assert!(about(&text, "a-endless.ipynb").contains("signal SIGKILL"), "{text}");
    assert!(about(&text, "b-good.ipynb").contains("same"), "{text}");
}

#[test]
fn no_worker_outlives_the_program_that_started_it() {
    let archive = Archive::new();
    archive.edited("endless.ipynb", "loop {}");
    let folder = archive.0.path().display().to_string();
    let mut audit = start(&["audit", &folder]);
    let worker = wait_for("a worker", || children(audit.id()).first().copied());
    signal(audit.id(), "KILL");
    audit.wait().unwrap();
    let running = || {
        let stat = std::fs::read_to_string(format!("/proc/{worker}/stat")).ok()?;
        (!stat.rsplit(") ").next()?.starts_with('Z')).then_some(())
    };
    wait_for("the end of the worker", || running().is_none().then_some(()));
}

#[test]
fn an_audit_that_was_stopped_goes_on_where_it_stopped() {
    let archive = Archive::new();
    for n in 0..6 {
        archive.sealed(&format!("{n}.ipynb"), &energy(n));
    }
    let whole = out(&archive.audit(&[]));
    // Alone and in order, the last of them holds the audit up until it is stopped.
    archive.edited("7-endless.ipynb", "loop {}");
    let (folder, state) = (archive.0.path().display().to_string(), archive.text("state.json"));
    let audit = start(&["audit", "--jobs", "1", "--resume", &state, &folder]);
    let lines = |text: &str| text.lines().filter(|line| line.starts_with("{\"audit\"")).count();
    let read = || std::fs::read_to_string(&state).unwrap_or_default();
    wait_for("six audits", || (lines(&read()) == 6).then_some(()));
    let second = hessbook(&["audit", "--resume", &state, &folder]);
    assert!(err(&second).contains("another audit writes the state file"), "{}", err(&second));
    signal(audit.id(), "INT");
    let stopped = audit.wait_with_output().unwrap();
    assert_eq!(stopped.status.code(), Some(2));
    assert!(err(&stopped).contains("stopped after 6 of 7 notebooks"), "{}", err(&stopped));
    let gathered = hessbook(&["audit", "--gathered", &state]);
    assert!(err(&gathered).contains("not finished"), "{}", err(&gathered));

    // Killed while it wrote: half a line is left. Then one file is changed, and the endless one goes.
    std::fs::remove_file(archive.path("7-endless.ipynb")).unwrap();
    let torn = format!("{}{{\"audit\":{{\"lost\":fal", read());
    std::fs::write(&state, torn).unwrap();
    archive.edited("3.ipynb", &energy(8));
    let output = archive.audit(&["--resume", &state]);
    assert_eq!(output.status.code(), Some(1), "{}", err(&output));
    let text = out(&output);
    assert!(about(&text, "3.ipynb").contains("edited cell"), "{text}");
    for n in [0, 1, 2, 4, 5] {
        let name = format!("{n}.ipynb");
        assert_eq!(about(&text, &name), about(&whole, &name));
    }
    // Six from before, and the one that was changed.
    assert_eq!(lines(&read()), 7);
    let other = archive.audit(&["--resume", &state, "--strict-data"]);
    assert!(err(&other).contains("made with other options"), "{}", err(&other));
    assert_eq!(hessbook(&["audit", "--gathered", &state]).status.code(), Some(1));
}

#[test]
fn shards_share_an_archive_and_are_reported_on_together() {
    let archive = Archive::new();
    for n in 0..7 {
        archive.sealed(&format!("part-{}/{n}.ipynb", n % 2), &energy(n));
    }
    archive.edited("part-0/7.ipynb", &energy(9));
    let states: Vec<String> = (1..=3).map(|nth| archive.text(&format!("state-{nth}.json"))).collect();
    let mut rows = 0;
    for (nth, state) in states.iter().enumerate() {
        let output = archive.audit(&["--shard", &format!("{}/3", nth + 1), "--resume", state]);
        assert!(output.status.code().unwrap() <= 1, "{}", err(&output));
        rows += std::fs::read_to_string(state).unwrap().lines().filter(|line| line.starts_with("{\"audit\"")).count();
    }
    assert_eq!(rows, 8);
    let gathered = |states: &[String]| {
        let mut args = vec!["audit", "--gathered"];
        args.extend(states.iter().map(String::as_str));
        hessbook(&args)
    };
    let all = gathered(&states);
    assert_eq!(all.status.code(), Some(1), "{}", err(&all));
    // What is said of the shards together is what is said of the archive at once.
    let json = |output: &Output| -> Value { serde_json::from_slice(&output.stdout).unwrap() };
    let at_once = json(&archive.audit(&["--format", "json"]));
    let mut args = vec!["audit", "--gathered", "--format", "json"];
    args.extend(states.iter().map(String::as_str));
    let together = json(&hessbook(&args));
    assert_eq!(together["tally"], at_once["tally"]);
    assert_eq!(together["notebooks"], at_once["notebooks"]);
    let missing = gathered(&states[..2]);
    assert_eq!(missing.status.code(), Some(2));
    assert!(err(&missing).contains("shard 3/3 are missing"), "{}", err(&missing));
    let twice = gathered(&[states[0].clone(), states[1].clone(), states[2].clone(), states[1].clone()]);
    assert!(err(&twice).contains("stands in both"), "{}", err(&twice));
    let wrong = archive.audit(&["--shard", "2/3", "--resume", &states[0]]);
    assert!(err(&wrong).contains("it is of another shard"), "{}", err(&wrong));
    // A notebook that goes is no part of the shard any more, and another way to name the archive is another list.
    let first = std::fs::read_to_string(&states[0]).unwrap();
    let gone = first.lines().filter(|line| line.starts_with("{\"audit\"")).find_map(|line| {
        let line: Value = serde_json::from_str(line).unwrap();
        line["audit"]["audit"]["file"].as_str().map(str::to_owned)
    });
    std::fs::remove_file(gone.unwrap()).unwrap();
    archive.audit(&["--shard", "1/3", "--resume", &states[0]]);
    let fewer = json(&hessbook(&args));
    assert_eq!(fewer["notebooks"].as_array().unwrap().len(), 7);
    let elsewhere = archive.text("part-0");
    hessbook(&["audit", &elsewhere, "--shard", "3/3", "--resume", &archive.text("other.json")]);
    let mixed = gathered(&[states[0].clone(), states[1].clone(), archive.text("other.json")]);
    assert!(err(&mixed).contains("are of audits of different paths"), "{}", err(&mixed));
    archive.file("no-state.json", b"{\"cells\": []}\n");
    let no_state = gathered(&[archive.text("no-state.json")]);
    assert!(err(&no_state).contains("is no state file of an audit"), "{}", err(&no_state));
}

#[test]
fn an_audit_is_made_again_when_a_file_beside_the_notebook_was_changed() {
    let archive = Archive::new();
    archive.file("cp.csv", b"T / K,Cp / (J/(K mol))\n300,30\n400,31\n");
    archive.file("plant.rhai", b"fn doubled(x) { 2 * x }\n");
    archive.sealed("a.ipynb", "report(\"Cp\", read_csv(\"cp.csv\").column(\"Cp\")[0])");
    archive.sealed("b.ipynb", "report(\"energy\", plant::doubled(q(\"1.0(1) kJ\")))");
    archive.sealed("c.ipynb", &energy(3));
    let state = archive.text("state.json");
    let lines =
        || std::fs::read_to_string(&state).unwrap().lines().filter(|line| line.starts_with("{\"audit\"")).count();
    assert_eq!(archive.audit(&["--resume", &state]).status.code(), Some(0));
    assert_eq!(archive.audit(&["--resume", &state]).status.code(), Some(0));
    assert_eq!(lines(), 3, "nothing was changed, and nothing is made again");
    archive.file("plant.rhai", b"fn doubled(x) { 3 * x }\n");
    let output = archive.audit(&["--resume", &state]);
    assert_eq!((output.status.code(), lines()), (Some(1), 4), "{}", out(&output));
    assert!(about(&out(&output), "b.ipynb").contains("moved"), "{}", out(&output));
    archive.file("cp.csv", b"T / K,Cp / (J/(K mol))\n300,35\n400,31\n");
    let output = archive.audit(&["--resume", &state, "--page", &archive.text("page.html")]);
    assert_eq!(lines(), 5, "{}", out(&output));
    assert!(about(&out(&output), "a.ipynb").contains("moved"), "{}", out(&output));
}

#[test]
fn a_signature_can_be_demanded_and_its_lack_is_named() {
    let archive = Archive::new();
    let key = archive.text("plant.key");
    assert!(hessbook(&["keys", "new", &key]).status.success());
    for n in 0..12 {
        archive.sealed(&format!("{n:02}.ipynb"), &energy(n));
        let sign: &[&str] = if n == 7 { &[] } else { &["--sign", &key] };
        let name = archive.text(&format!("{n:02}.ipynb"));
        assert!(hessbook(&[&["seal", &name], sign].concat()).status.success());
    }
    let public = format!("{key}.pub");
    let output = archive.audit(&["--trust", &public]);
    assert_eq!(output.status.code(), Some(0), "{}", out(&output));
    assert!(about(&out(&output), "07.ipynb").contains("not signed"), "{}", out(&output));
    assert!(!about(&out(&output), "08.ipynb").contains("signed"), "one line where there is nothing to say");
    let output = archive.audit(&["--trust", &public, "--strict-signature"]);
    assert_eq!(output.status.code(), Some(1), "{}", out(&output));
    assert!(about(&out(&output), "07.ipynb").contains("differs\n"), "{}", out(&output));
    assert!(about(&out(&output), "07.ipynb").contains("as was demanded"), "{}", out(&output));
}

#[test]
fn reports_are_written_as_a_whole_or_not_at_all() {
    let archive = Archive::new();
    archive.sealed("a.ipynb", &energy(1));
    archive.edited("b.ipynb", &energy(2));
    let (page, junit) = (archive.text("page.html"), archive.text("junit.xml"));
    let output = archive.audit(&["--page", &page, "--junit", &junit]);
    assert_eq!(output.status.code(), Some(1), "{}", err(&output));
    let (page_text, junit_text) = (std::fs::read_to_string(&page).unwrap(), std::fs::read_to_string(&junit).unwrap());
    assert!(page_text.contains("b.ipynb") && page_text.trim_end().ends_with("</html>"), "{page_text}");
    assert!(junit_text.contains("failures=\"1\"") && junit_text.trim_end().ends_with("</testsuites>"), "{junit_text}");
    let nowhere = archive.audit(&["--page", &archive.text("no-folder/page.html")]);
    assert_eq!(nowhere.status.code(), Some(2));
    assert!(err(&nowhere).contains("its folder is not there"), "{}", err(&nowhere));
    assert!(nowhere.stdout.is_empty(), "that is said before anything is audited");
    assert_eq!(std::fs::read_dir(archive.0.path()).unwrap().count(), 4, "nothing is left of what was not written");
}

#[test]
fn an_audit_of_nothing_is_no_success() {
    let archive = Archive::new();
    archive.file("notes.txt", b"");
    let output = archive.audit(&[]);
    assert_eq!(output.status.code(), Some(2));
    assert!(err(&output).contains("holds no notebook"), "{}", err(&output));
    let output = hessbook(&["audit", &archive.text("*.ipynb")]);
    assert!(err(&output).contains("nothing matches the pattern"), "{}", err(&output));
    let output = hessbook(&["audit", &archive.text("gone.ipynb")]);
    assert_eq!(output.status.code(), Some(2));
    assert!(out(&output).contains("cannot read"), "{}", out(&output));
}
