//! The tree as written: names, spans and all the sugar, before anything is
//! known about what a name means.
//!
//! Templates and grammar files share it. The analysed form is
//! [`super::formula`]; [`super::analyse`] leads from here to there.

use std::ops::Range;

use super::atom::Comparison;

/// A piece of a text and what it says.
#[derive(Debug, Clone, PartialEq)]
pub struct Ast {
    /// What it says.
    pub kind: AstKind,
    /// The bytes of the text it was made from.
    pub span: Range<usize>,
}

/// What a piece of a text can say.
#[derive(Debug, Clone, PartialEq)]
pub enum AstKind {
    /// A name: of a channel, a flag, or (in a grammar) a rule or binding.
    /// `quoted` names are never anything but channels and flags.
    Name {
        /// The name.
        name: String,
        /// Whether it stood in double quotes.
        quoted: bool,
    },
    /// A number with its unit.
    Number(f64, Option<String>),
    /// `?` or `?name`.
    Slot(Option<String>),
    /// `end`.
    End,
    /// `name(argument, ...)`.
    Call(String, Vec<Ast>),
    /// `left - right`.
    Minus(Box<Ast>, Box<Ast>),
    /// `left <= right` and its kin.
    Compare(Box<Ast>, Comparison, Box<Ast>),
    /// `not operand`.
    Not(Box<Ast>),
    /// `left and right and ...`
    And(Vec<Ast>),
    /// `left or right or ...`
    Or(Vec<Ast>),
    /// `left implies right`, grouping to the right.
    Implies(Box<Ast>, Box<Ast>),
    /// `throughout [lower, upper] operand`.
    Throughout(Box<[Ast; 2]>, Box<Ast>),
    /// `sometime [lower, upper] operand`.
    Sometime(Box<[Ast; 2]>, Box<Ast>),
    /// `left until [lower, upper] right`.
    Until(Box<Ast>, Box<[Ast; 2]>, Box<Ast>),
}

impl AstKind {
    /// The piece with its place.
    pub fn at(self, span: Range<usize>) -> Ast {
        Ast { kind: self, span }
    }
}
