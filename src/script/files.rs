//! Files beside a notebook that a cell reads: a dataset of one's own, the text of a module, a molecule from quantum chemistry.
//!
//! A name is looked for in the notebook's folder. What was read becomes part of the session's state, so that a cell that
//! fails leaves no trace of it, and a cell that is run again reads its files anew.

use std::cell::RefCell;
use std::collections::BTreeMap;
use std::fmt;
use std::io;
use std::path::Path;
use std::rc::Rc;
use std::sync::Arc;

use rhai::{Dynamic, Engine, FuncRegistration, ImmutableString, NativeCallContext};

use crate::data::near::nearest;
use crate::data::own;
use crate::fault::{Explain, Fault};
use crate::model::card::{self, Value};
use crate::model::molecule::limits::MOLECULE_TABLE;
use crate::render::dataset as view;
use crate::script::bind::{Native, from_value, to_value, with_context};
use crate::script::module_text::ENDING;
use crate::script::script_error::ScriptError;
use crate::script::state::{Loaded, Shared, place_of};
use crate::script::tables::FileError;
use crate::script::verbs::{Display, VERBS};
use crate::script::words;
use crate::source::{self, Embedded};

/// Files larger than this are none that someone wrote or measured by hand.
const MOST_BYTES: u64 = 64 << 20;

/// The files beside a notebook as a session sees them, and what it has read of them.
#[derive(Clone, Default)]
pub struct Beside(Rc<RefCell<Seen>>);

#[derive(Default)]
struct Seen {
    /// Contents that stand in place of what is on the disk.
    given: BTreeMap<String, Arc<[u8]>>,
    /// Nothing is written to the disk; what a cell writes is kept here for later cells to read.
    apart: bool,
    written: BTreeMap<String, Arc<[u8]>>,
    read: BTreeMap<String, Arc<[u8]>>,
}

impl Beside {
    /// Reads these contents in place of the files of those names, and writes nothing to the disk from now on.
    pub fn set_apart(&self, given: BTreeMap<String, Arc<[u8]>>) {
        let mut seen = self.0.borrow_mut();
        (seen.given, seen.apart) = (given, true);
    }

    pub fn is_apart(&self) -> bool {
        self.0.borrow().apart
    }

    /// Keeps what a cell has written, for later cells.
    pub fn keep(&self, name: &str, text: &str) {
        self.0.borrow_mut().written.insert(name.to_owned(), text.as_bytes().into());
    }

    /// Every file that was read, with its content, by the name it was asked for.
    pub fn read(&self) -> BTreeMap<String, Arc<[u8]>> {
        self.0.borrow().read.clone()
    }

    fn find(&self, name: &str) -> Option<Arc<[u8]>> {
        let seen = self.0.borrow();
        seen.written.get(name).or_else(|| seen.given.get(name)).cloned()
    }

    fn note(&self, name: &str, bytes: &[u8]) {
        let mut seen = self.0.borrow_mut();
        if !seen.written.contains_key(name) {
            seen.read.entry(name.to_owned()).or_insert_with(|| bytes.into());
        }
    }
}

/// Why a file cannot be read.
#[derive(Clone, Debug, PartialEq, Eq)]
enum FileFault {
    Missing { name: String, folder: String, near: Vec<String> },
    Unreadable { name: String, why: String },
    TooLarge { name: String, bytes: u64 },
}

impl fmt::Display for FileFault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            FileFault::Missing { name, folder, .. } => write!(f, "there is no file {name} in {folder}"),
            FileFault::Unreadable { name, why } => write!(f, "the file {name} cannot be read: {why}"),
            FileFault::TooLarge { name, bytes } => {
                write!(f, "the file {name} has {} MB, and {} MB are read", bytes >> 20, MOST_BYTES >> 20)
            }
        }
    }
}

impl Explain for FileFault {
    fn code(&self) -> &'static str {
        match self {
            FileFault::Missing { .. } => "file-missing",
            FileFault::Unreadable { .. } => "file-beside-unreadable",
            FileFault::TooLarge { .. } => "file-too-large",
        }
    }

    fn hint(&self) -> String {
        match self {
            FileFault::Missing { near, .. } if near.is_empty() => {
                "names are looked for in the folder of the notebook; give the path from there".to_owned()
            }
            FileFault::Missing { near, .. } => format!("perhaps {}", near.join(" or ")),
            FileFault::Unreadable { .. } => "give a file, and see that it may be read".to_owned(),
            FileFault::TooLarge { .. } => "split it, or take out what is not needed".to_owned(),
        }
    }
}

/// The bytes of a file in the notebook's folder.
///
/// # Errors
/// It is not there, cannot be read, or is too large.
pub fn read_beside(shared: &Shared, name: &str) -> Result<Vec<u8>, Fault> {
    let bytes = fetch(shared, name)?;
    shared.beside.note(name, &bytes);
    Ok(bytes)
}

/// The bytes of a module's file. They are kept with the module, not among the files that cells read.
///
/// # Errors
/// It is not there, cannot be read, or is too large.
pub fn module_bytes(shared: &Shared, file: &str) -> Result<Vec<u8>, Fault> {
    fetch(shared, file).map_err(|fault| match fault {
        FileFault::Missing { name, near, .. } => {
            let bare = |file: &str| file.strip_suffix(ENDING).map(str::to_owned);
            let name = bare(&name).unwrap_or(name);
            let beside: Vec<String> = near.iter().filter_map(|near| bare(near)).collect();
            let near = words::nearest(&name, beside.iter().map(String::as_str)).map(str::to_owned);
            ScriptError::UnknownModule { name, near }.into()
        }
        other => other.into(),
    })
}

fn fetch(shared: &Shared, name: &str) -> Result<Vec<u8>, FileFault> {
    if let Some(bytes) = shared.beside.find(name) {
        return Ok(bytes.to_vec());
    }
    let folder = shared.folder();
    let path = folder.join(name);
    let failed = |error: io::Error| match error.kind() {
        io::ErrorKind::NotFound => missing(&folder, name),
        _ => FileFault::Unreadable { name: name.to_owned(), why: error.to_string() },
    };
    let about = std::fs::metadata(&path).map_err(failed)?;
    if !about.is_file() {
        // A device or a pipe may give bytes without end.
        let why = if about.is_dir() { "it is a folder" } else { "it is no regular file" };
        return Err(FileFault::Unreadable { name: name.to_owned(), why: why.to_owned() });
    }
    if about.len() > MOST_BYTES {
        return Err(FileFault::TooLarge { name: name.to_owned(), bytes: about.len() });
    }
    std::fs::read(&path).map_err(failed)
}

fn missing(folder: &Path, name: &str) -> FileFault {
    let entries = std::fs::read_dir(folder).into_iter().flatten().flatten();
    let mut names: Vec<String> = entries.map(|entry| entry.file_name().to_string_lossy().into_owned()).collect();
    names.sort();
    let near = nearest(name, names.iter().map(String::as_str), 2).into_iter().map(str::to_owned).collect();
    let shown = folder.display().to_string();
    let folder = if shown.is_empty() || shown == "." { "the notebook's folder".to_owned() } else { shown };
    FileFault::Missing { name: name.to_owned(), folder, near }
}

/// Two files with one id, or one file read twice.
#[derive(Clone, Debug, PartialEq, Eq)]
struct LoadedAlready {
    file: String,
    by: String,
}

impl fmt::Display for LoadedAlready {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "the dataset of {} was loaded already, by {}", self.file, self.by)
    }
}

impl Explain for LoadedAlready {
    fn code(&self) -> &'static str {
        "dataset-loaded-already"
    }

    fn hint(&self) -> String {
        "load it once, in the cell that comes first".to_owned()
    }
}

/// Registers the functions that read files.
pub fn register(engine: &mut Engine, shared: &Shared) {
    let doc = VERBS.iter().find(|verb| verb.name == "dataset").map_or("", |verb| verb.doc);
    let s = shared.clone();
    engine.register_fn(MOLECULE_TABLE.name, move |c: NativeCallContext<'_>, given: ImmutableString| {
        table_of_molecule(&s, &c, &given, None)
    });
    let s = shared.clone();
    engine.register_fn(MOLECULE_TABLE.name, move |c: NativeCallContext<'_>, given: ImmutableString, more: Dynamic| {
        table_of_molecule(&s, &c, &given, Some(&more))
    });
    let shared = shared.clone();
    FuncRegistration::new("dataset").with_comments([format!("/// {doc}")]).register_into_engine(
        engine,
        move |context: NativeCallContext<'_>, name: ImmutableString| -> Native<Display> {
            with_context(&shared, place_of(&context), |_| load(&shared, &name))
        },
    );
}

/// A card that is given a table as a text, and by a script also the name of a file that holds it.
fn table_of_molecule(
    shared: &Shared,
    c: &NativeCallContext<'_>,
    given: &str,
    more: Option<&Dynamic>,
) -> Native<Dynamic> {
    with_context(shared, place_of(c), |cx| {
        let text = if is_name(given) {
            let bytes = read_beside(shared, given)?;
            String::from_utf8(bytes).map_err(|_| FileError::NotText { name: given.to_owned() })?
        } else {
            given.to_owned()
        };
        let given = std::iter::once(Value::Text(text.into())).chain(more.map(to_value)).collect();
        card::call(cx, &MOLECULE_TABLE, given)
    })
    .map(from_value)
}

/// A table has several lines or begins with a brace; the name of a file does neither.
fn is_name(text: &str) -> bool {
    !text.trim().contains('\n') && !text.trim_start().starts_with('{')
}

fn load(shared: &Shared, name: &str) -> Result<Display, Fault> {
    let bytes = read_beside(shared, name)?;
    if let Some(earlier) = shared.state().loaded.iter().find(|earlier| earlier.file == name) {
        return Err(LoadedAlready { file: name.to_owned(), by: earlier.cell.to_string() }.into());
    }
    let sha256 = source::sha256(&bytes);
    let base = shared.references();
    let own = own::read(&Embedded { path: name, bytes: &bytes, sha256: &sha256 }, base.catalog())?;
    let (catalog, told) = base.catalog().overlaid(&own)?;
    let shown = view::bundle(&own, &told);
    let cell = shared.state().cell.clone();
    shared.lay_over(Loaded { cell, file: name.to_owned(), own: Rc::new(own), bytes: bytes.into() }, catalog);
    Ok(Display(Rc::new(shown)))
}
