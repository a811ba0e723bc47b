//! Units whose size is a physical constant, such as E_h and Da: they have one size in every run, whatever constant set an
//! audit takes, and the audit has to say so.
//!
//! A unit is read without knowing of a session, so a set of another year reaches the formulas and not the units. The surprise:
//! of the units that the SI does not define, these two are all that moved between 2018 and 2022.

use crate::quantity::round::shortest;
use crate::units::constants::{Constant, ConstantSet};
use crate::units::parse;

/// Finds a constant in a set.
type Find = fn(&ConstantSet) -> &Constant;

/// Units by their spellings, with the constant that is their size.
const UNITS: [(&[&str], Find); 3] = [
    (&["E_h", "hartree"], |set| &set.hartree),
    (&["Da"], |set| &set.atomic_mass),
    (&["eV"], |set| &set.elementary_charge),
];

/// What an audit has to say of the units that some texts name, where a constant set has another size for them.
pub fn said<'a>(texts: impl Iterator<Item = &'a str> + Clone, sets: [&ConstantSet; 2]) -> Vec<String> {
    let mut told = Vec::new();
    for (spellings, constant) in UNITS {
        for spelling in spellings.iter().filter(|spelling| texts.clone().any(|text| names(text, spelling))) {
            let Ok(unit) = parse::unit(spelling) else { continue };
            let other = sets.into_iter().find(|set| constant(set).value != unit.factor);
            if let Some(set) = other {
                told.push(format!(
                    "the size of {spelling}: it is {} {} in every run, whatever the constant set; that of {} has {}",
                    shortest(unit.factor),
                    constant(set).unit,
                    set.year,
                    shortest(constant(set).value),
                ));
            }
        }
    }
    told
}

/// Whether a text has a unit as a word of its own, with a prefix or without.
fn names(text: &str, spelling: &str) -> bool {
    let words = text.split(|c: char| !c.is_alphanumeric() && c != '_');
    let of_it = |word: &str| {
        word == spelling || (word.ends_with(spelling) && word.len() <= spelling.len() + 3 && parse::unit(word).is_ok())
    };
    words.into_iter().any(of_it)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::units::constants;

    #[test]
    fn a_unit_is_told_of_where_a_text_names_it_and_a_set_has_another_size() {
        let (older, newer) = (constants::set(2018).unwrap(), constants::current());
        let told = |text: &str, set| said([text].into_iter(), [newer, set]);
        let hartree = told("q(\"0.5 E_h\").per_mole()", older);
        assert_eq!(
            hartree,
            ["the size of E_h: it is 4.359744722206e-18 J in every run, whatever the constant set; that of 2018 has \
              4.3597447222071e-18"]
        );
        assert_eq!(told("q(\"16 kDa\")", older).len(), 1);
        assert_eq!(told("q(\"0.5 E_h\")", newer), Vec::<String>::new());
        // The SI defines it, so that no year has another.
        assert_eq!(told("q(\"27.2 eV\")", older), Vec::<String>::new());
        assert_eq!(told("let Dalton = 1; // Darmstadt", older), Vec::<String>::new());
    }
}
