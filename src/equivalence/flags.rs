//! Class data: facts about the family that a class stands for.
//!
//! All are facts about the meaning, known to hold or not known; so when two
//! classes turn out to be one, what is known of either is known of both.

use crate::template::{Bound, Window};

/// Facts about a family, as a set of bits.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Default)]
pub struct Flags(u8);

impl Flags {
    /// It has one member.
    pub const SINGLETON: Flags = Flags(1);
    /// Its members are nested.
    pub const CHAIN: Flags = Flags(2);
    /// With two members, their conjunction is a member.
    pub const MEET: Flags = Flags(4);
    /// With two members, their disjunction is a member.
    pub const JOIN: Flags = Flags(8);
    /// Outermost it reads as in the weak reading.
    pub const ROOT_WEAK: Flags = Flags(16);
    /// Outermost it reads as in the strong reading.
    pub const ROOT_STRONG: Flags = Flags(32);
    /// At instants of the record both readings agree.
    pub const SAME: Flags = Flags(64);

    const FAMILY: Flags = Flags(1 | 2 | 4 | 8);

    /// Whether all of these are known.
    pub fn has(self, other: Flags) -> bool {
        self.0 & other.0 == other.0
    }

    /// What is known of either.
    #[must_use]
    pub fn or(self, other: Flags) -> Flags {
        Flags(self.0 | other.0)
    }

    /// What is known of both.
    #[must_use]
    pub fn both(self, other: Flags) -> Flags {
        Flags(self.0 & other.0)
    }

    fn only(self, wanted: Flags) -> Flags {
        self.both(wanted)
    }

    /// An atom at samples that may be unknown: the readings may differ, and
    /// outermost it is read weak.
    pub fn atom(has_slot: bool) -> Flags {
        let family = if has_slot {
            Flags(2 | 4 | 8)
        } else {
            Flags::FAMILY
        };
        family.or(Flags::ROOT_WEAK)
    }

    /// `and` (or, with `disjunction`, `or`) of families.
    pub fn connective(parts: &[Flags], disjunction: bool) -> Flags {
        let everything = parts.iter().fold(Flags(127), |all, part| all.both(*part));
        let mut flags = everything.only(Flags(1 | 16 | 32 | 64));
        let closed = if disjunction {
            Flags::JOIN
        } else {
            Flags::MEET
        };
        flags = flags.or(everything.only(closed));
        let many: Vec<&Flags> = parts
            .iter()
            .filter(|part| !part.has(Flags::SINGLETON))
            .collect();
        match many.as_slice() {
            [] => flags.or(Flags::FAMILY),
            // With one member on all other sides, order and closure stay.
            [one] => flags.or(one.only(Flags(2 | 4 | 8))),
            _ => flags,
        }
    }

    /// `throughout` (or, with `existential`, `sometime`) over a family.
    pub fn window(window: Window, operand: Flags, existential: bool) -> Flags {
        let has_slot = [window.lower(), window.upper()].contains(&Bound::Slot);
        let family = match (has_slot, operand.has(Flags::SINGLETON)) {
            (true, true) => Flags(2 | 4 | 8),
            (true, false) => Flags(0),
            (false, true) => Flags::FAMILY,
            (false, false) => {
                let kept = if existential {
                    Flags::JOIN
                } else {
                    Flags::MEET
                };
                let mut flags = operand.only(Flags::CHAIN.or(kept));
                if operand.has(Flags::CHAIN) {
                    flags = flags.or(Flags(4 | 8));
                }
                flags
            }
        };
        family.or(Flags::reading(window, existential))
    }

    /// How the end of a record reads a windowed formula. With `end` the kind
    /// sets the reading, so all three are one; a bounded window outermost reads
    /// its operand by kind, as the weak (strong) reading does.
    fn reading(window: Window, existential: bool) -> Flags {
        if window.upper() == Bound::End {
            return Flags(16 | 32 | 64);
        }
        if existential {
            Flags::ROOT_STRONG
        } else {
            Flags::ROOT_WEAK
        }
    }

    /// `until` over families.
    pub fn until(window: Window, left: Flags, right: Flags) -> Flags {
        let has_slot = [window.lower(), window.upper()].contains(&Bound::Slot);
        let (one, other) = (left.has(Flags::SINGLETON), right.has(Flags::SINGLETON));
        let family = match (has_slot, one, other) {
            (true, true, true) => Flags(2 | 4 | 8),
            (true, _, _) => Flags(0),
            (false, true, true) => Flags::FAMILY,
            (false, false, true) => left.only(Flags(2 | 4)).or(chain_closure(left)),
            (false, true, false) => right.only(Flags(2 | 8)).or(chain_closure(right)),
            (false, false, false) => Flags(0),
        };
        let reading = match window.upper() {
            Bound::End => Flags(16 | 32 | 64),
            _ => Flags(0),
        };
        family.or(reading)
    }
}

/// Nested members are closed both ways.
fn chain_closure(flags: Flags) -> Flags {
    if flags.has(Flags::CHAIN) {
        Flags(4 | 8)
    } else {
        Flags(0)
    }
}
