//! Whether two templates sort the traces of a data set alike.

use serde::Serialize;

use crate::embedding::{column_digests, embed, mean_scaled_heights, resolve};
use crate::kernels::naive;
use crate::template::Formula;
use crate::traces::TraceSet;

/// Two templates on a data set.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct OnData {
    /// Whether they say the same about these traces: for templates, embeddings
    /// that agree up to the order of grid points and the scaling of the height;
    /// without slots, the same verdict on every trace.
    pub same_on_data: bool,
    /// Number of traces.
    pub traces: usize,
    /// Where they differ most, when they differ.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub differs: Option<String>,
}

/// Compares two templates on traces. `Err` carries what keeps a template from
/// being evaluated there.
///
/// # Errors
/// When a template does not fit the data, or only one of them has slots.
pub fn on_data(a: &Formula, b: &Formula, traces: &mut TraceSet) -> Result<OnData, String> {
    if a.is_specification() != b.is_specification() {
        return Err(
            "one of the two has slots and the other has none, so their answers cannot be \
                    compared trace by trace"
                .to_owned(),
        );
    }
    if a.is_specification() {
        return verdicts(a, b, traces);
    }
    for formula in [a, b] {
        resolve(formula, traces).map_err(|error| error.to_string())?;
    }
    let first = embed(a, traces).map_err(|error| error.to_string())?;
    let second = embed(b, traces).map_err(|error| error.to_string())?;
    let same = column_digests(&first) == column_digests(&second);
    let differs = (!same).then(|| {
        let (one, other) = (mean_scaled_heights(&first), mean_scaled_heights(&second));
        let gap = |trace: usize| (one[trace] - other[trace]).abs();
        let most = (0..traces.count()).max_by(|x, y| gap(*x).total_cmp(&gap(*y)));
        most.map(|trace| {
            format!(
                "{}: mean height {:.3} against {:.3}, on a scale from the lowest trace (0) to the \
                 highest (1)",
                traces.names()[trace],
                one[trace],
                other[trace]
            )
        })
    });
    Ok(OnData {
        same_on_data: same,
        traces: traces.count(),
        differs: differs.flatten(),
    })
}

fn verdicts(a: &Formula, b: &Formula, traces: &mut TraceSet) -> Result<OnData, String> {
    let first = resolve(a, traces).map_err(|error| error.to_string())?;
    let second = resolve(b, traces).map_err(|error| error.to_string())?;
    let different: Vec<&str> = traces
        .traces()
        .filter(|trace| {
            let record = traces.record(*trace);
            naive::satisfied(&first, record) != naive::satisfied(&second, record)
        })
        .map(|trace| traces.names()[trace.index()].as_str())
        .collect();
    let shown: Vec<&str> = different.iter().take(8).copied().collect();
    Ok(OnData {
        same_on_data: different.is_empty(),
        traces: traces.count(),
        differs: (!different.is_empty()).then(|| {
            format!(
                "{} of {} traces: {}",
                different.len(),
                traces.count(),
                shown.join(", ")
            )
        }),
    })
}
