//! Several templates vote on a trace.

/// The rule of one template that speaks for a trace.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Ballot {
    /// The group it is for.
    pub group: usize,
    /// Share of the traces for which the rule held that were in the group.
    pub precision: f64,
    /// Share of the group for which it held.
    pub recall: f64,
}

/// The ballot of a template, given its rules that fit a trace: the one with
/// the best precision, then recall; none where none fits.
pub fn ballot(fitting: impl Iterator<Item = Ballot>) -> Option<Ballot> {
    fitting.reduce(|best, other| {
        let better = (other.precision, other.recall) > (best.precision, best.recall);
        if better { other } else { best }
    })
}

/// The group with most votes, and how many. Equal numbers are told apart by
/// the sum of the precisions, then by the order of the groups.
pub fn elect(ballots: impl Iterator<Item = Ballot>, groups: usize) -> Option<(usize, usize)> {
    let mut votes = vec![(0usize, 0.0f64); groups];
    for ballot in ballots {
        votes[ballot.group].0 += 1;
        votes[ballot.group].1 += ballot.precision;
    }
    let mut best: Option<usize> = None;
    for (group, tally) in votes.iter().enumerate() {
        if tally.0 > 0 && best.is_none_or(|other| *tally > votes[other]) {
            best = Some(group);
        }
    }
    best.map(|group| (group, votes[group].0))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn vote(group: usize, precision: f64) -> Ballot {
        Ballot {
            group,
            precision,
            recall: 1.0,
        }
    }

    #[test]
    fn most_votes_win_then_precision_then_order() {
        let elect = |votes: &[Ballot]| elect(votes.iter().copied(), 3);
        assert_eq!(
            elect(&[vote(2, 0.9), vote(0, 1.0), vote(2, 0.8)]),
            Some((2, 2))
        );
        assert_eq!(elect(&[vote(2, 0.9), vote(0, 0.8)]), Some((2, 1)));
        assert_eq!(elect(&[vote(2, 0.9), vote(0, 0.9)]), Some((0, 1)));
        assert_eq!(elect(&[]), None);
        let one = ballot([vote(1, 0.7), vote(2, 0.9), vote(0, 0.9)].into_iter());
        assert_eq!(one, Some(vote(2, 0.9)));
    }
}
