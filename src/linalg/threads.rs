//! How many threads the dense kernels may use. The results are the same bits for every number.

use std::sync::atomic::{AtomicUsize, Ordering};

static WANTED: AtomicUsize = AtomicUsize::new(0);

/// Sets the number of threads the dense kernels may use; 0 leaves the choice to the machine's number of cores.
pub fn set(count: usize) {
    WANTED.store(count, Ordering::Relaxed);
}

/// Returns the number of threads the dense kernels may use, at least 1.
pub fn count() -> usize {
    match WANTED.load(Ordering::Relaxed) {
        0 => std::thread::available_parallelism().map_or(1, |cores| cores.get()),
        wanted => wanted,
    }
}
