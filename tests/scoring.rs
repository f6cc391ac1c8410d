//! Scores: intervals and trees against outside values.

use strandline::scoring::{
    Scaling, cross_validated_accuracy, max_literals, scaled, spearman, stratified_folds, wilson,
};
use strandline::support::Stream;

/// Wilson intervals: the first four rows are method 3 of table I in Newcombe,
/// Statistics in Medicine 17 (1998) 857-872; the others were computed with
/// statsmodels 0.15.
#[test]
fn wilson_limits() {
    for (hits, of, low, high) in [
        (81, 263, 0.2553, 0.3662),
        (15, 148, 0.0624, 0.1605),
        (0, 20, 0.0, 0.1611),
        (1, 29, 0.0061, 0.1718),
    ] {
        let (l, h) = wilson(hits, of);
        assert!(
            (l - low).abs() < 5e-5 && (h - high).abs() < 5e-5,
            "{hits}/{of}: {l} {h}"
        );
    }
    for (hits, of, low, high) in [
        (0, 10, 0.0, 0.277_533),
        (1, 10, 0.017_876, 0.404_150),
        (3, 10, 0.107_791, 0.603_222),
        (5, 10, 0.236_593, 0.763_407),
        (8, 10, 0.490_162, 0.943_318),
        (10, 10, 0.722_467, 1.0),
        (0, 100, 0.0, 0.036_993),
        (4, 7, 0.250_458, 0.841_780),
        (2, 2, 0.342_380, 1.0),
        (0, 1, 0.0, 0.793_451),
    ] {
        let (l, h) = wilson(hits, of);
        assert!(
            (l - low).abs() < 1e-6 && (h - high).abs() < 1e-6,
            "{hits}/{of}: {l} {h}"
        );
        let (ml, mh) = wilson(of - hits, of);
        assert!((l - (1.0 - mh)).abs() < 1e-12 && (h - (1.0 - ml)).abs() < 1e-12);
    }
    assert_eq!(wilson(0, 0), (0.0, 1.0));
}

/// A label that one threshold tells apart is told apart; one that nothing does
/// is not told better than by chance.
#[test]
fn trees_find_what_is_there_and_nothing_else() {
    let mut stream = Stream::new(3, "trees", 0);
    let label: Vec<usize> = (0..120).map(|i| i % 3).collect();
    let noise: Vec<f64> = (0..120).map(|_| stream.normal()).collect();
    let clear: Vec<f64> = label
        .iter()
        .map(|label| *label as f64 * 10.0 + stream.normal())
        .collect();
    let found = cross_validated_accuracy(
        &[noise.clone(), clear],
        &label,
        3,
        2,
        &mut Stream::new(1, "f", 0),
    );
    assert!(found > 0.98, "{found}");
    let nothing = cross_validated_accuracy(&[noise], &label, 3, 5, &mut Stream::new(1, "f", 0));
    assert!((nothing - 1.0 / 3.0).abs() < 0.12, "{nothing}");
    assert_eq!([max_literals(2), max_literals(5)], [3, 6]);
}

#[test]
fn folds_are_stratified() {
    let label: Vec<usize> = (0..103).map(|i| usize::from(i % 4 == 0)).collect();
    let fold = stratified_folds(&label, 2, 5, &mut Stream::new(1, "f", 0));
    for wanted in 0..2 {
        let counts: Vec<usize> = (0..5)
            .map(|f| {
                (0..103)
                    .filter(|i| fold[*i] == f && label[*i] == wanted)
                    .count()
            })
            .collect();
        let spread = counts.iter().max().unwrap() - counts.iter().min().unwrap();
        assert!(spread <= 1, "{counts:?}");
    }
}

/// Spearman's correlation by hand: ranks 1 2 3 4 5 against 2 1 4 3 5 have
/// 1 - 6 * 4 / (5 * 24) = 0.8.
#[test]
fn rank_correlation_by_hand() {
    let a = [1.0, 2.0, 3.0, 4.0, 5.0];
    let b = [20.0, 10.0, 40.0, 30.0, 50.0];
    assert!((spearman(&a, &b) - 0.8).abs() < 1e-12);
    assert!((spearman(&a, &a.map(|x: f64| -x.exp())) + 1.0).abs() < 1e-12);
    assert_eq!(spearman(&a, &[1.0; 5]), 0.0);
}

/// Scaling keeps order, and ties stay ties.
#[test]
fn scaling_keeps_order() {
    let column = vec![3.0, -1.0, 3.0, 100.0, 0.5, 2.0];
    for scaling in [Scaling::Rank, Scaling::SignedLog] {
        let points = scaled(std::slice::from_ref(&column), scaling).unwrap();
        let out = points.column(0);
        for i in 0..column.len() {
            for j in 0..column.len() {
                let same_order = column[i].total_cmp(&column[j]) == out[i].total_cmp(&out[j]);
                assert!(same_order, "{scaling:?}: {out:?}");
            }
        }
    }
}
