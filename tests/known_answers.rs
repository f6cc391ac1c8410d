//! Boundaries with known answers: handbook tables, closed forms, and signals
//! small enough to work out by hand.

use strandline::embedding::{Axis, Embedding, default_height, embed, embed_with, resolve};
use strandline::support::SlotId;
use strandline::template::{Signal, parse};
use strandline::traces::{Channel, Grid, TraceSet};

/// One trace, one sample a step; flags are named in capitals.
fn record(signals: &[(&str, Vec<f64>)]) -> TraceSet {
    let channels = signals
        .iter()
        .map(|(name, samples)| Channel {
            signal: if name.chars().all(char::is_uppercase) {
                Signal::flag(name)
            } else {
                Signal::channel(name)
            },
            unit: None,
            samples: samples.clone(),
        })
        .collect();
    let length = signals[0].1.len();
    TraceSet::new(
        vec!["trace".to_owned()],
        &[length],
        None,
        Grid::samples(),
        channels,
    )
}

fn embedding(set: &mut TraceSet, text: &str) -> Embedding {
    let formula = parse(text).unwrap_or_else(|error| panic!("{}", error.draw(text, "template")));
    resolve(&formula, set).unwrap();
    embed(&formula, set).unwrap()
}

/// The height of a template with one slot; `never` and `always` as infinities.
fn height(set: &mut TraceSet, text: &str) -> f64 {
    let found = embedding(set, text);
    assert_eq!(found.columns.len(), 1, "{text}");
    found.columns[0][0]
}

/// The step response of y'' + 2 z y' + y = 1 from rest, for any damping.
fn step_response(z: f64, t: f64) -> f64 {
    if (z - 1.0).abs() < 1e-12 {
        return 1.0 - (-t).exp() * (1.0 + t);
    }
    if z < 1.0 {
        let w = (1.0 - z * z).sqrt();
        return 1.0 - (-z * t).exp() * ((w * t).cos() + z / w * (w * t).sin());
    }
    let root = (z * z - 1.0).sqrt();
    let (a, b) = (z - root, z + root);
    1.0 - (b * (-a * t).exp() - a * (-b * t).exp()) / (b - a)
}

fn error_trace(z: f64, step: f64, until: f64) -> TraceSet {
    let count = (until / step).round() as usize + 1;
    let at = |k: usize| step_response(z, k as f64 * step);
    let y: Vec<f64> = (0..count).map(at).collect();
    record(&[("e", y.iter().map(|y| y - 1.0).collect()), ("y", y)])
}

/// Damping ratio, overshoot in percent, settling time to 5, 2 and 1 %, natural
/// frequency 1. Derived from the closed form; a control-systems library agrees
/// to the digits it prints. Overdamped rows have no overshoot.
const TABLE: &[(f64, f64, [f64; 3])] = &[
    (0.1, 72.924761, [28.967854, 38.383280, 44.805358]),
    (0.2, 52.662060, [13.744436, 19.601904, 22.933151]),
    (0.3, 37.232610, [10.137095, 11.230081, 14.324573]),
    (0.4, 25.382672, [7.608781, 8.409320, 11.332213]),
    (0.5, 16.303353, [5.289093, 8.076349, 8.780565]),
    (0.6, 9.478022, [5.229048, 5.942988, 6.258641]),
    (0.7, 4.598791, [2.899821, 5.978792, 6.574730]),
    (
        std::f64::consts::FRAC_1_SQRT_2,
        4.321392,
        [2.929839, 5.962585, 6.586439],
    ),
    (0.8, 1.516462, [3.385350, 3.755841, 6.353277]),
    (0.9, 0.152376, [4.014342, 4.699597, 5.127325]),
    (1.0, 0.0, [4.743865, 5.833922, 6.638352]),
    (1.2, 0.0, [6.214864, 7.922337, f64::NAN]),
    (1.5, 0.0, [8.255805, 10.654685, f64::NAN]),
    (2.0, 0.0, [11.45828, 14.877923, f64::NAN]),
];

/// Settling time and overshoot of the second-order step response, all damping
/// ratios at two sampling steps. Samples are a part of the signal, so the
/// sampled settling time is at most the next sample after the exact one; and
/// the sampled overshoot at most the exact one, short of it by at most
/// Mp dt^2 / 8 to leading order (doubled here).
#[test]
fn second_order_step_response() {
    for (z, overshoot, settling) in TABLE {
        for step in [0.1, 0.01] {
            let mut set = error_trace(*z, step, 60.0);
            for (band, exact) in [0.05, 0.02, 0.01].into_iter().zip(settling) {
                let template = format!("throughout [?, end] (abs(e) <= {band})");
                let steps = height(&mut set, &template);
                if !exact.is_nan() {
                    let limit = (exact / step).ceil();
                    assert!(steps <= limit, "{z} {step} {band}: {steps}");
                    if [0.2, 0.5, 0.7].contains(z) {
                        // Measured to be equal in all of these cases.
                        assert_eq!(steps, limit, "{z} {step} {band}");
                    }
                }
            }
            let top = height(&mut set, "throughout [0, end] (y <= ?)") - 1.0;
            let exact = overshoot / 100.0;
            assert!(top <= exact + 1e-8, "{z}: {top}");
            assert!(
                top >= exact * (1.0 - step * step / 4.0) - 1e-8 || *z >= 1.0,
                "{z}: {top}"
            );
        }
    }
}

/// Sampled overshoots of z = 0.2, 0.5, 0.7 at steps 0.1 and 0.01, and the
/// settling curve of z = 0.2 and 0.5 at step 0.01 after 5, 10 and 15: computed
/// from the closed form.
#[test]
fn sampled_overshoot_and_settling_curve() {
    for (z, step, expected) in [
        (0.2, 0.1, 0.52660989),
        (0.2, 0.01, 0.52661714),
        (0.5, 0.1, 0.16297087),
        (0.5, 0.01, 0.16303307),
        (0.7, 0.1, 0.04598789),
        (0.7, 0.01, 0.04598789),
    ] {
        let top = height(
            &mut error_trace(z, step, 60.0),
            "throughout [0, end] (y <= ?)",
        ) - 1.0;
        assert!((top - expected).abs() < 1e-8, "{z} {step}: {top}");
    }
    for (z, expected) in [
        (0.2, [0.27732821, 0.13609205, 0.04050312]),
        (0.5, [0.07459057, 0.00433340, 0.00063548]),
    ] {
        let mut set = error_trace(z, 0.01, 60.0);
        let found = curve(
            &mut set,
            "throughout [?, end] (abs(e) <= ?)",
            &[500.0, 1000.0, 1500.0],
        );
        for (found, expected) in found.iter().zip(expected) {
            assert!((found - expected).abs() < 1e-8, "{z}: {found}");
        }
    }
}

/// The heights of a template with a time axis at given points.
fn curve(set: &mut TraceSet, text: &str, points: &[f64]) -> Vec<f64> {
    let formula = parse(text).unwrap();
    resolve(&formula, set).unwrap();
    let height = default_height(&formula).unwrap();
    let slot = SlotId(u32::from(height == SlotId(0)));
    let axis = Axis {
        slot,
        points: points.to_vec(),
    };
    let found = embed_with(&formula, set, height, vec![axis]).unwrap();
    found.columns.iter().map(|column| column[0]).collect()
}

/// The settling curve is a staircase in part: at t = n pi / wd it is Mp^n.
#[test]
fn staircase_levels() {
    for (z, first) in [
        (0.2, 0.526_620_60),
        (0.5, 0.163_033_53),
        (0.7, 0.045_987_91),
    ] {
        let step = 0.001;
        let mut set = error_trace(z, step, 40.0);
        let period = std::f64::consts::PI / f64::sqrt(1.0 - z * z);
        let points: Vec<f64> = (1..=3)
            .map(|n| (f64::from(n) * period / step).floor())
            .collect();
        let found = curve(&mut set, "throughout [?, end] (abs(e) <= ?)", &points);
        for (n, found) in (1..).zip(found) {
            let expected = f64::powi(first, n);
            assert!(
                (found - expected).abs() < 2e-6,
                "{z} {n}: {found} {expected}"
            );
        }
    }
}

/// First order: 1 - exp(-t) settles to 5, 2 and 1 % at 2.995732, 3.912023 and
/// 4.605170 (minus the logarithm), and reaches 63.212056 % at 1.
#[test]
fn first_order_response() {
    let step = 0.001;
    let y: Vec<f64> = (0..10_000)
        .map(|k| 1.0 - (-f64::from(k) * step).exp())
        .collect();
    let mut set = record(&[("e", y.iter().map(|y| y - 1.0).collect()), ("y", y)]);
    for (band, exact) in [(0.05, 2.995732), (0.02, 3.912023), (0.01, 4.605170)] {
        let steps = height(&mut set, &format!("throughout [?, end] (abs(e) <= {band})"));
        assert_eq!(steps, f64::ceil(exact / step));
    }
    assert_eq!(height(&mut set, "sometime [0, ?] (y >= 0.63212)"), 1000.0);
    assert!(height(&mut set, "throughout [0, end] (y <= ?)") < 1.0);
}

/// A long sine: `sometime throughout` has the level cos(d / 2), `throughout
/// sometime` minus that; measured with step 0.001 within 2e-4 (closed form).
#[test]
fn windows_on_a_sine() {
    let step = 0.001;
    let x: Vec<f64> = (0..20_000).map(|k| f64::sin(f64::from(k) * step)).collect();
    let mut set = record(&[("x", x)]);
    for d in [1.0_f64, 2.0, 4.0] {
        let steps = (d / step).round();
        let dip = format!("sometime [0, 6283] (throughout [0, {steps}] (x >= ?))");
        let crest = format!("throughout [0, 6283] (sometime [0, {steps}] (x >= ?))");
        assert!(
            (height(&mut set, &dip) - (d / 2.0).cos()).abs() < 2e-4 * 2.0,
            "{d}"
        );
        assert!(
            (height(&mut set, &crest) + (d / 2.0).cos()).abs() < 2e-4 * 2.0,
            "{d}"
        );
    }
}

/// Hand values of windows on x = 1, 2.5, -0.5, 3, 2, 0.5: the level at the
/// first four steps (windows that fit), as boundaries of the suffixes.
#[test]
fn windows_by_hand() {
    let x = [1.0, 2.5, -0.5, 3.0, 2.0, 0.5];
    for (template, expected) in [
        ("throughout [0, 2] (x >= ?)", [-0.5, -0.5, -0.5, 0.5]),
        ("sometime [0, 2] (x >= ?)", [2.5, 3.0, 3.0, 3.0]),
        (
            "sometime [0, 1] (throughout [0, 1] (x >= ?))",
            [1.0, -0.5, 2.0, 2.0],
        ),
        (
            "throughout [0, 1] (sometime [0, 1] (x >= ?))",
            [2.5, 2.5, 3.0, 2.0],
        ),
    ] {
        for (at, expected) in expected.iter().enumerate() {
            let mut set = record(&[("x", x[at..].to_vec())]);
            assert_eq!(height(&mut set, template), *expected, "{template} at {at}");
        }
    }
    // p until [0, 5] q with p needed before, not at, the instant of q.
    let (p, q) = (
        [3.0, 2.0, 4.0, -1.0, 5.0, 2.0],
        [-2.0, -1.0, 0.0, 1.0, 3.0, -4.0],
    );
    for (at, expected) in [1.0, 1.0, 1.0, 1.0, 3.0, -4.0].iter().enumerate() {
        let best = q[at..]
            .iter()
            .filter(|level| {
                let mut set = record(&[("p", p[at..].to_vec()), ("q", q[at..].to_vec())]);
                let text = format!("(p >= {level}) until [0, 5] (q >= ?)");
                height(&mut set, &text) >= **level
            })
            .fold(f64::NEG_INFINITY, |a, b| a.max(*b));
        assert_eq!(best, *expected, "until at {at}");
    }
}

const NEVER: f64 = f64::NAN;

/// Signals as functions of the step.
fn made(length: usize, f: impl Fn(usize) -> f64) -> Vec<f64> {
    (0..length).map(f).collect()
}

fn on(length: usize, at: &[usize]) -> Vec<f64> {
    made(length, |t| f64::from(u8::from(at.contains(&t))))
}

fn between(length: usize, from: usize, to: usize) -> Vec<f64> {
    made(length, |t| f64::from(u8::from((from..=to).contains(&t))))
}

fn check(signals: &[(&str, Vec<f64>)], rows: &[(&str, f64)]) {
    let mut set = record(signals);
    for (template, expected) in rows {
        let found = embedding(&mut set, template);
        let found_height = found.columns[0][0];
        if expected.is_nan() {
            assert_eq!(found_height, found.never(), "{template}");
        } else {
            assert!(
                (found_height - expected).abs() < 1e-12,
                "{template}: {found_height}"
            );
        }
    }
}

/// Ramps, decays, zigzags and pulses; each value can be redone by hand.
#[test]
fn levels_and_times_of_simple_signals() {
    check(
        &[("x", made(11, |t| t as f64))],
        &[
            ("throughout [0, 5] (x <= ?)", 5.0),
            ("sometime [0, ?] (x >= 7)", 7.0),
        ],
    );
    let delayed = made(21, |t| (t.saturating_sub(4) as f64).min(10.0));
    check(
        &[("x", delayed)],
        &[("sometime [0, ?] (abs(since_start(x)) >= 1)", 5.0)],
    );
    let halves = made(13, |t| 0.5_f64.powi(t as i32));
    for m in [1, 5, 12] {
        let text = format!("throughout [?, end] (x <= {})", 0.5_f64.powi(m));
        check(&[("x", halves.clone())], &[(&text, f64::from(m))]);
    }
    let corners = [1.0, -0.5, 0.25, -0.125, 0.0625];
    let zigzag = made(17, |t| {
        let (at, share) = (t / 4, (t % 4) as f64 / 4.0);
        corners[at] + share * (corners.get(at + 1).unwrap_or(&corners[at]) - corners[at])
    });
    check(
        &[("x", zigzag)],
        &[
            ("throughout [?, end] (abs(x) <= 0.25)", 6.0),
            ("throughout [?, end] (abs(x) <= 0.5)", 2.0),
            ("throughout [?, end] (abs(x) <= 0.125)", 10.0),
            ("throughout [0, end] (x >= ?)", -0.5),
        ],
    );
    let pulse = made(15, |t| {
        [3.0, 6.0, 3.0]
            .get(t.wrapping_sub(6))
            .copied()
            .unwrap_or(0.0)
    });
    let depth = [(0, 6.0), (1, 3.0), (2, 3.0), (3, 0.0)];
    for (d, expected) in depth {
        let text = format!("sometime [0, end] (throughout [0, {d}] (x >= ?))");
        check(&[("x", pulse.clone())], &[(&text, expected)]);
    }
}

/// A triangle wave of amplitude 8, slope 2, period 16, rising from 0.
#[test]
fn windows_on_a_triangle_wave() {
    let wave = made(65, |t| {
        let phase = (t + 4) % 16;
        let up = if phase <= 8 { phase } else { 16 - phase };
        2.0 * up as f64 - 8.0
    });
    for (d, low, high) in [
        (0, -8.0, 8.0),
        (1, -6.0, 6.0),
        (2, -6.0, 6.0),
        (4, -4.0, 4.0),
        (5, -2.0, 2.0),
        (8, 0.0, 0.0),
        (16, 8.0, -8.0),
    ] {
        let crest = format!("throughout [0, end] (sometime [0, {d}] (x >= ?))");
        let dip = format!("sometime [0, end] (throughout [0, {d}] (x >= ?))");
        check(&[("x", wave.clone())], &[(&crest, low), (&dip, high)]);
    }
    check(
        &[("x", wave)],
        &[
            (
                "throughout [0, end] (x <= 5 or sometime [0, ?] (x <= 0))",
                5.0,
            ),
            ("throughout [0, end] (spread(x, 4) >= ?)", 4.0),
            ("throughout [0, end] (spread(x, 4) <= ?)", 8.0),
            ("throughout [0, end] (spread(x, 16) >= ?)", 16.0),
            ("throughout [0, end] (spread(x, 16) <= ?)", 16.0),
        ],
    );
    let step = made(20, |t| if t >= 10 { 5.0 } else { 0.0 });
    check(
        &[("x", step)],
        &[
            ("throughout [0, end] (spread(x, 4) <= ?)", 5.0),
            (
                "sometime [0, end] (throughout [0, ?] (spread(x, 4) >= 5))",
                3.0,
            ),
        ],
    );
    let sine = made(257, |t| (t as f64 * std::f64::consts::PI / 32.0).sin());
    for (w, least, most) in [
        (
            16,
            1.0 - (std::f64::consts::PI / 4.0).cos(),
            2.0 * (std::f64::consts::PI / 4.0).sin(),
        ),
        (32, 1.0, 2.0),
        (48, 1.0 - (std::f64::consts::PI * 0.75).cos(), 2.0),
    ] {
        let (low, high) = (
            format!("throughout [0, end] (spread(x, {w}) >= ?)"),
            format!("throughout [0, end] (spread(x, {w}) <= ?)"),
        );
        check(&[("x", sine.clone())], &[(&low, least), (&high, most)]);
    }
}

/// Flags: runs, gaps, edges, causes and effects, and what the end of a record
/// does to them.
#[test]
fn runs_gaps_and_answers() {
    let periodic = made(100, |t| f64::from(u8::from(t % 10 < 3)));
    check(
        &[("Q", periodic)],
        &[
            ("sometime [0, end] (throughout [0, ?] Q)", 2.0),
            ("throughout [0, end] (sometime [0, ?] not Q)", 3.0),
            ("throughout [0, end] (sometime [0, ?] Q)", 7.0),
            (
                "throughout [0, end] (rises(Q) implies sometime [1, ?] rises(Q))",
                10.0,
            ),
            (
                "throughout [0, end] (rises(Q) implies throughout [1, ?] not rises(Q))",
                9.0,
            ),
            (
                "throughout [0, end] (rises(Q) implies throughout [0, ?] Q)",
                2.0,
            ),
        ],
    );
    for (last, expected) in [(30, 7.0), (27, 7.0), (26, 7.0), (25, 6.0), (20, 3.0)] {
        let length = last + 1;
        check(
            &[
                ("C", on(length, &[2, 10, 20])),
                ("E", on(length, &[5, 11, 27])),
            ],
            &[(
                "throughout [0, end] (C implies sometime [0, ?] E)",
                expected,
            )],
        );
    }
    check(
        &[("v", made(13, |t| t as f64)), ("L", between(13, 7, 12))],
        &[
            ("(v <= ?) until [0, end] L", 6.0),
            ("(v <= ?) until [0, 5] L", NEVER),
            ("(v <= 6) until [0, ?] L", 7.0),
        ],
    );
}

/// Answers that come too late, delayed copies, and chains.
#[test]
fn late_answers_and_chains() {
    for (d, expected) in [(3, NEVER), (4, NEVER), (5, 0.0), (6, 0.0)] {
        let text = format!("throughout [0, end] (rises(E) implies (v <= ?) until [0, {d}] L)");
        check(
            &[
                ("E", between(20, 15, 19)),
                ("L", on(20, &[])),
                ("v", made(20, |t| if t < 15 { 1.0 } else { 0.0 })),
            ],
            &[(&text, expected)],
        );
    }
    let behind = |t: usize| t.saturating_sub(3) as f64;
    check(
        &[("x", made(20, |t| t as f64)), ("y", made(20, behind))],
        &[
            ("throughout [0, end] (abs(x - y) <= ?)", 3.0),
            (
                "throughout [0, end] (x <= 5 or sometime [0, ?] (y >= 6))",
                3.0,
            ),
            (
                "throughout [0, end] (x <= 17 or sometime [0, ?] (y >= 18))",
                2.0,
            ),
        ],
    );
    let abc = [
        ("A", on(12, &[3])),
        ("B", on(12, &[8])),
        ("C", on(12, &[10])),
    ];
    check(
        &abc,
        &[
            (
                "sometime [0, end] (A and sometime [0, ?] (B and sometime [0, 2] C))",
                5.0,
            ),
            (
                "sometime [0, end] (A and sometime [0, ?] (B and sometime [0, 1] C))",
                NEVER,
            ),
        ],
    );
}

/// A command and its feedback, a pump that starts and stops, and a level that
/// the end of the record cuts off.
#[test]
fn overlaps_and_open_ends() {
    check(
        &[("K", between(30, 10, 20)), ("F", between(30, 13, 24))],
        &[
            ("sometime [0, end] (throughout [0, ?] (K and not F))", 2.0),
            ("throughout [0, end] (sometime [0, ?] (not K or F))", 3.0),
            ("throughout [0, end] (sometime [0, ?] (K or not F))", 4.0),
        ],
    );
    let pump = made(31, |t| f64::from(u8::from(t <= 4 || (7..=20).contains(&t))));
    check(
        &[("P", pump)],
        &[
            (
                "throughout [0, end] (falls(P) implies throughout [0, ?] not P)",
                1.0,
            ),
            (
                "throughout [0, end] (rises(P) implies throughout [0, ?] P)",
                13.0,
            ),
        ],
    );
    check(
        &[("x", made(11, |t| if t < 6 { 0.0 } else { 1.0 }))],
        &[
            ("sometime [0, end] (throughout [0, ?] (x >= 1))", 4.0),
            ("throughout [0, end] (sometime [0, ?] (x <= 0))", 5.0),
            ("throughout [?, end] (x >= 1)", 6.0),
        ],
    );
}

/// Damping ratio, times to 10, 50, 90 and 100 % and to the peak, natural
/// frequency 1. Derived from the closed form (table 1A of the checks).
const RISE: &[(f64, [f64; 5])] = &[
    (0.1, [0.458009, 1.088419, 1.562208, 1.679382, 3.157419]),
    (0.2, [0.465212, 1.133267, 1.668642, 1.808697, 3.206375]),
    (0.3, [0.472644, 1.182168, 1.793984, 1.966047, 3.293284]),
    (0.4, [0.480313, 1.235592, 1.943805, 2.162881, 3.427759]),
    (0.5, [0.488229, 1.294039, 2.125802, 2.418399, 3.627599]),
    (0.6, [0.496400, 1.358027, 2.350451, 2.767872, 3.926991]),
    (0.7, [0.504835, 1.428059, 2.631037, 3.285328, 4.399110]),
    (0.8, [0.513543, 1.504590, 2.981035, 4.163486, 5.235988]),
    (0.9, [0.522532, 1.587961, 3.405488, 6.172581, 7.207308]),
];

/// The step at which a channel `y` first reaches a level.
fn reached(set: &mut TraceSet, level: f64) -> f64 {
    height(set, &format!("sometime [0, ?] (y >= {level})"))
}

/// Times to a level are the next sample after the exact ones; the largest
/// sample is one of the two beside the exact peak.
#[test]
fn rise_and_peak_times() {
    let step = 0.001;
    for (z, times) in RISE {
        let mut set = error_trace(*z, step, 20.0);
        for (level, exact) in [0.1, 0.5, 0.9, 1.0].into_iter().zip(times) {
            let steps = reached(&mut set, level);
            assert_eq!(steps, (exact / step).ceil(), "{z} {level}");
        }
        let top = height(&mut set, "throughout [0, end] (y <= ?)");
        let peak = reached(&mut set, top);
        assert!((peak - times[4] / step).abs() < 1.0, "{z}: {peak}");
    }
    // Rise from 10 to 90 % without overshoot: derived, same table.
    for (z, exact) in [
        (1.0, 3.357909),
        (1.2, 4.371389),
        (1.5, 5.858277),
        (2.0, 8.229235),
    ] {
        let mut set = error_trace(z, step, 30.0);
        let rise = reached(&mut set, 0.9) - reached(&mut set, 0.1);
        assert!((rise - exact / step).abs() < 1.0, "{z}: {rise}");
    }
}

/// Next to an extremum the error falls off as 1 - s^2 / 2, and a sample is at
/// most half a step away: short by a share of step^2 / 8 to leading order
/// (derived); half as much again is allowed, and `printed` for rounding.
fn is_sampled_extremum(found: f64, exact: f64, step: f64, printed: f64) -> bool {
    let least = exact * (1.0 - step * step / 8.0 * 1.5);
    (least - printed..=exact + printed).contains(&found)
}

/// The tight band of the sampled overshoot, no overshoot from critical damping
/// on (table 1A), and the envelope -ln(a sqrt(1 - z^2)) / z above every
/// settling time (1B); derived.
#[test]
fn overshoot_and_envelope_are_bounds() {
    for (z, overshoot, _) in TABLE {
        for step in [0.1, 0.01] {
            let mut set = error_trace(*z, step, 60.0);
            let top = height(&mut set, "throughout [0, end] (y <= ?)") - 1.0;
            if *z >= 1.0 {
                assert!((-1e-6..=0.0).contains(&top), "{z} {step}: {top}");
                continue;
            }
            let sampled = is_sampled_extremum(top, overshoot / 100.0, step, 5.1e-9);
            assert!(sampled, "{z} {step}: {top}");
            for band in [0.05, 0.02, 0.01] {
                let envelope = -(band * (1.0 - z * z).sqrt()).ln() / z;
                let template = format!("throughout [?, end] (abs(e) <= {band})");
                let steps = height(&mut set, &template);
                assert!(steps <= (envelope / step).ceil(), "{z} {step} {band}");
            }
        }
    }
}

/// The levels Mp^n at the printed times n pi / wd (1D, derived), as far as the
/// page lists them.
#[test]
fn listed_staircase_levels() {
    let step = 0.001;
    let listed: [(f64, &[(f64, f64)]); 3] = [
        (
            0.2,
            &[
                (3.206375, 0.52662060),
                (6.412749, 0.27732926),
                (9.619124, 0.14604730),
                (12.825498, 0.07691152),
                (16.031873, 0.04050319),
                (19.238247, 0.02132981),
            ],
        ),
        (
            0.5,
            &[
                (3.627599, 0.16303353),
                (7.255197, 0.02657993),
                (10.882796, 0.00433342),
                (14.510395, 0.00070649),
            ],
        ),
        (0.7, &[(4.399110, 0.04598791), (8.798219, 0.00211489)]),
    ];
    for (z, levels) in listed {
        let mut set = error_trace(z, step, 40.0);
        let points: Vec<f64> = levels.iter().map(|(t, _)| (t / step).floor()).collect();
        let found = curve(&mut set, "throughout [?, end] (abs(e) <= ?)", &points);
        assert_eq!(found.len(), levels.len());
        for (found, (t, level)) in found.into_iter().zip(levels) {
            let sampled = is_sampled_extremum(found, *level, step, 5.1e-9);
            assert!(sampled, "{z} {t}: {found} {level}");
        }
    }
}

/// Between the levels a*(t) = max(|y(t) - 1|, Mp^ceil(t wd / pi)); at the start
/// the lower level is 0, and from the peak on 1 - Mp^2 (1D, derived).
#[test]
fn settling_curve_and_undershoot() {
    let step = 0.01;
    for z in [0.2, 0.5, 0.7_f64] {
        let period = std::f64::consts::PI / (1.0 - z * z).sqrt();
        let overshoot = (-z * period).exp();
        let mut set = error_trace(z, step, 40.0);
        let points: Vec<f64> = (0..60).map(|k| f64::from(k * 17)).collect();
        let found = curve(&mut set, "throughout [?, end] (abs(e) <= ?)", &points);
        for (found, point) in found.into_iter().zip(points) {
            let t = point * step;
            let extremum = overshoot.powf((t / period).ceil());
            let exact = extremum.max((step_response(z, t) - 1.0).abs());
            let sampled = is_sampled_extremum(found, exact, step, 1e-12);
            assert!(sampled, "{z} {t}: {found} {exact}");
        }
        assert_eq!(height(&mut set, "throughout [0, end] (y >= ?)"), 0.0);
        let peak = (period / step).ceil();
        let low = height(&mut set, &format!("throughout [{peak}, end] (y >= ?)"));
        let sampled = is_sampled_extremum(1.0 - low, overshoot * overshoot, step, 1e-12);
        assert!(sampled, "{z}: {low}");
    }
}

/// All three jumps of the settling time (below table 1A, derived): just below
/// the damping the band is left once more around the peak, just above it is
/// not. The dampings are printed to 6 digits, so 2e-6 on either side; the peak
/// is above the band for less than 0.02 then.
#[test]
fn settling_time_jumps_at_every_band() {
    let step = 0.001;
    for (band, z, below, above) in [
        (0.05, 0.690107, 4.341098, 2.859071),
        (0.02, 0.779703, 5.017483, 3.602485),
        (0.01, 0.826085, 5.574880, 4.191612),
    ] {
        let template = format!("throughout [?, end] (abs(e) <= {band})");
        let settle = |z| height(&mut error_trace(z, step, 30.0), &template) * step;
        let late = settle(z - 2e-6) - below;
        assert!((0.0..0.02).contains(&late), "{band}: {late}");
        let early = settle(z + 2e-6) - above;
        assert!((0.0..=step).contains(&early), "{band}: {early}");
    }
}

/// First order, time constant 1: 63.212056, 86.466472 and 95.021293 % at 1, 2
/// and 3; from 10 to 90 % in ln 9 = 2.197225 (1D, derived).
#[test]
fn first_order_rise() {
    let step = 0.001;
    let y: Vec<f64> = (0..10_000)
        .map(|k| 1.0 - (-f64::from(k) * step).exp())
        .collect();
    let mut set = record(&[("y", y)]);
    for (steps, share) in [
        (1000.0, 0.63212056),
        (2000.0, 0.86466472),
        (3000.0, 0.95021293),
    ] {
        let template = format!("throughout [0, {steps}] (y <= ?)");
        assert!((height(&mut set, &template) - share).abs() < 5.1e-9);
    }
    let rise = reached(&mut set, 0.9) - reached(&mut set, 0.1);
    assert!((rise - 2197.225).abs() < 1.0, "{rise}");
}

/// Closed-form validity domains (6E, derived) of a ramp, a decay, a sine and a
/// pulse; and the values the page measured on the sine with step 0.001.
#[test]
fn closed_form_validity_domains() {
    let step = 0.001;
    let mut set = record(&[
        ("r", made(20_000, |k| k as f64 * step)),
        ("q", made(20_000, |k| (-(k as f64) * step / 2.0).exp())),
        ("x", made(20_000, |k| (k as f64 * step).sin())),
        ("p", between(20_000, 7000, 8250)),
    ]);
    for steps in [500, 1250, 2000, 3000] {
        let u = f64::from(steps) * step;
        let ramp = height(&mut set, &format!("throughout [0, {steps}] (r <= ?)"));
        let time = height(&mut set, &format!("sometime [0, ?] (r >= {u})"));
        let decay = height(&mut set, &format!("throughout [{steps}, end] (q <= ?)"));
        let sine = height(&mut set, &format!("throughout [0, {steps}] (x <= ?)"));
        assert!((ramp - u).abs() < 1e-12, "{u}: {ramp}");
        assert_eq!(time, f64::from(steps), "{u}");
        assert!((decay - (-u / 2.0).exp()).abs() < 1e-12, "{u}: {decay}");
        let exact = u.min(std::f64::consts::FRAC_PI_2).sin();
        assert!(is_sampled_extremum(sine, exact, step, 1e-12), "{u}: {sine}");
    }
    let width = "sometime [0, end] (throughout [0, ?] (p >= 0.5))";
    assert_eq!(height(&mut set, width), 1250.0);
    for (steps, dip, crest) in [
        (1000, 0.877485, -0.877396),
        (2000, 0.540131, -0.539975),
        (4000, -0.416164, 0.416501),
    ] {
        let inside = format!("sometime [0, 6283] (throughout [0, {steps}] (x >= ?))");
        let across = format!("throughout [0, 6283] (sometime [0, {steps}] (x >= ?))");
        let (inside, across) = (height(&mut set, &inside), height(&mut set, &across));
        assert!((inside - dip).abs() < 1e-6, "{steps}: {inside}");
        assert!((across - crest).abs() < 1e-6, "{steps}: {across}");
    }
}

/// Speed from 0 to 1 in 2 s, 2.5 s at 1 and back in 2 s, a sample every 0.25 s:
/// acceleration 1/2, and jerk 0.5/0.25 at the corners (row 40 of the
/// vocabulary's known answers).
#[test]
fn rates_on_a_grid_of_quarter_seconds() {
    let speed = made(27, |k| (k.min(26 - k) as f64 / 8.0).min(1.0));
    let grid = Grid {
        step: 0.25,
        unit: strandline::template::TimeUnit::Second,
    };
    let channel = Channel {
        signal: Signal::channel("v"),
        unit: None,
        samples: speed,
    };
    let mut set = TraceSet::new(vec!["lift".to_owned()], &[27], None, grid, vec![channel]);
    for (template, expected) in [
        ("throughout [0, end] (abs(rate(v)) <= ?)", 0.5),
        ("throughout [0, end] (abs(rate(rate(v))) <= ?)", 2.0),
    ] {
        assert_eq!(height(&mut set, template), expected, "{template}");
    }
}
