//! Whoever runs cells, as the functions inside a running cell reach it.
//!
//! [`HostSlot`] lends a host to the engine for the length of one cell. The surprise: the engine's callbacks must be
//! `'static`, a host is borrowed, and output must flow while the cell runs; hence one small unsafe block, argued below.

use std::cell::Cell;
use std::ptr::NonNull;
use std::rc::Rc;

use crate::render::Bundle;
use crate::script::memory;

/// Whoever runs cells: the kernel, the notebook runner and the tests are three hosts. Called while the cell runs.
pub trait Host {
    /// Text printed by the cell.
    fn write(&mut self, stderr: bool, text: &str);
    /// Something to show in the middle of a cell: a report, a picture. What has an id may be updated later.
    fn show(&mut self, bundle: &Bundle, id: Option<&str>);
    /// The new content of everything that was shown under an id, in this cell or an earlier one.
    fn update(&mut self, bundle: &Bundle, id: &str);
}

/// The host of the cell that is running, if one is.
#[derive(Clone, Default)]
pub struct HostSlot(Rc<Cell<Option<NonNull<dyn Host>>>>);

/// Puts the slot back as it was, also when the work panics.
struct Restore<'a> {
    slot: &'a HostSlot,
    before: Option<NonNull<dyn Host>>,
}

impl Drop for Restore<'_> {
    fn drop(&mut self) {
        self.slot.0.set(self.before);
    }
}

impl HostSlot {
    /// Makes `host` reachable through this slot and its clones while `work` runs.
    pub fn lend<R>(&self, host: &mut dyn Host, work: impl FnOnce() -> R) -> R {
        let pointer: NonNull<dyn Host + '_> = NonNull::from(host);
        // SAFETY: only the lifetime changes. The pointer leaves the slot when this function ends, by return or by
        // panic (`Restore`), and `with` hands out nothing that outlives its own call; so nobody can use the host
        // after the borrow that `lend` holds. The slot is neither Send nor Sync, so all this happens on one thread.
        let pointer: NonNull<dyn Host + 'static> = unsafe { std::mem::transmute(pointer) };
        let _restore = Restore { slot: self, before: self.0.replace(Some(pointer)) };
        work()
    }

    /// Lets `work` use the host. Does nothing when no cell runs, or when the host itself is already being called.
    pub fn with(&self, work: impl FnOnce(&mut dyn Host)) {
        // Taken out for the length of the call: a host that somehow runs script code cannot be borrowed twice.
        let Some(mut pointer) = self.0.take() else { return };
        let _restore = Restore { slot: self, before: Some(pointer) };
        // SAFETY: `lend` is still on the stack (it clears the slot when it ends) and holds the only borrow of the
        // host; no second reference exists because the slot is empty until `_restore` is dropped.
        let host = unsafe { pointer.as_mut() };
        // What a host keeps is often sent to another thread, and freed there.
        memory::uncounted(|| work(host));
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    struct Loud(Vec<String>);

    impl Host for Loud {
        fn write(&mut self, _stderr: bool, text: &str) {
            self.0.push(text.to_owned());
        }

        fn show(&mut self, _bundle: &Bundle, _id: Option<&str>) {}

        fn update(&mut self, _bundle: &Bundle, _id: &str) {}
    }

    #[test]
    fn the_host_is_reachable_during_the_loan_only() {
        let slot = HostSlot::default();
        let inside = slot.clone();
        let mut host = Loud(Vec::new());
        slot.lend(&mut host, || {
            inside.with(|host| host.write(false, "one"));
            inside.with(|_| inside.with(|host| host.write(false, "a second borrow")));
            inside.with(|host| host.write(false, "two"));
        });
        inside.with(|host| host.write(false, "after"));
        assert_eq!(host.0, ["one", "two"]);
    }

    #[test]
    fn a_panic_ends_the_loan() {
        let slot = HostSlot::default();
        let mut host = Loud(Vec::new());
        let caught = std::panic::catch_unwind(std::panic::AssertUnwindSafe(|| {
            slot.lend(&mut host, || panic!("planned by this test"));
        }));
        assert!(caught.is_err());
        assert!(slot.0.get().is_none());
    }
}
