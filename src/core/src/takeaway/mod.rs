//! What the user takes away: weights, results, readings, report, archive.
