//! The shipped tables against themselves, against each other, and against what the report says of its own functions.

use std::collections::{BTreeMap, BTreeSet};
use std::sync::Arc;

use serde_json::Value;

use hessbook::chem::element::Element;
use hessbook::chem::formula::Formula;
use hessbook::chem::species::SpeciesName;
use hessbook::data::catalog::{Catalog, T_REFERENCE_K};
use hessbook::data::dataset::DatasetId;
use hessbook::data::function::{Function, Interval};
use hessbook::data::substance::Substance;
use hessbook::data::transition::TransitionKind;
use hessbook::num::math::ln;
use hessbook::source::{Embedded, STDLIB, embedded};

const TABLES: [(&str, usize); 5] = [
    ("stdlib/data/nasa-tp-2002-211556-functions.json", 347),
    ("stdlib/data/nasa-tp-2002-211556-formation.json", 251),
    ("stdlib/data/nasa-tp-2002-211556-transitions.json", 80),
    ("stdlib/data/codata-1989.json", 148),
    ("stdlib/data/atct-1.112.json", 125),
];

fn json(path: &str) -> Value {
    serde_json::from_slice(embedded(path).bytes).unwrap_or_else(|error| panic!("{path}: {error}"))
}

fn records(path: &str) -> Vec<Value> {
    json(path)["records"].as_array().unwrap().clone()
}

fn substance(id: &str) -> Arc<Substance> {
    Catalog::shipped().find(id).unwrap_or_else(|error| panic!("{error}"))
}

/// Report what failed, all of it.
fn none(misses: Vec<String>) {
    assert!(misses.is_empty(), "{} misses:\n{}", misses.len(), misses.join("\n"));
}

// The report's equations (header of Appendix D), written out here so that the constants are tested without the program.
fn cp_over_r(i: &Interval, t: f64) -> f64 {
    i.a[0] / (t * t) + i.a[1] / t + i.a[2] + t * (i.a[3] + t * (i.a[4] + t * (i.a[5] + t * i.a[6])))
}

fn h_over_r(i: &Interval, t: f64) -> f64 {
    let powers = i.a[2] + t * (i.a[3] / 2.0 + t * (i.a[4] / 3.0 + t * (i.a[5] / 4.0 + t * i.a[6] / 5.0)));
    -i.a[0] / t + i.a[1] * ln(t) + t * powers + i.b[0]
}

fn s_over_r(i: &Interval, t: f64) -> f64 {
    let powers = t * (i.a[3] + t * (i.a[4] / 2.0 + t * (i.a[5] / 3.0 + t * i.a[6] / 4.0)));
    -i.a[0] / (2.0 * t * t) - i.a[1] / t + i.a[2] * ln(t) + powers + i.b[1]
}

fn at(function: &Function, t: f64) -> &Interval {
    function.intervals.iter().find(|i| i.t_min <= t && t <= i.t_max).unwrap()
}

fn functions() -> Vec<Arc<Function>> {
    Catalog::shipped().substances().filter_map(|s| s.function.clone()).collect()
}

#[test]
fn each_table_has_its_records_and_the_catalogue_has_them_all() {
    for (path, count) in TABLES {
        assert_eq!(records(path).len(), count, "{path}");
    }
    let catalog = Catalog::shipped();
    let entered: BTreeMap<&str, usize> =
        catalog.datasets().iter().flat_map(|d| &d.tables).map(|table| (&*table.path, table.records)).collect();
    assert_eq!(entered, TABLES.into_iter().collect());
    assert_eq!(functions().len(), 347);
    let table_rows = |id: &str| {
        let of = DatasetId::new(id);
        catalog.substances().filter(|s| s.formation(&of).is_some_and(|f| !f.dhf.unit.starts_with("J/"))).count()
    };
    assert_eq!(
        [table_rows("nasa-tp-2002-211556"), table_rows("codata-1989"), table_rows("atct-1.112")],
        [251, 148, 125]
    );
}

#[test]
fn each_record_says_where_it_was_printed_and_how_it_was_obtained() {
    let said = |value: &Value| value.as_str().is_some_and(|text| text.len() > 8);
    let mut misses = Vec::new();
    for (path, _) in TABLES {
        let page = json(path);
        for member in ["publication", "terms", "uncertainty"] {
            assert!(said(&page["dataset"][member]), "{path}: {member}");
        }
        for record in page["records"].as_array().unwrap() {
            if !said(&record["source"]) || !(said(&record["obtained"]) || said(&page["obtained"])) {
                misses.push(format!("{path}: {}", record["id"]));
            }
        }
    }
    none(misses);
}

#[test]
fn a_record_without_source_is_refused() {
    let file = embedded("stdlib/data/codata-1989.json");
    let text = std::str::from_utf8(file.bytes).unwrap();
    let source = "\"source\": \"CODATA Key Values for Thermodynamics (Cox, Wagman, Medvedev 1989)\", ";
    let cut = text.replacen(source, "", 1);
    assert_ne!(cut, text);
    let cut = Embedded { bytes: cut.leak().as_bytes(), ..file };
    let fault = Catalog::from_files(&[cut]).unwrap_err();
    assert!(fault.to_string().contains("missing field `source`"), "{fault}");
}

/// Handbooks are compared with, in `check` and `warnings`; no figure is taken from one. No software is a source.
#[test]
fn no_figure_comes_from_a_handbook_or_a_program() {
    let handbooks = ["CRC", "Pedley", "JANAF", "WebBook", "Shomate", "Poling", "Perry", "Zabransky", "VDI", "Landolt"];
    let software =
        ["python", "library", "package", "scipy", "numpy", "chemicals", "periodictable", "github", "licensed"];
    let mut misses = Vec::new();
    for file in STDLIB.iter().filter(|file| file.path.starts_with("stdlib/data/")) {
        let text = std::str::from_utf8(file.bytes).unwrap().to_lowercase();
        misses.extend(software.iter().filter(|w| text.contains(*w)).map(|w| format!("{}: {w}", file.path)));
    }
    for (path, _) in TABLES {
        let page = json(path);
        let header = [&page["dataset"]["id"], &page["dataset"]["publication"], &page["title"]].map(Value::to_string);
        let sources = page["records"].as_array().unwrap().iter().map(|record| record["source"].to_string());
        for text in header.into_iter().chain(sources) {
            misses.extend(handbooks.iter().filter(|w| text.contains(*w)).map(|w| format!("{path}: {w} in {text}")));
        }
        let text = std::str::from_utf8(embedded(path).bytes).unwrap();
        assert!(!text.contains("unconfirmed"), "{path}");
    }
    none(misses);
}

#[test]
fn temperature_ranges_are_in_order_and_join() {
    let mut misses = Vec::new();
    for function in functions() {
        let ranges: Vec<(f64, f64)> = function.intervals.iter().map(|i| (i.t_min, i.t_max)).collect();
        let ordered = ranges.iter().all(|(low, high)| 0.0 < *low && low < high);
        if !ordered || ranges.windows(2).any(|pair| pair[0].1 != pair[1].0) {
            misses.push(format!("{}: {ranges:?}", function.id));
        }
        assert_eq!((function.t_min, function.t_max), (ranges[0].0, ranges[ranges.len() - 1].1));
    }
    none(misses);
}

#[test]
fn intervals_meet_in_value_unless_a_warning_says_otherwise() {
    // The report gives its constants to ten digits; at 2000 K and above that leaves tenths of a J/mol in H and S T,
    // and Cp is good to 0.1 J/(mol K). Larger steps are the report's own and are named in the record.
    let mut misses = Vec::new();
    for function in functions() {
        for pair in function.intervals.windows(2) {
            let t = pair[0].t_max;
            let r = function.r_of_source;
            let step = |f: fn(&Interval, f64) -> f64| r * (f(&pair[1], t) - f(&pair[0], t)).abs();
            let steps = [("H", step(h_over_r), 0.5), ("S", step(s_over_r) * t, 0.5), ("Cp", step(cp_over_r), 0.1)];
            for (name, step, allowed) in steps {
                let warned = function.warnings.iter().any(|w| w.contains("steps") && w.contains(&format!("{t} K")));
                if step > allowed && !warned {
                    misses.push(format!("{}: {name} steps by {step} at {t} K", function.id));
                }
            }
        }
    }
    none(misses);
}

#[test]
fn functions_give_back_their_formation_enthalpy() {
    // The report's own claim is its third decimal in kJ/mol; ten digits of b1 and a1 to a7 leave up to 1 J/mol.
    let allowed = 1.0;
    let mut misses = Vec::new();
    let mut tested = 0;
    for function in functions().iter().filter(|f| f.covers(T_REFERENCE_K)) {
        let h = function.r_of_source * h_over_r(at(function, T_REFERENCE_K), T_REFERENCE_K);
        tested += 1;
        if (h - function.dhf_298).abs() > allowed {
            misses.push(format!("{}: {h} against {}", function.id, function.dhf_298));
        }
    }
    assert_eq!(tested, 271);
    none(misses);
}

#[test]
fn functions_give_back_the_printed_entropy_and_heat_capacity() {
    // NASA/TP-2002-211556, Tables B1 and B2, print three decimals: half a unit of the third, and a hundredth of that for
    // the digits of the constants.
    let allowed = 0.000_505;
    let nasa = DatasetId::new("nasa-tp-2002-211556");
    let mut misses = Vec::new();
    let mut tested = 0;
    for substance in Catalog::shipped().substances() {
        let (Some(function), Some(row)) = (&substance.function, substance.formation(&nasa)) else { continue };
        let (Some(s), Some(cp)) = (&row.s, &row.cp) else { continue };
        let interval = at(function, T_REFERENCE_K);
        let got = [s_over_r, cp_over_r].map(|f: fn(&Interval, f64) -> f64| f(interval, T_REFERENCE_K));
        tested += 1;
        for (name, got, want) in [("S", got[0] * function.r_of_source, s), ("Cp", got[1] * function.r_of_source, cp)] {
            assert_eq!(want.last_place, 0.001);
            if (got - want.value).abs() > allowed {
                misses.push(format!("{} {name}: {got} against {}", substance.id(), want.printed));
            }
        }
    }
    assert_eq!(tested, 251);
    none(misses);
}

#[test]
fn h298_minus_h0_is_below_what_the_third_law_allows() {
    // H(T) - H(0) = ∫Cp dT is at most T ∫Cp/T dT = T S, since Cp is positive; no residual entropy exceeds the gap.
    let mut misses = Vec::new();
    for substance in Catalog::shipped().substances() {
        for formation in &substance.formations {
            if let (Some(h), Some(s)) = (&formation.h298_minus_h0, &formation.s)
                && !(0.0..T_REFERENCE_K * s.value).contains(&h.value)
            {
                misses.push(format!("{} in {}: {} against S {}", substance.id(), formation.dataset, h.value, s.value));
            }
        }
    }
    none(misses);
}

#[test]
fn transitions_are_what_their_two_functions_say() {
    // The records round dH to 0.1 J/mol and dS to 0.0001 J/(mol K). The functions of ice and water meet to 0.7 J/mol in
    // Gibbs energy, all others to 0.1 (report's constants).
    let catalog = Catalog::shipped();
    let mut misses = Vec::new();
    let mut kinds: BTreeMap<TransitionKind, BTreeSet<Arc<str>>> = BTreeMap::new();
    for substance in catalog.substances() {
        for transition in catalog.transitions_of(substance) {
            kinds.entry(transition.kind).or_default().insert(transition.id.clone());
            let ends = [&transition.from, &transition.to].map(|id| catalog.find(id).unwrap_or_else(|e| panic!("{e}")));
            let [low, high] = ends.map(|end| end.function.clone().unwrap_or_else(|| panic!("{end} has no function")));
            let t = transition.t_k;
            assert!(low.covers(t) && high.covers(t), "{}", transition.id);
            if low.id == high.id {
                assert!(low.intervals.iter().any(|i| i.t_max == t), "{}", transition.id);
                assert_eq!((transition.kind, transition.dh), (TransitionKind::SecondOrder, 0.0));
                continue;
            }
            assert_eq!((low.t_max, high.t_min), (t, t), "{}", transition.id);
            let (low_i, high_i) = (&low.intervals[low.intervals.len() - 1], &high.intervals[0]);
            let dh = low.r_of_source * (h_over_r(high_i, t) - h_over_r(low_i, t));
            let ds = low.r_of_source * (s_over_r(high_i, t) - s_over_r(low_i, t));
            let gap = if &*low.id == "H2O(cr,ice-ih)" { 0.7 } else { 0.1 };
            if (dh - transition.dh).abs() > 0.05 || (ds - transition.ds).abs() > 0.000_05 || (dh - t * ds).abs() > gap {
                misses.push(format!("{}: dH {dh}, dS {ds}, dG {}", transition.id, dh - t * ds));
            }
        }
    }
    let counts: Vec<(TransitionKind, usize)> = kinds.iter().map(|(kind, ids)| (*kind, ids.len())).collect();
    let expected = [(TransitionKind::Fusion, 47), (TransitionKind::SolidSolid, 26), (TransitionKind::SecondOrder, 7)];
    assert_eq!(counts, expected);
    none(misses);
}

#[test]
fn a_phase_that_starts_above_298_k_continues_the_enthalpy_of_one_that_does_not() {
    let catalog = Catalog::shipped();
    let mut misses = Vec::new();
    let mut continued = 0;
    for substance in catalog.substances().filter(|s| s.function.is_some()) {
        let Some(reference) = catalog.reference_phase(substance) else {
            misses.push(format!("{substance} has no reference phase"));
            continue;
        };
        assert!(!reference.formations.is_empty(), "{reference}");
        let [own, base] = [substance, &reference].map(|s| s.function.as_ref().unwrap().dhf_298);
        if substance.id() != reference.id() {
            continued += 1;
            // Ice has a formation enthalpy of its own in the report; every other phase repeats its reference's.
            if own != base && substance.id() != "H2O(cr,ice-ih)" {
                misses.push(format!("{substance} has {own}, its reference {reference} has {base}"));
            }
        }
    }
    assert_eq!(continued, 76);
    none(misses);
    let of = |id: &str| catalog.reference_phase(&substance(id)).map(|s| s.id().to_owned());
    assert_eq!(of("Fe(l)").as_deref(), Some("Fe(cr,alpha)"));
    assert_eq!(of("H2O(cr,ice-ih)").as_deref(), Some("H2O(l)"));
    assert_eq!(of("H2O(g)").as_deref(), Some("H2O(g)"));
    assert_eq!(of("AgCl(cr)"), None);
}

#[test]
fn formulas_have_the_atoms_that_the_report_prints() {
    let mut misses = Vec::new();
    for record in records("stdlib/data/nasa-tp-2002-211556-functions.json") {
        let formula = record["formula"].as_str().unwrap();
        let printed: BTreeMap<Element, String> = record["composition"]
            .as_object()
            .unwrap()
            .iter()
            .map(|(symbol, count)| (Element::from_symbol(symbol).unwrap(), count.to_string()))
            .collect();
        let read: BTreeMap<Element, String> = match Formula::parse_record(formula) {
            Ok(formula) => formula.composition().iter().map(|(element, n)| (element, n.to_string())).collect(),
            Err(error) => {
                misses.push(format!("{formula}: {error}"));
                continue;
            }
        };
        if read != printed {
            misses.push(format!("{formula}: {read:?} against {printed:?}"));
        }
    }
    none(misses);
}

#[test]
fn records_gathered_under_one_substance_agree_in_atoms_and_nearly_in_enthalpy() {
    // Figures of two datasets for one substance differ by less than 3 kJ/mol, unless the record of the function
    // warns of it (old figures of the report). One filed under the wrong phase would be out by a vaporisation.
    let allowed = 3_000.0;
    let mut misses = Vec::new();
    for substance in Catalog::shipped().substances() {
        let name: SpeciesName = substance.id().parse().unwrap();
        assert_eq!(name.base, substance.species.entity.name());
        for formation in &substance.formations {
            let formula = Formula::parse_record(&formation.formula).unwrap();
            if (formula.composition(), formula.charge()) != (&substance.species.composition, substance.species.charge) {
                misses.push(format!("{substance}: {} in {}", formation.formula, formation.dataset));
            }
            let state = formation.id.parse::<SpeciesName>().unwrap().phase.unwrap().state;
            assert_eq!(state, substance.species.phase.state, "{substance}");
        }
        let datasets: BTreeSet<&DatasetId> = substance.formations.iter().map(|f| &f.dataset).collect();
        assert_eq!(datasets.len(), substance.formations.len(), "{substance} has two records of one dataset");
        let values: Vec<f64> = substance.formations.iter().map(|f| f.dhf.value).collect();
        let spread = values.iter().copied().fold(f64::MIN, f64::max) - values.iter().copied().fold(f64::MAX, f64::min);
        let warnings = substance.function.iter().flat_map(|function| &function.warnings);
        let warned = warnings.filter(|warning| warning.starts_with("dHf differs from")).count() > 0;
        if !values.is_empty() && spread > allowed && !warned {
            misses.push(format!("{substance}: {values:?} J/mol"));
        }
    }
    none(misses);
}

#[test]
fn figures_are_si_and_uncertainties_standard() {
    let [atct, codata, nasa] = ["atct-1.112", "codata-1989", "nasa-tp-2002-211556"].map(DatasetId::new);
    let catalog = Catalog::shipped();
    let order: Vec<&DatasetId> = catalog.datasets().iter().map(|dataset| &dataset.id).collect();
    assert_eq!(order, [&atct, &codata, &nasa]);
    assert_eq!(catalog.dataset(&atct).unwrap().divisor, Some(2.0));
    assert_eq!(catalog.dataset(&codata).unwrap().divisor, Some(2.0));
    assert_eq!(catalog.dataset(&nasa).unwrap().divisor, None);

    let water = substance("H2O(l)");
    let used: Vec<&DatasetId> = water.formations.iter().map(|f| &f.dataset).collect();
    assert_eq!(used, [&atct, &codata, &nasa]);
    // ATcT 1.112, from a machine-readable copy: -285.825 +- 0.027 kJ/mol, a 95 % figure too.
    let row = water.formation(&atct).unwrap();
    assert_eq!((row.dhf.value, row.dhf.u, &*row.dhf.printed), (-285_825.0, Some(13.5), "-285.825"));
    // CODATA Key Values 1989: -285.830 +- 0.040 kJ/mol, 69.95 +- 0.03 J/(mol K); half of a 95 % figure is standard.
    let row = water.formation(&codata).unwrap();
    assert_eq!((row.dhf.value, row.dhf.u, &*row.dhf.printed), (-285_830.0, Some(20.0), "-285.830"));
    let s = row.s.as_ref().unwrap();
    assert_eq!((s.value, s.u, &*s.unit), (69.95, Some(0.015), "J/(mol K)"));
    // NASA/TP-2002-211556, Table B2: no uncertainty, which is not zero.
    let row = water.formation(&nasa).unwrap();
    assert_eq!((row.dhf.value, row.dhf.u), (-285_830.0, None));

    let mut misses = Vec::new();
    for substance in catalog.substances() {
        let element = substance.species.composition.len() == 1 || substance.id() == "H+(aq)";
        for formation in &substance.formations {
            let stated = catalog.dataset(&formation.dataset).unwrap().divisor.is_some();
            let dhf = &formation.dhf;
            let fits = match dhf.u {
                Some(u) if dhf.is_convention() => u == 0.0 && element,
                // The largest printed figure is +- 8 kJ/mol, for Si(g) and U(g).
                Some(u) => stated && 0.0 < u && u <= 4_000.0,
                None => !stated && dhf.value != 0.0,
            };
            if !fits {
                misses.push(format!("{substance} in {}: {dhf:?}", formation.dataset));
            }
        }
    }
    none(misses);
}

#[test]
fn a_dataset_can_be_taken_away() {
    let files: Vec<Embedded> = STDLIB.iter().copied().filter(|file| !file.path.contains("atct")).collect();
    let catalog = Catalog::from_files(&files).unwrap();
    assert_eq!(catalog.datasets().len(), 2);
    assert_eq!(catalog.find("CO2(g)").unwrap().formations[0].dataset.as_str(), "codata-1989");
    // Only ATcT has these two; their names must not lead into the void.
    for gone in ["cyclohexane(g)", "chloroform(l)"] {
        assert_eq!(catalog.find(gone).unwrap_err().to_string(), format!("{gone} is not on record"));
    }
}
