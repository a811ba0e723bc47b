//! Names near to a mistyped one, for the hint of a fault.
//!
//! [`nearest`] counts the letters to insert, delete, replace or swap, upper and lower case alike.

/// Up to `most` of `names`, nearest first, that are within about a third of the length of `text`.
pub fn nearest<'a>(text: &str, names: impl IntoIterator<Item = &'a str>, most: usize) -> Vec<&'a str> {
    let wanted: Vec<char> = text.to_lowercase().chars().collect();
    let allowed = (wanted.len() / 3).clamp(1, 4);
    let mut near: Vec<(usize, &str)> = names
        .into_iter()
        .filter(|name| name.chars().count().abs_diff(wanted.len()) <= allowed)
        .map(|name| (distance(&wanted, &name.to_lowercase().chars().collect::<Vec<char>>()), name))
        .filter(|&(distance, _)| distance <= allowed)
        .collect();
    near.sort();
    near.dedup();
    if near.first().is_some_and(|&(distance, _)| distance == 0) {
        near.retain(|&(distance, _)| distance == 0); // only the case was wrong
    }
    near.into_iter().take(most).map(|(_, name)| name).collect()
}

/// Insertions, deletions, replacements and swaps of neighbours that lead from one text to the other.
fn distance(left: &[char], right: &[char]) -> usize {
    let mut before: Vec<usize> = Vec::new();
    let mut above: Vec<usize> = (0..=right.len()).collect();
    for (i, &l) in left.iter().enumerate() {
        let mut row = vec![i + 1];
        for (j, &r) in right.iter().enumerate() {
            let mut least = (above[j] + usize::from(l != r)).min(above[j + 1] + 1).min(row[j] + 1);
            if i > 0 && j > 0 && l == right[j - 1] && left[i - 1] == r {
                least = least.min(before[j - 1] + 1);
            }
            row.push(least);
        }
        before = std::mem::replace(&mut above, row);
    }
    above[right.len()]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn slips_of_the_fingers_are_found_and_strangers_are_not() {
        let names = ["methanol(l)", "ethanol(l)", "methanol(g)", "benzene(l)"];
        assert_eq!(nearest("methnaol(l)", names, 3), ["methanol(l)", "ethanol(l)", "methanol(g)"]);
        assert_eq!(nearest("Benzen(l)", names, 3), ["benzene(l)"]);
        assert_eq!(nearest("BENZENE(L)", names, 3), ["benzene(l)"]);
        assert!(nearest("kryptonite(cr)", names, 3).is_empty());
        assert_eq!(distance(&['a', 'b'], &['b', 'a']), 1);
        assert_eq!(distance(&[], &['b', 'a']), 2);
    }
}
