//! How much memory a thread holds, counted by the program's allocator.
//!
//! A cell that doubles a list for ever must end as a fault of that cell; left alone, the failed allocation ends the
//! process. rhai's own size limits make every `push` walk the array, so the engine asks [`held`] between steps
//! instead. The count is per thread: sessions beside each other, and output on its way to a client, do not add up.

use std::alloc::{GlobalAlloc, Layout, System};
use std::cell::Cell;

/// The system's allocator with a count per thread.
struct Counting;

#[global_allocator]
static ALLOCATOR: Counting = Counting;

thread_local! {
    // Built at compile time and without a destructor, so that the allocator may use it at any moment of a thread's life.
    static HELD: Cell<isize> = const { Cell::new(0) };
}

fn add(bytes: isize) {
    HELD.with(|held| held.set(held.get().wrapping_add(bytes)));
}

// A layout's size never exceeds isize::MAX (a promise of `Layout`), so the casts below keep the value.
#[allow(clippy::cast_possible_wrap)]
const fn signed(size: usize) -> isize {
    size as isize
}

// SAFETY: every call goes to the system's allocator unchanged; beside it only a counter of this thread moves, which
// neither allocates nor unwinds.
unsafe impl GlobalAlloc for Counting {
    unsafe fn alloc(&self, layout: Layout) -> *mut u8 {
        let pointer = unsafe { System.alloc(layout) };
        if !pointer.is_null() {
            add(signed(layout.size()));
        }
        pointer
    }

    unsafe fn alloc_zeroed(&self, layout: Layout) -> *mut u8 {
        let pointer = unsafe { System.alloc_zeroed(layout) };
        if !pointer.is_null() {
            add(signed(layout.size()));
        }
        pointer
    }

    unsafe fn dealloc(&self, pointer: *mut u8, layout: Layout) {
        unsafe { System.dealloc(pointer, layout) };
        add(-signed(layout.size()));
    }

    unsafe fn realloc(&self, pointer: *mut u8, layout: Layout, size: usize) -> *mut u8 {
        let moved = unsafe { System.realloc(pointer, layout, size) };
        if !moved.is_null() {
            add(signed(size) - signed(layout.size()));
        }
        moved
    }
}

/// Bytes that this thread has taken and not given back. Only differences mean something: what one thread takes and
/// another gives back leaves the first one's count high.
pub fn held() -> isize {
    HELD.with(Cell::get)
}

/// Runs `work` without counting: for what is handed to another thread, which will give it back there.
pub fn uncounted<R>(work: impl FnOnce() -> R) -> R {
    let before = held();
    let result = work();
    HELD.with(|held| held.set(before));
    result
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_count_rises_and_falls_with_what_is_held() {
        let before = held();
        let mut bytes: Vec<u8> = Vec::with_capacity(1 << 20);
        assert_eq!(held() - before, 1 << 20);
        bytes.reserve_exact(1 << 21);
        assert_eq!(held() - before, 1 << 21);
        drop(bytes);
        assert_eq!(held(), before);
    }

    #[test]
    fn what_another_thread_takes_is_not_counted_here() {
        let before = held();
        std::thread::scope(|threads| {
            let other = threads.spawn(|| {
                let start = held();
                let bytes = vec![0_u8; 1 << 22];
                (held() - start, bytes.len())
            });
            assert_eq!(other.join().unwrap(), (1 << 22, 1 << 22));
        });
        // Starting a thread takes a few small things of our own, nothing near the megabytes over there.
        assert!(held() - before < 1 << 16);
    }

    #[test]
    fn uncounted_work_leaves_the_count_alone() {
        let before = held();
        let kept = uncounted(|| vec![0_u8; 1 << 20]);
        assert_eq!(held(), before);
        uncounted(|| drop(kept));
        assert_eq!(held(), before);
    }
}
