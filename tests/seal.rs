//! Seals and audits: the shipped notebooks are the same as sealed, and each way to part from a seal is named with its size.
//!
//! Every altered copy is made from a shipped notebook, sealed anew here. What a revised figure must move is worked out from
//! the revision itself: a reaction enthalpy moves by the stoichiometric number times the change of the figure.

#[path = "seal/edits.rs"]
mod edits;
#[path = "seal/sources.rs"]
mod sources;
#[path = "seal/workshop.rs"]
mod workshop;

use std::path::{Path, PathBuf};
use std::sync::Arc;

use hessbook::data::records::Records;
use hessbook::notebook::audit::{AuditOptions, audit_one};
use hessbook::notebook::audit_text;
use hessbook::notebook::holdings::Holdings;
use hessbook::notebook::seal::{KEY, Seal};
use hessbook::notebook::sealing::{Sealing, seal};
use hessbook::notebook::verdict::{Against, AuditStatus, CauseKind, Verdict};
use hessbook::render::report::MIME;
use hessbook::session::on_big_stack;
use hessbook::units::constants;
use serde_json::{Value, json};
use workshop::{REPORTS, SHIFT, Workshop, move_of, number, revised, value};

fn shipped_notebooks() -> Vec<PathBuf> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("notebooks");
    let mut found: Vec<PathBuf> = std::fs::read_dir(folder).unwrap().map(|entry| entry.unwrap().path()).collect();
    found.retain(|path| path.extension().is_some_and(|extension| extension == "ipynb"));
    found.sort();
    found
}

#[test]
fn the_shipped_notebooks_are_sealed_and_identical() {
    for path in shipped_notebooks() {
        let options = AuditOptions { strict_data: true, from_sources: true, ..AuditOptions::default() };
        let audit = audit_one(&path, &options);
        let text = audit_text::notebook(&audit);
        assert_eq!(audit.against, Against::Seal, "{text}");
        assert_eq!(audit.status, AuditStatus::Same, "{text}");
        assert!(!audit.values.is_empty());
        for value in &audit.values {
            assert_eq!(value.under_sealed.verdict, Verdict::Identical, "{text}");
            assert_eq!(value.under_today.verdict, Verdict::Identical, "{text}");
        }
        // Without the cells too, each value and each of its steps.
        for one in audit.from_sources.iter().flatten() {
            assert!(one.same && one.u_same == Some(true) && one.not_rederived.is_empty(), "{one:#?}");
        }
        let seal = audit.seal.unwrap();
        assert!(seal.whole && !seal.draft, "{text}");
    }
}

#[test]
fn an_edited_coefficient_is_named_with_its_cell_and_its_whole_size() {
    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    workshop.edit_cells("2 * shift", "3 * shift");
    let audit = workshop.audit(&AuditOptions::default());
    assert_eq!(audit.status, AuditStatus::Differs);
    assert_eq!(value(&audit, "shift").under_sealed.verdict, Verdict::Identical);
    let twice = value(&audit, "twice");
    assert_eq!(twice.under_sealed.verdict, Verdict::Moved);
    let (by, causes) = move_of(&twice.under_sealed);
    // Three times it instead of twice: once the value itself.
    let once = number(&value(&audit, "shift").sealed.as_ref().unwrap().value);
    assert!((by - once).abs() < 1e-12, "{by} {once}");
    assert_eq!((causes.len(), causes[0].kind, causes[0].what.as_str()), (1, CauseKind::Cell, "cell-2"));
    assert_eq!(
        twice.under_sealed.moved.as_ref().unwrap().parts_at.as_deref(),
        Some("cell-2, line 2: scale 2 then, scale 3 now")
    );
    assert_eq!(twice.under_sealed, twice.under_today);
}

#[test]
fn an_edit_is_a_move_at_any_size_and_one_without_effect_is_listed() {
    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    workshop.edit_cells("2 * shift", "2.0000000001 * shift");
    let audit = workshop.audit(&AuditOptions::default());
    let twice = &value(&audit, "twice").under_sealed;
    assert_eq!((twice.verdict, audit.status), (Verdict::Moved, AuditStatus::Differs));
    // 1e-10 of 37.6 kJ/mol, far below the last digit shown.
    let (by, _) = move_of(twice);
    assert!((by + 37.596e-10).abs() < 0.001e-10, "{by}");

    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    workshop.edit_cells("let shift", "// said twice\nlet shift");
    let audit = workshop.audit(&AuditOptions::default());
    assert_eq!(audit.status, AuditStatus::Same);
    assert!(audit.environment.iter().any(|difference| difference.what == "cell-1"), "{:?}", audit.environment);
}

#[test]
fn an_altered_seal_is_named_with_what_its_own_derivation_says() {
    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    let sealed = number(&value(&workshop.audit(&AuditOptions::default()), "shift").sealed.as_ref().unwrap().value);
    workshop.edit(|tree| tree["metadata"][KEY]["values"][0]["record"]["value"] = json!("-38.5"));
    let audit = workshop.audit(&AuditOptions::default());
    assert_eq!(audit.status, AuditStatus::Differs);
    assert!(!audit.seal.as_ref().unwrap().whole);
    let (by, causes) = move_of(&value(&audit, "shift").under_sealed);
    assert!((by - (sealed + 38.5)).abs() < 1e-12);
    // The printed text was left as it was, and is not the figure that was compared.
    let shown = &value(&audit, "shift").sealed.as_ref().unwrap().shown;
    assert!(shown.starts_with("-38.5 kJ/mol[rxn]"), "{shown}");
    assert!(audit_text::notebook(&audit).contains("which is another figure"));
    assert_eq!((causes.len(), causes[0].kind), (1, CauseKind::Seal));
    assert_eq!(value(&audit, "twice").under_sealed.verdict, Verdict::Identical);
}

#[test]
fn an_altered_record_in_the_seal_is_named_with_its_share() {
    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    workshop.edit(|tree| {
        for table in tree["metadata"][KEY]["data"].as_array_mut().unwrap() {
            for record in table["records"].as_array_mut().unwrap() {
                let content = record["content"].as_str().unwrap();
                record["content"] = json!(content.replace("-393.474", "-393.974"));
            }
        }
    });
    let audit = workshop.audit(&AuditOptions::default());
    let (by, causes) = move_of(&value(&audit, "twice").under_sealed);
    // ν(CO2) = 1, twice, times -0.500 kJ/mol.
    assert!((by + 1.0).abs() < 1e-9, "{by}");
    assert_eq!((causes.len(), causes[0].kind), (1, CauseKind::Seal));
    assert!(causes[0].what.contains("formation properties of CO2(g) in atct-1.112"), "{causes:?}");
    assert_eq!(value(&audit, "twice").under_today.verdict, Verdict::Identical);
}

#[test]
fn an_altered_reason_moves_nothing_and_is_no_seal_any_more() {
    let workshop = Workshop::sealed(&[
        SHIFT,
        "report(\"short\", shift.enthalpy(\"450 degC\", #{ heat_capacity: \"constant\" }));\n\
         justify(\"constant-heat-capacity\", \"short\", \"for comparison only\");",
    ]);
    assert_eq!(workshop.audit(&AuditOptions::default()).status, AuditStatus::Same);
    workshop.edit(|tree| {
        tree["metadata"][KEY]["values"][0]["decisions"][0]["reason"] = json!("approved by everybody");
    });
    let audit = workshop.audit(&AuditOptions::default());
    assert_eq!(audit.status, AuditStatus::Differs);
    let short = &value(&audit, "short").under_sealed;
    assert_eq!(short.verdict, Verdict::AssumptionChanged);
    let note = "the seal has \"approved by everybody\", the cell \"for comparison only\"";
    assert!(short.notes.iter().any(|said| said.contains(note)), "{short:#?}");
}

#[test]
fn a_revised_formation_enthalpy_moves_todays_value_by_its_coefficient() {
    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    let today = revised("formation properties of CO2(g) in atct-1.112", "-393.474", "-393.974");
    let audit = workshop.audit(&AuditOptions { today: today.clone(), ..AuditOptions::default() });
    assert_eq!(audit.status, AuditStatus::Same, "the sealed data give the sealed values");
    let twice = value(&audit, "twice");
    assert_eq!((twice.under_sealed.verdict, twice.under_today.verdict), (Verdict::Identical, Verdict::Moved));
    let (by, causes) = move_of(&twice.under_today);
    assert!((by + 1.0).abs() < 1e-9, "{by}");
    assert_eq!(causes.len(), 1);
    assert_eq!(causes[0].kind, CauseKind::Data);
    assert_eq!(causes[0].what, "formation properties of CO2(g) in atct-1.112");
    let strict = workshop.audit(&AuditOptions { today, strict_data: true, ..AuditOptions::default() });
    assert_eq!(strict.status, AuditStatus::Differs);
}

#[test]
fn a_revision_within_the_stated_uncertainty_is_within_u() {
    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    // ATcT 1.112 has -393.474 ± 0.015 kJ/mol at 95 %, so u = 0.0075 kJ/mol; the revised figure lies 0.006 off.
    let today = revised("formation properties of CO2(g) in atct-1.112", "-393.474", "-393.480");
    let audit = workshop.audit(&AuditOptions { today, ..AuditOptions::default() });
    let shift = &value(&audit, "shift").under_today;
    let (by, causes) = move_of(shift);
    assert!((by + 0.006).abs() < 1e-9, "{by}");
    assert_eq!((causes.len(), causes[0].kind), (1, CauseKind::Data));
    let u = number(shift.moved.as_ref().unwrap().u_of_changed.as_ref().unwrap());
    assert!((u - 0.0075).abs() < 1e-9, "{u}");
    assert_eq!(shift.verdict, Verdict::WithinU);
}

#[test]
fn two_revisions_have_a_share_each() {
    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    let one = revised("formation properties of CO2(g) in atct-1.112", "-393.474", "-393.974");
    let other = revised("formation properties of H2O(g) in atct-1.112", "-241.822", "-241.722");
    let key = |key: &str| Records::shipped().all().into_keys().find(|known| known.to_string() == key).unwrap();
    let water = key("formation properties of H2O(g) in atct-1.112");
    let mut both = Records::clone(&one.records);
    both.put(&water, other.records.all().get(&water), &other.records);
    let audit = workshop.audit(&AuditOptions { today: Holdings::of(both), ..AuditOptions::default() });
    let (by, causes) = move_of(&value(&audit, "shift").under_today);
    let shares: Vec<f64> = causes.iter().map(|cause| number(cause.share.as_ref().unwrap())).collect();
    // ν = +1 for CO2, -1 for H2O.
    assert!((by + 0.6).abs() < 1e-9 && (shares[0] + 0.5).abs() < 1e-9 && (shares[1] + 0.1).abs() < 1e-9, "{causes:?}");
}

#[test]
fn another_constant_set_moves_what_rests_on_its_measured_constants() {
    // The SI defines R, F and N_A in both; only the hartree and the atomic mass constant differ between 2018 and 2022.
    let workshop = Workshop::sealed(&[
        SHIFT,
        "report(\"dissociation\", q(\"27.2 eV\").per_mole());\nreport(\"shift\", shift.internal_energy(\"450 degC\"));",
    ]);
    let older = Holdings::shipped().with_constants(constants::set(2018).unwrap());
    let audit = workshop.audit(&AuditOptions { today: older, ..AuditOptions::default() });
    assert_eq!(audit.status, AuditStatus::Same);
    let year = audit.environment.iter().find(|difference| difference.what == "constant set").unwrap();
    assert_eq!((year.sealed.as_str(), year.now.as_str()), ("2022", "2018"));
    for value in &audit.values {
        assert_eq!(value.under_today.verdict, Verdict::Identical, "{value:#?}");
    }
    assert!(!audit.not_compared.iter().any(|what| what.starts_with("the size of")), "{:?}", audit.not_compared);
    // A hartree has one size in every run, and the audit says that it says nothing of another.
    let workshop = Workshop::sealed(&["report(\"energy\", q(\"0.5 E_h\").per_mole());"]);
    let older = Holdings::shipped().with_constants(constants::set(2018).unwrap());
    let audit = workshop.audit(&AuditOptions { today: older, ..AuditOptions::default() });
    assert_eq!(value(&audit, "energy").under_today.verdict, Verdict::Identical);
    assert!(audit.not_compared.iter().any(|what| what.starts_with("the size of E_h")), "{:?}", audit.not_compared);
    // A set whose R is the one of CODATA 1986, 8.314510(70) J/(mol K), as NASA/TP-2002-211556 takes it.
    let altered = constants::current().with(&[("molar gas constant", 8.314_510, 0.000_070)]);
    let workshop = Workshop::sealed(&["let m = reaction(\"CO(g) + 3 H2(g) -> CH4(g) + H2O(g)\");\n\
         report(\"U\", m.internal_energy(\"430 degC\"));\nreport(\"H\", m.enthalpy(\"430 degC\"))"]);
    let today = Holdings::shipped().with_constants(altered);
    let audit = workshop.audit(&AuditOptions { today, ..AuditOptions::default() });
    assert_eq!(value(&audit, "H").under_today.verdict, Verdict::Identical);
    let (by, causes) = move_of(&value(&audit, "U").under_today);
    // ΔU = ΔH - Δn R T with Δn = -2, so ΔU moves by 2 T ΔR.
    let expected = 2.0 * 703.15 * (8.314_510 - constants::current().molar_gas.value) / 1000.0;
    assert!((by - expected).abs() < 1e-9, "{by} {expected}");
    assert_eq!((causes.len(), causes[0].kind), (1, CauseKind::Constants));
    assert!(causes[0].what.starts_with("molar gas constant R"), "{causes:?}");
}

#[test]
fn a_session_with_one_constant_altered_is_told_from_the_seal() {
    // The library's own `Session`, opened with another R, seals; the audit with the true R must say which constant it was.
    let altered = constants::current().with(&[("molar gas constant", 8.314_472, 0.0)]);
    let workshop = Workshop::sealed(&[
        "let m = reaction(\"CO(g) + 3 H2(g) -> CH4(g) + H2O(g)\");\nreport(\"U\", m.internal_energy(\"430 degC\"))",
    ]);
    let path = workshop.path();
    on_big_stack(|| {
        let how = Sealing { date: "2026-12-01T00:00:00Z".to_owned(), ..Sealing::default() };
        let holdings = Holdings::shipped().with_constants(altered);
        seal(&path, &how, &holdings, &Arc::default()).unwrap().notebook.write(&path).unwrap();
    });
    let audit = workshop.audit(&AuditOptions::default());
    let u = value(&audit, "U");
    assert_eq!(u.under_sealed.verdict, Verdict::Identical, "it runs with the constants it was sealed with");
    let (by, causes) = move_of(&u.under_today);
    let expected = 2.0 * 703.15 * (constants::current().molar_gas.value - 8.314_472) / 1000.0;
    assert!((by - expected).abs() < 1e-9, "{by} {expected}");
    assert_eq!(causes.iter().map(|cause| cause.kind).collect::<Vec<_>>(), [CauseKind::Constants]);
}

#[test]
fn values_that_go_come_and_fail_have_verdicts_of_their_own() {
    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    workshop.edit_cells("\"twice\"", "\"double\"");
    let audit = workshop.audit(&AuditOptions::default());
    assert_eq!(value(&audit, "twice").under_sealed.verdict, Verdict::Missing);
    assert_eq!(value(&audit, "double").under_sealed.verdict, Verdict::New);
    assert_eq!(audit.status, AuditStatus::Differs);

    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    workshop.edit_cells("report(\"twice\"", "throw \"no\"; report(\"twice\"");
    let audit = workshop.audit(&AuditOptions::default());
    assert_eq!(value(&audit, "twice").under_sealed.verdict, Verdict::CouldNotRun);
    assert_eq!(audit.status, AuditStatus::CouldNotRun);

    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    workshop.edit_cells(
        "report(\"twice\", 2 * shift.enthalpy(\"450 degC\"))",
        "report(\"twice\", shift.entropy(\"450 degC\"))",
    );
    let audit = workshop.audit(&AuditOptions::default());
    assert_eq!(value(&audit, "twice").under_sealed.verdict, Verdict::UnitOrBasisChanged);
}

#[test]
fn a_justification_lapses_where_its_price_grew_past_the_tolerance() {
    let workshop = Workshop::sealed(&[
        SHIFT,
        "report(\"short\", shift.enthalpy(\"450 degC\", #{ formation: \"codata-1989\" }));\n\
         justify(\"formation-dataset\", \"short\", \"the design sheet uses CODATA\");\n\
         justify(\"independent-inputs\", \"short\", \"the table gives no coefficients\");",
    ]);
    // The value rests on CODATA; ATcT, its alternative, is revised, so the value stays and the price does not.
    let today = revised("formation properties of CO2(g) in atct-1.112", "-393.474", "-394.474");
    let audit = workshop.audit(&AuditOptions { today, strict_data: true, ..AuditOptions::default() });
    let short = value(&audit, "short");
    assert_eq!(
        (short.under_sealed.verdict, short.under_today.verdict),
        (Verdict::Identical, Verdict::JustificationLapsed)
    );
    assert!(audit.justifications.iter().any(|one| one.lapsed && one.id == "formation-dataset"));
    assert_eq!(audit.status, AuditStatus::Differs);
}

#[test]
fn a_justification_of_an_equilibrium_constant_lapses_by_its_price_in_the_logarithm() {
    let workshop = Workshop::sealed(&[
        SHIFT,
        "report(\"K\", shift.equilibrium_constant(\"450 degC\"));\n\
         justify(\"formation-dataset\", \"K\", \"ATcT is newer\");\n\
         ",
    ]);
    let at = |to: &str| {
        let today = revised("formation properties of CO2(g) in atct-1.112", "-393.474", to);
        let audit = workshop.audit(&AuditOptions { today, strict_data: true, ..AuditOptions::default() });
        assert_eq!(value(&audit, "K").under_sealed.verdict, Verdict::Identical);
        (value(&audit, "K").under_today.verdict, audit.justifications)
    };
    // K rests on ATcT, and CODATA is the alternative. CO2 1.5 kJ/mol less stable takes K down by a factor 1.28, and what the
    // other dataset would make of it apart by as much again.
    let (verdict, justifications) = at("-391.974");
    assert_eq!(verdict, Verdict::Moved);
    assert!(justifications.iter().any(|one| one.lapsed && one.id == "formation-dataset"), "{justifications:#?}");
    // By a tenth of the tolerance it does not lapse.
    let (_, justifications) = at("-393.473");
    assert!(!justifications.iter().any(|one| one.lapsed), "{justifications:#?}");
}

#[test]
fn a_row_that_nobody_dealt_with_refuses_the_seal_unless_it_is_a_draft() {
    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    workshop.edit_cells(
        "2 * shift.enthalpy(\"450 degC\")",
        "shift.enthalpy(\"450 degC\", #{ heat_capacity: \"constant\" })",
    );
    let before = std::fs::read(workshop.path()).unwrap();
    let how = Sealing { date: "2026-12-02T00:00:00Z".to_owned(), ..Sealing::default() };
    let fault = workshop.seal(&how).unwrap_err();
    assert_eq!(fault.code(), "seal-of-open-rows");
    assert!(fault.message().contains("constant-heat-capacity"), "{fault}");
    assert_eq!(std::fs::read(workshop.path()).unwrap(), before, "a refused seal leaves the file as it was");
    let draft = workshop.seal(&Sealing { draft: true, ..how }).unwrap();
    assert!(draft.draft && draft.open[0].id == "constant-heat-capacity" && draft.open[0].status == "strained");
}

#[test]
fn sealing_what_is_sealed_already_changes_no_byte() {
    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    let before = std::fs::read(workshop.path()).unwrap();
    workshop.seal(&Sealing { date: "2030-01-01T00:00:00Z".to_owned(), ..Sealing::default() }).unwrap();
    assert_eq!(std::fs::read(workshop.path()).unwrap(), before);
}

#[test]
fn a_seal_survives_an_editor_that_sorts_and_indents() {
    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    fn sorted(value: &Value) -> Value {
        match value {
            Value::Object(members) => {
                let sorted: std::collections::BTreeMap<_, _> = members.iter().map(|(k, v)| (k, sorted(v))).collect();
                json!(sorted)
            }
            Value::Array(items) => items.iter().map(sorted).collect(),
            other => other.clone(),
        }
    }
    workshop.edit(|tree| *tree = sorted(tree));
    let audit = workshop.audit(&AuditOptions::default());
    assert!(audit.seal.unwrap().whole);
    assert_eq!(audit.status, AuditStatus::Same);
}

#[test]
fn set_parameters_are_sealed_and_set_again() {
    let workshop =
        Workshop::sealed(&[SHIFT, "let t = parameter(\"t\", \"450 degC\");\nreport(\"shift\", shift.enthalpy(t))"]);
    let settings = [("t".to_owned(), "300 degC".to_owned())].into();
    let how = Sealing { settings, date: "2026-12-02T00:00:00Z".to_owned(), ..Sealing::default() };
    let seal = workshop.seal(&how).unwrap();
    assert_eq!(seal.parameters[0].set.as_deref(), Some("300 degC"));
    let audit = workshop.audit(&AuditOptions::default());
    assert_eq!(audit.status, AuditStatus::Same);
    assert!(audit_text::notebook(&audit).contains("with t set to 300 degC from outside"));
}

/// Changes each recorded result.
fn in_outputs(tree: &mut Value, change: impl Fn(&mut Value)) {
    for cell in tree["cells"].as_array_mut().unwrap() {
        for output in cell["outputs"].as_array_mut().unwrap() {
            if let Some(record) = output.get_mut("data").and_then(|data| data.get_mut(MIME)) {
                change(record);
            }
        }
    }
}

#[test]
fn a_recorded_output_that_does_not_say_what_was_sealed_is_a_difference_and_a_cleared_one_is_not() {
    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    let audit = workshop.audit(&AuditOptions::default());
    assert_eq!((audit.status, audit.outputs.len()), (AuditStatus::Same, 0), "{}", audit_text::notebook(&audit));
    workshop.edit(|tree| {
        in_outputs(tree, |record| {
            if record["label"] == "twice" {
                record["value"] = json!("-99.5");
            }
        });
    });
    let audit = workshop.audit(&AuditOptions::default());
    let text = audit_text::notebook(&audit);
    assert_eq!((audit.status, audit.outputs.len()), (AuditStatus::Differs, 1), "{text}");
    assert!(text.contains("the recorded output of twice says -99.5 kJ/mol[rxn], u "), "{text}");
    // Sealing again puts it right, though the seal itself says the same.
    workshop.seal(&Sealing::default()).unwrap();
    assert_eq!(workshop.audit(&AuditOptions::default()).status, AuditStatus::Same);
    workshop.edit(|tree| tree["cells"].as_array_mut().unwrap().iter_mut().for_each(|cell| cell["outputs"] = json!([])));
    let audit = workshop.audit(&AuditOptions::default());
    assert_eq!(audit.status, AuditStatus::Same);
    assert!(audit_text::notebook(&audit).contains("not compared: recorded outputs: there are none"));
}

#[test]
fn a_notebook_without_seal_is_compared_with_its_outputs_or_says_that_it_has_none() {
    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    workshop.edit(|tree| drop(tree["metadata"].as_object_mut().unwrap().remove(KEY)));
    let audit = workshop.audit(&AuditOptions::default());
    assert_eq!((audit.against, audit.status), (Against::RecordedOutputs, AuditStatus::Same));
    workshop.edit_cells("2 * shift", "3 * shift");
    let audit = workshop.audit(&AuditOptions::default());
    assert_eq!(audit.status, AuditStatus::Differs);
    assert_eq!(value(&audit, "twice").under_today.verdict, Verdict::Moved);
    workshop.edit(|tree| tree["cells"].as_array_mut().unwrap().iter_mut().for_each(|cell| cell["outputs"] = json!([])));
    let audit = workshop.audit(&AuditOptions::default());
    assert_eq!((audit.against, audit.status), (Against::Nothing, AuditStatus::NothingToCompare));
    assert!(audit_text::notebook(&audit).contains("no seal and no recorded result"));
}

#[test]
fn a_figure_that_left_the_graph_as_a_bare_number_has_its_records_sealed_too() {
    let workshop = Workshop::sealed(&["let x = substance(\"CO2(g)\").enthalpy(\"298.15 K\").value(\"kJ/mol\");\n\
         report(\"scaled\", x * q(\"1 kJ/mol\"))"]);
    let today = revised("formation properties of CO2(g) in atct-1.112", "-393.474", "-393.974");
    let audit = workshop.audit(&AuditOptions { today, ..AuditOptions::default() });
    let scaled = value(&audit, "scaled");
    assert_eq!(scaled.under_sealed.verdict, Verdict::Identical);
    let (by, causes) = move_of(&scaled.under_today);
    assert!((by + 0.5).abs() < 1e-9, "{by}");
    assert_eq!(causes[0].what, "formation properties of CO2(g) in atct-1.112");
    // Its uncertainty does not reach the value, so nothing says that the move is within it.
    assert_eq!(scaled.under_today.verdict, Verdict::Moved);
}

#[test]
fn a_molar_mass_runs_on_the_sealed_atomic_weights() {
    let workshop = Workshop::sealed(&["report(\"M\", molar_mass(\"CH4\"));
         justify(\"independent-inputs\", \"M\", \"the table gives no coefficients\")"]);
    // Figures of the standard atomic weight of carbon: 12.011 and, invented for this test, 12.111.
    let today = revised("atomic weight of C", "12.011", "12.111");
    let audit = workshop.audit(&AuditOptions { today, ..AuditOptions::default() });
    let m = value(&audit, "M");
    assert_eq!(m.under_sealed.verdict, Verdict::Identical);
    let (by, causes) = move_of(&m.under_today);
    assert!((by - 0.1).abs() < 1e-9, "{by}");
    assert_eq!(causes[0].what, "atomic weight of C");
}

#[test]
fn a_dataset_that_is_new_and_wins_is_one_cause() {
    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    let shipped = Records::shipped();
    // CODATA's figures again, as a dataset of another name that goes before all others.
    let mut records = Records::clone(&shipped);
    let mut table = shipped.tables.iter().find(|table| *table.dataset == *"codata-1989").unwrap().clone();
    table.dataset = "invented".into();
    table.head = table.head.replace("codata-1989", "invented").replace("\"rank\":20", "\"rank\":1").into();
    assert!(table.head.contains("\"rank\":1,") || table.head.contains("\"rank\":1}"), "{}", table.head);
    records.tables.push(table);
    let audit = workshop.audit(&AuditOptions { today: Holdings::of(records), ..AuditOptions::default() });
    let shift = value(&audit, "shift");
    assert_eq!(shift.under_sealed.verdict, Verdict::Identical);
    let (_, causes) = move_of(&shift.under_today);
    assert_eq!(causes.len(), 1, "{causes:?}");
    assert_eq!(causes[0].what, "dataset invented, which is new");
}

#[test]
fn what_is_no_notebook_or_no_seal_costs_its_own_row_only() {
    let workshop = Workshop::new();
    std::fs::write(workshop.path(), "{\"cells\": 5").unwrap();
    let audit = workshop.audit(&AuditOptions::default());
    assert_eq!((audit.status, audit.faults[0].fault.code.as_str()), (AuditStatus::CouldNotRun, "not-a-notebook"));

    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    workshop.edit(|tree| tree["metadata"][KEY]["values"] = json!(7));
    let audit = workshop.audit(&AuditOptions::default());
    assert_eq!((audit.status, audit.faults[0].fault.code.as_str()), (AuditStatus::CouldNotRun, "seal-unreadable"));
    workshop.edit(|tree| tree["metadata"][KEY]["format"] = json!("hessbook-seal/9"));
    let audit = workshop.audit(&AuditOptions::default());
    assert_eq!(audit.faults[0].fault.code, "seal-format");
}

#[test]
fn values_are_derived_again_without_the_cells() {
    let workshop = Workshop::sealed(&[
        "let m = reaction(\"CO(g) + 3 H2(g) -> CH4(g) + H2O(g)\"); let t = q(\"430(2) degC\");",
        "report(\"H\", m.enthalpy(t)); report(\"double\", 3 * m.enthalpy(t) - m.enthalpy(t));\n\
         report(\"K\", m.equilibrium_constant(t)); report(\"per kg\", m.enthalpy(t).per(\"CH4\").per_mass());\n\
         report(\"mean\", mean(q(\"1.5(2) kJ\"), q(\"1.7(1) kJ\")) / 3 + q(\"2 kJ\"));",
    ]);
    // Nothing of the cells is left to run.
    workshop.edit(|tree| tree["cells"].as_array_mut().unwrap().iter_mut().for_each(|cell| cell["source"] = json!("")));
    let audit = workshop.audit(&AuditOptions { from_sources: true, ..AuditOptions::default() });
    let derived = audit.from_sources.unwrap();
    assert_eq!(derived.len(), 5);
    for one in derived {
        assert!(one.same && one.u_same == Some(true) && one.not_rederived.is_empty(), "{one:#?}");
    }
}

#[test]
fn a_step_that_was_sealed_wrong_is_found_without_the_cells() {
    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    workshop.edit(|tree| {
        // The figure and the step it ends at, both altered alike, as someone would who knows the seal.
        let seal = &mut tree["metadata"][KEY];
        let at: usize = seal["values"][0]["step"].as_str().unwrap().parse().unwrap();
        seal["steps"][at]["si"] = json!("-38500");
        seal["values"][0]["record"]["value"] = json!("-38.5");
    });
    let audit = workshop.audit(&AuditOptions { from_sources: true, ..AuditOptions::default() });
    let derived = audit.from_sources.unwrap();
    assert!(!derived[0].same && derived[0].parts_at.as_ref().unwrap().contains("enthalpy"), "{:#?}", derived[0]);
    assert_eq!(audit.status, AuditStatus::Differs);
}

#[test]
fn a_long_run_of_steps_is_named_as_not_derived_again() {
    let workshop = Workshop::sealed(&[
        "let sum = q(\"1.0(1) kJ\"); let step = q(\"0.01(1) kJ\"); for i in 0..6000 { sum = sum + step; }\n\
         report(\"sum\", sum)",
    ]);
    let tree: Value = serde_json::from_slice(&std::fs::read(workshop.path()).unwrap()).unwrap();
    assert!(tree["metadata"][KEY]["steps"].as_array().unwrap().len() <= 2000);
    let audit = workshop.audit(&AuditOptions { from_sources: true, ..AuditOptions::default() });
    assert_eq!(audit.status, AuditStatus::Same, "{}", audit_text::notebook(&audit));
    let derived = audit.from_sources.unwrap();
    assert!(!derived[0].not_rederived.is_empty(), "{derived:#?}");
}

#[test]
fn a_signature_is_verified_and_says_whether_its_key_is_trusted() {
    use hessbook::notebook::signature::{PrivateKey, TrustedKey, new_keys};
    use hessbook::notebook::verdict::Signed;
    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    let [own, other] = ["analyst", "other"].map(|name| workshop.folder.path().join(name));
    let [own_public, other_public] = [&own, &other].map(|path| new_keys(path).unwrap());
    assert_eq!(hessbook::fault::Fault::from(new_keys(&own).unwrap_err()).code(), "key-exists");
    let key = Some(PrivateKey::read(&own).unwrap());
    workshop.seal(&Sealing { key, date: "2026-12-02T00:00:00Z".to_owned(), ..Sealing::default() }).unwrap();
    let signed = |trusted: &Path| {
        let trusted = vec![TrustedKey::read(trusted).unwrap()];
        let audit = workshop.audit(&AuditOptions { trusted, ..AuditOptions::default() });
        (audit.seal.unwrap().signed, audit.status)
    };
    assert!(
        matches!(signed(&own_public), (Signed::Valid { trusted: Some(name), .. }, AuditStatus::Same) if name == "analyst")
    );
    assert!(matches!(signed(&other_public), (Signed::Valid { trusted: None, .. }, AuditStatus::Same)));
    // Someone alters the seal and makes its digest anew: only the signature tells.
    workshop.edit(|tree| {
        let seal = &mut tree["metadata"][KEY];
        seal["author"] = json!("somebody else");
        let mut altered: Seal = serde_json::from_value(seal.clone()).unwrap();
        altered.digest = altered.digest_now();
        *seal = serde_json::to_value(altered).unwrap();
    });
    assert!(matches!(signed(&own_public), (Signed::Invalid { .. }, AuditStatus::Differs)));
}

#[test]
fn a_file_beside_the_notebook_is_sealed_with_its_content() {
    let workshop = Workshop::new();
    let file = workshop.folder.path().join("power.csv");
    std::fs::write(&file, "t / s,P / W\n0,1.0\n1,2.0\n").unwrap();
    let cells = json!([{"cell_type": "code", "id": "a", "metadata": {}, "execution_count": null, "outputs": [],
        "source": "let n = read_csv(\"power.csv\").len();\nreport(\"rows\", n * q(\"1 kJ\"))"}]);
    let tree = json!({"cells": cells, "metadata": {}, "nbformat": 4, "nbformat_minor": 5});
    std::fs::write(workshop.path(), tree.to_string()).unwrap();
    let seal = workshop.seal(&Sealing::default()).unwrap();
    assert_eq!((seal.files.len(), seal.files[0].name.as_str()), (1, "power.csv"));
    std::fs::write(&file, "t / s,P / W\n0,1.0\n1,2.0\n2,3.0\n").unwrap();
    let audit = workshop.audit(&AuditOptions::default());
    let rows = value(&audit, "rows");
    assert_eq!(rows.under_sealed.verdict, Verdict::Identical);
    let (by, causes) = move_of(&rows.under_today);
    assert_eq!((by, causes.len(), causes[0].kind), (1.0, 1, CauseKind::Data));
    assert!(causes[0].what.contains("power.csv"));
}

#[test]
fn a_revision_tells_what_it_would_move_before_it_is_adopted() {
    use hessbook::notebook::data_change::compare_data;
    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    let new = revised("formation properties of H2O(g) in atct-1.112", "-241.822", "-241.722");
    let audit = compare_data(&workshop.path(), &Holdings::shipped(), &new, &Arc::default());
    let (by, causes) = move_of(&value(&audit, "twice").under_today);
    // ν(H2O) = -1, twice, times +0.100 kJ/mol.
    assert!((by + 0.2).abs() < 1e-9, "{by}");
    assert_eq!(causes[0].what, "formation properties of H2O(g) in atct-1.112");
}

#[test]
fn a_seal_that_is_killed_leaves_the_old_file_or_the_new_one() {
    // By hand and in `.ci/long` 200 moments; the seed of the moments is fixed, the system's clock is not.
    let moments: u64 = std::env::var("HESSBOOK_KILLS").ok().and_then(|text| text.parse().ok()).unwrap_or(12);
    let workshop = Workshop::sealed(&[SHIFT, REPORTS]);
    let path = workshop.path();
    let author = || {
        let notebook = hessbook::notebook::file::NotebookFile::read(&path).unwrap();
        let seal = hessbook::notebook::sealing::read_seal("copy", &notebook).unwrap().unwrap();
        assert!(seal.is_whole(), "a torn seal");
        seal.author.unwrap_or_default()
    };
    let start = |name: &str| {
        let mut command = std::process::Command::new(env!("CARGO_BIN_EXE_hessbook"));
        command.args(["seal", "--author", name]).arg(&path).stdout(std::process::Stdio::null());
        command.spawn().unwrap()
    };
    let begun = std::time::Instant::now();
    assert!(start("first").wait().unwrap().success());
    let whole = begun.elapsed();
    assert_eq!(author(), "first");
    let (mut before, mut state, mut new) = ("first".to_owned(), 7_u64, 0);
    for moment in 0..moments {
        // A linear congruential generator (Knuth, MMIX, from memory) spreads the moments over the time a whole run takes.
        state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        let share = (state >> 33) as f64 / f64::from(1_u32 << 31);
        let name = format!("author {moment}");
        let mut child = start(&name);
        std::thread::sleep(whole.mul_f64(share));
        let _ = child.kill(); // It may have ended by itself.
        child.wait().unwrap();
        let now = author();
        assert!(now == before || now == name, "{now}");
        new += usize::from(now == name);
        before = now;
    }
    println!("{moments} moments, {new} of them after the new file was in place");
}
