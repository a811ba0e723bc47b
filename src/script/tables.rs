//! Tables of figures that a cell reads and writes: comma-separated values beside the notebook.
//!
//! What is written stays in the notebook's folder, so that a notebook that somebody else wrote can be run without harm. The
//! surprise: it is put on the disk when the cell has succeeded, since a failed cell leaves nothing behind; until then the
//! cell's own reading finds it.

use std::cell::RefCell;
use std::collections::BTreeMap;
use std::io::{self, Write};
use std::path::{Component, Path, PathBuf};
use std::rc::Rc;

use rhai::{Dynamic, Engine, FuncRegistration, ImmutableString, NativeCallContext};
use tempfile::NamedTempFile;

use crate::fault::Explain;
use crate::model::card::Value;
use crate::model::curve::Curve;
use crate::model::table::Table;
use crate::render;
use crate::script::bind::{Native, to_value, with_context};
use crate::script::files::{Beside, read_beside};
use crate::script::state::{Shared, place_of};

/// The extension of the files that are written.
const EXTENSION: &str = "csv";

/// Why a file is not read or written.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum FileError {
    #[error("`{name}` would be written outside the folder of this notebook")]
    Outside { name: String },
    #[error("`{name}` would be written, and its name does not end in .{EXTENSION}")]
    Extension { name: String },
    #[error("`{name}` is no text in UTF-8")]
    NotText { name: String },
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
            FileError::NotText { .. } => "file-not-text",
            FileError::Write { .. } => "table-unwritable",
            FileError::NotACurve { .. } => "file-of-no-curve",
            FileError::Grids { .. } => "file-of-two-grids",
            FileError::SameName { .. } => "file-column-twice",
            FileError::Name { .. } => "file-column-name",
        }
    }

    fn hint(&self) -> String {
        match self {
            FileError::Outside { .. } => {
                "write it beside the notebook, or into a folder below: `tables/shift.csv`".to_owned()
            }
            FileError::Extension { .. } => format!("call it by a name that ends so, such as `shift.{EXTENSION}`"),
            FileError::NotText { .. } => {
                "save it again as comma-separated values in UTF-8, which every table program offers".to_owned()
            }
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

/// What the running cell will have written, by path.
#[derive(Clone, Default)]
pub struct Writes(Rc<RefCell<BTreeMap<PathBuf, Written>>>);

#[derive(Clone)]
struct Written {
    name: String,
    text: Rc<str>,
}

impl Writes {
    /// Forgets what the last cell would have written.
    pub fn forget(&self) {
        self.0.borrow_mut().clear();
    }

    fn add(&self, folder: &Path, name: &str, text: &str) -> Result<(), FileError> {
        let path = inside(folder, name).ok_or_else(|| FileError::Outside { name: name.to_owned() })?;
        if path.extension().is_none_or(|extension| extension != EXTENSION) {
            return Err(FileError::Extension { name: name.to_owned() });
        }
        let failed = |error: io::Error| FileError::Write { name: name.to_owned(), why: plain(&error) };
        // A link may lead out of the folder.
        let [root, parent] = [folder, path.parent().unwrap_or(folder)].map(|path| here(path).canonicalize());
        if !parent.map_err(failed)?.starts_with(root.map_err(failed)?) {
            return Err(FileError::Outside { name: name.to_owned() });
        }
        self.0.borrow_mut().insert(path, Written { name: name.to_owned(), text: text.into() });
        Ok(())
    }

    fn find(&self, folder: &Path, name: &str) -> Option<Rc<str>> {
        self.0.borrow().get(&inside(folder, name)?).map(|written| Rc::clone(&written.text))
    }

    /// Puts on the disk what the cell has written: every text into a new file, then each in its place, so that no file is
    /// ever half written.
    ///
    /// # Errors
    /// A file cannot be written.
    pub fn commit(&self, beside: &Beside) -> Result<(), FileError> {
        let pending = std::mem::take(&mut *self.0.borrow_mut());
        if beside.is_apart() {
            pending.values().for_each(|written| beside.keep(&written.name, &written.text));
            return Ok(());
        }
        let failed =
            |written: &Written, error: &io::Error| FileError::Write { name: written.name.clone(), why: plain(error) };
        let mut ready = Vec::new();
        for (path, written) in &pending {
            let file = NamedTempFile::new_in(here(path.parent().unwrap_or(path))).and_then(|mut file| {
                file.write_all(written.text.as_bytes())?;
                share(&file)?;
                Ok(file)
            });
            ready.push((file.map_err(|error| failed(written, &error))?, path, written));
        }
        for (file, path, written) in ready {
            file.persist(path).map_err(|error| failed(written, &error.error))?;
        }
        Ok(())
    }
}

/// The path of a name that stays in a folder, without the `.` in between, so that one file has one path.
fn inside(folder: &Path, name: &str) -> Option<PathBuf> {
    let parts = || Path::new(name).components();
    let stays = parts().all(|part| matches!(part, Component::Normal(_) | Component::CurDir));
    let path = parts().filter(|part| *part != Component::CurDir).collect::<PathBuf>();
    (stays && path.file_name().is_some()).then(|| folder.join(path))
}

/// The current folder has no name of its own.
fn here(folder: &Path) -> &Path {
    if folder.as_os_str().is_empty() { Path::new(".") } else { folder }
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
                Ok(s.writes.add(&s.folder(), &name, &render::csv::curves(cx, &curves)?)?)
            })
        },
    );
}

fn read(shared: &Shared, context: &NativeCallContext<'_>, name: &str, source: Option<&str>) -> Native<Rc<Table>> {
    with_context(shared, place_of(context), |cx| {
        let text = match shared.writes.find(&shared.folder(), name) {
            Some(text) => text,
            None => {
                let bytes = read_beside(shared, name)?;
                // Text, cells and figures together take some ten times what the file does.
                shared.room_for(10 * bytes.len())?;
                let text = String::from_utf8(bytes).map_err(|_| FileError::NotText { name: name.to_owned() })?;
                text.into()
            }
        };
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
