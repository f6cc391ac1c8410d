//! Descriptions: rules found, numbers placed in the gap, and the independent
//! check that would notice a wrong one.

use strandline::description::{
    LiteralSearch, Quality, representatives, rule, rule_text, rules_on_trial, verify,
};
use strandline::embedding::{embed, resolve};
use strandline::grouping::{Distances, Partition, Points};
use strandline::template::{Signal, parse};
use strandline::traces::{Channel, Grid, Labels, TraceSet};

/// Thirty records: ten that stay low, ten with a middle peak, ten with a high
/// one.
fn peaks() -> (TraceSet, Vec<usize>) {
    let mut samples = Vec::new();
    let mut kinds = Vec::new();
    for trace in 0..30 {
        let kind = trace % 3;
        let peak = [1.0, 5.0, 9.0][kind] + 0.1 * (trace / 3) as f64;
        samples.extend((0..10).map(|t| if t == 4 { peak } else { 0.0 }));
        kinds.push(kind);
    }
    let channel = Channel {
        signal: Signal::channel("x"),
        unit: Some("bar".into()),
        samples,
    };
    let names = (0..30).map(|n| format!("t{n}")).collect();
    (
        TraceSet::new(names, &[10; 30], None, Grid::samples(), vec![channel]),
        kinds,
    )
}

#[test]
fn rules_are_short_and_their_numbers_lie_in_the_gap() {
    let (mut traces, kinds) = peaks();
    let formula = parse("throughout [0, end] (x <= ?)").unwrap();
    resolve(&formula, &mut traces).unwrap();
    let embedding = embed(&formula, &traces).unwrap();
    let search = LiteralSearch::new(&embedding, traces.grid());
    for (kind, text, literals) in [
        (0, "throughout [0, end] (x <= 4)", 1),
        (1, "", 2),
        (2, "sometime [0, end] (x > 8)", 1),
    ] {
        let members: Vec<bool> = kinds.iter().map(|own| *own == kind).collect();
        let found = rule(&search, &members).unwrap();
        let quality = found.quality(&embedding, &members);
        assert_eq!(
            (quality.support, quality.hits, quality.members),
            (10, 10, 10)
        );
        assert_eq!(found.literals.len(), literals);
        let (printed, said) = rule_text(&found, &embedding, traces.grid(), &());
        if literals == 1 {
            // The gaps are 1.9 to 5 and 5.9 to 9; the numbers with the fewest
            // digits well inside them.
            assert_eq!(printed, text);
        }
        assert!(parse(&printed).is_ok() && said.ends_with('.'), "{said}");
        let check = verify(&found, &embedding, &traces).unwrap();
        assert_eq!((check.verdicts, check.disagreements), (30 * literals, 0));
    }
}

/// A height that is not the trace's own is noticed.
#[test]
fn a_wrong_height_is_noticed_by_the_check() {
    let (mut traces, kinds) = peaks();
    let formula = parse("throughout [0, end] (x <= ?)").unwrap();
    resolve(&formula, &mut traces).unwrap();
    let mut embedding = embed(&formula, &traces).unwrap();
    let members: Vec<bool> = kinds.iter().map(|kind| *kind == 0).collect();
    let found = rule(&LiteralSearch::new(&embedding, traces.grid()), &members).unwrap();
    embedding.columns[0][0] = 100.0;
    let check = verify(&found, &embedding, &traces).unwrap();
    assert_eq!(check.disagreements, 1);
}

#[test]
fn rules_are_tried_on_traces_they_were_not_found_on() {
    let (mut traces, kinds) = peaks();
    let formula = parse("throughout [0, end] (x <= ?)").unwrap();
    resolve(&formula, &mut traces).unwrap();
    let embedding = embed(&formula, &traces).unwrap();
    let labels =
        |kinds: &[usize]| Labels::from_names(kinds.iter().map(|k| k.to_string()).collect());
    let clear = rules_on_trial(&embedding, &labels(&kinds), traces.grid(), 1);
    assert!(clear.iter().all(|f1| *f1 > 0.9), "{clear:?}");
    let shuffled: Vec<usize> = (0..30).map(|i| (i * i + i / 3) % 3).collect();
    let noise = rules_on_trial(&embedding, &labels(&shuffled), traces.grid(), 1);
    assert!(noise.iter().copied().fold(1.0, f64::min) < 0.6, "{noise:?}");
}

#[test]
fn figures_of_a_rule_by_hand() {
    let verdicts = [
        (true, true),
        (true, false),
        (false, true),
        (true, true),
        (false, false),
    ];
    let quality = Quality::of(verdicts.into_iter());
    assert_eq!((quality.support, quality.hits, quality.members), (3, 2, 3));
    assert!((quality.precision() - 2.0 / 3.0).abs() < 1e-12);
    assert!((quality.recall() - 2.0 / 3.0).abs() < 1e-12);
    assert!((quality.f1() - 2.0 / 3.0).abs() < 1e-12);
}

/// On a line the typical one is in the middle of its group, the borderline one
/// next to the other group.
#[test]
fn representatives_on_a_line() {
    let points = Points::new(vec![vec![0.0, 1.0, 2.0, 10.0, 11.0, 12.0, 13.0]]);
    let partition = Partition {
        group_of: vec![0, 0, 0, 1, 1, 1, 1],
        groups: 2,
    };
    let chosen = representatives(&Distances::euclidean(&points), &partition);
    assert_eq!(chosen[0].unwrap().typical, 1);
    assert_eq!(chosen[0].unwrap().borderline, 2);
    assert_eq!(chosen[1].unwrap().borderline, 3);
}
