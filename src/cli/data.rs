//! `hessbook data`: what is on record of a substance, whether figures are likely right, and how two datasets differ.

use std::cell::Cell;
use std::path::{Path, PathBuf};
use std::process::ExitCode;
use std::sync::Arc;

use clap::{Args, Subcommand};

use crate::cli::archive::Workers;
use crate::cli::{Done, data_change, out};
use crate::data::catalog::{Catalog, T_REFERENCE_K};
use crate::data::checkup;
use crate::data::dataset::{DatasetId, Datum};
use crate::data::doctor::{self, Finding, Printed, Row};
use crate::data::own::{self, Own};
use crate::data::records::{RecordTable, Records};
use crate::fault::Fault;
use crate::model::card::{Cx, References};
use crate::model::function;
use crate::model::table::Table;
use crate::num::math;
use crate::source::{self, Embedded};
use crate::units::constants;

/// Show, check and compare records: shipped ones, files of one's own, and printed tables.
#[derive(Args)]
pub struct Data {
    #[command(subcommand)]
    what: What,
}

#[derive(Subcommand)]
enum What {
    /// Show what is on record of a substance, or what a file of records holds
    Show {
        /// A name with phase, such as "CO2(g)", or a .json file
        name: String,
    },
    /// Look for slips: transposed digits, signs, units, rows, joins
    ///
    /// Exit status: 0 when nothing was found, 1 with findings, 2 when a file could not be read.
    Check {
        /// Files of records (.json) or printed tables (.csv with columns T, Cp, S, H); none checks the shipped functions
        files: Vec<PathBuf>,
    },
    /// Set the formation enthalpies and entropies of two datasets side by side, in units of u
    ///
    /// With an archive, tells instead which of its reported values would move, and by how much, if the second table took the
    /// place of the first, whatever its id; both are tables as shipped, of one schema, and the status is 1 when a value would
    /// move.
    Compare {
        /// The id of a dataset, or a .json file
        a: String,
        /// The other one
        b: String,
        /// Notebooks, folders of notebooks, and patterns
        #[arg(long, value_name = "PATH")]
        archive: Vec<PathBuf>,
        #[command(flatten)]
        workers: Workers,
    },
}

impl Data {
    pub(super) fn run(self) -> Done {
        match self.what {
            What::Show { name } => show(&name),
            What::Check { files } => check(&files),
            What::Compare { a, b, archive, .. } if archive.is_empty() => compare(&a, &b),
            What::Compare { a, b, archive, workers } => {
                data_change::compare(Path::new(&a), Path::new(&b), &archive, &workers)
            }
        }
    }
}

fn is_file(name: &str) -> bool {
    name.ends_with(".json")
}

fn bytes_of(path: &Path) -> Result<Vec<u8>, Fault> {
    std::fs::read(path).map_err(|error| {
        let message = format!("the file {} cannot be read: {error}", path.display());
        Fault::new("data-file-unreadable", message, "give the path of a file that is there")
    })
}

fn own_of(path: &Path, base: &Catalog) -> Result<Own, Fault> {
    let bytes = bytes_of(path)?;
    let (name, sha256) = (path.display().to_string(), source::sha256(&bytes));
    Ok(own::read(&Embedded { path: &name, bytes: &bytes, sha256: &sha256 }, base)?)
}

fn figure(datum: &Datum, per: f64) -> String {
    let u = datum.u.map_or_else(|| ", u not stated".to_owned(), |u| format!(", u = {:.4}", u / per));
    format!("{:.3}{u}", datum.value / per)
}

fn show(name: &str) -> Done {
    let shipped = Catalog::shipped();
    let (catalog, ids): (Arc<Catalog>, Vec<String>) = if is_file(name) {
        let own = own_of(Path::new(name), &shipped)?;
        let (catalog, _) = shipped.overlaid(&own)?;
        (Arc::new(catalog), own.phases.iter().map(|phase| phase.id.to_string()).collect())
    } else {
        let id = shipped.find(name)?.id().to_owned();
        (shipped, vec![id])
    };
    for id in ids {
        let substance = catalog.find(&id)?;
        let words = substance.name.as_ref().map_or_else(String::new, |name| format!(", {name}"));
        let mut text = format!("{id}{words}\n");
        for formation in &substance.formations {
            text.push_str(&format!(
                "  ΔfH°(298.15 K) = {} kJ/mol  {}\n",
                figure(&formation.dhf, 1000.0),
                formation.citation
            ));
            if let Some(s) = &formation.s {
                text.push_str(&format!("  S°(298.15 K) = {} J/(mol K)  {}\n", figure(s, 1.0), formation.citation));
            }
        }
        if let Some(of) = &substance.function {
            let t = T_REFERENCE_K.clamp(of.t_min, of.t_max);
            let cp = function::evaluate(of, t).cp;
            text.push_str(&format!(
                "  Cp°({t} K) = {cp:.3} J/(mol K), {} K to {} K  {}\n",
                of.t_min, of.t_max, of.citation
            ));
        }
        for one in catalog.transitions_of(&substance) {
            text.push_str(&format!(
                "  {} -> {} at {} K, {:.3} kJ/mol  {}\n",
                one.from,
                one.to,
                one.t_k,
                one.dh / 1e3,
                one.citation
            ));
        }
        out(&text);
    }
    Ok(ExitCode::SUCCESS)
}

fn told(subject: &str, finding: &Finding) {
    let likely = finding.likely.as_ref().map_or_else(String::new, |likely| format!("\n    likely: {likely}"));
    out(&format!("{subject}, {}: {}{likely}\n", finding.place, finding.what));
}

fn check(files: &[PathBuf]) -> Done {
    let shipped = Catalog::shipped();
    let mut found = 0;
    let mut tell = |subject: &str, finding: &Finding| {
        found += 1;
        told(subject, finding);
    };
    if files.is_empty() {
        checkup::of_catalog(&shipped).iter().for_each(|(subject, finding)| tell(subject, finding));
    }
    for path in files {
        if path.extension().is_some_and(|extension| extension == "csv") {
            let subject = path.display().to_string();
            let rows = rows(path)?;
            doctor::of_table(&rows).iter().for_each(|finding| tell(&subject, finding));
            if let Some(less) = doctor::less_checked(&rows) {
                out(&format!("{subject}: {less}\n"));
            }
        } else {
            let own = own_of(path, &shipped)?;
            let (laid, _) = shipped.overlaid(&own)?;
            checkup::of_own(&own, &shipped, &laid).iter().for_each(|(subject, finding)| tell(subject, finding));
        }
    }
    let number = if found == 1 { "1 finding".to_owned() } else { format!("{found} findings") };
    out(&format!("{number}\n"));
    Ok(if found == 0 { ExitCode::SUCCESS } else { ExitCode::from(1) })
}

/// The rows of a printed table.
fn rows(path: &Path) -> Result<Vec<Row>, Fault> {
    let text = String::from_utf8_lossy(&bytes_of(path)?).into_owned();
    let (references, ordinal) = (References::new(constants::current()), Cell::new(0));
    let cx = Cx { references: &references, place: None, ordinal: &ordinal, halted: &|| None };
    let table = Table::read(&cx, &path.display().to_string(), &text, None)?;
    let printed = |name: &str, row: usize| {
        let column = table.columns().iter().find(|column| &*column.name == name)?;
        let value = column.value(row);
        let digit = value.node().input().and_then(|input| input.digit).unwrap_or(0.0);
        Some(Printed { si: value.si(), digit })
    };
    table.column("T")?;
    table.column("Cp")?;
    let row = |row: usize| {
        Some(Row { t_k: printed("T", row)?.si, cp: printed("Cp", row)?, s: printed("S", row), h: printed("H", row) })
    };
    Ok((0..table.rows()).filter_map(row).collect())
}

/// One side of a comparison: a dataset that is there, or a file, which adds one.
struct Side {
    id: DatasetId,
    own: Option<PathBuf>,
}

/// What a name stands for; a table as shipped is put among `records`.
fn side(name: &str, records: &mut Records) -> Result<Side, Fault> {
    if is_file(name) {
        let bytes = bytes_of(Path::new(name))?;
        let read = Records::read(&[Embedded { path: name, bytes: &bytes, sha256: &source::sha256(&bytes) }])?;
        let Some(table) = read.tables.into_iter().find(RecordTable::is_of_formations) else {
            let own = own_of(Path::new(name), &Catalog::shipped())?;
            return Ok(Side { id: own.dataset.id.clone(), own: Some(PathBuf::from(name)) });
        };
        // A revision that kept the id stands beside what it revises under the name of its file.
        let id = if records.stands_for(&table) { name } else { &*table.dataset };
        *records = records.with_tables(&Records { tables: vec![table.described(id, None)] });
        return Ok(Side { id: DatasetId::new(id), own: None });
    }
    let id = DatasetId::new(name);
    let shipped = Catalog::shipped();
    if shipped.dataset(&id).is_none() {
        let known: Vec<String> = shipped.datasets().iter().map(|dataset| dataset.id.to_string()).collect();
        let hint = format!("name one of {}, or a .json file", known.join(", "));
        return Err(Fault::new("compared-dataset-unknown", format!("`{name}` is no dataset"), hint));
    }
    Ok(Side { id, own: None })
}

fn compare(a: &str, b: &str) -> Done {
    let mut records = Records::clone(&Records::shipped());
    let sides = [side(a, &mut records)?, side(b, &mut records)?];
    let mut catalog = Arc::new(records.catalog()?);
    for own in sides.iter().filter_map(|side| side.own.as_ref()) {
        catalog = Arc::new(catalog.overlaid(&own_of(own, &catalog)?)?.0);
    }
    let [a, b] = sides.map(|side| side.id);
    let mut lines: Vec<(f64, String)> = Vec::new();
    let mut compared = 0;
    for substance in catalog.substances() {
        let (Some(left), Some(right)) = (substance.formation(&a), substance.formation(&b)) else { continue };
        let pairs = [
            ("ΔfH°", "kJ/mol", 1000.0, Some(&left.dhf), Some(&right.dhf)),
            ("S°", "J/(mol K)", 1.0, left.s.as_ref(), right.s.as_ref()),
        ];
        for (name, unit, per, x, y) in pairs {
            let (Some(x), Some(y)) = (x, y) else { continue };
            compared += 1;
            let u = math::hypot(x.u.unwrap_or(0.0), y.u.unwrap_or(0.0));
            let gap = (x.value - y.value) / per;
            let (size, in_u) = match x.u.is_some() && y.u.is_some() && u > 0.0 {
                true => ((x.value - y.value).abs() / u, format!("{:+.1} u", (x.value - y.value) / u)),
                false => (0.0, "u not stated".to_owned()),
            };
            let line = format!(
                "{}  {name}  {}  {}  {gap:+.3} {unit}  {in_u}\n",
                substance.id(),
                figure(x, per),
                figure(y, per)
            );
            lines.push((size, line));
        }
    }
    // The worst first; stable, so by name where nothing is known of u.
    lines.sort_by(|x, y| y.0.total_cmp(&x.0));
    out(&format!("{compared} figures that both have: {a}, then {b}, then the difference\n"));
    lines.iter().for_each(|(_, line)| out(line));
    Ok(ExitCode::SUCCESS)
}
