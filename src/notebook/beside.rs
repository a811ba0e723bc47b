//! The files beside a notebook that an audit of it rests on: figures, records and modules, each by its digest on the disk.

use std::collections::BTreeSet;
use std::path::Path;

use serde::{Deserialize, Serialize};

use crate::notebook::file::bytes_of;
use crate::notebook::seal::Seal;
use crate::notebook::trial::Trial;
use crate::source::sha256;

/// A file beside a notebook.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct FileBeside {
    /// As the cell or the module named it, from the notebook's folder.
    pub name: String,
    /// None where it could not be read.
    pub sha256: Option<String>,
}

impl FileBeside {
    fn of(notebook: &Path, name: &str) -> FileBeside {
        let path = notebook.parent().unwrap_or(Path::new("")).join(name);
        FileBeside { name: name.to_owned(), sha256: bytes_of(&path).ok().map(|bytes| sha256(&bytes)) }
    }

    /// Whether it is on the disk as it was.
    pub fn is_as_it_was(&self, notebook: &Path) -> bool {
        *self == FileBeside::of(notebook, &self.name)
    }
}

/// The files that the seal names and those that the runs used.
pub fn files_beside(notebook: &str, seal: Option<&Seal>, trials: [&Trial; 2]) -> Vec<FileBeside> {
    let mut names: BTreeSet<&str> = BTreeSet::new();
    if let Some(seal) = seal {
        names.extend(seal.files.iter().map(|file| file.name.as_str()));
        names.extend(seal.modules.iter().map(|module| module.name.as_str()));
    }
    for trial in trials {
        names.extend(trial.files.keys().chain(trial.modules.keys()).map(String::as_str));
    }
    names.into_iter().map(|name| FileBeside::of(Path::new(notebook), name)).collect()
}
