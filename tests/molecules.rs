//! Every shipped molecule against the published function of the same gas, worst first, and what explains each miss.
//!
//! The constants were selected by this very agreement, so the table tests the sums and not the constants. A miss is more
//! than 0.2 J/(mol K) in S or 0.5 % in Cp; it is explained where a named term that the molecule leaves out, computed here
//! by its own sum, accounts for at least half of it. Constants of these terms are from memory, and serve for nothing else.

#[path = "molecules/prices.rs"]
mod prices;
#[path = "molecules/terms.rs"]
mod terms;

use std::cell::Cell;

use hessbook::model::card::{Cx, References};
use hessbook::model::function;
use hessbook::model::molecule::definition::Motion;
use hessbook::model::molecule::parameter::Parameter;
use hessbook::model::molecule::{Molecule, shipped};
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
    /// The same with inferred wavenumbers, and which.
    inferred: Option<(f64, f64, String)>,
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
                inferred: inferred(&cx, &record.id, t_k),
            });
        }
    }
    rows.sort_by(|a, b| b.share().total_cmp(&a.share()));
    rows
}

/// Misses that no term here accounts for, with what is known of them.
const UNEXPLAINED: [(&str, f64, &str); 4] = [
    ("CH4(g)", 500.0, METHANE),
    ("CH4(g)", 1000.0, METHANE),
    ("CH4(g)", 1500.0, METHANE),
    (
        "NH3(g)",
        1500.0,
        "what is known brings four fifths of it in S; in Cp inversion and anharmonicity nearly cancel, and neither is known well \
         enough so far up",
    ),
];
const METHANE: &str = "centres of the first polyads, with stretching, bring a third of it; JANAF has the rigid rotor and \
                       harmonic oscillators, as here";

/// A gas, wavenumbers as observed and as inferred, and what is known of them.
type Inferred = (&'static str, &'static [(f64, f64)], &'static str);

/// Published functions that are no sum over the observed fundamentals but, to 0.05 J/(mol K) at all temperatures, one over
/// these wavenumbers. They were found by fitting that function, and no publication of them is at hand: so this tells what the
/// difference is, and explains nothing.
const INFERRED: [Inferred; 2] = [
    (
        "CCl4(g)",
        &[(459.0, 463.0), (217.0, 220.0), (776.0, 797.0)],
        "the highest, which shows as a pair of bands at 762 and 790 cm⁻¹ in resonance with 459 + 314, is the one that counts",
    ),
    ("SF6(g)", &[(347.0, 343.0)], "the lowest, which is seen neither in the infrared nor in the Raman spectrum"),
];

/// Cp and S, J/(mol K), of the molecule with the wavenumbers moved that its published function asks for.
fn inferred(cx: &Cx, id: &str, t_k: f64) -> Option<(f64, f64, String)> {
    let (_, moved, why) = INFERRED.iter().find(|(known, _, _)| *known == id)?;
    let molecule = shipped::molecule(cx, id).unwrap_or_else(|fault| panic!("{id}: {fault}"));
    let mut definition = molecule.definition().clone();
    let Motion::Polyatomic { vibrations, .. } = &mut definition.motion else { panic!("{id} vibrates") };
    let theta = |per_cm: f64| 100.0 * per_cm * cx.constants().second_radiation.value;
    for (from, to) in *moved {
        let of = vibrations.iter_mut().find(|(nu, _)| (nu.value / theta(*from) - 1.0).abs() < 1e-9);
        of.unwrap_or_else(|| panic!("{id} has no fundamental at {from}")).0 = Parameter::exact("moved", theta(*to));
    }
    let at = Molecule::new(definition, *molecule.treatment()).gas().functions(t_k, cx.constants());
    let list: Vec<String> = moved.iter().map(|(from, to)| format!("{to} for {from}")).collect();
    Some((at.cp, at.s, format!("{} cm⁻¹; {why}", list.join(", "))))
}

#[test]
fn the_sums_give_the_published_functions_or_what_is_missing_is_named() {
    let rows = rows();
    assert_eq!(rows.len(), 62 * TEMPERATURES_K.len(), "a molecule or its function is gone");
    println!("the constants were selected by agreement with these functions: this tests the sums, not the constants");
    println!(" share   T/K  gas: Cp computed, published, off; S computed, published, off in J/(mol K)");
    let (mut wrong, mut counts) = (Vec::new(), [0_u32; 3]);
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
        if let (false, Some((cp, s, which))) = (holds, &row.inferred) {
            let (off_cp, off_s) = (cp - row.cp.1, s - row.s.1);
            counts[1] += 1;
            println!("        inferred: off by {off_cp:+.3} in Cp and {off_s:+.3} in S with {which}");
            if off_cp.abs() > 0.05 || off_s.abs() > 0.05 {
                wrong.push(format!("{id} at {t_k} K is not what was inferred: {off_cp:+.3} {off_s:+.3}"));
            }
            continue;
        }
        counts[if holds { 0 } else { 2 }] += 1;
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
    println!(
        "misses: {} explained, {} inferred from the function itself, {} unexplained",
        counts[0], counts[1], counts[2]
    );
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}
