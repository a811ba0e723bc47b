//! A table of figures with units: named columns, as in a file of comma-separated values.
//!
//! The first line names each column with its unit, `T / K` or `Cp (J/(K mol))`; a column `u(Cp) / (J/(K mol))` holds the
//! standard uncertainties of the column it names, empty where none is stated. Lines that begin with `#` are remarks, and
//! `# source: …` says where the figures are from. [`Table::read`] takes the text; who reads files is above this layer. The
//! surprise: a column without a unit is refused, since a unit that is guessed is how tables go wrong; a pure number says so,
//! `K° / 1`.

use std::rc::Rc;
use std::sync::Arc;

use thiserror::Error;

use crate::fault::{Explain, Fault, Place};
use crate::model::card::Cx;
use crate::quantity::{Quantity, text};
use crate::record::node::{Input, LeafKey};
use crate::source::Citation;
use crate::units::{Kind, Unit, UnitError, parse as unit_parse};

/// Rows between two looks whether the work must end.
const PATIENCE: usize = 512;

/// The mark of a line that holds no figures.
pub const REMARK: char = '#';
/// Begins the remark that says where the figures are from.
pub const SOURCE: &str = "source:";

/// Columns of equal length.
pub struct Table {
    /// As the script named it.
    pub name: Rc<str>,
    columns: Vec<Rc<Column>>,
    /// The remarks, without their marks.
    pub remarks: Vec<String>,
    /// The source that was given when it was read; else its remarks name it.
    pub source: Option<Rc<str>>,
}

/// Figures of one unit.
pub struct Column {
    pub name: Rc<str>,
    pub unit: Arc<Unit>,
    kind: Kind,
    file: Rc<str>,
    /// SI units, one for each row.
    numbers: Vec<f64>,
    /// SI units; `None` where the table states none.
    u: Vec<Option<f64>>,
    /// SI value of one unit in the last digit written.
    digits: Vec<Option<f64>>,
    /// The line of the file that each row stands on.
    lines: Rc<[u64]>,
    place: Option<Place>,
    /// The first of the numbers under which the figures are inputs.
    first: u64,
    citation: Citation,
}

/// What is wrong with a table.
#[derive(Clone, Debug, Error)]
pub enum TableError {
    #[error("{file} has no line that names the columns")]
    NoHead { file: String },
    #[error("{file} names its columns and has no rows")]
    NoRows { file: String },
    #[error("{file}, line {line}: column {nth}, `{head}`, has no unit")]
    UnitMissing { file: String, line: u64, nth: usize, head: String },
    #[error("{file}, line {line}: column {nth}, `{head}`: {why}")]
    Unit { file: String, line: u64, nth: usize, head: String, why: Box<UnitError> },
    #[error("{file}, line {line}: two columns are called `{name}`")]
    Twice { file: String, line: u64, name: String },
    #[error("{file}, line {line}: `u({name})` is the uncertainty of a column that is not there")]
    UncertaintyOfNothing { file: String, line: u64, name: String },
    #[error("{file}, line {line}: `u({name})` is in {u}, and `{name}` in {unit}")]
    UncertaintyUnit { file: String, line: u64, name: String, u: String, unit: String },
    #[error("{file}, line {line}: {found} cells, and {wanted} columns are named")]
    Width { file: String, line: u64, found: usize, wanted: usize },
    #[error("{file}, line {line}, column {nth} ({name}): `{cell}` is no number")]
    Cell { file: String, line: u64, nth: usize, name: String, cell: String },
    #[error("{file}, line {line}, column {nth} ({name}): the cell is empty")]
    Empty { file: String, line: u64, nth: usize, name: String },
    #[error("{file}, line {line}, column {nth} ({name}): an uncertainty of {cell} is negative")]
    Negative { file: String, line: u64, nth: usize, name: String, cell: String },
    #[error(
        "{file}, line {line}, column {nth} ({name}): its uncertainty stands in brackets and in a column of its own"
    )]
    UncertaintyTwice { file: String, line: u64, nth: usize, name: String },
    #[error("{file} has no column `{name}`")]
    NoColumn { file: String, name: String, known: String },
    #[error("{file} has {count} columns besides `{x}`, so which one the curve shows must be said")]
    WhichColumn { file: String, x: String, count: usize, known: String },
    #[error("`{name}` of {file} is in {unit}, and a curve goes over temperatures")]
    NotTemperatures { file: String, name: String, unit: String },
    #[error("{file}, line {line}: {t_k} K does not lie above the {before_k} K of the row before it")]
    NotAscending { file: String, line: u64, t_k: f64, before_k: f64 },
    #[error("{file}, line {line}: {t_k} K is not a temperature above absolute zero")]
    NotPositive { file: String, line: u64, t_k: f64 },
    #[error("{file} has one row, and a curve has two at least")]
    OneRow { file: String },
}

impl Explain for TableError {
    fn code(&self) -> &'static str {
        match self {
            TableError::NoHead { .. } => "table-without-head",
            TableError::NoRows { .. } => "table-without-rows",
            TableError::UnitMissing { .. } => "column-without-unit",
            TableError::Unit { .. } => "column-unit-unreadable",
            TableError::Twice { .. } => "column-twice",
            TableError::UncertaintyOfNothing { .. } => "column-of-uncertainty-alone",
            TableError::UncertaintyUnit { .. } => "column-of-uncertainty-unit",
            TableError::Width { .. } => "row-width",
            TableError::Cell { .. } => "cell-not-a-number",
            TableError::Empty { .. } => "cell-empty",
            TableError::Negative { .. } => "cell-uncertainty-negative",
            TableError::UncertaintyTwice { .. } => "cell-uncertainty-twice",
            TableError::NoColumn { .. } => "column-unknown",
            TableError::WhichColumn { .. } => "column-not-said",
            TableError::NotTemperatures { .. } => "column-no-temperatures",
            TableError::NotAscending { .. } => "rows-not-ascending",
            TableError::NotPositive { .. } => "row-temperature-not-positive",
            TableError::OneRow { .. } => "table-of-one-row",
        }
    }

    fn hint(&self) -> String {
        match self {
            TableError::NoHead { .. } => {
                "begin with the names and units of the columns, as in `T / K,Cp / (J/(K mol[CH4])),u(Cp) / (J/(K mol[CH4]))`"
                    .to_owned()
            }
            TableError::NoRows { .. } => "add the figures below the line that names the columns".to_owned(),
            TableError::UnitMissing { head, .. } => {
                format!("write its unit behind a stroke, as in `{head} / K`; a pure number is in units of 1, `{head} / 1`")
            }
            TableError::Unit { why, .. } => why.hint(),
            TableError::Twice { .. } => "give each column a name of its own".to_owned(),
            TableError::UncertaintyOfNothing { .. } => {
                "call it by the name of the column it belongs to, or by another name without u(…)".to_owned()
            }
            TableError::UncertaintyUnit { unit, .. } => format!("give the uncertainty in {unit}, or in a multiple of it"),
            TableError::Width { .. } => {
                "give each row one cell for each column; a name or unit that holds a comma is put in double quotes".to_owned()
            }
            TableError::Cell { .. } => {
                "write a plain number with a decimal point, as in `-41.166`, `1.5e-3` or `75.29(4)`; its unit stands in the \
                 first line"
                    .to_owned()
            }
            TableError::Empty { .. } => {
                "fill it, or leave the row out; only an uncertainty may be empty, where none is stated".to_owned()
            }
            TableError::Negative { .. } => "give its size, without a sign".to_owned(),
            TableError::UncertaintyTwice { .. } => "keep one of the two".to_owned(),
            TableError::NoColumn { known, .. } | TableError::WhichColumn { known, .. } => {
                format!("its columns are {known}")
            }
            TableError::NotTemperatures { .. } => {
                "name the column of temperatures as the second argument, `table.curve(\"Cp\", \"T\")`".to_owned()
            }
            TableError::NotAscending { .. } => {
                "sort the rows by temperature, and keep one row, or the mean, of those that share one".to_owned()
            }
            TableError::NotPositive { .. } => "check the sign and the unit of the column".to_owned(),
            TableError::OneRow { .. } => "take the figure itself, `table.column(\"Cp\")[0]`".to_owned(),
        }
    }
}

/// A column as its head names it.
struct Head {
    name: String,
    unit: Unit,
    /// The column whose uncertainties these are.
    of: Option<String>,
}

/// What a cell says, in SI units.
struct Cell {
    si: f64,
    u: Option<f64>,
    digit: Option<f64>,
    kind: Kind,
}

/// Where a cell stands, for messages.
struct Spot<'a> {
    file: &'a str,
    line: u64,
    nth: usize,
    name: &'a str,
}

impl Table {
    /// Reads a table. `file` names it in messages; `source` says where the figures are from, in place of the file's own word.
    ///
    /// # Errors
    /// See [`TableError`]; the line and the column are named.
    pub fn read(cx: &Cx, file: &str, content: &str, source: Option<&str>) -> Result<Table, Fault> {
        let content = content.strip_prefix('\u{feff}').unwrap_or(content).replace("\r\n", "\n");
        let content = content.trim_end_matches('\n').to_owned() + "\n";
        let remarks: Vec<String> =
            content.lines().filter_map(|line| line.strip_prefix(REMARK)).map(|line| line.trim().to_owned()).collect();
        let mut rows = csv::ReaderBuilder::new()
            .has_headers(false)
            .flexible(true)
            .comment(Some(REMARK as u8))
            .trim(csv::Trim::All)
            .delimiter(delimiter(&content))
            .from_reader(content.as_bytes());
        let (mut heads, mut cells, mut lines): (Vec<Head>, Vec<Vec<Cell>>, Vec<u64>) = Default::default();
        let mut record = csv::StringRecord::new();
        // The text is UTF-8 and rows may differ in width, so the reader has nothing left to refuse.
        while rows.read_record(&mut record).unwrap_or_else(|error| unreachable!("a text is read as it is: {error}")) {
            // A record's own position is where the remarks before it begin.
            let line = rows.position().line() - 1;
            if heads.is_empty() {
                heads = heads_of(file, line, &record)?;
                cells.resize_with(heads.len(), Vec::new);
                continue;
            }
            if lines.len() % PATIENCE == 0
                && let Some(halt) = (cx.halted)()
            {
                return Err(halt);
            }
            if record.len() != heads.len() {
                let (found, wanted) = (record.len(), heads.len());
                return Err(TableError::Width { file: file.to_owned(), line, found, wanted }.into());
            }
            for (nth, (cell, head)) in record.iter().zip(&heads).enumerate() {
                cells[nth].push(cell_of(cell, head, &Spot { file, line, nth: nth + 1, name: &head.name })?);
            }
            lines.push(line);
        }
        if heads.is_empty() {
            return Err(TableError::NoHead { file: file.to_owned() }.into());
        }
        if lines.is_empty() {
            return Err(TableError::NoRows { file: file.to_owned() }.into());
        }
        let said: Vec<&str> = remarks.iter().filter_map(|remark| remark.strip_prefix(SOURCE)).map(str::trim).collect();
        let said = source.map_or_else(|| said.join("; "), str::to_owned);
        let citation =
            if said.is_empty() { Citation::new(file, "") } else { Citation::new(said, format!("read from {file}")) };
        columns(cx, file, heads, cells, lines.into(), &citation).map(|columns| Table {
            name: file.into(),
            columns,
            remarks,
            source: source.map(Rc::from),
        })
    }

    pub fn columns(&self) -> &[Rc<Column>] {
        &self.columns
    }

    pub fn rows(&self) -> usize {
        self.columns.first().map_or(0, |column| column.len())
    }

    /// A column by its name.
    ///
    /// # Errors
    /// It has none of that name.
    pub fn column(&self, name: &str) -> Result<&Rc<Column>, TableError> {
        self.columns.iter().find(|column| &*column.name == name).ok_or_else(|| TableError::NoColumn {
            file: self.name.to_string(),
            name: name.to_owned(),
            known: self.known(),
        })
    }

    /// The one column besides `x`.
    ///
    /// # Errors
    /// There are several, or none.
    pub fn only_besides(&self, x: &Column) -> Result<&Rc<Column>, TableError> {
        let mut others = self.columns.iter().filter(|column| column.name != x.name);
        match (others.next(), others.count()) {
            (Some(only), 0) => Ok(only),
            (first, more) => Err(TableError::WhichColumn {
                file: self.name.to_string(),
                x: x.name.to_string(),
                count: more + usize::from(first.is_some()),
                known: self.known(),
            }),
        }
    }

    fn known(&self) -> String {
        crate::model::card::listed(self.columns.iter().map(|column| &*column.name))
    }
}

/// What parts the cells: a tab or a semicolon where the head has one, for a table written where the decimal mark is a comma.
fn delimiter(content: &str) -> u8 {
    let head = content.lines().find(|line| !line.trim().is_empty() && !line.starts_with(REMARK)).unwrap_or("");
    [b'\t', b';'].into_iter().find(|mark| head.contains(*mark as char)).unwrap_or(b',')
}

fn heads_of(file: &str, line: u64, record: &csv::StringRecord) -> Result<Vec<Head>, TableError> {
    let mut heads: Vec<Head> = Vec::with_capacity(record.len());
    for (nth, head) in (1..).zip(record.iter()) {
        let (name, unit) = parted(head);
        let (file, head) = (|| file.to_owned(), || head.to_owned());
        let Some(unit) = unit.filter(|unit| !unit.is_empty() && !name.is_empty()) else {
            return Err(TableError::UnitMissing { file: file(), line, nth, head: head() });
        };
        let unit = unit_parse::unit(unit).map_err(|why| TableError::Unit {
            file: file(),
            line,
            nth,
            head: head(),
            why: Box::new(why),
        })?;
        if heads.iter().any(|known| known.name == name) {
            return Err(TableError::Twice { file: file(), line, name: name.to_owned() });
        }
        let of = name.strip_prefix("u(").and_then(|rest| rest.strip_suffix(')')).map(|of| of.trim().to_owned());
        heads.push(Head { name: name.to_owned(), unit, of });
    }
    for head in &heads {
        let Some(of) = &head.of else { continue };
        let Some(value) = heads.iter().find(|value| value.name == *of && value.of.is_none()) else {
            return Err(TableError::UncertaintyOfNothing { file: file.to_owned(), line, name: of.clone() });
        };
        if value.unit.dim != head.unit.dim {
            let (u, unit) = (head.unit.text.to_string(), value.unit.text.to_string());
            return Err(TableError::UncertaintyUnit { file: file.to_owned(), line, name: of.clone(), u, unit });
        }
    }
    Ok(heads)
}

/// Name and unit of a column: `T / K`, `Cp/(J/(K mol))`, `Cp (J/(K mol))` or `p [bar]`.
fn parted(head: &str) -> (&str, Option<&str>) {
    let head = head.trim();
    let mut depth = 0_i32;
    for (at, c) in head.char_indices() {
        match c {
            '(' | '[' | '{' => depth += 1,
            ')' | ']' | '}' => depth -= 1,
            '/' if depth == 0 => return (head[..at].trim(), Some(bare(head[at + 1..].trim()))),
            _ => {}
        }
    }
    // Brackets behind a space hold the unit; those of `u(T)` or `CO2(g)` do not stand apart.
    let opens = head.char_indices().filter(|(at, c)| matches!(c, '(' | '[') && head[..*at].ends_with(' '));
    for (at, _) in opens {
        let unit = bare(&head[at..]);
        if unit.len() < head.len() - at {
            return (head[..at].trim(), Some(unit));
        }
    }
    (head, None)
}

/// A text without the one pair of brackets around all of it.
fn bare(text: &str) -> &str {
    let inside = [('(', ')'), ('[', ']')]
        .into_iter()
        .find_map(|(open, close)| text.strip_prefix(open).and_then(|rest| rest.strip_suffix(close)));
    let Some(inside) = inside else { return text };
    let mut depth = 0_i32;
    for c in inside.chars() {
        match c {
            '(' | '[' => depth += 1,
            ')' | ']' => depth -= 1,
            _ => {}
        }
        if depth < 0 {
            return text; // The first bracket closes before the end.
        }
    }
    inside.trim()
}

fn cell_of(cell: &str, head: &Head, spot: &Spot<'_>) -> Result<Cell, Fault> {
    let (file, line, nth, name) = (|| spot.file.to_owned(), spot.line, spot.nth, || spot.name.to_owned());
    let no_number = || TableError::Cell { file: file(), line, nth, name: name(), cell: cell.to_owned() };
    if cell.is_empty() {
        return match &head.of {
            Some(_) => Ok(Cell { si: f64::NAN, u: None, digit: None, kind: Kind::PLAIN }),
            None => Err(TableError::Empty { file: file(), line, nth, name: name() }.into()),
        };
    }
    // Whatever has other letters is a word, or a number with a unit of its own.
    if !cell.chars().all(|c| c.is_ascii_digit() || "+-−.eE()".contains(c)) {
        return Err(no_number().into());
    }
    if head.of.is_some() {
        let number: f64 = cell.replace('−', "-").parse().ok().filter(|u: &f64| u.is_finite()).ok_or_else(no_number)?;
        if number < 0.0 {
            return Err(TableError::Negative { file: file(), line, nth, name: name(), cell: cell.to_owned() }.into());
        }
        return Ok(Cell { si: number * head.unit.factor.abs(), u: None, digit: None, kind: Kind::PLAIN });
    }
    let value = text::parse(&format!("{cell} {}", head.unit.text), None, 0).map_err(|_| no_number())?;
    let input = value.node().input();
    let (u, digit) = input.map_or((None, None), |input| (input.u, input.digit));
    Ok(Cell { si: value.si(), u, digit, kind: value.kind().clone() })
}

fn columns(
    cx: &Cx,
    file: &str,
    heads: Vec<Head>,
    cells: Vec<Vec<Cell>>,
    lines: Rc<[u64]>,
    citation: &Citation,
) -> Result<Vec<Rc<Column>>, Fault> {
    let position = |name: &str| heads.iter().position(|head| head.of.as_deref() == Some(name));
    let mut made = Vec::new();
    for (nth, head) in heads.iter().enumerate().filter(|(_, head)| head.of.is_none()) {
        let stated = position(&head.name).map(|at| &cells[at]);
        let mut u: Vec<Option<f64>> = Vec::with_capacity(lines.len());
        for (row, cell) in cells[nth].iter().enumerate() {
            let of_column = stated.map(|cells| cells[row].si).filter(|u| !u.is_nan());
            if let (Some(_), Some(_)) = (of_column, cell.u) {
                let (file, line, name) = (file.to_owned(), lines[row], head.name.clone());
                return Err(TableError::UncertaintyTwice { file, line, nth: nth + 1, name }.into());
            }
            u.push(of_column.or(cell.u));
        }
        let first = cx.ordinal.get();
        cx.ordinal.set(first + lines.len() as u64);
        made.push(Rc::new(Column {
            name: head.name.as_str().into(),
            unit: Arc::new(head.unit.clone()),
            kind: cells[nth][0].kind.clone(),
            file: file.into(),
            numbers: cells[nth].iter().map(|cell| cell.si).collect(),
            u,
            digits: cells[nth].iter().map(|cell| cell.digit).collect(),
            lines: Rc::clone(&lines),
            place: cx.place.clone(),
            first,
            citation: citation.clone(),
        }));
    }
    Ok(made)
}

impl Column {
    pub fn len(&self) -> usize {
        self.numbers.len()
    }

    /// A table has a row at least.
    pub fn is_empty(&self) -> bool {
        self.numbers.is_empty()
    }

    /// The figures in SI units.
    pub fn numbers(&self) -> &[f64] {
        &self.numbers
    }

    /// Their standard uncertainties in SI units; `None` where the table states none.
    pub fn uncertainties(&self) -> &[Option<f64>] {
        &self.u
    }

    pub fn kind(&self) -> &Kind {
        &self.kind
    }

    pub fn citation(&self) -> &Citation {
        &self.citation
    }

    /// A figure as an input, with its uncertainty and source.
    pub fn value(&self, row: usize) -> Quantity {
        let name = format!("{} of {}, line {}", self.name, self.file, self.lines[row]);
        let input = Input {
            u: self.u[row],
            digit: self.digits[row],
            label: Some(name.into()),
            unit: Some(Arc::clone(&self.unit)),
            citation: Some(self.citation.clone()),
            ..Input::of(LeafKey::Typed { place: self.place.clone(), ordinal: self.first + row as u64 })
        };
        let (dim, kind) = (self.unit.dim.clone(), self.kind.clone());
        let value = Quantity::input(self.numbers[row], dim, kind, input, self.place.clone());
        value.unwrap_or_else(|_| unreachable!("a cell was read as a number")).in_unit(Some(Arc::clone(&self.unit)))
    }

    /// That the column holds temperatures which ascend, as a curve goes over.
    ///
    /// # Errors
    /// It does not; the line is named.
    pub fn ascends(&self) -> Result<(), TableError> {
        let file = || self.file.to_string();
        if !self.kind.what.is_temperature() {
            let unit = self.unit.text.to_string();
            return Err(TableError::NotTemperatures { file: file(), name: self.name.to_string(), unit });
        }
        if self.len() < 2 {
            return Err(TableError::OneRow { file: file() });
        }
        if self.numbers[0] <= 0.0 {
            return Err(TableError::NotPositive { file: file(), line: self.lines[0], t_k: self.numbers[0] });
        }
        let row = (1..self.len()).find(|row| self.numbers[*row] <= self.numbers[row - 1]);
        match row {
            Some(row) => Err(TableError::NotAscending {
                file: file(),
                line: self.lines[row],
                t_k: self.numbers[row],
                before_k: self.numbers[row - 1],
            }),
            None => Ok(()),
        }
    }
}

#[cfg(test)]
mod tests {
    use std::cell::Cell as Counter;

    use super::*;
    use crate::model::card::References;
    use crate::units::constants;

    fn read(content: &str) -> Result<Table, Fault> {
        let (references, ordinal) = (References::new(constants::current()), Counter::new(0));
        let cx = Cx { references: &references, place: None, ordinal: &ordinal, halted: &|| None };
        Table::read(&cx, "cp.csv", content, None)
    }

    #[test]
    fn names_and_units_are_told_apart_in_all_the_usual_ways() {
        let rows = [
            ("T / K", ("T", Some("K"))),
            ("T/K", ("T", Some("K"))),
            ("Cp / (J/(K mol[CH4]))", ("Cp", Some("J/(K mol[CH4])"))),
            ("enthalpy (kJ/mol[rxn])", ("enthalpy", Some("kJ/mol[rxn]"))),
            ("p [bar]", ("p", Some("bar"))),
            ("u(Cp) / (J/(K mol))", ("u(Cp)", Some("J/(K mol)"))),
            ("u(Cp) (J/(K mol))", ("u(Cp)", Some("J/(K mol)"))),
            ("v / (m/s)/(1)", ("v", Some("(m/s)/(1)"))),
            ("K° / 1", ("K°", Some("1"))),
            ("Cp of CO2(g)", ("Cp of CO2(g)", None)),
            ("u(T)", ("u(T)", None)),
        ];
        for (head, wanted) in rows {
            assert_eq!(parted(head), wanted, "{head}");
        }
    }

    #[test]
    fn figures_come_with_unit_uncertainty_and_source() {
        let table = read(
            "\u{feff}# source: laboratory book 7, invented\r\n# more\nT / degC, Cp (J/(K mol[CH4])), u(Cp) / (kJ/(K mol[CH4]))\n\
             20,35.5,0.0004\n\n25,35.71(3),\n",
        )
        .unwrap();
        assert_eq!((table.rows(), table.columns().len()), (2, 2));
        let cp = table.column("Cp").unwrap();
        assert_eq!((cp.numbers(), cp.uncertainties()), (&[35.5, 35.71][..], &[Some(0.4), Some(0.03)][..]));
        assert_eq!(table.column("T").unwrap().numbers(), [293.15, 298.15]);
        let value = cp.value(1);
        let input = value.node().input().unwrap();
        assert_eq!(input.name(), "Cp of cp.csv, line 6");
        assert_eq!(input.citation.as_ref().unwrap().to_string(), "laboratory book 7, invented; read from cp.csv");
        assert!(cp.value(0).node().input().unwrap().key != input.key, "two cells are two inputs");
    }

    #[test]
    fn semicolons_and_tabs_part_cells_where_the_head_has_them() {
        for mark in [";", "\t"] {
            let table = read(&format!("T / K{mark}p / bar\n300{mark}1.5\n")).unwrap();
            assert_eq!(table.column("p").unwrap().numbers(), [1.5e5]);
        }
    }

    #[test]
    fn each_fault_names_its_line_and_column() {
        let rows = [
            ("", "table-without-head", ""),
            ("# only a remark\n", "table-without-head", ""),
            ("T / K,p / bar\n", "table-without-rows", ""),
            ("T / K,p\n300,1\n", "column-without-unit", "line 1: column 2, `p`"),
            ("# a\n\nT / K,p", "column-without-unit", "line 3: column 2, `p`"),
            ("T / K,E / cal\n300,1\n", "column-unit-unreadable", "line 1: column 2"),
            ("T / K,T / degC\n300,1\n", "column-twice", "line 1"),
            ("T / K,u(p) / bar\n300,1\n", "column-of-uncertainty-alone", "`u(p)`"),
            ("T / K,p / bar,u(p) / K\n300,1,1\n", "column-of-uncertainty-unit", "`u(p)` is in K"),
            ("T / K,p / bar\n300,1\n310,2,3\n", "row-width", "line 3: 3 cells"),
            ("T / K,p / bar\n300,1\n310,NaN\n", "cell-not-a-number", "line 3, column 2 (p): `NaN`"),
            ("T / K,p / bar\n300,1 bar\n", "cell-not-a-number", "`1 bar`"),
            ("T / K;p / bar\n300;1,5\n", "cell-not-a-number", "`1,5`"),
            ("T / K,p / bar\n300,1e999\n", "cell-not-a-number", "`1e999`"),
            ("T / K,p / bar\n300,inf\n", "cell-not-a-number", "`inf`"),
            ("T / K,p / bar\n300,\n", "cell-empty", "line 2, column 2 (p)"),
            ("T / K,p / bar,u(p) / bar\n300,1,-0.1\n", "cell-uncertainty-negative", "column 3"),
            ("T / K,p / bar,u(p) / bar\n300,1.0(1),0.1\n", "cell-uncertainty-twice", "line 2, column 2 (p)"),
        ];
        for (content, code, words) in rows {
            let fault = read(content).map(|_| ()).unwrap_err();
            assert_eq!(fault.code(), code, "{content}");
            assert!(fault.message().contains(words), "{content}: {}", fault.message());
        }
    }

    #[test]
    fn a_curve_goes_over_temperatures_that_ascend() {
        let faults = [
            ("T / K,p / bar\n300,1\n300,2\n", "T", "rows-not-ascending", "line 3"),
            ("# a\nT / K,p / bar\n300,1\n299,2\n", "T", "rows-not-ascending", "line 4"),
            ("T / K,p / bar\n300,1\n310,2\n", "p", "column-no-temperatures", "bar"),
            ("T / K,p / bar\n300,1\n", "T", "table-of-one-row", "cp.csv"),
            ("T / K,p / bar\n-3,1\n4,1\n", "T", "row-temperature-not-positive", "line 2"),
        ];
        for (content, column, code, words) in faults {
            let error = read(content).unwrap().column(column).unwrap().ascends().unwrap_err();
            assert_eq!(error.code(), code, "{content}");
            assert!(error.to_string().contains(words), "{error}");
        }
    }
}
