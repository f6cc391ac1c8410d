//! Families in the ranking: templates that group the traces nearly alike are
//! gathered under the best of them, so that the ranking shows one line an
//! idea.
//!
//! The likeness of templates is a graph: a node a template, an edge between
//! two that are alike. Walking down the ranking, the best template without a
//! family founds one and takes its neighbours that have none. (Connected
//! components would be simpler and wrong: likeness is not transitive, and
//! chains would gather strangers.)

use petgraph::graph::{DiGraph, NodeIndex, UnGraph};

use crate::template::{Formula, is_special_case};

/// A founder and those it stands for, as positions in the ranking.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Family {
    /// The best of the family.
    pub founder: usize,
    /// The others, best first.
    pub members: Vec<usize>,
}

/// The families among `count` ranked templates, best first. `alike(a, b)` says
/// whether two positions of the ranking group the traces nearly alike.
pub fn families(count: usize, alike: impl Fn(usize, usize) -> bool) -> Vec<Family> {
    let mut graph: UnGraph<usize, ()> = UnGraph::default();
    let nodes: Vec<NodeIndex> = (0..count).map(|rank| graph.add_node(rank)).collect();
    for first in 0..count {
        for second in first + 1..count {
            if alike(first, second) {
                graph.add_edge(nodes[first], nodes[second], ());
            }
        }
    }
    let mut taken = vec![false; count];
    let mut found = Vec::new();
    for founder in 0..count {
        if taken[founder] {
            continue;
        }
        taken[founder] = true;
        let mut members: Vec<usize> = graph
            .neighbors(nodes[founder])
            .map(|node| graph[node])
            .filter(|rank| !taken[*rank])
            .collect();
        members.sort_unstable();
        for member in &members {
            taken[*member] = true;
        }
        found.push(Family { founder, members });
    }
    found
}

/// For each template the least general other one of which it is a special
/// case: its cover in the order of generality.
pub(super) fn parents(formulas: &[Option<Formula>]) -> Vec<Option<usize>> {
    let mut graph: DiGraph<usize, ()> = DiGraph::default();
    let nodes: Vec<NodeIndex> = (0..formulas.len())
        .map(|place| graph.add_node(place))
        .collect();
    for (place, special) in formulas.iter().enumerate() {
        for (other, general) in formulas.iter().enumerate() {
            if let (Some(special), Some(general)) = (special, general)
                && is_special_case(special, general)
            {
                graph.add_edge(nodes[place], nodes[other], ());
            }
        }
    }
    let slots = |place: usize| formulas[place].as_ref().map_or(0, |f| f.slots().len());
    nodes
        .iter()
        .map(|node| {
            let above = graph.neighbors(*node).map(|other| graph[other]);
            above.min_by_key(|place| (slots(*place), *place))
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_chain_of_likeness_does_not_gather_strangers() {
        let value = [0.0_f64, 1.0, 2.0, 0.5, 9.0];
        let found = families(5, |a, b| (value[a] - value[b]).abs() <= 1.0);
        let family = |founder, members: &[usize]| Family {
            founder,
            members: members.to_vec(),
        };
        assert_eq!(found, [family(0, &[1, 3]), family(2, &[]), family(4, &[])]);
    }
}
