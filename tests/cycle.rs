//! The cycle behind a reaction enthalpy: its legs, what they add up to, and how they are shown.

mod asking;

use std::rc::Rc;

use asking::Desk;
use hessbook::fault::Fault;
use hessbook::model::answer::Answer;
use hessbook::model::card::{self, Value};
use hessbook::model::cycle::{CYCLE, Cycle, Happens};
use hessbook::model::property_card::ENTHALPY;
use hessbook::model::reaction::REACTION;
use hessbook::render;

fn cycle(desk: &Desk, equation: &str, t: &str, options: &[(&str, &str)]) -> Result<Rc<Cycle>, Fault> {
    let reaction = card::call(&desk.cx(), &REACTION, vec![Value::Text(equation.into())])?;
    let option = |(name, word): &(&str, &str)| ((*name).to_owned(), Value::Text((*word).into()));
    let options = Value::Options(Rc::new(options.iter().map(option).collect()));
    match card::call(&desk.cx(), &CYCLE, vec![reaction, Value::Text(t.into()), options])? {
        Value::Answer(Answer::Cycle(cycle)) => Ok(cycle),
        other => panic!("{}", other.sort()),
    }
}

const IRON_SULFIDE: &str = "Fe(cr,alpha) + S(cr,rhombic) -> FeS(cr,alpha)";

#[test]
fn reactants_go_down_products_go_up_and_each_change_of_phase_is_a_leg() {
    let cycle = cycle(&Desk::new(), IRON_SULFIDE, "700 K", &[]).unwrap();
    let legs: Vec<(&str, &str, f64, f64)> =
        cycle.legs.iter().map(|leg| (leg.happens.word(), &*leg.what, leg.from_k, leg.to_k)).collect();
    assert_eq!(
        legs,
        [
            ("cooling", "Fe(cr,alpha)", 700.0, 298.15),
            ("cooling", "S(l)", 700.0, 388.36),
            ("phase change", "S(l) -> S(cr,monoclinic)", 388.36, 388.36),
            ("cooling", "S(cr,monoclinic)", 388.36, 368.3),
            ("phase change", "S(cr,monoclinic) -> S(cr,rhombic)", 368.3, 368.3),
            ("cooling", "S(cr,rhombic)", 368.3, 298.15),
            ("reaction", IRON_SULFIDE, 298.15, 298.15),
            ("heating", "FeS(cr,alpha)", 298.15, 411.0),
            ("phase change", "FeS(cr,alpha) -> FeS(cr,beta)", 411.0, 411.0),
            ("heating", "FeS(cr,beta)", 411.0, 598.0),
            ("phase change", "FeS(cr,beta) -> FeS(cr,gamma)", 598.0, 598.0),
            ("heating", "FeS(cr,gamma)", 598.0, 700.0),
        ]
    );
    // The transitions are the recorded ones, with the sign of the way that is taken: NASA/TP-2002-211556, pp. 260 and 229.
    let changes: Vec<f64> =
        (cycle.legs.iter().filter(|leg| leg.happens == Happens::PhaseChange)).map(|leg| leg.dh.si()).collect();
    assert_eq!(changes, [-1721.0, -401.0, 2343.0, 397.5]);
}

#[test]
fn the_legs_add_up_to_the_reaction_enthalpy_by_every_way_of_taking_cp() {
    let desk = Desk::new();
    for (equation, t) in [
        (IRON_SULFIDE, "700 K"),
        ("CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(g)", "1200 K"),
        ("2 Fe(cr,gamma) + 3/2 O2(g) -> Fe2O3(cr,hematite)", "1300 K"),
        ("H2O(cr,ice-ih) -> H2O(g)", "260 K"),
        ("Pb(cr) + 1/2 O2(g) -> PbO(cr,red)", "900 K"),
        ("N2(g) + 3 H2(g) -> 2 NH3(g)", "298.15 K"),
    ] {
        for mode in ["full", "constant", "midpoint", "mean"] {
            let options = [("heat_capacity", mode)];
            let cycle = cycle(&desk, equation, t, &options).unwrap();
            let alone = desk.ask(&ENTHALPY, equation, t, &options).unwrap();
            assert_eq!(cycle.total.si(), alone.si(), "{equation} {mode}");
            let legs: f64 = cycle.legs.iter().map(|leg| leg.dh.si()).sum();
            let size: f64 = cycle.legs.iter().map(|leg| leg.dh.si().abs()).sum();
            // Bound: a few roundings of each leg.
            assert!((legs - alone.si()).abs() <= 1e-14 * size, "{equation} {mode}: {legs}, {}", alone.si());
            assert_eq!(cycle.residual, cycle.sum.si() - alone.si());
            // The legs rest on what the reaction enthalpy rests on, so the uncertainty is the same.
            let u = |value: &hessbook::quantity::Quantity| value.spread().u().unwrap_or(0.0);
            assert!((u(&cycle.sum) - u(&alone)).abs() <= 1e-12 * u(&alone), "{equation} {mode}");
        }
    }
}

#[test]
fn a_phase_that_is_not_there_at_298_k_passes_through_the_one_that_is() {
    let desk = Desk::new();
    let gamma = cycle(&desk, "Fe(cr,gamma) -> Fe(g)", "1300 K", &[]).unwrap();
    let words: Vec<String> = gamma.legs.iter().map(|leg| format!("{} {}", leg.happens.word(), leg.what)).collect();
    assert_eq!(
        words,
        [
            "cooling Fe(cr,gamma)",
            "phase change Fe(cr,gamma) -> Fe(cr,alpha)",
            "cooling Fe(cr,alpha)",
            "reaction Fe(cr,alpha) -> Fe(g)",
            "heating Fe(g)",
        ]
    );
    // 0.900 kJ/mol, NASA/TP-2002-211556, p. 228. Bound: the recorded figure is rounded to 0.1 J/mol.
    assert!((gamma.legs[1].dh.si() + 900.0).abs() < 0.06, "{}", gamma.legs[1].dh.si());
    let ice = cycle(&desk, "H2O(cr,ice-ih) -> H2O(g)", "260 K", &[]).unwrap();
    let words: Vec<String> = ice.legs.iter().map(|leg| format!("{} {}", leg.happens.word(), leg.what)).collect();
    assert_eq!(
        words,
        [
            "heating H2O(cr,ice-ih)",
            "phase change H2O(cr,ice-ih) -> H2O(l)",
            "heating H2O(l)",
            "reaction H2O(l) -> H2O(g)",
            "cooling H2O(g)",
        ]
    );
    // A change of phase at another temperature is no reaction at 298.15 K, where one phase stands on both sides.
    let melting = cycle(&desk, "H2O(cr,ice-ih) -> H2O(l)", "273.15 K", &[]).unwrap();
    let reaction = melting.legs.iter().find(|leg| leg.happens == Happens::Reaction).unwrap();
    assert!(reaction.dh.si() == 0.0 && reaction.what.contains("only H2O(l)"), "{}", reaction.what);
}

#[test]
fn a_cycle_is_a_table_a_picture_and_rows() {
    let desk = Desk::new();
    let cycle = cycle(&desk, IRON_SULFIDE, "700 K", &[]).unwrap();
    let bundle = render::answer(&Answer::Cycle(Rc::clone(&cycle)));
    let of = |mime: &str| bundle.data[mime].as_str().unwrap().to_owned();
    let (text, html, svg) = (of("text/plain"), of("text/html"), of("image/svg+xml"));
    for line in
        ["S(l) -> S(cr,monoclinic)", "-1.721", "388.36 K to 368.3 K", "ΔrH° = -97.689", "[1] NASA/TP-2002-211556"]
    {
        assert!(text.contains(line), "{line} in {text}");
    }
    for part in ["<table>", "S(l) -&gt; S(cr,monoclinic)", "<svg ", "-1.721"] {
        assert!(html.contains(part), "{part}");
    }
    for part in ["7  reaction at 298.15 K: −99.621", "in all −97.689 kJ/mol", "H / (kJ/mol)", "<title>"] {
        assert!(svg.contains(part), "{part} in {svg}");
    }
    let Value::List(rows) = Answer::Cycle(Rc::clone(&cycle)).part("rows").unwrap() else { panic!("no list") };
    assert_eq!(rows.len(), cycle.legs.len());
    for (row, leg) in rows.iter().zip(&cycle.legs) {
        let Value::Options(row) = row else { panic!("no map") };
        assert_eq!(row.keys().map(String::as_str).collect::<Vec<_>>(), ["dH", "from", "leg", "species", "to"]);
        let Value::Quantity(dh) = &row["dH"] else { panic!("no quantity") };
        let Value::Quantity(to) = &row["to"] else { panic!("no quantity") };
        assert_eq!((dh.si(), to.si()), (leg.dh.si(), leg.to_k));
    }
}
