//! What the machine tells of its memory.

use std::fs;

/// Memory that is free or can be freed at once [B]; none where the system does not tell.
pub fn free_memory() -> Option<f64> {
    kilobytes("/proc/meminfo", "MemAvailable:").map(|kb| kb * 1024.0)
}

/// Highest resident memory of this process so far [B]; none where the system does not tell.
pub fn peak_memory() -> Option<f64> {
    kilobytes("/proc/self/status", "VmHWM:").map(|kb| kb * 1024.0)
}

fn kilobytes(path: &str, key: &str) -> Option<f64> {
    let text = fs::read_to_string(path).ok()?;
    let line = text.lines().find(|line| line.starts_with(key))?;
    line.split_whitespace().nth(1)?.parse().ok()
}
