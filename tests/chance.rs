//! Chance: permutation p-values against worked examples, and behaviour on data
//! with and without groups.

use strandline::embedding::Embedding;
use strandline::scoring::{
    adjusted_by_maximum, label_chance, permutation_p_value, surrogate_chance,
};
use strandline::support::{SlotId, Stream};
use strandline::template::parse;
use strandline::traces::Labels;

/// Phipson and Smyth, SAGMB 9(1) (2010) article 39: (b + 1) / (m + 1), never 0.
#[test]
fn p_values_are_never_zero() {
    assert_eq!(permutation_p_value(0, 19), 0.05);
    assert_eq!(permutation_p_value(0, 99), 0.01);
    assert_eq!(permutation_p_value(99, 99), 1.0);
}

/// All 20 splits 3 against 3 of rows f1 = 1 2 3 4 5 6, f2 = 2 1 4 3 6 5,
/// f3 = 6 1 5 2 4 3 with labels 000111, statistic |difference of means|: raw
/// p 2/20, 4/20, 14/20, by the single-step maximum of Westfall and Young (1993)
/// 6/20, 8/20, 18/20. Worked by hand.
#[test]
fn maximum_of_three_features() {
    let rows = [[1, 2, 3, 4, 5, 6], [2, 1, 4, 3, 6, 5], [6, 1, 5, 2, 4, 3]];
    let statistic = |row: &[i32; 6], split: u32| {
        let (mut inside, mut outside) = (0, 0);
        for (at, value) in row.iter().enumerate() {
            if split >> at & 1 == 1 {
                inside += value;
            } else {
                outside += value;
            }
        }
        f64::from((inside - outside).abs()) / 3.0
    };
    let splits: Vec<u32> = (0..64u32).filter(|split| split.count_ones() == 3).collect();
    assert_eq!(splits.len(), 20);
    let observed: Vec<f64> = rows.iter().map(|row| statistic(row, 0b11_1000)).collect();
    let maxima: Vec<f64> = splits
        .iter()
        .map(|split| {
            rows.iter()
                .map(|row| statistic(row, *split))
                .fold(0.0, f64::max)
        })
        .collect();
    assert_eq!(adjusted_by_maximum(&observed, &maxima), [6, 8, 18]);
    for (row, raw) in rows.iter().zip([2, 4, 14]) {
        let own: Vec<f64> = splits.iter().map(|split| statistic(row, *split)).collect();
        assert_eq!(
            adjusted_by_maximum(&[statistic(row, 0b11_1000)], &own),
            [raw]
        );
    }
}

/// Embeddings of noise, the first with `shift` between two halves.
fn embeddings(count: usize, traces: usize, shift: f64, seed: u64) -> Vec<Embedding> {
    (0..count)
        .map(|number| {
            let mut stream = Stream::new(seed, "noise", number as u64);
            let columns = (0..4)
                .map(|_| {
                    let lift = |i: usize| {
                        if i % 2 == 1 && number == 0 {
                            shift
                        } else {
                            0.0
                        }
                    };
                    (0..traces).map(|i| stream.normal() + lift(i)).collect()
                })
                .collect();
            Embedding {
                formula: parse("throughout [0, end] (x <= ?)").unwrap(),
                height: SlotId(0),
                axes: Vec::new(),
                columns,
            }
        })
        .collect()
}

/// A label that one of forty templates sees is significant; labels drawn at
/// random are significant about as often as they should be.
#[test]
fn shuffled_labels_tell_signal_from_noise() {
    let traces = 40;
    let labels = |shuffle: Option<u64>| {
        let mut names: Vec<String> = (0..traces)
            .map(|i| if i % 2 == 1 { "odd" } else { "even" }.to_owned())
            .collect();
        if let Some(seed) = shuffle {
            Stream::new(seed, "relabel", 0).shuffle(&mut names);
        }
        Labels::from_names(names)
    };
    let planted = embeddings(40, traces, 3.0, 1);
    let all: Vec<&Embedding> = planted.iter().collect();
    let chance = label_chance(&all, 1, 40, &labels(None), 99, 1);
    assert!((chance.p_values[0] - 0.01).abs() < 1e-12);
    let noise = embeddings(40, traces, 0.0, 2);
    let all: Vec<&Embedding> = noise.iter().collect();
    let low = (0..60)
        .filter(|seed| {
            let chance = label_chance(&all, 40, 40, &labels(Some(*seed)), 39, *seed);
            chance.p_values.iter().any(|p| *p <= 0.05)
        })
        .count();
    assert!(low <= 9, "{low} of 60 relabellings");
}

/// Five groups that several templates see are told from chance; one cloud is
/// not. (Groups along one principal component alone are a known blind spot:
/// shuffling a component keeps its own distribution.)
#[test]
fn surrogates_tell_groups_from_a_cloud() {
    let mut planted = embeddings(20, 100, 0.0, 3);
    for (number, embedding) in planted.iter_mut().enumerate().take(12) {
        for column in &mut embedding.columns {
            for (i, height) in column.iter_mut().enumerate() {
                // Each template sees the groups in another order.
                *height += 6.0 * ((i % 5 * (1 + number % 4) + number) % 5) as f64;
            }
        }
    }
    let all: Vec<&Embedding> = planted.iter().collect();
    let found = surrogate_chance(&all, 19, 1).unwrap();
    assert!(found.p_value <= 0.05, "{found:?}");
    let cloud = embeddings(20, 100, 0.0, 4);
    let all: Vec<&Embedding> = cloud.iter().collect();
    let nothing = surrogate_chance(&all, 19, 1).unwrap();
    assert!(nothing.p_value > 0.05, "{nothing:?}");
}
