//! The name in `mol[CH4(g)]` as the entity it stands for: without phase, charge and counts in one spelling.
//!
//! The surprise: only a phase is taken off the end. `Ca(OH)2` and `butan-2-ol` keep all they have.

use crate::units::dimension::Entity;
use crate::units::exponent::superscript;

/// Phases that may end a name, alone or before a comma with the form: `(cr,alpha-quartz)`, `(aq,undissoc.)`.
const PHASES: [&str; 6] = ["g", "l", "s", "cr", "gl", "aq"];

/// The entity of a name as written in brackets; `None` where nothing is left of it.
pub fn entity(written: &str) -> Option<Entity> {
    let name = plain(written);
    let name = without_phase(&name);
    (!name.is_empty()).then(|| Entity::named(&one_charge(name)))
}

/// Single spaces, ASCII digits and signs.
fn plain(written: &str) -> String {
    let mut out = String::with_capacity(written.len());
    let mut raised = String::new();
    for c in written.trim().chars() {
        match c {
            '⁺' => raised.push('+'),
            '⁻' => raised.push('-'),
            _ if superscript(c).is_some() => raised.extend(superscript(c)),
            _ => {
                flush_raised(&mut out, &mut raised);
                match c {
                    '₀'..='₉' => out.extend(char::from_digit(c as u32 - '₀' as u32, 10)),
                    '−' => out.push('-'),
                    _ if c.is_whitespace() && out.ends_with(' ') => {}
                    _ if c.is_whitespace() => out.push(' '),
                    _ => out.push(c),
                }
            }
        }
    }
    flush_raised(&mut out, &mut raised);
    out
}

fn flush_raised(out: &mut String, raised: &mut String) {
    if !raised.is_empty() {
        out.push('^');
        out.push_str(raised);
        raised.clear();
    }
}

/// Takes off every phase at the end, so that what is left reads the same when it is read again.
fn without_phase(name: &str) -> &str {
    let mut name = name;
    while let Some(open) = last_group(name) {
        let inside = &name[open + 1..name.len() - 1];
        let phase = inside.split(',').next().unwrap_or(inside);
        // A square bracket in there would leave its partner behind.
        if !PHASES.contains(&phase.trim()) || inside.contains(['[', ']']) {
            break;
        }
        name = name[..open].trim_end();
    }
    name
}

/// Where the parenthesis opens that closes at the end of the name.
fn last_group(name: &str) -> Option<usize> {
    let mut open_groups = 0_usize;
    for (at, c) in name.strip_suffix(')')?.char_indices().rev() {
        match c {
            ')' => open_groups += 1,
            '(' if open_groups == 0 => return Some(at),
            '(' => open_groups -= 1,
            _ => {}
        }
    }
    None
}

/// `SO4^2-` is `SO4-2`, and `Na^+` is `Na+`: one spelling, or the same ion would be two entities.
fn one_charge(name: &str) -> String {
    let Some((stem, charge)) = name.split_once('^') else { return name.to_owned() };
    let Some(sign) = charge.chars().last().filter(|c| matches!(c, '+' | '-')) else { return name.to_owned() };
    let count = &charge[..charge.len() - 1];
    if !count.chars().all(|c| c.is_ascii_digit()) {
        return name.to_owned();
    }
    let count = if count == "1" { "" } else { count };
    format!("{stem}{sign}{count}")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn phases_go_and_everything_else_stays() {
        let rows = [
            ("CH4(g)", "CH4"),
            ("H2O(l)", "H2O"),
            ("SiO2(cr,alpha-quartz)", "SiO2"),
            ("H3BO3(aq, undissoc.)", "H3BO3"),
            ("SiO2(gl)", "SiO2"),
            ("Fe2O3(cr,iron(III) oxide)", "Fe2O3"),
            ("CO2(g)(g)", "CO2"),
            ("Ca(OH)2", "Ca(OH)2"),
            ("Ca(OH)2(cr)", "Ca(OH)2"),
            ("(CH3)2CO", "(CH3)2CO"),
            ("iron(III)", "iron(III)"),
            (" acetic   acid ", "acetic acid"),
            ("n-butane", "n-butane"),
            ("SO4-2", "SO4-2"),
            ("SO4-2(aq)", "SO4-2"),
            ("SO4^2-", "SO4-2"),
            ("SO₄²⁻", "SO4-2"),
            ("Na⁺", "Na+"),
            ("Na^1+(aq)", "Na+"),
            ("e-", "e-"),
            ("H2O", "H2O"),
            ("H₂O", "H2O"),
        ];
        for (written, name) in rows {
            assert_eq!(entity(written).map(Entity::name), Some(name), "{written}");
        }
        assert_eq!(entity("rxn"), Some(Entity::RXN));
    }

    #[test]
    fn a_phase_alone_names_nothing() {
        assert_eq!(entity("  "), None);
        assert_eq!(entity("(g)"), None);
    }
}
