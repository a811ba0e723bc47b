//! What was edited since a notebook was sealed, its cells and its modules, and what each edit moved.
//!
//! A seal keeps the text of each cell and module, so that [`exchanged_edits`] can run the notebook as it was sealed with one
//! edit alone. The surprise: cells are paired by their texts, not by their numbers, since a cell that is put in moves the
//! numbers of all that follow; and two edits that only work together, such as a new name for a variable, have one share.

use std::collections::BTreeMap;
use std::path::Path;
use std::sync::Arc;

use crate::fault::Fault;
use crate::notebook::audit::Runner;
use crate::notebook::causes::{Values, values_of};
use crate::notebook::file::{NotebookFile, bytes_of};
use crate::notebook::holdings::Holdings;
use crate::notebook::seal::{Seal, SealedCell, source_digest};
use crate::notebook::sealing::sealed_cells;
use crate::notebook::trial::Trial;
use crate::notebook::verdict::CauseKind;
use crate::source::sha256;

/// More edits than this are taken together: each would be a run of the notebook.
const MOST_EXCHANGED: usize = 24;

/// Pairs of cells that are compared with each other, at most; beyond, cells are paired by their order.
const MOST_COMPARED: usize = 4_000_000;

/// Pairs of texts whose words are compared, at most.
const MOST_WEIGHED: usize = 10_000;

/// One edit.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Edit {
    pub kind: CauseKind,
    /// `cell-3`; `cell-4, added`; `plant.rhai`.
    pub what: String,
    /// Digests; none for what was not there.
    pub then: Option<String>,
    pub now: Option<String>,
    piece: Piece,
}

#[derive(Clone, Debug, PartialEq, Eq)]
enum Piece {
    /// Positions among the sealed cells and among those of the notebook; an added cell stands before a sealed one.
    Cell {
        then: Option<usize>,
        now: Option<usize>,
        before: usize,
    },
    Module,
}

/// Every edit: cells in their order, then modules.
pub fn edits(file: &str, notebook: &NotebookFile, seal: &Seal) -> Vec<Edit> {
    let now = sealed_cells(notebook);
    let texts = |cells: &[SealedCell]| -> Vec<String> { cells.iter().map(|cell| cell.source.clone()).collect() };
    let cells = parted(&texts(&seal.cells), &texts(&now)).into_iter().map(|(then, now_at, before)| {
        let name = |at: Option<usize>, cells: &[SealedCell]| at.map(|at| cells[at].name.clone());
        let what = match (name(then, &seal.cells), name(now_at, &now)) {
            (Some(was), Some(is)) if was == is => is,
            (Some(was), Some(is)) => format!("{was}, which is {is} now"),
            (Some(was), None) => format!("{was}, taken away"),
            (None, is) => format!("{}, added", is.unwrap_or_default()),
        };
        Edit {
            kind: CauseKind::Cell,
            what,
            then: then.map(|at| seal.cells[at].sha256.clone()),
            now: now_at.map(|at| now[at].sha256.clone()),
            piece: Piece::Cell { then, now: now_at, before },
        }
    });
    let folder = Path::new(file).parent().unwrap_or(Path::new(""));
    let modules = seal.modules.iter().filter_map(|module| {
        let now = bytes_of(&folder.join(&module.name)).ok().map(|bytes| sha256(&bytes));
        (now.as_ref() != Some(&module.sha256)).then(|| Edit {
            kind: CauseKind::Module,
            what: module.name.clone(),
            then: Some(module.sha256.clone()),
            now,
            piece: Piece::Module,
        })
    });
    cells.chain(modules).collect()
}

/// Where two lists of texts part: positions in both, and how many of the first stand before it.
fn parted(then: &[String], now: &[String]) -> Vec<(Option<usize>, Option<usize>, usize)> {
    let same = |(a, b): &(&String, &String)| a == b;
    let head = then.iter().zip(now).take_while(same).count();
    let (then_left, now_left) = (&then[head..], &now[head..]);
    let tail = then_left.iter().rev().zip(now_left.iter().rev()).take_while(same).count();
    let (then_mid, now_mid) = (&then_left[..then_left.len() - tail], &now_left[..now_left.len() - tail]);
    let mut pairs = common(then_mid, now_mid);
    pairs.push((then_mid.len(), now_mid.len()));
    let mut parted = Vec::new();
    let (mut i, mut j) = (0, 0);
    for (next_i, next_j) in pairs {
        let mut before = head + i;
        for (was, is) in replaced(&then_mid[i..next_i], &now_mid[j..next_j]) {
            let was = was.map(|at| head + i + at);
            parted.push((was, is.map(|at| head + j + at), was.unwrap_or(before)));
            before = was.map_or(before, |at| at + 1);
        }
        (i, j) = (next_i + 1, next_j + 1);
    }
    parted
}

/// Which text of one list took the place of which of another, where no text is in both: in order, and where one list is
/// longer, those that have most words in common.
fn replaced(then: &[String], now: &[String]) -> Vec<(Option<usize>, Option<usize>)> {
    let (few, many, turned) = if then.len() <= now.len() { (then, now, false) } else { (now, then, true) };
    let weighed = few.len() < many.len() && few.len() * many.len() <= MOST_WEIGHED;
    // `best[i][j]`: likeness of the first i, each paired with one of the first j.
    let mut best = vec![vec![0_usize; many.len() + 1]; few.len() + 1];
    for i in 1..=few.len() {
        for j in i..=many.len() {
            let paired = best[i - 1][j - 1] + if weighed { likeness(&few[i - 1], &many[j - 1]) } else { 0 };
            best[i][j] = if j > i { paired.max(best[i][j - 1]) } else { paired };
        }
    }
    let (mut i, mut pairs) = (few.len(), Vec::new());
    for j in (1..=many.len()).rev() {
        let skipped = i == 0 || (i < j && best[i][j] == best[i][j - 1]);
        i -= usize::from(!skipped);
        let (one, other) = ((!skipped).then_some(i), Some(j - 1));
        pairs.push(if turned { (other, one) } else { (one, other) });
    }
    pairs.reverse();
    pairs
}

/// How many words of a text stand in the other too, in thousandths of the words of both.
fn likeness(a: &str, b: &str) -> usize {
    let words = |text: &str| -> BTreeMap<String, usize> {
        let mut counts = BTreeMap::new();
        let words = text.split(|c: char| !c.is_alphanumeric() && c != '_').filter(|word| !word.is_empty());
        words.for_each(|word| *counts.entry(word.to_owned()).or_default() += 1);
        counts
    };
    let (a, b) = (words(a), words(b));
    let shared: usize = a.iter().map(|(word, count)| b.get(word).map_or(0, |other| *other.min(count))).sum();
    2000 * shared / (a.values().sum::<usize>() + b.values().sum::<usize>()).max(1)
}

/// The longest common part of two lists, as pairs of positions.
fn common(a: &[String], b: &[String]) -> Vec<(usize, usize)> {
    if a.len().saturating_mul(b.len()) > MOST_COMPARED {
        return Vec::new();
    }
    // `longest[i][j]`: of what follows these positions.
    let mut longest = vec![vec![0_usize; b.len() + 1]; a.len() + 1];
    for i in (0..a.len()).rev() {
        for j in (0..b.len()).rev() {
            longest[i][j] = match a[i] == b[j] {
                true => 1 + longest[i + 1][j + 1],
                false => longest[i + 1][j].max(longest[i][j + 1]),
            };
        }
    }
    let (mut i, mut j, mut pairs) = (0, 0, Vec::new());
    while i < a.len() && j < b.len() {
        if a[i] == b[j] {
            pairs.push((i, j));
            (i, j) = (i + 1, j + 1);
        } else if longest[i + 1][j] >= longest[i][j + 1] {
            i += 1;
        } else {
            j += 1;
        }
    }
    pairs
}

/// What a notebook gives as it was sealed, and with each edit alone.
pub struct ExchangedEdits {
    /// The sealed cells and modules, run by this program on the sealed data.
    pub as_sealed: Values,
    pub each: Vec<(Edit, Values)>,
}

/// Runs the sealed cells and modules on the sealed data, and again with each edit alone; `with_all` is the run with all.
///
/// # Errors
/// The records make no catalogue.
pub fn exchanged_edits(
    runner: &Runner,
    then: &Holdings,
    seal: &Seal,
    edits: Vec<Edit>,
    with_all: &Trial,
) -> Result<ExchangedEdits, Fault> {
    let now: Vec<String> = runner.notebook.code_cells().into_iter().map(|cell| cell.source).collect();
    let run = |edit: Option<&Edit>| -> Result<Values, Fault> {
        let mut files = then.files.clone();
        files.extend(modules_of(seal).into_iter().filter(|(name, _)| {
            // The one that was edited is read from the disk, as it is now.
            edit.is_none_or(|edit| edit.piece != Piece::Module || edit.what != *name)
        }));
        let cells = cells_with(seal, &now, edit.map(|edit| &edit.piece));
        Ok(values_of(&runner.run_cells(cells, &then.with_files(files))?))
    };
    let as_sealed = run(None)?;
    let each = match edits.as_slice() {
        [_] => edits.into_iter().map(|edit| (edit, values_of(with_all))).collect(),
        many if many.len() > MOST_EXCHANGED => edits.into_iter().map(|edit| (edit, Values::new())).collect(),
        _ => edits.into_iter().map(|edit| run(Some(&edit)).map(|values| (edit, values))).collect::<Result<_, _>>()?,
    };
    Ok(ExchangedEdits { as_sealed, each })
}

/// The modules of a seal, by the names of their files.
pub fn modules_of(seal: &Seal) -> BTreeMap<String, Arc<[u8]>> {
    seal.modules.iter().map(|module| (module.name.clone(), module.content.as_bytes().into())).collect()
}

/// The sealed cells with one of them as it is now.
fn cells_with(seal: &Seal, now: &[String], piece: Option<&Piece>) -> Vec<(String, String)> {
    let edited = match piece {
        Some(Piece::Cell { then, now, before }) => Some((*then, *now, *before)),
        _ => None,
    };
    let text = |at: Option<usize>| at.and_then(|at| now.get(at)).cloned();
    let mut cells = Vec::with_capacity(seal.cells.len() + 1);
    for (nth, cell) in seal.cells.iter().enumerate() {
        match edited {
            Some((None, at, before)) if before == nth => {
                cells.push(("an added cell".to_owned(), text(at).unwrap_or_default()));
                cells.push((cell.name.clone(), cell.source.clone()));
            }
            Some((Some(then), at, _)) if then == nth => {
                cells.extend(text(at).map(|text| (cell.name.clone(), text)));
            }
            _ => cells.push((cell.name.clone(), cell.source.clone())),
        }
    }
    if let Some((None, at, before)) = edited
        && before >= seal.cells.len()
    {
        cells.push(("an added cell".to_owned(), text(at).unwrap_or_default()));
    }
    cells
}

/// Cells of a seal whose digest is not that of their text, and modules likewise, by name.
pub fn altered_texts(seal: &Seal) -> Vec<String> {
    let cells = seal.cells.iter().filter(|cell| source_digest(&cell.source) != cell.sha256).map(|cell| &cell.name);
    let modules = seal.modules.iter().filter(|module| sha256(module.content.as_bytes()) != module.sha256);
    cells.chain(modules.map(|module| &module.name)).cloned().collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn list(text: &str) -> Vec<String> {
        text.chars().map(String::from).collect()
    }

    #[test]
    fn cells_are_paired_by_their_texts() {
        let cases = [
            ("abc", "abc", vec![]),
            ("abc", "axc", vec![(Some(1), Some(1), 1)]),
            // Put in: what follows is the same cell under another number.
            ("abc", "aXbc", vec![(None, Some(1), 1)]),
            ("abc", "bc", vec![(Some(0), None, 0)]),
            ("abc", "abcd", vec![(None, Some(3), 3)]),
            ("abcd", "axcyd", vec![(Some(1), Some(1), 1), (None, Some(3), 3)]),
            ("ab", "xyz", vec![(Some(0), Some(0), 0), (Some(1), Some(1), 1), (None, Some(2), 2)]),
            ("", "a", vec![(None, Some(0), 0)]),
            // Two in the place of one: each text is a single word, so nothing speaks for either.
            ("abc", "axyc", vec![(Some(1), Some(1), 1), (None, Some(2), 2)]),
        ];
        for (then, now, expected) in cases {
            assert_eq!(parted(&list(then), &list(now)), expected, "{then} {now}");
        }
    }

    #[test]
    fn of_two_in_the_place_of_one_the_likelier_is_the_edited_one() {
        let then = ["let a = 1;", "let b = q(\"1 kJ\");", "c"].map(String::from);
        let now = ["let a = 1;", "a = 3 * a;", "let b = q(\"1.5 kJ\");", "c"].map(String::from);
        assert_eq!(parted(&then, &now), [(None, Some(1), 1), (Some(1), Some(2), 1)]);
        // The other way round, one of two was taken away.
        assert_eq!(parted(&now, &then), [(Some(1), None, 1), (Some(2), Some(1), 2)]);
    }
}
