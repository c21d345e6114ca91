//! Filters, resampling, channel matrix: against SciPy and by hand.
