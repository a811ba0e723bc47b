//! The closing summary of an audit for a terminal.
//!
//! Colour repeats what words say. What comes from files is made harmless first, since a label could steer the terminal.

use std::collections::BTreeMap;
use std::io::Write;

use crate::archive::audits::Audits;
use crate::archive::report::{About, unwritable};
use crate::archive::tally::{CauseSum, Tally};
use crate::archive::words::{counted, reasons, status_words, verdict_counts};
use crate::fault::Fault;
use crate::notebook::audit_text::short;
use crate::notebook::verdict::Verdict;
use crate::render::harmless::in_one_line;

/// Largest shares that a cause shows, each in a unit of its own.
const SHARES: usize = 3;

/// Causes that are shown; the other forms have all.
const CAUSES: usize = 20;

pub(super) fn write(
    audits: &dyn Audits,
    tally: &Tally,
    about: &About,
    colour: bool,
    out: &mut dyn Write,
) -> Result<(), Fault> {
    let mut pen = Pen { out, colour };
    let (program, constants) = (&about.program, &about.constants);
    let took = about.took_s.as_ref().map_or_else(|| " in several runs".to_owned(), |took| format!(" in {took} s"));
    pen.heading(&format!("{} audited{took}", counted(tally.all(), "notebook")))?;
    pen.line(&format!("by {program} with {constants} and the shipped tables {}", short(&about.tables)))?;
    for (status, notebooks) in &tally.notebooks {
        let words = status_words(*status, *notebooks);
        pen.line(&if status.exit() == 0 { words } else { pen.loud(&words) })?;
    }
    verdicts(&mut pen, tally)?;
    facts(&mut pen, tally)?;
    causes(&mut pen, tally)?;
    if tally.not_same() > 0 {
        pen.heading("not the same")?;
    }
    audits.each(&mut |audit| {
        if audit.status.exit() == 0 {
            return Ok(());
        }
        let word = pen.loud(audit.status.word());
        let reasons = reasons(audit, about.strict_data).join("; ");
        pen.line(&format!("{}: {word}: {}", in_one_line(&audit.file), in_one_line(&reasons)))
    })
}

/// Writes lines, with colour where the terminal has it.
struct Pen<'a> {
    out: &'a mut dyn Write,
    colour: bool,
}

impl Pen<'_> {
    fn heading(&mut self, words: &str) -> Result<(), Fault> {
        let words = self.styled("1", words);
        writeln!(self.out, "{words}").map_err(unwritable)
    }

    fn line(&mut self, words: &str) -> Result<(), Fault> {
        writeln!(self.out, "  {words}").map_err(unwritable)
    }

    /// Something that wants attention.
    fn loud(&self, words: &str) -> String {
        self.styled("1;31", words)
    }

    fn styled(&self, style: &str, words: &str) -> String {
        if self.colour { format!("\u{1b}[{style}m{words}\u{1b}[0m") } else { words.to_owned() }
    }
}

fn verdicts(pen: &mut Pen, tally: &Tally) -> Result<(), Fault> {
    const COLUMNS: [&str; 2] = ["under the sealed data", "under today's data"];
    let of = |counts: &BTreeMap<Verdict, usize>, verdict: Verdict| counts.get(&verdict).copied().unwrap_or(0);
    let row = |first: &str, cells: [String; 2]| {
        let [one, other] = cells;
        format!("{first:<22}  {one:>w1$}  {other:>w2$}", w1 = COLUMNS[0].len(), w2 = COLUMNS[1].len())
    };
    if !tally.under_sealed.is_empty() {
        pen.heading("values in sealed notebooks")?;
        pen.line(&row("", COLUMNS.map(str::to_owned)))?;
        for verdict in Verdict::ALL {
            let counts = [of(&tally.under_sealed, verdict), of(&tally.under_today, verdict)];
            if counts == [0, 0] {
                continue;
            }
            let words = row(verdict.word(), counts.map(|count| count.to_string()));
            pen.line(&if verdict.is_same() { words } else { pen.loud(&words) })?;
        }
        let all = [&tally.under_sealed, &tally.under_today].map(|counts| counts.values().sum::<usize>().to_string());
        pen.line(&row("all", all))?;
    }
    if !tally.against_recorded.is_empty() {
        let all = tally.against_recorded.iter().flat_map(|(verdict, count)| std::iter::repeat_n(*verdict, *count));
        pen.heading("values in notebooks without a seal")?;
        pen.line(&format!("against their recorded results: {}", verdict_counts(all)))?;
    }
    Ok(())
}

/// What else an auditor asks first; nothing of what there is none of.
fn facts(pen: &mut Pen, tally: &Tally) -> Result<(), Fault> {
    let seals = &tally.seals;
    let counts = [
        (tally.without_seal(), "without a seal", false),
        (seals.unreadable, "with a seal that cannot be read", true),
        (tally.not_read(), "that could not be read", true),
        (tally.outputs_differ, "with recorded outputs that are not what was sealed", true),
        (seals.not_signed, "sealed and not signed", false),
        (seals.signed_trusted, "signed with a trusted key", false),
        (seals.signed_untrusted, "signed with a key that is not among the trusted", false),
        (seals.signature_invalid, "with a signature that does not hold", true),
        (seals.altered, "with a seal that was altered", true),
        (seals.drafts, "sealed as a draft", false),
        (tally.notebooks_edited, "with cells or modules edited since they were sealed", false),
    ];
    let said = |(count, words, loud): &(usize, &str, bool)| {
        let words = format!("{} {words}", counted(*count, "notebook"));
        if *loud { pen.loud(&words) } else { words }
    };
    let mut lines: Vec<String> = counts.iter().filter(|(count, ..)| *count > 0).map(said).collect();
    let (force, lapsed) = (tally.justifications_in_force, tally.justifications_lapsed);
    if force + lapsed > 0 {
        let gone = format!("{lapsed} lapsed");
        let gone = if lapsed > 0 { pen.loud(&gone) } else { gone };
        lines.push(format!("{} in force, {gone}", counted(force, "justification")));
    }
    if let Some(derived) = &tally.rederived {
        let otherwise = format!("{} otherwise than sealed", derived.otherwise);
        let otherwise = if derived.otherwise > 0 { pen.loud(&otherwise) } else { otherwise };
        let not_at_all = if derived.not_at_all > 0 {
            pen.loud(&format!(", {} could not be derived", derived.not_at_all))
        } else {
            String::new()
        };
        lines.push(format!(
            "derived again from sources alone: {} whole, {} with some steps taken as sealed, {otherwise}{not_at_all}",
            counted(derived.whole, "value"),
            derived.in_part
        ));
    }
    if !lines.is_empty() {
        pen.heading("seals and decisions")?;
    }
    lines.iter().try_for_each(|line| pen.line(line))
}

fn causes(pen: &mut Pen, tally: &Tally) -> Result<(), Fault> {
    if tally.causes.is_empty() {
        return Ok(());
    }
    pen.heading("causes of moves")?;
    for cause in tally.causes.iter().take(CAUSES) {
        pen.line(&in_one_line(&cause.words()))?;
        pen.line(&format!("  {}", in_one_line(&sizes(cause))))?;
    }
    let further = tally.causes.len().saturating_sub(CAUSES) + tally.causes_left_out;
    if further > 0 {
        pen.line(&format!("and {}, in the other forms of this report", counted(further, "further cause")))
    } else {
        Ok(())
    }
}

/// `12 values in 3 notebooks; largest share -0.50 kJ/mol, of heat of reaction in loops/a.ipynb`
pub(super) fn sizes(cause: &CauseSum) -> String {
    let mut words = format!("{} in {}", counted(cause.values, "value"), counted(cause.notebooks, "notebook"));
    for largest in cause.largest.values().take(SHARES) {
        words.push_str(&format!("; largest share {}, of {} in {}", largest.shown, largest.label, largest.file));
    }
    if cause.without_share > 0 {
        words.push_str(&format!("; share not known for {}", counted(cause.without_share, "value")));
    }
    words
}
