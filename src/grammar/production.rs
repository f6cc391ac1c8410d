//! A grammar meets a palette: every rule, in every kind of place where it is
//! used, becomes a list of pieces.
//!
//! A piece is a head with parts. The head says what is built from the values of
//! the parts and what it adds to size, slots and flags; so counting and listing
//! need to know nothing about the language. Pieces live in one arena and refer
//! to each other by index; a rule used in one kind of place is one piece,
//! however often it is used, which is how `f and f` is known to have the same
//! rule on both sides.

use std::collections::BTreeMap;

use super::file::{Alternative, Binding, Grammar, Pool};
use super::palette::Palette;
use super::piece::{Head, Piece, PieceId, Value};
use crate::template::{
    Ast, AstKind, Bound, Function, Kind, Signal, TextError, Window, called_function, duration,
    threshold, window_length,
};

/// A mistake in a grammar that shows when its rules are put together.
pub type ProductionError = TextError;

/// What kind of thing a place needs.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(super) enum Place {
    Formula,
    Numeric,
    Flag,
    Time,
}

/// All pieces of a grammar on a palette.
#[derive(Debug, Clone)]
pub(super) struct Productions {
    pub(super) pieces: Vec<Piece>,
    pub(super) goal: PieceId,
    /// The piece of each rule as a formula, where it is used as one.
    pub(super) formulas: BTreeMap<usize, PieceId>,
}

/// Puts a grammar and a palette together.
pub(super) fn productions(
    grammar: &Grammar,
    palette: &Palette,
) -> Result<Productions, ProductionError> {
    let mut compiler = Compiler {
        grammar,
        palette,
        pieces: Vec::new(),
        rules: BTreeMap::new(),
    };
    let goal = compiler.rule(grammar.goal, Place::Formula)?;
    let formulas = compiler
        .rules
        .iter()
        .filter(|((_, place), _)| *place == Place::Formula)
        .map(|((rule, _), piece)| (*rule, *piece))
        .collect();
    Ok(Productions {
        pieces: compiler.pieces,
        goal,
        formulas,
    })
}

/// What the names bound in an alternative stand for.
type Bindings = BTreeMap<String, Signal>;

struct Compiler<'a> {
    grammar: &'a Grammar,
    palette: &'a Palette,
    pieces: Vec<Piece>,
    rules: BTreeMap<(usize, Place), PieceId>,
}

impl Compiler<'_> {
    fn push(&mut self, head: Head, parts: Vec<PieceId>) -> PieceId {
        self.pieces.push(Piece { head, parts });
        self.pieces.len() - 1
    }

    fn leaf(&mut self, value: Value) -> PieceId {
        self.push(Head::Leaf(value), Vec::new())
    }

    /// The piece of a rule in a kind of place. It is entered before its
    /// alternatives are put together, so that recursion finds it.
    fn rule(&mut self, rule: usize, place: Place) -> Result<PieceId, ProductionError> {
        if let Some(piece) = self.rules.get(&(rule, place)) {
            return Ok(*piece);
        }
        let piece = self.push(Head::Choice(Vec::new()), Vec::new());
        self.rules.insert((rule, place), piece);
        let mut alternatives: Vec<&Alternative> =
            self.grammar.rules[rule].alternatives.iter().collect();
        // Best first; equal weights stay in the order of the file.
        alternatives.sort_by(|a, b| b.weight.total_cmp(&a.weight));
        let mut choices = Vec::new();
        for alternative in alternatives {
            for bound in self.bindings(&alternative.bindings) {
                choices.push(self.piece(&alternative.ast, place, &bound)?);
            }
        }
        self.pieces[piece].head = Head::Choice(choices);
        Ok(piece)
    }

    /// All ways to bind the names of an alternative.
    fn bindings(&self, bindings: &[Binding]) -> Vec<Bindings> {
        let mut all = vec![Bindings::new()];
        for binding in bindings {
            let pool: Vec<(Signal, Option<&str>)> = match binding.pool {
                Pool::Channels => self
                    .palette
                    .channels
                    .iter()
                    .map(|(signal, unit)| (signal.clone(), unit.as_deref()))
                    .collect(),
                Pool::Flags => self
                    .palette
                    .flags
                    .iter()
                    .map(|f| (f.clone(), None))
                    .collect(),
            };
            for name in &binding.names {
                all = all
                    .iter()
                    .flat_map(|bound| extended(bound, name, binding, &pool))
                    .collect();
            }
        }
        all
    }

    fn piece(
        &mut self,
        ast: &Ast,
        place: Place,
        bound: &Bindings,
    ) -> Result<PieceId, ProductionError> {
        match (&ast.kind, place) {
            (AstKind::Name { name, quoted }, _) => self.name(ast, name, *quoted, place, bound),
            (AstKind::Call(name, arguments), Place::Numeric | Place::Flag) => {
                self.call(ast, name, arguments, place, bound)
            }
            (AstKind::Call(..), Place::Formula) => {
                let signal = self.piece(ast, Place::Flag, bound)?;
                Ok(self.push(Head::Flag, vec![signal]))
            }
            (AstKind::Minus(left, right), Place::Numeric) => {
                let sides = vec![
                    self.piece(left, Place::Numeric, bound)?,
                    self.piece(right, Place::Numeric, bound)?,
                ];
                Ok(self.push(Head::Derived(Function::Difference), sides))
            }
            (AstKind::Number(..), Place::Time) => {
                Ok(self.leaf(Value::Bound(Bound::After(duration(ast)?))))
            }
            (AstKind::Slot(_), Place::Time) => Ok(self.leaf(Value::Bound(Bound::Slot))),
            (AstKind::End, Place::Time) => Ok(self.leaf(Value::Bound(Bound::End))),
            (_, Place::Formula) => self.formula(ast, bound),
            _ => Err(misplaced(ast, place)),
        }
    }

    fn formula(&mut self, ast: &Ast, bound: &Bindings) -> Result<PieceId, ProductionError> {
        let place = Place::Formula;
        match &ast.kind {
            AstKind::Compare(left, comparison, right) => {
                let threshold = threshold(right)?;
                let signal = self.piece(left, Place::Numeric, bound)?;
                Ok(self.push(Head::Compare(*comparison, threshold), vec![signal]))
            }
            AstKind::Not(operand) => {
                let operand = self.piece(operand, place, bound)?;
                Ok(self.push(Head::Not, vec![operand]))
            }
            AstKind::And(operands) => self.connective(Head::And, operands, bound),
            AstKind::Or(operands) => self.connective(Head::Or, operands, bound),
            AstKind::Implies(left, right) => {
                let left = self.piece(left, place, bound)?;
                let left = self.push(Head::Not, vec![left]);
                let right = self.piece(right, place, bound)?;
                Ok(self.push(Head::Or, vec![left, right]))
            }
            AstKind::Throughout(bounds, operand) => {
                let mut parts = self.window(bounds, bound)?;
                parts.push(self.piece(operand, place, bound)?);
                Ok(self.push(Head::Throughout, parts))
            }
            AstKind::Sometime(bounds, operand) => {
                let mut parts = self.window(bounds, bound)?;
                parts.push(self.piece(operand, place, bound)?);
                Ok(self.push(Head::Sometime, parts))
            }
            AstKind::Until(left, bounds, right) => {
                let mut parts = vec![self.piece(left, place, bound)?];
                parts.extend(self.window(bounds, bound)?);
                parts.push(self.piece(right, place, bound)?);
                Ok(self.push(Head::Until, parts))
            }
            _ => Err(misplaced(ast, place)),
        }
    }

    fn connective(
        &mut self,
        head: Head,
        operands: &[Ast],
        bound: &Bindings,
    ) -> Result<PieceId, ProductionError> {
        let parts = operands
            .iter()
            .map(|operand| self.piece(operand, Place::Formula, bound))
            .collect::<Result<_, _>>()?;
        Ok(self.push(head, parts))
    }

    fn window(
        &mut self,
        bounds: &[Ast; 2],
        bound: &Bindings,
    ) -> Result<Vec<PieceId>, ProductionError> {
        let parts = vec![
            self.piece(&bounds[0], Place::Time, bound)?,
            self.piece(&bounds[1], Place::Time, bound)?,
        ];
        if let [
            Head::Leaf(Value::Bound(lower)),
            Head::Leaf(Value::Bound(upper)),
        ] = [&self.pieces[parts[0]].head, &self.pieces[parts[1]].head]
        {
            Window::new(*lower, *upper).map_err(|error| {
                let span = bounds[0].span.start..bounds[1].span.end;
                TextError::new(error.to_string(), span, "this window cannot be")
            })?;
        }
        Ok(parts)
    }

    fn name(
        &mut self,
        ast: &Ast,
        name: &str,
        quoted: bool,
        place: Place,
        bound: &Bindings,
    ) -> Result<PieceId, ProductionError> {
        if !quoted && let Some(rule) = self.grammar.rule(name) {
            return self.rule(rule, place);
        }
        if place == Place::Formula {
            let signal = self.name(ast, name, quoted, Place::Flag, bound)?;
            return Ok(self.push(Head::Flag, vec![signal]));
        }
        if place == Place::Time {
            let duration = match name {
                "short" => self.palette.short,
                "long" => self.palette.long,
                "hold" => self.palette.hold,
                _ => return Err(misplaced(ast, place)),
            };
            return Ok(self.leaf(Value::Bound(Bound::After(duration))));
        }
        let kind = match place {
            Place::Numeric => Kind::Numeric,
            _ => Kind::Flag,
        };
        let signals: Vec<Signal> = match (bound.get(name), name, quoted, kind) {
            (Some(signal), _, false, _) => vec![signal.clone()],
            (_, "CHANNEL", false, Kind::Numeric) => self
                .palette
                .channels
                .iter()
                .map(|(signal, _)| signal.clone())
                .collect(),
            (_, "FLAG", false, Kind::Flag) => self.palette.flags.clone(),
            (_, _, true, kind) => vec![Signal::Recorded {
                name: name.into(),
                kind,
            }],
            _ => return Err(misplaced(ast, place)),
        };
        if signals.iter().any(|signal| signal.kind() != kind) {
            return Err(misplaced(ast, place));
        }
        let choices = signals
            .into_iter()
            .map(|s| self.leaf(Value::Signal(s)))
            .collect();
        Ok(self.push(Head::Choice(choices), Vec::new()))
    }

    fn call(
        &mut self,
        ast: &Ast,
        name: &str,
        arguments: &[Ast],
        place: Place,
        bound: &Bindings,
    ) -> Result<PieceId, ProductionError> {
        let shape = called_function(name, arguments.len(), &ast.span)?;
        let fits = match place {
            Place::Numeric => shape.result == Kind::Numeric,
            _ => shape.result == Kind::Flag,
        };
        if !fits {
            return Err(misplaced(ast, place));
        }
        if let Some(length) = arguments.get(shape.arguments.len())
            && matches!(length.kind, AstKind::Number(..))
        {
            window_length(length)?;
        }
        let places = shape.arguments.iter().map(|kind| match kind {
            Kind::Numeric => Place::Numeric,
            Kind::Flag => Place::Flag,
        });
        let parts = arguments
            .iter()
            .zip(places.chain([Place::Time]))
            .map(|(argument, place)| self.piece(argument, place, bound))
            .collect::<Result<_, _>>()?;
        Ok(self.push(Head::Derived(shape.function), parts))
    }
}

/// A binding with one more name, for each signal that it can stand for.
fn extended(
    bound: &Bindings,
    name: &str,
    binding: &Binding,
    pool: &[(Signal, Option<&str>)],
) -> Vec<Bindings> {
    let position = |signal: &Signal| pool.iter().position(|(other, _)| other == signal);
    let earlier: Vec<usize> = binding
        .names
        .iter()
        .filter_map(|name| position(bound.get(name)?))
        .collect();
    let allowed = |candidate: usize| {
        earlier.iter().all(|other| {
            candidate != *other
                && (!binding.unordered
                    || (candidate > *other && pool[candidate].1 == pool[*other].1))
        })
    };
    (0..pool.len())
        .filter(|candidate| allowed(*candidate))
        .map(|candidate| {
            let mut more = bound.clone();
            more.insert(name.to_owned(), pool[candidate].0.clone());
            more
        })
        .collect()
}

fn misplaced(ast: &Ast, place: Place) -> TextError {
    let needed = match place {
        Place::Formula => "a formula",
        Place::Numeric => "a numeric channel",
        Place::Flag => "a flag",
        Place::Time => "a duration",
    };
    TextError::new(
        format!("{needed} is needed here"),
        ast.span.clone(),
        format!("this is not {needed}"),
    )
}
