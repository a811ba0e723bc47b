//! Where figures come from, and files built into the program.
//!
//! A [`Citation`] is the printed source of a figure together with how the figure was obtained. Embedded files
//! keep their bytes; whoever reads one parses it typed, at first use.

use std::sync::Arc;

use sha2::{Digest, Sha256};

/// A published source, and how the figure was read from it. Both are shown wherever the figure is used.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Citation {
    /// The publication, with table or page where known.
    pub source: Arc<str>,
    /// How the figure was obtained, as the record says; empty where the source was read directly.
    pub obtained: Arc<str>,
}

impl Citation {
    pub fn new(source: impl Into<Arc<str>>, obtained: impl Into<Arc<str>>) -> Self {
        Citation { source: source.into(), obtained: obtained.into() }
    }
}

impl std::fmt::Display for Citation {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        if self.obtained.is_empty() {
            write!(f, "{}", self.source)
        } else {
            write!(f, "{}; {}", self.source, self.obtained)
        }
    }
}

/// A file of the distribution, built into the program; or a text that stands for one, such as the tables of a seal.
#[derive(Clone, Copy, Debug)]
pub struct Embedded<'a> {
    /// Path below the project's root, for messages and seals.
    pub path: &'a str,
    pub bytes: &'a [u8],
    /// SHA-256 of the bytes in lower-case hexadecimal; that of a file built in was taken when the program was built.
    pub sha256: &'a str,
}

// `STDLIB`: every file of stdlib/, by path; written by build.rs.
include!(concat!(env!("OUT_DIR"), "/stdlib.rs"));

/// SHA-256 of a text in lower-case hexadecimal.
pub fn sha256(bytes: &[u8]) -> String {
    Sha256::digest(bytes).iter().map(|byte| format!("{byte:02x}")).collect()
}

/// The file of that path. In a constant, a path that is not in `stdlib/` is a build error.
pub const fn embedded(path: &str) -> Embedded<'static> {
    let mut at = 0;
    while at < STDLIB.len() {
        if equal(STDLIB[at].path.as_bytes(), path.as_bytes()) {
            return STDLIB[at];
        }
        at += 1;
    }
    panic!("a path that the program asks for is not among the files of stdlib/")
}

/// Equality of bytes in a constant, where `==` on slices is not to be had.
const fn equal(left: &[u8], right: &[u8]) -> bool {
    let mut at = 0;
    while at < left.len() && at < right.len() && left[at] == right[at] {
        at += 1;
    }
    left.len() == right.len() && at == left.len()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn digests_are_those_of_the_bytes_and_paths_are_sorted() {
        assert!(STDLIB.is_sorted_by_key(|file| file.path));
        for file in STDLIB {
            assert_eq!(sha256(file.bytes), file.sha256, "{}", file.path);
        }
        assert_eq!(embedded("stdlib/data/codata-1989.json").path, "stdlib/data/codata-1989.json");
    }
}
