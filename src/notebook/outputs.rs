//! Compares what readers of a sealed notebook see, its recorded outputs, with what its seal says.
//!
//! Nothing is run for it. The surprise: outputs that were cleared are no difference, since many people keep their notebooks
//! without them; they are named as not compared.

use serde::Deserialize;
use serde_json::Value;

use crate::notebook::file::NotebookFile;
use crate::notebook::seal::Seal;
use crate::notebook::verdict::OutputDiffers;
use crate::render::report::{MIME, Record};

/// Recorded outputs beside the seal.
pub struct Outputs {
    pub differ: Vec<OutputDiffers>,
    /// Sealed results without a recorded output, in words.
    pub not_there: Vec<String>,
}

/// Compares the results that stand in the outputs with the sealed ones, label by label.
pub fn outputs(notebook: &NotebookFile, seal: &Seal) -> Outputs {
    let mut differ = Vec::new();
    let mut seen: Vec<String> = Vec::new();
    for tree in notebook.recorded(MIME) {
        let label = tree.get("label").and_then(Value::as_str).unwrap_or("a result without label").to_owned();
        let sealed = seal.values.iter().map(|value| &value.record).find(|record| record.label == label);
        match (Record::deserialize(tree), sealed) {
            (Ok(output), Some(sealed)) => differ.extend(part(&output, sealed)),
            (Ok(output), None) => {
                differ.push(OutputDiffers { label: label.clone(), output: output.shown, seal: None });
            }
            (Err(_), sealed) => differ.push(OutputDiffers {
                label: label.clone(),
                output: "what cannot be read".to_owned(),
                seal: sealed.map(|sealed| sealed.shown.clone()),
            }),
        }
        seen.push(label);
    }
    let labels = seal.values.iter().map(|value| &value.record.label);
    let gone: Vec<&str> = labels.filter(|label| !seen.contains(label)).map(String::as_str).collect();
    let not_there = match gone.as_slice() {
        [] => Vec::new(),
        all if all.len() == seal.values.len() => vec!["recorded outputs: there are none".to_owned()],
        some => vec![format!("recorded outputs of {}: there are none", some.join(", "))],
    };
    Outputs { differ, not_there }
}

/// How two records of one label part: by the printed figure, else by the field that differs.
fn part(output: &Record, sealed: &Record) -> Option<OutputDiffers> {
    if output == sealed {
        return None;
    }
    let differs =
        |output: String, seal: String| Some(OutputDiffers { label: sealed.label.clone(), output, seal: Some(seal) });
    let exact = |record: &Record| {
        let u = record.u.as_ref().map_or_else(|| "not stated".to_owned(), |u| format!("{u} {}", record.unit));
        format!("{} {}, u {u}", record.value, record.unit)
    };
    if exact(output) != exact(sealed) {
        return differs(exact(output), exact(sealed));
    }
    if output.shown != sealed.shown {
        return differs(output.shown.clone(), sealed.shown.clone());
    }
    let trees = (serde_json::to_value(output).ok()?, serde_json::to_value(sealed).ok()?);
    let (Value::Object(then), Value::Object(now)) = trees else { return None };
    let field = now.keys().find(|name| then.get(*name) != now.get(*name))?;
    differs(format!("something else under `{field}`"), "what it was sealed with".to_owned())
}
