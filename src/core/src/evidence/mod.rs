//! Held-out ratios, permutation, bootstrap, ratio against C.
