//! The template language: text, tree, analysed form, and back to text, JSON
//! and plain sentences.
//!
//! A template exists in two forms, and the difference matters:
//!
//! * [`Ast`] is **what was written**: spans, names, `implies`, `not`, brackets.
//!   It is what error messages point into and what grammar files are made of.
//! * [`Formula`] is **what it means**: negation normal form, anonymous slots,
//!   and facts (size, horizon, signals, the direction of each slot) that its
//!   constructors compute, so an ill-formed formula cannot be built. Equality,
//!   enumeration, equivalence and evaluation all work on this form.
//!
//! [`parse`] leads from text to formula; `Display` leads back, and printing
//! then parsing is the identity. [`to_json`] and [`from_json`] give the
//! versioned tagged tree; [`sentence`] says a formula in words.
//!
//! The words of the language are those of plain English and of the trade. What
//! a formula *means* on a trace is defined in `kernels::naive`.

mod analyse;
mod ast;
mod atom;
mod duration;
mod error;
mod formula;
mod function;
mod json;
mod parse;
mod print;
mod sentence;
mod signal;
mod slot;
mod special;
mod token;
mod window;

pub use analyse::{
    analyse, called_function, duration, parse, parse_signal, threshold, window_length,
};
pub use ast::{Ast, AstKind};
pub use atom::{Atom, Comparison, Threshold};
pub use duration::{Duration, TimeUnit};
pub use error::TextError;
pub use formula::{Formula, Node, UntilNotNegatable};
pub use function::{FUNCTIONS, Function, FunctionShape, Kind};
pub use json::{JsonError, from_json, to_json};
pub use parse::{Parser, parse_ast};
pub use sentence::{Words, sentence};
pub use signal::{Derivation, Signal};
pub use slot::{Direction, Slot, SlotKind, SlotValue};
pub use special::is_special_case;
pub use token::{RESERVED, Token, TokenKind, is_plain_name, tokenize};
pub use window::{Bound, Window, WindowError};
