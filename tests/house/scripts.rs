//! `tests/run` says honestly what the runners counted: tried on its own, with runners that only speak.

use std::fs;
use std::io::Write;
use std::process::{Command, Stdio};

/// What `tests/counts.awk` makes of a log.
fn counted(log: &str) -> String {
    let mut awk = Command::new("awk");
    awk.args(["-f", "tests/counts.awk"]).stdin(Stdio::piped()).stdout(Stdio::piped());
    let mut child = awk.spawn().unwrap_or_else(|e| panic!("awk cannot be started: {e}"));
    child.stdin.take().expect("stdin was piped").write_all(log.as_bytes()).expect("awk reads its input");
    let output = child.wait_with_output().expect("awk ends");
    assert!(output.status.success());
    String::from_utf8(output.stdout).expect("counts are ASCII").trim().to_owned()
}

#[test]
fn closing_lines_of_the_runners_are_counted_and_nothing_else_is() {
    // As cargo test, pytest and kernelcheck print them, read from their output.
    for (log, counts) in [
        ("test result: ok. 12 passed; 0 failed; 1 ignored; 0 measured; 0 filtered out; finished in 0.10s\n", "12 0"),
        ("test result: FAILED. 3 passed; 2 failed; 0 ignored; 0 measured; 0 filtered out; finished in 0.1s\n", "3 2"),
        ("test result: ok. 1 passed; 0 failed;\ntest a ... ok\ntest result: ok. 4 passed; 0 failed;\n", "5 0"),
        ("..F\n1 failed, 5 passed, 1 skipped in 2.31s\n", "5 1"),
        ("5 passed in 2.31s\n", "5 0"),
        ("=== 1 failed, 5 passed, 2 errors in 72.31s (0:01:12) ===\n", "5 3"),
        ("1 error in 0.20s\n", "0 1"),
        ("77 passed, 1 failed, 4 skipped\n", "77 1"),
        ("\u{1b}[32m5 passed\u{1b}[0m in 2.31s\n", "5 0"),
        // What only looks like a closing line.
        ("== ordinary clients: passed, 7 s\n", "none"),
        ("assertion: wanted 3 passed, 0 failed, got less\n", "none"),
        ("error: could not compile `hessbook`\n", "none"),
        ("", "none"),
    ] {
        assert_eq!(counted(log), counts, "{log}");
    }
}

/// Makes in the present folder a copy of `tests/run`, and runners that print a text and end with a status. A shell writes
/// them, since a file that this process holds open while it starts another cannot be executed.
const TRIAL: &str = r#"
set -euo pipefail
mkdir -p bin tests/client
cp "$1"/run "$1"/steps.bash "$1"/counts.awk tests/
printf '#!/usr/bin/env bash\necho "%s"\nexit %d\n' "$2" "$3" >bin/cargo
printf '#!/usr/bin/env bash\necho "%s"\nexit %d\n' "$4" "$5" >tests/client/run
chmod +x bin/cargo tests/client/run
"#;

/// Exit status and last line of `tests/run`, where cargo and the clients print these texts and end with that status.
fn tried(cargo: (&str, i32), clients: (&str, i32)) -> (i32, String) {
    let folder = tempfile::tempdir().expect("a folder for the trial");
    let ours = fs::canonicalize("tests").expect("the folder of the tests");
    let mut make = Command::new("bash");
    make.current_dir(folder.path()).args(["-c", TRIAL, "trial"]).arg(ours);
    make.args([cargo.0, &cargo.1.to_string(), clients.0, &clients.1.to_string()]);
    assert!(make.status().expect("bash can be started").success());
    let path = format!("{}:{}", folder.path().join("bin").display(), std::env::var("PATH").unwrap_or_default());
    let output = Command::new(folder.path().join("tests/run")).env("PATH", path).output().expect("tests/run starts");
    let text = String::from_utf8(output.stdout).expect("text");
    (output.status.code().expect("not ended by a signal"), text.lines().last().unwrap_or("").to_owned())
}

#[test]
fn the_last_line_sums_all_runners_and_a_silent_failure_is_one() {
    let cargo = "test result: ok. 12 passed; 0 failed; 0 ignored; 0 measured";
    let failing = "test result: FAILED. 12 passed; 2 failed; 0 ignored; 0 measured";
    let clients = "5 passed in 1.20s\n77 passed, 0 failed, 4 skipped";
    for (first, second, status, last) in [
        ((cargo, 0), (clients, 0), 0, "94 passed, 0 failed"),
        ((failing, 101), (clients, 0), 1, "94 passed, 2 failed"),
        (("error: could not compile", 101), (clients, 0), 1, "82 passed, 1 failed"),
        ((cargo, 0), ("5 passed in 1.20s\nTraceback", 1), 1, "17 passed, 1 failed"),
        ((cargo, 0), ("nothing to run", 0), 1, "12 passed, 1 failed"),
    ] {
        assert_eq!(tried(first, second), (status, last.to_owned()), "{first:?} {second:?}");
    }
}
