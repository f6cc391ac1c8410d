//! Results for people and for other programs. Everything here turns the plain
//! data of `search::outcome` into text; nothing is computed again.

mod comparison;
mod terminal;

pub use comparison::comparison;
pub use terminal::{explanation, ranking};
