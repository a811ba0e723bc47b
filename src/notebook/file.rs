//! A notebook file of the open format, version 4: read as it is, changed only where cells were run, written atomically.
//!
//! [`NotebookFile`] keeps the whole JSON tree, so that what other tools put into a notebook survives. The surprise:
//! quirks of the file (a missing id, an older minor version) are listed, and mended only when the file is written.

use std::collections::BTreeSet;
use std::io::{BufWriter, Write};
use std::path::{Path, PathBuf};

use serde_json::{Map, Value, json};
use thiserror::Error;

use crate::fault::Explain;
use crate::render::Bundle;

/// Why a notebook cannot be read or written.
#[derive(Debug, Error)]
pub enum FileError {
    #[error("cannot read {path}: {why}", path = path.display())]
    Read { path: PathBuf, why: String },
    #[error("{path} has {mib} MiB, and there is not the memory to read it", path = path.display())]
    TooLarge { path: PathBuf, mib: u64 },
    #[error("{path} is not a notebook: {why}", path = path.display())]
    NotANotebook { path: PathBuf, why: String },
    #[error("{path} is a notebook of format {major}, and this program reads format 4", path = path.display())]
    Format { path: PathBuf, major: i64 },
    #[error("{path} is a notebook in {language}, and this program runs rhai", path = path.display())]
    Language { path: PathBuf, language: String },
    #[error("cannot write {path}: {why}", path = path.display())]
    Write { path: PathBuf, why: String },
}

impl Explain for FileError {
    fn code(&self) -> &'static str {
        match self {
            FileError::Read { .. } => "file-unreadable",
            FileError::TooLarge { .. } => "notebook-out-of-memory",
            FileError::NotANotebook { .. } => "not-a-notebook",
            FileError::Format { .. } => "notebook-format",
            FileError::Language { .. } => "notebook-language",
            FileError::Write { .. } => "file-unwritable",
        }
    }

    fn hint(&self) -> String {
        match self {
            FileError::Read { .. } => "check the path and the rights to the file".to_owned(),
            FileError::TooLarge { .. } => {
                "clear its outputs in a front end and save it; an audit may be allowed more with --memory-limit MIB"
                    .to_owned()
            }
            FileError::NotANotebook { .. } => {
                "give a .ipynb file as a notebook front end saves it, or a .rhai script".to_owned()
            }
            FileError::Format { .. } => {
                "open and save it in a current notebook front end, which writes format 4".to_owned()
            }
            FileError::Language { .. } => {
                "choose the kernel of this program in the front end, and save the notebook".to_owned()
            }
            FileError::Write { .. } => {
                "check the folder's rights and the space left; the old file is untouched".to_owned()
            }
        }
    }
}

/// The language of cells, as the kernel names it.
const LANGUAGE: &str = "rhai";

/// One code cell.
#[derive(Clone, Debug, PartialEq)]
pub struct CodeCell {
    /// Position among all cells of the file.
    index: usize,
    /// `cell-3`: the third code cell, as faults and places name it.
    pub name: String,
    pub source: String,
}

/// One output of a cell, as the format stores it.
#[derive(Clone, Debug, PartialEq)]
pub enum Output {
    Stream {
        stderr: bool,
        text: String,
    },
    /// Shown in the middle of a cell; what has an id may be updated later.
    Display {
        bundle: Bundle,
        id: Option<String>,
    },
    Result(Bundle),
    Error {
        name: String,
        message: String,
        trace: Vec<String>,
    },
}

/// A notebook with everything that was in its file.
#[derive(Clone, Debug)]
pub struct NotebookFile {
    tree: Map<String, Value>,
    /// What the file does not do as the format says, in words.
    pub quirks: Vec<String>,
}

impl NotebookFile {
    /// Reads a file.
    ///
    /// # Errors
    /// It cannot be read, is no JSON object, or no notebook of format 4.
    pub fn read(path: &Path) -> Result<NotebookFile, FileError> {
        NotebookFile::of_bytes(path, &bytes_of(path)?)
    }

    /// A notebook by the content of its file; `path` is for what is said about it.
    ///
    /// # Errors
    /// It is no JSON object, or no notebook of format 4.
    pub fn of_bytes(path: &Path, bytes: &[u8]) -> Result<NotebookFile, FileError> {
        let refused = |why: String| FileError::NotANotebook { path: path.to_owned(), why };
        // Some editors begin a file with a byte order mark.
        let text = bytes.strip_prefix(b"\xef\xbb\xbf").unwrap_or(bytes);
        let tree: Value = serde_json::from_slice(text).map_err(|e| refused(e.to_string()))?;
        let Value::Object(tree) = tree else { return Err(refused("it is no JSON object".to_owned())) };
        match tree.get("nbformat").and_then(Value::as_i64) {
            Some(4) => {}
            Some(major) => return Err(FileError::Format { path: path.to_owned(), major }),
            None => return Err(refused("it names no notebook format".to_owned())),
        }
        let Some(Value::Array(cells)) = tree.get("cells") else {
            return Err(refused("it has no list of cells".to_owned()));
        };
        if let Some(language) = language_of(&tree).filter(|language| *language != LANGUAGE) {
            return Err(FileError::Language { path: path.to_owned(), language: language.to_owned() });
        }
        let mut quirks = Vec::new();
        if tree.get("nbformat_minor").and_then(Value::as_i64) != Some(5) {
            quirks.push("the minor version of its format is not 5".to_owned());
        }
        for (index, cell) in cells.iter().enumerate() {
            if !cell.is_object() {
                return Err(refused(format!("cell {} is no JSON object", index + 1)));
            }
            if source_of(cell).is_none() {
                return Err(refused(format!("cell {} has no readable source", index + 1)));
            }
            if cell.get("id").and_then(Value::as_str).is_none() {
                quirks.push(format!("cell {} has no id", index + 1));
            }
        }
        Ok(NotebookFile { tree, quirks })
    }

    fn cells(&self) -> &[Value] {
        match self.tree.get("cells") {
            Some(Value::Array(cells)) => cells,
            _ => unreachable!("a notebook is read with its list of cells"),
        }
    }

    /// The code cells in order, the empty ones too, since their count names the others.
    pub fn code_cells(&self) -> Vec<CodeCell> {
        let code = self.cells().iter().enumerate().filter(|(_, cell)| cell.get("cell_type") == Some(&json!("code")));
        code.enumerate()
            .map(|(nth, (index, cell))| CodeCell {
                index,
                name: format!("cell-{}", nth + 1),
                source: source_of(cell).unwrap_or_default(),
            })
            .collect()
    }

    /// What a tool keeps in the notebook's metadata under a name of its own.
    pub fn metadata(&self, name: &str) -> Option<&Value> {
        self.tree.get("metadata")?.get(name)
    }

    /// Puts something into the notebook's metadata.
    pub fn set_metadata(&mut self, name: &str, value: Value) {
        let metadata = self.tree.entry("metadata").or_insert_with(|| json!({}));
        if let Value::Object(metadata) = metadata {
            metadata.insert(name.to_owned(), value);
        } else {
            *metadata = json!({ name: value });
        }
    }

    /// What stands in the outputs under a MIME type, in order.
    pub fn recorded(&self, mime: &str) -> Vec<&Value> {
        let outputs = self.cells().iter().filter_map(|cell| cell.get("outputs")?.as_array()).flatten();
        outputs.filter_map(|output| output.get("data")?.get(mime)).collect()
    }

    /// Puts what a cell gave in place of its recorded outputs.
    pub fn set_outputs(&mut self, cell: &CodeCell, count: Option<u32>, outputs: &[Output]) {
        let Some(Value::Array(cells)) = self.tree.get_mut("cells") else { return };
        let Some(Value::Object(stored)) = cells.get_mut(cell.index) else { return };
        stored.insert("execution_count".to_owned(), json!(count));
        stored.insert("outputs".to_owned(), outputs.iter().map(|output| stored_output(output, count)).collect());
    }

    /// The file's text: minor version 5, every cell with an id.
    ///
    /// # Errors
    /// None that is known: what was read as JSON can be written.
    pub fn text(&self) -> Result<String, serde_json::Error> {
        let mut tree = self.tree.clone();
        tree.insert("nbformat_minor".to_owned(), json!(5));
        tree.entry("metadata").or_insert_with(|| json!({}));
        if let Some(Value::Array(cells)) = tree.get_mut("cells") {
            let mut taken: BTreeSet<String> =
                cells.iter().filter_map(|cell| cell.get("id").and_then(Value::as_str).map(str::to_owned)).collect();
            for (index, cell) in cells.iter_mut().enumerate() {
                let Value::Object(cell) = cell else { continue };
                cell.entry("metadata").or_insert_with(|| json!({}));
                if cell.get("id").and_then(Value::as_str).is_none() {
                    let id =
                        (index + 1..).map(|n| format!("cell-{n}")).find(|id| !taken.contains(id)).unwrap_or_default();
                    taken.insert(id.clone());
                    cell.insert("id".to_owned(), json!(id));
                }
                if cell.get("cell_type") == Some(&json!("code")) {
                    cell.entry("execution_count").or_insert(Value::Null);
                    cell.entry("outputs").or_insert_with(|| json!([]));
                }
            }
        }
        // One space of indent, as the format's own writer has it.
        let mut bytes = Vec::new();
        let formatter = serde_json::ser::PrettyFormatter::with_indent(b" ");
        let mut serializer = serde_json::Serializer::with_formatter(&mut bytes, formatter);
        serde::Serialize::serialize(&tree, &mut serializer)?;
        bytes.push(b'\n');
        Ok(String::from_utf8(bytes).unwrap_or_else(|_| unreachable!("JSON text is UTF-8")))
    }

    /// Writes the notebook beside `path` and renames it into place, so that the file is the old one or the new one.
    ///
    /// # Errors
    /// The folder cannot be written to; the old file is untouched then.
    pub fn write(&self, path: &Path) -> Result<(), FileError> {
        let failed = |why: String| FileError::Write { path: path.to_owned(), why };
        let text = self.text().map_err(|e| failed(e.to_string()))?;
        write_whole(path, text.as_bytes()).map_err(|e| failed(e.to_string()))
    }
}

/// The content of a regular file: a pipe or a device may give bytes without end, or wait for ever.
///
/// # Errors
/// It cannot be read, or is not a regular file.
pub fn bytes_of(path: &Path) -> Result<Vec<u8>, FileError> {
    let failed = |why: String| FileError::Read { path: path.to_owned(), why };
    let facts = std::fs::metadata(path).map_err(|error| failed(error.to_string()))?;
    if !facts.is_file() {
        return Err(failed("it is not a regular file".to_owned()));
    }
    std::fs::read(path).map_err(|error| match error.kind() {
        std::io::ErrorKind::OutOfMemory => FileError::TooLarge { path: path.to_owned(), mib: facts.len() >> 20 },
        _ => failed(error.to_string()),
    })
}

/// Writes a file as a whole or not at all.
///
/// # Errors
/// As the file system says.
pub fn write_whole(path: &Path, bytes: &[u8]) -> std::io::Result<()> {
    write_whole_by(path, |file| file.write_all(bytes))
}

/// The same for what is written piece by piece: where that fails, nothing is left.
///
/// # Errors
/// As the file system says, or as `write` does.
pub fn write_whole_by<E: From<std::io::Error>>(
    path: &Path,
    write: impl FnOnce(&mut dyn Write) -> Result<(), E>,
) -> Result<(), E> {
    // A link stays a link, and what it points to is written; a pipe or device is no place for a notebook.
    let path = &std::fs::canonicalize(path).unwrap_or_else(|_| path.to_owned());
    if std::fs::metadata(path).is_ok_and(|there| !there.is_file()) {
        return Err(std::io::Error::other("it is there and is no regular file").into());
    }
    let folder = path.parent().filter(|folder| !folder.as_os_str().is_empty()).unwrap_or(Path::new("."));
    let mut file = tempfile::Builder::new().permissions(readable()).tempfile_in(folder)?;
    let mut buffered = BufWriter::new(file.as_file_mut());
    write(&mut buffered)?;
    buffered.flush()?;
    drop(buffered);
    file.as_file().sync_all()?;
    if let Ok(old) = std::fs::metadata(path) {
        file.as_file().set_permissions(old.permissions())?;
    }
    file.persist(path).map_err(|error| error.error)?;
    Ok(())
}

/// The rights of a file as any program makes one; the user's mask is taken off by the system.
#[cfg(unix)]
fn readable() -> std::fs::Permissions {
    std::os::unix::fs::PermissionsExt::from_mode(0o666)
}

/// The language a notebook says it is written in.
fn language_of(tree: &Map<String, Value>) -> Option<&str> {
    let metadata = tree.get("metadata")?;
    let named = metadata.pointer("/kernelspec/language").or_else(|| metadata.pointer("/language_info/name"))?;
    named.as_str()
}

fn source_of(cell: &Value) -> Option<String> {
    match cell.get("source")? {
        Value::String(text) => Some(text.clone()),
        Value::Array(lines) => lines.iter().map(|line| line.as_str()).collect(),
        _ => None,
    }
}

/// Text as the format's own writer stores it: a list of lines, each with its line end.
fn lines(text: &str) -> Value {
    text.split_inclusive('\n').collect()
}

fn stored_output(output: &Output, count: Option<u32>) -> Value {
    let data = |bundle: &Bundle| -> Value {
        let entries = bundle.data.iter().map(|(mime, content)| {
            let stored = match content {
                Value::String(text) => lines(text),
                other => other.clone(),
            };
            (mime.clone(), stored)
        });
        Value::Object(entries.collect())
    };
    match output {
        Output::Stream { stderr, text } => {
            json!({"name": if *stderr { "stderr" } else { "stdout" }, "output_type": "stream", "text": lines(text)})
        }
        Output::Display { bundle, .. } => json!({"data": data(bundle), "metadata": {}, "output_type": "display_data"}),
        Output::Result(bundle) => {
            json!({"data": data(bundle), "execution_count": count, "metadata": {}, "output_type": "execute_result"})
        }
        Output::Error { name, message, trace } => {
            json!({"ename": name, "evalue": message, "output_type": "error", "traceback": trace})
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn written(text: &str) -> (tempfile::TempDir, PathBuf) {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("n.ipynb");
        std::fs::write(&path, text).unwrap();
        (folder, path)
    }

    #[test]
    fn what_other_tools_wrote_survives_and_quirks_are_mended_only_on_writing() {
        let (_folder, path) = written(
            r#"{"cells":[{"cell_type":"code","source":["1\n","2"],"metadata":{"z":1,"a":2}}],"metadata":{"own":{"k":0.1}},"nbformat":4,"nbformat_minor":2}"#,
        );
        let mut notebook = NotebookFile::read(&path).unwrap();
        assert_eq!(notebook.quirks.len(), 2);
        let cell = notebook.code_cells().remove(0);
        assert_eq!((cell.name.as_str(), cell.source.as_str()), ("cell-1", "1\n2"));
        notebook.set_outputs(&cell, Some(1), &[Output::Stream { stderr: false, text: "a\nb".into() }]);
        notebook.write(&path).unwrap();
        let again = NotebookFile::read(&path).unwrap();
        assert!(again.quirks.is_empty());
        let text = std::fs::read_to_string(&path).unwrap();
        assert!(text.contains("\"k\": 0.1") && text.contains("\"z\": 1") && text.contains("\"a\\n\""), "{text}");
    }

    #[test]
    fn what_is_no_notebook_is_refused_and_says_why() {
        for (text, code) in [
            ("[]", "not-a-notebook"),
            ("{\"nbformat\":3}", "notebook-format"),
            ("{\"nbformat\":4}", "not-a-notebook"),
            ("{\"nbformat\":4,\"cells\":[5]}", "not-a-notebook"),
            ("{\"nbformat\":4,\"cells\":[{\"cell_type\":\"code\",\"source\":7}]}", "not-a-notebook"),
        ] {
            let (_folder, path) = written(text);
            assert_eq!(NotebookFile::read(&path).unwrap_err().code(), code, "{text}");
        }
    }
}
