//! Point groups by their Schoenflies symbols, and the symmetry number of rotation that follows.
//!
//! σ is the number of proper rotations: 1 for C1, Cs, Ci and C∞v, n for Cn, Cnv, Cnh, n/2 for Sn, 2n for Dn, Dnh, Dnd, 2 for
//! D∞h, 12 for T, Td, Th, 24 for O, Oh and 60 for I, Ih.
//! Source: G. Herzberg, Molecular Spectra and Molecular Structure II (1945), table 140 (from memory).

/// The symmetry number of a point group; `None` for a text that is none. Infinity is written ∞ or `inf`.
pub fn symmetry_number(symbol: &str) -> Option<f64> {
    let symbol = symbol.replace("inf", "∞");
    match symbol.as_str() {
        "C1" | "Cs" | "Ci" | "C∞v" => return Some(1.0),
        "D∞h" => return Some(2.0),
        "T" | "Td" | "Th" => return Some(12.0),
        "O" | "Oh" => return Some(24.0),
        "I" | "Ih" => return Some(60.0),
        _ => {}
    }
    let mut chars = symbol.chars();
    let family = chars.next()?;
    let rest = chars.as_str();
    let digits = rest.trim_end_matches(|c: char| !c.is_ascii_digit());
    let (n, end): (u32, &str) = (digits.parse().ok()?, &rest[digits.len()..]);
    match (family, end) {
        ('C', "" | "v" | "h") if n >= 2 => Some(f64::from(n)),
        ('D', "" | "h" | "d") if n >= 2 => Some(f64::from(2 * n)),
        ('S', "") if n >= 4 && n % 2 == 0 => Some(f64::from(n / 2)),
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::data::catalog::Catalog;

    #[test]
    fn groups_have_their_numbers() {
        for (symbol, sigma) in [
            ("C1", 1.0),
            ("C2v", 2.0),
            ("C3v", 3.0),
            ("D3d", 6.0),
            ("D6h", 12.0),
            ("S4", 2.0),
            ("Td", 12.0),
            ("Dinfh", 2.0),
            ("C10v", 10.0),
        ] {
            assert_eq!(symmetry_number(symbol), Some(sigma), "{symbol}");
        }
        for symbol in ["", "C", "Q3", "C2x", "D0h", "S3", "c2v", "2C"] {
            assert_eq!(symmetry_number(symbol), None, "{symbol}");
        }
    }

    #[test]
    fn every_shipped_molecule_has_the_number_of_its_group() {
        let catalog = Catalog::shipped();
        let mut seen = 0;
        for molecule in catalog.molecules() {
            if let Some(group) = &molecule.point_group {
                assert_eq!(symmetry_number(group), Some(f64::from(molecule.symmetry_number)), "{}", molecule.id);
                seen += 1;
            }
        }
        assert_eq!(seen, 41);
    }
}
