//! Windows, covariances, compression and the two measures of "differs".
//!
//! With X_k (channels × samples) a window about its own mean, C_k = X_k X_kᵀ/(n_k−1), S and R the weighted means over signal and
//! reference windows, P over both, P = V diag(e) Vᵀ and C leading dimensions:
//!
//! * **total**: S w = λ R̃ w in V_C, R̃ = (1−γ)R + γ(tr R/C)I; the weaker end is the same problem with the sides exchanged;
//! * **typical**: D u = δ u, D = mean_S L − mean_R L, L_k = log((1−ρ)C_k + ρI) in the space whitened by P;
//!   w = V_C diag(e_C)^(−1/2) u (difference of log-Euclidean means: Arsigny, Fillard, Pennec & Ayache 2006).
//!
//! # Kinds
//! What the two sides are depends on the question ([`crate::recipe::Contrast`]): event windows, pieces of spans ([`pieces`]), a band and its
//! flanks ([`band`]), sums and differences of samples a lag apart ([`read`]). For what repeats, S is K times the covariance of the average
//! over K trials and R the mean covariance of a trial (de Cheveigné & Simon 2008): a ratio of 1 where nothing repeats, K where all does;
//! a trial has no such ratio of its own, so only *total* is defined there.
//!
//! # Scale, sign and order
//! wᵀRw = 1 with R as it is. The pattern a = P w/(wᵀPw) (Haufe et al. 2014) has its entry of largest magnitude positive.
//! Stronger components come by falling λ or δ, weaker ones by rising ratio.
pub mod band;
pub mod fit;
pub mod linalg;
pub mod pieces;
pub mod read;
pub mod reject;
pub mod space;
pub mod windows;
