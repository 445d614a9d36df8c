//! Constants of nature.

/// Permittivity of vacuum [F/m]: CODATA 2022, 8.854 187 8188(14)e-12 F/m.
pub const EPS0: f64 = 8.854_187_818_8e-12;
