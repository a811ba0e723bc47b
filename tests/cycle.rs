//! The cycle behind a reaction enthalpy: its legs, what they add up to, and how they are shown; and over random reactions, the
//! same enthalpy by a path of the test's own.

mod asking;
mod second;

use std::collections::BTreeMap;
use std::rc::Rc;
use std::sync::Arc;

use asking::Desk;
use hessbook::data::catalog::Catalog;
use hessbook::data::dataset::DatasetId;
use hessbook::data::substance::Substance;
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

/// A generator of whole numbers and shares that needs no library: SplitMix64 (Steele, Lea, Flood, 2014; from memory).
struct Random(u64);

impl Random {
    fn next(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mixed = (self.0 ^ (self.0 >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        let mixed = (mixed ^ (mixed >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        mixed ^ (mixed >> 31)
    }

    fn below(&mut self, n: usize) -> usize {
        (self.next() % n as u64) as usize
    }

    fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * (self.next() >> 11) as f64 / (1u64 << 53) as f64
    }
}

/// What random reactions are made of: substances that exist at 298.15 K, and the elements to balance them with.
struct Pool {
    substances: Vec<Arc<Substance>>,
    /// Symbol to the reference state, and how many atoms one mole of it has.
    elements: BTreeMap<String, (Arc<Substance>, i64)>,
}

fn pool(data: &Catalog) -> Pool {
    let at_298 = |substance: &&Arc<Substance>| substance.function.as_ref().is_some_and(|f| f.covers(second::T_0));
    let known: Vec<Arc<Substance>> = data.substances().filter(at_298).cloned().collect();
    let mut elements = BTreeMap::new();
    for substance in &known {
        let atoms: Vec<_> = substance.species.composition.iter().collect();
        let function = substance.function.as_ref().unwrap();
        // The report marks other phases of elements too; the reference state is the one whose scale starts at zero.
        if let [(element, count)] = atoms[..]
            && function.is_reference_element
            && function.dhf_298 == 0.0
        {
            elements.insert(element.symbol().to_owned(), (substance.clone(), count.to_f64() as i64));
        }
    }
    let is_element = |id: &str| elements.values().any(|(element, _)| element.id() == id);
    let balances = |substance: &Arc<Substance>| {
        let whole = substance
            .species
            .composition
            .iter()
            .all(|(element, count)| count.is_integer() && elements.contains_key(element.symbol()));
        whole && substance.species.charge == 0 && !is_element(substance.id())
    };
    let substances = known.iter().filter(|substance| balances(substance)).cloned().collect();
    Pool { substances, elements }
}

/// Stoichiometric numbers times `denominator`, by substance.
struct Made {
    terms: BTreeMap<String, (Arc<Substance>, i64)>,
    denominator: i64,
}

/// A random combination of formation reactions. Elements that cancel leave reactions between compounds.
fn random_reaction(random: &mut Random, pool: &Pool) -> Option<Made> {
    // The least that whole numbers of all elements divide into: P, S and the metals are atoms, the gases pairs.
    let denominator = 12;
    let mut terms: BTreeMap<String, (Arc<Substance>, i64)> = BTreeMap::new();
    for _ in 0..2 + random.below(4) {
        let substance = &pool.substances[random.below(pool.substances.len())];
        let nu = [-4, -3, -2, -1, 1, 2, 3, 4][random.below(8)];
        terms.entry(substance.id().to_owned()).or_insert((substance.clone(), 0)).1 += nu * denominator;
        for (element, count) in substance.species.composition.iter() {
            let (reference, atoms) = &pool.elements[element.symbol()];
            let share = nu * denominator * count.to_f64() as i64;
            assert_eq!(share % atoms, 0, "{} atoms of {}", atoms, element.symbol());
            terms.entry(reference.id().to_owned()).or_insert((reference.clone(), 0)).1 -= share / atoms;
        }
    }
    terms.retain(|_, (_, nu)| *nu != 0);
    let condensed = |(substance, _): &&(Arc<Substance>, i64)| !substance.species.is_gas();
    let mut entities: Vec<_> = terms.values().filter(condensed).map(|(s, _)| s.species.entity).collect();
    let all = entities.len();
    entities.sort();
    entities.dedup();
    // Two condensed phases of one substance may be refused, as `phases.rs` tests.
    (terms.len() > 1 && entities.len() == all).then_some(Made { terms, denominator })
}

impl Made {
    fn equation(&self) -> String {
        let side = |sign: i64| {
            let on_it = self.terms.values().filter(|(_, nu)| nu.signum() == sign);
            let written = on_it.map(|(substance, nu)| format!("{}/{} {}", nu.abs(), self.denominator, substance.id()));
            written.collect::<Vec<_>>().join(" + ")
        };
        format!("{} -> {}", side(-1), side(1))
    }

    fn numbers(&self) -> impl Iterator<Item = (&Arc<Substance>, f64)> {
        self.terms.values().map(|(substance, nu)| (substance, *nu as f64 / self.denominator as f64))
    }

    /// Where all its species have an enthalpy, over their changes of phase.
    fn range(&self, data: &Catalog) -> (f64, f64) {
        let top = |substance: &Arc<Substance>| {
            let mut phase = substance.clone();
            while let Some((_, next)) = second::next(data, &phase) {
                phase = next;
            }
            phase.function.as_ref().unwrap().t_max
        };
        let range = |substance: &Arc<Substance>| (substance.function.as_ref().unwrap().t_min, top(substance));
        let ranges = self.terms.values().map(|(substance, _)| range(substance));
        ranges.fold((0.0_f64, f64::INFINITY), |all, one| (all.0.max(one.0), all.1.min(one.1)))
    }
}

/// The formation enthalpy that a dataset gives, or the convention for an element.
fn formation(substance: &Substance, dataset: &DatasetId) -> f64 {
    let printed = substance.formation(dataset).map(|record| record.dhf.value);
    printed.unwrap_or_else(|| {
        assert!(substance.function.as_ref().unwrap().is_reference_element, "{}", substance.id());
        0.0
    })
}

#[test]
fn over_a_thousand_random_reactions_the_cycle_closes_by_another_path() {
    const SEED: u64 = 20_020_911;
    const REACTIONS: usize = 1200;
    let (desk, data) = (Desk::new(), Catalog::shipped());
    let (pool, mut random) = (pool(&data), Random(SEED));
    let dataset = "nasa-tp-2002-211556";
    let id = DatasetId::new(dataset);
    let (mut compared, mut crossed, mut worst) = (0, 0, (0.0_f64, String::new()));
    let mut species: BTreeMap<String, usize> = BTreeMap::new();
    while compared < REACTIONS {
        let Some(made) = random_reaction(&mut random, &pool) else { continue };
        let (low, high) = made.range(&data);
        let t_k = random.between(low, high.min(3000.0));
        let equation = made.equation();
        let t = format!("{t_k} K");
        let got = desk.ask(&ENTHALPY, &equation, &t, &[("formation", dataset)]);
        let got = got.unwrap_or_else(|fault| panic!("{equation} at {t}: {fault}")).si();
        let legs = cycle(&desk, &equation, &t, &[("formation", dataset)]).unwrap();
        // Other temperatures on the way than the program's, which has none between the ends of intervals.
        let cuts: Vec<f64> = (0..5).map(|_| random.between(low.max(200.0), high.min(3000.0))).collect();
        let (mut sum, mut size) = (0.0, 0.0);
        for (substance, nu) in made.numbers() {
            let (heatings, passed) = second::increment(&data, substance, t_k, &cuts);
            let heated: f64 = heatings.iter().map(|heating| heating.integral + heating.joins).sum();
            let h = formation(substance, &id) + heated + passed.iter().map(|change| change.dh).sum::<f64>();
            sum += nu * h;
            size += (nu * h).abs();
            crossed += passed.len();
            *species.entry(substance.id().to_owned()).or_default() += 1;
        }
        // Both the reaction enthalpy and the sum of the legs that are shown.
        let residual = (got - sum).abs().max((legs.sum.si() - sum).abs()) / size;
        if residual > worst.0 {
            worst = (residual, format!("{equation} at {t}: {got} and {sum} J/mol, Σ|νH| = {size}"));
        }
        compared += 1;
    }
    println!("seed {SEED}: {compared} reactions of {} species, {crossed} changes of phase passed", species.len());
    println!("worst residual {:.1e} of Σ|νH|, at {}", worst.0, worst.1);
    // Bound: rounding of the closed forms, whose terms cancel from up to 1e9 J/mol in liquid water.
    assert!(worst.0 <= 1e-12, "{:.2e}: {}", worst.0, worst.1);
    assert!(species.len() > 200 && crossed > 500, "{} species, {crossed} changes", species.len());
}
