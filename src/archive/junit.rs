//! The audits of an archive as JUnit XML, which build servers show: a suite for each notebook, a case for each value.
//!
//! A value that differs is a failure with its causes; what could not be run is an error; a notebook with nothing to compare
//! is skipped. A move under today's data alone is a failure only where it was asked to count, and a note otherwise. Where a
//! notebook differs by something that no value shows, such as its seal, a case of its own says so. The surprise: the
//! library that writes the XML holds a whole report, so each suite is written as a report of its own and taken out of it.

use std::collections::BTreeMap;
use std::io::Write;
use std::time::Duration;

use quick_junit::{NonSuccessKind, Report, TestCase, TestCaseStatus, TestSuite};

use crate::archive::audits::Audits;
use crate::archive::report::{About, ReportError, unwritable};
use crate::archive::words::{causes_words, edits, fault_words, seal_words};
use crate::fault::Fault;
use crate::notebook::verdict::{
    Against, AuditFault, AuditStatus, NotebookAudit, Outcome, OutputDiffers, Rederived, Signed, ValueAudit, Verdict,
};
use crate::render::harmless::{harmless, in_one_line};

/// Closes the outermost element; names and texts cannot hold it, since `<` is escaped in them.
const END: &str = "</testsuites>";

pub(super) fn write(audits: &dyn Audits, about: &About, out: &mut dyn Write) -> Result<(), Fault> {
    let mut whole = Report::new("hessbook audit");
    if let Ok(time) = chrono::DateTime::parse_from_rfc3339(&about.time) {
        whole.set_timestamp(time);
    }
    if let Some(took) =
        about.took_s.as_ref().and_then(|took| took.parse().ok()).and_then(|s| Duration::try_from_secs_f64(s).ok())
    {
        whole.set_time(took);
    }
    audits.each(&mut |audit| {
        let suite = suite(audit, about);
        whole.tests += suite.tests;
        whole.failures += suite.failures;
        whole.errors += suite.errors;
        whole.skipped += suite.skipped;
        Ok(())
    })?;
    let frame = xml(&whole)?;
    let (head, tail) = frame.split_at(frame.rfind(END).ok_or_else(|| unmade("it has no end"))?);
    out.write_all(head.trim_end().as_bytes()).map_err(unwritable)?;
    audits.each(&mut |audit| {
        let mut alone = Report::unnamed();
        alone.add_test_suite(suite(audit, about));
        let alone = xml(&alone)?;
        // A suite's own name may hold anything but `<`.
        let begin = alone.find("<testsuite ").ok_or_else(|| unmade("a suite has no beginning"))?;
        let end = alone.rfind(END).ok_or_else(|| unmade("a suite has no end"))?;
        write!(out, "\n    {}", alone[begin..end].trim_end()).map_err(unwritable)
    })?;
    write!(out, "\n{}\n", tail.trim_end()).map_err(unwritable)
}

fn unmade(why: impl ToString) -> Fault {
    ReportError::Make { why: why.to_string() }.into()
}

fn xml(report: &Report) -> Result<String, Fault> {
    report.to_string().map_err(unmade)
}

/// A text of several lines as XML may hold it.
fn legal(text: &str) -> String {
    harmless(text).replace('\t', " ")
}

/// A name or a message, which stands in one line.
fn line(text: &str) -> String {
    in_one_line(text).into_owned()
}

fn suite(audit: &NotebookAudit, about: &About) -> TestSuite {
    let mut suite = TestSuite::new(line(&audit.file));
    let derived: BTreeMap<&str, &Rederived> =
        audit.from_sources.iter().flatten().map(|one| (one.label.as_str(), one)).collect();
    let again = |value: &ValueAudit| derived.get(value.label.as_str()).copied();
    let cases = audit.values.iter().map(|value| of_value(value, audit, about, again(value)));
    for case in of_notebook(audit, about).into_iter().chain(cases) {
        suite.add_test_case(case);
    }
    let notes = notes(audit, about);
    if !notes.is_empty() {
        suite.set_system_out(legal(&notes.join("\n")));
    }
    suite
}

fn case(audit: &NotebookAudit, name: &str, status: TestCaseStatus) -> TestCase {
    let mut case = TestCase::new(line(name), status);
    case.set_classname(line(&audit.file));
    case
}

fn fallen(kind: NonSuccessKind, sort: &str, message: &str, lines: &[String]) -> TestCaseStatus {
    let mut status = TestCaseStatus::non_success(kind);
    status.set_type(sort).set_message(line(message)).set_description(legal(&lines.join("\n")));
    status
}

/// Whether a fault counts for the result, as the status of its notebook does.
fn counts(fault: &AuditFault, about: &About) -> bool {
    about.strict_data || fault.under != "today's data"
}

/// What differs about a notebook beside its values.
fn of_notebook(audit: &NotebookAudit, about: &About) -> Vec<TestCase> {
    let mut cases = Vec::new();
    for fault in audit.faults.iter().filter(|fault| counts(fault, about)) {
        let (message, hint) = fault_words(fault, &audit.file);
        let lines = [message.clone(), format!("try: {hint}")];
        let status = fallen(NonSuccessKind::Error, &fault.fault.code, &message, &lines);
        cases.push(case(audit, &format!("(run under {})", fault.under), status));
    }
    if let Some(seal) = audit.seal.as_ref().filter(|seal| !seal.whole || matches!(seal.signed, Signed::Invalid { .. }))
    {
        let words = seal_words(seal);
        cases.push(case(
            audit,
            "(seal)",
            fallen(NonSuccessKind::Failure, "altered seal", &words, std::slice::from_ref(&words)),
        ));
    }
    if let Some(first) = audit.outputs.first() {
        let words: Vec<String> = audit.outputs.iter().map(OutputDiffers::words).collect();
        let status = fallen(NonSuccessKind::Failure, "recorded output differs", &first.words(), &words);
        cases.push(case(audit, "(recorded outputs)", status));
    }
    if audit.status == AuditStatus::NothingToCompare {
        let mut status = TestCaseStatus::skipped();
        status.set_message(line(audit.not_compared.first().map_or("nothing to compare with", String::as_str)));
        cases.push(case(audit, "(nothing to compare)", status));
    }
    cases
}

fn of_value(value: &ValueAudit, audit: &NotebookAudit, about: &About, derived: Option<&Rederived>) -> TestCase {
    // A notebook without seal is run once, on today's data.
    let (first, under) = match audit.against {
        Against::Seal => (&value.under_sealed, "under the sealed data"),
        _ => (&value.under_today, "against its recorded result"),
    };
    let other = (audit.against == Against::Seal && value.under_today != value.under_sealed)
        .then_some((&value.under_today, "under today's data"));
    let otherwise = derived.filter(|one| !one.is_same());

    let counts = other.filter(|_| about.strict_data);
    let worst = [Some((first, under)), counts].into_iter().flatten().max_by_key(|(outcome, _)| outcome.verdict);
    let (outcome, under) = worst.unwrap_or((first, under));
    let mut lines = told(value, first, under_words(audit));
    let mut note = Vec::new();
    if let Some((other, under)) = other.filter(|(other, _)| other.verdict != Verdict::Identical) {
        let told = told(value, other, under);
        if about.strict_data { lines.extend(told) } else { note.extend(told) }
    }
    if let Some(one) = otherwise {
        lines.push(derived_words(one));
    }
    let status = if outcome.verdict == Verdict::CouldNotRun {
        fallen(NonSuccessKind::Error, outcome.verdict.word(), &format!("could not run {under}"), &lines)
    } else if !outcome.verdict.is_same() {
        let by = outcome.moved.as_ref().map_or_else(String::new, |moved| format!(" by {}", moved.shown));
        let message = format!("{}{by} {under}", outcome.verdict.word());
        fallen(NonSuccessKind::Failure, outcome.verdict.word(), &message, &lines)
    } else if let Some(one) = otherwise {
        fallen(NonSuccessKind::Failure, "derived otherwise", &derived_words(one), &lines)
    } else {
        TestCaseStatus::success()
    };
    let mut case = case(audit, &value.label, status);
    if !note.is_empty() {
        note.insert(0, "not counted, since moves under today's data alone were not asked to count:".to_owned());
        case.set_system_out(legal(&note.join("\n")));
    }
    case
}

fn under_words(audit: &NotebookAudit) -> &'static str {
    if audit.against == Against::Seal { "under the sealed data" } else { "against its recorded result" }
}

/// What became of a value, in lines: was, is, move, causes, where it parts.
fn told(value: &ValueAudit, outcome: &Outcome, under: &str) -> Vec<String> {
    let mut lines = vec![format!("{} {under}", outcome.verdict.word())];
    lines.extend(value.sealed.iter().map(|figure| format!("was {}", figure.shown)));
    lines.extend(outcome.figure.iter().map(|figure| format!("is {}", figure.shown)));
    if let Some(moved) = &outcome.moved {
        lines.push(format!("moved by {}", moved.shown));
        lines.extend(causes_words(moved));
        lines.extend(moved.parts_at.iter().map(|step| format!("first differs at {step}")));
    }
    lines.extend(outcome.notes.iter().cloned());
    lines
}

fn derived_words(one: &Rederived) -> String {
    let step = one.parts_at.as_ref().map_or_else(String::new, |step| format!("; first differs at {step}"));
    format!("{}{step}", one.otherwise_words())
}

/// What a reader of the suite should know and what fails no case.
fn notes(audit: &NotebookAudit, about: &About) -> Vec<String> {
    let mut notes: Vec<String> = audit.seal.iter().map(seal_words).collect();
    notes.extend(
        audit.faults.iter().filter(|fault| !counts(fault, about)).map(|fault| fault_words(fault, &audit.file).0),
    );
    notes.extend(edits(audit));
    notes.extend(audit.untested.iter().map(|row| format!("open when it was sealed: {row}")));
    let lapsed = audit.justifications.iter().filter(|one| one.lapsed);
    notes.extend(lapsed.map(|one| format!("lapsed: {} of {}, justified by: {}", one.id, one.label, one.reason)));
    for one in audit.from_sources.iter().flatten().filter(|one| !one.not_rederived.is_empty()) {
        notes.extend(one.not_rederived.iter().map(|step| format!("not derived again, {}: {step}", one.label)));
    }
    notes.extend(audit.not_compared.iter().map(|what| format!("not compared: {what}")));
    notes
}
