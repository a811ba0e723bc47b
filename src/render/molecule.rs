//! A molecule, its contributions to Cp and a sum of powers as text and HTML.
//!
//! The contributions stand in a table, and on a page with a picture of them over T. The surprise: vibrations that are too
//! many for a picture are drawn as one curve.

use crate::model::molecule::Molecule;
use crate::model::molecule::definition::Motion;
use crate::model::molecule::power_fit::HandedOn;
use crate::model::molecule::shares::{Row, Shares};
use crate::model::solid::Crystal;
use crate::quantity::round;
use crate::render::plot::curve::{Axis, Curve, Picture, svg};
use crate::render::{Bundle, html};

/// What a molecule is made of, in one line.
pub fn bundle(molecule: &Molecule) -> Bundle {
    let definition = molecule.definition();
    let motion = match &definition.motion {
        Motion::Atom => "an atom".to_owned(),
        Motion::Diatomic { .. } => "diatomic".to_owned(),
        Motion::Polyatomic { top, vibrations, torsions } => {
            let shape = if top.len() == 1 { "linear" } else { "nonlinear" };
            let modes: f64 = vibrations.iter().map(|(_, g)| g).sum();
            let turning = match torsions.len() {
                0 => String::new(),
                1 => ", 1 torsion".to_owned(),
                more => format!(", {more} torsions"),
            };
            format!("{shape}, {modes} vibrations{turning}")
        }
    };
    let sigma = if matches!(definition.motion, Motion::Atom) {
        String::new()
    } else {
        format!(", symmetry number {}", definition.symmetry_number)
    };
    let text = format!("molecule of {}: {motion}{sigma}", molecule.text());
    Bundle::text(text.clone()).with_text("text/html", html::escaped(&text))
}

/// What a crystal is made of, in one line.
pub fn crystal(crystal: &Crystal) -> Bundle {
    let modes = crystal.modes.iter().map(|modes| {
        let theta = round::shortest(modes.theta.value);
        format!("{} modes after {}, {theta} K", modes.count, modes.spectrum.word())
    });
    let mut text = format!("crystal of {}: {}", crystal.text(), modes.collect::<Vec<_>>().join(", "));
    if crystal.gamma.is_some() {
        text.push_str(", electrons");
    }
    if crystal.expansion.is_some() {
        text.push_str(", expansion");
    }
    Bundle::text(text.clone()).with_text("text/html", html::escaped(&text))
}

/// Rows as they are read: name, Cp, limit, share of the limit, share of Cp, S.
fn rows(shares: &Shares) -> Vec<[String; 6]> {
    let number = |x: f64| round::fixed(x, 3);
    let percent = |x: f64| round::fixed(100.0 * x, 1);
    let mut rows: Vec<[String; 6]> = Vec::new();
    for row in &shares.rows {
        let (limit, of_limit) = if row.limit > 0.0 {
            (number(row.limit), percent(row.cp / row.limit))
        } else {
            ("-".to_owned(), "-".to_owned())
        };
        let share = percent(row.cp / shares.cp());
        rows.push([row.name.clone(), number(row.cp), limit, of_limit, share, number(row.s)]);
    }
    let of_limit = percent(shares.cp() / shares.limit());
    let total = [
        "together".to_owned(),
        number(shares.cp()),
        number(shares.limit()),
        of_limit,
        percent(1.0),
        number(shares.s()),
    ];
    rows.push(total);
    rows
}

const HEAD: [&str; 6] = ["motion", "Cp", "limit", "% of limit", "% of Cp", "S"];

fn caption(shares: &Shares) -> String {
    let t = round::shortest(round::significant(shares.t_k, 10).parse().unwrap_or(shares.t_k));
    format!("contributions to Cp of {} at {t} K, in J/(K mol); p° = 1 bar, S without nuclear spin", shares.molecule)
}

/// The table, on a page with its picture.
pub fn shares(shares: &Shares) -> Bundle {
    let rows = rows(shares);
    let width = |at: usize| {
        let cells = rows.iter().map(|row| row[at].chars().count());
        cells.chain([HEAD[at].chars().count()]).max().unwrap_or(0)
    };
    let widths: Vec<usize> = (0..HEAD.len()).map(width).collect();
    let line = |cells: &[String; 6]| {
        let rest: Vec<String> =
            cells.iter().zip(&widths).skip(1).map(|(cell, width)| format!("{cell:>width$}")).collect();
        format!("  {:<width$}  {}", cells[0], rest.join("  "), width = widths[0])
    };
    let mut text = format!("{}\n{}\n", caption(shares), line(&HEAD.map(str::to_owned)));
    rows.iter().for_each(|row| text.push_str(&format!("{}\n", line(row))));
    text.truncate(text.trim_end().len());
    let cell = |tag: &str, text: &str, left: bool| {
        let side = if left { "left" } else { "right" };
        format!("<{tag} style=\"text-align:{side}\">{}</{tag}>", html::escaped(text))
    };
    let row = |tag: &str, cells: &[String; 6]| {
        let cells: String = cells.iter().enumerate().map(|(at, text)| cell(tag, text, at == 0)).collect();
        format!("<tr>{cells}</tr>")
    };
    let mut page = format!("<div class=\"hessbook-shares\"><p>{}</p><table>", html::escaped(&caption(shares)));
    page.push_str(&row("th", &HEAD.map(str::to_owned)));
    rows.iter().for_each(|cells| page.push_str(&row("td", cells)));
    page.push_str(&format!("</table>{}</div>", svg(&picture(shares))));
    Bundle::text(text).with_text("text/html", page)
}

/// Curves that a picture tells apart.
const MOST_CURVES: usize = 7;

fn picture(shares: &Shares) -> Picture {
    let curve = |name: &str, values: &[f64]| Curve {
        name: name.to_owned(),
        points: shares.temperatures.iter().copied().zip(values.iter().copied()).collect(),
    };
    let sum = |rows: &[&Row]| {
        let at = |nth: usize| rows.iter().map(|row| row.curve[nth]).sum();
        (0..shares.temperatures.len()).map(at).collect::<Vec<f64>>()
    };
    let all: Vec<&Row> = shares.rows.iter().collect();
    let mut curves = vec![curve("Cp", &sum(&all))];
    if all.len() < MOST_CURVES {
        curves.extend(all.iter().map(|row| curve(&row.name, &row.curve)));
    } else {
        let (vibrations, others): (Vec<&Row>, Vec<&Row>) =
            all.iter().partition(|row| row.name.starts_with("vibration"));
        curves.extend(others.iter().take(MOST_CURVES - 2).map(|row| curve(&row.name, &row.curve)));
        curves.push(curve("all vibrations", &sum(&vibrations)));
    }
    Picture {
        title: format!("What each motion brings to Cp of {}", shares.molecule),
        x: Axis { label: "T / K".to_owned(), limits: None },
        y: Axis { label: "Cp / J K⁻¹ mol⁻¹".to_owned(), limits: None },
        curves,
        band: None,
    }
}

/// The coefficients of a sum of powers, with its error.
pub fn power_fit(fit: &HandedOn) -> Bundle {
    let head = format!(
        "Cp of {} as a sum of powers of T/K, in J/(K mol), from {} K to {} K",
        fit.molecule,
        round::shortest(fit.t_min_k),
        round::shortest(fit.t_max_k)
    );
    let worst = format!(
        "largest deviation from the molecule: {} J/(K mol), at {} K",
        round::significant(fit.worst, 2),
        round::fixed(fit.worst_at_k, 0)
    );
    let anchor = format!(
        "Cp(298.15 K) = {} and S°(298.15 K) = {} J/(K mol), of the molecule itself",
        round::fixed(fit.cp_298, 3),
        round::fixed(fit.s_298, 3)
    );
    let mut text = format!("{head}\n");
    let mut page = format!("<div class=\"hessbook-powers\"><p>{}</p><table>", html::escaped(&head));
    for (power, coefficient) in fit.terms() {
        text.push_str(&format!("  {coefficient:>18}  T^{power}\n"));
        page.push_str(&format!(
            "<tr><td style=\"text-align:right\">{}</td><td style=\"text-align:left\"><i>T</i><sup>{}</sup></td></tr>",
            html::escaped(&coefficient),
            html::escaped(&power.to_string()).replace('-', "−")
        ));
    }
    text.push_str(&format!("  {worst}\n  {anchor}"));
    page.push_str(&format!("</table><p>{}<br>{}</p></div>", html::escaped(&worst), html::escaped(&anchor)));
    Bundle::text(text).with_text("text/html", page)
}
