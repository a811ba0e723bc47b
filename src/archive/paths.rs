//! Which notebooks an archive holds: files, folders and patterns, each notebook once, and the part of them that falls to
//! one shard.
//!
//! [`found`] lists them in order. The surprise: a shard takes notebooks by the digest of their path and not by their place
//! in the list, so that every notebook falls to exactly one shard even where the archive grows while the shards run.

use std::collections::BTreeSet;
use std::fmt;
use std::path::{Path, PathBuf};
use std::str::FromStr;

use thiserror::Error;

use crate::fault::Explain;
use crate::source::sha256;

/// Why there is nothing to audit.
#[derive(Debug, PartialEq, Eq, Error)]
pub enum PathError {
    #[error("nothing matches the pattern `{pattern}`")]
    NothingMatches { pattern: String },
    #[error("`{pattern}` is no pattern of paths: {why}")]
    NoPattern { pattern: String, why: String },
    #[error("the folder {path} holds no notebook, nor does a folder in it", path = path.display())]
    NoNotebook { path: PathBuf },
    #[error("`{text}` names no shard: {why}")]
    NoShard { text: String, why: &'static str },
}

impl Explain for PathError {
    fn code(&self) -> &'static str {
        match self {
            PathError::NothingMatches { .. } => "pattern-without-match",
            PathError::NoPattern { .. } => "not-a-pattern",
            PathError::NoNotebook { .. } => "folder-without-notebook",
            PathError::NoShard { .. } => "not-a-shard",
        }
    }

    fn hint(&self) -> String {
        match self {
            PathError::NothingMatches { .. } => {
                "check the spelling, and from which folder the path starts; ** stands for folders at any depth"
                    .to_owned()
            }
            PathError::NoPattern { .. } => "* and ? stand for characters of a name, [ab] for one of them".to_owned(),
            PathError::NoNotebook { .. } => "give the folder that holds .ipynb files".to_owned(),
            PathError::NoShard { .. } => "write the first of four shards as 1/4, and the last as 4/4".to_owned(),
        }
    }
}

/// One part of an archive among several of about the same size.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Shard {
    /// From 1.
    nth: u64,
    of: u64,
}

impl FromStr for Shard {
    type Err = PathError;

    fn from_str(text: &str) -> Result<Shard, PathError> {
        let refused = |why| PathError::NoShard { text: text.to_owned(), why };
        let (nth, of) = text.split_once('/').ok_or(refused("it has no `/`"))?;
        let number = |text: &str| text.trim().parse::<u64>().map_err(|_| refused("it takes two whole numbers"));
        let (nth, of) = (number(nth)?, number(of)?);
        match nth {
            0 => Err(refused("shards are counted from 1")),
            _ if nth > of => Err(refused("its number is larger than their count")),
            _ => Ok(Shard { nth, of }),
        }
    }
}

impl fmt::Display for Shard {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}/{}", self.nth, self.of)
    }
}

impl Shard {
    /// Whether a notebook falls to this shard.
    pub fn takes(self, path: &Path) -> bool {
        let digest = sha256(path.as_os_str().as_encoded_bytes());
        // Sixty bits: even to one part in 10^12 for a million shards.
        let number = u64::from_str_radix(&digest[..15], 16).unwrap_or(0);
        number % self.of == self.nth - 1
    }
}

/// What was found.
#[derive(Debug, Default, PartialEq, Eq)]
pub struct Found {
    /// In the order of the arguments, by path within a folder, each once.
    pub notebooks: Vec<PathBuf>,
    /// Folders that could not be read, with why.
    pub unreadable: Vec<(PathBuf, String)>,
    /// Digest of the arguments.
    pub asked: String,
}

/// The notebooks that files, folders and patterns name. A path that is not there is kept, so that its audit says so.
///
/// # Errors
/// A pattern that matches nothing, or a folder without notebooks: an audit of nothing would pass for one without findings.
pub fn found(arguments: &[PathBuf]) -> Result<Found, PathError> {
    let listed: Vec<String> = arguments.iter().map(|path| format!("{}\n", path.display())).collect();
    let mut all = Found { asked: sha256(listed.concat().as_bytes()), ..Found::default() };
    for argument in arguments {
        let text = argument.to_string_lossy();
        let is_pattern = text.contains(['*', '?', '[']) && !argument.exists();
        if !is_pattern {
            all.take(argument)?;
            continue;
        }
        let paths = glob::glob(&text)
            .map_err(|error| PathError::NoPattern { pattern: text.clone().into_owned(), why: error.msg.to_owned() })?;
        let mut any = false;
        for path in paths {
            match path {
                Ok(path) => all.matched(&path, &mut any)?,
                Err(error) => {
                    any = true;
                    all.unreadable.push((error.path().to_owned(), error.error().to_string()));
                }
            }
        }
        if !any {
            return Err(PathError::NothingMatches { pattern: text.into_owned() });
        }
    }
    let mut seen = BTreeSet::new();
    all.notebooks.retain(|path| seen.insert(place(path)));
    Ok(all)
}

/// One place for all spellings of a path. A link to a notebook is a notebook of its own.
fn place(path: &Path) -> PathBuf {
    let folder = path.parent().filter(|folder| !folder.as_os_str().is_empty()).unwrap_or(Path::new("."));
    match (std::fs::canonicalize(folder), path.file_name()) {
        (Ok(folder), Some(name)) => folder.join(name),
        _ => path.to_owned(),
    }
}

impl Found {
    fn take(&mut self, path: &Path) -> Result<(), PathError> {
        if !path.is_dir() {
            self.notebooks.push(path.to_owned());
            return Ok(());
        }
        let before = (self.notebooks.len(), self.unreadable.len());
        self.below(path);
        let none = before == (self.notebooks.len(), self.unreadable.len());
        if none { Err(PathError::NoNotebook { path: path.to_owned() }) } else { Ok(()) }
    }

    /// What a pattern matches: folders whole, and files that are notebooks by their name.
    fn matched(&mut self, path: &Path, any: &mut bool) -> Result<(), PathError> {
        let before = self.notebooks.len();
        if path.is_dir() {
            self.below(path);
        } else if is_notebook(path) {
            self.notebooks.push(path.to_owned());
        }
        *any |= self.notebooks.len() > before;
        Ok(())
    }

    /// The notebooks in a folder and those below it. A stack of its own, since folders may be nested deeper than calls.
    fn below(&mut self, folder: &Path) {
        let mut pending = vec![folder.to_owned()];
        while let Some(path) = pending.pop() {
            if !path.is_dir() {
                self.notebooks.push(path);
                continue;
            }
            let entries = std::fs::read_dir(&path).and_then(Iterator::collect::<Result<Vec<_>, _>>);
            let entries = match entries {
                Ok(entries) => entries,
                Err(why) => {
                    self.unreadable.push((path, why.to_string()));
                    continue;
                }
            };
            let mut paths: Vec<PathBuf> = entries.into_iter().map(|entry| entry.path()).collect();
            // A link to a folder may lead round in a circle, and is passed over.
            paths.retain(|path| !is_hidden(path) && if path.is_dir() { !path.is_symlink() } else { is_notebook(path) });
            paths.sort();
            pending.extend(paths.into_iter().rev());
        }
    }
}

fn is_notebook(path: &Path) -> bool {
    path.extension().is_some_and(|extension| extension.eq_ignore_ascii_case("ipynb"))
}

/// Front ends keep copies of notebooks in hidden folders.
fn is_hidden(path: &Path) -> bool {
    path.file_name().is_some_and(|name| name.to_string_lossy().starts_with('.'))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn archive(files: &[&str]) -> tempfile::TempDir {
        let folder = tempfile::tempdir().unwrap();
        for file in files {
            let path = folder.path().join(file);
            std::fs::create_dir_all(path.parent().unwrap()).unwrap();
            std::fs::write(path, "{}").unwrap();
        }
        folder
    }

    fn names(folder: &Path, found: &Found) -> Vec<String> {
        found.notebooks.iter().map(|path| path.strip_prefix(folder).unwrap().display().to_string()).collect()
    }

    #[test]
    fn folders_are_walked_in_order_and_copies_of_front_ends_left_out() {
        let folder = archive(&[
            "b/2.ipynb",
            "b/1.IPYNB",
            "a.ipynb",
            "b/.ipynb_checkpoints/1.ipynb",
            "b/notes.txt",
            "c/d/3.ipynb",
        ]);
        let path = folder.path();
        #[cfg(unix)]
        std::os::unix::fs::symlink(path, path.join("b/round")).unwrap();
        let all = found(&[path.to_owned()]).unwrap();
        assert_eq!(names(path, &all), ["a.ipynb", "b/1.IPYNB", "b/2.ipynb", "c/d/3.ipynb"]);
        let twice = found(&[path.join("a.ipynb"), path.to_owned()]).unwrap();
        assert_eq!(names(path, &twice).len(), 4, "each once");
        let spelt = found(&[path.join("a.ipynb"), path.join("b/../a.ipynb"), path.join("./a.ipynb")]).unwrap();
        assert_eq!(spelt.notebooks, [path.join("a.ipynb")], "however it is spelt");
    }

    #[test]
    fn patterns_find_notebooks_and_folders_and_say_when_they_find_nothing() {
        let folder = archive(&["2024/1.ipynb", "2025/2.ipynb", "2025/x.csv", "bare/x.csv"]);
        let path = folder.path();
        let of = |pattern: &str| found(&[path.join(pattern)]).map(|all| names(path, &all));
        assert_eq!(of("202?").unwrap(), ["2024/1.ipynb", "2025/2.ipynb"]);
        assert_eq!(of("**/2.*").unwrap(), ["2025/2.ipynb"]);
        assert!(matches!(of("2026/*"), Err(PathError::NothingMatches { .. })));
        assert!(matches!(of("*/x.csv"), Err(PathError::NothingMatches { .. })));
        assert!(matches!(of("[a-"), Err(PathError::NoPattern { .. })));
        assert!(matches!(of("bare"), Err(PathError::NoNotebook { .. })));
        assert_eq!(of("not-there.ipynb").unwrap(), ["not-there.ipynb"], "its audit will say that it is not there");
    }

    #[test]
    fn every_notebook_falls_to_exactly_one_shard() {
        let shards: Vec<Shard> = (1..=7).map(|nth| format!("{nth}/7").parse().unwrap()).collect();
        let mut counts = [0; 7];
        for n in 0..7000 {
            let path = PathBuf::from(format!("archive/{n}.ipynb"));
            let takers: Vec<usize> = (0..7).filter(|at| shards[*at].takes(&path)).collect();
            assert_eq!(takers.len(), 1);
            counts[takers[0]] += 1;
        }
        // Binomial: 1000 expected, standard deviation 29; six of them.
        assert!(counts.iter().all(|count| (820..1180).contains(count)), "{counts:?}");
        for wrong in ["0/4", "5/4", "1", "a/b", "1/0", "-1/3", ""] {
            assert!(wrong.parse::<Shard>().is_err(), "{wrong}");
        }
    }
}
