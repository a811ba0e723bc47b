//! Names near to a mistyped one, for the hint of a fault.
//!
//! [`nearest`] counts the letters to insert, delete, replace or swap, upper and lower case alike.

use crate::num::edits::edits;

/// Up to `most` of `names`, nearest first, that are within about a third of the length of `text`.
pub fn nearest<'a>(text: &str, names: impl IntoIterator<Item = &'a str>, most: usize) -> Vec<&'a str> {
    let wanted: Vec<char> = text.to_lowercase().chars().collect();
    let allowed = (wanted.len() / 3).clamp(1, 4);
    let mut near: Vec<(usize, &str)> = names
        .into_iter()
        .filter(|name| name.chars().count().abs_diff(wanted.len()) <= allowed)
        .map(|name| (edits(&wanted, &name.to_lowercase().chars().collect::<Vec<char>>()), name))
        .filter(|&(distance, _)| distance <= allowed)
        .collect();
    near.sort();
    near.dedup();
    if near.first().is_some_and(|&(distance, _)| distance == 0) {
        near.retain(|&(distance, _)| distance == 0); // only the case was wrong
    }
    near.into_iter().take(most).map(|(_, name)| name).collect()
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
    }
}
