//! Samples as compressed bytes: little-endian doubles, deflated.

use std::io::{Read, Write};

use flate2::Compression;
use flate2::read::ZlibDecoder;
use flate2::write::ZlibEncoder;

/// Packs samples.
pub(super) fn pack(samples: &[f64]) -> std::io::Result<Vec<u8>> {
    let mut encoder = ZlibEncoder::new(Vec::new(), Compression::fast());
    for sample in samples {
        encoder.write_all(&sample.to_le_bytes())?;
    }
    encoder.finish()
}

/// Unpacks samples; `None` when the bytes are damaged or not `count` samples.
pub(super) fn unpack(bytes: &[u8], count: usize) -> Option<Vec<f64>> {
    let mut plain = Vec::with_capacity(8 * count);
    let limit = 8 * count as u64 + 1;
    ZlibDecoder::new(bytes)
        .take(limit)
        .read_to_end(&mut plain)
        .ok()?;
    let (doubles, rest) = plain.as_chunks::<8>();
    (rest.is_empty() && doubles.len() == count).then(|| {
        doubles
            .iter()
            .map(|bytes| f64::from_le_bytes(*bytes))
            .collect()
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn samples_survive_packing_bit_for_bit() {
        let samples = [0.1, -2.5e300, f64::NAN, 0.0, 1.0];
        let bytes = pack(&samples).unwrap();
        let back = unpack(&bytes, samples.len()).unwrap();
        let bits = |all: &[f64]| all.iter().map(|x| x.to_bits()).collect::<Vec<_>>();
        assert_eq!(bits(&samples), bits(&back));
        assert!(unpack(&bytes, 4).is_none());
        assert!(unpack(&bytes[..bytes.len() / 2], 5).is_none());
    }
}
