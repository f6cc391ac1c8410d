//! The embedding of a template: exact heights at every grid point.

use rayon::prelude::*;

use super::grid::{threshold_points, time_points};
use super::resolve::{ResolveError, resolve_derived};
use super::table::{Axis, Embedding};
use crate::kernels::{Code, Limit, NEVER, Plan, Resolved, Role, Shape, Span, Step, Worker, naive};
use crate::support::{SignalId, SlotId, TraceId};
use crate::template::{Direction, Formula, SlotKind};
use crate::traces::{MOST_NARROW, TraceSet};

/// Points of an axis when nothing else is said.
pub const DEFAULT_POINTS: usize = 16;
/// Points of each of several axes in a search: scoring thins a larger grid out
/// again, so its points would be computed for nothing.
const POINTS_OF_SEVERAL: usize = 8;

/// Why a template has no embedding on a trace set.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum EmbedError {
    /// It does not fit the data.
    #[error(transparent)]
    Resolve(#[from] ResolveError),
    /// It has no slot.
    #[error("`{0}` has no slot, so there is nothing to measure; write `?` for a number")]
    NoSlot(Formula),
}

/// The slot that is solved when nothing else is said: the first threshold,
/// else the first slot.
pub fn default_height(formula: &Formula) -> Option<SlotId> {
    let slots = formula.slots();
    let threshold = |slot: &&crate::template::Slot| matches!(slot.kind, SlotKind::Threshold(_));
    let first = slots.iter().position(|slot| threshold(&slot));
    first.or((!slots.is_empty()).then_some(0)).map(SlotId::at)
}

/// The axes of a template on a trace set: every slot but the height.
///
/// # Errors
/// When the template does not fit the data.
pub fn axes(
    formula: &Formula,
    traces: &TraceSet,
    height: SlotId,
    points: usize,
) -> Result<Vec<Axis>, EmbedError> {
    let mut axes = Vec::new();
    let resolved = resolve_derived(formula, traces)?;
    for (position, slot) in formula.slots().iter().enumerate() {
        let id = SlotId::at(position);
        if id == height {
            continue;
        }
        let points = match &slot.kind {
            SlotKind::Time => {
                // An upper bound below the lower one would make an empty window.
                let least = lower_bound(&resolved, id).unwrap_or(0);
                let mut times = time_points(traces.longest(), points);
                times.retain(|time| *time >= f64::from(least));
                if times.is_empty() {
                    times.push(f64::from(least));
                }
                times
            }
            SlotKind::Threshold(signal) => {
                let signal = traces
                    .signal_id(signal)
                    .ok_or_else(|| ResolveError::from(traces.unknown(signal)))?;
                threshold_points(traces, signal, points)
            }
        };
        axes.push(Axis { slot: id, points });
    }
    Ok(axes)
}

/// The embedding of a template with default height and axes. The trace set
/// must have all signals of the template already.
///
/// # Errors
/// When the template has no slot or does not fit the data.
pub fn embed(formula: &Formula, traces: &TraceSet) -> Result<Embedding, EmbedError> {
    let (formula, height, axes) = request(formula, traces)?;
    embed_with(&formula, traces, height, axes)
}

/// A template with default height and axes, to be embedded with others.
///
/// # Errors
/// When the template has no slot or does not fit the data.
pub fn request(formula: &Formula, traces: &TraceSet) -> Result<Request, EmbedError> {
    let height = default_height(formula).ok_or_else(|| EmbedError::NoSlot(formula.clone()))?;
    let points = match formula.slots().len() {
        0..=2 => DEFAULT_POINTS,
        _ => POINTS_OF_SEVERAL,
    };
    let axes = axes(formula, traces, height, points)?;
    Ok((formula.clone(), height, axes))
}

/// The embedding of a template with a given height and axes.
///
/// # Errors
/// When the template does not fit the data.
pub fn embed_with(
    formula: &Formula,
    traces: &TraceSet,
    height: SlotId,
    axes: Vec<Axis>,
) -> Result<Embedding, EmbedError> {
    let mut embeddings = embed_batch(vec![(formula.clone(), height, axes)], traces);
    embeddings.pop().expect("one template, one embedding")
}

/// A template, the slot that is solved, and the grids of the others.
pub type Request = (Formula, SlotId, Vec<Axis>);

/// The embeddings of many templates at once: what they share is computed once,
/// and the traces are spread over the cores. One result a request, in order.
///
/// # Errors
/// For each template that does not fit the data.
pub fn embed_batch(
    requests: Vec<Request>,
    traces: &TraceSet,
) -> Vec<Result<Embedding, EmbedError>> {
    let mut narrow = Batch::default();
    let mut wide = Batch::default();
    let mut results: Vec<Option<Result<Embedding, EmbedError>>> = Vec::new();
    for (place, (formula, height, axes)) in requests.into_iter().enumerate() {
        results.push(None);
        let embedding = Embedding {
            formula,
            height,
            axes,
            columns: Vec::new(),
        };
        match resolve_derived(&embedding.formula, traces) {
            Err(error) => results[place] = Some(Err(error.into())),
            Ok(resolved) => {
                let signal = signal_of(&resolved, height);
                let codes = match signal {
                    Some(signal) => traces.distinct_values(signal).len(),
                    None => traces.longest() + 1,
                };
                let batch = if codes <= MOST_NARROW {
                    &mut narrow
                } else {
                    &mut wide
                };
                batch.add(place, embedding, &resolved, signal, traces);
            }
        }
    }
    for (place, embedding) in narrow
        .evaluate::<u16>(traces)
        .into_iter()
        .chain(wide.evaluate::<u32>(traces))
    {
        results[place] = Some(Ok(embedding));
    }
    results
        .into_iter()
        .map(|result| result.expect("every request was answered"))
        .collect()
}

/// Templates whose demands fit one code.
#[derive(Debug, Default)]
struct Batch {
    plan: Plan,
    /// The place of each among the requests, and the signal that its height
    /// limits.
    members: Vec<(usize, Embedding, Option<SignalId>)>,
}

impl Batch {
    fn add(
        &mut self,
        place: usize,
        embedding: Embedding,
        resolved: &Resolved,
        signal: Option<SignalId>,
        traces: &TraceSet,
    ) {
        let mut roles = vec![Role::Height; embedding.formula.slots().len()];
        for axis in &embedding.axes {
            roles[axis.slot.index()] = match embedding.formula.slot(axis.slot).kind {
                SlotKind::Threshold(_) => Role::Levels(axis.points.clone()),
                SlotKind::Time => {
                    Role::Steps(axis.points.iter().map(|point| *point as u32).collect())
                }
            };
        }
        self.plan.add(resolved, &roles, traces);
        self.members.push((place, embedding, signal));
    }

    /// The embeddings, each with its place among the requests.
    fn evaluate<T: Code>(self, traces: &TraceSet) -> Vec<(usize, Embedding)> {
        if self.plan.is_empty() {
            return Vec::new();
        }
        let ids: Vec<TraceId> = traces.traces().collect();
        let plan = &self.plan;
        let demands: Vec<Vec<u32>> = ids
            .par_iter()
            .map_init(
                || Worker::<T>::new(plan),
                |worker, trace| worker.demands(traces.record(*trace)),
            )
            .collect();
        let mut first = 0;
        let mut embeddings = Vec::with_capacity(self.members.len());
        for (place, mut embedding, signal) in self.members {
            let values = signal.map_or(&[][..], |signal| traces.distinct_values(signal));
            let axes = embedding.axes.iter();
            let cells: usize = axes.map(|axis| axis.points.len()).product();
            embedding.columns = (first..first + cells)
                .map(|cell| {
                    let rows = demands.iter().zip(&ids);
                    rows.map(|(row, trace)| {
                        height_of(&embedding, row[cell], values, traces.length(*trace))
                    })
                    .collect()
                })
                .collect();
            first += cells;
            embeddings.push((place, embedding));
        }
        embeddings
    }
}

/// The verdict of a specification on every trace.
///
/// # Errors
/// When it does not fit the data.
pub fn verdicts(formula: &Formula, traces: &TraceSet) -> Result<Vec<bool>, ResolveError> {
    let resolved = resolve_derived(formula, traces)?;
    let ids: Vec<TraceId> = traces.traces().collect();
    Ok(ids
        .par_iter()
        .map(|trace| naive::satisfied(&resolved, traces.record(*trace)))
        .collect())
}

/// The signal that a threshold slot limits.
fn signal_of(resolved: &Resolved, slot: SlotId) -> Option<SignalId> {
    match &resolved.shape {
        Shape::Compare { signal, limit, .. } if *limit == Limit::Slot(slot) => Some(*signal),
        shape => shape
            .operands()
            .into_iter()
            .find_map(|operand| signal_of(operand, slot)),
    }
}

/// The constant lower bound of the window that a slot is the upper bound of.
fn lower_bound(resolved: &Resolved, slot: SlotId) -> Option<u32> {
    let own = |span: &Span| match (span.lower, span.upper) {
        (Step::At(lower), Step::Slot(upper)) if upper == slot => Some(lower),
        _ => None,
    };
    let here = match &resolved.shape {
        Shape::Throughout(span, _) | Shape::Sometime(span, _) | Shape::Until(span, _, _) => {
            own(span)
        }
        _ => None,
    };
    let mut operands = resolved.shape.operands().into_iter();
    here.or_else(|| operands.find_map(|operand| lower_bound(operand, slot)))
}

/// A demand as a height.
fn height_of(embedding: &Embedding, demand: u32, values: &[f64], length: usize) -> f64 {
    let slot = embedding.formula.slot(embedding.height);
    if demand == 0 {
        return embedding.always();
    }
    if demand == NEVER {
        return embedding.never();
    }
    let place = demand as usize;
    match (&slot.kind, slot.direction) {
        (SlotKind::Threshold(_), Direction::LargerIsEasier) => values[place - 1],
        (SlotKind::Threshold(_), Direction::LargerIsHarder) => values[values.len() - place],
        // A time beyond the record says nothing about the trace.
        (SlotKind::Time, Direction::LargerIsEasier) if place > length => embedding.never(),
        (SlotKind::Time, Direction::LargerIsEasier) => (place - 1) as f64,
        (SlotKind::Time, Direction::LargerIsHarder) => (length - place) as f64,
    }
}
