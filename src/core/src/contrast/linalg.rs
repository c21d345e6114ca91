//! Small dense symmetric algebra: Gram products, eigenproblems, the matrix logarithm.
//!
//! # Packing
//! A symmetric `n × n` matrix is kept as its lower triangle row by row: entry (i, j ≤ i) stands at i(i+1)/2 + j. The leading
//! `c × c` block of a packed matrix is its first c(c+1)/2 entries, so a smaller C costs nothing to cut out.
use nalgebra::{DMatrix, DVector};

/// A symmetric matrix as its packed lower triangle.
pub type Packed = Vec<f64>;

/// Entries of a packed `n × n` matrix.
pub const fn packed_len(n: usize) -> usize {
    n * (n + 1) / 2
}

/// Packs the lower triangle.
pub fn pack(full: &DMatrix<f64>) -> Packed {
    let n = full.nrows();
    let mut out = Vec::with_capacity(packed_len(n));
    for i in 0..n {
        for j in 0..=i {
            out.push(full[(i, j)]);
        }
    }
    out
}

/// The leading `n × n` block as a full matrix.
pub fn unpack(packed: &[f64], n: usize) -> DMatrix<f64> {
    let mut full = DMatrix::zeros(n, n);
    let mut k = 0;
    for i in 0..n {
        for j in 0..=i {
            full[(i, j)] = packed[k];
            full[(j, i)] = packed[k];
            k += 1;
        }
    }
    full
}

/// `into += weight · from`, over the shorter of the two (so over a leading block).
pub fn add_scaled(into: &mut [f64], from: &[f64], weight: f64) {
    for (a, b) in into.iter_mut().zip(from) {
        *a += weight * b;
    }
}

/// uᵀ A u for the leading block of the size of `u`.
pub fn quadratic(packed: &[f64], u: &[f64]) -> f64 {
    let mut sum = 0.0;
    let mut k = 0;
    for (i, ui) in u.iter().enumerate() {
        let row = &packed[k..k + i + 1];
        let mut inner = 0.0;
        for (a, uj) in row[..i].iter().zip(u) {
            inner += a * uj;
        }
        sum += ui * (2.0 * inner + row[i] * ui);
        k += i + 1;
    }
    sum
}

/// Width of the register tile of [`gram`].
const TILE: usize = 4;

/// Σₜ x(t) x(t)ᵀ, packed, for `panel` = samples × `stride` (sample-major; `stride` a multiple of 4, rows beyond `n` zero).
///
/// 2·n²·samples/2 floating-point operations over 4×4 register tiles.
pub fn gram(panel: &[f64], n: usize, stride: usize) -> Packed {
    debug_assert_eq!(stride % TILE, 0);
    let mut out = vec![0.0; packed_len(n)];
    for i0 in (0..n).step_by(TILE) {
        for j0 in (0..=i0).step_by(TILE) {
            let tile = tile_product(panel, stride, i0, j0);
            for (a, row) in tile.iter().enumerate() {
                let i = i0 + a;
                if i >= n {
                    break;
                }
                for (b, value) in row.iter().enumerate() {
                    let j = j0 + b;
                    if j <= i {
                        out[packed_len(i) + j] = *value;
                    }
                }
            }
        }
    }
    out
}

#[inline]
fn tile_product(panel: &[f64], stride: usize, i0: usize, j0: usize) -> [[f64; TILE]; TILE] {
    let mut acc = [[0.0; TILE]; TILE];
    for row in panel.chunks_exact(stride) {
        let (a, b) = (&row[i0..i0 + TILE], &row[j0..j0 + TILE]);
        for i in 0..TILE {
            for j in 0..TILE {
                acc[i][j] += a[i] * b[j];
            }
        }
    }
    acc
}

/// Eigenvalues, descending, and their eigenvectors as columns: A = V diag(e) Vᵀ.
pub fn eigh(matrix: &DMatrix<f64>) -> (Vec<f64>, DMatrix<f64>) {
    let n = matrix.nrows();
    let mut vectors = matrix.clone();
    let (mut diagonal, mut off) = (vec![0.0; n], vec![0.0; n]);
    tridiagonalise(&mut vectors, &mut diagonal, &mut off, true);
    implicit_ql(&mut diagonal, &mut off, Some(&mut vectors));
    let mut order: Vec<usize> = (0..n).collect();
    order.sort_by(|a, b| diagonal[*b].total_cmp(&diagonal[*a]));
    let values = order.iter().map(|i| diagonal[*i]).collect();
    let sorted = DMatrix::from_fn(n, n, |r, c| vectors[(r, order[c])]);
    (values, sorted)
}

/// Eigenvalues alone, descending.
pub fn eigenvalues(matrix: &DMatrix<f64>) -> Vec<f64> {
    let n = matrix.nrows();
    let mut work = matrix.clone();
    let (mut diagonal, mut off) = (vec![0.0; n], vec![0.0; n]);
    tridiagonalise(&mut work, &mut diagonal, &mut off, false);
    implicit_ql(&mut diagonal, &mut off, None);
    diagonal.sort_by(|a, b| b.total_cmp(a));
    diagonal
}

/// Householder reduction to tridiagonal form (Golub & Van Loan, *Matrix Computations*, alg. 8.3.1), from the first column on.
/// All inner loops run down contiguous columns. On return `a` holds the accumulated orthogonal matrix when `accumulate`.
fn tridiagonalise(a: &mut DMatrix<f64>, diagonal: &mut [f64], off: &mut [f64], accumulate: bool) {
    let n = a.nrows();
    let data = a.as_mut_slice();
    let mut betas = vec![0.0; n];
    let (mut p, mut v) = (vec![0.0; n], vec![0.0; n]);
    for k in 0..n.saturating_sub(1) {
        // Reflector that maps column k below the diagonal onto its first entry.
        let column = &mut data[k * n..(k + 1) * n];
        diagonal[k] = column[k];
        let scale = column[k + 1..].iter().fold(0.0f64, |m, x| m.max(x.abs()));
        let norm = if scale == 0.0 {
            0.0
        } else {
            scale
                * column[k + 1..]
                    .iter()
                    .map(|x| (x / scale) * (x / scale))
                    .sum::<f64>()
                    .sqrt()
        };
        let tail: f64 = column[k + 2..].iter().fold(0.0f64, |m, x| m.max(x.abs()));
        if norm == 0.0 || tail == 0.0 {
            off[k] = column[k + 1];
            betas[k] = 0.0;
            continue;
        }
        let alpha = if column[k + 1] > 0.0 { -norm } else { norm };
        off[k] = alpha;
        let head = column[k + 1] - alpha;
        for x in &mut column[k + 2..] {
            *x /= head;
        }
        column[k + 1] = 1.0;
        let beta = -head / alpha;
        betas[k] = beta;
        let m = k + 1;
        v[m..].copy_from_slice(&column[m..]);
        // p = β A v over the trailing block, of which only the lower triangle is kept up to date.
        p[m..].fill(0.0);
        for j in m..n {
            let vj = v[j];
            let lower = &data[j * n + j..(j + 1) * n];
            let below = &lower[1..];
            let across = add_and_dot(&mut p[j + 1..], below, vj, &v[j + 1..]);
            p[j] += lower[0] * vj + across;
        }
        for x in &mut p[m..] {
            *x *= beta;
        }
        let half = 0.5 * beta * dot(&p[m..], &v[m..]);
        for (pi, vi) in p[m..].iter_mut().zip(&v[m..]) {
            *pi -= half * vi;
        }
        for j in m..n {
            let (vj, pj) = (v[j], p[j]);
            let lower = &mut data[j * n + j..(j + 1) * n];
            for ((x, vi), pi) in lower.iter_mut().zip(&v[j..]).zip(&p[j..]) {
                *x -= vi * pj + pi * vj;
            }
        }
    }
    if n > 0 {
        diagonal[n - 1] = data[n * n - 1];
        off[n - 1] = 0.0;
    }
    if accumulate {
        accumulate_reflectors(data, n, &betas);
    }
}

/// Q = H₀ H₁ … formed backwards in place, where column k below the diagonal holds the k-th reflector.
fn accumulate_reflectors(data: &mut [f64], n: usize, betas: &[f64]) {
    let mut v = vec![0.0; n];
    for k in (0..n).rev() {
        let m = k + 1;
        let beta = betas[k];
        if m < n {
            v[m..].copy_from_slice(&data[k * n + m..(k + 1) * n]);
        }
        if beta != 0.0 {
            for j in m..n {
                let column = &mut data[j * n + m..(j + 1) * n];
                let s = beta * dot(column, &v[m..]);
                for (x, vi) in column.iter_mut().zip(&v[m..]) {
                    *x -= s * vi;
                }
            }
        }
        // Column k becomes that of the identity: the reflectors before k do not touch rows ≤ k yet.
        data[k * n..(k + 1) * n].fill(0.0);
        data[k * n + k] = 1.0;
        for j in m..n {
            data[j * n + k] = 0.0;
        }
    }
}

/// `into += x · scale` and x·y in one pass over x.
fn add_and_dot(into: &mut [f64], x: &[f64], scale: f64, y: &[f64]) -> f64 {
    let n = x.len();
    let (into, y) = (&mut into[..n], &y[..n]);
    let mut partial = [0.0; 4];
    let whole = n - n % 4;
    for at in (0..whole).step_by(4) {
        for i in 0..4 {
            into[at + i] += x[at + i] * scale;
            partial[i] += x[at + i] * y[at + i];
        }
    }
    let mut rest = 0.0;
    for i in whole..n {
        into[i] += x[i] * scale;
        rest += x[i] * y[i];
    }
    (partial[0] + partial[2]) + (partial[1] + partial[3]) + rest
}

/// A dot product with four partial sums, so that it can use vector registers; always in the same order.
fn dot(a: &[f64], b: &[f64]) -> f64 {
    let mut partial = [0.0; 4];
    let (ca, cb) = (a.chunks_exact(4), b[..a.len()].chunks_exact(4));
    let rest: f64 = ca
        .remainder()
        .iter()
        .zip(cb.remainder())
        .map(|(x, y)| x * y)
        .sum();
    for (x, y) in ca.zip(cb) {
        for i in 0..4 {
            partial[i] += x[i] * y[i];
        }
    }
    (partial[0] + partial[2]) + (partial[1] + partial[3]) + rest
}

/// Implicit QL with Wilkinson's shift on a tridiagonal matrix (Bowdler, Martin, Reinsch & Wilkinson 1968, procedure tql2).
/// Rotations act on neighbouring columns of `vectors`, which are contiguous.
fn implicit_ql(d: &mut [f64], e: &mut [f64], mut vectors: Option<&mut DMatrix<f64>>) {
    const MOST_SWEEPS: usize = 60;
    let n = d.len();
    let mut rotations: Vec<(f64, f64)> = Vec::with_capacity(n);
    for l in 0..n {
        for _ in 0..MOST_SWEEPS {
            let m = (l..n - 1)
                .find(|&m| e[m].abs() <= f64::EPSILON * (d[m].abs() + d[m + 1].abs()))
                .unwrap_or(n - 1);
            if m == l {
                break;
            }
            let mut g = (d[l + 1] - d[l]) / (2.0 * e[l]);
            let mut r = g.hypot(1.0);
            g = d[m] - d[l] + e[l] / (g + r.copysign(g));
            let (mut s, mut c, mut p) = (1.0, 1.0, 0.0);
            rotations.clear();
            let mut i = m;
            let mut underflow = false;
            while i > l {
                i -= 1;
                let f = s * e[i];
                let b = c * e[i];
                r = f.hypot(g);
                e[i + 1] = r;
                if r == 0.0 {
                    d[i + 1] -= p;
                    e[m] = 0.0;
                    underflow = true;
                    break;
                }
                s = f / r;
                c = g / r;
                g = d[i + 1] - p;
                r = (d[i] - g) * s + 2.0 * c * b;
                p = s * r;
                d[i + 1] = g + p;
                g = c * r - b;
                rotations.push((s, c));
            }
            if let Some(v) = vectors.as_deref_mut() {
                rotate_columns(v, m, &rotations);
            }
            if underflow {
                continue;
            }
            d[l] -= p;
            e[l] = g;
            e[m] = 0.0;
        }
    }
}

/// Applies the k-th rotation to columns `m − 1 − k` and `m − k`.
///
/// Four rotations go over their five columns at once: the column between two rotations stays in a register, which halves the
/// memory traffic that bounds this loop.
fn rotate_columns(v: &mut DMatrix<f64>, m: usize, rotations: &[(f64, f64)]) {
    let n = v.nrows();
    let data = v.as_mut_slice();
    let mut right = m;
    let mut groups = rotations.chunks_exact(4);
    for group in &mut groups {
        let (e, rest) = data[(right - 4) * n..(right + 1) * n].split_at_mut(n);
        let (d, rest) = rest.split_at_mut(n);
        let (c, rest) = rest.split_at_mut(n);
        let (b, a) = rest.split_at_mut(n);
        rotate_five([a, b, c, d, e], [group[0], group[1], group[2], group[3]]);
        right -= 4;
    }
    for &(s, c) in groups.remainder() {
        let (left, last) = data[(right - 1) * n..(right + 1) * n].split_at_mut(n);
        for (x, y) in left.iter_mut().zip(last.iter_mut()) {
            let f = *y;
            *y = s * *x + c * f;
            *x = c * *x - s * f;
        }
        right -= 1;
    }
}

/// Rotates columns a–b, b–c, c–d, d–e in this order.
#[inline(never)]
fn rotate_five([a, b, c, d, e]: [&mut [f64]; 5], rotations: [(f64, f64); 4]) {
    let [(s0, c0), (s1, c1), (s2, c2), (s3, c3)] = rotations;
    let n = a.len();
    let (b, c, d, e) = (&mut b[..n], &mut c[..n], &mut d[..n], &mut e[..n]);
    for i in 0..n {
        let (x, y) = (a[i], b[i]);
        a[i] = s0 * y + c0 * x;
        let x = c0 * y - s0 * x;
        let y = c[i];
        b[i] = s1 * y + c1 * x;
        let x = c1 * y - s1 * x;
        let y = d[i];
        c[i] = s2 * y + c2 * x;
        let x = c2 * y - s2 * x;
        let y = e[i];
        d[i] = s3 * y + c3 * x;
        e[i] = c3 * y - s3 * x;
    }
}

/// log((1−ρ)A + ρI) of the leading `n × n` block, packed; A positive semidefinite.
///
/// Eigenvalues of the argument are at least ρ; where ρ = 0 they are floored at 1e-12 so that a rank-deficient window has a logarithm.
pub fn log_shrunk(packed: &[f64], n: usize, rho: f64) -> Packed {
    let mut a = unpack(packed, n);
    a *= 1.0 - rho;
    for i in 0..n {
        a[(i, i)] += rho;
    }
    let (mut diagonal, mut off) = (vec![0.0; n], vec![0.0; n]);
    tridiagonalise(&mut a, &mut diagonal, &mut off, true);
    implicit_ql(&mut diagonal, &mut off, Some(&mut a));
    // Row-major panel of U scaled by the root of |log| and its sign kept apart: Σ_k log(l_k) u_k u_kᵀ.
    let stride = n.next_multiple_of(TILE);
    let mut positive = Vec::new();
    let mut negative = Vec::new();
    for (k, value) in diagonal.iter().enumerate() {
        let log = value.max(1e-12).ln();
        let root = log.abs().sqrt();
        let panel = if log >= 0.0 {
            &mut positive
        } else {
            &mut negative
        };
        let start = panel.len();
        panel.resize(start + stride, 0.0);
        for (x, u) in panel[start..start + n].iter_mut().zip(a.column(k).iter()) {
            *x = root * u;
        }
    }
    let mut out = gram(&positive, n, stride);
    add_scaled(&mut out, &gram(&negative, n, stride), -1.0);
    out
}

/// S w = λ B w by Cholesky of B = L Lᵀ: descending λ and vectors with wᵀBw = 1 as columns. `None` where B is not positive definite.
pub fn generalised_eigh(s: &DMatrix<f64>, b: &DMatrix<f64>) -> Option<(Vec<f64>, DMatrix<f64>)> {
    let l = b.clone().cholesky()?.unpack();
    let half = l.solve_lower_triangular(s)?;
    let mut reduced = l.solve_lower_triangular(&half.transpose())?;
    symmetrise(&mut reduced);
    let (values, vectors) = eigh(&reduced);
    let w = l.tr_solve_lower_triangular(&vectors)?;
    Some((values, w))
}

fn symmetrise(a: &mut DMatrix<f64>) {
    for i in 0..a.nrows() {
        for j in 0..i {
            let mean = 0.5 * (a[(i, j)] + a[(j, i)]);
            a[(i, j)] = mean;
            a[(j, i)] = mean;
        }
    }
}

/// |cosine| of the angle between two vectors, 0 where one is zero.
pub fn abs_cosine(a: &[f64], b: &[f64]) -> f64 {
    let norms = dot(a, a).sqrt() * dot(b, b).sqrt();
    if norms > 0.0 {
        (dot(a, b) / norms).abs()
    } else {
        0.0
    }
}

/// The vector as nalgebra's.
pub fn column(v: &[f64]) -> DVector<f64> {
    DVector::from_column_slice(v)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn lcg(seed: u64) -> impl FnMut() -> f64 {
        let mut state = seed;
        move || {
            state = state
                .wrapping_mul(6364136223846793005)
                .wrapping_add(1442695040888963407);
            (state >> 11) as f64 * 2f64.powi(-53) - 0.5
        }
    }

    fn symmetric(n: usize, seed: u64) -> DMatrix<f64> {
        let mut next = lcg(seed);
        let a = DMatrix::from_fn(n, n, |_, _| next());
        &a + a.transpose()
    }

    #[test]
    fn two_by_two_by_hand() {
        // [[2, 1], [1, 2]] has eigenvalues 3 and 1.
        let (values, vectors) = eigh(&DMatrix::from_row_slice(2, 2, &[2.0, 1.0, 1.0, 2.0]));
        assert!((values[0] - 3.0).abs() < 1e-15 && (values[1] - 1.0).abs() < 1e-15);
        assert!((vectors[(0, 0)].abs() - 0.5f64.sqrt()).abs() < 1e-15);
    }

    #[test]
    fn eigh_equals_nalgebra_and_rebuilds_the_matrix_at_every_size() {
        for n in 1..=40 {
            let a = symmetric(n, n as u64);
            let (values, v) = eigh(&a);
            let rebuilt = &v * DMatrix::from_diagonal(&column(&values)) * v.transpose();
            let tolerance = 20.0 * f64::EPSILON * (n as f64).sqrt() * a.norm().max(1.0);
            assert!((rebuilt - &a).amax() < tolerance, "n = {n}");
            assert!(
                (v.transpose() * &v - DMatrix::identity(n, n)).amax()
                    < 40.0 * f64::EPSILON * (n as f64).sqrt(),
                "n = {n}"
            );
            let mut other: Vec<f64> = a.clone().symmetric_eigenvalues().iter().copied().collect();
            other.sort_by(|x, y| y.total_cmp(x));
            let alone = eigenvalues(&a);
            for i in 0..n {
                assert!(
                    (values[i] - other[i]).abs() < tolerance
                        && (alone[i] - other[i]).abs() < tolerance,
                    "n = {n}, i = {i}"
                );
            }
        }
    }

    #[test]
    fn eigh_of_special_matrices() {
        for a in [
            DMatrix::zeros(5, 5),
            DMatrix::identity(5, 5),
            DMatrix::from_element(5, 5, 1.0),
            DMatrix::from_diagonal(&column(&[1e-300, 1.0, 1e300, 0.0, -1.0])),
        ] {
            let (values, v) = eigh(&a);
            let rebuilt = &v * DMatrix::from_diagonal(&column(&values)) * v.transpose();
            assert!((rebuilt - &a).amax() <= 1e-14 * a.amax());
        }
    }

    #[test]
    fn gram_equals_the_naive_product() {
        for (n, samples) in [(1usize, 3), (4, 7), (5, 9), (13, 31)] {
            let stride = n.next_multiple_of(TILE);
            let mut next = lcg(7);
            let mut panel = vec![0.0; stride * samples];
            for row in panel.chunks_exact_mut(stride) {
                row[..n].iter_mut().for_each(|x| *x = next());
            }
            let packed = gram(&panel, n, stride);
            for i in 0..n {
                for j in 0..=i {
                    let naive: f64 = panel.chunks_exact(stride).map(|r| r[i] * r[j]).sum();
                    assert!((packed[packed_len(i) + j] - naive).abs() < 1e-14);
                }
            }
        }
    }

    #[test]
    fn log_of_a_diagonal_and_quadratic_form() {
        let a = pack(&DMatrix::from_diagonal(&column(&[4.0, 0.5, 1.0])));
        let l = unpack(&log_shrunk(&a, 3, 0.1), 3);
        for (i, x) in [4.0f64, 0.5, 1.0].iter().enumerate() {
            assert!((l[(i, i)] - (0.9 * x + 0.1).ln()).abs() < 1e-14);
        }
        let full = symmetric(6, 3);
        let u = [0.3, -1.0, 2.0, 0.1, 0.0, 1.5];
        let direct = (column(&u).transpose() * &full * column(&u))[(0, 0)];
        assert!((quadratic(&pack(&full), &u) - direct).abs() < 1e-13);
    }
}
