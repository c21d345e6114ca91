//! Windows, covariances, compression and the two measures of "differs".
