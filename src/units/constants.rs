//! Physical constants by CODATA year, as plain numbers with their standard uncertainty and source.
//!
//! Main type: [`ConstantSet`], from [`set`]. The surprise: 2018 and 2022 agree in everything the SI defines (R, F, N_A
//! and the like are exact); only the hartree and the atomic mass constant move.

use std::sync::{Mutex, PoisonError};

use crate::source::Citation;

/// The year of the set that new notebooks use.
pub const CURRENT: u16 = 2022;

/// One constant.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Constant {
    pub name: &'static str,
    pub symbol: &'static str,
    /// In `unit`.
    pub value: f64,
    /// Standard uncertainty in `unit`; 0 where the value is exact.
    pub u: f64,
    /// Machine text of an SI unit, so that `value` is the SI value.
    pub unit: &'static str,
    publication: &'static str,
    obtained: &'static str,
}

impl Constant {
    pub fn citation(&self) -> Citation {
        Citation::new(self.publication, self.obtained)
    }

    pub fn is_exact(&self) -> bool {
        self.u == 0.0
    }
}

/// The constants of one CODATA year that the program uses.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ConstantSet {
    pub year: u16,
    /// R
    pub molar_gas: Constant,
    /// N_A
    pub avogadro: Constant,
    /// k
    pub boltzmann: Constant,
    /// h
    pub planck: Constant,
    /// e
    pub elementary_charge: Constant,
    /// F
    pub faraday: Constant,
    /// c
    pub speed_of_light: Constant,
    /// hc, which takes a wavenumber to an energy.
    pub wavenumber_energy: Constant,
    /// c2 = hc/k, which takes a wavenumber to a temperature.
    pub second_radiation: Constant,
    /// E_h
    pub hartree: Constant,
    /// m_u
    pub atomic_mass: Constant,
}

impl ConstantSet {
    /// All of them, in a fixed order.
    pub fn all(&self) -> [&Constant; 11] {
        [
            &self.molar_gas,
            &self.avogadro,
            &self.boltzmann,
            &self.planck,
            &self.elementary_charge,
            &self.faraday,
            &self.speed_of_light,
            &self.wavenumber_energy,
            &self.second_radiation,
            &self.hartree,
            &self.atomic_mass,
        ]
    }

    fn all_mut(&mut self) -> [&mut Constant; 11] {
        [
            &mut self.molar_gas,
            &mut self.avogadro,
            &mut self.boltzmann,
            &mut self.planck,
            &mut self.elementary_charge,
            &mut self.faraday,
            &mut self.speed_of_light,
            &mut self.wavenumber_energy,
            &mut self.second_radiation,
            &mut self.hartree,
            &mut self.atomic_mass,
        ]
    }

    /// This set with other figures for some of its constants, each by its name with its u. Sets live as long as the
    /// program; equal ones are one.
    pub fn with(&self, figures: &[(&str, f64, f64)]) -> &'static ConstantSet {
        let mut made = *self;
        for constant in made.all_mut() {
            if let Some((_, value, u)) = figures.iter().find(|(name, ..)| *name == constant.name) {
                (constant.value, constant.u) = (*value, *u);
            }
        }
        kept(made)
    }

    /// This set under another year, for a year that the program has no set of.
    pub fn of_year(&self, year: u16) -> &'static ConstantSet {
        kept(ConstantSet { year, ..*self })
    }
}

static MADE: Mutex<Vec<&'static ConstantSet>> = Mutex::new(Vec::new());

/// A set for the life of the program; the program's own where it is one of these.
fn kept(made: ConstantSet) -> &'static ConstantSet {
    if let Some(own) = SETS.iter().find(|own| **own == made) {
        return own;
    }
    let mut others = MADE.lock().unwrap_or_else(PoisonError::into_inner);
    if let Some(known) = others.iter().find(|known| ***known == made) {
        return known;
    }
    let made: &'static ConstantSet = Box::leak(Box::new(made));
    others.push(made);
    made
}

/// The set of that CODATA year, if the program has it.
pub fn set(year: u16) -> Option<&'static ConstantSet> {
    SETS.iter().find(|set| set.year == year)
}

/// The set of [`CURRENT`].
pub fn current() -> &'static ConstantSet {
    set(CURRENT).expect("the current constant set is in the table")
}

/// The years there are sets for, oldest first.
pub fn years() -> impl Iterator<Item = u16> {
    SETS.iter().map(|set| set.year)
}

/// Standard pressure p° of today's tables.
pub static STANDARD_PRESSURE: Constant = Constant {
    name: "standard-state pressure",
    symbol: "p°",
    value: 100_000.0,
    u: 0.0,
    unit: "Pa",
    publication: "CODATA recommended values 2022 (NIST), standard-state pressure",
    obtained: LISTING,
};

/// Standard atmosphere, the standard pressure of tables before 1982.
pub static STANDARD_ATMOSPHERE: Constant = Constant {
    name: "standard atmosphere",
    symbol: "atm",
    value: 101_325.0,
    u: 0.0,
    unit: "Pa",
    publication: "CODATA recommended values 2022 (NIST), standard atmosphere",
    obtained: LISTING,
};

const LISTING: &str = "machine-readable listing; the printed table was not seen";
const SI: &str = "SI Brochure, 9th ed. (2019), defining constants";
const FROM_MEMORY: &str = "from memory; equal to the machine-readable CODATA listing";
const PRODUCTS: &str = "exact product or quotient of the defining constants of the SI Brochure, 9th ed. (2019)";
const COMPUTED: &str = "computed with 40-digit decimals; equal to the machine-readable CODATA listing";

const fn defined(name: &'static str, symbol: &'static str, value: f64, unit: &'static str) -> Constant {
    Constant { name, symbol, value, u: 0.0, unit, publication: SI, obtained: FROM_MEMORY }
}

const fn derived(name: &'static str, symbol: &'static str, value: f64, unit: &'static str) -> Constant {
    Constant { name, symbol, value, u: 0.0, unit, publication: PRODUCTS, obtained: COMPUTED }
}

const fn since_2019(year: u16, hartree: Constant, atomic_mass: Constant) -> ConstantSet {
    ConstantSet {
        year,
        molar_gas: derived("molar gas constant", "R", 8.314_462_618_153_24, "J/(K mol)"),
        avogadro: defined("Avogadro constant", "N_A", 6.022_140_76e23, "1/mol"),
        boltzmann: defined("Boltzmann constant", "k", 1.380_649e-23, "J/K"),
        planck: defined("Planck constant", "h", 6.626_070_15e-34, "J s"),
        elementary_charge: defined("elementary charge", "e", 1.602_176_634e-19, "C"),
        faraday: derived("Faraday constant", "F", 96_485.332_123_310_02, "C/mol"),
        speed_of_light: defined("speed of light in vacuum", "c", 299_792_458.0, "m/s"),
        wavenumber_energy: derived("energy of a wavenumber", "hc", 1.986_445_857_148_928_6e-25, "J m"),
        second_radiation: derived("second radiation constant", "c2", 0.014_387_768_775_039_338, "K m"),
        hartree,
        atomic_mass,
    }
}

const fn measured(
    name: &'static str,
    symbol: &'static str,
    value_and_u: [f64; 2],
    unit: &'static str,
    publication: &'static str,
) -> Constant {
    Constant { name, symbol, value: value_and_u[0], u: value_and_u[1], unit, publication, obtained: LISTING }
}

const CODATA_2018: &str = "CODATA recommended values 2018 (NIST)";
const CODATA_2022: &str = "CODATA recommended values 2022 (NIST)";

static SETS: [ConstantSet; 2] = [
    since_2019(
        2018,
        measured("Hartree energy", "E_h", [4.359_744_722_207_1e-18, 8.5e-30], "J", CODATA_2018),
        measured("atomic mass constant", "m_u", [1.660_539_066_60e-27, 5.0e-37], "kg", CODATA_2018),
    ),
    since_2019(
        2022,
        measured("Hartree energy", "E_h", [4.359_744_722_206_0e-18, 4.8e-30], "J", CODATA_2022),
        measured("atomic mass constant", "m_u", [1.660_539_068_92e-27, 5.2e-37], "kg", CODATA_2022),
    ),
];

#[cfg(test)]
mod tests {
    use super::*;
    use crate::units::parse::unit;

    /// Relative. Each literal and each operation rounds by at most half of EPSILON, and the longest row, hc/k, has
    /// three rounded literals and two operations (c is a whole number).
    const ROUNDING: f64 = 5.0 * 0.5 * f64::EPSILON;

    #[test]
    fn derived_constants_are_the_products_of_the_exact_ones() {
        for set in &SETS {
            let [n_a, k, h, e, c] =
                [set.avogadro, set.boltzmann, set.planck, set.elementary_charge, set.speed_of_light].map(|x| x.value);
            let rows = [
                ("R = N_A k", set.molar_gas.value, n_a * k),
                ("F = N_A e", set.faraday.value, n_a * e),
                ("hc", set.wavenumber_energy.value, h * c),
                ("c2 = hc/k", set.second_radiation.value, h * c / k),
            ];
            for (name, listed, product) in rows {
                assert!((listed / product - 1.0).abs() <= ROUNDING, "{} {name}: {listed} against {product}", set.year);
            }
        }
    }

    #[test]
    fn a_set_with_the_figures_of_another_is_that_one() {
        let [older, newer] = [set(2018).unwrap(), set(2022).unwrap()];
        let figures: Vec<(&str, f64, f64)> = newer.all().iter().map(|c| (c.name, c.value, c.u)).collect();
        assert!(std::ptr::eq(newer.with(&figures), newer));
        let altered = newer.with(&[("molar gas constant", 8.314, 0.0)]);
        assert_eq!((altered.molar_gas.value, altered.hartree), (8.314, newer.hartree));
        assert!(std::ptr::eq(altered, newer.with(&[("molar gas constant", 8.314, 0.0)])));
        assert_ne!(older.of_year(1986).year, older.year);
    }

    #[test]
    fn the_hartree_is_twice_the_rydberg_constant_times_hc() {
        // Rydberg constant: CODATA 2018 and 2022 (NIST), machine-readable listing; the printed table was not seen.
        for (year, rydberg) in [(2018, 10_973_731.568_160), (2022, 10_973_731.568_157)] {
            let set = set(year).unwrap();
            let gap = 2.0 * rydberg * set.wavenumber_energy.value - set.hartree.value;
            // The two are one quantity in the adjustment: half the last digit listed of each, and rounding, bound the gap.
            let digits = 0.5e-31 + 2.0 * 0.5e-6 * set.wavenumber_energy.value;
            assert!(gap.abs() <= digits + ROUNDING * set.hartree.value, "{year}: off by {gap:e}");
        }
    }

    #[test]
    fn the_atomic_mass_constant_times_avogadros_is_the_molar_mass_constant() {
        // Molar mass constant: CODATA 2018 and 2022 (NIST), machine-readable listing; the printed table was not seen.
        for (year, listed) in [(2018, 0.999_999_999_65e-3), (2022, 1.000_000_001_05e-3)] {
            let set = set(year).unwrap();
            // Half the last digit of both listings, relative: 0.5e-11 here and 0.5e-37/1.66e-27 there.
            let allowed = 0.5e-11 + 0.5 * 1e-37 / 1.66e-27 + ROUNDING;
            assert!((set.avogadro.value * set.atomic_mass.value / listed - 1.0).abs() < allowed, "{year}");
        }
    }

    #[test]
    fn the_current_set_is_the_latest_and_its_units_are_si() {
        assert_eq!(years().max(), Some(CURRENT));
        assert_eq!(current().year, CURRENT);
        assert!(set(1986).is_none());
        let fixed = [&STANDARD_PRESSURE, &STANDARD_ATMOSPHERE];
        for constant in SETS.iter().flat_map(|set| set.all()).chain(fixed) {
            let unit = unit(constant.unit).unwrap();
            assert_eq!(unit.factor, 1.0, "{}", constant.name);
            assert_eq!(*unit.text, *constant.unit, "machine text of {}", constant.name);
            assert!(!constant.citation().source.is_empty());
        }
    }

    #[test]
    fn units_of_the_table_that_are_constants_have_their_values() {
        for (symbol, constant) in [
            ("E_h", &current().hartree),
            ("Da", &current().atomic_mass),
            ("atm", &STANDARD_ATMOSPHERE),
            ("bar", &STANDARD_PRESSURE),
        ] {
            assert_eq!(unit(symbol).unwrap().factor, constant.value, "{symbol}");
        }
        assert_eq!(unit("eV").unwrap().factor, current().elementary_charge.value);
    }
}
