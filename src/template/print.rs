//! The text form of the analysed form. Printing then parsing is the identity.

use std::fmt;

use super::atom::{Atom, Threshold};
use super::formula::{Formula, Node};
use super::token::is_plain_name;
use super::window::{Bound, Window};

/// Writes a name, in double quotes where it needs them.
pub(super) fn write_name(f: &mut fmt::Formatter<'_>, name: &str) -> fmt::Result {
    if is_plain_name(name) {
        write!(f, "{name}")
    } else {
        write!(f, "\"{name}\"")
    }
}

/// How tightly the place where a formula is printed binds; a formula that
/// binds less tightly is put in parentheses.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
enum Binding {
    Implies,
    Or,
    And,
    Until,
    Unary,
}

struct Printer {
    next_slot: usize,
}

impl fmt::Display for Formula {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        Printer { next_slot: 1 }.formula(f, self, Binding::Implies)
    }
}

impl Printer {
    fn formula(
        &mut self,
        f: &mut fmt::Formatter<'_>,
        formula: &Formula,
        place: Binding,
    ) -> fmt::Result {
        let parentheses = binding(formula) < place || is_bare_comparison(formula, place);
        if parentheses {
            write!(f, "(")?;
        }
        self.bare(f, formula)?;
        if parentheses {
            write!(f, ")")?;
        }
        Ok(())
    }

    fn bare(&mut self, f: &mut fmt::Formatter<'_>, formula: &Formula) -> fmt::Result {
        if let Some((cause, effect)) = implication(formula) {
            write!(f, "{cause} implies ")?;
            return self.formula(f, effect, Binding::Implies);
        }
        match formula.node() {
            Node::Atom(atom) => self.atom(f, atom),
            Node::And(operands) => self.joined(f, operands, " and ", Binding::Until),
            Node::Or(operands) => self.joined(f, operands, " or ", Binding::And),
            Node::Throughout(window, operand) => {
                write!(f, "throughout ")?;
                self.window(f, window)?;
                write!(f, " ")?;
                self.operand(f, operand)
            }
            Node::Sometime(window, operand) => {
                write!(f, "sometime ")?;
                self.window(f, window)?;
                write!(f, " ")?;
                self.operand(f, operand)
            }
            Node::Until(window, left, right) => {
                self.formula(f, left, Binding::Unary)?;
                write!(f, " until ")?;
                self.window(f, window)?;
                write!(f, " ")?;
                self.formula(f, right, Binding::Unary)
            }
        }
    }

    /// The operand of a temporal operator: another temporal operator gets
    /// parentheses too, because they help a person read.
    fn operand(&mut self, f: &mut fmt::Formatter<'_>, operand: &Formula) -> fmt::Result {
        if matches!(operand.node(), Node::Throughout(..) | Node::Sometime(..)) {
            write!(f, "(")?;
            self.bare(f, operand)?;
            return write!(f, ")");
        }
        self.formula(f, operand, Binding::Unary)
    }

    fn joined(
        &mut self,
        f: &mut fmt::Formatter<'_>,
        operands: &[Formula],
        word: &str,
        place: Binding,
    ) -> fmt::Result {
        for (position, operand) in operands.iter().enumerate() {
            if position > 0 {
                write!(f, "{word}")?;
            }
            self.formula(f, operand, place)?;
        }
        Ok(())
    }

    fn atom(&mut self, f: &mut fmt::Formatter<'_>, atom: &Atom) -> fmt::Result {
        match atom {
            Atom::Flag { signal, negated } => {
                write!(f, "{}{signal}", if *negated { "not " } else { "" })
            }
            Atom::Compare {
                signal,
                comparison,
                threshold,
            } => {
                write!(f, "{signal} {} ", comparison.sign())?;
                match threshold {
                    Threshold::Number(value, None) => write!(f, "{value}"),
                    Threshold::Number(value, Some(unit)) => write!(f, "{value} {unit}"),
                    Threshold::Slot => self.slot(f),
                }
            }
        }
    }

    fn window(&mut self, f: &mut fmt::Formatter<'_>, window: &Window) -> fmt::Result {
        write!(f, "[")?;
        self.bound(f, window.lower())?;
        write!(f, ", ")?;
        self.bound(f, window.upper())?;
        write!(f, "]")
    }

    fn bound(&mut self, f: &mut fmt::Formatter<'_>, bound: Bound) -> fmt::Result {
        match bound {
            Bound::After(duration) => write!(f, "{duration}"),
            Bound::Slot => self.slot(f),
            Bound::End => write!(f, "end"),
        }
    }

    fn slot(&mut self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "?{}", self.next_slot)?;
        self.next_slot += 1;
        Ok(())
    }
}

fn binding(formula: &Formula) -> Binding {
    if implication(formula).is_some() {
        return Binding::Implies;
    }
    match formula.node() {
        Node::Or(_) => Binding::Or,
        Node::And(_) => Binding::And,
        Node::Until(..) => Binding::Until,
        Node::Atom(_) | Node::Throughout(..) | Node::Sometime(..) => Binding::Unary,
    }
}

/// A comparison directly under a temporal operator is put in parentheses: they
/// are not needed, but the eye wants them.
fn is_bare_comparison(formula: &Formula, place: Binding) -> bool {
    place == Binding::Unary && matches!(formula.node(), Node::Atom(Atom::Compare { .. }))
}

/// An `or` of two whose first operand is a negated flag reads better as an
/// implication: the flag that causes, and the effect.
pub(super) fn implication(formula: &Formula) -> Option<(&super::Signal, &Formula)> {
    let Node::Or(operands) = formula.node() else {
        return None;
    };
    let [first, effect] = operands.as_slice() else {
        return None;
    };
    match (first.node(), effect.node()) {
        (_, Node::Atom(Atom::Flag { negated: true, .. })) => None,
        (
            Node::Atom(Atom::Flag {
                signal,
                negated: true,
            }),
            _,
        ) => Some((signal, effect)),
        _ => None,
    }
}
