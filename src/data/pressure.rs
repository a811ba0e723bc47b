//! Constants for the dependence of one substance on pressure: second virial coefficients, condensed volumes, vapour pressures.
//!
//! [`Constants`] are those of one phase. They are facts of several publications, each with its own source, read from one
//! file without a dataset, so that it can be left out as a whole; `model` evaluates them. The surprise: a fit is no good
//! outside its range, and says so by [`Virial::covers`].

use std::sync::Arc;

use serde::Deserialize;

use crate::source::{Citation, Embedded};

use super::critical::{self, CriticalTemperature};
use super::dataset::{self, TableFault};

/// What is on record of one phase; each may be missing.
#[derive(Clone, Debug, Default)]
pub struct Constants {
    /// Of a gas.
    pub critical: Option<Arc<CriticalTemperature>>,
    /// Of a gas.
    pub virial: Option<Arc<Virial>>,
    /// Of a liquid or solid.
    pub volume: Option<Arc<Volume>>,
    /// Of a liquid.
    pub vapour: Option<Arc<VapourPressure>>,
}

/// The form of a fit of B(T), coefficients in m³/mol.
#[derive(Clone, Debug, PartialEq)]
pub enum VirialForm {
    /// Σ aᵢ (298.15 K/T − 1)ⁱ
    InverseTemperature(Box<[f64]>),
    /// a − b exp(c/T), c in kelvin.
    Exponential { a: f64, b: f64, c_k: f64 },
    /// Σ aᵢ (T/T₀)^bᵢ, T₀ in kelvin.
    Powers { terms: Box<[(f64, f64)]>, t0_k: f64 },
}

/// The second virial coefficient of one gas.
#[derive(Clone, Debug)]
pub struct Virial {
    pub id: Arc<str>,
    pub form: VirialForm,
    /// K
    pub t_min: f64,
    /// K
    pub t_max: f64,
    pub citation: Citation,
    /// How it compares with other sources.
    pub check: Arc<str>,
}

impl Virial {
    pub fn covers(&self, t_k: f64) -> bool {
        self.t_min <= t_k && t_k <= self.t_max
    }
}

/// The molar volume of a condensed phase, V = V₀ [1 + α (T − T₀) − κ (p − p₀)].
#[derive(Clone, Debug)]
pub struct Volume {
    pub id: Arc<str>,
    /// V₀, m³/mol
    pub v0: f64,
    /// One unit of the last digit on record of V₀, m³/mol.
    pub digit: f64,
    /// Isobaric expansivity, 1/K.
    pub alpha: f64,
    /// Isothermal compressibility, 1/Pa.
    pub kappa: f64,
    /// K
    pub t0_k: f64,
    /// Pa
    pub p0_pa: f64,
    /// Where constant α and κ may be used with care, K; judged, not given by the source.
    pub use_range: (f64, f64),
    pub citation: Citation,
    pub check: Arc<str>,
    /// What is known against the figures, in words.
    pub warnings: Box<[Arc<str>]>,
}

/// The form of a vapour-pressure equation.
#[derive(Clone, Debug, PartialEq)]
pub enum VapourForm {
    /// lg(p/Pa) = a − b/(T + c), b and c in kelvin.
    Antoine { a: f64, b_k: f64, c_k: f64 },
    /// ln(p/p_c) = (T_c/T) Σ aᵢ (1 − T/T_c)^nᵢ
    Reduced { terms: Box<[(f64, f64)]>, tc_k: f64, pc_pa: f64 },
}

/// The vapour pressure of a liquid.
#[derive(Clone, Debug)]
pub struct VapourPressure {
    pub id: Arc<str>,
    pub form: VapourForm,
    /// K; where other equations agree, not all that the source claims.
    pub t_min: f64,
    /// K
    pub t_max: f64,
    pub citation: Citation,
    pub check: Arc<str>,
}

pub(super) const SCHEMA: &str = "hessbook-pressure/1";

/// Everything in a file of constants.
#[derive(Debug, Default)]
pub(super) struct Read {
    pub critical: Vec<CriticalTemperature>,
    pub virial: Vec<Virial>,
    pub volume: Vec<Volume>,
    pub vapour: Vec<VapourPressure>,
}

#[derive(Deserialize)]
struct Page<'a> {
    #[serde(borrow, default)]
    critical_constants: Vec<critical::Record<'a>>,
    #[serde(borrow, default)]
    second_virial: Vec<VirialRecord<'a>>,
    #[serde(borrow, default)]
    condensed_volumes: Vec<VolumeRecord<'a>>,
    #[serde(borrow, default)]
    vapour_pressures: Vec<VapourRecord<'a>>,
}

/// The lists of such a file.
pub(super) const LISTS: [&str; 4] = ["critical_constants", "second_virial", "condensed_volumes", "vapour_pressures"];

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct VirialRecord<'a> {
    id: &'a str,
    form: &'a str,
    a_cm3: Vec<f64>,
    #[serde(default)]
    b: Vec<f64>,
    t: [f64; 2],
    range_obtained: &'a str,
    source: &'a str,
    obtained: &'a str,
    check: &'a str,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct VolumeRecord<'a> {
    id: &'a str,
    t: f64,
    p_pa: f64,
    v_cm3: f64,
    alpha_per_k: f64,
    kappa_per_pa: f64,
    use_range: [f64; 2],
    source: &'a str,
    obtained: &'a str,
    check: &'a str,
    #[serde(default)]
    warnings: Vec<&'a str>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct VapourRecord<'a> {
    id: &'a str,
    form: &'a str,
    a: Vec<f64>,
    #[serde(default)]
    exponents: Vec<f64>,
    critical: Option<[f64; 2]>,
    t: [f64; 2],
    source: &'a str,
    obtained: &'a str,
    check: &'a str,
}

/// Reads a file of constants; every record is validated.
///
/// # Errors
/// A figure is out of its range, a form is unknown, or a member is missing.
pub(super) fn read(file: &Embedded<'_>, all: &mut Read) -> Result<(), TableFault> {
    let page: Page<'_> = dataset::parse(file)?;
    let wrong =
        |record: &str, column| TableFault::Figure { path: file.path.to_owned(), record: record.to_owned(), column };
    for record in page.critical_constants {
        all.critical.push(record.read(file.path)?);
    }
    for record in page.second_virial {
        all.virial.push(record.read().map_err(|column| wrong(record.id, column))?);
    }
    for record in page.condensed_volumes {
        all.volume.push(record.read().map_err(|column| wrong(record.id, column))?);
    }
    for record in page.vapour_pressures {
        all.vapour.push(record.read().map_err(|column| wrong(record.id, column))?);
    }
    Ok(())
}

/// A range of temperatures in order, above absolute zero.
fn range(t: [f64; 2]) -> Result<(f64, f64), &'static str> {
    if 0.0 < t[0] && t[0] <= t[1] && t[1].is_finite() { Ok((t[0], t[1])) } else { Err("t") }
}

impl VirialRecord<'_> {
    fn read(&self) -> Result<Virial, &'static str> {
        const CM3: f64 = 1e-6;
        let (t_min, t_max) = range(self.t)?;
        let form = match (self.form, self.a_cm3.as_slice()) {
            ("inverse-temperature", a) if !a.is_empty() => {
                VirialForm::InverseTemperature(a.iter().map(|a| a * CM3).collect())
            }
            ("exponential", &[a, b, c_k]) => VirialForm::Exponential { a: a * CM3, b: b * CM3, c_k },
            ("powers", a) if !a.is_empty() && a.len() == self.b.len() => {
                let terms = a.iter().zip(&self.b).map(|(a, b)| (a * CM3, *b)).collect();
                VirialForm::Powers { terms, t0_k: 100.0 }
            }
            _ => return Err("form"),
        };
        let obtained = match self.range_obtained {
            range if range == self.obtained => self.obtained.to_owned(),
            range => format!("{}; range: {range}", self.obtained),
        };
        Ok(Virial {
            id: self.id.into(),
            form,
            t_min,
            t_max,
            citation: Citation::new(self.source, &*obtained),
            check: self.check.into(),
        })
    }
}

impl VolumeRecord<'_> {
    fn read(&self) -> Result<Volume, &'static str> {
        let positive = |x: f64, column| if x > 0.0 && x.is_finite() { Ok(x) } else { Err(column) };
        let use_range = range(self.use_range).map_err(|_| "use_range")?;
        if !self.alpha_per_k.is_finite() {
            return Err("alpha_per_k");
        }
        // What the shortest decimal of the figure ends with.
        let decimals = self.v_cm3.to_string().split_once('.').map_or(0, |(_, after)| after.len());
        Ok(Volume {
            id: self.id.into(),
            v0: positive(self.v_cm3, "v_cm3")? * 1e-6,
            digit: (0..decimals).fold(1e-6, |digit, _| digit / 10.0),
            alpha: self.alpha_per_k,
            kappa: positive(self.kappa_per_pa, "kappa_per_pa")?,
            t0_k: positive(self.t, "t")?,
            p0_pa: positive(self.p_pa, "p_pa")?,
            use_range,
            citation: Citation::new(self.source, self.obtained),
            check: self.check.into(),
            warnings: self.warnings.iter().map(|text| Arc::from(*text)).collect(),
        })
    }
}

impl VapourRecord<'_> {
    fn read(&self) -> Result<VapourPressure, &'static str> {
        let (t_min, t_max) = range(self.t)?;
        let form = match (self.form, self.a.as_slice(), self.critical) {
            ("antoine", &[a, b_k, c_k], None) => VapourForm::Antoine { a, b_k, c_k },
            ("reduced-powers", a, Some([tc_k, pc_pa])) if a.len() == self.exponents.len() && t_max <= tc_k => {
                let terms = a.iter().zip(&self.exponents).map(|(a, n)| (*a, *n)).collect();
                VapourForm::Reduced { terms, tc_k, pc_pa }
            }
            _ => return Err("form"),
        };
        Ok(VapourPressure {
            id: self.id.into(),
            form,
            t_min,
            t_max,
            citation: Citation::new(self.source, self.obtained),
            check: self.check.into(),
        })
    }
}
