//! Work over independent outputs, one after the other.

/// Calls `work(index, chunk)` for each chunk of `out` of length `len`.
pub fn for_each_chunk<T: Send>(out: &mut [T], len: usize, work: impl Fn(usize, &mut [T]) + Sync + Send) {
    out.chunks_mut(len).enumerate().for_each(|(k, chunk)| work(k, chunk));
}

/// `work(0) … work(n − 1)` in order.
pub fn map<T: Send>(n: usize, work: impl Fn(usize) -> T + Sync + Send) -> Vec<T> {
    (0..n).map(work).collect()
}

/// Threads: one.
pub fn count() -> usize {
    1
}

/// Runs `work` on the calling thread.
pub fn with<T: Send>(_threads: Option<usize>, work: impl FnOnce() -> T + Send) -> T {
    work()
}
