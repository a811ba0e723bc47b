//! What a run stands on: the records that formulas look up, and the constants.
//!
//! [`Holdings`] is what an audit exchanges: those of the seal, today's, and one piece of the one in place of the other's.

use std::collections::{BTreeMap, BTreeSet};
use std::sync::{Arc, OnceLock};

use crate::data::catalog::Catalog;
use crate::data::dataset::TableFault;
use crate::data::records::{Record, RecordTable, Records};
use crate::model::card::References;
use crate::notebook::seal::{Constants, Seal, SealedConstant, SealedFile, SealedRecord, SealedTable};
use crate::quantity::round::shortest;
use crate::units::constants::{self, ConstantSet};

/// Records and constants.
#[derive(Clone, Debug)]
pub struct Holdings {
    pub records: Arc<Records>,
    pub constants: &'static ConstantSet,
    /// Contents that stand in place of files beside the notebook.
    pub files: BTreeMap<String, Arc<[u8]>>,
    catalog: Arc<OnceLock<Arc<Catalog>>>,
}

impl Holdings {
    /// What the program ships.
    pub fn shipped() -> Holdings {
        let catalog = OnceLock::new();
        catalog.get_or_init(Catalog::shipped);
        Holdings {
            records: Records::shipped(),
            constants: constants::current(),
            files: BTreeMap::new(),
            catalog: Arc::new(catalog),
        }
    }

    /// Other records, with today's constants.
    pub fn of(records: Records) -> Holdings {
        Holdings {
            records: Arc::new(records),
            constants: constants::current(),
            files: BTreeMap::new(),
            catalog: Arc::default(),
        }
    }

    /// The same records with other constants.
    #[must_use]
    pub fn with_constants(&self, constants: &'static ConstantSet) -> Holdings {
        Holdings { constants, ..self.clone() }
    }

    /// The same records with these files.
    #[must_use]
    pub fn with_files(&self, files: BTreeMap<String, Arc<[u8]>>) -> Holdings {
        Holdings { files, ..self.clone() }
    }

    /// The catalogue of the records, made at its first use.
    ///
    /// # Errors
    /// A record is not what its schema promises.
    pub fn catalog(&self) -> Result<Arc<Catalog>, TableFault> {
        if let Some(made) = self.catalog.get() {
            return Ok(Arc::clone(made));
        }
        let made = Arc::new(self.records.catalog()?);
        Ok(Arc::clone(self.catalog.get_or_init(|| made)))
    }

    /// For a session.
    ///
    /// # Errors
    /// As [`Holdings::catalog`].
    pub fn references(&self) -> Result<References, TableFault> {
        Ok(References::of(self.catalog()?, self.constants))
    }
}

/// The constants as a seal keeps them.
pub fn sealed_constants(set: &ConstantSet) -> Constants {
    let values = set.all().into_iter().map(|constant| SealedConstant {
        name: constant.name.to_owned(),
        symbol: constant.symbol.to_owned(),
        value: shortest(constant.value),
        u: shortest(constant.u),
        unit: constant.unit.to_owned(),
    });
    Constants { year: set.year.to_string(), values: values.collect() }
}

/// The records as a seal keeps them.
pub fn sealed_tables(records: &Records) -> Vec<SealedTable> {
    let record = |record: &Record| SealedRecord {
        list: record.list.to_string(),
        id: record.id.to_string(),
        sha256: record.sha256.to_string(),
        content: record.content.to_string(),
    };
    let table = |table: &RecordTable| SealedTable {
        path: table.path.to_string(),
        schema: table.schema.to_string(),
        dataset: table.dataset.to_string(),
        head: table.head.to_string(),
        head_sha256: table.head_sha256.to_string(),
        lists: table.lists.iter().map(ToString::to_string).collect(),
        records: table.records.iter().map(record).collect(),
    };
    records.tables.iter().map(table).collect()
}

/// The records of a seal, with the entities they are all that is known of.
pub fn records_of(seal: &Seal) -> (Records, BTreeSet<Arc<str>>) {
    let table = |table: &SealedTable| {
        let head = Record::from_text("", "", &table.head);
        RecordTable {
            path: format!("the seal's {}", table.path).into(),
            schema: table.schema.as_str().into(),
            dataset: table.dataset.as_str().into(),
            head: head.content,
            head_sha256: head.sha256,
            lists: table.lists.iter().map(|list| list.as_str().into()).collect(),
            records: table.records.iter().map(|one| Record::from_text(&one.list, &one.id, &one.content)).collect(),
        }
    };
    let entities = seal.entities.iter().map(|entity| entity.as_str().into()).collect();
    (Records { tables: seal.data.iter().map(table).collect() }, entities)
}

/// The files of a seal whose content it keeps.
pub fn files_of(seal: &Seal) -> BTreeMap<String, Arc<[u8]>> {
    let kept = |file: &SealedFile| Some((file.name.clone(), file.content.as_ref()?.as_bytes().into()));
    seal.files.iter().filter_map(kept).collect()
}

/// Records of a seal whose digest is not that of their content, by name.
pub fn altered_records(seal: &Seal) -> Vec<String> {
    let (records, _) = records_of(seal);
    let now = records.all();
    let mut sealed: BTreeMap<String, &str> = BTreeMap::new();
    for table in &seal.data {
        let name = |list: &str, id: &str| format!("{}|{}|{list}|{id}", table.schema, table.dataset);
        sealed.insert(name("", ""), &table.head_sha256);
        for record in &table.records {
            sealed.insert(name(&record.list, &record.id), &record.sha256);
        }
    }
    let name =
        |key: &crate::data::records::RecordKey| format!("{}|{}|{}|{}", key.schema, key.dataset, key.list, key.id);
    let differs = now.iter().filter(|(key, record)| sealed.get(&name(key)).is_some_and(|sha| **sha != *record.sha256));
    differs.map(|(key, _)| key.to_string()).collect()
}

/// The constants of a seal; those that are not numbers are as the program has them.
pub fn constants_of(sealed: &Constants) -> &'static ConstantSet {
    let year = sealed.year.parse().unwrap_or(constants::CURRENT);
    let base = constants::set(year).unwrap_or_else(|| constants::current().of_year(year));
    let number = |text: &str| text.parse().ok().filter(|number: &f64| number.is_finite());
    let figures: Vec<(&str, f64, f64)> =
        sealed.values.iter().filter_map(|c| Some((c.name.as_str(), number(&c.value)?, number(&c.u)?))).collect();
    base.with(&figures)
}
