//! Rows of numbers under their heads, as text and HTML; long ones show their ends.

use crate::render::html::escaped;

/// Rows shown at either end of what is too long to be shown whole.
const ENDS: usize = 4;
/// Rows up to which all are shown.
const WHOLE: usize = 12;

/// A title, lines below it, and the rows that are shown.
pub struct Cells {
    pub title: String,
    pub lines: Vec<String>,
    pub heads: Vec<String>,
    /// `None` where rows were left out.
    pub rows: Vec<Option<Vec<String>>>,
    pub left_out: usize,
}

impl Cells {
    /// Fills in the rows of something that has `count` of them.
    pub fn fill(&mut self, count: usize, row: impl Fn(usize) -> Vec<String>) {
        let shown: Vec<usize> =
            if count <= WHOLE { (0..count).collect() } else { (0..ENDS).chain(count - ENDS..count).collect() };
        for (nth, &at) in shown.iter().enumerate() {
            if nth > 0 && at != shown[nth - 1] + 1 {
                self.rows.push(None);
            }
            self.rows.push(Some(row(at)));
        }
        self.left_out = count - shown.len();
    }

    pub fn text(&self) -> String {
        let mut out = format!("{}\n", self.title);
        for line in &self.lines {
            out.push_str(&format!("  {line}\n"));
        }
        let width = |column: usize| {
            let cells = self.rows.iter().flatten().filter_map(|row| row.get(column));
            cells.chain(&self.heads[column..=column]).map(|cell| cell.chars().count()).max().unwrap_or(0)
        };
        let widths: Vec<usize> = (0..self.heads.len()).map(width).collect();
        let mut line = |cells: &[String]| {
            let padded = cells.iter().zip(&widths).map(|(cell, width)| {
                let missing = width.saturating_sub(cell.chars().count());
                format!("  {}{cell}", " ".repeat(missing))
            });
            out.push_str(padded.collect::<String>().trim_end());
            out.push('\n');
        };
        line(&self.heads);
        for row in &self.rows {
            match row {
                Some(cells) => line(cells),
                None => line(&["…".to_owned()]),
            }
        }
        out.truncate(out.trim_end().len());
        out
    }

    pub fn html(&self) -> String {
        let lines: String = self.lines.iter().map(|line| format!("<br>{}", escaped(line))).collect();
        let mut out = format!("<p>{}{lines}</p><table><thead><tr>", escaped(&self.title));
        for head in &self.heads {
            out.push_str(&format!("<th style=\"text-align:right\">{}</th>", escaped(head)));
        }
        out.push_str("</tr></thead><tbody>");
        for row in &self.rows {
            out.push_str("<tr>");
            match row {
                Some(cells) => {
                    for cell in cells {
                        let cell = escaped(cell).replace('-', "−");
                        out.push_str(&format!("<td style=\"text-align:right;white-space:nowrap\">{cell}</td>"));
                    }
                }
                None => out.push_str(&format!(
                    "<td colspan=\"{}\" style=\"text-align:center\">… {} more</td>",
                    self.heads.len(),
                    self.left_out
                )),
            }
            out.push_str("</tr>");
        }
        out.push_str("</tbody></table>");
        out
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn cells(count: usize) -> Cells {
        let heads = vec!["T / K".to_owned(), "x < 1".to_owned()];
        let mut cells = Cells { title: "a & b".to_owned(), lines: Vec::new(), heads, rows: Vec::new(), left_out: 0 };
        cells.fill(count, |row| vec![row.to_string(), format!("-{row}")]);
        cells
    }

    #[test]
    fn a_long_table_shows_its_ends() {
        let long = cells(100);
        assert_eq!((long.rows.len(), long.left_out), (9, 92));
        assert!(
            long.text()
                .ends_with("\n      3     -3\n      …\n     96    -96\n     97    -97\n     98    -98\n     99    -99")
        );
        let short = cells(12);
        assert!(short.rows.iter().all(Option::is_some) && short.left_out == 0);
    }

    #[test]
    fn nothing_becomes_markup_and_minus_signs_are_true_ones() {
        let html = cells(3).html();
        assert!(html.contains("a &amp; b") && html.contains("x &lt; 1") && html.contains(">−2<"), "{html}");
    }
}
