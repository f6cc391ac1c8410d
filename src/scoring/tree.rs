//! How well a short tree of literals on one template's columns tells labels
//! apart, by cross-validation.
//!
//! The tree is grown best split first by the Gini index (Breiman, Friedman,
//! Olshen and Stone 1984) until it has as many literals as a person would
//! read. A split is a literal: a column against a number in the middle of a
//! gap. The columns are sorted once; a node is a set of traces, and its best
//! split is found in one pass over each sorted column.

use super::columns::order;
use crate::support::Stream;

/// Folds of the cross-validation.
const FOLDS: usize = 5;

/// As many literals as a short tree may have for so many labels.
pub fn max_literals(labels: usize) -> usize {
    3.max(labels + 1)
}

/// Mean accuracy of short trees over `repeats` stratified 5-fold
/// cross-validations. `columns[j][i]` is the number of trace i; `label[i]` is
/// below `labels`.
pub fn cross_validated_accuracy(
    columns: &[Vec<f64>],
    label: &[usize],
    labels: usize,
    repeats: usize,
    stream: &mut Stream,
) -> f64 {
    if columns.is_empty() || label.is_empty() {
        return 0.0;
    }
    let grower = Grower {
        columns,
        orders: columns.iter().map(|column| order(column)).collect(),
        label,
        labels,
    };
    let mut right = 0;
    for _ in 0..repeats {
        let fold = stratified_folds(label, labels, FOLDS, stream);
        for held in 0..FOLDS {
            let training: Vec<bool> = fold.iter().map(|fold| *fold != held).collect();
            let tree = grower.grow(&training);
            right += (0..label.len())
                .filter(|trace| !training[*trace] && tree.leaf(columns, *trace) == label[*trace])
                .count();
        }
    }
    right as f64 / (repeats * label.len()) as f64
}

/// A fold for each trace; every label is spread evenly over the folds.
pub fn stratified_folds(
    label: &[usize],
    labels: usize,
    folds: usize,
    stream: &mut Stream,
) -> Vec<usize> {
    let mut fold = vec![0; label.len()];
    let mut next = 0;
    for wanted in 0..labels {
        let mut members: Vec<usize> = (0..label.len()).filter(|i| label[*i] == wanted).collect();
        stream.shuffle(&mut members);
        for trace in members {
            fold[trace] = next % folds;
            next += 1;
        }
    }
    fold
}

/// A tree as a list of nodes, the root first.
struct Tree {
    nodes: Vec<TreeNode>,
}

enum TreeNode {
    Leaf(usize),
    Split {
        column: usize,
        cut: f64,
        /// Nodes for at most the cut and for above it.
        below: usize,
        above: usize,
    },
}

impl Tree {
    fn leaf(&self, columns: &[Vec<f64>], trace: usize) -> usize {
        let mut at = 0;
        loop {
            match &self.nodes[at] {
                TreeNode::Leaf(label) => return *label,
                TreeNode::Split {
                    column,
                    cut,
                    below,
                    above,
                } => {
                    at = if columns[*column][trace] <= *cut {
                        *below
                    } else {
                        *above
                    };
                }
            }
        }
    }
}

struct Grower<'a> {
    columns: &'a [Vec<f64>],
    orders: Vec<Vec<usize>>,
    label: &'a [usize],
    labels: usize,
}

/// A leaf that could be split.
struct Open {
    node: usize,
    members: Vec<bool>,
    split: Option<Split>,
}

#[derive(Clone, Copy)]
struct Split {
    /// How much impurity (number of traces times Gini index) it removes.
    gain: f64,
    column: usize,
    cut: f64,
}

impl Grower<'_> {
    fn grow(&self, training: &[bool]) -> Tree {
        let mut tree = Tree { nodes: Vec::new() };
        let mut open = vec![self.open(&mut tree, training.to_vec())];
        for _ in 0..max_literals(self.labels) {
            let best = (0..open.len())
                .filter(|at| open[*at].split.is_some())
                .max_by(|a, b| gain(&open[*a]).total_cmp(&gain(&open[*b])).then(b.cmp(a)));
            let Some(best) = best else { break };
            let leaf = open.swap_remove(best);
            let Some(split) = leaf.split else { break };
            let column = &self.columns[split.column];
            let side = |below: bool| -> Vec<bool> {
                (0..column.len())
                    .map(|i| leaf.members[i] && (column[i] <= split.cut) == below)
                    .collect()
            };
            let (below, above) = (
                self.open(&mut tree, side(true)),
                self.open(&mut tree, side(false)),
            );
            tree.nodes[leaf.node] = TreeNode::Split {
                column: split.column,
                cut: split.cut,
                below: below.node,
                above: above.node,
            };
            open.extend([below, above]);
        }
        tree
    }

    fn open(&self, tree: &mut Tree, members: Vec<bool>) -> Open {
        let counts = self.counts(&members);
        let majority = (0..self.labels)
            .rev()
            .max_by_key(|label| counts[*label])
            .unwrap_or(0);
        tree.nodes.push(TreeNode::Leaf(majority));
        let split = self.best_split(&members, &counts);
        Open {
            node: tree.nodes.len() - 1,
            members,
            split,
        }
    }

    fn counts(&self, members: &[bool]) -> Vec<usize> {
        let mut counts = vec![0; self.labels];
        for (label, member) in self.label.iter().zip(members) {
            counts[*label] += usize::from(*member);
        }
        counts
    }

    fn best_split(&self, members: &[bool], counts: &[usize]) -> Option<Split> {
        let whole = impurity(counts);
        if whole <= 0.0 {
            return None;
        }
        let mut best: Option<Split> = None;
        for (column, order) in self.orders.iter().enumerate() {
            let values = &self.columns[column];
            let mut below = vec![0usize; self.labels];
            let mut above = counts.to_vec();
            let mut before: Option<usize> = None;
            for trace in order.iter().copied().filter(|trace| members[*trace]) {
                if let Some(last) = before
                    && values[last] < values[trace]
                {
                    let gain = whole - impurity(&below) - impurity(&above);
                    if best.is_none_or(|best| gain > best.gain + 1e-12) {
                        let cut = f64::midpoint(values[last], values[trace]);
                        best = Some(Split { gain, column, cut });
                    }
                }
                below[self.label[trace]] += 1;
                above[self.label[trace]] -= 1;
                before = Some(trace);
            }
        }
        best.filter(|split| split.gain > 1e-9)
    }
}

fn gain(open: &Open) -> f64 {
    open.split.map_or(0.0, |split| split.gain)
}

/// Number of traces times the Gini index.
fn impurity(counts: &[usize]) -> f64 {
    let total: usize = counts.iter().sum();
    if total == 0 {
        return 0.0;
    }
    let squares: usize = counts.iter().map(|count| count * count).sum();
    total as f64 - squares as f64 / total as f64
}
