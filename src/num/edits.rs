//! How many slips of the fingers lie between two words.

/// Insertions, deletions, replacements and swaps of neighbours that lead from one word to the other (optimal string alignment).
pub fn edits(from: &[char], to: &[char]) -> usize {
    let mut before: Vec<usize> = Vec::new();
    let mut above: Vec<usize> = (0..=to.len()).collect();
    for (i, &f) in from.iter().enumerate() {
        let mut row = vec![i + 1];
        for (j, &t) in to.iter().enumerate() {
            let mut least = (above[j] + usize::from(f != t)).min(above[j + 1] + 1).min(row[j] + 1);
            if i > 0 && j > 0 && f == to[j - 1] && from[i - 1] == t {
                least = least.min(before[j - 1] + 1);
            }
            row.push(least);
        }
        before = std::mem::replace(&mut above, row);
    }
    above[to.len()]
}

/// The same of two texts.
pub fn between(from: &str, to: &str) -> usize {
    let letters = |text: &str| text.chars().collect::<Vec<char>>();
    edits(&letters(from), &letters(to))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn slips_are_counted_and_a_swap_of_neighbours_is_one() {
        for (from, to, count) in [
            ("", "", 0),
            ("", "ba", 2),
            ("ab", "ba", 1),
            ("abm", "bam", 1),
            ("abc", "xyz", 3),
            ("enthlapy", "enthalpy", 1),
            ("Tor", "Torr", 1),
        ] {
            assert_eq!((between(from, to), between(to, from)), (count, count), "{from} {to}");
        }
    }
}
