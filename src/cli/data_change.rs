//! `hessbook data compare OLD NEW --archive PATH`: what a revised table would move in an archive, before it is adopted.

use std::path::{Path, PathBuf};
use std::process::ExitCode;

use crate::archive::audits::Audits;
use crate::archive::order::{Order, Table, Task};
use crate::archive::paths::found;
use crate::archive::work::Work;
use crate::notebook::audit_text;
use crate::notebook::verdict::{AuditStatus, Verdict};

use super::archive::{Printer, Workers, interrupted};
use super::{Done, out, stopped_by_interrupt};

/// Audits each notebook of an archive on the new table against the old one. The old one stands in the place of the shipped
/// table of its dataset, the new one in the place of the old.
pub(super) fn compare(old: &Path, new: &Path, archive: &[PathBuf], workers: &Workers) -> Done {
    let order = Order::now(Task::Revision { old: Table::at(old)?, new: Table::at(new)? });
    order.prepared()?;
    let stop = stopped_by_interrupt();
    let mut work = Work::new(order, found(archive)?, None, None)?;
    let mut printer = Printer::new(&work, true, &|audit, _| audit_text::data_change(audit))?;
    let whole = work.finish(&workers.pool()?, &stop, &mut printer)?;
    printer.end();
    if !whole {
        return Err(interrupted(&work, None));
    }
    let (mut worst, mut count, mut moving) = (AuditStatus::Same, 0, 0);
    work.state().each(&mut |audit| {
        worst = worst.max(audit.status);
        count += audit.values.len();
        moving += audit.values.iter().filter(|value| value.under_today.verdict != Verdict::Identical).count();
        Ok(())
    })?;
    out(&format!("{moving} of {count} reported values would change\n"));
    Ok(ExitCode::from(worst.exit()))
}
