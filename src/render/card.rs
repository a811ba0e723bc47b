//! A formula as help shows it: everything that its card declares, and nothing said twice.

use crate::model::card::{Arg, Card, Default, Takes, listed};
use crate::model::symbols;
use crate::record::register::claim_of;

/// Columns that a line of help may take.
const WIDTH: usize = 100;

/// A card in full.
pub fn card(card: &Card) -> String {
    let mut text = format!("{}\n", card.signature());
    named(&mut text, "", card.doc);
    named(&mut text, "gives", card.gives);
    if !card.args.is_empty() {
        text.push_str("  arguments\n");
        arguments(&mut text, card.args, 4);
    }
    if let Some(formula) = symbols::of(card) {
        named(&mut text, "equation", formula.text);
        let widest = |part: fn(&symbols::Symbol) -> &str| {
            formula.symbols.iter().map(|one| part(one).chars().count()).max().unwrap_or(0)
        };
        let (symbol, unit) = (widest(|one| one.text), widest(|one| one.unit));
        for one in formula.symbols {
            let head = format!("    {}  {}  ", padded(one.text, symbol), padded(one.unit, unit));
            wrapped(&mut text, &head, one.meaning);
        }
    }
    if !card.claims.is_empty() {
        text.push_str("  rests on\n");
        for claim in card.claims {
            let words = claim_of(claim.id).unwrap_or("the claim that the analyst gives with it");
            wrapped(&mut text, &format!("    {}  ", claim.id), words);
        }
    }
    if !card.alternatives.is_empty() {
        text.push_str("  shortcuts that a report prices\n");
        for one in card.alternatives {
            wrapped(&mut text, &format!("    {}  ", one.id), one.words);
        }
    }
    if let Some(caution) = card.caution {
        named(&mut text, "caution", &caution.text());
    }
    named(&mut text, "source", card.source);
    text.push_str("  example\n");
    card.example.lines().for_each(|line| text.push_str(&format!("    {line}\n")));
    text
}

/// Arguments with what they take; the entries of a map of options stand below it.
fn arguments(text: &mut String, args: &[Arg], indent: usize) {
    let widest = args.iter().map(|arg| arg.name.chars().count()).max().unwrap_or(0);
    for arg in args {
        let given = match arg.default {
            Default::Required => String::new(),
            Default::Number(number) => format!(" (may be left out: {number})"),
            Default::NoOptions | Default::Absent => " (may be left out)".to_owned(),
        };
        let head = format!("{}{}  ", " ".repeat(indent), padded(arg.name, widest));
        wrapped(text, &head, &format!("{}: {}{given}", taken(arg.takes), arg.doc));
        if let Takes::Options(inner) | Takes::Maps(inner) = arg.takes {
            arguments(text, inner, indent + 2);
        }
    }
}

/// What an argument takes, in words.
fn taken(takes: Takes) -> String {
    match takes {
        Takes::Quantity { unit } => format!("a quantity in units of {unit}"),
        Takes::AnyQuantity => "a quantity".to_owned(),
        Takes::Temperature => "a temperature".to_owned(),
        Takes::Temperatures => "a temperature, or a grid of them".to_owned(),
        Takes::Number => "a number".to_owned(),
        Takes::Fraction => "a fraction".to_owned(),
        Takes::Text => "a text".to_owned(),
        Takes::Word(words) => format!("one of {}", listed(words.iter().copied())),
        Takes::Quantities => "a list of quantities".to_owned(),
        Takes::Reaction => "a reaction".to_owned(),
        Takes::Streams => "a stream, or a list of them".to_owned(),
        Takes::Maps(_) => "a list of maps".to_owned(),
        Takes::Options(_) => "a map of options".to_owned(),
        Takes::Named { unit } => format!("quantities by name, in units of {unit}"),
        Takes::NamedMaps => "maps of quantities by name".to_owned(),
        Takes::Any => "a value".to_owned(),
    }
}

/// A line of help with its name before it.
pub fn named(text: &mut String, name: &str, words: &str) {
    let head = if name.is_empty() { "  ".to_owned() } else { format!("  {name:<12}") };
    wrapped(text, &head, words);
}

/// Words behind a head, their further lines below the first word.
pub fn wrapped(text: &mut String, head: &str, words: &str) {
    let indent = head.chars().count();
    let mut line = head.to_owned();
    let mut column = indent;
    for word in words.split_whitespace() {
        let length = word.chars().count();
        if column > indent && column + 1 + length > WIDTH {
            text.push_str(line.trim_end());
            text.push('\n');
            line = " ".repeat(indent);
            column = indent;
        }
        if column > indent {
            line.push(' ');
            column += 1;
        }
        line.push_str(word);
        column += length;
    }
    text.push_str(line.trim_end());
    text.push('\n');
}

fn padded(text: &str, width: usize) -> String {
    format!("{text}{}", " ".repeat(width.saturating_sub(text.chars().count())))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::CARDS;

    #[test]
    fn help_holds_all_that_a_card_declares() {
        for one in CARDS {
            let help = card(one);
            let flat = |text: &str| text.split_whitespace().collect::<Vec<_>>().join(" ");
            let help_flat = flat(&help);
            let mut parts = vec![one.signature(), flat(one.doc), flat(one.source), flat(one.example), flat(one.gives)];
            parts.extend(one.args.iter().map(|arg| flat(arg.doc)));
            parts.extend(one.claims.iter().map(|claim| claim.id.to_owned()));
            parts.extend(one.alternatives.iter().map(|one| flat(one.words)));
            for part in parts {
                assert!(help_flat.contains(&part), "{part} is not in\n{help}");
            }
        }
    }

    #[test]
    fn lines_are_broken_between_words_and_go_on_below_the_first() {
        let mut text = String::new();
        wrapped(&mut text, "  ab  ", &"word ".repeat(30));
        let lines: Vec<&str> = text.lines().collect();
        assert_eq!(lines.len(), 2);
        assert!(lines[0].starts_with("  ab  word word") && lines[1].starts_with("      word"));
        assert!(lines.iter().all(|line| line.chars().count() <= WIDTH));
    }
}
