//! The order in which requests arrived, and which of them may still run.
//!
//! [`Arrivals`] numbers the requests of the shell channel. An interrupt or a failed cell cancels those that arrived
//! before it *by number*: clearing a flag at the start of each cell would let an interrupt hit a cell that came
//! after it, or miss one that was waiting.

use std::sync::Arc;
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};

/// Shared by the thread of the sockets, which counts and interrupts, and the worker, which asks before each cell.
#[derive(Default)]
pub struct Arrivals {
    next: AtomicU64,
    cancelled_before: AtomicU64,
    stop: Arc<AtomicBool>,
}

impl Arrivals {
    /// The flag that ends a running cell; the session reads it.
    pub fn stop_flag(&self) -> Arc<AtomicBool> {
        Arc::clone(&self.stop)
    }

    /// Gives a request that just arrived its number.
    pub fn number(&self) -> u64 {
        self.next.fetch_add(1, Ordering::SeqCst)
    }

    /// How many requests have arrived.
    pub fn count(&self) -> u64 {
        self.next.load(Ordering::SeqCst)
    }

    /// Cancels the cells that arrived so far; the one that is running goes on.
    pub fn cancel_waiting(&self) {
        self.cancelled_before.fetch_max(self.count(), Ordering::SeqCst);
    }

    /// Stops the running cell and cancels those that arrived so far. Idle, it changes nothing for later cells.
    pub fn interrupt(&self) {
        self.cancel_waiting();
        self.stop.store(true, Ordering::SeqCst);
    }

    /// Stops the running cell and cancels all others, those to come as well.
    pub fn close(&self) {
        self.cancelled_before.store(u64::MAX, Ordering::SeqCst);
        self.stop.store(true, Ordering::SeqCst);
    }

    /// Whether the cell with this number may run; clears the stop flag for it.
    ///
    /// The flag is cleared first and the number looked at second, while [`Arrivals::interrupt`] cancels first and
    /// sets the flag second: whichever way the two threads meet, the cell is either cancelled or finds the flag set.
    pub fn admit(&self, number: u64) -> bool {
        self.stop.store(false, Ordering::SeqCst);
        number >= self.cancelled_before.load(Ordering::SeqCst)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn an_interrupt_stops_what_came_before_it_and_nothing_after() {
        let arrivals = Arrivals::default();
        let stop = arrivals.stop_flag();
        let (running, waiting) = (arrivals.number(), arrivals.number());
        assert!(arrivals.admit(running));
        arrivals.interrupt();
        assert!(stop.load(Ordering::SeqCst));
        let later = arrivals.number();
        assert!(!arrivals.admit(waiting));
        assert!(arrivals.admit(later));
        assert!(!stop.load(Ordering::SeqCst));
    }

    #[test]
    fn a_failed_cell_cancels_the_waiting_ones_without_stopping_a_later_one() {
        let arrivals = Arrivals::default();
        let (_failed, waiting) = (arrivals.number(), arrivals.number());
        arrivals.cancel_waiting();
        assert!(!arrivals.admit(waiting));
        assert!(arrivals.admit(arrivals.number()));
    }

    #[test]
    fn a_closed_kernel_admits_nothing() {
        let arrivals = Arrivals::default();
        arrivals.close();
        assert!(!arrivals.admit(arrivals.number()));
        arrivals.interrupt();
        assert!(!arrivals.admit(arrivals.number()));
    }
}
