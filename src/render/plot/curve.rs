//! Curves over one axis, with a band that marks a limit.
//!
//! The legend stands beside the axes, where it hides nothing, and names each curve by its dash pattern as well as by its
//! colour, so that a print in grey can be read. The surprise: the drawing library does not cut lines at the axes, so that
//! is done here, with the ends interpolated.

use plotters::backend::SVGBackend;
use plotters::chart::{ChartBuilder, ChartContext};
use plotters::coord::Shift;
use plotters::coord::cartesian::Cartesian2d;
use plotters::coord::types::RangedCoordf64;
use plotters::drawing::{DrawingArea, DrawingAreaErrorKind, IntoDrawingArea};
use plotters::element::{PathElement, Rectangle, Text};
use plotters::series::{DashedLineSeries, LineSeries};
use plotters::style::text_anchor::{HPos, Pos, VPos};
use plotters::style::{BLACK, Color, IntoFont, RGBColor, ShapeStyle, TextStyle, WHITE};

use crate::quantity::round;
use crate::render::html;

/// What is drawn.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Picture {
    /// In words, for readers who do not see the picture as much as for those who do.
    pub title: String,
    pub x: Axis,
    pub y: Axis,
    pub curves: Vec<Curve>,
    /// Horizontal, over the whole width.
    pub band: Option<Band>,
}

/// One axis.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Axis {
    /// Quantity and unit: `T / K`.
    pub label: String,
    /// From the curves where not given.
    pub limits: Option<(f64, f64)>,
}

/// One curve, in the numbers of the axes. A point that is not finite is a gap.
#[derive(Clone, Debug, PartialEq)]
pub struct Curve {
    pub name: String,
    pub points: Vec<(f64, f64)>,
}

/// What lies between two values of y.
#[derive(Clone, Debug, PartialEq)]
pub struct Band {
    pub name: String,
    pub from: f64,
    pub to: f64,
}

const WIDTH: u32 = 760;
const HEIGHT: u32 = 380;
const LEGEND: u32 = 230;
const LEGEND_ROW: i32 = 24;

/// The drawing library rounds to whole units, which shows as steps in a curve: it draws on a sheet that is so many times
/// finer, and the picture is shown in pixels.
const FINE: i32 = 8;
const FINE_U: u32 = FINE as u32;

/// How curves are told apart, in the order they come: colour, and dash and gap in pixels, none for a whole line.
const STROKES: [(RGBColor, Option<(i32, i32)>); 7] = [
    (RGBColor(20, 60, 120), None),
    (RGBColor(185, 70, 20), Some((9, 4))),
    (RGBColor(20, 120, 95), Some((3, 3))),
    (RGBColor(125, 50, 130), Some((14, 4))),
    (RGBColor(140, 110, 0), Some((5, 7))),
    (RGBColor(90, 90, 90), Some((2, 6))),
    (RGBColor(190, 30, 80), Some((12, 9))),
];
const SHADE: RGBColor = RGBColor(225, 232, 214);
const GRID: RGBColor = RGBColor(228, 228, 228);

type Chart<'a> = ChartContext<'a, SVGBackend<'a>, Cartesian2d<RangedCoordf64, RangedCoordf64>>;
type Failed = DrawingAreaErrorKind<std::io::Error>;

/// The picture as an SVG element that may stand in a page or be a file.
pub fn svg(picture: &Picture) -> String {
    let mut out = String::new();
    // Drawing into a text fails in no way that an input could bring about.
    draw(picture, &mut out).unwrap_or_else(|error| unreachable!("a text takes every drawing: {error}"));
    let size = |width, height| format!("width=\"{width}\" height=\"{height}\"");
    let out = out.replacen(&size(WIDTH * FINE_U, HEIGHT * FINE_U), &size(WIDTH, HEIGHT), 1);
    let title = format!("<title>{}</title>", html::escaped(&picture.title));
    match out.find('>') {
        Some(end) => format!("{} role=\"img\">{title}{}", &out[..end], out[end + 1..].trim_end()),
        None => out,
    }
}

fn draw(picture: &Picture, out: &mut String) -> Result<(), Failed> {
    let root = SVGBackend::with_string(out, (WIDTH * FINE_U, HEIGHT * FINE_U)).into_drawing_area();
    root.fill(&WHITE)?;
    let (left, right) = root.split_horizontally((WIDTH - LEGEND) * FINE_U);
    let x =
        picture.x.limits.unwrap_or_else(|| spanned(picture.curves.iter().flat_map(|c| &c.points).map(|p| p.0), 0.0));
    let heights = picture.curves.iter().flat_map(|c| &c.points).map(|p| p.1);
    let y = picture.y.limits.unwrap_or_else(|| spanned(heights, 0.05));
    let mut chart: Chart<'_> = ChartBuilder::on(&left)
        .margin(14 * FINE)
        .x_label_area_size(44 * FINE)
        .y_label_area_size(66 * FINE)
        .build_cartesian_2d(x.0..x.1, y.0..y.1)?;
    if let Some(band) = &picture.band {
        let (from, to) = (band.from.clamp(y.0, y.1), band.to.clamp(y.0, y.1));
        chart.draw_series([Rectangle::new([(x.0, from), (x.1, to)], SHADE.filled())])?;
    }
    let tick = |range: (f64, f64)| move |value: &f64| tick_text(*value, range);
    chart
        .configure_mesh()
        .x_desc(picture.x.label.as_str())
        .y_desc(picture.y.label.as_str())
        .x_label_formatter(&tick(x))
        .y_label_formatter(&tick(y))
        .x_labels(8)
        .y_labels(8)
        .axis_desc_style(("sans-serif", 17 * FINE))
        .label_style(("sans-serif", 15 * FINE))
        .max_light_lines(1)
        .bold_line_style(GRID.stroke_width(FINE_U))
        .axis_style(BLACK.stroke_width(FINE_U))
        .set_all_tick_mark_size(5 * FINE)
        .draw()?;
    for (curve, (colour, dash)) in picture.curves.iter().zip(STROKES.iter().cycle()) {
        for run in visible(&curve.points, y) {
            stroke(&mut chart, run, *colour, *dash)?;
        }
    }
    legend(picture, &right)?;
    root.present()
}

fn stroke(
    chart: &mut Chart<'_>,
    run: Vec<(f64, f64)>,
    colour: RGBColor,
    dash: Option<(i32, i32)>,
) -> Result<(), Failed> {
    let style = ShapeStyle::from(colour).stroke_width(2 * FINE_U);
    match dash {
        None => chart.draw_series(LineSeries::new(run, style))?,
        Some((dash, gap)) => chart.draw_series(DashedLineSeries::new(run, dash * FINE, gap * FINE, style))?,
    };
    Ok(())
}

fn legend(picture: &Picture, area: &DrawingArea<SVGBackend<'_>, Shift>) -> Result<(), Failed> {
    let words: TextStyle<'_> =
        ("sans-serif", 16 * FINE).into_font().color(&BLACK).pos(Pos::new(HPos::Left, VPos::Center));
    let mut row = 24 * FINE;
    for (curve, (colour, dash)) in picture.curves.iter().zip(STROKES.iter().cycle()) {
        let style = ShapeStyle::from(colour).stroke_width(2 * FINE_U);
        let (start, end) = (4 * FINE, 40 * FINE);
        match dash {
            None => area.draw(&PathElement::new([(start, row), (end, row)], style))?,
            Some((dash, gap)) => {
                let mut from = start;
                while from < end {
                    area.draw(&PathElement::new([(from, row), ((from + dash * FINE).min(end), row)], style))?;
                    from += (dash + gap) * FINE;
                }
            }
        }
        area.draw(&Text::new(curve.name.as_str(), (48 * FINE, row), words.clone()))?;
        row += LEGEND_ROW * FINE;
    }
    if let Some(band) = &picture.band {
        area.draw(&Rectangle::new([(4 * FINE, row - 7 * FINE), (40 * FINE, row + 7 * FINE)], SHADE.filled()))?;
        area.draw(&Text::new(band.name.as_str(), (48 * FINE, row), words))?;
    }
    Ok(())
}

/// From the smallest to the largest, with some room; an axis of one value gets a width.
fn spanned(values: impl Iterator<Item = f64>, room: f64) -> (f64, f64) {
    let finite = values.filter(|value| value.is_finite());
    let (low, high) = finite.fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), v| (l.min(v), h.max(v)));
    match low <= high {
        false => (0.0, 1.0),
        true if low == high => (low - 0.5 * low.abs().max(1.0), high + 0.5 * high.abs().max(1.0)),
        true => (low - room * (high - low), high + room * (high - low)),
    }
}

/// The parts of a curve between two values of y, cut where it leaves them.
fn visible(points: &[(f64, f64)], y: (f64, f64)) -> Vec<Vec<(f64, f64)>> {
    let mut runs: Vec<Vec<(f64, f64)>> = Vec::new();
    let mut run: Vec<(f64, f64)> = Vec::new();
    for pair in points.windows(2) {
        match cut(pair[0], pair[1], y) {
            Some((from, to)) => {
                if run.last() != Some(&from) {
                    runs.push(std::mem::replace(&mut run, vec![from]));
                }
                run.push(to);
            }
            None => runs.push(std::mem::take(&mut run)),
        }
    }
    runs.push(run);
    runs.retain(|run| run.len() > 1);
    runs
}

/// What of a straight piece lies between two values of y.
fn cut(from: (f64, f64), to: (f64, f64), y: (f64, f64)) -> Option<((f64, f64), (f64, f64))> {
    if ![from.0, from.1, to.0, to.1].iter().all(|number| number.is_finite()) {
        return None;
    }
    let (low, high) = (from.1.min(to.1), from.1.max(to.1));
    if high < y.0 || low > y.1 {
        return None;
    }
    let at = |height: f64| (from.0 + (to.0 - from.0) * (height - from.1) / (to.1 - from.1), height);
    let inside = |point: (f64, f64)| match point.1 {
        h if h < y.0 => at(y.0),
        h if h > y.1 => at(y.1),
        _ => point,
    };
    Some((inside(from), inside(to)))
}

/// A number at an axis: as short as the axis allows, with a true minus sign.
fn tick_text(value: f64, range: (f64, f64)) -> String {
    // What is left of zero after steps of the axis were added up.
    let value = if value.abs() < 1e-9 * (range.1 - range.0) { 0.0 } else { value };
    let text = round::shortest(round::significant(value, 8).parse().unwrap_or(value));
    text.replace('-', "−")
}

#[cfg(test)]
mod tests {
    use super::*;

    fn picture() -> Picture {
        let line = |slope: f64| (0..=10).map(|x| (f64::from(x), slope * f64::from(x))).collect();
        Picture {
            title: "errors < 1 & more".to_owned(),
            x: Axis { label: "T / K".to_owned(), limits: None },
            y: Axis { label: "error / (kJ/mol)".to_owned(), limits: Some((-2.0, 2.0)) },
            curves: vec![
                Curve { name: "held constant".to_owned(), points: line(0.1) },
                Curve { name: "no correction".to_owned(), points: line(-1.0) },
            ],
            band: Some(Band { name: "within 1 kJ/mol".to_owned(), from: -1.0, to: 1.0 }),
        }
    }

    #[test]
    fn a_picture_names_axes_curves_and_band_and_escapes_its_title() {
        let svg = svg(&picture());
        assert!(svg.starts_with("<svg ") && svg.ends_with("</svg>"), "{svg}");
        for words in ["T / K", "error / (kJ/mol)", "held constant", "no correction", "within 1 kJ/mol", "−2"] {
            assert!(svg.contains(words), "{words}");
        }
        assert!(svg.contains("<title>errors &lt; 1 &amp; more</title>"), "{svg}");
    }

    #[test]
    fn a_curve_is_cut_where_it_leaves_the_axes_and_broken_at_a_gap() {
        let y = (-1.0, 1.0);
        let leaving = [(0.0, 0.0), (1.0, 0.5), (2.0, 2.5), (3.0, 2.5), (4.0, 0.5)];
        assert_eq!(visible(&leaving, y), [vec![(0.0, 0.0), (1.0, 0.5), (1.25, 1.0)], vec![(3.75, 1.0), (4.0, 0.5)]]);
        let gap = [(0.0, 0.0), (1.0, 0.0), (2.0, f64::NAN), (3.0, 0.0), (4.0, 0.0)];
        assert_eq!(visible(&gap, y).len(), 2);
        // A steep piece from below to above is cut at both ends.
        assert_eq!(visible(&[(0.0, -2.0), (1.0, 2.0)], y), [vec![(0.25, -1.0), (0.75, 1.0)]]);
    }

    #[test]
    fn no_coordinate_lies_beyond_the_picture() {
        let svg = svg(&picture());
        let numbers =
            svg.split("points=\"").skip(1).flat_map(|rest| rest.split('"').next().unwrap_or("").split([' ', ',']));
        for number in numbers.filter(|text| !text.is_empty()) {
            let number: i64 = number.parse().unwrap();
            assert!((0..=i64::from(WIDTH * FINE_U)).contains(&number), "{number}");
        }
    }

    #[test]
    fn ticks_are_short() {
        let range = (-2.0, 2.0);
        assert_eq!([-1.5, 0.1 + 0.2, 1e-17, 1500.0].map(|v| tick_text(v, range)), ["−1.5", "0.3", "0", "1500"]);
    }
}
