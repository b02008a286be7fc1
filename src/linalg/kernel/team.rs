//! Work shared out among threads.

use crate::linalg::factor::Failure;

/// Cuts so many items into parts for at most so many threads, each of at least `least` items; returns the items of a
/// part.
pub(super) fn part_size(items: usize, threads: usize, least: usize) -> usize {
    items.div_ceil(threads.min(items / least).max(1)).max(1)
}

/// Works on all parts, the last one in this thread and each other one in its own.
///
/// *Errors*: the first failure in the order of the parts.
pub(super) fn share_out<P: Send>(
    mut parts: Vec<P>,
    work: impl Fn(P) -> Result<(), Failure> + Sync,
) -> Result<(), Failure> {
    let Some(own) = parts.pop() else { return Ok(()) };
    if parts.is_empty() {
        return work(own);
    }
    let work = &work;
    std::thread::scope(|scope| {
        let helpers: Vec<_> = parts.into_iter().map(|part| scope.spawn(move || work(part))).collect();
        let last = work(own);
        for helper in helpers {
            match helper.join() {
                Ok(result) => result?,
                Err(panic) => std::panic::resume_unwind(panic),
            }
        }
        last
    })
}
