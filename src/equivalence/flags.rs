//! Class data: facts about the family that a class stands for.
//!
//! All are facts about the meaning, known to hold or not known; so when two
//! classes turn out to be one, what is known of either is known of both.
//! W, S and R are the weak, the strong and the outermost verdict.

use crate::template::{Bound, Window};

/// Facts about a family, as a set of bits.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Default)]
pub struct Flags(u16);

impl Flags {
    /// It has one member.
    pub const SINGLETON: Flags = Flags(1);
    /// Its members are nested.
    pub const CHAIN: Flags = Flags(2);
    /// With two members, their conjunction is a member.
    pub const MEET: Flags = Flags(4);
    /// With two members, their disjunction is a member.
    pub const JOIN: Flags = Flags(8);
    /// Outermost it reads as in the weak reading: R = W.
    pub const ROOT_WEAK: Flags = Flags(16);
    /// Outermost it reads as in the strong reading: R = S.
    pub const ROOT_STRONG: Flags = Flags(32);
    /// At instants of the record both readings agree: W = S.
    pub const SAME: Flags = Flags(64);
    /// On the record, once true it stays true, in W and in S.
    pub const UP: Flags = Flags(128);
    /// On the record, once false it stays false, in W and in S.
    pub const DOWN: Flags = Flags(256);

    /// All facts about the number and order of members.
    pub const FAMILY: Flags = Flags(1 | 2 | 4 | 8);
    /// All three verdicts agree on the record.
    pub const STATE: Flags = Flags(16 | 32 | 64);
    /// A state that is the same at all instants of the record.
    pub const FIXED: Flags = Flags(16 | 32 | 64 | 128 | 256);
    /// Everything that can be known.
    pub const ALL: Flags = Flags(511);

    /// Whether all of these are known.
    pub fn has(self, other: Flags) -> bool {
        self.0 & other.0 == other.0
    }

    /// What is known of either.
    #[must_use]
    pub const fn or(self, other: Flags) -> Flags {
        Flags(self.0 | other.0)
    }

    /// What is known of both.
    #[must_use]
    pub const fn both(self, other: Flags) -> Flags {
        Flags(self.0 & other.0)
    }

    /// An atom. Of a signal that is known at every sample all verdicts are one;
    /// else the readings may differ, and outermost it is read weak.
    pub fn atom(has_slot: bool, is_known: bool) -> Flags {
        let family = if has_slot {
            Flags(2 | 4 | 8)
        } else {
            Flags::FAMILY
        };
        family.or(if is_known {
            Flags::STATE
        } else {
            Flags::ROOT_WEAK
        })
    }

    /// `and` (or, with `disjunction`, `or`) of families.
    pub fn connective(parts: &[Flags], disjunction: bool) -> Flags {
        let everything = parts.iter().fold(Flags::ALL, |all, part| all.both(*part));
        let closed = if disjunction {
            Flags::JOIN
        } else {
            Flags::MEET
        };
        let kept = Flags::SINGLETON.or(Flags::FIXED).or(closed);
        let flags = everything.both(kept);
        let mut many = parts.iter().filter(|part| !part.has(Flags::SINGLETON));
        match (many.next(), many.next()) {
            (None, _) => flags.or(Flags::FAMILY),
            // With one member on all other sides, order and closure stay.
            (Some(one), None) => flags.or(one.both(Flags(2 | 4 | 8))),
            _ => flags,
        }
    }

    /// `throughout` (or, with `existential`, `sometime`) over a family.
    pub fn window(window: Window, operand: Flags, existential: bool) -> Flags {
        let family = match (has_slot(window), operand.has(Flags::SINGLETON)) {
            (true, true) => Flags(2 | 4 | 8),
            (true, false) => Flags(0),
            (false, true) => Flags::FAMILY,
            (false, false) => {
                let kept = if existential {
                    Flags::JOIN
                } else {
                    Flags::MEET
                };
                operand
                    .both(Flags::CHAIN.or(kept))
                    .or(chain_closure(operand))
            }
        };
        family.or(Flags::reading(window, operand, existential))
    }

    /// How the end of a record reads a windowed formula. With `end` the kind
    /// sets the reading, so all three are one; a bounded window outermost reads
    /// its operand by kind, as the weak (strong) reading does.
    fn reading(window: Window, operand: Flags, existential: bool) -> Flags {
        let (root, own, other) = if existential {
            (Flags::ROOT_STRONG, Flags::DOWN, Flags::UP)
        } else {
            (Flags::ROOT_WEAK, Flags::UP, Flags::DOWN)
        };
        if window.upper() != Bound::End {
            return root;
        }
        // What must hold from now on can only become true; if the operand can
        // only become false, all hangs on the last instant.
        let fixed = starts_now(window) && operand.has(other);
        let moves = if fixed { own.or(other) } else { own };
        Flags::STATE.or(moves)
    }

    /// `until` over families.
    pub fn until(window: Window, left: Flags, right: Flags) -> Flags {
        let (one, other) = (left.has(Flags::SINGLETON), right.has(Flags::SINGLETON));
        let family = match (has_slot(window), one, other) {
            (true, true, true) => Flags(2 | 4 | 8),
            (true, _, _) => Flags(0),
            (false, true, true) => Flags::FAMILY,
            (false, false, true) => left
                .both(Flags::CHAIN.or(Flags::MEET))
                .or(chain_closure(left)),
            (false, true, false) => right
                .both(Flags::CHAIN.or(Flags::JOIN))
                .or(chain_closure(right)),
            (false, false, false) => Flags(0),
        };
        let reading = match window.upper() {
            // An end that stays can be reached ever more easily.
            Bound::End if starts_now(window) => Flags::STATE.or(right.both(Flags::UP)),
            Bound::End => Flags::STATE,
            // Outermost the left side is read weak, the right one strong.
            _ if left.has(Flags::SAME) => Flags::ROOT_STRONG,
            _ => Flags(0),
        };
        family.or(reading)
    }

    /// The value of a family at the last instant, which does not depend on
    /// where it is asked.
    pub fn last(operand: Flags) -> Flags {
        operand.both(Flags::FAMILY).or(Flags::FIXED)
    }
}

fn has_slot(window: Window) -> bool {
    [window.lower(), window.upper()].contains(&Bound::Slot)
}

fn starts_now(window: Window) -> bool {
    matches!(window.lower(), Bound::After(low) if low.is_zero())
}

/// Nested members are closed both ways.
fn chain_closure(flags: Flags) -> Flags {
    if flags.has(Flags::CHAIN) {
        Flags(4 | 8)
    } else {
        Flags(0)
    }
}
