//! The reports on an archive: what they count, that they can be read back, and that nothing in a notebook can steer them.
//!
//! The archive is made of copies of shipped notebooks: one edited, one with an altered seal, one without seal, one torn, one
//! with nothing to compare, and small ones sealed here. Today's tables have one figure revised and today's constants another
//! gas constant. What the reports must count is counted here from the audits again, by other code.

use std::path::Path;
use std::sync::{Arc, LazyLock};
use std::time::Duration;

use hessbook::archive::audits::Audits;
use hessbook::archive::report::{self, About};
use hessbook::archive::tally::Tally;
use hessbook::data::records::{Record, Records};
use hessbook::fault::Fault;
use hessbook::notebook::audit::{AuditOptions, audit_one};
use hessbook::notebook::holdings::Holdings;
use hessbook::notebook::seal::KEY;
use hessbook::notebook::sealing::{Sealing, seal};
use hessbook::notebook::verdict::{
    AuditFault, AuditStatus, CauseKind, Difference, NotebookAudit, Outcome, Signed, ValueAudit, Verdict,
};
use hessbook::session::on_big_stack;
use hessbook::units::constants;
use serde_json::{Value, json};

/// Today's tables with one figure revised, and another gas constant.
fn today() -> Holdings {
    let shipped = Records::shipped();
    let name = "formation properties of CO2(g) in atct-1.112";
    let (key, record) = shipped.all().into_iter().find(|(known, _)| known.to_string() == name).unwrap();
    assert!(record.content.contains("-393.474"), "{}", record.content);
    let mut records = Records::clone(&shipped);
    let content = record.content.replace("-393.474", "-393.974");
    records.put(&key, Some(&Record::from_text(&record.list, &record.id, &content)), &shipped);
    // The gas constant of CODATA 1986, as NASA/TP-2002-211556 takes it: 8.314510(70) J/(mol K).
    let altered = constants::current().with(&[("molar gas constant", 8.314_510, 0.000_070)]);
    Holdings::of(records).with_constants(altered)
}

fn edit(path: &Path, change: impl FnOnce(&mut Value)) {
    let mut tree: Value = serde_json::from_slice(&std::fs::read(path).unwrap()).unwrap();
    change(&mut tree);
    std::fs::write(path, tree.to_string()).unwrap();
}

fn exchange_in_cells(tree: &mut Value, from: &str, to: &str) {
    let cells = serde_json::to_string(&tree["cells"]).unwrap();
    let quoted = |text: &str| text.replace('"', "\\\"");
    assert!(cells.contains(&quoted(from)), "no cell has {from}");
    tree["cells"] = serde_json::from_str(&cells.replace(&quoted(from), &quoted(to))).unwrap();
}

/// A notebook of one cell, sealed.
fn sealed(path: &Path, source: &str, author: Option<&str>) {
    let cell = json!({"cell_type": "code", "id": "only", "metadata": {}, "source": source,
        "execution_count": null, "outputs": []});
    let tree = json!({"cells": [cell], "metadata": {}, "nbformat": 4, "nbformat_minor": 5});
    std::fs::write(path, tree.to_string()).unwrap();
    on_big_stack(|| {
        let author = author.map(str::to_owned);
        let how = Sealing { date: "2026-12-01T00:00:00Z".to_owned(), author, ..Sealing::default() };
        seal(path, &how, &Holdings::shipped(), &Arc::default()).unwrap().notebook.write(path).unwrap();
    });
}

static OPTIONS: LazyLock<AuditOptions> =
    LazyLock::new(|| AuditOptions { today: today(), from_sources: true, ..AuditOptions::default() });

/// The audits, with `archive` for the folder.
static AUDITS: LazyLock<Vec<NotebookAudit>> = LazyLock::new(|| {
    let folder = tempfile::tempdir().unwrap();
    let shipped = Path::new(env!("CARGO_MANIFEST_DIR")).join("notebooks");
    let path = |name: &str| folder.path().join(format!("{name}.ipynb"));
    let copy = |of: &str, name: &str| {
        std::fs::copy(shipped.join(format!("{of}.ipynb")), path(name)).unwrap();
        path(name)
    };
    edit(&copy("shift-converter", "altered"), |tree| {
        tree["metadata"][KEY]["values"][0]["record"]["value"] = json!("-39.5");
    });
    edit(&copy("pressure-vessel", "bare"), |tree| drop(tree["metadata"].as_object_mut().unwrap().remove(KEY)));
    edit(&copy("shift-converter", "edited"), |tree| exchange_in_cells(tree, "\"430 degC\"", "\"432 degC\""));
    edit(&copy("shift-converter", "empty"), |tree| {
        tree["metadata"].as_object_mut().unwrap().remove(KEY);
        tree["cells"].as_array_mut().unwrap().iter_mut().for_each(|cell| cell["outputs"] = json!([]));
    });
    sealed(
        &path("lapsed"),
        "let shift = reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\");\n\
         report(\"short\", shift.enthalpy(\"450 degC\", #{ formation: \"codata-1989\" }));\n\
         justify(\"formation-dataset\", \"short\", \"the design sheet uses CODATA\");\n\
         justify(\"independent-inputs\", \"short\", \"the table gives no coefficients\");",
        Some("A. Analyst"),
    );
    copy("pressure-vessel", "revised");
    sealed(&path("same"), "let c = q(\"2.5(1) kJ\");\nlet d = c * 3.0;\nreport(\"heat\", d)", None);
    std::fs::write(path("torn"), "{\"nbformat\": 4, \"cells\": [{\"source\": \"let shift = rea").unwrap();
    let mut names: Vec<_> = std::fs::read_dir(folder.path()).unwrap().map(|entry| entry.unwrap().path()).collect();
    names.sort();
    let folder_text = folder.path().display().to_string();
    let audit = |path: &std::path::PathBuf| {
        let told = serde_json::to_string(&audit_one(path, &OPTIONS)).unwrap();
        serde_json::from_str(&told.replace(&folder_text, "archive")).unwrap()
    };
    names.iter().map(audit).collect()
});

fn about() -> About {
    let paths = vec!["archive".to_owned()];
    let about = About::of(&OPTIONS, paths, "2026-12-01T09:30:00Z", Some(Duration::from_millis(4200)));
    // The digest of the shipped tables changes with each of them.
    About { tables: "5eed".repeat(16), ..about }
}

fn audits() -> &'static dyn Audits {
    static SLICE: LazyLock<Slice> = LazyLock::new(|| Slice(AUDITS.clone()));
    &*SLICE
}

struct Slice(Vec<NotebookAudit>);

impl Audits for Slice {
    fn each(&self, take: &mut dyn FnMut(&NotebookAudit) -> Result<(), Fault>) -> Result<(), Fault> {
        self.0.iter().try_for_each(take)
    }
}

type Form = fn(&dyn Audits, &About, &mut dyn std::io::Write) -> Result<(), Fault>;

fn written(form: Form, audits: &dyn Audits, about: &About) -> String {
    let mut bytes = Vec::new();
    form(audits, about, &mut bytes).unwrap();
    String::from_utf8(bytes).unwrap()
}

fn named(name: &str) -> &'static NotebookAudit {
    AUDITS.iter().find(|audit| audit.file == format!("archive/{name}.ipynb")).unwrap()
}

fn values() -> impl Iterator<Item = (&'static NotebookAudit, &'static ValueAudit)> {
    AUDITS.iter().flat_map(|audit| audit.values.iter().map(move |value| (audit, value)))
}

fn causes(outcome: &Outcome) -> Vec<CauseKind> {
    outcome.moved.iter().flat_map(|moved| &moved.causes).map(|cause| cause.kind).collect()
}

#[test]
fn the_archive_is_what_the_tests_say_it_is() {
    let status = |name: &str| named(name).status;
    assert_eq!(status("same"), AuditStatus::Same);
    assert_eq!(status("revised"), AuditStatus::Same, "today's data alone do not count");
    assert_eq!(status("lapsed"), AuditStatus::Same);
    assert_eq!(status("edited"), AuditStatus::Differs);
    assert_eq!(status("altered"), AuditStatus::Differs);
    assert_eq!(status("bare"), AuditStatus::Differs, "without seal it is run on today's data");
    assert_eq!(status("empty"), AuditStatus::NothingToCompare);
    assert_eq!(status("torn"), AuditStatus::CouldNotRun);
    let kinds: Vec<CauseKind> = values().flat_map(|(_, value)| causes(&value.under_today)).collect();
    for kind in [CauseKind::Data, CauseKind::Constants, CauseKind::Cell, CauseKind::Seal] {
        assert!(kinds.contains(&kind), "no {kind:?} in {kinds:?}");
    }
    assert!(named("lapsed").justifications.iter().any(|one| one.lapsed));
}

#[test]
fn a_tally_counts_what_is_there() {
    let tally = Tally::of(audits()).unwrap();
    assert_eq!((tally.all(), tally.not_same()), (8, 4));
    assert_eq!((tally.sealed, tally.recorded, tally.nothing), (5, 1, 2));
    let sealed = || values().filter(|(audit, _)| audit.seal.is_some());
    for verdict in Verdict::ALL {
        let of = |counts: &std::collections::BTreeMap<Verdict, usize>| counts.get(&verdict).copied().unwrap_or(0);
        assert_eq!(of(&tally.under_sealed), sealed().filter(|(_, one)| one.under_sealed.verdict == verdict).count());
        assert_eq!(of(&tally.under_today), sealed().filter(|(_, one)| one.under_today.verdict == verdict).count());
    }
    assert_eq!(tally.against_recorded.values().sum::<usize>(), named("bare").values.len());
    assert_eq!(tally.justifications_lapsed, 1);
    let justified: usize = AUDITS.iter().map(|audit| audit.justifications.len()).sum();
    assert_eq!(tally.justifications_in_force, justified - 1);
    assert_eq!((tally.seals.altered, tally.seals.not_signed, tally.seals.signed_trusted), (1, 5, 0));
    assert_eq!((tally.edits, tally.notebooks_edited), (1, 1));
    // One cause for the revised record, whatever the notebook.
    let record = tally.causes.iter().find(|cause| cause.words().contains("CO2(g) in atct-1.112")).unwrap();
    let moved = |value: &ValueAudit| {
        let of = value.under_today.moved.iter().flat_map(|moved| &moved.causes);
        of.clone().any(|cause| cause.kind == CauseKind::Data && cause.what.contains("CO2(g)"))
    };
    assert_eq!(record.values, values().filter(|(_, value)| moved(value)).count());
    // The largest share in kJ/mol is ν(CO2) = 1 times -0.500 kJ/mol, or as much of it as a coefficient of -1 turns round.
    let largest: f64 = record.largest["kJ/mol"].share.parse().unwrap();
    assert!((largest.abs() - 0.5).abs() < 1e-9, "{largest}");
}

#[test]
fn json_reads_back_as_the_audits_with_figures_as_texts() {
    let text = written(report::json, audits(), &about());
    let tree: Value = serde_json::from_str(&text).unwrap();
    assert_eq!(tree["format"], "hessbook-audit/1");
    let back: Vec<NotebookAudit> = serde_json::from_value(tree["notebooks"].clone()).unwrap();
    assert_eq!(&back, &*AUDITS);
    assert_eq!(tree["tally"]["notebooks"]["differs"], 3);
    assert_eq!(tree["about"]["took_s"], "4.2");
    fn fractions(value: &Value, path: &str, found: &mut Vec<String>) {
        match value {
            Value::Number(number) if !number.is_u64() => found.push(format!("{path}: {number}")),
            Value::Array(items) => items.iter().for_each(|item| fractions(item, path, found)),
            Value::Object(members) => {
                members.iter().for_each(|(name, item)| fractions(item, &format!("{path}.{name}"), found));
            }
            _ => {}
        }
    }
    let mut found = Vec::new();
    fractions(&tree, "", &mut found);
    assert_eq!(found, Vec::<String>::new(), "counts are integers, and figures are texts");
}

#[test]
fn junit_has_a_suite_for_each_notebook_and_the_right_counts() {
    let about = about();
    let text = written(report::junit, audits(), &about);
    let report = quick_junit::Report::deserialize_from_str(&text).unwrap();
    assert_eq!(report.test_suites.len(), AUDITS.len());
    let sum = |of: fn(&quick_junit::TestSuite) -> usize| report.test_suites.iter().map(of).sum::<usize>();
    assert_eq!((report.tests, report.failures), (sum(|suite| suite.tests), sum(|suite| suite.failures)));
    assert_eq!((report.errors, report.skipped), (sum(|suite| suite.errors), sum(|suite| suite.skipped)));
    for (audit, suite) in AUDITS.iter().zip(&report.test_suites) {
        assert_eq!(suite.name.as_str(), audit.file);
        // A build server must come to the same result as the exit status.
        let fallen = (suite.errors > 0, suite.failures > 0);
        let expected = match audit.status {
            AuditStatus::Same | AuditStatus::NothingToCompare => (false, false),
            AuditStatus::Differs => (false, true),
            AuditStatus::CouldNotRun => (true, false),
        };
        assert_eq!(fallen, expected, "{}", audit.file);
        for value in &audit.values {
            assert!(suite.test_cases.iter().any(|case| case.name.as_str() == value.label), "no case {}", value.label);
        }
    }
    let different = |(audit, value): &(&NotebookAudit, &ValueAudit)| {
        let first = if audit.seal.is_some() { &value.under_sealed } else { &value.under_today };
        !first.verdict.is_same()
    };
    // Two more for the altered seal itself: that it is one, and that the outputs say otherwise than it.
    assert_eq!((report.failures, report.errors, report.skipped), (values().filter(different).count() + 2, 1, 1));

    let strict = About { strict_data: true, ..about };
    let report = quick_junit::Report::deserialize_from_str(&written(report::junit, audits(), &strict)).unwrap();
    let either = |(_, value): &(&NotebookAudit, &ValueAudit)| {
        !(value.under_sealed.verdict.is_same() && value.under_today.verdict.is_same())
    };
    assert_eq!(report.failures, values().filter(either).count() + 2);
}

#[test]
fn a_failure_names_cause_and_size_and_a_move_under_todays_data_is_a_note() {
    let text = written(report::junit, audits(), &about());
    let report = quick_junit::Report::deserialize_from_str(&text).unwrap();
    let case = |file: &str, label: &str| {
        let suite = report.test_suites.iter().find(|suite| suite.name.as_str().contains(file)).unwrap();
        suite.test_cases.iter().find(|case| case.name.as_str() == label).unwrap().clone()
    };
    let quick_junit::TestCaseStatus::NonSuccess { message, description, .. } =
        case("edited", "shift enthalpy at outlet").status
    else {
        panic!("an edited cell fails no case")
    };
    let (message, description) = (message.unwrap().into_string(), description.unwrap().into_string());
    let moved = value("edited", "shift enthalpy at outlet").under_sealed.moved.as_ref().unwrap();
    assert!(message.contains(&moved.shown), "{message}");
    assert!(description.contains("edited cell: cell-1") && description.contains("first differs at"), "{description}");
    let note = case("revised", "methanation enthalpy by the tables").system_out.unwrap().into_string();
    assert!(note.contains("formation properties of CO2(g) in atct-1.112"), "{note}");
}

fn value(file: &str, label: &str) -> &'static ValueAudit {
    named(file).values.iter().find(|value| value.label == label).unwrap()
}

#[test]
fn derivations_stand_side_by_side_with_the_step_where_they_part() {
    // An edited parameter: the typed temperature is the first step that is another one, and the enthalpy follows it.
    let steps = &value("edited", "shift enthalpy at outlet").steps;
    assert_eq!(steps[0].under, "the sealed data");
    let parting: Vec<_> = steps[0].pairs.iter().filter(|pair| pair.parts).collect();
    assert_eq!(parting.len(), 1);
    let side = |side: &Option<hessbook::notebook::verdict::StepSide>| side.as_ref().unwrap().clone();
    let (then, now) = (side(&parting[0].then), side(&parting[0].now));
    assert_eq!((then.words.as_str(), now.words.as_str()), ("\"430 degC\"", "\"432 degC\""));
    let last = steps[0].pairs.last().unwrap();
    assert!(side(&last.now).words.starts_with("enthalpy of CO(g) + H2O(g) -> CO2(g) + H2(g), T = step"), "{last:#?}");
    assert_eq!(side(&last.then).value, value("edited", "shift enthalpy at outlet").sealed.as_ref().unwrap().value);
    let formation = |pair: &&hessbook::notebook::verdict::StepPair| {
        pair.then.as_ref().is_some_and(|side| side.words.contains("formation enthalpy of CO2(g)"))
    };
    assert!(steps[0].pairs.iter().find(formation).unwrap().is_same());

    // A revised record: the derivation under today's data parts at it, by the revision.
    let steps = &value("revised", "methanation enthalpy by the tables").steps;
    assert_eq!((steps.len(), steps[0].under.as_str()), (1, "today's data"));
    let revised = steps[0].pairs.iter().find(formation).unwrap();
    assert!(revised.parts && !revised.is_same());
    assert_eq!((side(&revised.then).shown, side(&revised.now).shown), figures("-393.474 kJ/mol", "-393.974 kJ/mol"));

    // What is identical carries none.
    assert!(
        values().all(|(_, one)| one.steps.is_empty()
            || one.under_sealed.moved.is_some()
            || one.under_today.moved.is_some())
    );
    assert!(named("same").values.iter().all(|one| one.steps.is_empty()));
}

fn figures(then: &str, now: &str) -> (String, String) {
    (then.to_owned(), now.to_owned())
}

#[test]
fn a_long_derivation_lists_where_it_parts_and_counts_what_it_leaves_out() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("long.ipynb");
    // Each turn is two steps, and the first two figures are used by all: more steps than are listed, and fewer than a seal folds.
    let source = "let x = q(\"1.0(1) kJ\");\nlet y = q(\"2.5 kJ\");\n\
                  for turn in 0..40 { x = (x + y) * 0.5; }\nlet z = x - q(\"7.5 kJ\");\nreport(\"z\", z)";
    sealed(&path, source, None);
    edit(&path, |tree| exchange_in_cells(tree, "x - q(", "x + q("));
    let audit = audit_one(&path, &AuditOptions::default());
    let steps = &audit.values[0].steps[0];
    // The sum parts, and it alone: everything under it is the same.
    let differ: Vec<_> = steps.pairs.iter().filter(|pair| !pair.is_same()).collect();
    assert_eq!((differ.len(), differ[0].parts), (1, true));
    assert_eq!(differ[0].number, steps.pairs.last().unwrap().number);
    assert_eq!(steps.pairs.len() + steps.same_left_out, differ[0].number);
    assert!(steps.same_left_out > 20 && steps.others_left_out == 0, "{steps:#?}");

    // An edit at the beginning: what differs comes first, and the rest of it is counted.
    sealed(&path, source, None);
    edit(&path, |tree| exchange_in_cells(tree, "1.0(1) kJ", "1.5(1) kJ"));
    let audit = audit_one(&path, &AuditOptions::default());
    let steps = &audit.values[0].steps[0];
    assert!(steps.pairs.iter().any(|pair| pair.parts) && steps.others_left_out > 20, "{steps:#?}");
    assert_eq!(
        steps.pairs.len() + steps.same_left_out + steps.others_left_out,
        steps.pairs.last().unwrap().number,
        "the value itself is listed last, with the number of all"
    );
}

#[test]
fn the_page_holds_every_part_and_asks_for_nothing_from_outside() {
    let page = written(report::page, audits(), &about());
    for part in [
        "asked",
        "summary",
        "not-same",
        "faults",
        "moves",
        "steps",
        "justifications",
        "untested",
        "not-compared",
        "surroundings",
        "notebooks",
        "meaning",
        "review",
    ] {
        assert!(page.contains(&format!("id=\"{part}\"")), "no part {part}");
        assert!(page.contains(&format!("href=\"#{part}\"")), "nothing leads to {part}");
    }
    for outside in ["http:", "https:", "src=", "url(", "@import", "<link", "<script", "<img", "<iframe", "javascript:"]
    {
        assert!(!page.contains(outside), "{outside}");
    }
    assert!(page.contains("lang=\"en\"") && page.contains("4 of 8 notebooks are not the same"));
    for (_, value) in values().filter(|(_, value)| value.under_today.moved.is_some()) {
        assert!(page.contains(&value.label), "{}", value.label);
        assert!(page.contains(&escaped(&value.under_today.moved.as_ref().unwrap().shown)));
    }
    assert!(page.contains("the design sheet uses CODATA") && page.contains("author as given: A. Analyst"));
    let of_altered = named("altered").justifications.len();
    assert!(of_altered > 0);
    assert_eq!(page.matches("this need not be what its author wrote").count(), of_altered);
    assert!(page.contains("not signed") && page.contains("altered after it was made"));
    assert_eq!(page.matches("parts here</td>").count(), parted(), "each derivation marks where it parts");
    let tags = tags(&page);
    assert_eq!(unclosed(&tags), Vec::<String>::new());
    assert_eq!(links_to_nowhere(&page), Vec::<&str>::new());
    let mut ids: Vec<&str> = tags.iter().filter_map(|tag| tag.split_once(" id=\"")?.1.split('"').next()).collect();
    ids.sort_unstable();
    let all = ids.len();
    ids.dedup();
    assert_eq!(ids.len(), all, "an id is given twice");
}

/// Every link of the page leads somewhere in it.
fn links_to_nowhere(page: &str) -> Vec<&str> {
    let links = page.split("<a href=\"#").skip(1).filter_map(|rest| rest.split('"').next());
    links.filter(|link| !page.contains(&format!("id=\"{link}\""))).collect()
}

fn parted() -> usize {
    values().flat_map(|(_, value)| &value.steps).flat_map(|steps| &steps.pairs).filter(|pair| pair.parts).count()
}

/// As HTML has it.
fn escaped(text: &str) -> String {
    text.replace('&', "&amp;").replace('<', "&lt;").replace('/', "&#x2f;")
}

/// What stands between angle brackets, in order.
fn tags(page: &str) -> Vec<String> {
    page.split('<').skip(1).map(|rest| rest.split('>').next().unwrap_or("").to_owned()).collect()
}

/// Elements that are opened and not closed, or the other way round.
fn unclosed(tags: &[String]) -> Vec<String> {
    let (mut open, mut wrong) = (Vec::new(), Vec::new());
    for tag in tags {
        let name = tag.split_whitespace().next().unwrap_or("");
        match name.strip_prefix('/') {
            Some(name) if open.last().copied() == Some(name) => drop(open.pop()),
            Some(name) => wrong.push(format!("/{name} inside {open:?}")),
            None if ["!DOCTYPE", "meta", "br", "col"].contains(&name) => {}
            None => open.push(name),
        }
    }
    wrong.extend(open.into_iter().map(str::to_owned));
    wrong
}

/// Put before every text that an audit holds.
const HOSTILE: &str = "</td></table><script>alert(1)</script><img src=\"http://x\" onerror='x'>&amp;{{ 7*7 }}{% raw %}]]><!-- each -->\u{1b}[2J\u{202e}\u{0}";

/// The audits with a hostile text in every place that a notebook or a name can fill.
fn hostile() -> Slice {
    /// Words that are chosen from lists, or that decide what a text is about.
    const CHOSEN: [&str; 7] = ["against", "status", "verdict", "kind", "signed", "u_coverage", "under"];
    fn spoilt(value: &mut Value) {
        match value {
            Value::String(text) => *text = format!("{HOSTILE}{text}"),
            Value::Array(items) => items.iter_mut().for_each(spoilt),
            Value::Object(members) => {
                let kept = ["program", "shipped tables and procedures", "constant set"];
                let kept = members.get("what").and_then(Value::as_str).is_some_and(|what| kept.contains(&what));
                for (name, value) in members.iter_mut() {
                    let chosen = CHOSEN.contains(&name.as_str()) || (kept && name == "what") || name == "remainder";
                    if !chosen {
                        spoilt(value);
                    }
                }
            }
            _ => {}
        }
    }
    let mut tree = serde_json::to_value(&*AUDITS).unwrap();
    spoilt(&mut tree);
    Slice(serde_json::from_value(tree).unwrap())
}

#[test]
fn nothing_in_a_notebook_becomes_markup_on_the_page() {
    let (benign, spoilt) = (written(report::page, audits(), &about()), written(report::page, &hostile(), &about()));
    let (benign, hostile_tags) = (tags(&benign), tags(&spoilt));
    let first = benign.iter().zip(&hostile_tags).find(|(one, other)| one != other);
    assert_eq!(first, None);
    assert_eq!(benign.len(), hostile_tags.len());
    assert!(spoilt.contains("&lt;script&gt;alert(1)"), "the text itself is still shown");
    assert!(spoilt.contains("{{ 7*7 }}"), "what a notebook holds is no template");
    assert!(!spoilt.contains(['\u{1b}', '\u{202e}', '\u{0}']));
}

#[test]
fn nothing_in_a_notebook_breaks_the_xml() {
    let text = written(report::junit, &hostile(), &about());
    let report = quick_junit::Report::deserialize_from_str(&text).unwrap();
    let plain = written(report::junit, audits(), &about());
    let plain = quick_junit::Report::deserialize_from_str(&plain).unwrap();
    let counts = |report: &quick_junit::Report| {
        (report.test_suites.len(), report.tests, report.failures, report.errors, report.skipped)
    };
    assert_eq!(counts(&report), counts(&plain));
    assert!(report.test_suites[0].name.as_str().contains("]]><!-- each -->\\u{1b}[2J"));
    let legal = |c: char| matches!(c, '\t' | '\n' | '\r' | ' '..='\u{d7ff}' | '\u{e000}'..='\u{fffd}' | '\u{10000}'..);
    assert!(text.chars().all(legal), "XML 1.0, section 2.2, has other characters alone");
}

#[test]
fn nothing_in_a_notebook_steers_the_terminal() {
    let mut bytes = Vec::new();
    report::text(&hostile(), &about(), false, &mut bytes).unwrap();
    let text = String::from_utf8(bytes).unwrap();
    assert!(!text.contains(['\u{1b}', '\u{202e}', '\u{0}']), "{text}");
    let mut plain = Vec::new();
    report::text(audits(), &about(), false, &mut plain).unwrap();
    let plain = String::from_utf8(plain).unwrap();
    assert_eq!(text.lines().count(), plain.lines().count(), "no label makes a line of its own");
}

#[test]
fn the_summary_reads_as_agreed_and_colour_adds_no_words() {
    let written = |colour: bool| {
        let mut bytes = Vec::new();
        report::text(audits(), &about(), colour, &mut bytes).unwrap();
        String::from_utf8(bytes).unwrap()
    };
    let plain = written(false);
    insta::assert_snapshot!(plain);
    let coloured = written(true);
    assert_ne!(coloured, plain);
    let bare = ["\u{1b}[1;31m", "\u{1b}[1m", "\u{1b}[0m"].iter().fold(coloured, |text, code| text.replace(code, ""));
    assert_eq!(bare, plain);
}

/// An audit with what the archive above lacks: every sort of signature, a draft, values that came, went and failed, shares
/// that are not known, steps on one side alone, steps taken as sealed.
fn odd(signed: Signed) -> NotebookAudit {
    let mut audit = named("edited").clone();
    let seal = audit.seal.as_mut().unwrap();
    (seal.signed, seal.draft) = (signed, true);
    let verdicts =
        [Verdict::New, Verdict::Missing, Verdict::CouldNotRun, Verdict::WithinU, Verdict::UnitOrBasisChanged];
    for (value, verdict) in audit.values.iter_mut().zip(verdicts) {
        value.under_sealed.verdict = verdict;
        match verdict {
            Verdict::New => value.sealed = None,
            Verdict::Missing | Verdict::CouldNotRun => {
                (value.under_sealed.figure, value.under_sealed.moved) = (None, None)
            }
            _ => {}
        }
    }
    let moved = audit.values[4].under_today.moved.as_mut().unwrap();
    (moved.causes[0].share, moved.causes[0].shown) = (None, None);
    (moved.remainder, moved.remainder_shown) = ("0.25".to_owned(), "+0.250 kJ/mol".to_owned());
    let steps = &mut audit.values[4].steps[0];
    steps.pairs.drain(1..3);
    (steps.same_left_out, steps.others_left_out) = (2, 1);
    steps.pairs[1].then = None;
    steps.pairs[2].now = None;
    let derived = audit.from_sources.as_mut().unwrap();
    derived[0].not_rederived = vec!["cell-2, line 1: 3 steps folded, taken by their linear form".to_owned()];
    (derived[1].same, derived[1].value, derived[1].off_by) = (false, None, None);
    derived[1].parts_at = Some("cell-3, line 1: exp".to_owned());
    audit.environment.push(Difference { what: "program".into(), sealed: "0.0.9".into(), now: "0.1.0".into() });
    for (what, then, now) in [("cell-4, added", "not there", "5d"), ("plant.rhai", "6e", "not there")] {
        audit.environment.push(Difference { what: what.into(), sealed: then.into(), now: now.into() });
    }
    let fault = named("torn").faults[0].fault.clone();
    audit.faults.push(AuditFault { under: "today's data".to_owned(), fault });
    audit
}

#[test]
fn what_is_rare_is_reported_in_every_form_too() {
    let key = "0a".repeat(32);
    let valid = |trusted: Option<&str>| Signed::Valid { key: key.clone(), trusted: trusted.map(str::to_owned) };
    let invalid = Signed::Invalid { key: key.clone(), why: "it is of another content".to_owned() };
    let odd = Slice([valid(Some("larkmoor")), valid(None), invalid].map(odd).to_vec());
    let about = About {
        trusted: vec!["larkmoor".to_owned()],
        strict_data: true,
        left_out: vec!["shard 1 of 3: 16 notebooks fall to the others".to_owned()],
        ..about()
    };
    let tally = Tally::of(&odd).unwrap();
    let seals = &tally.seals;
    assert_eq!((seals.signed_trusted, seals.signed_untrusted, seals.signature_invalid, seals.drafts), (1, 1, 1, 3));
    let page = written(report::page, &odd, &about);
    for words in [
        "signed with the trusted key larkmoor",
        "which is not among the trusted",
        "DOES NOT HOLD: it is of another content",
        "draft",
        "not in the seal",
        "no figure",
        "share not known",
        "+0.250 kJ&#x2f;mol, remainder, not told apart",
        "no such step",
        "steps not listed",
        "Steps not listed: 2 that are the same on both sides, and 1 that differ.",
        "the same, with these steps taken as sealed",
        "could not be derived again",
        "program: 0.0.9 then, 0.1.0 now",
        "cell-1, edited; cell-4, added; plant.rhai, not there",
        "16 notebooks fall to the others",
    ] {
        assert!(page.contains(words), "{words}");
    }
    assert_eq!(unclosed(&tags(&page)), Vec::<String>::new());
    let text = written(|audits, about, out| report::text(audits, about, false, out), &odd, &about);
    assert!(text.contains("1 notebook with a signature that does not hold"), "{text}");
    assert!(text.contains("share not known for 3 values"), "{text}");
    let report = quick_junit::Report::deserialize_from_str(&written(report::junit, &odd, &about)).unwrap();
    // Of each: the fault under today's data, which is asked to count, and the value that could not run.
    assert_eq!((report.test_suites.len(), report.errors), (3, 6));
}

#[test]
fn a_page_says_how_many_derivations_it_leaves_out() {
    let many = Slice((0..30).map(|_| named("edited").clone()).collect());
    let page = written(report::page, &many, &about());
    let all: usize = many.0.iter().flat_map(|audit| &audit.values).map(|value| value.steps.len()).sum();
    let shown = page.matches("<details").count();
    assert!(shown < all && shown > 100, "{shown} of {all}");
    assert!(page.contains(&format!("{} more derivations are not shown", all - shown)));
    assert_eq!(links_to_nowhere(&page), Vec::<&str>::new());
}

#[test]
fn an_archive_without_notebooks_says_so_in_every_form() {
    let none = Slice(Vec::new());
    assert!(written(report::page, &none, &about()).contains("No notebook was audited."));
    let tree: Value = serde_json::from_str(&written(report::json, &none, &about())).unwrap();
    assert_eq!(tree["notebooks"], json!([]));
    let report = quick_junit::Report::deserialize_from_str(&written(report::junit, &none, &about())).unwrap();
    assert_eq!((report.tests, report.test_suites.len()), (0, 0));
}

#[test]
fn an_audit_that_cannot_be_read_back_or_a_full_disk_ends_the_report_with_its_fault() {
    struct Gone;
    impl Audits for Gone {
        fn each(&self, _: &mut dyn FnMut(&NotebookAudit) -> Result<(), Fault>) -> Result<(), Fault> {
            Err(Fault::new("gone-for-the-test", "the audits are gone", "none"))
        }
    }
    struct Full;
    impl std::io::Write for Full {
        fn write(&mut self, _: &[u8]) -> std::io::Result<usize> {
            Err(std::io::Error::other("the disk is full"))
        }

        fn flush(&mut self) -> std::io::Result<()> {
            Ok(())
        }
    }
    for form in [report::json, report::junit, report::page] as [Form; 3] {
        assert_eq!(form(&Gone, &about(), &mut Vec::new()).unwrap_err().code(), "gone-for-the-test");
        let fault = form(audits(), &about(), &mut Full).unwrap_err();
        assert_eq!(fault.code(), "archive-report-unwritable");
        assert!(fault.message().contains("the disk is full"), "{fault}");
    }
}
