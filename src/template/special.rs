//! When a template is another one with a slot fixed.

use super::atom::{Atom, Threshold};
use super::formula::{Formula, Node};
use super::window::{Bound, Window};

/// Operands of a connective up to which all orders are tried.
const MOST_OPERANDS: usize = 5;

/// Whether one template is another with some of its slots fixed: at a number,
/// or, for the bound of a window, at `end`.
pub fn is_special_case(special: &Formula, general: &Formula) -> bool {
    special.slots().len() < general.slots().len() && fits(special, general)
}

fn fits(special: &Formula, general: &Formula) -> bool {
    if special == general {
        return true;
    }
    match (special.node(), general.node()) {
        (Node::Atom(a), Node::Atom(b)) => atom_fits(a, b),
        (Node::And(a), Node::And(b)) | (Node::Or(a), Node::Or(b)) => {
            a.len() == b.len()
                && a.len() <= MOST_OPERANDS
                && operands_fit(a, b, &mut vec![false; b.len()])
        }
        (Node::Throughout(v, f), Node::Throughout(w, g))
        | (Node::Sometime(v, f), Node::Sometime(w, g)) => window_fits(*v, *w) && fits(f, g),
        (Node::Until(v, f, g), Node::Until(w, h, k)) => {
            window_fits(*v, *w) && fits(f, h) && fits(g, k)
        }
        // Over no window at all: the bound fixed at nothing.
        (_, Node::Throughout(w, g) | Node::Sometime(w, g)) => {
            let shrinks = matches!(w.lower(), Bound::After(low) if low.is_zero())
                && w.upper() == Bound::Slot
                && special.temporal_depth() == 0;
            shrinks && fits(special, g)
        }
        _ => false,
    }
}

/// Whether the operands of one fit those of the other in some order.
fn operands_fit(special: &[Formula], general: &[Formula], taken: &mut Vec<bool>) -> bool {
    let Some((first, rest)) = special.split_first() else {
        return true;
    };
    for at in 0..general.len() {
        if !taken[at] && fits(first, &general[at]) {
            taken[at] = true;
            if operands_fit(rest, general, taken) {
                return true;
            }
            taken[at] = false;
        }
    }
    false
}

fn atom_fits(special: &Atom, general: &Atom) -> bool {
    match (special, general) {
        (
            Atom::Compare {
                signal: x,
                comparison: one,
                threshold: Threshold::Number(..),
            },
            Atom::Compare {
                signal: y,
                comparison: other,
                threshold: Threshold::Slot,
            },
        ) => x == y && one == other,
        _ => false,
    }
}

fn window_fits(special: Window, general: Window) -> bool {
    let fits = |a: Bound, b: Bound| a == b || b == Bound::Slot;
    fits(special.lower(), general.lower()) && fits(special.upper(), general.upper())
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::template::parse;

    #[test]
    fn a_fixed_slot_makes_a_special_case() {
        for (special, general, expected) in [
            (
                "throughout [0, end] (x <= ?)",
                "throughout [0, ?] (x <= ?)",
                true,
            ),
            (
                "throughout [0, 2 s] (x <= ?)",
                "throughout [0, ?] (x <= ?)",
                true,
            ),
            (
                "throughout [0, end] (x <= ?)",
                "throughout [?, end] (x <= ?)",
                true,
            ),
            ("x <= ?", "sometime [0, ?] (x <= ?)", true),
            ("y <= ? and x <= 3", "x <= ? and y <= ?", true),
            (
                "throughout [0, ?] (x <= ?)",
                "throughout [0, end] (x <= ?)",
                false,
            ),
            (
                "sometime [0, end] (x <= ?)",
                "throughout [0, ?] (x <= ?)",
                false,
            ),
            ("x <= ?", "x <= ?", false),
            ("x <= 3 and x <= 4", "x <= ? and y <= ?", false),
        ] {
            let (a, b) = (parse(special).unwrap(), parse(general).unwrap());
            assert_eq!(is_special_case(&a, &b), expected, "{special} of {general}");
        }
    }
}
