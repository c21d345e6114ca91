//! Checks that hold for every figure.
