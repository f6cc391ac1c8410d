//! A grouping: which group each point is in.

use std::cmp::Reverse;

/// Each point's group, numbered from 0.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Partition {
    /// The group of each point, below `groups`.
    pub group_of: Vec<usize>,
    /// The number of groups; some may be empty.
    pub groups: usize,
}

impl Partition {
    /// The number of points in each group.
    ///
    /// # Panics
    /// When a point's group is not below `groups`.
    pub fn sizes(&self) -> Vec<usize> {
        let mut sizes = vec![0; self.groups];
        for group in &self.group_of {
            sizes[*group] += 1;
        }
        sizes
    }

    /// The points of one group, ascending.
    pub fn members(&self, group: usize) -> Vec<usize> {
        let all = self.group_of.iter().enumerate();
        all.filter(|(_, own)| **own == group)
            .map(|(i, _)| i)
            .collect()
    }

    /// The same grouping with the largest group first; among groups of one
    /// size, that with the earliest member first.
    ///
    /// # Panics
    /// When a point's group is not below `groups`.
    pub fn relabelled_by_size(&self) -> Partition {
        let sizes = self.sizes();
        let mut first = vec![self.group_of.len(); self.groups];
        for (i, group) in self.group_of.iter().enumerate().rev() {
            first[*group] = i;
        }
        let mut order: Vec<usize> = (0..self.groups).collect();
        order.sort_by_key(|group| (Reverse(sizes[*group]), first[*group]));
        let mut place = vec![0; self.groups];
        for (new, old) in order.into_iter().enumerate() {
            place[old] = new;
        }
        Partition {
            group_of: self.group_of.iter().map(|group| place[*group]).collect(),
            groups: self.groups,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_largest_group_comes_first_and_ties_go_by_first_member() {
        let partition = Partition {
            group_of: vec![3, 0, 2, 2, 0, 2],
            groups: 5,
        };
        assert_eq!(partition.sizes(), [2, 0, 3, 1, 0]);
        assert_eq!(partition.members(2), [2, 3, 5]);
        let relabelled = partition.relabelled_by_size();
        assert_eq!(relabelled.group_of, [2, 1, 0, 0, 1, 0]);
        assert_eq!(relabelled.sizes(), [3, 2, 1, 0, 0]);
        let tie = Partition {
            group_of: vec![1, 0, 0, 1],
            groups: 2,
        };
        assert_eq!(tie.relabelled_by_size().group_of, [0, 1, 1, 0]);
    }
}
