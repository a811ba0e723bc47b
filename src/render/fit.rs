//! A fitted or interpolated heat capacity as text, HTML and a picture: what it is, and what is left at each row.
//!
//! The surprise: residuals are shown over u, since a fit is judged by what its rows claim of themselves.

use std::fmt::Write as _;

use crate::model::fit::{Fit, Way};
use crate::num::math;
use crate::quantity::round;
use crate::render::Bundle;
use crate::render::html::escaped;
use crate::render::plot::curve::{self, Axis, Band, Picture};

/// The fit, with its residuals as a table and as a picture.
pub fn bundle(fit: &Fit) -> Bundle {
    let lines = lines(fit);
    let rows = residuals(fit);
    let mut text = lines.join("\n  ");
    let mut html = format!(
        "<div class=\"hessbook-fit\">{}",
        lines.iter().map(|line| format!("<p>{}</p>", escaped(line))).collect::<String>()
    );
    if let Some(rows) = &rows {
        let head = ["T / K", "Cp measured", "Cp fitted", "residual", "residual / u"];
        let _ = write!(text, "\n  {:>9}  {:>12}  {:>10}  {:>9}  {:>12}", head[0], head[1], head[2], head[3], head[4]);
        let _ = write!(
            html,
            "<table><thead><tr>{}</tr></thead><tbody>",
            head.map(|name| format!("<th>{name}</th>")).concat()
        );
        for row in rows {
            let cells = row.cells();
            let _ = write!(
                text,
                "\n  {:>9}  {:>12}  {:>10}  {:>9}  {:>12}",
                cells[0], cells[1], cells[2], cells[3], cells[4]
            );
            let _ = write!(html, "<tr>{}</tr>", cells.map(|cell| format!("<td>{cell}</td>")).concat());
        }
        html.push_str("</tbody></table>");
    }
    html.push_str("</div>");
    let bundle = Bundle::text(text).with_text("text/html", html);
    match rows {
        Some(rows) => bundle.with_text("image/svg+xml", curve::svg(&picture(fit, &rows))),
        None => bundle,
    }
}

/// One row with what the fit leaves of it.
struct Residual {
    t_k: f64,
    measured: f64,
    fitted: f64,
    u: f64,
}

impl Residual {
    fn over_u(&self) -> f64 {
        (self.measured - self.fitted) / self.u
    }

    fn cells(&self) -> [String; 5] {
        let decimals = round::decimals_for(self.u).clamp(0, 6);
        let shown = |value: f64| round::fixed(value, decimals);
        [
            round::fixed(self.t_k, 2),
            shown(self.measured),
            shown(self.fitted),
            shown(self.measured - self.fitted),
            round::fixed(self.over_u(), 1),
        ]
    }
}

/// Nothing for an interpolation, which leaves nothing.
fn residuals(fit: &Fit) -> Option<Vec<Residual>> {
    let Way::Terms { sigma, .. } = &fit.way else { return None };
    let row = |row: &crate::model::fit::Row| Residual {
        t_k: row.t_k,
        measured: row.cp.si(),
        fitted: fit.cp(row.t_k),
        u: row.u.unwrap_or(*sigma),
    };
    Some(fit.rows.iter().map(row).collect())
}

fn lines(fit: &Fit) -> Vec<String> {
    let (low, high) = fit.measured();
    let span = format!("{} rows of {}, {low} K to {high} K", fit.rows.len(), fit.name);
    let Way::Terms { exponents, solved, sigma, chi_square, .. } = &fit.way else {
        let u = if fit.rows.iter().all(|row| row.u.is_some()) { "u of each row carried on" } else { "u not stated" };
        return vec![format!("heat capacity interpolated between {span}; {u}")];
    };
    let weighting = if chi_square.is_some() { "weighted by the u of each row" } else { "all rows alike" };
    let mut lines = vec![format!("heat capacity fitted to {span}, {weighting}")];
    let covariance = solved.covariance();
    let p = exponents.len();
    let u = |j: usize| sigma * math::sqrt(covariance[j * p + j]);
    let terms: Vec<String> = (exponents.iter().zip(solved.coefficients()).enumerate())
        .map(|(j, (exponent, c))| {
            let number = round::with_brackets(c, u(j));
            if *exponent == 0.0 { number } else { format!("{number} (T/298.15 K)^{exponent}") }
        })
        .collect();
    lines.push(format!("Cp/(J/(mol K)) = {}", terms.join(" + ").replace("+ -", "- ")));
    if p > 1 {
        let mut largest: Option<(usize, usize, f64)> = None;
        for j in 0..p {
            for k in 0..j {
                let r = covariance[j * p + k] / math::sqrt(covariance[j * p + j] * covariance[k * p + k]);
                if largest.is_none_or(|(_, _, known)| r.abs() > known.abs()) {
                    largest = Some((k, j, r));
                }
            }
        }
        if let Some((k, j, r)) = largest {
            lines.push(format!(
                "the coefficients are correlated, those of T^{} and T^{} with r = {}; compute with the fit, not with them",
                exponents[k],
                exponents[j],
                round::fixed(r, 4)
            ));
        }
    }
    let freedom = fit.freedom();
    lines.push(match chi_square {
        Some(chi_square) => format!("χ² = {} for {freedom} degrees of freedom", round::significant(*chi_square, 3)),
        None => format!(
            "the rows state no u: their scatter gives {} J/(mol K), with {freedom} degrees of freedom",
            round::significant(*sigma, 2)
        ),
    });
    if let Some(beyond) = fit.beyond_k {
        lines.push(format!("carried on to {beyond} K as asked, where nothing was measured"));
    }
    lines
}

fn picture(fit: &Fit, rows: &[Residual]) -> Picture {
    let largest = rows.iter().map(|row| row.over_u().abs()).fold(3.0, f64::max);
    Picture {
        title: format!("Residuals of the heat capacity fitted to {}, over their standard uncertainty", fit.name),
        x: Axis { label: "T / K".to_owned(), limits: None },
        y: Axis { label: "(measured - fitted) / u".to_owned(), limits: Some((-1.1 * largest, 1.1 * largest)) },
        curves: vec![curve::Curve {
            name: "residual / u".to_owned(),
            points: rows.iter().map(|row| (row.t_k, row.over_u())).collect(),
        }],
        band: Some(Band { name: "within 2 u".to_owned(), from: -2.0, to: 2.0 }),
    }
}
