//! The reader of seals, and what an audit does with one before it runs a cell: digests, records, signature, derivations.
#![no_main]

use std::sync::LazyLock;

use hessbook::notebook::holdings::{Holdings, altered_records, files_of, records_of};
use hessbook::notebook::rederive::rederive;
use hessbook::notebook::seal::{Made, Seal};
use hessbook::notebook::signature::checked;
use libfuzzer_sys::fuzz_target;

static HOLDINGS: LazyLock<Holdings> = LazyLock::new(Holdings::shipped);

fuzz_target!(|bytes: &[u8]| {
    let Ok(seal) = serde_json::from_slice::<Seal>(bytes) else { return };
    let text = serde_json::to_string(&seal).expect("a seal is plain texts");
    let again: Seal = serde_json::from_str(&text).expect("what was written can be read");
    assert!(seal == again && seal.digest_now() == again.digest_now());
    let (records, entities) = records_of(&seal);
    let _ = (altered_records(&seal), files_of(&seal), checked(&seal, &[]));
    if let Ok(catalog) = HOLDINGS.records.with_sealed(&records, &entities).catalog() {
        let _ = catalog.find("CO2(g)");
    }
    // Formulas may take long over the figures of a stranger; that is what an audit has its time limit for.
    let is_formula = |made: &Made| matches!(made, Made::Formula { .. });
    if !seal.steps.iter().any(|step| is_formula(&step.made)) {
        let derived = rederive(&seal, &HOLDINGS).expect("the shipped records make a catalogue");
        assert_eq!(derived.len(), seal.values.len());
    }
});
