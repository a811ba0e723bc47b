//! A table in the place of another: what a new edition needs before anyone adopts it.
//!
//! The surprise: a new edition mostly has an id of its own, and stands in the old one's place all the same. So it is read
//! under the id and with the rank of the old one, unless its id is that of another table which is there already: then the
//! old one goes, and the other moves up to its rank.

use serde_json::Value;

use crate::source::{Embedded, STDLIB, sha256};

use super::formation;
use super::records::{RecordTable, Records};
use super::tables;

/// The shipped file of formation enthalpies of a dataset.
pub fn shipped_file(dataset: &str) -> Option<&'static Embedded<'static>> {
    STDLIB.iter().find(|file| {
        tables::schema(file.bytes) == Some(formation::SCHEMA)
            && Records::read(&[**file]).is_ok_and(|read| read.tables.iter().any(|table| *table.dataset == *dataset))
    })
}

impl Records {
    /// Whether there is a table of the same schema and dataset as this one.
    pub fn stands_for(&self, table: &RecordTable) -> bool {
        self.tables.iter().any(|known| known.schema == table.schema && known.dataset == table.dataset)
    }

    /// These records with `new` in the place of the table of the schema and dataset of `old`.
    #[must_use]
    pub fn with_new_edition(&self, old: &RecordTable, new: &RecordTable) -> Records {
        let is_old = |table: &RecordTable| table.schema == old.schema && table.dataset == old.dataset;
        let there = !is_old(new) && self.stands_for(new);
        let id = if there { &new.dataset } else { &old.dataset };
        let rest = self.tables.iter().filter(|table| !is_old(table)).cloned();
        let placed = new.described(id, rank(old));
        Records { tables: rest.collect() }.with_tables(&Records { tables: vec![placed] })
    }
}

impl RecordTable {
    /// Whether it has formation enthalpies.
    pub fn is_of_formations(&self) -> bool {
        *self.schema == *formation::SCHEMA
    }

    /// The table as one of a dataset of this id and rank.
    #[must_use]
    pub fn described(&self, id: &str, rank: Option<Value>) -> RecordTable {
        let mut table = self.clone();
        let Ok(mut head) = serde_json::from_str::<Value>(&table.head) else { return table };
        let Some(dataset) = head.get_mut("dataset").and_then(Value::as_object_mut) else { return table };
        dataset.insert("id".to_owned(), id.into());
        if let Some(rank) = rank {
            dataset.insert("rank".to_owned(), rank);
        }
        let head = head.to_string();
        (table.dataset, table.head_sha256, table.head) = (id.into(), sha256(head.as_bytes()).into(), head.into());
        table
    }
}

fn rank(table: &RecordTable) -> Option<Value> {
    let head: Value = serde_json::from_str(&table.head).ok()?;
    head.get("dataset")?.get("rank").cloned()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn table(dataset: &str) -> RecordTable {
        let read = Records::read(&[*shipped_file(dataset).unwrap()]).unwrap();
        read.tables.into_iter().next().unwrap()
    }

    fn dhf(records: &Records, id: &str) -> Vec<(String, f64)> {
        let found = records.catalog().unwrap().find(id).unwrap();
        found.formations.iter().map(|one| (one.dataset.to_string(), one.dhf.value)).collect()
    }

    #[test]
    fn a_new_edition_takes_the_place_and_the_rank_of_the_old_one_under_whatever_id() {
        let old = table("atct-1.112");
        let new = old.described("atct-1.130", Some(99.into()));
        let laid = Records::shipped().with_new_edition(&old, &new);
        assert_eq!(dhf(&laid, "CO2(g)"), dhf(&Records::shipped(), "CO2(g)"));
    }

    #[test]
    fn a_table_that_is_there_moves_up_to_the_rank_of_the_one_it_replaces() {
        let (old, new) = (table("atct-1.112"), table("codata-1989"));
        let found = dhf(&Records::shipped().with_new_edition(&old, &new), "CO2(g)");
        let names: Vec<&str> = found.iter().map(|(dataset, _)| dataset.as_str()).collect();
        // -393.51 kJ/mol is CODATA's figure for CO2(g) (Cox, Wagman, Medvedev 1989).
        assert_eq!((names, found[0].1), (vec!["codata-1989", "nasa-tp-2002-211556"], -393_510.0));
    }
}
