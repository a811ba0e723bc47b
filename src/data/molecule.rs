//! Constants of molecules for statistical mechanics: what spectroscopists print, with source and mark.
//!
//! A [`Constants`] is one record, its figures as printed; `model` makes a molecule of it. The surprise: every record is
//! from memory and was kept for its agreement with a published function, which the record says in its own words.

use std::sync::Arc;

use serde::Deserialize;

use crate::source::{Citation, Embedded};

use super::dataset::{self, TableFault};

/// A figure in cm⁻¹ as printed.
#[derive(Clone, Debug, PartialEq)]
pub struct Printed {
    pub text: Arc<str>,
    /// cm⁻¹
    pub value: f64,
    /// One unit of the last printed place, cm⁻¹.
    pub digit: f64,
}

/// The constants of one molecule or atom.
#[derive(Clone, Debug)]
pub struct Constants {
    /// By the id of its substance: `CO2(g)`.
    pub id: Arc<str>,
    pub point_group: Option<Arc<str>>,
    /// 1 for atoms.
    pub symmetry_number: u32,
    pub shape: Shape,
    /// Energies above the lowest level, with degeneracies.
    pub electronic_levels: Vec<(Printed, u32)>,
    pub citation: Citation,
    /// How the sum over the levels compares with a published function.
    pub check: Arc<str>,
}

/// What moves besides the electrons.
#[derive(Clone, Debug)]
pub enum Shape {
    Atom,
    Diatomic {
        we: Printed,
        wexe: Printed,
        be: Printed,
        alpha_e: Printed,
        /// Weights of even and odd J, where they matter.
        spin_weights: Option<[u32; 2]>,
        /// The isotopologue the constants are of, and its mass in g/mol.
        isotopologue: Arc<str>,
        isotopologue_mass: Printed,
    },
    Polyatomic {
        /// One of a linear molecule, else three.
        rotational_constants: Vec<Printed>,
        fundamentals: Vec<(Printed, u32)>,
        torsion: Option<Torsion>,
    },
}

/// A top with a threefold cosine barrier.
#[derive(Clone, Debug)]
pub struct Torsion {
    pub f: Printed,
    pub v3: Printed,
    pub symmetry_number: u32,
}

pub(super) const SCHEMA: &str = "hessbook-molecular-constants/1";

#[derive(Deserialize)]
struct Page<'a> {
    #[serde(borrow)]
    records: Vec<Record<'a>>,
}

#[derive(Deserialize)]
struct Record<'a> {
    id: &'a str,
    point_group: Option<&'a str>,
    symmetry_number: Option<u32>,
    #[serde(borrow, default)]
    rotational_constants: Vec<&'a str>,
    #[serde(borrow, default)]
    fundamentals: Vec<(&'a str, u32)>,
    we: Option<&'a str>,
    wexe: Option<&'a str>,
    #[serde(rename = "Be")]
    be: Option<&'a str>,
    alpha_e: Option<&'a str>,
    spin_weights: Option<[u32; 2]>,
    isotopologue: Option<&'a str>,
    isotopologue_mass: Option<&'a str>,
    #[serde(borrow)]
    internal_rotation: Option<Internal<'a>>,
    #[serde(borrow)]
    electronic_levels: Vec<(&'a str, u32)>,
    source: &'a str,
    obtained: &'a str,
    check: &'a str,
}

#[derive(Deserialize)]
struct Internal<'a> {
    #[serde(rename = "F")]
    f: &'a str,
    #[serde(rename = "V3")]
    v3: &'a str,
    symmetry_number: u32,
}

fn printed(text: &str) -> Option<Printed> {
    let value: f64 = text.parse().ok()?;
    let decimals = text.split_once('.').map_or(0, |(_, after)| after.len());
    let digit = format!("1e-{decimals}").parse().ok()?;
    (value.is_finite() && value >= 0.0).then(|| Printed { text: text.into(), value, digit })
}

/// Reads a file of molecular constants.
pub(super) fn read(file: &Embedded<'_>, all: &mut Vec<Constants>) -> Result<(), TableFault> {
    let page: Page<'_> = dataset::parse(file)?;
    for record in page.records {
        let (id, citation, check) =
            (record.id.into(), Citation::new(record.source, record.obtained), record.check.into());
        let unreadable = || TableFault::Figure {
            path: file.path.to_owned(),
            record: record.id.to_owned(),
            column: "of the molecular constants",
        };
        let figures = |pairs: &[(&str, u32)]| -> Option<Vec<(Printed, u32)>> {
            pairs.iter().map(|(text, g)| Some((printed(text)?, *g))).collect()
        };
        let electronic_levels = figures(&record.electronic_levels).ok_or_else(unreadable)?;
        let shape = shape(&record, figures(&record.fundamentals)).ok_or_else(unreadable)?;
        all.push(Constants {
            id,
            point_group: record.point_group.map(Arc::from),
            symmetry_number: record.symmetry_number.unwrap_or(1),
            shape,
            electronic_levels,
            citation,
            check,
        });
    }
    Ok(())
}

fn shape(record: &Record<'_>, fundamentals: Option<Vec<(Printed, u32)>>) -> Option<Shape> {
    if let Some(we) = record.we {
        return Some(Shape::Diatomic {
            we: printed(we)?,
            wexe: printed(record.wexe?)?,
            be: printed(record.be?)?,
            alpha_e: printed(record.alpha_e?)?,
            spin_weights: record.spin_weights,
            isotopologue: record.isotopologue?.into(),
            isotopologue_mass: printed(record.isotopologue_mass?)?,
        });
    }
    if record.rotational_constants.is_empty() {
        return Some(Shape::Atom);
    }
    let torsion = match &record.internal_rotation {
        Some(internal) => Some(Torsion {
            f: printed(internal.f)?,
            v3: printed(internal.v3)?,
            symmetry_number: internal.symmetry_number,
        }),
        None => None,
    };
    Some(Shape::Polyatomic {
        rotational_constants: record.rotational_constants.iter().map(|text| printed(text)).collect::<Option<_>>()?,
        fundamentals: fundamentals?,
        torsion,
    })
}
