//! Tables that cells read and write: what comes back, where files may lie, and that a failed cell writes none.

use std::path::Path;
use std::sync::Arc;

use hessbook::fault::Fault;
use hessbook::render::Bundle;
use hessbook::session::outcome::Host;
use hessbook::session::{Session, on_big_stack};

struct Silent;

impl Host for Silent {
    fn write(&mut self, _stderr: bool, _text: &str) {}

    fn show(&mut self, _bundle: &Bundle, _id: Option<&str>) {}

    fn update(&mut self, _bundle: &Bundle, _id: &str) {}
}

/// Runs cells in a session of the folder, up to the first that fails; the text that the last one shows.
fn cells(folder: &Path, cells: &[&str]) -> Result<String, Fault> {
    on_big_stack(|| {
        let mut session = Session::new(Arc::default());
        session.set_folder(folder.to_path_buf());
        let mut shown = String::new();
        for (nth, cell) in cells.iter().enumerate() {
            let outcome = session.run_cell(&format!("cell-{}", nth + 1), cell, &mut Silent);
            outcome.result?;
            shown = outcome.shown.map(|bundle| bundle.plain().to_owned()).unwrap_or_default();
        }
        Ok(shown)
    })
}

fn code(folder: &Path, text: &str) -> &'static str {
    cells(folder, &[text]).map(|_| ()).unwrap_err().code()
}

const SHIFT: &str =
    "let r = reaction(\"CO(g) + H2O(g) -> CO2(g) + H2(g)\"); let T = grid(\"20 degC\", \"900 degC\", 89);";

#[test]
fn a_curve_comes_back_with_its_units_and_uncertainties() {
    let folder = tempfile::tempdir().unwrap();
    let writing = "let h = r.enthalpy(T); [h, r.heat_capacity(T), r.equilibrium_constant(T)].write_csv(\"shift.csv\");";
    let round_trip = "let t = read_csv(\"shift.csv\");
        let back = #{ h: t.curve(\"ΔrH°\"), cp: t.curve(\"ΔrCp°\"), k: t.curve(\"K°\") };
        require(t.columns() == [\"T\", \"ΔrH°\", \"ΔrCp°\", \"K°\"], `${t.columns()}`);
        // Bound: each number is rounded once in its unit on the way out and once on the way in.
        let near = |a, b| (a - b).abs() <= 3e-16 * a.abs();
        for i in 0..h.len() {
            require(near.call(h.x()[i].value(\"K\"), back.h.x()[i].value(\"K\")), `T of row ${i}`);
            require(near.call(h[i].value(\"J/mol\"), back.h[i].value(\"J/mol\")), `ΔrH° of row ${i}`);
            require(near.call(h[i].uncertainty(\"J/mol\"), back.h[i].uncertainty(\"J/mol\")), `u of row ${i}`);
            require(back.cp[i].uncertainty(\"J/(K mol)\") == (), \"none is stated for heat capacities\");
        }
        require(near.call(r.equilibrium_constant(T)[7].value(\"1\"), back.k[7].value(\"1\")), \"K°\");
        back.h[0] - h[0]";
    let shown = cells(folder.path(), &[SHIFT, writing, round_trip]).unwrap();
    assert!(shown.contains("per mole of reaction"), "the basis came back too: {shown}");
}

#[test]
fn the_text_of_a_file_is_as_agreed() {
    let folder = tempfile::tempdir().unwrap();
    let writing = "let r = reaction(\"C(cr,graphite) + O2(g) -> CO2(g)\");
        let T = grid(\"298.15 K\", \"299.15 K\", 3);
        #{ heat: r.enthalpy(T).to(\"kcal_th/mol\"), constant: r.entropy(T) }.write_csv(\"burnt.csv\");";
    cells(folder.path(), &[writing]).unwrap();
    let text = std::fs::read_to_string(folder.path().join("burnt.csv")).unwrap();
    let heads: Vec<&str> = text.lines().filter(|line| !line.starts_with('#')).collect();
    assert_eq!(heads[0], "T / K,constant / (J/(K mol[rxn])),heat / (kcal_th/mol[rxn]),u(heat) / (kcal_th/mol[rxn])");
    assert!(heads[1].starts_with("298.15,") && heads[2].starts_with("298.65,") && heads.len() == 4, "{text}");
    let remarks = text.lines().filter(|line| line.starts_with("# source: ")).count();
    assert!(remarks >= 3, "the sources of figures and functions are listed: {text}");
}

#[test]
fn a_failed_cell_writes_nothing_and_a_cell_reads_what_it_wrote() {
    let folder = tempfile::tempdir().unwrap();
    let failing =
        "r.enthalpy(T).write_csv(\"lost.csv\"); require(read_csv(\"lost.csv\").len() == 89, \"its own\"); throw 1";
    assert!(cells(folder.path(), &[SHIFT, failing]).is_err());
    assert!(!folder.path().join("lost.csv").exists());
    // A name may be written in two ways, and is one file.
    let again = "r.enthalpy(T).write_csv(\"./kept.csv\"); require(read_csv(\"kept.csv\").len() == 89, \"its own\");";
    cells(folder.path(), &[SHIFT, again]).unwrap();
    let files: Vec<_> = std::fs::read_dir(folder.path()).unwrap().map(|entry| entry.unwrap().file_name()).collect();
    assert_eq!(files, ["kept.csv"]);
}

#[test]
fn files_are_written_in_the_folder_of_the_notebook() {
    let folder = tempfile::tempdir().unwrap();
    let inside = folder.path().join("inside");
    std::fs::create_dir(&inside).unwrap();
    std::fs::write(folder.path().join("out.csv"), "T / K,p / bar\n300,1\n").unwrap();
    std::fs::write(inside.join("binary.csv"), [0xff, 0xfe, 0x00]).unwrap();
    let absolute = folder.path().join("out.csv").display().to_string();
    for name in ["../out.csv", &absolute, "", "a/../../out.csv"] {
        let writing = format!("{SHIFT} r.enthalpy(T).write_csv(\"{name}\")");
        assert_eq!(code(&inside, &writing), "file-outside-folder", "{name}");
    }
    assert_eq!(code(&inside, "read_csv(\"none.csv\")"), "file-missing");
    assert_eq!(code(&inside, "read_csv(\"binary.csv\")"), "file-not-text");
    let writing = |name: &str| code(&inside, &format!("{SHIFT} r.enthalpy(T).write_csv(\"{name}\")"));
    assert_eq!(writing("notes.txt"), "file-extension");
    assert_eq!(writing("nowhere/x.csv"), "table-unwritable");
    #[cfg(unix)]
    {
        std::os::unix::fs::symlink(folder.path().join("out.csv"), inside.join("link.csv")).unwrap();
        std::os::unix::fs::symlink(folder.path(), inside.join("up")).unwrap();
        assert_eq!(writing("up/x.csv"), "file-outside-folder");
        // A link in the place of the file is replaced, and what it leads to stays as it is.
        cells(&inside, &[SHIFT, "r.enthalpy(T).write_csv(\"link.csv\");"]).unwrap();
        assert!(std::fs::read_to_string(folder.path().join("out.csv")).unwrap().starts_with("T / K,p / bar"));
    }
}

#[test]
fn a_measured_curve_keeps_its_figures_apart_and_is_not_interpolated() {
    let folder = tempfile::tempdir().unwrap();
    let table = "# source: invented for this test\nT / K,Cp / (J/(K mol[CH4])),u(Cp) / (J/(K mol[CH4]))\n\
                 300,35.8,0.3\n310,36.1,0.4\n320,36.5,\n";
    std::fs::write(folder.path().join("cp.csv"), table).unwrap();
    let script = "let cp = read_csv(\"cp.csv\").curve();
        require((cp[1] - cp[0]).uncertainty(\"J/(K mol)\") == 0.5, \"two readings are independent\"); // 0.3² + 0.4² = 0.5²
        require((cp[1] - cp.at(\"310 K\")).uncertainty(\"J/(K mol)\") == 0.0, \"one reading is itself\");
        require(cp.uncertainty(\"J/(K mol)\")[2] == (), \"none is stated\");
        let computed = substance(\"CH4(g)\").heat_capacity(grid(cp.x()));
        let gap = cp - computed;
        require(gap.len() == 3 && gap[0].value(\"J/(K mol)\").abs() < 0.2, `${gap[0]}`);";
    cells(folder.path(), &[script]).unwrap();
    let between = "let cp = read_csv(\"cp.csv\").curve(\"Cp\", \"T\"); cp.at(\"305 K\")";
    assert_eq!(code(folder.path(), between), "curve-not-interpolated");
}

#[test]
fn a_molecule_is_read_from_a_file_in_both_forms() {
    let folder = tempfile::tempdir().unwrap();
    let csv = "property,value,unit,degeneracy\nformula,CO2,,\npoint group,Dinfh,,\nrotational constant,11.698,GHz,\n\
               distortion constant,4.0,kHz,\nwavenumber,1333,cm^-1,\nwavenumber,667,cm^-1,2\nwavenumber,2349,cm^-1,\n";
    let json = r#"{"formula": "CO2", "point_group": "Dinfh", "rotational_constants": ["11.698 GHz"], "distortion": ["4.0 kHz"],
        "unit": "cm^-1", "vibrations": [1333, [667, 2], 2349]}"#;
    std::fs::write(folder.path().join("freq.csv"), csv).unwrap();
    std::fs::write(folder.path().join("freq.json"), json).unwrap();
    let cell = "let of = |m| m.entropy(\"500 K\").value(\"J/(K mol)\");
        let a = of.call(molecule_table(\"freq.csv\"));
        require(a == of.call(molecule_table(\"freq.json\")), \"both forms are one molecule\");
        // 234.9 J/(K mol) by NASA/TP-2002-211556, Appendix D, p. 85, evaluated; its wavenumbers, here rounded, give it to 0.1.
        require((a - 234.9).abs() < 0.1, `S of carbon dioxide: ${a}`);
        let hot = molecule_table(\"freq.csv\", #{ scale: 0.98 });
        require(of.call(hot) > a, \"and more is said of it beside the file\");";
    cells(folder.path(), &[cell]).unwrap_or_else(|fault| panic!("{fault}"));
    std::fs::write(folder.path().join("bytes.csv"), [0xff, 0xfe, 0x00]).unwrap();
    assert_eq!(code(folder.path(), "molecule_table(\"bytes.csv\")"), "file-not-text");
    assert_eq!(code(folder.path(), "molecule_table(\"absent.csv\")"), "file-missing");
    assert_eq!(code(folder.path(), "molecule_table(\"formula,CO2\")"), "file-missing");
}
