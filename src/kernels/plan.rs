//! A resolved formula as a list of nodes, with the axes that each one reads.

use super::boundary::Fill;
use super::resolved::{Reading, Resolved, Shape};
use crate::support::SlotId;

/// An axis: a slot and what it stands for at each of its points.
#[derive(Debug, Clone, PartialEq)]
pub struct PlanAxis {
    /// The slot.
    pub slot: SlotId,
    /// Its points.
    pub fills: Vec<Fill>,
}

/// A formula ready to be evaluated on many records.
#[derive(Debug, Clone, PartialEq)]
pub struct Plan {
    pub(super) nodes: Vec<PlanNode>,
    pub(super) root: usize,
    pub(super) axes: Vec<PlanAxis>,
    slots: usize,
}

#[derive(Debug, Clone, PartialEq)]
pub(super) struct PlanNode {
    pub(super) reading: Reading,
    pub(super) op: Shape<usize>,
    /// The positions of the axes that the node reads.
    axes: Vec<usize>,
}

impl Plan {
    /// The plan of a formula with so many slots. Every slot but the height has
    /// an axis.
    pub fn new(formula: &Resolved, slots: usize, axes: Vec<PlanAxis>) -> Self {
        let mut plan = Plan {
            nodes: Vec::new(),
            root: 0,
            axes,
            slots,
        };
        plan.root = plan.add(formula);
        plan
    }

    fn add(&mut self, formula: &Resolved) -> usize {
        let op = formula.shape.map(|operand| self.add(operand));
        let slots = op.own_slots();
        let mut axes: Vec<usize> = (0..self.axes.len())
            .filter(|at| slots.contains(&self.axes[*at].slot))
            .collect();
        for child in op.operands() {
            axes.extend(&self.nodes[*child].axes);
        }
        axes.sort_unstable();
        axes.dedup();
        self.nodes.push(PlanNode {
            reading: formula.reading,
            op,
            axes,
        });
        self.nodes.len() - 1
    }

    /// Every slot as the height, to be overwritten by the axes.
    pub(super) fn fills(&self) -> Vec<Fill> {
        vec![Fill::Height; self.slots]
    }

    /// Number of combinations of the axes that a node reads.
    pub(super) fn combinations(&self, node: &PlanNode) -> usize {
        node.axes
            .iter()
            .map(|axis| self.axes[*axis].fills.len())
            .product()
    }

    /// The number of the combination at a position on all axes.
    pub(super) fn key(&self, node: usize, position: &[usize]) -> usize {
        let axes = &self.nodes[node].axes;
        axes.iter().fold(0, |key, axis| {
            key * self.axes[*axis].fills.len() + position[*axis]
        })
    }
}
