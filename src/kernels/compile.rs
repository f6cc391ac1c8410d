//! From a resolved template to operations of a plan.

use std::sync::Arc;

use super::plan::{Op, Plan, Role, Run, Upper};
use super::resolved::{Limit, Reading, Resolved, Shape, Span, Step};
use crate::support::{SignalId, SlotId};
use crate::template::{Comparison, Direction};
use crate::traces::TraceSet;

/// What a sub-formula was compiled to.
pub(super) struct Compiled {
    pub(super) node: usize,
    /// The slots whose axes its rows run through, the last one fastest.
    pub(super) axes: Vec<SlotId>,
    /// The threshold axis that is not laid out yet.
    place: Option<Place>,
    has_height: bool,
}

/// A threshold axis that stands in a row as places.
#[derive(Clone, Copy)]
struct Place {
    slot: SlotId,
    points: u32,
    above: bool,
}

/// Adds the operations of a template to a plan.
pub(super) fn compile(
    plan: &mut Plan,
    formula: &Resolved,
    roles: &[Role],
    traces: &TraceSet,
) -> Compiled {
    let mut compiler = Compiler {
        plan,
        roles,
        traces,
    };
    compiler.root(formula)
}

struct Compiler<'a> {
    plan: &'a mut Plan,
    roles: &'a [Role],
    traces: &'a TraceSet,
}

impl Compiler<'_> {
    /// The whole template. An outermost window over a height and a threshold
    /// axis is scattered.
    fn root(&mut self, formula: &Resolved) -> Compiled {
        let (max, span, operand) = match &formula.shape {
            Shape::Throughout(span, operand) => (true, span, operand),
            Shape::Sometime(span, operand) => (false, span, operand),
            _ => return self.laid_out_formula(formula),
        };
        let parts = match &operand.shape {
            Shape::Or(parts) if max => parts,
            Shape::And(parts) if !max => parts,
            _ => return self.laid_out_formula(formula),
        };
        let Some((lower, upper, own)) = self.bounds(span) else {
            return self.laid_out_formula(formula);
        };
        let mut compiled: Vec<Compiled> = parts.iter().map(|part| self.formula(part)).collect();
        let fits = |part: &Compiled| part.place.is_some() && !part.has_height;
        let Some(at) = compiled.iter().position(fits) else {
            return self.laid_out_formula(formula);
        };
        if !compiled.iter().any(|part| part.has_height) {
            return self.laid_out_formula(formula);
        }
        let place = compiled.remove(at);
        let height = self.join(!max, compiled);
        let Some(axis) = place.place else {
            return self.laid_out_formula(formula);
        };
        let mut axes = height.axes;
        axes.extend(place.axes);
        axes.extend(own);
        axes.push(axis.slot);
        let node = self.plan.node(Op::Scatter {
            max,
            lower,
            upper,
            points: axis.points,
            above: axis.above,
            height: height.node,
            place: place.node,
        });
        Compiled {
            node,
            axes,
            place: None,
            has_height: true,
        }
    }

    fn laid_out_formula(&mut self, formula: &Resolved) -> Compiled {
        let compiled = self.formula(formula);
        self.laid_out(compiled)
    }

    /// With its threshold axis laid out, if it has one.
    fn laid_out(&mut self, mut compiled: Compiled) -> Compiled {
        if let Some(place) = compiled.place.take() {
            compiled.node = self.plan.node(Op::Met {
                points: place.points,
                above: place.above,
                part: compiled.node,
            });
            compiled.axes.push(place.slot);
        }
        compiled
    }

    fn formula(&mut self, formula: &Resolved) -> Compiled {
        let weak = formula.reading == Reading::Weak;
        match &formula.shape {
            Shape::Compare {
                signal,
                comparison,
                limit,
            } => self.compare(*signal, *comparison, *limit, weak),
            Shape::Flag { signal, negated } => {
                let values = self.traces.distinct_values(*signal);
                let cut = values.partition_point(|value| *value <= 0.5) as u32;
                self.leaf(Op::Cut {
                    signal: *signal,
                    cut,
                    above: !negated,
                    weak,
                })
            }
            Shape::And(parts) => {
                let parts = parts.iter().map(|part| self.formula(part)).collect();
                self.join(true, parts)
            }
            Shape::Or(parts) => {
                let parts = parts.iter().map(|part| self.formula(part)).collect();
                self.join(false, parts)
            }
            Shape::Throughout(span, part) => self.window(true, span, part),
            Shape::Sometime(span, part) => self.window(false, span, part),
            Shape::Until(span, left, right) => self.until(span, left, right),
        }
    }

    fn leaf(&mut self, op: Op) -> Compiled {
        let has_height = matches!(op, Op::Level { .. });
        Compiled {
            node: self.plan.node(op),
            axes: Vec::new(),
            place: None,
            has_height,
        }
    }

    fn compare(
        &mut self,
        signal: SignalId,
        comparison: Comparison,
        limit: Limit,
        weak: bool,
    ) -> Compiled {
        let values = self.traces.distinct_values(signal);
        let above = matches!(comparison, Comparison::AtLeast | Comparison::Above);
        // Samples below this rank are below the limit, as the comparison has it.
        let cut = |limit: f64| {
            let below = |value: &f64| match comparison {
                Comparison::AtMost | Comparison::Above => *value <= limit,
                Comparison::Below | Comparison::AtLeast => *value < limit,
            };
            values.partition_point(below) as u32
        };
        let slot = match limit {
            Limit::Number(number) => {
                let cut = cut(number);
                return self.leaf(Op::Cut {
                    signal,
                    cut,
                    above,
                    weak,
                });
            }
            Limit::Slot(slot) => slot,
        };
        match &self.roles[slot.index()] {
            Role::Levels(points) => {
                let cuts: Arc<[u32]> = points.iter().map(|point| cut(*point)).collect();
                let place = Place {
                    slot,
                    points: cuts.len() as u32,
                    above,
                };
                let mut leaf = self.leaf(Op::Place {
                    signal,
                    cuts,
                    above,
                    weak,
                });
                leaf.place = Some(place);
                leaf
            }
            // For a strict comparison the boundary is that of its negation: the
            // value that just does not do.
            _ => {
                let count = values.len() as u32;
                self.leaf(Op::Level {
                    signal,
                    easier: comparison.direction() == Direction::LargerIsEasier,
                    count,
                    weak,
                })
            }
        }
    }

    /// Parts joined. Only one kind of rank can stand in a row: beside the height
    /// every threshold axis is laid out, else all but the first.
    fn join(&mut self, max: bool, parts: Vec<Compiled>) -> Compiled {
        let has_height = parts.iter().any(|part| part.has_height);
        let mut kept: Option<Place> = None;
        let mut axes = Vec::new();
        let mut nodes = Vec::new();
        for mut part in parts {
            if has_height || kept.is_some() {
                part = self.laid_out(part);
            }
            kept = kept.or(part.place);
            axes.extend(part.axes);
            nodes.push(part.node);
        }
        let node = match nodes.as_slice() {
            [one] => *one,
            _ => self.plan.node(Op::Join { max, parts: nodes }),
        };
        Compiled {
            node,
            axes,
            place: kept,
            has_height,
        }
    }

    /// The bounds of a window and the axis among them; `None` when one is the
    /// height, or the lower one an axis.
    fn bounds(&self, span: &Span) -> Option<(u32, Upper, Option<SlotId>)> {
        let Step::At(lower) = span.lower else {
            return None;
        };
        match span.upper {
            Step::At(upper) => Some((lower, Upper::At(upper), None)),
            Step::End => Some((lower, Upper::End, None)),
            Step::Slot(slot) => match &self.roles[slot.index()] {
                Role::Steps(points) => Some((lower, Upper::Axis(Arc::clone(points)), Some(slot))),
                _ => None,
            },
        }
    }

    /// The axis of a lower bound.
    fn lower_axis(&self, span: &Span) -> Option<(Arc<[u32]>, SlotId)> {
        match span.lower {
            Step::Slot(slot) => match &self.roles[slot.index()] {
                Role::Steps(points) => Some((Arc::clone(points), slot)),
                _ => None,
            },
            _ => None,
        }
    }

    fn window(&mut self, max: bool, span: &Span, operand: &Resolved) -> Compiled {
        let weak = operand.reading == Reading::Weak;
        let mut compiled = self.formula(operand);
        let op = if let Some((lower, upper, own)) = self.bounds(span) {
            compiled.axes.extend(own);
            Op::Window {
                max,
                lower,
                upper,
                weak,
                part: compiled.node,
            }
        } else if let Some((lowers, slot)) = self.lower_axis(span) {
            compiled.axes.push(slot);
            Op::From {
                max,
                lowers,
                weak,
                part: compiled.node,
            }
        } else {
            compiled = self.laid_out(compiled);
            compiled.has_height = true;
            let (run, lower) = match (span.lower, max) {
                (Step::At(lower), true) => (Run::Longest, lower),
                (Step::At(lower), false) => (Run::First, lower),
                (_, true) => (Run::LastViolation, 0),
                (_, false) => (Run::LastTime, 0),
            };
            Op::Run {
                run,
                lower,
                weak,
                parts: vec![compiled.node],
            }
        };
        compiled.node = self.plan.node(op);
        compiled
    }

    fn until(&mut self, span: &Span, left: &Resolved, right: &Resolved) -> Compiled {
        let weak = (
            left.reading == Reading::Weak,
            right.reading == Reading::Weak,
        );
        let (mut left, mut right) = (self.formula(left), self.formula(right));
        let bounds = self.bounds(span);
        let from = self.lower_axis(span);
        let is_run = bounds.is_none() && from.is_none();
        let has_height = left.has_height || right.has_height || is_run;
        if has_height {
            left = self.laid_out(left);
            right = self.laid_out(right);
        } else if left.place.is_some() {
            right = self.laid_out(right);
        }
        let (l, r) = (left.node, right.node);
        let mut axes = left.axes;
        axes.extend(right.axes);
        let op = if let Some((lower, upper, own)) = bounds {
            axes.extend(own);
            Op::Until {
                lower,
                upper,
                weak,
                left: l,
                right: r,
            }
        } else if let Some((lowers, slot)) = from {
            axes.push(slot);
            Op::UntilFrom {
                lowers,
                weak,
                left: l,
                right: r,
            }
        } else {
            let (run, lower) = match span.lower {
                Step::At(lower) => (Run::FirstAnswer, lower),
                _ => (Run::LastAnswer, 0),
            };
            Op::Run {
                run,
                lower,
                weak: weak.1,
                parts: vec![l, r],
            }
        };
        Compiled {
            node: self.plan.node(op),
            axes,
            place: left.place.or(right.place),
            has_height,
        }
    }
}
