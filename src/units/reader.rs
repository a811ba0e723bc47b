//! Units as readers see them, in text, HTML and LaTeX, and the basis in words.
//!
//! The surprise: no form here says what moles are of. A unit symbol carries no such information in print, so it stands
//! beside the quantity as [`basis_words`]; the machine text of the unit keeps it.

use crate::units::dimension::{Base, Dimension, Entity, Of};
use crate::units::parse;
use crate::units::terms::{Term, Terms};
use crate::units::unit::Unit;

/// `kJ/mol`, `J/(K mol)`, `cm³/mol`, `cm⁻¹`; empty for a pure number.
pub fn reader_text(unit: &Unit) -> String {
    let Ok(terms) = parse::terms(&unit.text) else { return unit.text.to_string() };
    let side = |terms: &mut dyn Iterator<Item = &Term>, sign: i32| {
        terms.map(|term| format!("{}{}", shown(term), raised(sign * term.halves))).collect::<Vec<_>>()
    };
    let over = side(&mut terms.over(), 1);
    if over.is_empty() {
        return side(&mut terms.under(), 1).join(" ");
    }
    match side(&mut terms.under(), -1).as_slice() {
        [] => over.join(" "),
        [one] => format!("{}/{one}", over.join(" ")),
        several => format!("{}/({})", over.join(" "), several.join(" ")),
    }
}

/// `kJ&nbsp;mol<sup>−1</sup>`; empty for a pure number.
pub fn reader_html(unit: &Unit) -> String {
    let Ok(terms) = parse::terms(&unit.text) else { return escaped(&unit.text) };
    joined(&terms, "&nbsp;", |term| {
        let shown = shown(term);
        let symbol = match shown.split_once('_') {
            Some((stem, index)) => format!("{stem}<sub>{index}</sub>"),
            None => shown,
        };
        match term.halves {
            2 => symbol,
            halves => format!("{symbol}<sup>{}</sup>", plain_power(halves, "−")),
        }
    })
}

/// `\mathrm{kJ\,mol^{-1}}`; empty for a pure number.
pub fn reader_latex(unit: &Unit) -> String {
    let Ok(terms) = parse::terms(&unit.text) else { return format!("\\text{{{}}}", unit.text) };
    let body = joined(&terms, "\\,", |term| {
        let shown = shown(term);
        let (stem, index) = shown.split_once('_').unwrap_or((&shown, ""));
        let index = if index.is_empty() { String::new() } else { format!("_{{{index}}}") };
        let symbol = format!("{}{index}", latex_letters(stem));
        match term.halves {
            2 => symbol,
            halves => format!("{symbol}^{{{}}}", plain_power(halves, "-")),
        }
    });
    if body.is_empty() { body } else { format!("\\mathrm{{{body}}}") }
}

fn joined(terms: &Terms, separator: &str, each: impl Fn(&Term) -> String) -> String {
    terms.list().iter().map(each).collect::<Vec<_>>().join(separator)
}

fn shown(term: &Term) -> String {
    format!("{}{}", term.prefix.map_or("", |prefix| prefix.shown), term.row.shown)
}

/// A power in raised digits; nothing for 1.
fn raised(halves: i32) -> String {
    if halves == 2 {
        return String::new();
    }
    if halves % 2 != 0 {
        return format!("^({halves}/2)");
    }
    let raise = |c: char| match c {
        '-' => '⁻',
        '1' => '¹',
        '2' => '²',
        '3' => '³',
        digit => char::from_u32('⁰' as u32 + digit as u32 - '0' as u32).unwrap_or(digit),
    };
    (halves / 2).to_string().chars().map(raise).collect()
}

fn plain_power(halves: i32, minus: &str) -> String {
    let size = halves.abs();
    let power = if size % 2 == 0 { (size / 2).to_string() } else { format!("{size}/2") };
    if halves < 0 { format!("{minus}{power}") } else { power }
}

fn latex_letters(symbol: &str) -> String {
    let mut out = String::new();
    for c in symbol.chars() {
        match c {
            '°' => out.push_str("{}^{\\circ}"),
            'Ω' => out.push_str("\\Omega{}"),
            'Å' => out.push_str("\\mathring{A}"),
            'µ' => out.push_str("\\mu{}"),
            '%' => out.push_str("\\%"),
            _ => out.push(c),
        }
    }
    // A power after `\Omega{}` would fall on the empty group.
    out.strip_suffix("{}").map_or(out.clone(), str::to_owned)
}

fn escaped(text: &str) -> String {
    text.replace('&', "&amp;").replace('<', "&lt;").replace('>', "&gt;")
}

/// The basis in words, to stand beside a quantity: "per mole of reaction as written", "per kg of feed".
///
/// A bare mole and, for energies, a bare kilogram say that they do not say. `None` where there is no basis.
pub fn basis_words(dim: &Dimension) -> Option<String> {
    let mut entities = dim.entities().to_vec();
    entities.sort_by_key(|&(of, entity, _)| (of, entity.name()));
    let words = |of_sign: fn(i8) -> bool| -> Vec<String> {
        entities.iter().filter(|e| of_sign(e.2)).map(|&(of, entity, halves)| counted(of, entity, halves)).collect()
    };
    let (over, under) = (words(|halves| halves > 0), words(|halves| halves < 0));
    let mut parts = Vec::new();
    if !over.is_empty() {
        parts.push(over.join(" times "));
    }
    if !under.is_empty() {
        parts.push(format!("per {}", under.join(" and per ")));
    }
    if parts.is_empty() && is_per_bare_kilogram(dim) {
        parts.push("per kg (of what is not said)".to_owned());
    }
    (!parts.is_empty()).then(|| parts.join(" "))
}

fn counted(of: Of, entity: Entity, halves: i8) -> String {
    let unit = if of == Of::Amount { "mole" } else { "kg" };
    let of_what = match entity {
        Entity::OPEN => "(of what is not said)".to_owned(),
        Entity::RXN => "of reaction as written".to_owned(),
        Entity::ELECTRON => "of electrons".to_owned(),
        named => format!("of {}", named.name()),
    };
    match halves.unsigned_abs() {
        2 => format!("{unit} {of_what}"),
        other => format!("({unit} {of_what}) to the power {}", plain_power(other.into(), "")),
    }
}

/// Specific energy, entropy or heat capacity without a word on what the kilogram is of.
fn is_per_bare_kilogram(dim: &Dimension) -> bool {
    let kelvin = dim.halves(Base::Kelvin);
    let rest = Base::ALL.map(|base| dim.halves(base));
    let [metre, kilogram, second, ampere, _, candela] = rest;
    (metre, kilogram, second, ampere, candela) == (4, 0, -4, 0, 0) && matches!(kelvin, 0 | -2)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::units::parse::unit;

    #[test]
    fn a_reader_sees_no_entities() {
        let rows = [
            ("kJ/mol[rxn]", "kJ/mol", "kJ&nbsp;mol<sup>−1</sup>", "\\mathrm{kJ\\,mol^{-1}}"),
            (
                "J/(K mol[CH4])",
                "J/(K mol)",
                "J&nbsp;K<sup>−1</sup>&nbsp;mol<sup>−1</sup>",
                "\\mathrm{J\\,K^{-1}\\,mol^{-1}}",
            ),
            ("cm^3/mol", "cm³/mol", "cm<sup>3</sup>&nbsp;mol<sup>−1</sup>", "\\mathrm{cm^{3}\\,mol^{-1}}"),
            ("1/cm", "cm⁻¹", "cm<sup>−1</sup>", "\\mathrm{cm^{-1}}"),
            ("kcal_th/mol", "kcal_th/mol", "kcal<sub>th</sub>&nbsp;mol<sup>−1</sup>", "\\mathrm{kcal_{th}\\,mol^{-1}}"),
            ("degC", "°C", "°C", "\\mathrm{{}^{\\circ}C}"),
            ("umol", "µmol", "µmol", "\\mathrm{\\mu{}mol}"),
            ("1/ohm", "Ω⁻¹", "Ω<sup>−1</sup>", "\\mathrm{\\Omega^{-1}}"),
            ("m^(1/2)", "m^(1/2)", "m<sup>1/2</sup>", "\\mathrm{m^{1/2}}"),
            ("m^-10", "m⁻¹⁰", "m<sup>−10</sup>", "\\mathrm{m^{-10}}"),
            ("mol[H2O]/mol[rxn]", "mol/mol", "mol&nbsp;mol<sup>−1</sup>", "\\mathrm{mol\\,mol^{-1}}"),
            ("1", "", "", ""),
        ];
        for (machine, text, html, latex) in rows {
            let unit = unit(machine).unwrap();
            assert_eq!(reader_text(&unit), text);
            assert_eq!(reader_html(&unit), html);
            assert_eq!(reader_latex(&unit), latex);
        }
    }

    #[test]
    fn the_basis_stands_in_words() {
        let rows = [
            ("kJ/mol[rxn]", Some("per mole of reaction as written")),
            ("kJ/mol[CH4]", Some("per mole of CH4")),
            ("kJ/kg[feed]", Some("per kg of feed")),
            ("kJ/mol", Some("per mole (of what is not said)")),
            ("kJ/kg", Some("per kg (of what is not said)")),
            ("kJ/(K kg)", Some("per kg (of what is not said)")),
            ("mol[H2O]/mol[rxn]", Some("mole of H2O per mole of reaction as written")),
            ("mol[NaCl]/kg[H2O]", Some("mole of NaCl per kg of H2O")),
            ("C/mol[e-]", Some("per mole of electrons")),
            ("1/mol[A]^2", Some("per (mole of A) to the power 2")),
            ("kJ", None),
            ("bar", None),
        ];
        for (machine, words) in rows {
            assert_eq!(basis_words(&unit(machine).unwrap().dim).as_deref(), words, "{machine}");
        }
    }
}
