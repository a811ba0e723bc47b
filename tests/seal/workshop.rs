//! Notebooks that are sealed, edited and audited in a folder of their own.

use std::path::PathBuf;
use std::sync::Arc;

use hessbook::data::records::{Record, Records};
use hessbook::notebook::audit::{AuditOptions, audit_one};
use hessbook::notebook::holdings::Holdings;
use hessbook::notebook::seal::Seal;
use hessbook::notebook::sealing::{Sealing, seal};
use hessbook::notebook::verdict::{Cause, NotebookAudit, Outcome, ValueAudit};
use hessbook::session::on_big_stack;
use hessbook::source::sha256;
use serde_json::{Value, json};

/// A folder of its own with notebooks in it.
pub struct Workshop {
    pub folder: tempfile::TempDir,
}

impl Workshop {
    pub fn new() -> Workshop {
        Workshop { folder: tempfile::tempdir().unwrap() }
    }

    pub fn path(&self) -> PathBuf {
        self.folder.path().join("copy.ipynb")
    }

    /// A notebook of these code cells, sealed.
    pub fn sealed(cells: &[&str]) -> Workshop {
        Workshop::sealed_beside(cells, &[])
    }

    /// The same with these files beside it.
    pub fn sealed_beside(cells: &[&str], files: &[(&str, &str)]) -> Workshop {
        let workshop = Workshop::unsealed(cells, files);
        workshop.seal(&Sealing { date: "2026-12-01T00:00:00Z".to_owned(), ..Sealing::default() }).unwrap();
        workshop
    }

    pub fn unsealed(cells: &[&str], files: &[(&str, &str)]) -> Workshop {
        let workshop = Workshop::new();
        files.iter().for_each(|(name, text)| workshop.write(name, text));
        let cells: Vec<Value> = (cells.iter())
            .map(|source| {
                json!({"cell_type": "code", "id": sha256(source.as_bytes())[..8], "metadata": {}, "source": source,
                    "execution_count": null, "outputs": []})
            })
            .collect();
        let tree = json!({"cells": cells, "metadata": {}, "nbformat": 4, "nbformat_minor": 5});
        std::fs::write(workshop.path(), tree.to_string()).unwrap();
        workshop
    }

    pub fn write(&self, name: &str, text: &str) {
        std::fs::write(self.folder.path().join(name), text).unwrap();
    }

    pub fn seal(&self, how: &Sealing) -> Result<Seal, hessbook::fault::Fault> {
        let path = self.path();
        on_big_stack(|| {
            let made = seal(&path, how, &Holdings::shipped(), &Arc::default())?;
            made.notebook.write(&path)?;
            Ok(made.seal)
        })
    }

    /// Changes the file as an editor might.
    pub fn edit(&self, change: impl FnOnce(&mut Value)) {
        let mut tree: Value = serde_json::from_slice(&std::fs::read(self.path()).unwrap()).unwrap();
        change(&mut tree);
        std::fs::write(self.path(), tree.to_string()).unwrap();
    }

    /// Exchanges a text in the source of its cells.
    pub fn edit_cells(&self, from: &str, to: &str) {
        let mut found = false;
        self.edit(|tree| {
            for cell in tree["cells"].as_array_mut().unwrap() {
                let source = match &cell["source"] {
                    Value::Array(lines) => lines.iter().map(|line| line.as_str().unwrap()).collect(),
                    other => other.as_str().unwrap().to_owned(),
                };
                found |= source.contains(from);
                cell["source"] = json!(source.replace(from, to));
            }
        });
        assert!(found, "no cell has {from}");
    }

    pub fn audit(&self, options: &AuditOptions) -> NotebookAudit {
        audit_one(&self.path(), options)
    }
}

pub const SHIFT: &str = "let shift = reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\");";
pub const REPORTS: &str = "report(\"shift\", shift.enthalpy(\"450 degC\"));\n\
                       report(\"twice\", 2 * shift.enthalpy(\"450 degC\"));";

pub fn value<'a>(audit: &'a NotebookAudit, label: &str) -> &'a ValueAudit {
    audit.values.iter().find(|value| value.label == label).unwrap_or_else(|| panic!("no {label} in {audit:#?}"))
}

pub fn number(text: &str) -> f64 {
    text.parse().unwrap()
}

/// The move of an outcome, its causes, and that its shares and remainder add up to it.
pub fn move_of(outcome: &Outcome) -> (f64, Vec<Cause>) {
    let moved = outcome.moved.as_ref().unwrap_or_else(|| panic!("no move in {outcome:#?}"));
    let shares: f64 = moved.causes.iter().map(|cause| number(cause.share.as_ref().unwrap())).sum();
    let by = number(&moved.by);
    // Differences of doubles of this size are off by a few units of their last place.
    assert!((shares + number(&moved.remainder) - by).abs() <= 1e-12 * by.abs().max(100.0), "{moved:#?}");
    (by, moved.causes.clone())
}

/// Today's tables with one figure revised.
pub fn revised(key: &str, from: &str, to: &str) -> Holdings {
    let shipped = Records::shipped();
    let (key, record) = shipped.all().into_iter().find(|(known, _)| known.to_string() == key).unwrap();
    assert!(record.content.contains(from), "{}", record.content);
    let mut records = Records::clone(&shipped);
    let content = record.content.replace(from, to);
    records.put(&key, Some(&Record::from_text(&record.list, &record.id, &content)), &shipped);
    Holdings::of(records)
}
