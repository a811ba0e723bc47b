//! A dataset of one's own as it is shown when it is loaded: what it holds, which reactions it serves, and what its records
//! stand before.

use std::fmt::Write as _;

use crate::data::overlay::Precedence;
use crate::data::own::Own;
use crate::render::Bundle;
use crate::render::html::escaped;

/// What was loaded, as text and HTML.
pub fn bundle(own: &Own, told: &[Precedence]) -> Bundle {
    let lines = lines(own, told);
    let text =
        lines.iter().map(|(depth, line)| format!("{}{line}", "  ".repeat(*depth))).collect::<Vec<_>>().join("\n");
    let html = lines.iter().fold(String::from("<div>"), |mut html, (depth, line)| {
        let _ = write!(html, "<div style=\"margin-left:{}em\">{}</div>", 1.5 * *depth as f64, escaped(line));
        html
    });
    Bundle::text(text).with_text("text/html", format!("{html}</div>"))
}

fn counted(count: usize, one: &str) -> String {
    format!("{count} {one}{}", if count == 1 { "" } else { "s" })
}

fn lines(own: &Own, told: &[Precedence]) -> Vec<(usize, String)> {
    let dataset = &own.dataset;
    let parts = [(own.formations.len(), "formation enthalp"), (own.functions.len(), "heat capacit")];
    let mut held: Vec<String> = (parts.iter().filter(|(count, _)| *count > 0))
        .map(|(count, word)| format!("{count} {word}{}", if *count == 1 { "y" } else { "ies" }))
        .collect();
    if !own.transitions.is_empty() {
        held.push(counted(own.transitions.len(), "transition"));
    }
    let file = dataset.tables.first().map_or("", |table| &*table.path);
    let mut lines = vec![
        (0, format!("{} (`{}`), from {file}: {}", dataset.short, dataset.id, held.join(", "))),
        (1, dataset.publication.to_string()),
        (1, format!("terms: {}", dataset.terms)),
    ];
    if !own.formations.is_empty() {
        let ids: Vec<&str> = own.formations.iter().map(|formation| &*formation.id).collect();
        lines.push((1, format!("its formation enthalpies come first in reactions with {}", ids.join(", "))));
        lines.push((
            1,
            match &dataset.extends {
                Some(base) => {
                    format!("for other species of such a reaction {base} serves beside it, as the file declares")
                }
                None => "such a reaction takes all its formation enthalpies from this file, or none".to_owned(),
            },
        ));
    }
    for one in told {
        let verb = if one.hides { "hides" } else { "stands before" };
        let gap = one.in_u.map_or_else(String::new, |gap| format!(" ({:+.1} u apart)", gap));
        lines
            .push((1, format!("{} of {}: {} {verb} {} of {}{gap}", one.what, one.id, one.own, one.other, one.dataset)));
    }
    lines
}
