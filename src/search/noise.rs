//! The same traces with a little more noise: a column of an embedding, or a
//! grouping, that does not survive it says nothing.
//!
//! Each numeric channel gets normal noise of the larger of two amounts: half
//! of the noise that it has already, estimated from the differences of
//! neighbouring samples, median |dx - median dx| / (0.6745 sqrt 2), which is
//! the standard deviation of white noise under a slow signal; and 1 % of the
//! channel's standard deviation.

use crate::support::{SignalId, Stream};
use crate::template::Kind;
use crate::traces::TraceSet;

/// The recorded channels with added noise, flags as they are. Derived signals
/// are left out, to be computed again from the noisy channels.
pub fn noisy_copy(traces: &TraceSet, seed: u64) -> TraceSet {
    let lengths: Vec<usize> = traces.traces().map(|trace| traces.length(trace)).collect();
    let mut channels = Vec::new();
    for (position, channel) in traces.recorded().iter().enumerate() {
        let mut channel = channel.clone();
        if channel.signal.kind() == Kind::Numeric {
            let amount = amount(traces, SignalId::at(position));
            let mut stream = Stream::new(seed, "noise", position as u64);
            for sample in &mut channel.samples {
                // An unknown sample stays unknown: NaN plus anything is NaN.
                *sample += amount * stream.normal();
            }
        }
        channels.push(channel);
    }
    TraceSet::new(
        traces.names().to_vec(),
        &lengths,
        traces.labels().cloned(),
        traces.grid().clone(),
        channels,
    )
}

/// The standard deviation of the noise for a channel.
fn amount(traces: &TraceSet, signal: SignalId) -> f64 {
    let mut differences = Vec::new();
    let (mut count, mut sum, mut squares) = (0.0, 0.0, 0.0);
    for trace in traces.traces() {
        let samples = traces.samples(signal, trace);
        differences.extend(
            samples
                .windows(2)
                .map(|pair| pair[1] - pair[0])
                .filter(|difference| difference.is_finite()),
        );
        for sample in samples.iter().filter(|sample| sample.is_finite()) {
            count += 1.0;
            sum += sample;
            squares += sample * sample;
        }
    }
    let middle = median(&mut differences);
    let mut deviations: Vec<f64> = differences.iter().map(|d| (d - middle).abs()).collect();
    let own = median(&mut deviations) / (0.6745 * 2.0_f64.sqrt());
    let variance = if count > 0.0 {
        (squares / count - (sum / count).powi(2)).max(0.0)
    } else {
        0.0
    };
    (own / 2.0).max(0.01 * variance.sqrt())
}

/// The median; 0 of nothing.
fn median(values: &mut [f64]) -> f64 {
    if values.is_empty() {
        return 0.0;
    }
    let middle = values.len() / 2;
    *values.select_nth_unstable_by(middle, f64::total_cmp).1
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::template::Signal;
    use crate::traces::{Channel, Grid};

    #[test]
    fn the_amount_follows_the_noise_that_is_there() {
        let mut stream = Stream::new(5, "test", 0);
        let samples: Vec<f64> = (0..4000)
            .map(|t| f64::from(t) * 0.001 + 0.2 * stream.normal())
            .collect();
        let channel = Channel {
            signal: Signal::channel("x"),
            unit: None,
            samples,
        };
        let traces = TraceSet::new(
            vec!["a".to_owned(), "b".to_owned()],
            &[2000, 2000],
            None,
            Grid::samples(),
            vec![channel],
        );
        let amount = amount(&traces, SignalId(0));
        assert!((amount - 0.1).abs() < 0.01, "half of 0.2, not {amount}");
        let noisy = noisy_copy(&traces, 1);
        let id = SignalId(0);
        let changed = noisy.channel(id).samples[0] - traces.channel(id).samples[0];
        assert!(changed != 0.0 && changed.abs() < 1.0);
    }
}
