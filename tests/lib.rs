//! Helpers shared by the checks: see `all.rs`.
