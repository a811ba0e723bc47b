//! Shortcuts as text, HTML and pictures: where one serves, and all of them side by side.

use crate::model::review;
use crate::model::shortcut::{Course, SideBySide, Validity};
use crate::quantity::{Quantity, round, text};
use crate::render::headline::Headline;
use crate::render::plot::curve::{self, Axis, Band, Curve, Picture};
use crate::render::{Bundle, html};
use crate::units::reader_text;

/// Where a shortcut stays within a tolerance, and where it is worse than none.
pub fn validity(validity: &Validity) -> Bundle {
    let title = format!("{} for the enthalpy of {}", validity.shortcut.words(), validity.reaction);
    let tolerance = text::shown_plain(&validity.tolerance);
    let list = |pairs: &[(f64, f64)]| match pairs {
        [] => "nowhere".to_owned(),
        pairs => pairs.iter().map(|pair| interval(*pair)).collect::<Vec<_>>().join("; "),
    };
    let mut rows = vec![(format!("within {tolerance}"), list(&validity.intervals))];
    if validity.courses.len() > 1 {
        rows.push(("worse than no correction".to_owned(), list(&validity.worse_than_none)));
    }
    rows.push(("data".to_owned(), interval(validity.range)));
    let width = rows.iter().map(|(name, _)| name.chars().count()).max().unwrap_or(0);
    let lines: String = rows.iter().map(|(name, what)| format!("\n  {name:<width$}  {what}")).collect();
    let cells = |(name, what): &(String, String)| {
        format!(
            "<tr><td style=\"text-align:left\">{}</td><td style=\"text-align:left\">{}</td></tr>",
            html::escaped(name),
            html::escaped(what)
        )
    };
    let table: String = rows.iter().map(cells).collect();
    let picture = picture(&title, &validity.courses, Some((validity.tolerance_si, tolerance)));
    Bundle::text(format!("{title}{lines}")).with_text("text/html", page(&title, &table, picture))
}

/// `200.0 K to 553.9 K`.
fn interval((from, to): (f64, f64)) -> String {
    format!("{} K to {} K", round::fixed(from, 1), round::fixed(to, 1))
}

/// Every shortcut with what it gives and what it is off by.
pub fn side_by_side(ways: &SideBySide) -> Bundle {
    let title = format!("enthalpy of {} at {} K", ways.reaction, round::shortest(ways.t_k));
    let unit = ways.full.unit();
    // As many decimals as the full value is shown with.
    let half_digit = ways.full.shown().half_digit_si / unit.factor;
    let decimals = round::decimals_of_digit(2.0 * half_digit);
    let number = |value: &Quantity| round::fixed(unit.from_si(value.si()), decimals);
    let mut rows = vec![("full integral".to_owned(), number(&ways.full), String::new())];
    for way in &ways.ways {
        let error = review::signed(half_digit, way.error.si() / unit.factor);
        rows.push((way.shortcut.words(), number(&way.value), error));
    }
    let heads = [String::new(), format!("value / ({})", reader_text(&unit)), "off by".to_owned()];
    let mut lines = vec![title.clone()];
    let all: Vec<[String; 3]> = std::iter::once(heads).chain(rows.into_iter().map(|(a, b, c)| [a, b, c])).collect();
    let width = |column: usize| all.iter().map(|row| row[column].chars().count()).max().unwrap_or(0);
    let widths = [width(0), width(1), width(2)];
    for [name, value, error] in &all {
        let line = format!("  {name:<a$}  {value:>b$}  {error:>c$}", a = widths[0], b = widths[1], c = widths[2]);
        lines.push(line.trim_end().to_owned());
    }
    let cell = |text: &String, side: &str| format!("<td style=\"text-align:{side}\">{}</td>", html::escaped(text));
    let row = |[name, value, error]: &[String; 3]| {
        format!("<tr>{}{}{}</tr>", cell(name, "left"), cell(value, "right"), cell(error, "right"))
    };
    let table: String = all.iter().map(row).collect();
    let tolerance =
        ways.tolerance_si.map(|si| (si, format!("{} {}", round::shortest(si / unit.factor), reader_text(&unit))));
    let picture = picture(&title, &ways.courses, tolerance);
    let caveat = Headline::of(&ways.full).line();
    lines.push(format!("  in full: {caveat}"));
    Bundle::text(lines.join("\n")).with_text("text/html", page(&title, &table, picture))
}

fn page(title: &str, table: &str, picture: Option<String>) -> String {
    let picture = picture.unwrap_or_default();
    format!(
        "<div class=\"hessbook-shortcuts\"><p><b>{}</b></p><table>{table}</table>{picture}</div>",
        html::escaped(title)
    )
}

/// The errors against temperature, in kJ/mol. Errors far beyond the tolerance would hide what happens about it, so they
/// are cut at six times the tolerance.
fn picture(title: &str, courses: &[Course], tolerance: Option<(f64, String)>) -> Option<String> {
    if courses.is_empty() {
        return None;
    }
    let kilo = |course: &Course| course.points.iter().map(|(t_k, si)| (*t_k, si / 1000.0)).collect();
    let curves = courses.iter().map(|course| Curve { name: course.shortcut.words(), points: kilo(course) }).collect();
    let largest = courses.iter().flat_map(|c| &c.points).map(|(_, si)| si.abs() / 1000.0).fold(0.0, f64::max);
    let (band, limits) = match tolerance {
        Some((si, words)) => {
            let limit = si / 1000.0;
            let height = 1.05 * largest.min(6.0 * limit).max(2.0 * limit);
            (Some(Band { name: format!("within {words}"), from: -limit, to: limit }), Some((-height, height)))
        }
        None => (None, None),
    };
    Some(curve::svg(&Picture {
        title: format!("Error of shortcuts against temperature, {title}"),
        x: Axis { label: "T / K".to_owned(), limits: None },
        y: Axis { label: "error in ΔrH° / (kJ/mol)".to_owned(), limits },
        curves,
        band,
    }))
}
