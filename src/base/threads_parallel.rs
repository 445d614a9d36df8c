//! Work over independent outputs, on all threads of the current pool.
//!
//! Never over the terms of a sum, so that any number of threads gives the same bits.

use rayon::prelude::*;

/// Calls `work(index, chunk)` for each chunk of `out` of length `len`.
pub fn for_each_chunk<T: Send>(out: &mut [T], len: usize, work: impl Fn(usize, &mut [T]) + Sync + Send) {
    out.par_chunks_mut(len).enumerate().for_each(|(k, chunk)| work(k, chunk));
}

/// `work(0) … work(n − 1)` in order.
pub fn map<T: Send>(n: usize, work: impl Fn(usize) -> T + Sync + Send) -> Vec<T> {
    (0..n).into_par_iter().map(work).collect()
}

/// Threads of the current pool.
pub fn count() -> usize {
    rayon::current_num_threads()
}

/// Runs `work` with `threads` threads, or with all.
pub fn with<T: Send>(threads: Option<usize>, work: impl FnOnce() -> T + Send) -> T {
    let Some(threads) = threads else { return work() };
    match rayon::ThreadPoolBuilder::new().num_threads(threads).build() {
        Ok(pool) => pool.install(work),
        // Without a pool of its own the work runs on the common one: the digits are the same.
        Err(_) => work(),
    }
}
