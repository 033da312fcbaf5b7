//! Fields on the nodes: several right-hand sides side by side, and sums that do not depend on the threads.
//!
//! All right-hand sides of a node lie next to each other, so that the matrix is read once for all of them. Sums are
//! made over chunks of fixed length and added in order: one, two and four threads give the same bits.

use rayon::prelude::*;

/// K values a node, nodes in the order of the grid.
pub type Field<const K: usize> = Vec<[f64; K]>;

/// Nodes in a chunk of parallel work.
pub const CHUNK: usize = 4096;

/// Adds per-chunk sums in order.
pub fn in_order<const K: usize>(parts: Vec<[f64; K]>) -> [f64; K] {
    parts.into_iter().fold([0.0; K], |sum, part| std::array::from_fn(|r| sum[r] + part[r]))
}

/// Scalar products of the columns of two fields.
pub fn dots<const K: usize>(a: &[[f64; K]], b: &[[f64; K]]) -> [f64; K] {
    let part = |(a, b): (&[[f64; K]], &[[f64; K]])| {
        let mut sum = [0.0; K];
        for (a, b) in a.iter().zip(b) {
            for r in 0..K {
                sum[r] += a[r] * b[r];
            }
        }
        sum
    };
    in_order(a.par_chunks(CHUNK).zip(b.par_chunks(CHUNK)).map(part).collect())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn sums_do_not_depend_on_the_threads() {
        let a: Field<2> = (0..50_000).map(|n| [(n as f64).sin(), 1.0 / (1.0 + n as f64)]).collect();
        let sums: Vec<[f64; 2]> = [1, 2, 4]
            .map(|threads| {
                let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
                pool.install(|| dots(&a, &a))
            })
            .to_vec();
        assert_eq!(sums[0], sums[1]);
        assert_eq!(sums[0], sums[2]);
    }
}
