//! The unit table: one row per unit, with its source. A new unit is one row here and nothing elsewhere.
//!
//! Main type: [`Row`]. Sizes are kept as exact ratios of whole numbers times a power of ten, never as rounded floats,
//! so that `kcal_th/mol` is 4184 and `cm^3` is the nearest float to 1e-6. The surprise: `cal`, `Btu`, `M` and their
//! like are not here; they are refused by name in `refused.rs`.

use std::collections::BTreeMap;
use std::sync::LazyLock;

use crate::source::Citation;
use crate::units::dimension::{Dimension, Entity, Of};

/// A factor to SI as `numerator / denominator × 10^ten`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Size {
    pub numerator: u64,
    pub denominator: u64,
    pub ten: i32,
}

/// One SI prefix.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Prefix {
    /// As machine text has it: ASCII, so `u` for micro.
    pub symbol: &'static str,
    /// Other spellings that are read.
    pub also: &'static [&'static str],
    /// As a reader sees it.
    pub shown: &'static str,
    pub ten: i32,
}

/// Which SI prefixes a unit takes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Prefixes {
    None,
    Every,
    /// The usual ones only, where the rest would be unheard of or read as another unit.
    Only(&'static [&'static str]),
}

impl Prefixes {
    pub fn takes(self, prefix: &Prefix) -> bool {
        match self {
            Prefixes::None => false,
            Prefixes::Every => true,
            Prefixes::Only(symbols) => symbols.contains(&prefix.symbol),
        }
    }
}

/// How well a unit's size is known.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Sureness {
    /// By definition, or composed of definitions.
    Exact,
    /// Measured; relative standard uncertainty of the size.
    Measured(f64),
    /// A printed figure that states no uncertainty.
    NotStated,
}

/// One unit.
#[derive(Clone, Copy, Debug)]
pub struct Row {
    /// As written; the first one is what the program writes. Never empty.
    pub symbols: &'static [&'static str],
    pub name: &'static str,
    pub size: Size,
    /// Whole exponents of metre, kilogram, second, ampere, kelvin, candela, and of the open mole.
    pub bases: [i8; 6],
    pub moles: i8,
    pub prefixes: Prefixes,
    /// The number on a temperature scale at the ice point, 273.15 K; such a unit names a point.
    pub ice: Option<f64>,
    pub sureness: Sureness,
    /// As a reader sees it; what follows `_` is an index.
    pub shown: &'static str,
    source: Source,
}

#[derive(Clone, Copy, Debug)]
struct Source {
    publication: &'static str,
    obtained: &'static str,
}

impl Row {
    /// The symbol that the program writes.
    pub fn symbol(&self) -> &'static str {
        self.symbols[0]
    }

    pub fn dim(&self) -> Dimension {
        let bases = Dimension::whole(self.bases);
        let moles = Dimension::amount(Entity::OPEN).powered(2 * i32::from(self.moles));
        bases.times(&moles.expect("a row's exponent of the mole is small"))
    }

    /// Whether the unit counts moles or kilograms, so that it may say of what in brackets.
    pub fn counts(&self) -> Option<Of> {
        match (self.bases, self.moles) {
            ([0, 0, 0, 0, 0, 0], 1) => Some(Of::Amount),
            ([0, 1, 0, 0, 0, 0], 0) => Some(Of::Mass),
            _ => None,
        }
    }

    pub fn is_exact(&self) -> bool {
        self.sureness == Sureness::Exact
    }

    /// 0 where the size is exact, `None` where its source states no uncertainty.
    pub fn relative_uncertainty(&self) -> Option<f64> {
        match self.sureness {
            Sureness::Exact => Some(0.0),
            Sureness::Measured(relative) => Some(relative),
            Sureness::NotStated => None,
        }
    }

    pub fn citation(&self) -> Citation {
        Citation::new(self.source.publication, self.source.obtained)
    }

    const fn named(self, symbols: &'static [&'static str], shown: &'static str) -> Row {
        Row { symbols, shown, ..self }
    }

    const fn not_stated(self) -> Row {
        Row { sureness: Sureness::NotStated, ..self }
    }

    const fn measured(self, relative: f64) -> Row {
        Row { sureness: Sureness::Measured(relative), ..self }
    }

    const fn point(self, ice: f64) -> Row {
        Row { ice: Some(ice), ..self }
    }

    const fn moles(self, moles: i8) -> Row {
        Row { moles, ..self }
    }
}

/// A unit and its prefix, as one spelling names them.
#[derive(Clone, Copy, Debug)]
pub struct Spelled {
    pub row: &'static Row,
    pub prefix: Option<&'static Prefix>,
}

/// What a spelling such as `kJ` names, if anything.
pub fn lookup(spelling: &str) -> Option<Spelled> {
    SPELLINGS.get(spelling).copied()
}

/// Every spelling that is read, prefixes included, in the order of the table: for completion and for `650.0.K`.
pub fn spellings() -> impl Iterator<Item = (String, Spelled)> {
    UNITS
        .iter()
        .flat_map(|row| spelled(row.symbols, row.prefixes).map(move |(text, prefix)| (text, Spelled { row, prefix })))
}

/// The given symbols alone and with each prefix that they take, in every spelling of the prefix.
pub(crate) fn spelled(
    symbols: &'static [&'static str],
    prefixes: Prefixes,
) -> impl Iterator<Item = (String, Option<&'static Prefix>)> {
    symbols.iter().flat_map(move |symbol| {
        let prefixed = PREFIXES.iter().filter(move |prefix| prefixes.takes(prefix)).flat_map(move |prefix| {
            let ways = std::iter::once(&prefix.symbol).chain(prefix.also);
            ways.map(move |way| (format!("{way}{symbol}"), Some(prefix)))
        });
        std::iter::once(((*symbol).to_owned(), None)).chain(prefixed)
    })
}

static SPELLINGS: LazyLock<BTreeMap<String, Spelled>> = LazyLock::new(|| spellings().collect());

const fn prefix(symbol: &'static str, ten: i32) -> Prefix {
    Prefix { symbol, also: &[], shown: symbol, ten }
}

/// SI prefixes: SI Brochure, 9th ed. (2019), Table 7, with the four of resolution 3 of the 27th CGPM (2022); from memory.
pub static PREFIXES: &[Prefix] = &[
    prefix("k", 3),
    prefix("m", -3),
    prefix("M", 6),
    prefix("c", -2),
    Prefix { symbol: "u", also: &["µ", "μ"], shown: "µ", ten: -6 },
    prefix("n", -9),
    prefix("G", 9),
    prefix("p", -12),
    prefix("d", -1),
    prefix("h", 2),
    prefix("da", 1),
    prefix("T", 12),
    prefix("f", -15),
    prefix("P", 15),
    prefix("a", -18),
    prefix("E", 18),
    prefix("z", -21),
    prefix("Z", 21),
    prefix("y", -24),
    prefix("Y", 24),
    prefix("r", -27),
    prefix("R", 27),
    prefix("q", -30),
    prefix("Q", 30),
];

const fn from_memory(publication: &'static str) -> Source {
    Source { publication, obtained: "from memory" }
}

const SI_BASE: Source = from_memory("SI Brochure, 9th ed. (2019), Table 2");
const SI_NAMED: Source = from_memory("SI Brochure, 9th ed. (2019), Table 4");
const SI_ACCEPTED: Source = from_memory("SI Brochure, 9th ed. (2019), Table 8");
const SI_NUMBERS: Source = from_memory("SI Brochure, 9th ed. (2019), section 5.4.7");
const SP811: Source = from_memory("NIST SP 811 (2008), Appendix B");
const BTU_TH: Source =
    from_memory("NIST SP 811 (2008), Appendix B, as 4.184 J/(g K) × 1 lb × 5/9 K (printed 1.054350E+03)");
const POUND_MOLE: Source =
    from_memory("definition: 1 lbmol is to 1 mol as 1 lb is to 1 g, with the pound of NIST SP 811 (2008)");
const DEBYE: Source = from_memory("definition: 1E-18 statC cm, that is 1E-21/c C m with c of the SI Brochure");
const CODATA_2022: Source = Source {
    publication: "CODATA recommended values 2022 (NIST)",
    obtained: "machine-readable listing; the printed table was not seen",
};

const NUMBER: [i8; 6] = [0; 6];
const LENGTH: [i8; 6] = [1, 0, 0, 0, 0, 0];
const VOLUME: [i8; 6] = [3, 0, 0, 0, 0, 0];
const MASS: [i8; 6] = [0, 1, 0, 0, 0, 0];
const TIME: [i8; 6] = [0, 0, 1, 0, 0, 0];
const RATE: [i8; 6] = [0, 0, -1, 0, 0, 0];
const TEMPERATURE: [i8; 6] = [0, 0, 0, 0, 1, 0];
const FORCE: [i8; 6] = [1, 1, -2, 0, 0, 0];
const PRESSURE: [i8; 6] = [-1, 1, -2, 0, 0, 0];
const ENERGY: [i8; 6] = [2, 1, -2, 0, 0, 0];
const DOSE: [i8; 6] = [2, 0, -2, 0, 0, 0];
const POWER: [i8; 6] = [2, 1, -3, 0, 0, 0];

const ONE: Size = decimal(1, 0);

const fn decimal(digits: u64, ten: i32) -> Size {
    Size { numerator: digits, denominator: 1, ten }
}

const fn ratio(numerator: u64, denominator: u64, ten: i32) -> Size {
    Size { numerator, denominator, ten }
}

const fn row(symbols: &'static [&'static str], name: &'static str, size: Size, bases: [i8; 6], source: Source) -> Row {
    Row {
        symbols,
        name,
        size,
        bases,
        moles: 0,
        prefixes: Prefixes::None,
        ice: None,
        sureness: Sureness::Exact,
        shown: symbols[0],
        source,
    }
}

/// A row that takes every SI prefix.
const fn every(
    symbols: &'static [&'static str],
    name: &'static str,
    size: Size,
    bases: [i8; 6],
    source: Source,
) -> Row {
    Row { prefixes: Prefixes::Every, ..row(symbols, name, size, bases, source) }
}

/// A row that takes the listed prefixes.
const fn only(prefixes: &'static [&'static str], row: Row) -> Row {
    Row { prefixes: Prefixes::Only(prefixes), ..row }
}

/// All units.
pub static UNITS: &[Row] = &[
    // Base units. The gram stands for the kilogram, since prefixes attach to it.
    every(&["m"], "metre", ONE, LENGTH, SI_BASE),
    every(&["g"], "gram", decimal(1, -3), MASS, SI_BASE),
    every(&["s"], "second", ONE, TIME, SI_BASE),
    every(&["A"], "ampere", ONE, [0, 0, 0, 1, 0, 0], SI_BASE),
    every(&["K"], "kelvin", ONE, TEMPERATURE, SI_BASE),
    every(&["mol"], "mole", ONE, NUMBER, SI_BASE).moles(1),
    every(&["cd"], "candela", ONE, [0, 0, 0, 0, 0, 1], SI_BASE),
    // Derived units with names of their own.
    every(&["J"], "joule", ONE, ENERGY, SI_NAMED),
    every(&["Pa"], "pascal", ONE, PRESSURE, SI_NAMED),
    every(&["W"], "watt", ONE, POWER, SI_NAMED),
    every(&["N"], "newton", ONE, FORCE, SI_NAMED),
    every(&["Hz"], "hertz", ONE, RATE, SI_NAMED),
    every(&["C"], "coulomb", ONE, [0, 0, 1, 1, 0, 0], SI_NAMED),
    every(&["V"], "volt", ONE, [2, 1, -3, -1, 0, 0], SI_NAMED),
    every(&["F"], "farad", ONE, [-2, -1, 4, 2, 0, 0], SI_NAMED),
    // The Greek capital omega, and the ohm sign that Unicode keeps for old texts.
    every(&["ohm"], "ohm", ONE, [2, 1, -3, -2, 0, 0], SI_NAMED).named(&["ohm", "Ω", "\u{2126}"], "Ω"),
    every(&["S"], "siemens", ONE, [-2, -1, 3, 2, 0, 0], SI_NAMED),
    every(&["Wb"], "weber", ONE, [2, 1, -2, -1, 0, 0], SI_NAMED),
    every(&["T"], "tesla", ONE, [0, 1, -2, -1, 0, 0], SI_NAMED),
    every(&["H"], "henry", ONE, [2, 1, -2, -2, 0, 0], SI_NAMED),
    every(&["rad"], "radian", ONE, NUMBER, SI_NAMED),
    every(&["sr"], "steradian", ONE, NUMBER, SI_NAMED),
    every(&["lm"], "lumen", ONE, [0, 0, 0, 0, 0, 1], SI_NAMED),
    every(&["lx"], "lux", ONE, [-2, 0, 0, 0, 0, 1], SI_NAMED),
    every(&["Bq"], "becquerel", ONE, RATE, SI_NAMED),
    every(&["Gy"], "gray", ONE, DOSE, SI_NAMED),
    every(&["Sv"], "sievert", ONE, DOSE, SI_NAMED),
    every(&["kat"], "katal", ONE, RATE, SI_NAMED).moles(1),
    row(&["degC"], "degree Celsius", ONE, TEMPERATURE, SI_NAMED).point(0.0).named(&["degC", "°C", "℃"], "°C"),
    // Accepted for use with the SI.
    row(&["min"], "minute", decimal(60, 0), TIME, SI_ACCEPTED),
    row(&["h"], "hour", decimal(3600, 0), TIME, SI_ACCEPTED),
    row(&["d"], "day", decimal(86_400, 0), TIME, SI_ACCEPTED),
    every(&["L", "l"], "litre", decimal(1, -3), VOLUME, SI_ACCEPTED),
    only(&["k", "M", "G"], row(&["t"], "tonne", decimal(1, 3), MASS, SI_ACCEPTED)),
    every(&["Da"], "dalton", decimal(166_053_906_892, -38), MASS, CODATA_2022).measured(5.2e-37 / 1.660_539_068_92e-27),
    row(&["u"], "unified atomic mass unit", decimal(166_053_906_892, -38), MASS, CODATA_2022)
        .measured(5.2e-37 / 1.660_539_068_92e-27),
    only(&["m", "k", "M", "G", "T"], row(&["Wh"], "watt hour", decimal(3600, 0), ENERGY, SP811)),
    every(&["eV"], "electronvolt", decimal(1_602_176_634, -28), ENERGY, SI_ACCEPTED),
    // Atomic units.
    every(&["E_h", "hartree"], "hartree", decimal(43_597_447_222_060, -31), ENERGY, CODATA_2022)
        .measured(4.8e-30 / 4.359_744_722_206_0e-18),
    row(&["D"], "debye", ratio(1, 299_792_458, -21), [1, 0, 1, 1, 0, 0], DEBYE),
    // Pure numbers.
    row(&["%"], "per cent", decimal(1, -2), NUMBER, SI_NUMBERS),
    row(&["ppm"], "part per million", decimal(1, -6), NUMBER, SI_NUMBERS),
    // Heat.
    every(&["cal_th"], "thermochemical calorie", decimal(4184, -3), ENERGY, SP811),
    every(&["cal_IT"], "International Table calorie", decimal(41_868, -4), ENERGY, SP811),
    every(&["cal_15"], "15 °C calorie", decimal(41_858, -4), ENERGY, SP811).not_stated(),
    every(&["cal_20"], "20 °C calorie", decimal(41_819, -4), ENERGY, SP811).not_stated(),
    every(&["cal_mean"], "mean calorie", decimal(419_002, -5), ENERGY, SP811).not_stated(),
    row(&["Btu_IT"], "International Table British thermal unit", decimal(105_505_585_262, -8), ENERGY, SP811),
    row(&["Btu_th"], "thermochemical British thermal unit", ratio(94_891_523_804, 9, -7), ENERGY, BTU_TH),
    row(&["Btu_39"], "39 °F British thermal unit", decimal(105_967, -2), ENERGY, SP811).not_stated(),
    row(&["Btu_59", "Btu_59F"], "59 °F British thermal unit", decimal(105_480, -2), ENERGY, SP811).not_stated(),
    row(&["Btu_60"], "60 °F British thermal unit", decimal(105_468, -2), ENERGY, SP811).not_stated(),
    row(&["Btu_mean"], "mean British thermal unit", decimal(105_587, -2), ENERGY, SP811).not_stated(),
    row(&["therm_EC"], "therm (EC)", decimal(105_506, 3), ENERGY, SP811),
    row(&["therm_US"], "therm (US)", decimal(1_054_804, 2), ENERGY, SP811),
    row(&["t_TNT"], "ton of TNT, an energy by convention", decimal(4184, 6), ENERGY, SP811),
    row(&["erg"], "erg", decimal(1, -7), ENERGY, SP811),
    row(&["hp_550"], "horsepower of 550 ft lbf/s", decimal(74_569_987_158_227_022, -14), POWER, SP811),
    row(&["hp_metric"], "metric horsepower, 75 kgf m/s", decimal(73_549_875, -5), POWER, SP811),
    row(&["hp_electric"], "electric horsepower", decimal(746, 0), POWER, SP811),
    // Pressure and force.
    only(&["u", "m", "k", "M", "G"], row(&["bar", "bara"], "bar", decimal(1, 5), PRESSURE, SP811)),
    row(&["atm"], "standard atmosphere", decimal(101_325, 0), PRESSURE, SP811),
    only(&["m", "u"], row(&["Torr", "torr"], "torr", ratio(101_325, 760, 0), PRESSURE, SP811)),
    row(&["mmHg"], "conventional millimetre of mercury", decimal(133_322_387_415, -9), PRESSURE, SP811),
    row(&["inHg"], "conventional inch of mercury", decimal(3_386_388_640_341, -9), PRESSURE, SP811),
    row(&["mmH2O"], "conventional millimetre of water", decimal(980_665, -5), PRESSURE, SP811),
    row(&["inH2O"], "conventional inch of water", decimal(24_908_891, -5), PRESSURE, SP811),
    row(&["psi", "psia"], "pound-force per square inch", ratio(44_482_216_152_605, 64_516, -5), PRESSURE, SP811),
    only(&["m", "k", "M"], row(&["dyn"], "dyne", decimal(1, -5), FORCE, SP811)),
    row(&["kgf"], "kilogram-force", decimal(980_665, -5), FORCE, SP811),
    row(&["lbf"], "pound-force", decimal(44_482_216_152_605, -13), FORCE, SP811),
    // Mass, amount, length, volume, temperature.
    row(&["lb"], "avoirdupois pound", decimal(45_359_237, -8), MASS, SP811),
    row(&["ton_short"], "short ton, 2000 lb", decimal(90_718_474, -5), MASS, SP811),
    row(&["ton_long"], "long ton, 2240 lb", decimal(10_160_469_088, -7), MASS, SP811),
    row(&["lbmol"], "pound-mole", decimal(45_359_237, -5), NUMBER, POUND_MOLE).moles(1),
    row(&["in"], "inch", decimal(254, -4), LENGTH, SP811),
    row(&["ft"], "foot", decimal(3048, -4), LENGTH, SP811),
    // The letter, and the angstrom sign that Unicode keeps for old texts.
    row(&["angstrom"], "angstrom", decimal(1, -10), LENGTH, SP811).named(&["angstrom", "Å", "\u{212B}"], "Å"),
    row(&["gal_US"], "US gallon", decimal(3_785_411_784, -12), VOLUME, SP811),
    row(&["gal_UK"], "UK gallon", decimal(454_609, -8), VOLUME, SP811),
    row(&["bbl"], "petroleum barrel, 42 US gallons", decimal(158_987_294_928, -12), VOLUME, SP811),
    row(&["degF"], "degree Fahrenheit", ratio(5, 9, 0), TEMPERATURE, SP811)
        .point(32.0)
        .named(&["degF", "°F", "℉"], "°F"),
    row(&["degR"], "degree Rankine", ratio(5, 9, 0), TEMPERATURE, SP811).named(&["degR"], "°R"),
];

#[cfg(test)]
mod tests {
    use super::*;
    use crate::units::parse::unit;
    use crate::units::refused::REFUSED;

    #[test]
    fn no_spelling_names_two_things() {
        let mut seen: BTreeMap<String, String> = BTreeMap::new();
        let mut clashes = Vec::new();
        let rows = UNITS.iter().map(|row| (row.symbols, row.prefixes, row.name));
        let refusals = REFUSED.iter().map(|entry| (entry.symbols, entry.prefixes, entry.code));
        for (symbols, prefixes, name) in rows.chain(refusals) {
            for (text, prefix) in spelled(symbols, prefixes) {
                let meaning = format!("{} {name}", prefix.map_or("", |prefix| prefix.symbol));
                if let Some(other) = seen.insert(text.clone(), meaning.clone()) {
                    clashes.push(format!("{text}: {other} and {meaning}"));
                }
            }
        }
        assert!(clashes.is_empty(), "{}", clashes.join("\n"));
        assert!(seen.len() > 1000, "{}", seen.len());
    }

    #[test]
    fn a_prefix_never_hides_a_unit_of_its_own() {
        let rows = [
            ("min", "minute"),
            ("Pa", "pascal"),
            ("cd", "candela"),
            ("mmol", "mole"),
            ("mmHg", "conventional millimetre of mercury"),
            ("ft", "foot"),
            ("T", "tesla"),
            ("h", "hour"),
            ("dag", "gram"),
            ("kat", "katal"),
            ("u", "unified atomic mass unit"),
            ("um", "metre"),
            ("Gy", "gray"),
            ("lm", "lumen"),
        ];
        for (spelling, name) in rows {
            assert_eq!(lookup(spelling).map(|spelled| spelled.row.name), Some(name), "{spelling}");
        }
        assert_eq!(lookup("dag").and_then(|spelled| spelled.prefix).map(|prefix| prefix.ten), Some(1));
    }

    #[test]
    fn every_spelling_parses_and_its_machine_text_parses_back() {
        for (text, spelled) in spellings() {
            let unit = unit(&text).unwrap_or_else(|error| panic!("{text}: {error}"));
            assert_eq!(unit.dim, spelled.row.dim(), "{text}");
            let again = crate::units::parse::unit(&unit.text).unwrap();
            assert_eq!(again, unit, "{text}");
            assert_eq!(again.factor.to_bits(), unit.factor.to_bits(), "{text}");
        }
    }

    #[test]
    fn every_row_has_a_source_and_a_sureness_that_fits_it() {
        let mut names = std::collections::BTreeSet::new();
        for row in UNITS {
            assert!(!row.symbols.is_empty() && !row.name.is_empty());
            assert!(names.insert(row.name), "{} twice", row.name);
            let citation = row.citation();
            assert!(!citation.source.is_empty() && !citation.obtained.is_empty(), "{}", row.name);
            if let Sureness::Measured(relative) = row.sureness {
                assert!(relative > 0.0 && relative < 1e-8, "{}: {relative}", row.name);
            }
        }
        let stated = |symbol| lookup(symbol).unwrap().row.relative_uncertainty();
        assert_eq!((stated("cal_th"), stated("cal_15")), (Some(0.0), None));
        // CODATA 2022 (machine-readable listing; the printed table was not seen): relative u of E_h is 1.1e-12.
        assert!((stated("E_h").unwrap() / 1.1e-12 - 1.0).abs() < 0.05);
    }

    #[test]
    fn sizes_are_the_ones_that_nist_sp_811_prints() {
        // NIST SP 811 (2008), Appendix B.8 and B.9, from memory. Seven digits are printed, or fewer where exact; half a
        // unit of the seventh bounds the difference, which is at most 5e-7 of the figure.
        let rows = [
            ("atm", 1.013_25e5),
            ("kgf/cm^2", 9.806_65e4),
            ("Torr", 1.333_224e2),
            ("mmHg", 1.333_224e2),
            ("inHg", 3.386_389e3),
            ("mmH2O", 9.806_65),
            ("inH2O", 2.490_889e2),
            ("psi", 6.894_757e3),
            ("lbf", 4.448_222),
            ("kgf", 9.806_65),
            ("dyn", 1e-5),
            ("cal_th", 4.184),
            ("cal_IT", 4.1868),
            ("cal_15", 4.1858),
            ("cal_20", 4.1819),
            ("cal_mean", 4.190_02),
            ("Btu_IT", 1.055_056e3),
            ("Btu_th", 1.054_350e3),
            ("Btu_mean", 1.055_87e3),
            ("Btu_59", 1.0548e3),
            ("therm_EC", 1.055_06e8),
            ("therm_US", 1.054_804e8),
            ("t_TNT", 4.184e9),
            ("ft lbf", 1.355_818),
            ("erg", 1e-7),
            ("kW h", 3.6e6),
            ("hp_550", 7.456_999e2),
            ("hp_metric", 7.354_988e2),
            ("hp_electric", 7.46e2),
            ("Btu_IT/lb", 2.326e3),
            ("Btu_th/lb", 2.324_444e3),
            ("Btu_IT/(lb degF)", 4.1868e3),
            ("Btu_th/(lb degF)", 4.184e3),
            ("Btu_IT/ft^3", 3.725_895e4),
            ("Btu_IT/h", 2.930_711e-1),
            ("Btu_IT ft/(h ft^2 degF)", 1.730_735),
            ("cal_IT/(g degC)", 4.1868e3),
            ("lb", 4.535_924e-1),
            ("ton_short", 9.071_847e2),
            ("ton_long", 1.016_047e3),
            ("lb/ft^3", 1.601_846e1),
            ("lb/gal_US", 1.198_264e2),
            ("in", 2.54e-2),
            ("ft", 3.048e-1),
            ("ft^3", 2.831_685e-2),
            ("angstrom", 1e-10),
            ("gal_US", 3.785_412e-3),
            ("gal_UK", 4.546_09e-3),
            ("bbl", 1.589_873e-1),
            ("degR", 5.555_556e-1),
        ];
        let misses: Vec<String> = rows
            .iter()
            .map(|&(text, printed)| (text, printed, unit(text).unwrap().factor))
            .filter(|&(_, printed, got)| (got / printed - 1.0).abs() > 5e-7)
            .map(|(text, printed, got)| format!("{text}: {got} instead of {printed}"))
            .collect();
        assert!(misses.is_empty(), "{}", misses.join("\n"));
    }

    #[test]
    fn temperature_scales_meet_at_their_fixed_points() {
        // NIST SP 811 (2008), Appendix B.8, from memory: t/degC = (t/degF - 32)/1.8, T/K = t/degC + 273.15.
        for (celsius, fahrenheit) in [(0.0, 32.0), (100.0, 212.0), (-40.0, -40.0), (25.0, 77.0)] {
            let (c, f) = (unit("degC").unwrap().to_si(celsius), unit("degF").unwrap().to_si(fahrenheit));
            // A few roundings at a few hundred kelvin.
            assert!((c - f).abs() <= 4.0 * f64::EPSILON * c, "{celsius} degC is {c} K, {fahrenheit} degF is {f} K");
        }
        assert_eq!(unit("degC").unwrap().to_si(25.0), 298.15);
    }
}
