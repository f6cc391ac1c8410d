//! Seeded random streams: the only source of randomness in the program.
//!
//! A stream is named by a seed, a purpose and an index, so work can be split
//! over threads in any way: the stream for (seed, purpose, index) is the same
//! wherever it is used. The generator is `SplitMix64` (Steele, Lea and Flood,
//! OOPSLA 2014), which passes the usual statistical batteries and needs one
//! word of state.

/// A stream of pseudo-random numbers.
#[derive(Debug, Clone)]
pub struct Stream {
    state: u64,
}

impl Stream {
    /// The stream for one purpose (a word such as `"kmeans"`) and index.
    pub fn new(seed: u64, purpose: &str, index: u64) -> Self {
        let mut state = seed ^ 0x9e37_79b9_7f4a_7c15;
        for byte in purpose.bytes() {
            state = mix(state ^ u64::from(byte));
        }
        Stream {
            state: mix(state ^ mix(index.wrapping_add(1))),
        }
    }

    /// The next 64 random bits.
    pub fn next_u64(&mut self) -> u64 {
        self.state = self.state.wrapping_add(0x9e37_79b9_7f4a_7c15);
        mix(self.state)
    }

    /// A number in [0, 1) with 53 random bits.
    pub fn uniform(&mut self) -> f64 {
        (self.next_u64() >> 11) as f64 / (1u64 << 53) as f64
    }

    /// A whole number in `0..n`, by Lemire's multiplication with rejection
    /// (ACM TOMACS 29(1), 2019), so every value is exactly equally likely.
    ///
    /// # Panics
    /// When `n` is zero.
    pub fn below(&mut self, n: usize) -> usize {
        assert!(n > 0, "a range needs at least one value");
        let n = n as u64;
        let threshold = n.wrapping_neg() % n;
        loop {
            let product = u128::from(self.next_u64()) * u128::from(n);
            if product as u64 >= threshold {
                return (product >> 64) as usize;
            }
        }
    }

    /// A standard normal number, by the polar method (Marsaglia and Bray,
    /// SIAM Review 6, 1964).
    pub fn normal(&mut self) -> f64 {
        loop {
            let u = 2.0 * self.uniform() - 1.0;
            let v = 2.0 * self.uniform() - 1.0;
            let s = u * u + v * v;
            if s > 0.0 && s < 1.0 {
                return u * (-2.0 * s.ln() / s).sqrt();
            }
        }
    }

    /// Puts a slice into random order (Fisher and Yates).
    pub fn shuffle<T>(&mut self, items: &mut [T]) {
        for last in (1..items.len()).rev() {
            items.swap(last, self.below(last + 1));
        }
    }

    /// `count` different numbers of `0..n`, in ascending order.
    pub fn sample(&mut self, n: usize, count: usize) -> Vec<usize> {
        let mut all: Vec<usize> = (0..n).collect();
        self.shuffle(&mut all);
        all.truncate(count);
        all.sort_unstable();
        all
    }
}

/// The finaliser of `SplitMix64`.
fn mix(mut z: u64) -> u64 {
    z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
    z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
    z ^ (z >> 31)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn streams_differ_by_purpose_and_index_and_repeat() {
        let first = Stream::new(7, "kmeans", 0).next_u64();
        assert_eq!(first, Stream::new(7, "kmeans", 0).next_u64());
        assert_ne!(first, Stream::new(7, "kmeans", 1).next_u64());
        assert_ne!(first, Stream::new(7, "noise", 0).next_u64());
        assert_ne!(first, Stream::new(8, "kmeans", 0).next_u64());
    }

    #[test]
    fn moments_are_those_of_the_distributions() {
        let mut stream = Stream::new(1, "test", 0);
        let n = 200_000;
        let uniform: f64 = (0..n).map(|_| stream.uniform()).sum::<f64>() / f64::from(n);
        assert!((uniform - 0.5).abs() < 0.005, "mean {uniform}");
        let normal: Vec<f64> = (0..n).map(|_| stream.normal()).collect();
        let mean = normal.iter().sum::<f64>() / f64::from(n);
        let square = normal.iter().map(|x| x * x).sum::<f64>() / f64::from(n);
        assert!(mean.abs() < 0.01 && (square - 1.0).abs() < 0.02);
    }

    #[test]
    fn a_shuffle_keeps_every_item() {
        let mut items: Vec<usize> = (0..50).collect();
        Stream::new(3, "test", 9).shuffle(&mut items);
        assert_ne!(items, (0..50).collect::<Vec<_>>());
        items.sort_unstable();
        assert_eq!(items, (0..50).collect::<Vec<_>>());
    }
}
