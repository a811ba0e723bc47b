//! The audits of an archive on disk: written as they are done, read back one at a time, and found again by a later run.
//!
//! The file is JSON Lines: what was ordered, then one audit a line, then a line that says that the list was done. The
//! surprise: it is only ever appended to, so that a run that was killed loses at most the audit it was writing; a line that
//! was torn is cut off when the file is opened again.

use std::cell::RefCell;
use std::collections::{BTreeMap, BTreeSet};
use std::fs::{File, TryLockError};
use std::io::{BufRead, BufReader, Seek, SeekFrom, Write};
use std::path::{Path, PathBuf};

use serde::{Deserialize, Serialize};
use thiserror::Error;

use crate::archive::audits::Audits;
use crate::archive::order::Order;
use crate::archive::pool::Done;
use crate::fault::{Explain, Fault};
use crate::notebook::beside::FileBeside;
use crate::notebook::file::bytes_of;
use crate::notebook::verdict::{AuditStatus, NotebookAudit};
use crate::source::sha256;

/// Name and version of the shape of the file.
const FORMAT: &str = "hessbook-audit-state/1";

/// Why a state file cannot be used.
#[derive(Debug, Error)]
pub enum StateError {
    #[error("cannot {what} the state file {path}: {why}", path = path.display())]
    Io { what: &'static str, path: PathBuf, why: String },
    #[error("another audit writes the state file {path} now", path = path.display())]
    InUse { path: PathBuf },
    #[error("{path} is no state file of an audit: {why}", path = path.display())]
    NotAState { path: PathBuf, why: String },
    #[error("the state file {path} is of another audit: {what}", path = path.display())]
    OfAnother { path: PathBuf, what: &'static str },
    #[error("the state file {path} is of an audit that was not finished", path = path.display())]
    NotFinished { path: PathBuf },
    #[error("{notebook} stands in both {one} and {other}", one = one.display(), other = other.display())]
    Twice { notebook: String, one: PathBuf, other: PathBuf },
    #[error("{one} and {other} are of audits of different paths", one = one.display(), other = other.display())]
    OtherPaths { one: PathBuf, other: PathBuf },
    #[error("the state files are of {given}, and those of {missing} are missing")]
    ShardMissing { given: String, missing: String },
}

impl Explain for StateError {
    fn code(&self) -> &'static str {
        match self {
            StateError::Io { .. } => "state-file-inaccessible",
            StateError::InUse { .. } => "state-file-in-use",
            StateError::NotAState { .. } => "not-a-state-file",
            StateError::OfAnother { .. } => "state-of-another-audit",
            StateError::NotFinished { .. } => "state-not-finished",
            StateError::Twice { .. } => "notebook-in-two-states",
            StateError::OtherPaths { .. } => "shards-of-other-paths",
            StateError::ShardMissing { .. } => "shard-missing",
        }
    }

    fn hint(&self) -> String {
        match self {
            StateError::Io { .. } => "check the path, the rights and the space left".to_owned(),
            StateError::InUse { .. } => "wait for it, or give this audit a file of its own".to_owned(),
            StateError::NotAState { .. } => "give a file that `hessbook audit --resume FILE` wrote".to_owned(),
            StateError::OfAnother { .. } => {
                "give the same options as then, or a new file for this audit; results of two audits do not mix"
                    .to_owned()
            }
            StateError::NotFinished { .. } => "run the same command again, which goes on where it stopped".to_owned(),
            StateError::Twice { .. } => "give each shard's file once, and shards of one archive".to_owned(),
            StateError::OtherPaths { .. } => {
                "audit each shard with the same paths, written alike: a shard is a part of what they name".to_owned()
            }
            StateError::ShardMissing { .. } => {
                "give the state files of all shards; without them the report would pass over their notebooks".to_owned()
            }
        }
    }
}

/// One line of the file.
#[derive(Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
enum Line {
    Head(Head),
    Audit(Box<Entry>),
    /// A notebook that an earlier run audited, and that is not in the list any more.
    Gone {
        file: String,
    },
    /// That the list was done, and when, in UTC: `2026-12-01T09:30:00Z`. Shards of one archive were asked for in one way, of
    /// which `asked` is the digest.
    Finished {
        notebooks: usize,
        ended: String,
        asked: String,
    },
}

#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
struct Head {
    format: String,
    /// `2/4`, where it is one part of several.
    shard: Option<String>,
    order: Order,
}

#[derive(Serialize, Deserialize)]
struct Entry {
    lost: bool,
    audit: NotebookAudit,
}

/// The files that an audit rests on.
#[derive(Clone)]
struct Rests {
    sha256: String,
    beside: Vec<FileBeside>,
}

impl Rests {
    /// None for an audit that another try may make better: a file that was missing may be there now.
    fn of(entry: &Entry) -> Option<Rests> {
        let again = entry.lost || entry.audit.status == AuditStatus::CouldNotRun;
        let sha256 = entry.audit.sha256.clone().filter(|_| !again)?;
        Some(Rests { sha256, beside: entry.audit.beside.clone() })
    }

    fn are_as_they_were(&self, notebook: &Path) -> bool {
        bytes_of(notebook).is_ok_and(|bytes| sha256(&bytes) == self.sha256)
            && self.beside.iter().all(|file| file.is_as_it_was(notebook))
    }
}

/// Where an audit stands: in which file, from which byte on.
type Place = (usize, u64);

/// Audits on disk.
pub struct State {
    files: Vec<RefCell<Reader>>,
    /// By the position of the notebook.
    places: Vec<Option<Place>>,
    /// End of the last file, to which audits are appended.
    end: u64,
    order: Order,
    /// When the last of the audits was made.
    ended: Option<String>,
    /// Whether a part of them was made by an earlier run, or by several.
    in_parts: bool,
}

/// Is given each line, with the byte it starts at.
type Taking<'a> = dyn FnMut(u64, Line) -> Result<(), StateError> + 'a;

/// A state file. It is read and appended to.
struct Reader {
    path: PathBuf,
    file: File,
}

impl Reader {
    fn failed(&self, what: &'static str, why: &std::io::Error) -> StateError {
        StateError::Io { what, path: self.path.clone(), why: why.to_string() }
    }

    /// Reads whole lines from the start; gives the byte after the last of them.
    fn lines(&mut self, take: &mut Taking) -> Result<u64, StateError> {
        let refused = |path: &Path, why: String| StateError::NotAState { path: path.to_owned(), why };
        self.file.seek(SeekFrom::Start(0)).map_err(|why| self.failed("read", &why))?;
        let (mut at, mut line) = (0, Vec::new());
        let mut reader = BufReader::new(&self.file);
        loop {
            line.clear();
            let read = reader.read_until(b'\n', &mut line).map_err(|why| self.failed("read", &why))?;
            if line.last() != Some(&b'\n') {
                return Ok(at);
            }
            let parsed = serde_json::from_slice(&line).map_err(|error| refused(&self.path, error.to_string()))?;
            if (at == 0) != matches!(parsed, Line::Head(_)) {
                return Err(refused(&self.path, "its first line, and no other, says what was ordered".to_owned()));
            }
            take(at, parsed)?;
            at += read as u64;
        }
    }

    fn entry(&mut self, at: u64) -> Result<NotebookAudit, StateError> {
        let mut line = Vec::new();
        let mut file = &self.file;
        let read = file.seek(SeekFrom::Start(at)).and_then(|_| BufReader::new(file).read_until(b'\n', &mut line));
        read.map_err(|why| self.failed("read", &why))?;
        match serde_json::from_slice(&line) {
            Ok(Line::Audit(entry)) => Ok(entry.audit),
            Ok(_) => Err(StateError::NotAState { path: self.path.clone(), why: "it was changed meanwhile".to_owned() }),
            Err(error) => Err(StateError::NotAState { path: self.path.clone(), why: error.to_string() }),
        }
    }
}

impl State {
    /// For an audit that nobody means to go on with: a file without a name.
    ///
    /// # Errors
    /// There is no space for temporary files.
    pub fn temporary(order: &Order, notebooks: usize) -> Result<State, StateError> {
        let path = std::env::temp_dir();
        let file = tempfile::tempfile().map_err(|why| StateError::Io {
            what: "make",
            path: path.clone(),
            why: why.to_string(),
        })?;
        let mut state = State::empty(Reader { path, file }, order, notebooks);
        state.append(&Line::Head(head(order, None)))?;
        Ok(state)
    }

    /// For an audit that goes on where an earlier one stopped, if there was one. Audits of notebooks that were changed since,
    /// or that have a file beside them that was, are made again, and so are those that could not be made.
    ///
    /// # Errors
    /// The file is of another audit, or cannot be read and written.
    pub fn resumed(
        path: &Path,
        order: &Order,
        shard: Option<String>,
        notebooks: &[PathBuf],
    ) -> Result<State, StateError> {
        let failed = |why: std::io::Error| StateError::Io { what: "open", path: path.to_owned(), why: why.to_string() };
        let file = File::options().read(true).write(true).create(true).truncate(false).open(path).map_err(failed)?;
        match file.try_lock() {
            Err(TryLockError::WouldBlock) => return Err(StateError::InUse { path: path.to_owned() }),
            // Some network file systems have no locks; an audit is not refused for that.
            Ok(()) | Err(TryLockError::Error(_)) => {}
        }
        let mut state = State::empty(Reader { path: path.to_owned(), file }, order, notebooks.len());
        let wanted = head(order, shard);
        let positions: BTreeMap<String, usize> =
            notebooks.iter().enumerate().map(|(nth, path)| (path.display().to_string(), nth)).collect();
        let mut known: Vec<Option<(u64, Rests)>> = vec![None; notebooks.len()];
        let (mut any, mut gone) = (false, BTreeSet::new());
        let end = state.files[0].borrow_mut().lines(&mut |at, line| {
            match line {
                Line::Head(found) => {
                    any = true;
                    return parting(&found, &wanted)
                        .map_or(Ok(()), |what| Err(StateError::OfAnother { path: path.to_owned(), what }));
                }
                Line::Audit(entry) => {
                    if let Some(&nth) = positions.get(&entry.audit.file) {
                        known[nth] = Rests::of(&entry).map(|rests| (at, rests));
                    } else {
                        gone.insert(entry.audit.file);
                    }
                }
                Line::Gone { file } => drop(gone.remove(&file)),
                Line::Finished { .. } => {}
            }
            Ok(())
        })?;
        for (nth, known) in known.into_iter().enumerate() {
            if let Some((at, _)) = known.filter(|(_, rests)| rests.are_as_they_were(&notebooks[nth])) {
                state.places[nth] = Some((0, at));
            }
        }
        state.end = end;
        state.in_parts = state.places.iter().any(Option::is_some);
        if !any {
            state.append(&Line::Head(wanted))?;
        }
        for file in gone {
            state.append(&Line::Gone { file })?;
        }
        Ok(state)
    }

    /// The audits of several state files together, those of the shards of one archive.
    ///
    /// # Errors
    /// They are of different audits, one was not finished or is missing, or a notebook stands in two.
    pub fn gathered(paths: &[PathBuf]) -> Result<State, StateError> {
        let mut gathered: Option<State> = None;
        let mut first: Option<Head> = None;
        let mut shards: Vec<Option<String>> = Vec::new();
        // Times in UTC sort as texts.
        let mut last_ended = String::new();
        let mut asked_for: Option<String> = None;
        let mut owners: BTreeMap<String, (usize, u64)> = BTreeMap::new();
        for (nth, path) in paths.iter().enumerate() {
            let file = File::open(path).map_err(|why| StateError::Io {
                what: "open",
                path: path.clone(),
                why: why.to_string(),
            })?;
            let mut reader = Reader { path: path.clone(), file };
            let (mut head, mut finished) = (None, None);
            // A later line about a notebook stands for an earlier one of the same file.
            let mut entries: BTreeMap<String, u64> = BTreeMap::new();
            reader.lines(&mut |at, line| {
                match line {
                    Line::Head(found) => head = Some(found),
                    Line::Audit(entry) => {
                        finished = None;
                        entries.insert(entry.audit.file, at);
                    }
                    Line::Gone { file } => drop(entries.remove(&file)),
                    Line::Finished { ended, asked, .. } => finished = Some((ended, asked)),
                }
                Ok(())
            })?;
            let Some(head) = head else {
                return Err(StateError::NotAState { path: path.clone(), why: "it is empty".to_owned() });
            };
            let Some((ended, asked)) = finished else {
                return Err(StateError::NotFinished { path: path.clone() });
            };
            last_ended = last_ended.max(ended);
            if *asked_for.get_or_insert_with(|| asked.clone()) != asked {
                return Err(StateError::OtherPaths { one: paths[0].clone(), other: path.clone() });
            }
            let wanted = Head { shard: head.shard.clone(), ..first.get_or_insert_with(|| head.clone()).clone() };
            if let Some(what) = parting(&head, &wanted) {
                return Err(StateError::OfAnother { path: path.clone(), what });
            }
            for (notebook, at) in entries {
                if let Some((other, _)) = owners.insert(notebook.clone(), (nth, at)) {
                    return Err(StateError::Twice { notebook, one: paths[other].clone(), other: path.clone() });
                }
            }
            shards.push(head.shard);
            match &mut gathered {
                Some(state) => state.files.push(RefCell::new(reader)),
                none => *none = Some(State::empty(reader, &head.order, 0)),
            }
        }
        all_shards(&shards)?;
        let Some(mut state) = gathered else {
            return Err(StateError::NotAState { path: PathBuf::new(), why: "no file was given".to_owned() });
        };
        state.places = owners.into_values().map(Some).collect();
        (state.ended, state.in_parts) = (Some(last_ended), true);
        Ok(state)
    }

    fn empty(reader: Reader, order: &Order, notebooks: usize) -> State {
        let files = vec![RefCell::new(reader)];
        State { files, places: vec![None; notebooks], end: 0, order: order.clone(), ended: None, in_parts: false }
    }

    /// What was ordered.
    pub fn order(&self) -> &Order {
        &self.order
    }

    /// Notebooks there are to be.
    pub fn count(&self) -> usize {
        self.places.len()
    }

    /// When the last of the audits was made, in UTC; none before that.
    pub fn ended(&self) -> Option<&str> {
        self.ended.as_deref()
    }

    /// Whether the audits were made by more than this run.
    pub fn is_in_parts(&self) -> bool {
        self.in_parts
    }

    /// Positions of notebooks that have no audit yet.
    pub fn open(&self) -> Vec<usize> {
        (0..self.places.len()).filter(|nth| self.places[*nth].is_none()).collect()
    }

    /// Keeps an audit.
    ///
    /// # Errors
    /// The file cannot be written.
    pub fn keep(&mut self, done: Done) -> Result<(), StateError> {
        let at = self.end;
        self.append(&Line::Audit(Box::new(Entry { lost: done.lost, audit: done.audit })))?;
        self.places[done.nth] = Some((self.files.len() - 1, at));
        Ok(())
    }

    /// Says that every notebook of the list has its audit; `asked` tells lists from each other.
    ///
    /// # Errors
    /// The file cannot be written.
    pub fn finish(&mut self, asked: &str) -> Result<(), StateError> {
        let ended = chrono::Utc::now().format("%Y-%m-%dT%H:%M:%SZ").to_string();
        self.append(&Line::Finished { notebooks: self.places.len(), ended: ended.clone(), asked: asked.to_owned() })?;
        self.ended = Some(ended);
        let reader = self.files[self.files.len() - 1].borrow();
        // A file without a name has nothing to be found again.
        let _ = reader.file.sync_all();
        Ok(())
    }

    fn append(&mut self, line: &Line) -> Result<(), StateError> {
        let reader = self.files.last_mut().map(RefCell::get_mut).unwrap_or_else(|| unreachable!("made with one"));
        let mut bytes = serde_json::to_vec(line).unwrap_or_else(|e| unreachable!("an audit is plain texts: {e}"));
        bytes.push(b'\n');
        let at = self.end;
        // What an earlier run left torn behind the last whole line is cut off.
        let written = reader
            .file
            .set_len(at)
            .and_then(|()| reader.file.seek(SeekFrom::Start(at)))
            .and_then(|_| reader.file.write_all(&bytes));
        written.map_err(|why| reader.failed("write", &why))?;
        self.end += bytes.len() as u64;
        Ok(())
    }

    /// The audit of a notebook.
    ///
    /// # Errors
    /// It cannot be read back.
    pub fn audit(&self, nth: usize) -> Result<Option<NotebookAudit>, StateError> {
        let Some((file, at)) = self.places.get(nth).copied().flatten() else { return Ok(None) };
        self.files[file].borrow_mut().entry(at).map(Some)
    }
}

impl Audits for State {
    fn each(&self, take: &mut dyn FnMut(&NotebookAudit) -> Result<(), Fault>) -> Result<(), Fault> {
        for nth in 0..self.places.len() {
            if let Some(audit) = self.audit(nth)? {
                take(&audit)?;
            }
        }
        Ok(())
    }
}

fn head(order: &Order, shard: Option<String>) -> Head {
    Head { format: FORMAT.to_owned(), shard, order: order.clone() }
}

/// In what two orders part.
fn parting(one: &Head, other: &Head) -> Option<&'static str> {
    match () {
        () if one.format != other.format => Some("its shape is of another version of the program"),
        () if one.order.program != other.order.program => Some("it was made by another version of the program"),
        () if one.order.task != other.order.task => Some("it was made with other options"),
        () if one.shard != other.shard => Some("it is of another shard"),
        () => None,
    }
}

/// Whether the shards are all there.
fn all_shards(given: &[Option<String>]) -> Result<(), StateError> {
    let given: Vec<&str> = given.iter().flatten().map(String::as_str).collect();
    let Some(of) = given.first().and_then(|shard| shard.split_once('/')).and_then(|(_, of)| of.parse::<u64>().ok())
    else {
        return Ok(());
    };
    let missing: Vec<String> =
        (1..=of).map(|nth| format!("{nth}/{of}")).filter(|shard| !given.contains(&shard.as_str())).take(20).collect();
    if missing.is_empty() {
        return Ok(());
    }
    let words = |shards: &[String]| format!("shard {}", shards.join(", "));
    let given: Vec<String> = given.iter().take(20).map(|shard| (*shard).to_owned()).collect();
    Err(StateError::ShardMissing { given: words(&given), missing: words(&missing) })
}
