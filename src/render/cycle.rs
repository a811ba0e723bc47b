//! A cycle as text, HTML and a picture, all from one [`Cycle`].
//!
//! The picture is a ladder of enthalpies: each level is a state, each step between two levels a leg with its number in the
//! table. Its zero is the reactants at T, so that the last level stands at the reaction enthalpy.

use crate::model::cycle::{Cycle, CycleLeg, Happens};
use crate::quantity::round;
use crate::render::headline::Headline;
use crate::render::html::escaped;
use crate::render::plot::ladder::{self, Ladder, Step};
use crate::render::{Bundle, html as html_parts};

/// Decimals of kJ/mol, as in check lines.
const DECIMALS: i32 = 3;

/// In text, HTML and as a picture.
pub fn bundle(cycle: &Cycle) -> Bundle {
    let picture = ladder::svg(&picture(cycle));
    Bundle::text(text(cycle)).with_text("text/html", html(cycle, &picture)).with_text("image/svg+xml", picture)
}

fn title(cycle: &Cycle) -> String {
    format!("cycle of {} at {} K, per mole of reaction as written", cycle.equation, kelvin(cycle.t_k))
}

fn kelvin(t_k: f64) -> String {
    round::shortest(round::significant(t_k, 10).parse().unwrap_or(t_k))
}

fn kilo(si: f64) -> String {
    round::fixed(si / 1000.0, DECIMALS)
}

/// `2 Fe(cr,gamma)`; the equation as it is.
fn species(leg: &CycleLeg) -> String {
    match leg.happens {
        Happens::Reaction => leg.what.clone(),
        _ if leg.nu == 1.0 => leg.what.clone(),
        _ => format!("{} {}", round::shortest(leg.nu), leg.what),
    }
}

fn from_to(leg: &CycleLeg) -> String {
    if leg.from_k == leg.to_k {
        format!("at {} K", kelvin(leg.from_k))
    } else {
        format!("{} K to {} K", kelvin(leg.from_k), kelvin(leg.to_k))
    }
}

/// Number, what happens, to what, where, ΔH in kJ/mol, sources.
fn row(number: usize, leg: &CycleLeg) -> [String; 6] {
    let sources: String = leg.sources.iter().map(|number| format!("[{number}]")).collect();
    [number.to_string(), leg.happens.word().to_owned(), species(leg), from_to(leg), kilo(leg.dh.si()), sources]
}

fn rows(cycle: &Cycle) -> Vec<[String; 6]> {
    let mut rows: Vec<[String; 6]> = (1..).zip(&cycle.legs).map(|(number, leg)| row(number, leg)).collect();
    let none = String::new;
    rows.push([none(), "sum".to_owned(), none(), none(), kilo(cycle.sum.si()), none()]);
    rows
}

/// The reaction enthalpy beside the sum, and what the legs leave open.
fn closing(cycle: &Cycle) -> [String; 2] {
    let open = match cycle.residual == 0.0 {
        true => "the legs add up to it exactly".to_owned(),
        false => {
            format!("the legs leave {} J/mol of it open, which is rounding", round::significant(cycle.residual, 1))
        }
    };
    [Headline::of(&cycle.total).line(), open]
}

const HEADER: [&str; 6] = ["", "leg", "species", "", "ΔH / (kJ/mol)", "sources"];

/// For terminals.
fn text(cycle: &Cycle) -> String {
    let mut all = vec![HEADER.map(ToOwned::to_owned)];
    all.extend(rows(cycle));
    let width = |column: usize| all.iter().map(|row| row[column].chars().count()).max().unwrap_or(0);
    let widths: [usize; 6] = std::array::from_fn(width);
    let mut out = format!("{}\n", title(cycle));
    for row in &all {
        let cell = |column: usize| {
            let gap = " ".repeat(widths[column] - row[column].chars().count());
            // Numbers end at one place.
            if matches!(column, 0 | 4) { format!("{gap}{}", row[column]) } else { format!("{}{gap}", row[column]) }
        };
        out.push_str(&format!("  {}", (0..6).map(cell).collect::<Vec<_>>().join("  ")));
        out.truncate(out.trim_end().len());
        out.push('\n');
    }
    for line in closing(cycle) {
        out.push_str(&format!("  {line}\n"));
    }
    out.push_str("  sources\n");
    for (number, source) in (1..).zip(&cycle.sources) {
        out.push_str(&format!("    [{number}] {source}\n"));
    }
    out.truncate(out.trim_end().len());
    out
}

/// For a notebook's page.
fn html(cycle: &Cycle, picture: &str) -> String {
    let cell = |tag: &str, right: bool, text: &str| {
        let side = if right { "right" } else { "left" };
        format!("<{tag} style=\"text-align:{side}\">{}</{tag}>", escaped(text))
    };
    let line = |tag: &str, row: [String; 6]| {
        let cells: String = row.iter().enumerate().map(|(at, text)| cell(tag, matches!(at, 0 | 4), text)).collect();
        format!("<tr>{cells}</tr>")
    };
    let mut out = format!("<div class=\"hessbook-cycle\"><p>{}</p><table>", escaped(&title(cycle)));
    out.push_str(&line("th", HEADER.map(ToOwned::to_owned)));
    rows(cycle).into_iter().for_each(|row| out.push_str(&line("td", row)));
    let [_, open] = closing(cycle);
    out.push_str("</table>");
    out.push_str(&format!("<p>{}<br>{}</p>", html_parts::headline(&Headline::of(&cycle.total)), escaped(&open)));
    out.push_str(picture);
    out.push_str("<details><summary>Sources</summary><ol>");
    for source in &cycle.sources {
        out.push_str(&format!("<li>{}</li>", escaped(&source.to_string())));
    }
    out.push_str("</ol></details></div>");
    out
}

fn picture(cycle: &Cycle) -> Ladder {
    let step = |leg: &CycleLeg| Step {
        rise: leg.dh.si() / 1000.0,
        name: match leg.happens {
            Happens::Reaction => format!("reaction at {} K", kelvin(leg.from_k)),
            Happens::PhaseChange => format!("{}, {}", species(leg), from_to(leg)),
            Happens::Cooling | Happens::Heating => format!("{}, {}", species(leg), from_to(leg)),
        },
        is_main: leg.happens == Happens::Reaction,
    };
    Ladder {
        title: format!("enthalpy ladder: {}", title(cycle)),
        axis: "H / (kJ/mol), reactants at T = 0".to_owned(),
        steps: cycle.legs.iter().map(step).collect(),
        total: format!("in all {} kJ/mol", kilo(cycle.sum.si())).replace('-', "−"),
    }
}
