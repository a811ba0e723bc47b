//! A ladder: levels one after the other, each step between two of them numbered and named beside the axes.
//!
//! Levels are named by their heights, steps by their numbers, so that a print in grey can be read. The surprise: a step may
//! be a thousandth of the highest, so its number stands beside the line between two levels and not on its height.

use plotters::backend::SVGBackend;
use plotters::chart::ChartBuilder;
use plotters::coord::Shift;
use plotters::drawing::{DrawingArea, DrawingAreaErrorKind, IntoDrawingArea};
use plotters::element::{PathElement, Text};
use plotters::style::text_anchor::{HPos, Pos, VPos};
use plotters::style::{BLACK, IntoFont, RGBColor, ShapeStyle, TextStyle, WHITE};

use crate::quantity::round;
use crate::render::html;

/// What is drawn.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Ladder {
    /// In words, for readers who do not see the picture as much as for those who do.
    pub title: String,
    /// Quantity and unit of the heights.
    pub axis: String,
    /// From the level at zero on.
    pub steps: Vec<Step>,
    /// What stands below the names of the steps.
    pub total: String,
}

/// From one level to the next.
#[derive(Clone, Debug, PartialEq)]
pub struct Step {
    pub rise: f64,
    pub name: String,
    /// Drawn stronger: what the others lead to and from.
    pub is_main: bool,
}

const WIDTH: u32 = 860;
/// For the axes alone; names below each other may need more.
const HEIGHT: u32 = 380;
const NAMES: u32 = 400;
const ROW: i32 = 22;

const LEVEL: RGBColor = RGBColor(20, 60, 120);
const RISE: RGBColor = RGBColor(90, 90, 90);
const MAIN: RGBColor = RGBColor(185, 70, 20);
const GRID: RGBColor = RGBColor(228, 228, 228);

type Failed = DrawingAreaErrorKind<std::io::Error>;

/// The picture as an SVG element that may stand in a page or be a file.
pub fn svg(ladder: &Ladder) -> String {
    let mut out = String::new();
    // Drawing into a text fails in no way that an input could bring about.
    draw(ladder, &mut out).unwrap_or_else(|error| unreachable!("a text takes every drawing: {error}"));
    let title = format!("<title>{}</title>", html::escaped(&ladder.title));
    match out.find('>') {
        Some(end) => format!("{} role=\"img\">{title}{}", &out[..end], out[end + 1..].trim_end()),
        None => out,
    }
}

/// The heights of the levels, the first at zero.
fn levels(ladder: &Ladder) -> Vec<f64> {
    let sums = ladder.steps.iter().scan(0.0, |height, step| {
        *height += step.rise;
        Some(*height)
    });
    std::iter::once(0.0).chain(sums).collect()
}

fn draw(ladder: &Ladder, out: &mut String) -> Result<(), Failed> {
    let rows = i32::try_from(ladder.steps.len() + 2).unwrap_or(i32::MAX).saturating_mul(ROW);
    let height = HEIGHT.max(u32::try_from(rows).unwrap_or(HEIGHT).saturating_add(24));
    let root = SVGBackend::with_string(out, (WIDTH, height)).into_drawing_area();
    root.fill(&WHITE)?;
    let (left, right) = root.split_horizontally(WIDTH - NAMES);
    let levels = levels(ladder);
    let (low, high) = levels.iter().fold((0.0_f64, 0.0_f64), |(low, high), level| (low.min(*level), high.max(*level)));
    let room = if high > low { 0.08 * (high - low) } else { 1.0 };
    let (low, high, width) = (low - room, high + room, levels.len() as f64);
    let mut chart = ChartBuilder::on(&left)
        .margin(14)
        .x_label_area_size(10)
        .y_label_area_size(72)
        .build_cartesian_2d(0.0..width, low..high)?;
    chart
        .configure_mesh()
        .disable_x_mesh()
        .x_labels(0)
        .y_desc(ladder.axis.as_str())
        .y_label_formatter(&|value: &f64| tick_text(*value, high - low))
        .y_labels(8)
        .axis_desc_style(("sans-serif", 17))
        .label_style(("sans-serif", 15))
        .max_light_lines(1)
        .bold_line_style(GRID)
        .draw()?;
    let words: TextStyle<'_> = ("sans-serif", 14).into_font().color(&BLACK).pos(Pos::new(HPos::Center, VPos::Bottom));
    for (at, level) in levels.iter().enumerate() {
        let from = at as f64;
        let bar = [(from + 0.15, *level), (from + 0.85, *level)];
        chart.draw_series([PathElement::new(bar, ShapeStyle::from(LEVEL).stroke_width(3))])?;
    }
    for (at, step) in ladder.steps.iter().enumerate() {
        let (from, to) = (at as f64 + 0.85, at as f64 + 1.15);
        let colour = if step.is_main { MAIN } else { RISE };
        let style = ShapeStyle::from(colour).stroke_width(if step.is_main { 2 } else { 1 });
        chart.draw_series([PathElement::new([(from, levels[at]), (to, levels[at + 1])], style)])?;
        let above = levels[at].max(levels[at + 1]) + 0.15 * room;
        let number = Text::new((at + 1).to_string(), (at as f64 + 1.0, above), words.clone());
        chart.draw_series([number])?;
    }
    names(ladder, &right)?;
    root.present()
}

fn names(ladder: &Ladder, area: &DrawingArea<SVGBackend<'_>, Shift>) -> Result<(), Failed> {
    let words = |size: u32, colour: &RGBColor| -> TextStyle<'_> {
        ("sans-serif", size).into_font().color(colour).pos(Pos::new(HPos::Left, VPos::Center))
    };
    let mut row = 24;
    for (number, step) in (1..).zip(&ladder.steps) {
        let line = format!("{number}  {}: {}", step.name, rise_text(step.rise));
        let colour = if step.is_main { MAIN } else { RGBColor(0, 0, 0) };
        area.draw(&Text::new(line, (4, row), words(13, &colour)))?;
        row += ROW;
    }
    area.draw(&Text::new(ladder.total.as_str(), (4, row), words(14, &RGBColor(0, 0, 0))))?;
    Ok(())
}

/// A step's height, with its sign and a true minus.
fn rise_text(rise: f64) -> String {
    let text = round::fixed(rise, 3);
    if let Some(size) = text.strip_prefix('-') { format!("−{size}") } else { format!("+{text}") }
}

/// A number at the axis: as short as the axis allows.
fn tick_text(value: f64, range: f64) -> String {
    // What is left of zero after steps of the axis were added up.
    let value = if value.abs() < 1e-9 * range { 0.0 } else { value };
    round::shortest(round::significant(value, 8).parse().unwrap_or(value)).replace('-', "−")
}

#[cfg(test)]
mod tests {
    use super::*;

    fn ladder(steps: usize) -> Ladder {
        let step = |at: usize| Step { rise: at as f64 - 1.5, name: format!("step < {at}"), is_main: at == 1 };
        Ladder {
            title: "a & b".to_owned(),
            axis: "H / (kJ/mol)".to_owned(),
            steps: (0..steps).map(step).collect(),
            total: "in all 0.5".to_owned(),
        }
    }

    #[test]
    fn every_step_is_numbered_and_named_and_texts_are_escaped() {
        let svg = svg(&ladder(4));
        assert!(svg.starts_with("<svg ") && svg.ends_with("</svg>"), "{svg}");
        for words in ["<title>a &amp; b</title>", "4  step &lt; 3: +1.500", "−1.500", "H / (kJ/mol)", "in all 0.5"] {
            assert!(svg.contains(words), "{words} in {svg}");
        }
    }

    #[test]
    fn a_long_ladder_grows_and_an_empty_or_flat_one_is_drawn() {
        let height = |steps: usize| {
            let svg = svg(&ladder(steps));
            let after = svg.split("height=\"").nth(1).unwrap().to_owned();
            after.split('"').next().unwrap().parse::<u32>().unwrap()
        };
        assert!(height(60) > height(3));
        assert_eq!(height(0), HEIGHT);
        let flat = Ladder { steps: vec![Step { rise: 0.0, name: "none".to_owned(), is_main: true }], ..ladder(0) };
        assert!(svg(&flat).contains("none"));
    }

    #[test]
    fn the_same_ladder_gives_the_same_bytes() {
        assert_eq!(svg(&ladder(7)), svg(&ladder(7)));
    }
}
