//! The inputs of this process, for clients that recall earlier ones.
//!
//! [`History`] is kept in memory and ends with the process: a notebook is the record that lasts. Its size is bounded;
//! the oldest inputs go first.

use std::collections::VecDeque;

/// This process's number among the sessions of the history protocol, where 0 means "the present one".
const PRESENT_SESSION: i64 = 1;

/// What inputs and outputs together may take up, in bytes.
const LIMIT: usize = 32_000_000;

/// One input that was run, with the plain text of its result.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Entry {
    pub line: i64,
    pub input: String,
    pub output: Option<String>,
}

impl Entry {
    pub fn session(&self) -> i64 {
        PRESENT_SESSION
    }

    fn size(&self) -> usize {
        self.input.len() + self.output.as_ref().map_or(0, String::len)
    }
}

/// Inputs in the order in which they were run.
#[derive(Default)]
pub struct History {
    entries: VecDeque<Entry>,
    size: usize,
}

impl History {
    pub fn push(&mut self, entry: Entry) {
        self.size += entry.size();
        self.entries.push_back(entry);
        while self.size > LIMIT {
            let Some(oldest) = self.entries.pop_front() else { break };
            self.size -= oldest.size();
        }
    }

    /// The last `count`, oldest first.
    pub fn tail(&self, count: usize) -> Vec<&Entry> {
        self.entries.iter().skip(self.entries.len().saturating_sub(count)).collect()
    }

    /// Lines from `start` up to and without `stop`. Sessions other than the present one have no entries.
    pub fn range(&self, session: i64, start: i64, stop: Option<i64>) -> Vec<&Entry> {
        if session != 0 && session != PRESENT_SESSION {
            return Vec::new();
        }
        let wanted = |entry: &&Entry| entry.line >= start && stop.is_none_or(|stop| entry.line < stop);
        self.entries.iter().filter(wanted).collect()
    }

    /// The last `count` whose input fits `pattern`, oldest first; `unique` keeps the latest of equal inputs.
    pub fn search(&self, pattern: &str, count: Option<usize>, unique: bool) -> Vec<&Entry> {
        let pattern: Vec<char> = pattern.chars().collect();
        let mut found: Vec<&Entry> = Vec::new();
        for entry in self.entries.iter().rev() {
            if count.is_some_and(|count| found.len() >= count) {
                break;
            }
            let repeated = unique && found.iter().any(|other| other.input == entry.input);
            if !repeated && fits(&pattern, &entry.input) {
                found.push(entry);
            }
        }
        found.reverse();
        found
    }
}

/// Whether the whole text fits the pattern, where `*` stands for any text and `?` for one character.
fn fits(pattern: &[char], text: &str) -> bool {
    let text: Vec<char> = text.chars().collect();
    let (mut at, mut position) = (0, 0);
    // The last star, and how much text it has taken: going back to it alone suffices, so the time is bounded by
    // the product of the two lengths.
    let mut star: Option<(usize, usize)> = None;
    while position < text.len() {
        match pattern.get(at) {
            Some('*') => {
                star = Some((at, position));
                at += 1;
            }
            Some(&wanted) if wanted == '?' || wanted == text[position] => {
                at += 1;
                position += 1;
            }
            _ => {
                let Some((star_at, taken)) = star else { return false };
                star = Some((star_at, taken + 1));
                at = star_at + 1;
                position = taken + 1;
            }
        }
    }
    pattern[at..].iter().all(|&rest| rest == '*')
}

#[cfg(test)]
mod tests {
    use super::*;

    fn history(inputs: &[&str]) -> History {
        let mut history = History::default();
        for (line, input) in (1..).zip(inputs) {
            history.push(Entry { line, input: (*input).to_owned(), output: None });
        }
        history
    }

    fn lines(entries: Vec<&Entry>) -> Vec<i64> {
        entries.into_iter().map(|entry| entry.line).collect()
    }

    #[test]
    fn tail_range_and_search_give_the_oldest_first() {
        let history = history(&["1+1", "let x = 2", "1+1", "x", "1+2"]);
        assert_eq!(lines(history.tail(2)), [4, 5]);
        assert_eq!(lines(history.tail(99)), [1, 2, 3, 4, 5]);
        assert_eq!(lines(history.range(0, 2, Some(4))), [2, 3]);
        assert_eq!(lines(history.range(1, 4, None)), [4, 5]);
        assert_eq!(lines(history.range(-1, 1, None)), [0; 0]);
        assert_eq!(lines(history.search("1*", None, false)), [1, 3, 5]);
        assert_eq!(lines(history.search("1*", Some(2), false)), [3, 5]);
        assert_eq!(lines(history.search("1*", None, true)), [3, 5]);
        assert_eq!(lines(history.search("nothing*", Some(5), false)), [0; 0]);
    }

    #[test]
    fn patterns_cover_the_whole_input() {
        for (pattern, text, expected) in [
            ("*", "", true),
            ("", "a", false),
            ("a?c", "abc", true),
            ("a?c", "ac", false),
            ("*b*", "abc", true),
            ("a*b*c", "a-b-b-c", true),
            ("a*b", "abc", false),
            ("?", "\u{1d41a}", true),
        ] {
            let pattern_chars: Vec<char> = pattern.chars().collect();
            assert_eq!(fits(&pattern_chars, text), expected, "{pattern} {text}");
        }
    }

    #[test]
    fn the_oldest_inputs_make_room() {
        let mut history = History::default();
        for line in 0..5 {
            history.push(Entry { line, input: "x".repeat(LIMIT / 2), output: None });
        }
        assert_eq!(lines(history.tail(9)), [3, 4]);
    }
}
