//! The holes of a face: the slot between a plate and its guard ring.
//!
//! For the preconditioner of the inner iteration a face has to be whole. Its potential is taken to go on across the slot,
//! linearly in the number of the node from one side to the other; left at zero there, it would have a step at every edge
//! of the slot, which costs several times the iterations.

use ndarray::Array2;

/// A node without metal, and the two nodes with metal that its potential is made of.
struct Hole {
    at: [usize; 2],
    sources: [([usize; 2], f64); 2],
}

/// All holes of a face.
pub struct Holes(Vec<Hole>);

impl Holes {
    /// The holes of a face with metal where `face` is not zero; every hole has metal on both sides along x or along y, or
    /// on one side and a symmetry plane on the other.
    pub fn new(face: &Array2<f64>) -> Holes {
        let (ni, nj) = face.dim();
        let mut holes = Vec::new();
        for ((i, j), _) in face.indexed_iter().filter(|(_, metal)| **metal == 0.0) {
            // The metal nearest in each direction: number of steps, node.
            let look = |d: usize, forward: bool| {
                let (mut at, last) = ([i, j], [ni - 1, nj - 1][d]);
                let mut steps = 0;
                while face[at] == 0.0 && if forward { at[d] < last } else { at[d] > 0 } {
                    at[d] = if forward { at[d] + 1 } else { at[d] - 1 };
                    steps += 1;
                }
                (face[at] != 0.0).then_some((steps, at))
            };
            let across = |d: usize| match (look(d, false), look(d, true)) {
                (Some(a), Some(b)) => Some([a, b]),
                (Some(a), None) | (None, Some(a)) => Some([a, a]),
                (None, None) => None,
            };
            let Some([(n, a), (m, b)]) =
                [across(0), across(1)].into_iter().flatten().min_by_key(|[a, b]| a.0 + b.0)
            else {
                continue;
            };
            let whole = (n + m) as f64;
            holes.push(Hole { at: [i, j], sources: [(a, m as f64 / whole), (b, n as f64 / whole)] });
        }
        Holes(holes)
    }

    /// Fills the holes from the metal around them.
    pub fn fill(&self, face: &mut Array2<f64>) {
        for Hole { at, sources } in &self.0 {
            face[*at] = sources.iter().map(|(from, weight)| weight * face[*from]).sum();
        }
    }

    /// The transpose: hands what is in the holes to the metal around them, and leaves them empty.
    pub fn empty(&self, face: &mut ndarray::ArrayViewMut2<f64>) {
        for Hole { at, sources } in &self.0 {
            let value = std::mem::take(&mut face[*at]);
            for (to, weight) in sources {
                face[*to] += weight * value;
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn filling_and_emptying_are_transposes() {
        // A plate, a slot and a ring; the plane of symmetry is at the first column.
        let metal =
            |i: usize, j: usize| !((2..=6).contains(&i) && j <= 4) || ((3..=5).contains(&i) && j <= 3);
        let face = Array2::from_shape_fn((9, 7), |(i, j)| f64::from(u8::from(metal(i, j))));
        let holes = Holes::new(&face);
        assert_eq!(holes.0.len() as f64, 63.0 - face.sum());
        let some =
            |seed: usize| Array2::from_shape_fn((9, 7), |(i, j)| ((i * 5 + j * 3 + seed) % 7) as f64 - 3.0);
        let (mut u, v) = (some(1) * &face, some(4));
        let mut back = v.clone();
        let before = u.clone();
        holes.fill(&mut u);
        holes.empty(&mut back.view_mut());
        assert!(((&u * &v).sum() - (&before * &back).sum()).abs() < 1e-12);
        let mut ones = face.clone();
        holes.fill(&mut ones);
        assert!(ones.iter().all(|v| (v - 1.0).abs() < 1e-15));
    }
}
