//! Cycles that are closed with figures of other tables: vaporisation, fusion and formation enthalpies that are not shipped.
//!
//! Each row is a cycle whose one side is computed here and whose other side is printed elsewhere; its residual is counted in
//! units of its own standard uncertainty. All rows are listed, worst first. What misses by more than 2 u is on a list with the
//! reason, and a row that leaves that list or comes onto it fails the test. The uncertainty of a row is what its sources state:
//! where a table states none, only the rounding of its last digit is known, and a miss says so. The formation enthalpies of gas
//! and liquid are taken as independent, which makes u of their difference too large where one was derived from the other.

mod asking;

use asking::Desk;
use hessbook::model::card::{self, Card, Value};
use hessbook::model::property_card::{ENTHALPY, SUBSTANCE_ENTHALPY};
use hessbook::model::substance::SUBSTANCE;
use hessbook::quantity::Quantity;
use hessbook::render::report::Report;

const CRC: &str = "CRC Handbook of Chemistry and Physics, 95th ed. (2014), Enthalpy of Vaporization (a machine-readable copy; \
                   the printed table was not seen)";
const CRC_FUSION: &str = "CRC Handbook of Chemistry and Physics, 95th ed. (2014), Enthalpy of Fusion (a machine-readable copy; \
                          the printed table was not seen)";
const IAPWS: &str = "IAPWS-95 formulation (Wagner, Pruss, J. Phys. Chem. Ref. Data 31, 387, 2002), computed from the published \
                     formulation";
const PEDLEY: &str = "J. B. Pedley, Thermochemical Data and Structures of Organic Compounds, TRC Data Series, 1994 (a \
                      machine-readable copy; the printed table was not seen); ± is twice the standard deviation of the mean \
                      (from memory)";

/// A figure of another table, kJ/mol, with its standard uncertainty.
struct Printed {
    value: f64,
    u: f64,
    source: &'static str,
}

/// Of a table that states no uncertainty: the rounding of a figure with that many decimals is known, and no more.
fn rounded(value: f64, decimals: i32, source: &'static str) -> Printed {
    Printed { value, u: 0.5 * 10_f64.powi(-decimals) / 3_f64.sqrt(), source }
}

struct Row {
    id: String,
    got: f64,
    u_got: f64,
    printed: Printed,
}

impl Row {
    fn of(id: &str, got: &Quantity, printed: Printed) -> Row {
        let u_got = got.spread().u().unwrap_or(0.0) / 1000.0;
        Row { id: id.to_owned(), got: got.si() / 1000.0, u_got, printed }
    }

    fn residual(&self) -> f64 {
        self.got - self.printed.value
    }

    /// In units of its u.
    fn share(&self) -> f64 {
        self.residual() / (self.u_got * self.u_got + self.printed.u * self.printed.u).sqrt()
    }

    fn line(&self) -> String {
        let Printed { value, u, source } = &self.printed;
        format!(
            "{:8.1} u  {}: {:.3} (u {:.3}) against {value:.3} (u {u:.4}), {:+.3} kJ/mol; {source}",
            self.share(),
            self.id,
            self.got,
            self.u_got,
            self.residual()
        )
    }
}

fn enthalpy(desk: &Desk, equation: &str, t: &str) -> Quantity {
    desk.ask(&ENTHALPY, equation, t, &[]).unwrap_or_else(|fault| panic!("{equation} at {t}: {fault}"))
}

/// Vaporisation: the records' liquid and ideal gas against printed figures of the saturated vapour.
fn vaporisations(desk: &Desk) -> Vec<Row> {
    let mut rows = Vec::new();
    for (name, t_k, value, decimals) in [
        ("methanol", 298.15, 37.43, 2),
        ("methanol", 337.75, 35.21, 2),
        ("ethanol", 298.15, 42.32, 2),
        ("ethanol", 351.44, 38.56, 2),
        ("toluene", 298.15, 38.01, 2),
        ("toluene", 383.78, 33.18, 2),
        ("n-hexane", 298.15, 31.56, 2),
        ("n-heptane", 298.15, 36.57, 2),
        ("n-heptane", 371.55, 31.77, 2),
        ("n-octane", 298.15, 41.49, 2),
        ("n-octane", 398.82, 34.41, 2),
        ("CCl4", 298.15, 32.43, 2),
        ("dichloromethane", 298.15, 28.82, 2),
        ("Br2", 298.15, 30.91, 2),
        ("Br2", 331.95, 29.96, 2),
        ("Hg", 629.769, 59.11, 2),
        ("benzene", 298.15, 33.83, 2),
        ("N2H4", 298.15, 44.7, 1),
    ] {
        let got = enthalpy(desk, &format!("{name}(l) -> {name}(g)"), &format!("{t_k} K"));
        rows.push(Row::of(&format!("vaporisation of {name} at {t_k} K"), &got, rounded(value, decimals, CRC)));
    }
    for (t_k, value, decimals) in [(273.16, 45.0546, 4), (298.15, 43.9875, 4), (373.124, 40.651, 3)] {
        let got = enthalpy(desk, "H2O(l) -> H2O(g)", &format!("{t_k} K"));
        rows.push(Row::of(&format!("vaporisation of water at {t_k} K"), &got, rounded(value, decimals, IAPWS)));
    }
    rows
}

/// The same of water with the step from the ideal gas to the saturated vapour, p (B − T dB/dT).
fn water_with_the_step(desk: &Desk) -> Vec<Row> {
    // B in m³/mol and dB/dT in m³/(mol K) are the zero-density limit of IAPWS-95; at 373.15 K, not 0.026 K below.
    let step = |t_k: f64, p_pa: f64, b: f64, slope: f64| p_pa * (b - t_k * slope) / 1000.0;
    [
        (298.15, 43.9875, step(298.15, 3169.929, -0.001_240_9, 2.19e-5)),
        (373.124, 40.651, step(373.15, 101_323.93, -0.000_451_13, 4.664e-6)),
    ]
    .map(|(t_k, value, step)| {
        let got = enthalpy(desk, "H2O(l) -> H2O(g)", &format!("{t_k} K"));
        // The real vapour lies below the ideal gas.
        let printed = rounded(value - step, 3, IAPWS);
        Row::of(&format!("vaporisation of water at {t_k} K, to the ideal gas"), &got, printed)
    })
    .into()
}

fn fusions(desk: &Desk) -> Vec<Row> {
    let of = |id: &str, t_k: f64| {
        let given = vec![Value::Text(id.into())];
        let substance = card::call(&desk.cx(), &SUBSTANCE, given).unwrap();
        let card: &'static Card = &SUBSTANCE_ENTHALPY;
        match card::call(&desk.cx(), card, vec![substance, Value::Text(format!("{t_k} K").into())]).unwrap() {
            Value::Quantity(value) => value.si(),
            other => panic!("{}", other.sort()),
        }
    };
    // The step of the path at the transition of the shipped data, against another table's enthalpy of fusion.
    [("Pb(cr)", 600.65, 4.774), ("Al(cr)", 933.61, 10.71), ("Zn(cr)", 692.73, 7.068), ("Cu(cr)", 1358.0, 13.26)]
        .into_iter()
        .map(|(id, t_k, value): (&str, f64, f64)| {
            let got = (of(id, t_k.next_up()) - of(id, t_k)) / 1000.0;
            let decimals = if value > 10.0 { 2 } else { 3 };
            Row { id: format!("fusion of {id}"), got, u_got: 0.0, printed: rounded(value, decimals, CRC_FUSION) }
        })
        .collect()
}

/// Formation of a liquid against Pedley, and of its gas against Pedley's liquid and the other table's vaporisation.
fn formations(desk: &Desk) -> Vec<Row> {
    let mut rows = Vec::new();
    for (name, elements, value, limits, vaporisation) in [
        ("ethanol", "2 C(cr,graphite) + 3 H2(g) + 1/2 O2(g)", -277.6, 0.3, Some(42.32)),
        ("methanol", "C(cr,graphite) + 2 H2(g) + 1/2 O2(g)", -239.1, 0.2, Some(37.43)),
        ("toluene", "7 C(cr,graphite) + 4 H2(g)", 12.4, 0.6, Some(38.01)),
        ("acetic acid", "2 C(cr,graphite) + 2 H2(g) + O2(g)", -484.3, 0.2, None),
    ] {
        let liquid = enthalpy(desk, &format!("{elements} -> {name}(l)"), "298.15 K");
        let pedley = Printed { value, u: limits / 2.0, source: PEDLEY };
        rows.push(Row::of(&format!("formation of {name}(l)"), &liquid, pedley));
        let Some(vaporisation) = vaporisation else { continue };
        let gas = enthalpy(desk, &format!("{elements} -> {name}(g)"), "298.15 K");
        let other = rounded(vaporisation, 2, CRC);
        let u = (limits * limits / 4.0 + other.u * other.u).sqrt();
        let printed = Printed { value: value + vaporisation, u, source: PEDLEY };
        rows.push(Row::of(&format!("formation of {name}(g), over the liquid and its vaporisation"), &gas, printed));
    }
    rows
}

/// What misses by more than 2 u, by how much in kJ/mol, and why.
const KNOWN: &[(&str, f64, &str)] = &[
    ("fusion of Zn(cr)", 0.232, "7.300 and 7.068 kJ/mol: the tables differ by 3 %, and neither states u"),
    ("fusion of Pb(cr)", 0.038, "the tables differ by 0.8 %, and neither states u"),
    ("fusion of Cu(cr)", -0.120, "the tables differ by 0.9 %, and neither states u"),
    ("fusion of Al(cr)", -0.010, "the tables differ by 0.1 %, and neither states u"),
    (
        "vaporisation of water at 373.124 K",
        0.227,
        "the printed figure is of the saturated vapour; the row with that step closes",
    ),
    ("vaporisation of benzene at 298.15 K", -0.030, "the formation enthalpies in use state no u"),
    ("vaporisation of N2H4 at 298.15 K", 0.100, "the formation enthalpies in use state no u"),
    ("vaporisation of Hg at 629.769 K", 0.096, "the heat capacities over 330 K state no u; 0.16 %"),
    (
        "vaporisation of methanol at 298.15 K",
        0.270,
        "the printed figure is of the saturated vapour, and alcohols associate in it",
    ),
    (
        "vaporisation of methanol at 337.75 K",
        0.908,
        "the printed figure is of the saturated vapour, and alcohols associate in it",
    ),
    (
        "vaporisation of ethanol at 351.44 K",
        0.972,
        "the printed figure is of the saturated vapour, and alcohols associate in it",
    ),
    (
        "vaporisation of Br2 at 331.95 K",
        -0.405,
        "not resolved: both agree at 298.15 K, and the vapour's imperfection would have the other sign",
    ),
    ("formation of methanol(l)", 0.700, "ATcT and Pedley differ by more than they state"),
    ("formation of ethanol(l)", 0.570, "ATcT and Pedley differ by more than they state"),
    ("formation of acetic acid(l)", 0.720, "ATcT and Pedley differ by more than they state"),
    (
        "formation of methanol(g), over the liquid and its vaporisation",
        0.970,
        "as its liquid, and the vaporisation at saturation adds to it",
    ),
    (
        "formation of ethanol(g), over the liquid and its vaporisation",
        0.710,
        "as its liquid, and the vaporisation at saturation adds to it",
    ),
];

#[test]
fn cycles_close_with_other_tables_but_for_a_known_list() {
    let desk = Desk::new();
    let mut rows = vaporisations(&desk);
    rows.extend(water_with_the_step(&desk));
    rows.extend(fusions(&desk));
    rows.extend(formations(&desk));
    rows.sort_by(|a, b| b.share().abs().total_cmp(&a.share().abs()));
    let why = |id: &str| KNOWN.iter().find(|(known, _, _)| *known == id).map(|(_, by, why)| (*by, *why));
    for row in &rows {
        println!("{}", row.line());
        if let Some((by, why)) = why(&row.id) {
            println!("              known: {why}");
            // Bound: half a unit of the last digit here. A known miss stays as large as it is known to be.
            assert!((row.residual() - by).abs() <= 6e-4, "{}: {:.4}, known as {by}", row.id, row.residual());
        }
    }
    let misses: Vec<&str> = rows.iter().filter(|row| row.share().abs() > 2.0).map(|row| &*row.id).collect();
    let new: Vec<&&str> = misses.iter().filter(|id| why(id).is_none()).collect();
    assert!(new.is_empty(), "more than 2 u: {new:?}");
    let gone: Vec<&str> = KNOWN.iter().map(|(id, _, _)| *id).filter(|id| !misses.contains(id)).collect();
    assert!(gone.is_empty(), "no longer more than 2 u: {gone:?}");
}

#[test]
fn a_vaporisation_of_the_records_names_the_step_to_the_saturated_vapour() {
    let desk = Desk::new();
    let value = enthalpy(&desk, "H2O(l) -> H2O(g)", "373.124 K");
    // 40.651 kJ/mol at the normal boiling point (IAPWS-95): the step is 0.23 kJ/mol. Bound: half a unit of its last digit.
    let step = value.si() / 1000.0 - 40.651;
    assert!((step - 0.23).abs() <= 0.005, "{step}");
    let record = Report::of(&desk.cx(), "steam", &value, &[]).record;
    let row = record.assumptions.iter().find(|row| row.id == "saturated-vapour-ideal").unwrap();
    assert_eq!((&*row.status, &*row.subject), ("strained", "H2O(g)"));
    // p (B - T dB/dT) = -222.05 J/mol with B = -451.13 cm³/mol and dB/dT = 4.664 cm³/(mol K) at 373.15 K: IAPWS-95 (W.
    // Wagner, A. Pruss, J. Phys. Chem. Ref. Data 31, 387 (2002)) at zero density, computed from the published formulation.
    // Bound: the shipped fit is off by up to 5.6 % of dB/dT from it, as its record says; p T dB/dT is 176 J/mol.
    let price: f64 = row.price.as_ref().unwrap().parse().unwrap();
    assert!((price - 0.22205).abs() <= 0.056 * 0.1763, "{price}");
    // Water that is formed as a liquid, or steam that takes part, is not evaporated.
    for equation in ["2 H2(g) + O2(g) -> 2 H2O(l)", "CO(g) + H2O(g) -> CO2(g) + H2(g)"] {
        let record = Report::of(&desk.cx(), "none", &enthalpy(&desk, equation, "373.124 K"), &[]).record;
        assert!(record.assumptions.iter().all(|row| row.id != "saturated-vapour-ideal"), "{equation}");
    }
}
