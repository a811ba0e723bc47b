//! Symbols that people write and that do not say what they mean: bare calories, gallons, gauge pressures.
//!
//! Main type: [`Refused`]. They are a table of their own so that the refusal can spell out every reading, also for
//! `kcal` and inside `cal/g`. The surprise: a symbol here may look like a prefix and a unit (`at` is no attotonne).

use std::collections::BTreeMap;
use std::sync::LazyLock;

use crate::units::table::{Prefix, Prefixes, spelled};

/// A family of symbols refused for one cause.
#[derive(Debug)]
pub struct Refused {
    pub symbols: &'static [&'static str],
    /// Prefixes with which the symbol is met; they are carried over to the readings.
    pub prefixes: Prefixes,
    pub code: &'static str,
    /// Ends the sentence "`cal` …".
    pub why: &'static str,
    /// The readings, as units.
    pub readings: &'static [&'static str],
    /// The unit in which the message gives the size of each reading.
    pub measured_in: Option<&'static str>,
    /// What else to do; empty where the readings say it all.
    pub way_out: &'static str,
}

/// The refusal of one spelling, with the prefix it came with.
pub fn refused(spelling: &str) -> Option<(&'static Refused, Option<&'static Prefix>)> {
    SPELLINGS.get(spelling).copied()
}

static SPELLINGS: LazyLock<BTreeMap<String, (&'static Refused, Option<&'static Prefix>)>> = LazyLock::new(|| {
    let all = REFUSED.iter();
    all.flat_map(|entry| spelled(entry.symbols, entry.prefixes).map(move |(text, prefix)| (text, (entry, prefix))))
        .collect()
});

/// All refused symbols.
pub static REFUSED: &[Refused] = &[
    Refused {
        symbols: &["cal"],
        prefixes: Prefixes::Every,
        code: "bare-calorie",
        why: "does not say which calorie",
        readings: &["cal_th", "cal_IT", "cal_15", "cal_20", "cal_mean"],
        measured_in: Some("J"),
        way_out: "",
    },
    Refused {
        symbols: &["Cal"],
        prefixes: Prefixes::None,
        code: "capital-calorie",
        why: "is a thousand calories, and does not say of which calorie",
        readings: &["kcal_th", "kcal_IT", "kcal_15", "kcal_20", "kcal_mean"],
        measured_in: Some("J"),
        way_out: "",
    },
    Refused {
        symbols: &["Btu", "BTU", "btu"],
        prefixes: Prefixes::None,
        code: "bare-btu",
        why: "does not say which British thermal unit",
        readings: &["Btu_IT", "Btu_th", "Btu_39", "Btu_59", "Btu_60", "Btu_mean"],
        measured_in: Some("J"),
        way_out: "",
    },
    Refused {
        symbols: &["MBtu", "MBTU", "MMBtu", "MMBTU", "MBtu_IT", "MMBtu_IT", "MBtu_th", "MMBtu_th"],
        prefixes: Prefixes::None,
        code: "btu-with-m",
        why: "is read as a thousand by those who take M for a Roman numeral and as a million by those who take it for mega",
        readings: &[],
        measured_in: None,
        way_out: "put the power of ten into the number and write it in Btu_IT or Btu_th: 1e6 Btu_IT",
    },
    Refused {
        symbols: &["M"],
        prefixes: Prefixes::Only(&["m", "u", "n", "p"]),
        code: "bare-molar",
        why: "is written for moles per litre, and in places for moles per kilogram of solvent or as the prefix mega",
        readings: &["mol/L", "mol/kg"],
        measured_in: Some("mol/m^3"),
        way_out: "and say of what in brackets where it matters, as in mol[NaCl]/L or mol[NaCl]/kg[H2O]",
    },
    Refused {
        symbols: &["at", "ata"],
        prefixes: Prefixes::None,
        code: "bare-technical-atmosphere",
        why: "is the technical atmosphere, easily taken for the standard one",
        readings: &["kgf/cm^2", "atm"],
        measured_in: Some("Pa"),
        way_out: "",
    },
    Refused {
        symbols: &["gal", "gallon", "gallons"],
        prefixes: Prefixes::None,
        code: "bare-gallon",
        why: "does not say which gallon",
        readings: &["gal_US", "gal_UK"],
        measured_in: Some("L"),
        way_out: "",
    },
    Refused {
        symbols: &["ton", "tons"],
        prefixes: Prefixes::None,
        code: "bare-ton",
        why: "does not say which ton",
        readings: &["t", "ton_short", "ton_long"],
        measured_in: Some("kg"),
        way_out: "",
    },
    Refused {
        symbols: &["hp", "HP"],
        prefixes: Prefixes::None,
        code: "bare-horsepower",
        why: "does not say which horsepower",
        readings: &["hp_550", "hp_metric", "hp_electric"],
        measured_in: Some("W"),
        way_out: "",
    },
    Refused {
        symbols: &["therm"],
        prefixes: Prefixes::None,
        code: "bare-therm",
        why: "does not say which therm",
        readings: &["therm_EC", "therm_US"],
        measured_in: Some("MJ"),
        way_out: "",
    },
    Refused {
        symbols: &["psig", "barg", "mbarg", "kPag", "hPag", "MPag"],
        prefixes: Prefixes::None,
        code: "gauge-pressure",
        why: "is gauge pressure, a difference from the ambient pressure, which the unit does not say",
        readings: &[],
        measured_in: None,
        way_out: "add the ambient pressure and write the sum in psi, bar or kPa, as in q(\"60 psi\") + q(\"1.01325 bar\")",
    },
    Refused {
        symbols: &["Nm", "Nm3", "Sm3", "Ncm3", "scf", "SCF", "sccm"],
        prefixes: Prefixes::None,
        code: "volume-at-conditions",
        why: "is read as a volume of gas at conditions that the unit does not say, or as newton metre",
        readings: &[],
        measured_in: None,
        way_out: "give the amount in mol, from p V/(R T) at the stated conditions; the newton metre is N m, with a space",
    },
    Refused {
        symbols: &["ppb", "ppt"],
        prefixes: Prefixes::None,
        code: "parts-per-what",
        why: "means another number in another language, and ppt is also read as parts per thousand",
        readings: &[],
        measured_in: None,
        way_out: "write the ratio: nmol/mol or ug/kg for 1e-9, pmol/mol or ng/kg for 1e-12",
    },
    Refused {
        symbols: &["wt%", "mol%", "vol%", "%wt", "%mol", "%vol"],
        prefixes: Prefixes::None,
        code: "percent-of-what",
        why: "says in the unit what the number is a share of",
        readings: &[],
        measured_in: None,
        way_out: "write % for a pure number, or the ratio with what it is of, as in g[NaCl]/kg[feed] or mol[CO2]/mol[feed]",
    },
    Refused {
        symbols: &["deg", "°"],
        prefixes: Prefixes::None,
        code: "bare-degree",
        why: "does not say of which scale, or that it is an angle",
        readings: &["degC", "degF", "degR", "rad"],
        measured_in: None,
        way_out: "",
    },
];
