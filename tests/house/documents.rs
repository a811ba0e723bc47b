//! Papers and scripts: what they name exists, and what they promise can be started.

/// Folders at the root that a document may point into.
const FOLDERS: [&str; 7] = ["src/", "tests/", "stdlib/", "notebooks/", "benches/", "fuzz/", ".ci/"];

/// The commands that the README promises to a newcomer, in this order.
pub const COMMANDS: [&str; 2] = ["cargo run --release -- run notebooks/shift-converter.ipynb", "tests/run"];

/// Paths of the project that a document names between backticks or in a block of commands.
pub fn paths(document: &str) -> Vec<String> {
    let mut found: Vec<String> = Vec::new();
    let mut fenced = false;
    for line in document.lines() {
        if line.starts_with("```") {
            fenced = !fenced;
            continue;
        }
        let pieces = if fenced { vec![line] } else { line.split('`').skip(1).step_by(2).collect() };
        for word in pieces.iter().flat_map(|piece| piece.split(|c: char| c.is_whitespace() || "(),;:".contains(c))) {
            let names_one = FOLDERS.iter().any(|folder| word.starts_with(folder) && word.len() > folder.len());
            // `<family>`, `{a,b}`, `*` and the ellipsis stand for something else.
            if names_one && !word.contains(['<', '{', '*', '…']) && !found.iter().any(|known| known == word) {
                found.push(word.trim_end_matches('.').to_owned());
            }
        }
    }
    found
}

/// Commands that a text does not hold, each on a line of its own, in order.
pub fn missing_commands(text: &str) -> Vec<String> {
    let mut lines = text.lines().map(str::trim);
    let missing = COMMANDS.iter().filter(|command| !lines.any(|line| line == **command));
    missing.map(|command| format!("no line `{command}`, or not in this order")).collect()
}

/// Commands of the README that the script of checks takes no step for.
pub fn unchecked_commands(script: &str) -> Vec<String> {
    let steps: Vec<&str> = script.lines().filter(|line| line.starts_with("step ")).collect();
    let unchecked = COMMANDS.iter().filter(|command| !steps.iter().any(|step| step.ends_with(&format!(" {command}"))));
    unchecked.map(|command| format!("no step runs `{command}`")).collect()
}

/// What is wrong with a shell script.
pub fn script(path: &str, text: &str, executable: bool) -> Vec<String> {
    let mut found = Vec::new();
    if !text.starts_with("#!/usr/bin/env bash\n") {
        found.push(format!("{path}: does not start with `#!/usr/bin/env bash`"));
    }
    if !text.lines().any(|line| line == "set -euo pipefail") {
        found.push(format!("{path}: no line `set -euo pipefail`"));
    }
    if !executable {
        found.push(format!("{path}: not executable"));
    }
    found
}

#[test]
fn paths_are_read_from_backticks_and_blocks() {
    let text = "See `src/units/table.rs`, `model/<family>.rs`, `tests/<kind>/x` and `src/`; src/plain.rs is prose.\n\
                ```\ncargo run -- run notebooks/a.ipynb # tests/run.\n```\n`tests/run` again `tests/run`\n";
    assert_eq!(paths(text), ["src/units/table.rs", "notebooks/a.ipynb", "tests/run"]);
}

#[test]
fn a_command_that_is_missing_or_out_of_order_is_found() {
    let [first, second] = COMMANDS;
    assert_eq!(missing_commands(&format!("a\n    {first}\nb\n    {second}\n")), Vec::<String>::new());
    assert_eq!(missing_commands(&format!("{second}\n{first}\n")).len(), 1);
    assert_eq!(missing_commands(&format!("run `{first}` and `{second}`")).len(), 2);
}

#[test]
fn a_promised_command_without_a_step_is_found() {
    let [first, second] = COMMANDS;
    assert_eq!(unchecked_commands(&format!("step \"a\" {second}\nstep \"b\" {first}\n")), Vec::<String>::new());
    assert_eq!(unchecked_commands(&format!("# {second}\nstep \"b\" {first}\n")).len(), 1);
}

#[test]
fn a_script_that_goes_on_after_an_error_is_found() {
    let text = "#!/usr/bin/env bash\nset -euo pipefail\n";
    assert_eq!(script("x", text, true), Vec::<String>::new());
    assert_eq!(script("x", text, false).len(), 1);
    assert_eq!(script("x", "#!/usr/bin/env bash\nset -e\n", true).len(), 1);
    assert_eq!(script("x", "#!/bin/sh\nset -euo pipefail\n", true).len(), 1);
}
