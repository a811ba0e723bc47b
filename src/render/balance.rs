//! A heat balance, stream by stream, as text and HTML; and a stream alone.
//!
//! The surprise: enthalpies of streams are counted from the elements at 298.15 K, so only their differences mean heat; the
//! table ends with the three legs that add up to the duty.

use crate::model::caution;
use crate::model::plant::balance::{HeatBalance, StreamRow};
use crate::model::plant::stream::{self, Stream};
use crate::num::math;
use crate::quantity::round;
use crate::render::headline::Headline;
use crate::render::{Bundle, html, text};

/// What the sign of a duty says.
const SIGN: &str = "heat taken up by the contents; negative: to be removed";

/// Five significant digits, without an exponent where a table can do without.
fn number(x: f64) -> String {
    if x == 0.0 {
        return "0".to_owned();
    }
    let digits = 4 - math::log10(x.abs()).floor() as i32;
    if (-1..=9).contains(&digits) { round::fixed(x, digits.clamp(0, 6)) } else { round::significant(x, 5) }
}

fn kelvin(t_k: f64) -> String {
    format!("{} K", round::shortest(round::fixed(t_k, 2).parse().unwrap_or(t_k)))
}

/// A stream in one line, `syngas at 493.15 K: CO(g) 120 kmol/h, H2(g) 260 kmol/h`.
pub fn stream(stream: &Stream) -> Bundle {
    let one = |portion: &crate::model::plant::stream::Portion| {
        format!("{} {}", portion.id(), stream::shown(portion.amount.si, stream.per_time))
    };
    let all = stream.portions.iter().map(one).collect::<Vec<_>>().join(", ");
    let line = format!("{} at {}: {all}", stream.name, kelvin(stream.t.si()));
    Bundle::text(line.clone()).with_text("text/html", html::escaped(&line))
}

/// Stream, species, amount, H of a mole, n H.
type Cells = [String; 5];

fn rows(balance: &HeatBalance) -> Vec<Cells> {
    let of_stream = |stream: &StreamRow, fed: bool| {
        let side = if fed { "fed" } else { "leaving" };
        let species = stream.species.iter().enumerate().map(move |(nth, row)| {
            let name =
                if nth == 0 { format!("{} ({side}), {}", stream.name, kelvin(stream.t_k)) } else { String::new() };
            let (n, _) = stream::in_unit(row.n, balance.per_time);
            [name, row.id.clone(), number(n), round::fixed(row.h / 1000.0, 3), number(row.n * row.h / 1000.0)]
        });
        let total = stream.species.iter().map(|row| row.n).sum();
        let (n, _) = stream::in_unit(total, balance.per_time);
        let sum = [String::new(), "in all".to_owned(), number(n), String::new(), number(stream.sum / 1000.0)];
        species.chain(std::iter::once(sum)).collect::<Vec<_>>()
    };
    let fed = balance.feeds.iter().flat_map(|stream| of_stream(stream, true));
    fed.chain(balance.products.iter().flat_map(|stream| of_stream(stream, false))).collect()
}

fn heads(balance: &HeatBalance) -> Cells {
    let (_, amount) = stream::in_unit(0.0, balance.per_time);
    let energy = if balance.per_time { "kW" } else { "kJ" };
    ["stream".to_owned(), "species".to_owned(), amount.to_owned(), "H, kJ/mol".to_owned(), format!("n H, {energy}")]
}

fn legs(balance: &HeatBalance) -> [(String, &'static str); 3] {
    let energy = if balance.per_time { "kW" } else { "kJ" };
    let words =
        ["feeds brought to 298.15 K", "reaction at 298.15 K", "products brought from 298.15 K to their temperatures"];
    let mut legs = words.map(|words| (String::new(), words));
    for (leg, si) in legs.iter_mut().zip(balance.legs) {
        leg.0 = format!("{} {energy}", number(si / 1000.0));
    }
    legs
}

/// In text and HTML.
pub fn bundle(balance: &HeatBalance) -> Bundle {
    Bundle::text(plain(balance)).with_text("text/html", markup(balance))
}

fn plain(balance: &HeatBalance) -> String {
    let mut table = vec![heads(balance)];
    table.extend(rows(balance));
    let width = |column: usize| table.iter().map(|row| row[column].chars().count()).max().unwrap_or(0);
    let widths: Vec<usize> = (0..5).map(width).collect();
    let duty = Headline::of(&balance.duty).line();
    let cautions = text::cautions(&caution::texts(&balance.duty));
    let mut out = format!("heat balance: {duty}\n  {SIGN}{cautions}\n");
    for row in &table {
        let cell = |(column, cell): (usize, &String)| {
            let missing = " ".repeat(widths[column] - cell.chars().count());
            if column < 2 { format!("{cell}{missing}") } else { format!("{missing}{cell}") }
        };
        let line = row.iter().enumerate().map(cell).collect::<Vec<_>>().join("  ");
        out.push_str(&format!("  {}\n", line.trim_end()));
    }
    out.push_str("  H counted from the elements at 298.15 K\n");
    let legs = legs(balance);
    let widest = legs.iter().map(|(leg, _)| leg.chars().count()).max().unwrap_or(0);
    for (leg, words) in legs {
        out.push_str(&format!("  {}{leg}  {words}\n", " ".repeat(widest - leg.chars().count())));
    }
    out.truncate(out.trim_end().len());
    out
}

fn markup(balance: &HeatBalance) -> String {
    let left = |cell: &str| format!("<td style=\"text-align:left;white-space:nowrap\">{}</td>", html::escaped(cell));
    let right = |cell: &str| {
        format!("<td style=\"text-align:right;white-space:nowrap\">{}</td>", html::escaped(cell).replace('-', "−"))
    };
    let head = heads(balance).into_iter().enumerate().map(|(column, head)| {
        let side = if column < 2 { "left" } else { "right" };
        format!("<th style=\"text-align:{side}\">{}</th>", html::escaped(&head))
    });
    let head: String = head.collect();
    let mut body = String::new();
    for [stream, species, n, h, sum] in rows(balance) {
        body.push_str(&format!(
            "<tr>{}{}{}{}{}</tr>",
            left(&stream),
            left(&species),
            right(&n),
            right(&h),
            right(&sum)
        ));
    }
    let mut path = String::new();
    for (leg, words) in legs(balance) {
        path.push_str(&format!("<tr>{}{}</tr>", right(&leg), left(words)));
    }
    format!(
        "<div class=\"hessbook-balance\"><p>{}<br>{SIGN}</p>{}<table><thead><tr>{head}</tr></thead><tbody>{body}</tbody></table>\
         <p>H counted from the elements at 298.15 K. The duty is the sum of</p><table>{path}</table></div>",
        html::headline(&Headline::of(&balance.duty)),
        html::cautions(&caution::texts(&balance.duty))
    )
}
