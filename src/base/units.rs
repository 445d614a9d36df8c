//! Unit names to SI factors.
