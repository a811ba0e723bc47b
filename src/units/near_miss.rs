//! Spellings that exist, near one that does not: `KJ`, `joule`, `Tor`.
//!
//! Used only while an error is being made, so it simply tries everything.

use crate::num::edits;
use crate::units::refused::refused;
use crate::units::table::{Row, Spelled, UNITS, spellings};

/// As many as a person will read.
const MOST: usize = 4;

/// Longer texts are not misspelled units.
const LONGEST: usize = 24;

/// Words and forms that people write for a unit.
const WORDS: &[(&str, &str)] = &[
    ("celsius", "degC"),
    ("centigrade", "degC"),
    ("fahrenheit", "degF"),
    ("rankine", "degR"),
    ("deg_c", "degC"),
    ("deg_f", "degF"),
    ("degk", "K"),
    ("°k", "K"),
    ("calorie", "cal_th"),
    ("calories", "cal_th"),
    ("kilocalorie", "kcal_th"),
    ("ha", "E_h"),
    ("eh", "E_h"),
    ("amu", "u"),
    ("litres", "L"),
    ("liter", "L"),
    ("liters", "L"),
    ("meter", "m"),
    ("micron", "um"),
    ("cc", "cm^3"),
    ("ccm", "cm^3"),
    ("wavenumber", "cm^-1"),
    ("gm", "g"),
    ("gms", "g"),
    ("kilo", "kg"),
    ("pound", "lb"),
    ("lbs", "lb"),
    ("lbm", "lb"),
    ("gmol", "mol"),
    ("kgmol", "kmol"),
    ("mole", "mol"),
    ("moles", "mol"),
    ("sec", "s"),
    ("hr", "h"),
    ("hrs", "h"),
    ("mins", "min"),
    ("days", "d"),
    ("atmosphere", "atm"),
    ("atmospheres", "atm"),
    ("percent", "%"),
    ("pct", "%"),
    ("per", "/"),
    ("micromol", "umol"),
    ("inch", "in"),
    ("feet", "ft"),
];

/// Existing spellings near `symbol`, best first; none where nothing is near.
pub fn near(symbol: &str) -> Vec<String> {
    if symbol.chars().count() > LONGEST {
        return Vec::new();
    }
    let lower = symbol.to_lowercase();
    let mut found: Vec<(usize, String)> = Vec::new();
    for &(word, meant) in WORDS {
        if word == lower {
            found.push((0, meant.to_owned()));
        }
    }
    for row in UNITS {
        if named_by(row, &lower) {
            found.push((0, row.symbol().to_owned()));
        }
    }
    // `KCAL`: the symbol meant is refused too, so its readings are what to offer.
    if let Some((entry, prefix)) = refused(&lower) {
        let prefix = prefix.map_or("", |prefix| prefix.symbol);
        found.extend(entry.readings.iter().map(|reading| (0, format!("{prefix}{reading}"))));
    }
    for (spelling, spelled) in spellings() {
        if let Some(distance) = distance(symbol, &lower, &spelling, spelled) {
            found.push((distance, spelling));
        }
    }
    // A stable sort keeps the order of the tables, which has the common units and prefixes first.
    found.sort_by_key(|candidate| candidate.0);
    let mut names: Vec<String> = Vec::new();
    for (_, name) in found {
        if !names.contains(&name) {
            names.push(name);
        }
    }
    names.truncate(MOST);
    names
}

/// `joule`, `joules`, `kelvin`.
fn named_by(row: &Row, lower: &str) -> bool {
    let name = row.name;
    name == lower || lower.strip_suffix('s') == Some(name)
}

/// 1 for another case, then by letters changed; `None` where it is too far or an unusual prefix makes it far-fetched.
fn distance(symbol: &str, lower: &str, spelling: &str, spelled: Spelled) -> Option<usize> {
    let usual = spelled.prefix.is_none_or(|prefix| matches!(prefix.symbol, "k" | "m" | "M" | "c" | "u" | "n" | "G"));
    if spelling.to_lowercase() == lower {
        return Some(if usual { 1 } else { 6 });
    }
    let letters = symbol.chars().count();
    let allowed = match letters {
        0..=2 => 0,
        3..=5 => 1,
        _ => 2,
    };
    // Two texts whose lengths differ by more than this cannot be so near.
    if letters.abs_diff(spelling.chars().count()) > allowed {
        return None;
    }
    let changed = edits::between(symbol, spelling);
    (usual && changed <= allowed).then_some(2 + changed)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_usual_slips_find_what_was_meant() {
        let rows = [
            ("KJ", "kJ"),
            ("kj", "kJ"),
            ("Kj", "kJ"),
            ("Joule", "J"),
            ("joules", "J"),
            ("kelvin", "K"),
            ("Celsius", "degC"),
            ("mole", "mol"),
            ("hr", "h"),
            ("Tor", "Torr"),
            ("kcal_ht", "kcal_th"),
            ("KCAL", "kcal_th"),
            ("BAR", "bar"),
            ("lbs", "lb"),
            ("liter", "L"),
        ];
        for (written, meant) in rows {
            assert_eq!(near(written).first().map(String::as_str), Some(meant), "{written}: {:?}", near(written));
        }
    }

    #[test]
    fn nothing_is_offered_for_what_is_not_near_anything() {
        assert!(near("furlong").is_empty(), "{:?}", near("furlong"));
        assert!(near(&"x".repeat(400)).is_empty());
    }
}
