//! Causes of a move that are not of the data: edited cells and modules, each with its share, and another program. What an
//! edit must move is worked out from the edit itself.

use crate::workshop::{REPORTS, SHIFT, Workshop, move_of, number, value};
use hessbook::notebook::audit::AuditOptions;
use hessbook::notebook::audit_text;
use hessbook::notebook::seal::{KEY, Seal};
use hessbook::notebook::sealing::Sealing;
use hessbook::notebook::verdict::{AuditStatus, CauseKind, Outcome, Verdict};
use serde_json::{Value, json};

/// Sort, words and share of each cause of a move.
fn causes(outcome: &Outcome) -> Vec<(CauseKind, String, f64)> {
    let (_, causes) = move_of(outcome);
    causes.into_iter().map(|cause| (cause.kind, cause.what, number(&cause.share.unwrap()))).collect()
}

fn near(one: f64, other: f64) -> bool {
    // Sums and products of a few doubles of this size.
    (one - other).abs() <= 1e-12 * other.abs().max(1.0)
}

#[test]
fn each_of_several_edited_cells_has_its_own_share_and_what_is_left_is_said() {
    let workshop = Workshop::sealed(&[
        "let a = q(\"2.0(1) kJ\");",
        "let n = 3;",
        "let idle = 1;",
        "report(\"product\", n * a); report(\"one\", 2 * a)",
    ]);
    workshop.edit_cells("2.0(1) kJ", "2.5(1) kJ");
    workshop.edit_cells("let n = 3", "let n = 4");
    workshop.edit_cells("let idle = 1", "let idle = 2");
    let audit = workshop.audit(&AuditOptions::default());
    let product = &value(&audit, "product").under_sealed;
    let told = causes(product);
    // 3 · 2.0 = 6 then; 3 · 2.5 with the first edit alone, 4 · 2.0 with the second, 4 · 2.5 with both.
    assert_eq!(
        told.iter().map(|(kind, what, _)| (*kind, what.as_str())).collect::<Vec<_>>(),
        [(CauseKind::Cell, "cell-1"), (CauseKind::Cell, "cell-2")]
    );
    assert!(near(told[0].2, 1.5) && near(told[1].2, 2.0), "{told:?}");
    let moved = product.moved.as_ref().unwrap();
    assert!(near(number(&moved.by), 4.0) && near(number(&moved.remainder), 0.5), "{moved:?}");
    let text = audit_text::notebook(&audit);
    assert!(text.contains("remainder, not told apart"), "{text}");
    let one = causes(&value(&audit, "one").under_sealed);
    assert!(one.len() == 1 && one[0].1 == "cell-1" && near(one[0].2, 1.0), "{one:?}");
    assert_eq!(audit.environment.iter().filter(|one| one.what.starts_with("cell-")).count(), 3);
}

#[test]
fn edits_that_only_run_together_have_one_share() {
    let workshop = Workshop::sealed(&["let a = q(\"2.0(1) kJ\");", "let k = 2;", "report(\"r\", k * a)"]);
    workshop.edit_cells("let a =", "let b =");
    workshop.edit_cells("k * a", "k * b * 2");
    workshop.edit_cells("let k = 2", "let k = 3");
    let audit = workshop.audit(&AuditOptions::default());
    let told = causes(&value(&audit, "r").under_sealed);
    // 2 · 2 then, 3 · 2 · 2 now; k alone gives 3 · 2.
    assert_eq!(
        told.iter().map(|(_, what, _)| what.as_str()).collect::<Vec<_>>(),
        ["cell-2", "cell-1; cell-3: together"]
    );
    assert!(near(told[0].2, 2.0) && near(told[1].2, 6.0), "{told:?}");
}

#[test]
fn a_cell_that_is_put_in_is_one_edit_whatever_it_does_to_the_numbers() {
    let workshop = Workshop::sealed(&["let a = q(\"2.0(1) kJ\");", "let b = q(\"1 kJ\");", "report(\"r\", a + b)"]);
    workshop.edit(|tree| {
        let added = json!({"cell_type": "code", "id": "new", "metadata": {}, "execution_count": null, "outputs": [],
            "source": "a = 3 * a;"});
        tree["cells"].as_array_mut().unwrap().insert(1, added);
    });
    let audit = workshop.audit(&AuditOptions::default());
    let told = causes(&value(&audit, "r").under_sealed);
    assert_eq!((told.len(), told[0].1.as_str()), (1, "cell-2, added"));
    assert!(near(told[0].2, 4.0), "{told:?}");
    let listed: Vec<&str> = audit.environment.iter().map(|one| one.what.as_str()).collect();
    assert_eq!(listed, ["cell-2, added"]);
    // Beside another edit it has a share of its own.
    workshop.edit_cells("1 kJ", "1.5 kJ");
    let told = causes(&value(&workshop.audit(&AuditOptions::default()), "r").under_sealed);
    let told: Vec<(&str, f64)> = told.iter().map(|(_, what, share)| (what.as_str(), *share)).collect();
    assert_eq!(told, [("cell-2, added", 4.0), ("cell-2, which is cell-3 now", 0.5)]);
}

const METHOD: &str = "// Invented.\nconst LOSS = q(\"2.0(1) kJ\");\nfn duty(x) { x + global::LOSS }\n";

#[test]
fn a_module_is_sealed_with_its_text_and_an_edited_one_is_a_cause_with_its_share() {
    let cells = ["let x = q(\"10.0(1) kJ\");", "report(\"duty\", method::duty(x)); report(\"x\", 1 * x)"];
    let workshop = Workshop::sealed_beside(&cells, &[("method.rhai", METHOD)]);
    let tree: Value = serde_json::from_slice(&std::fs::read(workshop.path()).unwrap()).unwrap();
    let seal = &tree["metadata"][KEY];
    assert_eq!(
        (seal["modules"][0]["name"].as_str(), seal["modules"][0]["content"].as_str()),
        (Some("method.rhai"), Some(METHOD))
    );
    assert_eq!(seal["files"], json!([]), "a module is not a file of figures");
    assert_eq!(workshop.audit(&AuditOptions::default()).status, AuditStatus::Same);

    workshop.write("method.rhai", &METHOD.replace("2.0(1)", "2.5(1)"));
    let audit = workshop.audit(&AuditOptions::default());
    assert_eq!(audit.status, AuditStatus::Differs);
    assert_eq!(value(&audit, "x").under_sealed.verdict, Verdict::Identical);
    let told = causes(&value(&audit, "duty").under_sealed);
    assert_eq!((told.len(), told[0].0, told[0].1.as_str()), (1, CauseKind::Module, "method.rhai"));
    assert!(near(told[0].2, 0.5), "{told:?}");
    assert!(audit.environment.iter().any(|one| one.what == "method.rhai"));

    // Beside an edited cell each has its own share: 0.5 kJ of the module, 3 kJ of the cell.
    workshop.edit_cells("10.0(1)", "13.0(1)");
    let audit = workshop.audit(&AuditOptions::default());
    let told = causes(&value(&audit, "duty").under_sealed);
    let told: Vec<(CauseKind, &str, f64)> =
        told.iter().map(|(kind, what, share)| (*kind, what.as_str(), *share)).collect();
    assert_eq!(told, [(CauseKind::Cell, "cell-1", 3.0), (CauseKind::Module, "method.rhai", 0.5)]);

    // Taken away, the notebook does not run: the module is a part of it.
    std::fs::remove_file(workshop.folder.path().join("method.rhai")).unwrap();
    let audit = workshop.audit(&AuditOptions::default());
    assert_eq!((audit.status, audit.faults[0].fault.code.as_str()), (AuditStatus::CouldNotRun, "unknown-module"));
    assert!(audit.environment.iter().any(|one| one.what == "method.rhai" && one.now == "not there"));
}

/// The seal of a notebook changed, and its digest made to fit: what a program that computes otherwise would have written.
fn sealed_otherwise(workshop: &Workshop, change: impl FnOnce(&mut Seal)) {
    workshop.edit(|tree| {
        let mut seal: Seal = serde_json::from_value(tree["metadata"][KEY].clone()).unwrap();
        change(&mut seal);
        seal.digest = seal.digest_now();
        tree["metadata"][KEY] = serde_json::to_value(seal).unwrap();
    });
}

#[test]
fn a_program_that_computes_otherwise_is_told_apart_from_what_was_edited() {
    let cells = [SHIFT, REPORTS];
    let workshop = Workshop::sealed(&cells);
    let by_0_5 = |seal: &mut Seal| {
        seal.engine.version = "0.0.9".to_owned();
        for sealed in &mut seal.values {
            // kJ/mol, and J/mol in the steps.
            let value = number(&sealed.record.value) - 0.5;
            sealed.record.value = value.to_string();
            let at: usize = sealed.step.parse().unwrap();
            seal.steps[at].si = (value * 1000.0).to_string();
        }
    };
    sealed_otherwise(&workshop, by_0_5);
    let audit = workshop.audit(&AuditOptions::default());
    assert!(audit.seal.as_ref().unwrap().whole);
    for label in ["shift", "twice"] {
        let told = causes(&value(&audit, label).under_sealed);
        assert_eq!((told.len(), told[0].0), (1, CauseKind::Engine), "{told:?}");
        assert!(told[0].1.starts_with("hessbook 0.0.9 then, ") && near(told[0].2, 0.5), "{told:?}");
    }
    // With an edited cell, the program keeps its share and the cell has its own: the coefficient 2 became 3.
    workshop.edit_cells("2 * shift", "3 * shift");
    let audit = workshop.audit(&AuditOptions::default());
    let told = causes(&value(&audit, "twice").under_sealed);
    let shift = number(&value(&audit, "shift").under_sealed.figure.as_ref().unwrap().value);
    assert_eq!(told.iter().map(|(kind, ..)| *kind).collect::<Vec<_>>(), [CauseKind::Engine, CauseKind::Cell]);
    assert!(near(told[0].2, 0.5) && near(told[1].2, shift), "{told:?}");
}

#[test]
fn two_revised_records_whose_effects_multiply_leave_a_remainder() {
    use crate::workshop::revised;
    use hessbook::data::records::Records;
    use hessbook::notebook::holdings::Holdings;
    // A product of two reaction enthalpies: each rests on one revised formation enthalpy, so that the effects multiply.
    let cells = [
        "let a = reaction(\"C(cr,graphite) + O2(g) -> CO2(g)\").enthalpy(\"298.15 K\");",
        "let b = reaction(\"H2(g) + 0.5 O2(g) -> H2O(g)\").enthalpy(\"298.15 K\");",
        "report(\"product\", a * b)",
    ];
    // As a draft: steam at 298.15 K and 1 bar is not the stable phase, which is beside the point here.
    let workshop = Workshop::unsealed(&cells, &[]);
    workshop.seal(&Sealing { draft: true, ..Sealing::default() }).unwrap();
    let one = revised("formation properties of CO2(g) in atct-1.112", "-393.474", "-393.974");
    let other = revised("formation properties of H2O(g) in atct-1.112", "-241.822", "-241.022");
    let water = Records::shipped().all().into_keys();
    let water =
        water.into_iter().find(|key| key.to_string() == "formation properties of H2O(g) in atct-1.112").unwrap();
    let mut both = Records::clone(&one.records);
    both.put(&water, other.records.all().get(&water), &other.records);
    let audit = workshop.audit(&AuditOptions { today: Holdings::of(both), ..AuditOptions::default() });
    let product = value(&audit, "product");
    let unit = &product.sealed.as_ref().unwrap().unit;
    let (by, causes) = move_of(&product.under_today);
    let moved = product.under_today.moved.as_ref().unwrap();
    // In kJ²/mol²: (a + α)(b + β) - ab = αb + aβ + αβ, with α = -0.500 kJ/mol and β = +0.800 kJ/mol.
    let factor = hessbook::units::parse::unit(unit).unwrap().factor / 1e6;
    let (a, b, alpha, beta) = (-393.474, -241.822, -0.5, 0.8);
    let shares: Vec<f64> = causes.iter().map(|cause| number(cause.share.as_ref().unwrap()) * factor).collect();
    // The figures are exact in the records; each is a sum and a product of doubles of 1e5.
    let close = |one: f64, other: f64| (one - other).abs() < 1e-7;
    assert_eq!(shares.len(), 2, "{causes:?}");
    assert!(close(shares[0], alpha * b) && close(shares[1], a * beta), "{shares:?} in {unit}");
    assert!(close(by * factor, alpha * b + a * beta + alpha * beta), "{by}");
    assert!(close(number(&moved.remainder) * factor, alpha * beta), "{moved:?}");
}
