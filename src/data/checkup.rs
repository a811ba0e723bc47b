//! What is likely wrong with records: each function in itself, and each record against others of the same substance.

use super::catalog::{Catalog, T_REFERENCE_K};
use super::doctor::{Finding, Printed, swapped};
use super::function::Function;
use super::own::Own;
use super::substance::Substance;

/// Calories in joules.
const CALORIE: f64 = 4.184;

/// A function in itself: joins, sign and size of Cp. `atoms` are those of the formula, 0 where they are not known.
pub fn of_function(function: &Function, atoms: f64, is_gas: bool) -> Vec<Finding> {
    let mut findings = Vec::new();
    let r = function.r_of_source;
    let cp = |at: usize, t: f64| r * function.intervals[at].powers().map(|power| power.value(t)).sum::<f64>();
    for at in 1..function.intervals.len() {
        let t = function.intervals[at].t_min;
        let (low, high) = (cp(at - 1, t), cp(at, t));
        let ((h0, s0), (h1, s1)) = (function.intervals[at - 1].h_and_s(t), function.intervals[at].h_and_s(t));
        // A tenth of Cp: heat capacities of one phase do not jump, while functions that were fitted piece by piece do a bit.
        let jumps = [
            ("Cp", high - low, 0.1 * low.abs(), "J/(mol K)"),
            ("H", r * (h1 - h0), 100.0, "J/mol"),
            ("S", r * (s1 - s0), 0.2, "J/(mol K)"),
        ];
        for (name, step, allowed, unit) in jumps {
            if step.abs() > allowed && !function.warnings.iter().any(|warning| warning.contains("steps")) {
                let (place, what) = (format!("join at {t} K"), format!("{name} jumps by {step:.1} {unit}"));
                findings.push(Finding { place, what, likely: None });
            }
        }
    }
    let ends = (function.t_min, function.t_max);
    let points = function
        .intervals
        .iter()
        .enumerate()
        .flat_map(|(at, one)| (0..9).map(move |n| (at, one.t_min + (one.t_max - one.t_min) * f64::from(n) / 8.0)));
    let below = points.clone().find(|&(at, t)| cp(at, t) <= 0.0);
    if let Some((at, t)) = below {
        let place = format!("Cp at {t:.0} K");
        let what = format!("it is {:.1} J/(mol K), so the enthalpy would fall on heating", cp(at, t));
        findings.push(Finding { place, what, likely: Some("a coefficient has the wrong sign".to_owned()) });
        return findings;
    }
    let t = T_REFERENCE_K.clamp(ends.0, ends.1);
    let home = function.intervals.iter().position(|one| one.t_min <= t && t <= one.t_max).unwrap_or(0);
    let value = cp(home, t);
    let (least, most) =
        if is_gas { (20.7_f64.max(4.0 * atoms), 20.8 + 50.0 * atoms) } else { (4.0 * atoms, 60.0 * atoms) };
    if atoms > 0.0 && t > 250.0 && !(least..=most).contains(&value) {
        let likely =
            [(CALORIE, "it is in calories, read as joules"), (1.0 / CALORIE, "it is in joules, read as calories")];
        let likely = likely.into_iter().find(|(factor, _)| (least..=most).contains(&(value * factor)));
        findings.push(Finding {
            place: format!("Cp at {t:.0} K"),
            what: format!("{value:.1} J/(mol K) for {atoms} atoms is outside {least:.0} to {most:.0} J/(mol K)"),
            likely: likely.map(|(_, words)| words.to_owned()),
        });
    }
    findings
}

fn atoms(substance: &Substance) -> f64 {
    substance.species.composition.iter().map(|(_, count)| count.to_f64()).sum()
}

/// All functions of a catalogue, each in itself.
pub fn of_catalog(catalog: &Catalog) -> Vec<(String, Finding)> {
    let mut findings = Vec::new();
    for substance in catalog.substances() {
        if let Some(function) = &substance.function {
            let found = of_function(function, atoms(substance), substance.species.is_gas());
            findings.extend(found.into_iter().map(|one| (substance.id().to_owned(), one)));
        }
    }
    findings
}

/// A file of one's own: its functions in themselves, and its figures against those of the shipped tables.
pub fn of_own(own: &Own, base: &Catalog, laid: &Catalog) -> Vec<(String, Finding)> {
    let mut findings = Vec::new();
    for function in &own.functions {
        let Ok(substance) = laid.find(&function.id) else { continue };
        let is_gas = substance.species.is_gas();
        let mut found = of_function(function, atoms(&substance), is_gas);
        if let Some(stated) = own.formations.iter().find(|one| one.id == function.id)
            && function.covers(T_REFERENCE_K)
        {
            let (h, dhf) = (function.h_plainly(T_REFERENCE_K), stated.dhf.value);
            // A constant of integration that was printed to a few digits.
            if function.zero.enthalpy && (h - dhf).abs() > 100.0_f64.max(3.0 * stated.dhf.last_place) {
                found.push(Finding {
                    place: "constants of heat_capacity".to_owned(),
                    what: format!(
                        "H at 298.15 K is {:.2} kJ/mol, and formation_enthalpy {:.2} kJ/mol",
                        h / 1e3,
                        dhf / 1e3
                    ),
                    likely: None,
                });
            }
        }
        if let Some(other) = base.find(&function.id).ok().and_then(|known| known.function.clone())
            && function.covers(T_REFERENCE_K)
            && other.covers(T_REFERENCE_K)
        {
            let ratio = other.cp_plainly(T_REFERENCE_K) / function.cp_plainly(T_REFERENCE_K);
            let slip =
                [(CALORIE, "it is in calories, read as joules"), (1.0 / CALORIE, "it is in joules, read as calories")];
            let likely = slip.into_iter().find(|(factor, _)| (ratio / factor - 1.0).abs() < 0.05);
            if (ratio - 1.0).abs() > 0.05 && !found.iter().any(|one| one.likely.is_some()) {
                found.push(Finding {
                    place: "Cp at 298.15 K".to_owned(),
                    what: format!(
                        "{:.1} J/(mol K), and the shipped function has {:.1} J/(mol K)",
                        function.cp_plainly(T_REFERENCE_K),
                        other.cp_plainly(T_REFERENCE_K)
                    ),
                    likely: likely.map(|(_, words)| words.to_owned()),
                });
            }
        }
        findings.extend(found.into_iter().map(|one| (function.id.to_string(), one)));
    }
    for formation in &own.formations {
        let Ok(known) = base.find(&formation.id) else { continue };
        let Some(other) = known.formations.first() else { continue };
        let (a, b) = (formation.dhf.value, other.dhf.value);
        let allowed = 5.0 * (formation.dhf.u.unwrap_or(0.0) + other.dhf.u.unwrap_or(0.0))
            + 1000.0_f64.max(formation.dhf.last_place);
        if (a - b).abs() <= allowed {
            continue;
        }
        let printed = Printed { si: a, digit: formation.dhf.last_place };
        let likely = if (a + b).abs() <= allowed {
            Some("its sign is the other way".to_owned())
        } else if (a * CALORIE - b).abs() <= 0.01 * b.abs() {
            Some("it is in kilocalories, read as kilojoules".to_owned())
        } else {
            swapped(&printed, b, allowed, 1000.0)
                .map(|figure| format!("{figure} kJ/mol, two digits having changed places"))
        };
        let what = format!("{:.2} kJ/mol, and {} has {:.2} kJ/mol", a / 1e3, other.dataset, b / 1e3);
        findings.push((formation.id.to_string(), Finding { place: "formation_enthalpy".to_owned(), what, likely }));
    }
    findings
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::data::own;
    use crate::source::Embedded;

    /// What is found in a file of one record, all figures invented but those of carbon dioxide and water.
    fn found(record: &str) -> Vec<(String, Finding)> {
        let text = format!(
            r#"{{"schema": "hessbook-records/1", "dataset": {{"id": "planted", "short": "planted", "publication": "invented",
            "terms": "none"}}, "records": [{record}]}}"#
        );
        let base = Catalog::shipped();
        let own = own::read(&Embedded { path: "planted.json", bytes: text.as_bytes(), sha256: "" }, &base).unwrap();
        let (laid, _) = base.overlaid(&own).unwrap();
        of_own(&own, &base, &laid)
    }

    fn liquid(unit: &str, a: f64, b: f64, further: &str) -> String {
        format!(
            r#"{{"id": "resin(l)", "formula": "C7H8O", "source": "invented", "heat_capacity": {{"form": "maier-kelley",
            "unit": "{unit}", "ranges": [{{"from": "280 K", "to": "330 K", "coefficients": {{"a": {a}, "b": {b}, "c": 0, "d": 0}}}}
            {further}]}}}}"#
        )
    }

    #[test]
    fn nothing_is_found_in_the_shipped_functions() {
        let all = of_catalog(&Catalog::shipped());
        assert!(all.is_empty(), "{} findings: {:#?}", all.len(), &all[..all.len().min(12)]);
    }

    #[test]
    fn planted_errors_in_records_are_found_and_named() {
        let water =
            |dhf: &str| found(&format!(r#"{{"id": "H2O(l)", "formation_enthalpy": "{dhf}", "source": "planted"}}"#));
        assert!(water("-285.83(4) kJ/mol").is_empty());
        for (dhf, words) in [
            ("-258.83(4) kJ/mol", "-285.83 kJ/mol, two digits"),
            ("285.83(4) kJ/mol", "sign"),
            ("-68.32 kJ/mol", "kilocalories"),
        ] {
            let all = water(dhf);
            assert!(
                all.iter().any(|(_, one)| one.likely.as_deref().is_some_and(|l| l.contains(words))),
                "{dhf}: {all:?}"
            );
        }
        // 200 J/(mol K) for the 16 atoms of a liquid is ordinary; the same figure in calories, read as joules, is not.
        assert!(found(&liquid("J/(mol K)", 80.0, 0.4, "")).is_empty());
        let calories = found(&liquid("J/(mol K)", 80.0 / CALORIE, 0.4 / CALORIE, ""));
        assert!(
            calories.iter().any(|(_, one)| one.likely.as_deref() == Some("it is in calories, read as joules")),
            "{calories:?}"
        );
        let sign = found(&liquid("J/(mol K)", -80.0, 0.1, ""));
        assert!(sign.iter().any(|(_, one)| one.what.contains("fall on heating")), "{sign:?}");
        let jump = r#", {"from": "330 K", "to": "400 K", "coefficients": {"a": 120, "b": 0.4, "c": 0, "d": 0}}"#;
        let joined = found(&liquid("J/(mol K)", 80.0, 0.4, jump));
        assert!(joined.iter().any(|(_, one)| one.place == "join at 330 K"), "{joined:?}");
    }
}
