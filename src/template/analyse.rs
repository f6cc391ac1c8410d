//! From the tree as written to the analysed form: what each name must be,
//! negation pushed to the atoms, sugar removed, slots checked.

use std::ops::Range;

use super::ast::{Ast, AstKind};
use super::atom::{Atom, Comparison, Threshold};
use super::duration::{Duration, TimeUnit};
use super::error::TextError;
use super::formula::Formula;
use super::function::{FUNCTIONS, Function, FunctionShape, Kind};
use super::parse::parse_ast;
use super::signal::Signal;
use super::window::{Bound, Window, WindowError};
use crate::support::Finite;

/// Reads a template (or, without slots, a specification) from its text form.
///
/// # Errors
/// With the place and a remedy when the text is not in the language.
pub fn parse(text: &str) -> Result<Formula, TextError> {
    analyse(&parse_ast(text)?)
}

/// Reads a signal, such as `smooth(speed, 0.5 s)`, from its text form.
///
/// # Errors
/// With the place and a remedy when the text is not a signal of that kind.
pub fn parse_signal(text: &str, kind: Kind) -> Result<Signal, TextError> {
    signal(&parse_ast(text)?, kind)
}

/// The analysed form of a tree.
///
/// # Errors
/// With the place when the tree says something the language does not allow.
pub fn analyse(ast: &Ast) -> Result<Formula, TextError> {
    check_slot_names(ast)?;
    formula(ast, false)
}

/// A formula, negated or not.
fn formula(ast: &Ast, negate: bool) -> Result<Formula, TextError> {
    match &ast.kind {
        AstKind::Compare(left, comparison, right) => compare(left, *comparison, right, negate),
        AstKind::Not(operand) => formula(operand, !negate),
        AstKind::And(operands) => connective(operands, negate, !negate),
        AstKind::Or(operands) => connective(operands, negate, negate),
        AstKind::Implies(left, right) => {
            let parts = vec![formula(left, !negate)?, formula(right, negate)?];
            Ok(if negate {
                Formula::and(parts)
            } else {
                Formula::or(parts)
            })
        }
        AstKind::Throughout(bounds, operand) => temporal(bounds, operand, negate, !negate),
        AstKind::Sometime(bounds, operand) => temporal(bounds, operand, negate, negate),
        AstKind::Until(left, bounds, right) => {
            if negate {
                return Err(until_negated(ast.span.clone()));
            }
            let window = window(bounds)?;
            Ok(Formula::until(
                window,
                formula(left, false)?,
                formula(right, false)?,
            ))
        }
        AstKind::Name { .. } | AstKind::Call(..) => {
            Ok(Formula::flag(signal(ast, Kind::Flag)?, negate))
        }
        AstKind::Number(..) | AstKind::Slot(_) | AstKind::End | AstKind::Minus(..) => {
            Err(TextError::new(
                "this is not something that can hold or not hold",
                ast.span.clone(),
                "expected a comparison, a flag or a temporal operator",
            ))
        }
    }
}

fn connective(operands: &[Ast], negate: bool, conjunction: bool) -> Result<Formula, TextError> {
    let parts = operands
        .iter()
        .map(|operand| formula(operand, negate))
        .collect::<Result<Vec<_>, _>>()?;
    Ok(if conjunction {
        Formula::and(parts)
    } else {
        Formula::or(parts)
    })
}

fn temporal(
    bounds: &[Ast; 2],
    operand: &Ast,
    negate: bool,
    everywhere: bool,
) -> Result<Formula, TextError> {
    let window = window(bounds)?;
    let operand = formula(operand, negate)?;
    Ok(if everywhere {
        Formula::throughout(window, operand)
    } else {
        Formula::sometime(window, operand)
    })
}

fn until_negated(span: Range<usize>) -> TextError {
    TextError::new(
        "`until` cannot be negated",
        span,
        "this `until` stands under `not`, or on the left of `implies`",
    )
    .with_help("its negation would need a slot twice; say what must hold instead of what must not")
}

fn compare(
    left: &Ast,
    comparison: Comparison,
    right: &Ast,
    negate: bool,
) -> Result<Formula, TextError> {
    let threshold = threshold(right)?;
    let atom = Atom::Compare {
        signal: signal(left, Kind::Numeric)?,
        comparison,
        threshold,
    };
    Ok(Formula::atom(if negate { atom.negated() } else { atom }))
}

/// The right side of a comparison.
///
/// # Errors
/// When it is neither a number nor a slot.
pub fn threshold(ast: &Ast) -> Result<Threshold, TextError> {
    match &ast.kind {
        AstKind::Slot(_) => Ok(Threshold::Slot),
        AstKind::Number(value, unit) => Ok(Threshold::Number(
            finite(*value, &ast.span)?,
            unit.as_deref().map(Into::into),
        )),
        _ => Err(TextError::new(
            "the right side of a comparison must be a number or a slot",
            ast.span.clone(),
            "expected a number or `?`",
        )
        .with_help("to compare two channels, write x - y <= ?")),
    }
}

fn finite(value: f64, span: &Range<usize>) -> Result<Finite, TextError> {
    Finite::new(value)
        .map_err(|error| TextError::new(error.to_string(), span.clone(), "not finite"))
}

/// A signal of the kind that its place needs.
fn signal(ast: &Ast, kind: Kind) -> Result<Signal, TextError> {
    let made = match &ast.kind {
        AstKind::Name { name, .. } => Signal::Recorded {
            name: name.as_str().into(),
            kind,
        },
        AstKind::Minus(left, right) => {
            let sides = vec![signal(left, Kind::Numeric)?, signal(right, Kind::Numeric)?];
            Signal::derived(Function::Difference, sides, None)
        }
        AstKind::Call(name, arguments) => call(ast, name, arguments)?,
        _ => {
            return Err(TextError::new(
                "a channel or flag is needed here",
                ast.span.clone(),
                "expected a name or a function of one",
            ));
        }
    };
    if made.kind() == kind {
        return Ok(made);
    }
    let (is, needs) = match kind {
        Kind::Numeric => ("a flag", "a numeric channel"),
        Kind::Flag => ("a numeric channel", "a flag or a comparison"),
    };
    Err(TextError::new(
        format!("`{made}` is {is}, and {needs} is needed here"),
        ast.span.clone(),
        format!("expected {needs}"),
    ))
}

/// The row of the function that a call names, after checking the number of its
/// arguments.
///
/// # Errors
/// When there is no such function, or it takes another number of arguments.
pub fn called_function(
    name: &str,
    count: usize,
    span: &Range<usize>,
) -> Result<&'static FunctionShape, TextError> {
    // The difference has a sign in place of a name.
    let named = || FUNCTIONS.iter().filter(|shape| shape.name != "-");
    let Some(shape) = named().find(|shape| shape.name == name) else {
        let known: Vec<&str> = named().map(|shape| shape.name).collect();
        return Err(TextError::new(
            format!("there is no function `{name}`"),
            span.clone(),
            "unknown function",
        )
        .with_help(format!("the functions are: {}", known.join(", "))));
    };
    let expected = shape.arguments.len() + usize::from(shape.takes_duration);
    if count != expected {
        return Err(TextError::new(
            format!("`{name}` takes {expected} argument(s), not {count}"),
            span.clone(),
            shape.definition,
        ));
    }
    Ok(shape)
}

fn call(ast: &Ast, name: &str, arguments: &[Ast]) -> Result<Signal, TextError> {
    let shape = called_function(name, arguments.len(), &ast.span)?;
    let (signals, rest) = arguments.split_at(shape.arguments.len());
    let signals = signals
        .iter()
        .zip(shape.arguments)
        .map(|(argument, kind)| signal(argument, *kind))
        .collect::<Result<Vec<_>, _>>()?;
    let duration = rest.first().map(window_length).transpose()?;
    Ok(Signal::derived(shape.function, signals, duration))
}

/// The length of a moving window.
///
/// # Errors
/// When it is no duration, or not above zero.
pub fn window_length(ast: &Ast) -> Result<Duration, TextError> {
    let duration = duration(ast)?;
    if duration.value > Finite::from(0) {
        return Ok(duration);
    }
    Err(TextError::new(
        "the length of a moving window must be more than zero",
        ast.span.clone(),
        "expected a duration such as 2 s",
    ))
}

/// A duration as written.
///
/// # Errors
/// When it is no number, or its unit is no unit of time.
pub fn duration(ast: &Ast) -> Result<Duration, TextError> {
    let AstKind::Number(value, unit) = &ast.kind else {
        return Err(TextError::new(
            "a duration is needed here",
            ast.span.clone(),
            "expected a number with a unit of time, such as 5 s",
        ));
    };
    let unit = match unit {
        None => TimeUnit::Data,
        Some(name) => TimeUnit::from_name(name).ok_or_else(|| {
            TextError::new(
                format!("`{name}` is not a unit of time"),
                ast.span.clone(),
                "expected us, ms, s, min, h, d or step",
            )
        })?,
    };
    let value = finite(*value, &ast.span)?;
    Ok(Duration { value, unit })
}

fn bound(ast: &Ast) -> Result<Bound, TextError> {
    match &ast.kind {
        AstKind::End => Ok(Bound::End),
        AstKind::Slot(_) => Ok(Bound::Slot),
        _ => Ok(Bound::After(duration(ast)?)),
    }
}

fn window(bounds: &[Ast; 2]) -> Result<Window, TextError> {
    Window::new(bound(&bounds[0])?, bound(&bounds[1])?).map_err(|error| {
        let label = match error {
            WindowError::StartsAtEnd | WindowError::Negative => "expected 0 or a duration",
            WindowError::SlotBelowBound => "expected [?, end], or a duration as lower bound",
            WindowError::Empty => "expected the smaller bound first",
        };
        TextError::new(
            error.to_string(),
            bounds[0].span.start..bounds[1].span.end,
            label,
        )
    })
}

/// Refuses a slot name that occurs twice. A slot that made a specification
/// easier in one place and harder in another would have no boundary; and one
/// that did not would still have no exact height.
fn check_slot_names(ast: &Ast) -> Result<(), TextError> {
    let mut found: Vec<(String, Range<usize>)> = Vec::new();
    let mut second = None;
    for_each_slot(ast, &mut |name, span| {
        if found.iter().any(|(other, _)| other == name) {
            second.get_or_insert((name.to_owned(), span.clone()));
        } else {
            found.push((name.to_owned(), span.clone()));
        }
    });
    match second {
        None => Ok(()),
        Some((name, span)) => Err(TextError::new(
            format!("the slot `?{name}` occurs twice"),
            span,
            "each slot occurs once",
        )
        .with_help(
            "a slot used twice could make the template easier in one place and harder in another; \
             use two slots, or a difference of two channels",
        )),
    }
}

fn for_each_slot(ast: &Ast, visit: &mut impl FnMut(&str, &Range<usize>)) {
    match &ast.kind {
        AstKind::Slot(Some(name)) => visit(name, &ast.span),
        AstKind::Slot(None) | AstKind::Name { .. } | AstKind::Number(..) | AstKind::End => {}
        AstKind::Call(_, parts) | AstKind::And(parts) | AstKind::Or(parts) => {
            for part in parts {
                for_each_slot(part, visit);
            }
        }
        AstKind::Minus(left, right)
        | AstKind::Compare(left, _, right)
        | AstKind::Implies(left, right) => {
            for_each_slot(left, visit);
            for_each_slot(right, visit);
        }
        AstKind::Not(operand) => for_each_slot(operand, visit),
        AstKind::Throughout(bounds, operand) | AstKind::Sometime(bounds, operand) => {
            for part in bounds.iter() {
                for_each_slot(part, visit);
            }
            for_each_slot(operand, visit);
        }
        AstKind::Until(left, bounds, right) => {
            for_each_slot(left, visit);
            for part in bounds.iter() {
                for_each_slot(part, visit);
            }
            for_each_slot(right, visit);
        }
    }
}
