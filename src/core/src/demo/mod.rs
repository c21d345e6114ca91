//! The invented demo recordings.
