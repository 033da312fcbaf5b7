//! A plate in the grid: the nodes of its metal, with those of its guard ring, and how it moves.

use crate::Carry;

/// A box of nodes, first and last (both included) along each axis.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct NodeBox {
    /// Along x.
    pub i: [usize; 2],
    /// Along y.
    pub j: [usize; 2],
    /// Along z.
    pub k: [usize; 2],
}

impl NodeBox {
    /// Whether a node belongs to the box.
    pub fn contains(&self, i: usize, j: usize, k: usize) -> bool {
        let within = |r: [usize; 2], v: usize| r[0] <= v && v <= r[1];
        within(self.i, i) && within(self.j, j) && within(self.k, k)
    }
}

/// A plate and its guard ring, if it has one, in the grid: one conductor.
#[derive(Clone, Debug, PartialEq)]
pub struct Body {
    /// Boxes of metal: the plate first, then the pieces of the guard ring, which may share nodes with each other.
    pub boxes: Vec<NodeBox>,
    /// The box around all of them.
    pub hull: NodeBox,
    /// Motion of the whole body.
    pub carry: Carry,
    /// Motion of the plate alone past a guard ring that stands still; none without a guard ring.
    pub guarded_carry: Option<Carry>,
}

impl Body {
    /// The nodes of the plate itself.
    pub fn plate(&self) -> &NodeBox {
        &self.boxes[0]
    }

    /// Motion of the plate alone.
    pub fn plate_carry(&self) -> &Carry {
        self.guarded_carry.as_ref().unwrap_or(&self.carry)
    }

    /// Whether a node is metal.
    pub fn contains(&self, i: usize, j: usize, k: usize) -> bool {
        self.boxes.iter().any(|b| b.contains(i, j, k))
    }
}
