//! A batch of templates compiled to one list of operations.
//!
//! Every operation gives, for each trace, one or more **rows** of demands (a
//! number an instant), one for each combination of the axis points below it.
//! Templates that share a sub-formula, with the same slot solved and the same
//! grids, share its operation, and its rows are computed once a trace.
//!
//! The rows of an operation are demands of one of three kinds:
//! * whether something holds (0 or [`Code::NEVER`](super::code::Code::NEVER)),
//! * the rank that the height must reach,
//! * the place that a threshold axis must reach, counted from its easy end: one
//!   row instead of one a point, until the two kinds meet and the axis is laid
//!   out (`Op::Met`), or, right below an outermost operator, never
//!   (`Op::Scatter`).
//!
//! Each slot occurs once, so the operands of an operation never share an axis.

use std::collections::HashMap;
use std::sync::Arc;

use super::compile::compile;
use super::resolved::Resolved;
use crate::support::{SignalId, SlotId};
use crate::traces::TraceSet;

/// What a slot of a template stands for.
#[derive(Debug, Clone, PartialEq)]
pub enum Role {
    /// It is solved.
    Height,
    /// A threshold on a grid, ascending.
    Levels(Vec<f64>),
    /// A time on a grid of steps, ascending.
    Steps(Arc<[u32]>),
}

/// The upper bound of a window.
#[derive(Debug, Clone, PartialEq, Eq, Hash)]
pub(super) enum Upper {
    /// So many steps.
    At(u32),
    /// None.
    End,
    /// An axis.
    Axis(Arc<[u32]>),
}

/// Which bound of an operator is solved, and what the operator is.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub(super) enum Run {
    /// `sometime [lower, ?]`
    First,
    /// `throughout [lower, ?]`
    Longest,
    /// `sometime [?, end]`
    LastTime,
    /// `throughout [?, end]`
    LastViolation,
    /// `until [lower, ?]`
    FirstAnswer,
    /// `until [?, end]`
    LastAnswer,
}

/// One operation. `weak` is what stands beyond the record, and for what is not
/// known: the demand 0, else never.
#[derive(Debug, Clone, PartialEq, Eq, Hash)]
pub(super) enum Op {
    /// The rank that the height must reach.
    Level {
        signal: SignalId,
        easier: bool,
        count: u32,
        weak: bool,
    },
    /// Whether a rank is below (or, with `above`, at or above) a cut.
    Cut {
        signal: SignalId,
        cut: u32,
        above: bool,
        weak: bool,
    },
    /// The place that a threshold axis must reach.
    Place {
        signal: SignalId,
        cuts: Arc<[u32]>,
        above: bool,
        weak: bool,
    },
    /// `and` (the larger demand) or `or`.
    Join { max: bool, parts: Vec<usize> },
    /// `throughout` (the largest demand) or `sometime`.
    Window {
        max: bool,
        lower: u32,
        upper: Upper,
        weak: bool,
        part: usize,
    },
    /// The same over `[?, end]`, the lower bound an axis.
    From {
        max: bool,
        lowers: Arc<[u32]>,
        weak: bool,
        part: usize,
    },
    /// `until`.
    Until {
        lower: u32,
        upper: Upper,
        weak: (bool, bool),
        left: usize,
        right: usize,
    },
    /// `until [?, end]`.
    UntilFrom {
        lowers: Arc<[u32]>,
        weak: (bool, bool),
        left: usize,
        right: usize,
    },
    /// A time height.
    Run {
        run: Run,
        lower: u32,
        weak: bool,
        parts: Vec<usize>,
    },
    /// A threshold axis laid out: whether the place at each point is met.
    Met {
        points: u32,
        above: bool,
        part: usize,
    },
    /// An outermost window over `height and place` (or, with `max`, over
    /// `height or place`), the axis of the place laid out as the last one.
    Scatter {
        max: bool,
        lower: u32,
        upper: Upper,
        points: u32,
        above: bool,
        height: usize,
        place: usize,
    },
}

/// An operation with what is known of it.
#[derive(Debug, Clone)]
pub(super) struct PlanNode {
    pub(super) op: Op,
    /// Number of rows.
    pub(super) rows: usize,
    /// Operations and templates that use it.
    pub(super) uses: u32,
}

/// Where the demands of one template come from.
#[derive(Debug, Clone)]
pub(super) struct Root {
    pub(super) node: usize,
    /// For each row of the root, its place on the grid of the template.
    pub(super) cell_of_row: Vec<u32>,
}

/// A batch of templates ready to be evaluated, all in one code.
#[derive(Debug, Clone, Default)]
pub struct Plan {
    pub(super) nodes: Vec<PlanNode>,
    pub(super) roots: Vec<Root>,
    numbers: HashMap<Op, usize>,
}

impl Plan {
    /// An empty batch.
    pub fn new() -> Self {
        Plan::default()
    }

    /// Adds a template; `roles` has one entry a slot, one of them
    /// [`Role::Height`]. Its demands will come in the order of its grid: the
    /// axes in the order of the slots, the last one fastest.
    pub fn add(&mut self, formula: &Resolved, roles: &[Role], traces: &TraceSet) {
        let compiled = compile(self, formula, roles, traces);
        self.nodes[compiled.node].uses += 1;
        let points = |slot: SlotId| match &roles[slot.index()] {
            Role::Height => 1,
            Role::Levels(points) => points.len(),
            Role::Steps(points) => points.len(),
        };
        // Strides of the template's own grid.
        let mut stride = vec![0; roles.len()];
        let mut cells = 1;
        for slot in (0..roles.len()).rev() {
            stride[slot] = cells;
            cells *= points(SlotId::at(slot));
        }
        let rows = self.nodes[compiled.node].rows;
        assert_eq!(rows, cells, "every axis is laid out once");
        let cell_of_row = (0..rows).map(|row| {
            let mut rest = row;
            let mut cell = 0;
            for slot in compiled.axes.iter().rev() {
                cell += rest % points(*slot) * stride[slot.index()];
                rest /= points(*slot);
            }
            cell as u32
        });
        let cell_of_row = cell_of_row.collect();
        self.roots.push(Root {
            node: compiled.node,
            cell_of_row,
        });
    }

    /// Number of templates.
    pub fn len(&self) -> usize {
        self.roots.len()
    }

    /// Whether there is no template.
    pub fn is_empty(&self) -> bool {
        self.roots.is_empty()
    }

    /// Grid points of all templates.
    pub fn cells(&self) -> usize {
        self.roots.iter().map(|root| root.cell_of_row.len()).sum()
    }

    /// About how many passes over a trace the batch takes; known before it
    /// runs, and shared operations count once.
    pub fn passes(&self) -> usize {
        self.nodes.iter().map(|node| self.passes_of(node)).sum()
    }

    fn passes_of(&self, node: &PlanNode) -> usize {
        let rows = |part: &usize| self.nodes[*part].rows;
        match &node.op {
            Op::Level { .. } | Op::Cut { .. } => 1,
            Op::Place { cuts, .. } => 1 + cuts.len(),
            Op::Join { parts, .. } => node.rows * (parts.len() - 1),
            Op::Window { upper, part, .. } => match upper {
                Upper::At(steps) => rows(part) * (1 + steps.checked_ilog2().unwrap_or(0) as usize),
                Upper::End => 8 * rows(part),
                Upper::Axis(_) => node.rows,
            },
            Op::From { part, .. } => 8 * rows(part) + node.rows,
            Op::Until {
                upper, left, right, ..
            } => match upper {
                Upper::Axis(_) => 3 * node.rows,
                _ => 20 * rows(left) * rows(right),
            },
            Op::UntilFrom { .. } => 20 * node.rows,
            Op::Run { .. } => 30 * node.rows,
            Op::Met { .. } => node.rows,
            Op::Scatter { height, place, .. } => 30 * rows(height) * rows(place),
        }
    }

    /// The number of an operation, a new one if need be.
    pub(super) fn node(&mut self, op: Op) -> usize {
        if let Some(number) = self.numbers.get(&op) {
            return *number;
        }
        let rows = self.rows_of(&op);
        for part in parts(&op) {
            self.nodes[part].uses += 1;
        }
        let number = self.nodes.len();
        self.numbers.insert(op.clone(), number);
        self.nodes.push(PlanNode { op, rows, uses: 0 });
        number
    }

    fn rows_of(&self, op: &Op) -> usize {
        let below: usize = parts(op)
            .iter()
            .map(|part| self.nodes[*part].rows)
            .product();
        let own = |upper: &Upper| match upper {
            Upper::Axis(points) => points.len(),
            _ => 1,
        };
        match op {
            Op::Window { upper, .. } | Op::Until { upper, .. } => below * own(upper),
            Op::From { lowers, .. } | Op::UntilFrom { lowers, .. } => below * lowers.len(),
            Op::Met { points, .. } => below * *points as usize,
            Op::Scatter { upper, points, .. } => below * own(upper) * *points as usize,
            _ => below,
        }
    }
}

/// The operands of an operation.
fn parts(op: &Op) -> Vec<usize> {
    match op {
        Op::Level { .. } | Op::Cut { .. } | Op::Place { .. } => Vec::new(),
        Op::Join { parts, .. } | Op::Run { parts, .. } => parts.clone(),
        Op::Window { part, .. } | Op::From { part, .. } | Op::Met { part, .. } => vec![*part],
        Op::Until { left, right, .. } | Op::UntilFrom { left, right, .. } => vec![*left, *right],
        Op::Scatter { height, place, .. } => vec![*height, *place],
    }
}
