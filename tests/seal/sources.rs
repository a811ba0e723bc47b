//! Values derived again from their steps and records alone: whatever an argument was, as long as it was made of plain data.

use hessbook::notebook::audit::AuditOptions;
use hessbook::notebook::seal::KEY;
use hessbook::notebook::sealing::Sealing;
use hessbook::notebook::verdict::Rederived;
use serde_json::json;

use crate::workshop::Workshop;

/// A notebook of these cells, sealed as a draft and derived again with nothing of its cells left to run.
fn derived(cells: &[&str], files: &[(&str, &str)]) -> Vec<Rederived> {
    let workshop = Workshop::unsealed(cells, files);
    workshop.seal(&Sealing { draft: true, ..Sealing::default() }).unwrap();
    workshop.edit(|tree| tree["cells"].as_array_mut().unwrap().iter_mut().for_each(|cell| cell["source"] = json!("")));
    let audit = workshop.audit(&AuditOptions { from_sources: true, ..AuditOptions::default() });
    audit.from_sources.unwrap()
}

fn all_derived(cells: &[&str], files: &[(&str, &str)], values: usize) {
    let derived = derived(cells, files);
    assert_eq!(derived.len(), values);
    for one in derived {
        assert!(one.same && one.u_same == Some(true) && one.not_rederived.is_empty(), "{one:#?}");
    }
}

#[test]
fn a_molecule_is_made_again_from_its_constants_and_is_one_wherever_it_is_used() {
    all_derived(
        &[
            "let wavenumber = q(\"667(2) cm^-1\");
             let m = molecule(#{ formula: \"CO2\", point_group: \"Dinfh\", unit: \"cm^-1\", rotational_constants: [0.39022],
                 vibrations: [\"1333(3) cm^-1\", [wavenumber, 2], 2349] });",
            "report(\"Cp\", m.heat_capacity(\"450 degC\"));
             report(\"difference\", m.heat_capacity(\"450 degC\") - m.heat_capacity(\"440 degC\"));
             report(\"classical\", m.taken(#{ vibration: \"equipartition\" }).entropy(\"450 degC\"));
             report(\"shipped\", molecule(\"H2O\").enthalpy_increment(\"450 degC\"));",
        ],
        &[],
        4,
    );
}

#[test]
fn a_crystal_is_made_again() {
    all_derived(
        &["let c = crystal(#{ formula: \"Cu\", debye: \"320(5) K\", electronic: \"0.695 mJ/(mol K^2)\",
               expansivity: \"4.95e-5 K^-1\", compressibility: \"7.3e-12 Pa^-1\", molar_volume: \"7.11 cm^3/mol\" });
           report(\"Cp\", c.heat_capacity(\"298.15 K\")); report(\"S\", c.entropy(\"350 K\"));"],
        &[],
        2,
    );
}

#[test]
fn streams_are_made_again_for_a_balance() {
    all_derived(
        &[
            "let flow = q(\"120(2) kmol/h\");
             let feed = stream(\"feed\", q(\"220(2) degC\"), #{ \"CO(g)\": flow, \"H2(g)\": \"260(3) kmol/h\" });
             let mass = stream(\"inert\", \"200 degC\", #{ \"N2(g)\": q(\"500(5) kg/h\") });
             let parts = stream(\"parts\", \"210 degC\", q(\"10.0(1) kmol/h\"), #{ \"CO(g)\": 0.4, \"H2(g)\": 0.6 });",
            "let r = #{ reaction: reaction(\"CO(g) + 2 H2(g) -> methanol(g)\"), conversion: 0.3, of: \"CO(g)\" };
             report(\"duty\", heat_balance(#{ feeds: [feed, mass, parts], reactions: [r], outlet: \"255 degC\" }).duty);
             report(\"T\", adiabatic_temperature(#{ feeds: [feed, mass], reactions: [r] }));
             let mixed = heat_balance(#{ feeds: [feed, mass], outlet: \"215 degC\" }).outlet;
             report(\"rise\", temperature_rise(#{ feeds: [mixed], reactions: [r] }));",
        ],
        &[],
        3,
    );
}

const CP: &str = "T / K,Cp / (J/(K mol[larkol])),u(Cp) / (J/(K mol[larkol]))\n\
                  290,148.8,1.0\n320,152.5,1.0\n340,154.8,1.0\n360,157.6,1.0\n380,160.0,1.0\n";

#[test]
fn what_one_measured_or_brings_along_stands_in_a_reaction_again() {
    all_derived(
        &[
            "let fit = fit_heat_capacity(read_csv(\"cp.csv\", \"laboratory book 7\"), [0, 1]);
             report(\"Cp of the fit\", fit.heat_capacity(\"350 K\")); report(\"increment\", fit.enthalpy_increment(\"370 K\", \"310 K\"));",
            "let m = molecule(#{ formula: \"CO2\", point_group: \"Dinfh\", unit: \"cm^-1\", rotational_constants: [0.39022],
                 vibrations: [1333, [\"667(2) cm^-1\", 2], 2349], formation_enthalpy: \"-393.5(1) kJ/mol\",
                 formation_temperature: \"298.15 K\" });
             let r = reaction(\"CO(g) + 0.5 O2(g) -> CO2(g)\", #{ own: #{ \"CO2(g)\": m } });
             report(\"H\", r.enthalpy(\"600 K\")); report(\"S\", r.entropy(\"600 K\"));",
        ],
        &[("cp.csv", CP)],
        4,
    );
}

#[test]
fn readings_taken_together_keep_their_correlation() {
    // One call gives both means; u of the ratio rests on how they scatter together.
    all_derived(
        &["let m = readings(#{ V: [5.007, 4.994, 5.005], I: [19.663, 19.639, 19.640] }, #{ V: \"V\", I: \"mA\" });
           report(\"resistance\", m.V / m.I); report(\"power\", m.V * m.I)"],
        &[],
        2,
    );
}

#[test]
fn a_thing_that_is_a_part_of_itself_is_named_as_not_derived_again() {
    // A thing that names itself, as only a seal that was tampered with can.
    let cells = ["let s = stream(\"s\", \"220 degC\", #{ \"CO(g)\": \"1 mol\" });
        report(\"Q\", heat_balance(#{ feeds: [s], products: [stream(\"t\", \"240 degC\", #{ \"CO(g)\": \"1 mol\" })] }).duty)"];
    let workshop = Workshop::unsealed(&cells, &[]);
    workshop.seal(&Sealing { draft: true, ..Sealing::default() }).unwrap();
    workshop.edit(|tree| {
        tree["metadata"][KEY]["objects"][0]["arguments"][0] = json!({"object": {"at": "0", "words": "itself"}});
    });
    let audit = workshop.audit(&AuditOptions { from_sources: true, ..AuditOptions::default() });
    let one = &audit.from_sources.unwrap()[0];
    assert!(one.not_rederived.iter().any(|why| why.contains("itself: it is made of itself")), "{one:#?}");
}

#[test]
fn records_and_measurements_beside_the_notebook_are_read_again_from_the_seal() {
    let cells = [
        "display(dataset(\"plant.json\"));",
        "let carbamate = fit_heat_capacity(read_csv(\"carbamate-cp.csv\"), [0, 1]);
         let absorption = reaction(\"larkmoor amine(l) + CO2(g) -> larkmoor carbamate(l)\",
             #{ own: #{ \"larkmoor carbamate(l)\": carbamate } });
         report(\"heat of absorption at 313 K\", absorption.enthalpy(\"313.15 K\"));
         report(\"heat of absorption at 393 K\", absorption.enthalpy(\"393.15 K\"));",
    ];
    let files = [
        ("plant.json", include_str!("../../notebooks/plant.json")),
        ("carbamate-cp.csv", include_str!("../../notebooks/carbamate-cp.csv")),
    ];
    all_derived(&cells, &files, 2);
}

#[test]
fn an_open_mole_that_takes_its_name_on_the_way_into_a_unit_is_bound_again() {
    all_derived(
        &["let h = reaction(\"N2(g) + 3 H2(g) -> 2 NH3(g)\").enthalpy(\"500 K\");
           report(\"heat\", (q(\"2 mol\") * h.per(\"NH3\")).to(\"kJ\"));"],
        &[],
        1,
    );
}

#[test]
fn a_typed_figure_is_read_again_from_its_text_and_one_without_a_text_is_named() {
    let table = ("cp.csv", "T / K,Cp / (J/(K mol))\n300,30\n400,31\n");
    let cells = ["report(\"typed\", 2 * q(\"5.0 kJ ± 0.2 kJ, 95 %, dof=18\"));
         report(\"read\", 2 * read_csv(\"cp.csv\").column(\"Cp\")[1]);
         report(\"mean\", 2 * readings([5.007, 4.994, 5.005], \"V\"));"];
    let all = derived(&cells, &[table]);
    assert!(all[0].same && all[0].not_rederived.is_empty(), "{:#?}", all[0]);
    let [figure] = all[1].not_rederived.as_slice() else { panic!("{:#?}", all[1]) };
    assert!(figure.contains("Cp of cp.csv, line 3, which is taken as sealed"), "{figure}");
    assert!(all[2].same && all[2].not_rederived.is_empty(), "{:#?}", all[2]);
    // A seal by someone who knows it: the input, its step and the value altered alike.
    let workshop = Workshop::unsealed(&cells, &[table]);
    workshop.seal(&Sealing { draft: true, ..Sealing::default() }).unwrap();
    workshop.edit(|tree| {
        let seal = &mut tree["metadata"][KEY];
        (seal["steps"][0]["si"], seal["steps"][1]["si"]) = (json!("7000"), json!("14000"));
        seal["values"][0]["record"]["value"] = json!("14");
    });
    let audit = workshop.audit(&AuditOptions { from_sources: true, ..AuditOptions::default() });
    let typed = &audit.from_sources.unwrap()[0];
    assert!(!typed.same && typed.parts_at.as_ref().unwrap().contains("7000 sealed, 5000 derived again"), "{typed:#?}");
}
