//! Traces kept from the search, so that what it finds can be tried on traces
//! it never saw.

use crate::support::Stream;
use crate::traces::{Labels, TraceSet};

/// Which traces are held out: `share` of them, drawn from the seed, the same
/// share of each label (at least one and not all of a label with two or more
/// traces).
pub fn hold_out(traces: &TraceSet, share: f64, seed: u64) -> Vec<bool> {
    let mut held_out = vec![false; traces.count()];
    if share <= 0.0 {
        return held_out;
    }
    for (label, mut members) in by_label(traces.labels(), traces.count()) {
        let wanted = (share * members.len() as f64).round() as usize;
        let count = match members.len() {
            0 | 1 => 0,
            n => wanted.clamp(1, n - 1),
        };
        Stream::new(seed, "hold-out", label as u64).shuffle(&mut members);
        for trace in &members[..count] {
            held_out[*trace] = true;
        }
    }
    held_out
}

/// The traces of each label; all in one when there are no labels.
fn by_label(labels: Option<&Labels>, count: usize) -> Vec<(usize, Vec<usize>)> {
    let Some(labels) = labels else {
        return vec![(0, (0..count).collect())];
    };
    (0..labels.names.len())
        .map(|label| {
            let members = (0..count).filter(|trace| labels.of_trace[*trace] == label);
            (label, members.collect())
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::traces::Grid;

    fn traces(labels: &[&str]) -> TraceSet {
        let names = (0..labels.len()).map(|n| format!("t{n}")).collect();
        let labels = Labels::from_names(labels.iter().map(ToString::to_string).collect());
        let lengths = vec![2; labels.of_trace.len()];
        TraceSet::new(names, &lengths, Some(labels), Grid::samples(), Vec::new())
    }

    #[test]
    fn every_label_keeps_and_gives_traces() {
        let mut labels = vec!["many"; 20];
        labels.extend(["two", "two", "one"]);
        let held_out = hold_out(&traces(&labels), 0.3, 1);
        let count =
            |range: std::ops::Range<usize>| held_out[range].iter().filter(|held| **held).count();
        assert_eq!([count(0..20), count(20..22), count(22..23)], [6, 1, 0]);
        assert_eq!(held_out, hold_out(&traces(&labels), 0.3, 1));
        assert_ne!(held_out, hold_out(&traces(&labels), 0.3, 2));
        assert!(hold_out(&traces(&labels), 0.0, 1).iter().all(|held| !held));
    }
}
