//! Every shipped molecule against the published function of the same gas, worst first, and what explains each miss.
//!
//! The constants were selected by this very agreement, so the table tests the sums and not the constants. A miss is more
//! than 0.2 J/(mol K) in S or 0.5 % in Cp; it is explained where a named term that the molecule leaves out, computed here
//! by its own sum, accounts for at least half of it. Constants of these terms are from memory, and serve for nothing else.

#[path = "molecules/terms.rs"]
mod terms;

use std::cell::Cell;

use hessbook::model::card::{Cx, References};
use hessbook::model::function;
use hessbook::model::molecule::shipped;
use hessbook::units::constants;

/// Of 298.15 K, 500 K, 1000 K and 1500 K.
const TEMPERATURES_K: [f64; 4] = [298.15, 500.0, 1000.0, 1500.0];
/// J/(mol K)
const MISS_S: f64 = 0.2;
const MISS_CP: f64 = 0.005;

struct Row {
    id: String,
    t_k: f64,
    /// Computed and published, J/(mol K).
    cp: (f64, f64),
    s: (f64, f64),
    constants: String,
}

impl Row {
    fn off_cp(&self) -> f64 {
        self.cp.0 / self.cp.1 - 1.0
    }

    fn off_s(&self) -> f64 {
        self.s.0 - self.s.1
    }

    fn misses_cp(&self) -> bool {
        self.off_cp().abs() > MISS_CP
    }

    fn misses_s(&self) -> bool {
        self.off_s().abs() > MISS_S
    }

    fn share(&self) -> f64 {
        (self.off_cp().abs() / MISS_CP).max(self.off_s().abs() / MISS_S)
    }

    /// What the named terms add, where they account for half of each miss.
    fn explained(&self) -> (Option<String>, bool) {
        let Some(terms) = terms::of(&self.id, self.t_k) else { return (None, false) };
        let (cp, s) = terms.iter().fold((0.0, 0.0), |sum, term| (sum.0 + term.cp, sum.1 + term.s));
        let part = |added: f64, off: f64| added / -off;
        let (of_cp, of_s) = (part(cp, self.cp.0 - self.cp.1), part(s, self.off_s()));
        // A term that overshoots by as much as the miss itself explains nothing.
        let enough = |missed: bool, part: f64| !missed || (0.5..=1.5).contains(&part);
        let holds = enough(self.misses_cp(), of_cp) && enough(self.misses_s(), of_s);
        let named: Vec<String> =
            terms.iter().map(|term| format!("{} {:+.3} {:+.3}", term.name, term.cp, term.s)).collect();
        let parts = format!("{:.0} % of the gap in Cp, {:.0} % in S", 100.0 * of_cp, 100.0 * of_s);
        (Some(format!("{}: {parts}", named.join(", "))), holds)
    }
}

fn rows() -> Vec<Row> {
    let (references, ordinal) = (References::new(constants::current()), Cell::new(0));
    let cx = Cx { references: &references, place: None, ordinal: &ordinal, halted: &|| None };
    let mut rows = Vec::new();
    for record in cx.data().molecules() {
        let molecule = shipped::molecule(&cx, &record.id).unwrap_or_else(|fault| panic!("{}: {fault}", record.id));
        let Some(published) = &molecule.definition().substance.function else { continue };
        for t_k in TEMPERATURES_K {
            let (own, other) = (molecule.gas().functions(t_k, cx.constants()), function::evaluate(published, t_k));
            rows.push(Row {
                id: record.id.to_string(),
                t_k,
                cp: (own.cp, other.cp),
                s: (own.s, other.s),
                constants: record.check.to_string(),
            });
        }
    }
    rows.sort_by(|a, b| b.share().total_cmp(&a.share()));
    rows
}

/// Misses that no term here accounts for, with what is known of them.
const UNEXPLAINED: [(&str, f64, &str); 16] = [
    ("Br(g)", 1000.0, BROMINE),
    ("Br(g)", 1500.0, BROMINE),
    ("CH4(g)", 500.0, METHANE),
    ("CH4(g)", 1000.0, METHANE),
    ("CH4(g)", 1500.0, METHANE),
    ("CCl4(g)", 298.15, OTHER_CONSTANTS),
    ("CCl4(g)", 500.0, OTHER_CONSTANTS),
    ("CCl4(g)", 1000.0, OTHER_CONSTANTS),
    ("CCl4(g)", 1500.0, OTHER_CONSTANTS),
    ("SF6(g)", 298.15, OTHER_CONSTANTS),
    ("SF6(g)", 500.0, OTHER_CONSTANTS),
    ("SF6(g)", 1000.0, OTHER_CONSTANTS),
    ("SF6(g)", 1500.0, OTHER_CONSTANTS),
    ("Br2(g)", 1500.0, OTHER_CONSTANTS),
    (
        "I2(g)",
        1500.0,
        "the excited states known from memory bring a third of it; levels near dissociation were not tried",
    ),
    ("NH3(g)", 1500.0, "levels of the inversion above 3 quanta are not known here"),
];
const BROMINE: &str =
    "two levels make the sum, and no third one lies below 60000 cm^-1, so the published function is not theirs";
const METHANE: &str = "centres of the first polyads, with stretching, bring a third of it";
const OTHER_CONSTANTS: &str = "the published function rests on other constants, which were not at hand";

#[test]
fn the_sums_give_the_published_functions_or_what_is_missing_is_named() {
    let rows = rows();
    assert_eq!(rows.len(), 62 * TEMPERATURES_K.len(), "a molecule or its function is gone");
    println!("the constants were selected by agreement with these functions: this tests the sums, not the constants");
    println!(" share   T/K  gas: Cp computed, published, off; S computed, published, off in J/(mol K)");
    let mut wrong = Vec::new();
    for row in &rows {
        let Row { id, t_k, cp, s, .. } = row;
        println!(
            "{:6.2} {t_k:7.2}  {id}: {:.3} {:.3} {:+.2} %; {:.3} {:.3} {:+.3}",
            row.share(),
            cp.0,
            cp.1,
            100.0 * row.off_cp(),
            s.0,
            s.1,
            row.off_s()
        );
        let stated = UNEXPLAINED.iter().find(|(known, t, _)| known == id && t == t_k);
        if !(row.misses_cp() || row.misses_s()) {
            if stated.is_some() {
                wrong.push(format!("{id} at {t_k} K does not miss, and is listed as unexplained"));
            }
            continue;
        }
        let (why, holds) = row.explained();
        match (holds, stated) {
            (true, None) => println!("        explained by {}", why.unwrap_or_default()),
            (false, Some((_, _, known))) => {
                let tried = why.map_or_else(String::new, |why| format!("; tried: {why}"));
                println!("        unexplained: {known}{tried}");
            }
            (true, Some(_)) => {
                wrong.push(format!("{id} at {t_k} K is explained after all: {}", why.unwrap_or_default()))
            }
            (false, None) => wrong.push(format!(
                "{id} at {t_k} K misses by {:+.2} % in Cp and {:+.3} in S, unexplained ({}); {}",
                100.0 * row.off_cp(),
                row.off_s(),
                why.unwrap_or_default(),
                row.constants
            )),
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}
