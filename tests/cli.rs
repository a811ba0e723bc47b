//! `hessbook run` as a user starts it: exit status, the JSON record, parameters, outputs written, Ctrl-C.

use std::path::PathBuf;
use std::process::{Command, Output, Stdio};
use std::time::{Duration, Instant};

use serde_json::Value;

const SHIFT: &str = "reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\")";

struct Folder(tempfile::TempDir);

impl Folder {
    fn new() -> Folder {
        Folder(tempfile::tempdir().unwrap())
    }

    fn file(&self, name: &str, text: &str) -> PathBuf {
        let path = self.0.path().join(name);
        std::fs::write(&path, text).unwrap();
        path
    }
}

fn hessbook(args: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_hessbook")).args(args).output().unwrap()
}

fn run_json(code: &str, more: &[&str]) -> (i32, Value) {
    let folder = Folder::new();
    let path = folder.file("calculation.rhai", code);
    let mut args = vec!["run", "--format", "json", path.to_str().unwrap()];
    args.extend(more);
    let output = hessbook(&args);
    (output.status.code().unwrap(), serde_json::from_slice(&output.stdout).unwrap())
}

fn number(value: &Value) -> f64 {
    value.as_str().unwrap().parse().unwrap()
}

#[test]
fn a_report_comes_out_as_a_record_with_exact_decimals() {
    let (status, record) = run_json(&format!("report(\"x\", {SHIFT}.enthalpy(q(\"1000 K\")))"), &[]);
    assert_eq!((status, &record["status"]), (0, &Value::from("ok")));
    let report = &record["reports"][0];
    // ΔrH°(1000 K) = -34.75 kJ/mol: NIST-JANAF Thermochemical Tables, 4th ed., from ΔfH° of CO2, CO and H2O at 1000 K,
    // -394.623, -112.010 and -247.857 kJ/mol (from memory). Bound: formation enthalpies of the two sets, 0.05 kJ/mol.
    assert!((number(&report["value"]) - (-394.623 + 112.010 + 247.857)).abs() < 0.05, "{}", report["value"]);
    assert_eq!(report["unit"], "kJ/mol[rxn]");
    assert_eq!(report["u_coverage"], "partial");
    assert!(report["u_missing"].as_array().unwrap().contains(&Value::from("heat capacity of CO(g)")));
    let text = report["value"].as_str().unwrap();
    assert_eq!(text, number(&report["value"]).to_string(), "shortest decimals that read back");
}

#[test]
fn the_price_of_a_shortcut_is_its_difference_from_the_full_value() {
    let code = format!(
        "report(\"full\", {SHIFT}.enthalpy(\"1000 K\")); \
         report(\"short\", {SHIFT}.enthalpy(\"1000 K\", #{{ heat_capacity: \"constant\" }}))"
    );
    let (_, record) = run_json(&code, &[]);
    let (full, short) = (&record["reports"][0], &record["reports"][1]);
    let gap = number(&short["value"]) - number(&full["value"]);
    let row = |report: &Value, list: &str| {
        let rows = report[list].as_array().unwrap().clone();
        rows.into_iter().find(|row| row["id"] == "constant-heat-capacity")
    };
    let priced = row(short, "assumptions").unwrap();
    assert_eq!(priced["status"], "strained");
    // Bound: two subtractions of numbers near 35 kJ/mol, in double precision.
    assert!((number(&priced["price"]) - gap).abs() < 1e-10);
    assert!((number(&row(full, "alternatives").unwrap()["price"]) - gap).abs() < 1e-10);
    assert!(row(full, "assumptions").is_none() && row(short, "alternatives").is_none());
}

#[test]
fn parameters_are_set_from_outside_listed_and_checked() {
    let code = format!("report(\"x\", {SHIFT}.enthalpy(parameter(\"outlet\", \"450 degC\")))");
    let (status, record) = run_json(&code, &["--set", "outlet=1000 K"]);
    assert_eq!(status, 0);
    assert_eq!(record["parameters"][0]["name"], "outlet");
    assert_eq!(record["parameters"][0]["set"], true);
    assert!(record["reports"][0]["conditions"].as_str().unwrap().starts_with("1000 K"));
    for (set, code_name) in
        [("outlt=1000 K", "parameter-undeclared"), ("outlet=3 bar", "parameter-unit"), ("outlet=hot", "number-missing")]
    {
        let (status, record) = run_json(&code, &["--set", set]);
        assert_eq!((status, &record["faults"][0]["code"]), (1, &Value::from(code_name)), "{set}");
    }
}

#[test]
fn a_fault_says_where_and_ends_with_status_1_and_a_missing_file_with_2() {
    let (status, record) = run_json("let a = 1;\nlet b = (a + ;\n", &[]);
    let fault = &record["faults"][0];
    assert_eq!((status, &record["status"]), (1, &Value::from("fault")));
    assert_eq!((&fault["cell"], &fault["line"]), (&Value::from("calculation.rhai"), &Value::from(2)));
    assert!(fault["column"].as_u64().unwrap() > 1 && !fault["hint"].as_str().unwrap().is_empty());
    let missing = hessbook(&["run", "no-such-file.rhai"]);
    assert_eq!(missing.status.code(), Some(2));
    assert!(String::from_utf8_lossy(&missing.stderr).contains("no-such-file.rhai"));
}

#[test]
fn reports_made_before_a_fault_are_kept_and_said() {
    let (status, record) = run_json(&format!("report(\"x\", {SHIFT}.enthalpy(\"500 K\"));\nreport(\"y\", 5)"), &[]);
    assert_eq!(status, 1);
    // One cell is all or nothing; its faults are told, its reports are not.
    assert_eq!(record["reports"].as_array().unwrap().len(), 0);
    assert_eq!(record["faults"][0]["code"], "report-not-a-quantity");
}

#[test]
fn outputs_go_into_a_notebook_and_the_original_stays_unless_asked() {
    let folder = Folder::new();
    let text = r#"{"cells":[{"cell_type":"code","id":"a","metadata":{},"execution_count":null,"outputs":[],"source":"report(\"x\", q(\"1.0(1) kJ\"))"},
        {"cell_type":"code","id":"b","metadata":{},"execution_count":null,"outputs":[],"source":"justify(\"basis-unnamed\", \"x\", \"no\")"}],
        "metadata":{},"nbformat":4,"nbformat_minor":5}"#;
    let path = folder.file("n.ipynb", text);
    let copy = folder.0.path().join("copy.ipynb");
    let output = hessbook(&["run", path.to_str().unwrap(), "--output", copy.to_str().unwrap()]);
    assert_eq!(output.status.code(), Some(1), "the second cell decides about a row that is not there");
    assert_eq!(std::fs::read_to_string(&path).unwrap(), text);
    let written: Value = serde_json::from_slice(&std::fs::read(&copy).unwrap()).unwrap();
    let record = &written["cells"][0]["outputs"][0]["data"]["application/vnd.hessbook.report.v1+json"];
    assert_eq!((&record["label"], &record["value"], &record["u"]), (&"x".into(), &"1".into(), &"0.1".into()));
    assert_eq!(written["cells"][1]["outputs"][0]["ename"], "assumption-unknown");
}

#[test]
fn a_decision_changes_the_report_where_it_stands() {
    let folder = Folder::new();
    let cells = [
        format!("report(\"x\", {SHIFT}.enthalpy(\"1000 K\", #{{ heat_capacity: \"constant\" }}))"),
        "justify(\"constant-heat-capacity\", \"x\", \"a first estimate\")".to_owned(),
    ];
    let cells: Vec<Value> = cells
        .iter()
        .enumerate()
        .map(|(n, source)| serde_json::json!({"cell_type": "code", "id": format!("c{n}"), "metadata": {}, "execution_count": null, "outputs": [], "source": source}))
        .collect();
    let notebook = serde_json::json!({"cells": cells, "metadata": {}, "nbformat": 4, "nbformat_minor": 5});
    let path = folder.file("n.ipynb", &notebook.to_string());
    assert_eq!(hessbook(&["run", path.to_str().unwrap(), "--in-place"]).status.code(), Some(0));
    let written: Value = serde_json::from_slice(&std::fs::read(&path).unwrap()).unwrap();
    let record = &written["cells"][0]["outputs"][0]["data"]["application/vnd.hessbook.report.v1+json"];
    let dealt = record["assumptions"][0]["dealt"].as_str().unwrap();
    assert!(dealt.contains("a first estimate") && dealt.contains("not corrected: -4.1"), "{dealt}");
    assert_eq!(written["cells"][1]["outputs"].as_array().unwrap().len(), 0, "one record of a label in a notebook");
}

#[test]
fn an_endless_loop_ends_on_an_interrupt_with_a_message() {
    let folder = Folder::new();
    for code in ["print(\"begun\"); loop {}", "print(\"begun\"); loop { print(\"on\") }"] {
        let path = folder.file("endless.rhai", code);
        let mut child = Command::new(env!("CARGO_BIN_EXE_hessbook"))
            .args(["run", path.to_str().unwrap()])
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .unwrap();
        // The first output says that the loop is reached; then somebody has to read on, or a full pipe stops the program.
        let mut reader = std::io::BufReader::new(child.stdout.take().unwrap());
        let mut first = String::new();
        std::io::BufRead::read_line(&mut reader, &mut first).unwrap();
        assert_eq!(first, "begun\n");
        let drain = std::thread::spawn(move || std::io::copy(&mut reader, &mut std::io::sink()));
        let interrupted = Command::new("kill").args(["-INT", &child.id().to_string()]).status().unwrap();
        assert!(interrupted.success());
        let since = Instant::now();
        let status = loop {
            if let Some(status) = child.try_wait().unwrap() {
                break status;
            }
            assert!(since.elapsed() < Duration::from_secs(60), "it does not end");
            std::thread::sleep(Duration::from_millis(5));
        };
        drain.join().unwrap().unwrap();
        assert_eq!(status.code(), Some(1));
        let mut said = String::new();
        std::io::Read::read_to_string(&mut child.stderr.take().unwrap(), &mut said).unwrap();
        assert!(said.contains("interrupted") && said.contains("try:"), "{said}");
    }
}

#[test]
fn a_revised_table_tells_what_it_would_move_in_an_archive() {
    let folder = Folder::new();
    let table = include_str!("../stdlib/data/atct-1.112.json");
    assert!(table.contains("\"-393.474\""));
    let old = folder.file("old.json", table);
    // The formation enthalpy of CO2(g), 0.500 kJ/mol lower.
    let new = folder.file("new.json", &table.replace("\"-393.474\"", "\"-393.974\""));
    std::fs::create_dir(folder.0.path().join("archive")).unwrap();
    let notebook = |name: &str, source: &str| {
        let cell = serde_json::json!({"cell_type": "code", "id": "a", "metadata": {}, "execution_count": null,
            "outputs": [], "source": source});
        let tree = serde_json::json!({"cells": [cell], "metadata": {}, "nbformat": 4, "nbformat_minor": 5});
        folder.file(&format!("archive/{name}.ipynb"), &tree.to_string());
    };
    notebook("shift", &format!("report(\"shift\", {SHIFT}.enthalpy(\"450 degC\")); report(\"own\", q(\"1.0(1) kJ\"))"));
    notebook("water", "report(\"water\", reaction(\"H2(g) + 0.5 O2(g) -> H2O(g)\").enthalpy(\"450 degC\"))");
    let [old, new] = [&old, &new].map(|path| path.to_str().unwrap());
    let archive = folder.0.path().join("archive");
    let compared = hessbook(&["data", "compare", old, new, "--archive", archive.to_str().unwrap()]);
    let said = String::from_utf8(compared.stdout).unwrap();
    // ν(CO2) = +1.
    for part in [
        "formation properties of CO2(g) in atct-1.112",
        "move  -0.500 kJ/mol",
        "water.ipynb: no value would change",
        "1 of 3 reported values would change",
    ] {
        assert!(said.contains(part), "{part} is not in\n{said}");
    }
    assert_eq!(compared.status.code(), Some(1));
    // A real new edition has another id and perhaps another rank; the old one may be named by its id.
    let edition = table.replace("\"-393.474\"", "\"-393.974\"").replace("\"atct-1.112\"", "\"atct-1.130\"");
    let edition = folder.file("edition.json", &edition.replace("\"rank\": 10", "\"rank\": 40"));
    let compared =
        hessbook(&["data", "compare", "atct-1.112", edition.to_str().unwrap(), "--archive", archive.to_str().unwrap()]);
    let said = String::from_utf8(compared.stdout).unwrap();
    for part in ["move  -0.500 kJ/mol", "1 of 3 reported values would change"] {
        assert!(said.contains(part), "{part} is not in\n{said}");
    }
    // CODATA in place of ATcT: CO -110.53, H2O -241.826, CO2 -393.51 against -110.525, -241.822, -393.474 kJ/mol
    // (Cox, Wagman, Medvedev 1989; ATcT 1.112), so the shift moves by -0.027 and water by -0.004 kJ/mol.
    let compared = hessbook(&["data", "compare", "atct-1.112", "codata-1989", "--archive", archive.to_str().unwrap()]);
    let said = String::from_utf8(compared.stdout).unwrap();
    for part in ["move  -0.027 kJ/mol", "move  -0.0040 kJ/mol", "2 of 3 reported values would change"] {
        assert!(said.contains(part), "{part} is not in\n{said}");
    }
    let other = folder.file("other.json", include_str!("../stdlib/data/nasa-tp-2002-211556-functions.json"));
    let refused = hessbook(&["data", "compare", old, other.to_str().unwrap(), "--archive", archive.to_str().unwrap()]);
    let said = String::from_utf8(refused.stderr).unwrap();
    assert_eq!(refused.status.code(), Some(2));
    assert!(said.contains("hessbook-formation/1") && said.contains("hessbook-functions/1"), "{said}");
    // Without an archive the two tables themselves are compared, also where both have one id.
    let listed = hessbook(&["data", "compare", "atct-1.112", new]);
    let said = String::from_utf8(listed.stdout).unwrap();
    let worst = said.lines().nth(1).unwrap_or_default();
    assert!(worst.starts_with("CO2(g)  ΔfH°  -393.474") && worst.contains("+0.500 kJ/mol"), "{said}");
    let same = hessbook(&["data", "compare", old, old, "--archive", archive.to_str().unwrap()]);
    assert!(String::from_utf8(same.stdout).unwrap().ends_with("0 of 3 reported values would change\n"));
    assert_eq!(same.status.code(), Some(0));
}

#[test]
fn what_is_explained_goes_to_standard_output_and_what_is_unknown_is_refused() {
    let folder = Folder::new();
    folder.file("method.rhai", "// Heat taken up.\nfn duty(n, dh) {\n    n * dh\n}\n");
    let place = folder.0.path().to_str().unwrap();
    let told = hessbook(&["explain", "method::duty", "--in", place]);
    assert_eq!(told.status.code(), Some(0));
    assert!(String::from_utf8(told.stdout).unwrap().starts_with("method::duty(n, dh)\n  method.rhai, line 2\n"));
    let refused = hessbook(&["explain", "method::dutty", "--in", place]);
    assert_eq!(refused.status.code(), Some(2));
    assert!(refused.stdout.is_empty());
    assert!(String::from_utf8(refused.stderr).unwrap().contains("did you mean method::duty?"));
}
