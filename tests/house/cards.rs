//! Every formula card is complete, and cards and register know the same assumptions.

use std::collections::{BTreeMap, BTreeSet};

use hessbook::model::card::{Arg, Card, Takes};

use crate::source::{Source, is_kebab};

/// The claim of a card that attaches the analyst's own assumptions, whose ids are not ours to list.
const OWN: &str = "own";

/// What is missing in a card.
pub fn gaps(card: &Card) -> Vec<String> {
    let mut found = Vec::new();
    let mut needs = |holds: bool, what: String| {
        if !holds {
            found.push(format!("{}: {what}", card.id));
        }
    };
    let shaped = card.id.split_once('.').is_some_and(|(family, name)| is_kebab(family) && is_kebab(name));
    needs(shaped, "its id is not of the form `family.name`".to_owned());
    for (what, text) in [
        ("name", card.name),
        ("doc", card.doc),
        ("source", card.source),
        ("example", card.example),
        ("gives", card.gives),
    ] {
        needs(!text.trim().is_empty(), format!("no {what}"));
    }
    needs(card.example.contains(&format!("{}(", card.name)), "its example does not call it".to_owned());
    for claim in card.claims {
        needs(is_kebab(claim.id), format!("the claim `{}` is not kebab-case", claim.id));
    }
    for alternative in card.alternatives {
        needs(is_kebab(alternative.id), format!("the alternative `{}` is not kebab-case", alternative.id));
        needs(!alternative.words.trim().is_empty(), format!("the alternative `{}` has no words", alternative.id));
    }
    for problem in undocumented(card.args) {
        needs(false, problem);
    }
    found
}

fn undocumented(args: &[Arg]) -> Vec<String> {
    let mut found = Vec::new();
    for arg in args {
        if arg.name.trim().is_empty() || arg.doc.trim().is_empty() {
            found.push(format!("the argument `{}` has no doc", arg.name));
        }
        match arg.takes {
            Takes::Options(options) | Takes::Maps(options) => found.extend(undocumented(options)),
            Takes::Word([]) => found.push(format!("the argument `{}` has no words to choose from", arg.name)),
            _ => {}
        }
    }
    found
}

/// Ids that two cards share, and calls that two cards answer.
pub fn clashes(cards: &[&Card]) -> Vec<String> {
    let mut found = Vec::new();
    for (nth, card) in cards.iter().enumerate() {
        for other in &cards[..nth] {
            if card.id == other.id {
                found.push(format!("two cards have the id `{}`", card.id));
            }
            let ((least, most), (other_least, other_most)) = (card.arity(), other.arity());
            if (card.on, card.name) == (other.on, other.name) && least.max(other_least) <= most.min(other_most) {
                found.push(format!("`{}` and `{}` answer the same call", other.id, card.id));
            }
        }
    }
    found
}

/// Ids in `Finding::known("...")`, with their places.
pub fn findings(source: &Source) -> Vec<(String, String)> {
    let code = source.code();
    let calls = code.match_indices("Finding::known(").filter_map(|(at, call)| {
        let after = at + call.len();
        let begin = after + (code[after..].len() - code[after..].trim_start().len());
        code[begin..].starts_with('"').then(|| (source.string_at(begin).to_owned(), source.place(at)))
    });
    calls.collect()
}

/// Where cards, findings and the register disagree. `reviewed` are the ids that the review of a report brings in itself.
pub fn register(
    claims: &[(&str, &str)],
    cards: &[&Card],
    findings: &[(String, String)],
    reviewed: &BTreeSet<String>,
) -> Vec<String> {
    let mut found = Vec::new();
    let mut words: BTreeMap<&str, &str> = BTreeMap::new();
    for (id, claim) in claims {
        if words.insert(id, claim).is_some() {
            found.push(format!("the register has `{id}` twice"));
        }
        if !is_kebab(id) || *id == OWN {
            found.push(format!("`{id}` is no id for an assumption"));
        }
        if claim.trim().is_empty() {
            found.push(format!("`{id}` claims nothing"));
        }
        let used = cards.iter().any(|card| card.claims.iter().any(|claim| claim.id == *id));
        if !used && !reviewed.contains(*id) {
            found.push(format!("no card and no review rests on `{id}`"));
        }
    }
    let known = |id: &str| words.contains_key(id);
    for card in cards {
        let unknown = card.claims.iter().filter(|claim| claim.id != OWN && !known(claim.id));
        found.extend(unknown.map(|claim| format!("{}: the register has no `{}`", card.id, claim.id)));
    }
    found.extend(
        findings.iter().filter(|(id, _)| !known(id)).map(|(id, place)| format!("{place}: the register has no `{id}`")),
    );
    found
}

#[cfg(test)]
mod planted {
    use super::*;

    use hessbook::model::card::{Alternative, Claim, Default, On, Value};

    const WHOLE: Card = Card {
        id: "bomb.energy",
        name: "bomb_energy",
        on: On::Nothing,
        args: &[Arg {
            name: "options",
            takes: Takes::Options(&[Arg {
                name: "gas",
                takes: Takes::Word(&["ideal"]),
                default: Default::Absent,
                doc: "gas law",
            }]),
            default: Default::NoOptions,
            doc: "how it is computed",
        }],
        gives: "an energy",
        doc: "Energy of a bomb.",
        source: "invented for this test",
        example: "bomb_energy()",
        claims: &[Claim { id: "ideal-gas", test: |_, _, _| Vec::new() }],
        alternatives: &[Alternative { id: "no-gas", words: "without the gas", value: |_, _, _| None }],
        run: |_, _| Ok(Value::Nothing),
        check_line: None,
        caution: None,
    };

    #[test]
    fn each_gap_in_a_card_is_found() {
        assert_eq!(gaps(&WHOLE), Vec::<String>::new());
        const NO_DOC: &[Arg] = &[Arg { name: "t", takes: Takes::Temperature, default: Default::Required, doc: " " }];
        const INNER: &[Arg] =
            &[Arg { name: "options", takes: Takes::Options(NO_DOC), default: Default::NoOptions, doc: "how" }];
        const NO_WORDS: &[Arg] =
            &[Arg { name: "gas", takes: Takes::Word(&[]), default: Default::Absent, doc: "gas law" }];
        for (what, card) in [
            ("id", Card { id: "energy", ..WHOLE }),
            ("id", Card { id: "bomb.Energy", ..WHOLE }),
            ("name", Card { name: "", example: "(", ..WHOLE }),
            ("doc", Card { doc: "", ..WHOLE }),
            ("source", Card { source: " ", ..WHOLE }),
            ("example", Card { example: "other()", ..WHOLE }),
            ("gives", Card { gives: "", ..WHOLE }),
            ("`t` has no doc", Card { args: NO_DOC, ..WHOLE }),
            ("`t` has no doc", Card { args: INNER, ..WHOLE }),
            ("no words to choose", Card { args: NO_WORDS, ..WHOLE }),
            ("claim", Card { claims: &[Claim { id: "Ideal gas", test: |_, _, _| Vec::new() }], ..WHOLE }),
            (
                "words",
                Card { alternatives: &[Alternative { id: "no-gas", words: "", value: |_, _, _| None }], ..WHOLE },
            ),
        ] {
            let found = gaps(&card);
            assert!(found.len() == 1 && found[0].contains(what), "{what}: {found:?}");
        }
    }

    #[test]
    fn cards_that_clash_are_found() {
        let other = Card { id: "bomb.heat", name: "bomb_heat", ..WHOLE };
        assert_eq!(clashes(&[&WHOLE, &other]), Vec::<String>::new());
        let same_call = Card { id: "bomb.heat", ..WHOLE };
        assert_eq!(clashes(&[&WHOLE, &same_call]).len(), 1);
        let same_id = Card { name: "bomb_heat", ..WHOLE };
        assert_eq!(clashes(&[&WHOLE, &same_id]).len(), 1);
        let on_another = Card { id: "bomb.heat", on: On::Reaction, ..WHOLE };
        assert_eq!(clashes(&[&WHOLE, &on_another]), Vec::<String>::new());
    }

    #[test]
    fn a_register_that_does_not_fit_the_cards_is_found() {
        let claims = [("ideal-gas", "the gases are ideal"), ("together", "all hold together")];
        let reviewed = BTreeSet::from(["together".to_owned()]);
        let source = Source::new(
            "src/model/review.rs",
            "fn f() { Finding::known(\n    \"together\", x); Finding::known(id, x) }",
        );
        let found = findings(&source);
        assert_eq!(found, [("together".to_owned(), "src/model/review.rs:1".to_owned())]);
        let own = Card { id: "bomb.own", claims: &[Claim { id: OWN, test: |_, _, _| Vec::new() }], ..WHOLE };
        assert_eq!(register(&claims, &[&WHOLE, &own], &found, &reviewed), Vec::<String>::new());

        let one = |claims: &[(&str, &str)], cards: &[&Card], findings: &[(String, String)], what: &str| {
            let found = register(claims, cards, findings, &reviewed);
            assert!(found.len() == 1 && found[0].contains(what), "{what}: {found:?}");
        };
        one(&claims, &[], &found, "no card and no review rests on `ideal-gas`");
        one(&claims[1..], &[&WHOLE], &found, "bomb.energy: the register has no `ideal-gas`");
        one(
            &claims,
            &[&WHOLE],
            &[("unheard".to_owned(), "src/x.rs:1".to_owned())],
            "src/x.rs:1: the register has no `unheard`",
        );
        one(&[claims[0], claims[1], claims[1]], &[&WHOLE], &found, "twice");
        one(&[claims[0], ("together", " ")], &[&WHOLE], &found, "claims nothing");
        let odd = Card { claims: &[Claim { id: "Odd", test: |_, _, _| Vec::new() }], ..WHOLE };
        one(&[claims[1], ("Odd", "something")], &[&odd], &found, "no id for an assumption");
    }
}
