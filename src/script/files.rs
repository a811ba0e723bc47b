//! Files that a notebook reads and writes: comma-separated values beside it.
//!
//! Names are relative to the notebook's folder and stay in it, so that a notebook can be moved with its files, and one that
//! somebody else wrote can be run without harm. The surprise: what a cell writes is put on the disk when the cell has
//! succeeded, since a failed cell leaves nothing behind; until then its own reading finds it.

use std::cell::RefCell;
use std::collections::BTreeMap;
use std::io::{self, Write};
use std::path::{Component, Path, PathBuf};
use std::rc::Rc;

use rhai::{Dynamic, Engine, FuncRegistration, ImmutableString, NativeCallContext};
use tempfile::NamedTempFile;

use crate::fault::{Explain, Fault};
use crate::model::card::Value;
use crate::model::curve::Curve;
use crate::model::table::Table;
use crate::render;
use crate::script::bind::{Native, to_value, with_context};
use crate::script::state::{Shared, place_of};

/// The extension of the files that are written.
const EXTENSION: &str = "csv";

/// Why a file is not read or written.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum FileError {
    #[error("`{name}` lies outside the folder of this notebook")]
    Outside { name: String },
    #[error("`{name}` would be written, and its name does not end in .{EXTENSION}")]
    Extension { name: String },
    #[error("there is no file `{name}` beside this notebook")]
    Missing { name: String, there: Vec<String> },
    #[error("`{name}` cannot be read: {why}")]
    Read { name: String, why: String },
    #[error("`{name}` cannot be written: {why}")]
    Write { name: String, why: String },
    #[error("`write_csv` writes curves, not {given}")]
    NotACurve { given: String },
    #[error("the curves of one file go over one grid, and `{name}` goes over {other}, the first over {first}")]
    Grids { name: String, first: String, other: String },
    #[error("two columns of `{file}` would be called `{name}`")]
    SameName { file: String, name: String },
    #[error("a column cannot be called `{name}`")]
    Name { name: String },
}

impl Explain for FileError {
    fn code(&self) -> &'static str {
        match self {
            FileError::Outside { .. } => "file-outside-folder",
            FileError::Extension { .. } => "file-extension",
            FileError::Missing { .. } => "file-missing",
            FileError::Read { .. } => "file-unreadable",
            FileError::Write { .. } => "file-unwritable",
            FileError::NotACurve { .. } => "file-of-no-curve",
            FileError::Grids { .. } => "file-of-two-grids",
            FileError::SameName { .. } => "file-column-twice",
            FileError::Name { .. } => "file-column-name",
        }
    }

    fn hint(&self) -> String {
        match self {
            FileError::Outside { .. } => {
                "put the file beside the notebook, or in a folder below, and give its name from there: `data/cp.csv`"
                    .to_owned()
            }
            FileError::Extension { .. } => format!("call it by a name that ends so, such as `shift.{EXTENSION}`"),
            FileError::Missing { there, .. } if there.is_empty() => {
                "put the file beside the notebook; there is none that ends in .csv".to_owned()
            }
            FileError::Missing { there, .. } => format!("there are {}", there.join(", ")),
            FileError::Read { .. } => "see that it is a text in UTF-8 and that you may read it".to_owned(),
            FileError::Write { .. } => "see that its folder is there and that you may write to it".to_owned(),
            FileError::NotACurve { .. } => {
                "give a curve, a list of them, or a map from names to curves: `#{ shift: h }.write_csv(\"shift.csv\")`"
                    .to_owned()
            }
            FileError::Grids { .. } => "ask all of them at one grid, or write a file for each".to_owned(),
            FileError::SameName { .. } => {
                "give each a name of its own, in a map: `#{ shift: h, reforming: k }.write_csv(\"both.csv\")`"
                    .to_owned()
            }
            FileError::Name { .. } => {
                "use a name without a stroke that does not begin with `u(`, `#` or a space".to_owned()
            }
        }
    }
}

/// The folder of a notebook, and what its running cell will have written.
#[derive(Clone, Default)]
pub struct Folder(Rc<RefCell<Inside>>);

#[derive(Default)]
struct Inside {
    /// The current folder of the process where it is empty.
    path: PathBuf,
    pending: BTreeMap<PathBuf, String>,
}

impl Folder {
    pub fn set(&self, path: &Path) {
        self.0.borrow_mut().path = path.to_owned();
    }

    /// Forgets what the last cell would have written.
    pub fn start_cell(&self) {
        self.0.borrow_mut().pending.clear();
    }

    fn root(&self) -> PathBuf {
        let path = self.0.borrow().path.clone();
        if path.as_os_str().is_empty() { PathBuf::from(".") } else { path }
    }

    /// The path of a name that stays in the folder.
    fn resolved(&self, name: &str) -> Result<PathBuf, FileError> {
        let inside = |part: Component<'_>| matches!(part, Component::Normal(_) | Component::CurDir);
        let path = Path::new(name);
        if name.trim().is_empty() || !path.components().all(inside) || path.file_name().is_none() {
            return Err(FileError::Outside { name: name.to_owned() });
        }
        // Without the `.` in between, so that one file has one path.
        Ok(self.root().join(path.components().filter(|part| *part != Component::CurDir).collect::<PathBuf>()))
    }

    /// That a link does not lead out of the folder.
    fn keeps_inside(&self, path: &Path, name: &str) -> io::Result<Result<(), FileError>> {
        let outside = || FileError::Outside { name: name.to_owned() };
        Ok(if path.canonicalize()?.starts_with(self.root().canonicalize()?) { Ok(()) } else { Err(outside()) })
    }

    fn read(&self, name: &str, room: impl Fn(usize) -> Result<(), Fault>) -> Result<String, Fault> {
        let path = self.resolved(name)?;
        if let Some(text) = self.0.borrow().pending.get(&path) {
            return Ok(text.clone());
        }
        let failed = |error: io::Error| match error.kind() {
            io::ErrorKind::NotFound => FileError::Missing { name: name.to_owned(), there: self.tables() },
            _ => FileError::Read { name: name.to_owned(), why: plain(&error) },
        };
        self.keeps_inside(&path, name).map_err(failed)??;
        let length = std::fs::metadata(&path).map_err(failed)?.len();
        // Text, cells and figures together take some ten times what the file does.
        room(usize::try_from(length).unwrap_or(usize::MAX).saturating_mul(10))?;
        Ok(std::fs::read_to_string(&path).map_err(failed)?)
    }

    /// Names of the tables in the folder, for messages.
    fn tables(&self) -> Vec<String> {
        let Ok(entries) = std::fs::read_dir(self.root()) else { return Vec::new() };
        let names = entries.flatten().map(|entry| entry.file_name().to_string_lossy().into_owned());
        let mut names: Vec<String> = names.filter(|name| name.ends_with(".csv")).collect();
        names.sort();
        names.truncate(8);
        names.iter().map(|name| format!("`{name}`")).collect()
    }

    fn write(&self, name: &str, text: String) -> Result<(), FileError> {
        let path = self.resolved(name)?;
        if path.extension().is_none_or(|extension| extension != EXTENSION) {
            return Err(FileError::Extension { name: name.to_owned() });
        }
        let folder = path.parent().unwrap_or(Path::new("."));
        let failed = |error: io::Error| FileError::Write { name: name.to_owned(), why: plain(&error) };
        self.keeps_inside(folder, name).map_err(failed)??;
        self.0.borrow_mut().pending.insert(path, text);
        Ok(())
    }

    /// Puts on the disk what the cell has written: every text into a new file, then each in its place, so that no file is
    /// ever half written.
    ///
    /// # Errors
    /// A file cannot be written.
    pub fn commit(&self) -> Result<(), FileError> {
        let pending = std::mem::take(&mut self.0.borrow_mut().pending);
        let name = |path: &Path| path.strip_prefix(self.root()).unwrap_or(path).display().to_string();
        let failed = |path: &Path, error: &io::Error| FileError::Write { name: name(path), why: plain(error) };
        let mut ready = Vec::new();
        for (path, text) in &pending {
            let written = NamedTempFile::new_in(path.parent().unwrap_or(Path::new("."))).and_then(|mut file| {
                file.write_all(text.as_bytes())?;
                share(&file)?;
                Ok(file)
            });
            ready.push((written.map_err(|error| failed(path, &error))?, path));
        }
        for (file, path) in ready {
            file.persist(path).map_err(|error| failed(path, &error.error))?;
        }
        Ok(())
    }
}

/// A new file is closed to others than its owner until it is opened to them, as any table is.
fn share(file: &NamedTempFile) -> io::Result<()> {
    #[cfg(unix)]
    {
        use std::os::unix::fs::PermissionsExt;
        file.as_file().set_permissions(std::fs::Permissions::from_mode(0o644))?;
    }
    let _ = file;
    Ok(())
}

/// What the system says, without its number and without a path of this machine.
fn plain(error: &io::Error) -> String {
    let text = error.to_string();
    text.split(" (os error").next().unwrap_or(&text).to_lowercase()
}

/// Registers the verbs of this file.
pub fn register(engine: &mut Engine, shared: &Shared) {
    let add = |name: &'static str| {
        let doc = crate::script::verbs::VERBS.iter().find(|verb| verb.name == name).map_or("", |verb| verb.doc);
        FuncRegistration::new(name).with_comments([format!("/// {doc}")])
    };
    engine.register_type_with_name::<Rc<Table>>("table");
    engine.register_fn("len", |table: &mut Rc<Table>| i64::try_from(table.rows()).unwrap_or(i64::MAX));
    for name in ["to_string", "to_debug"] {
        engine.register_fn(name, |table: &mut Rc<Table>| format!("{}, {} rows", table.name, table.rows()));
    }
    let s = shared.clone();
    add("read_csv")
        .register_into_engine(engine, move |c: NativeCallContext<'_>, name: ImmutableString| read(&s, &c, &name, None));
    let s = shared.clone();
    add("read_csv").register_into_engine(
        engine,
        move |c: NativeCallContext<'_>, name: ImmutableString, source: ImmutableString| {
            read(&s, &c, &name, Some(&source))
        },
    );
    let s = shared.clone();
    add("write_csv").register_into_engine(
        engine,
        move |c: NativeCallContext<'_>, curves: Dynamic, name: ImmutableString| -> Native<()> {
            with_context(&s, place_of(&c), |cx| {
                let curves = named(&curves, &name)?;
                Ok(s.folder.write(&name, render::csv::curves(cx, &curves)?)?)
            })
        },
    );
}

fn read(shared: &Shared, context: &NativeCallContext<'_>, name: &str, source: Option<&str>) -> Native<Rc<Table>> {
    with_context(shared, place_of(context), |cx| {
        let text = shared.folder.read(name, |bytes| Ok(shared.room_for(bytes)?))?;
        Ok(Rc::new(Table::read(cx, name, &text, source)?))
    })
}

/// The curves that are to be written, with the names of their columns.
fn named(value: &Dynamic, file: &str) -> Result<Vec<(String, Rc<Curve>)>, FileError> {
    let with_symbol = |curve: Rc<Curve>| {
        let symbol = render::curve::symbol_of(&curve);
        (if symbol.is_empty() { "value".to_owned() } else { symbol }, curve)
    };
    let curve = |value: &Value| match value {
        Value::Curve(curve) => Ok(Rc::clone(curve)),
        other => Err(FileError::NotACurve { given: other.sort().to_owned() }),
    };
    let all: Vec<(String, Rc<Curve>)> = match to_value(value) {
        Value::List(list) if !list.is_empty() => {
            list.iter().map(|one| curve(one).map(with_symbol)).collect::<Result<_, _>>()?
        }
        Value::Options(map) if !map.is_empty() => {
            map.iter().map(|(name, one)| Ok((name.clone(), curve(one)?))).collect::<Result<_, FileError>>()?
        }
        Value::List(_) | Value::Options(_) => return Err(FileError::NotACurve { given: "nothing".to_owned() }),
        one => vec![with_symbol(curve(&one)?)],
    };
    let first = all[0].1.grid();
    for (nth, (name, curve)) in all.iter().enumerate() {
        if name.contains(['/', '\n', '"']) || name.starts_with(['#', ' ']) || name.starts_with("u(") || name.is_empty()
        {
            return Err(FileError::Name { name: name.clone() });
        }
        if name == "T" || all[..nth].iter().any(|(known, _)| known == name) {
            return Err(FileError::SameName { file: file.to_owned(), name: name.clone() });
        }
        if !first.same_as(curve.grid()) {
            let (name, first, other) = (name.clone(), first.words(), curve.grid().words());
            return Err(FileError::Grids { name, first, other });
        }
    }
    Ok(all)
}
