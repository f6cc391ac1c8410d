//! The table of equalities that the normaliser applies: what `equal` gives as
//! reasons, and what the tests judge.
//!
//! Each has passed the brute force (`tests/equivalence.rs`, and at length
//! `benchmarks/equivalence.rs`). G is `throughout`, F is `sometime`; a fact in a
//! condition is one that class data hold. Each rule without `until` has a dual
//! (and/or, G/F, weak/strong, stays true/stays false swapped), applied under the
//! dual condition and counted with it.

/// Where an equality holds.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Place {
    /// Wherever the formula stands: such classes are united in the e-graph.
    Anywhere,
    /// Where it stands outermost only.
    Outermost,
}

/// One equality.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct RuleText {
    /// Its name.
    pub name: &'static str,
    /// What is replaced, and by what.
    pub sides: &'static str,
    /// When it holds.
    pub condition: &'static str,
    /// Why it holds.
    pub reason: &'static str,
    /// Where it holds.
    pub place: Place,
}

/// The rules.
pub const RULES: &[RuleText] = &[
    RuleText {
        name: "order",
        sides: "f and g = g and f; nested `and` is flat",
        condition: "always",
        reason: "pointwise in every reading",
        place: Place::Anywhere,
    },
    RuleText {
        name: "constants",
        sides: "f and true = f; f and false = false; G[a,end] true = true; G[0,b] false = \
         false",
        condition: "always",
        reason: "true and false are so at every instant of the record; beyond it they read \
         as every formula does",
        place: Place::Anywhere,
    },
    RuleText {
        name: "repeat",
        sides: "f and f = f",
        condition: "the family is closed under `and` (dual: under `or`)",
        reason: "two members together are a member again",
        place: Place::Anywhere,
    },
    RuleText {
        name: "absorb",
        sides: "f and g = f",
        condition: "every member of f implies every member of g, in all three verdicts",
        reason: "pointwise",
        place: Place::Anywhere,
    },
    RuleText {
        name: "opposed",
        sides: "f and g = false",
        condition: "no member of f is weakly true where one of g is (dual: or strongly)",
        reason: "a contradiction at every instant of the record",
        place: Place::Anywhere,
    },
    RuleText {
        name: "opposed-part",
        sides: "f and (g or h) = f and g",
        condition: "f and h are opposed",
        reason: "h cannot help where f holds",
        place: Place::Anywhere,
    },
    RuleText {
        name: "modular",
        sides: "f and (g or h) = h or (f and g)",
        condition: "h implies f; or h is f, and its members are nested",
        reason: "distribution, where f and h is h",
        place: Place::Anywhere,
    },
    RuleText {
        name: "spread",
        sides: "G[a,b] f and G[a,b] g = G[a,b](f and g)",
        condition: "no slot in the window",
        reason: "pointwise",
        place: Place::Anywhere,
    },
    RuleText {
        name: "touching",
        sides: "G[a,b] f and G[c,d] f = G[a,d] f",
        condition: "f has one member; a <= c <= b <= d are numbers",
        reason: "the windows cover one another's gap",
        place: Place::Anywhere,
    },
    RuleText {
        name: "until-spread",
        sides: "f until g or f until h = f until (g or h); f until h and g until h = (f \
         and g) until h",
        condition: "one window without a slot; the common side has one member",
        reason: "one instant serves both",
        place: Place::Anywhere,
    },
    RuleText {
        name: "until-beside",
        sides: "h or (f until [0,b] g) = h or g, where f implies h; h and (f until [0,b] \
         g) = h and g, where h and f are opposed",
        condition: "g reads strong outermost, f or h weak; with `end` the readings agree",
        reason: "if g comes later, f holds now",
        place: Place::Anywhere,
    },
    RuleText {
        name: "now",
        sides: "G[0,0] f = f",
        condition: "f outermost reads as in the weak reading (dual: strong)",
        reason: "one instant",
        place: Place::Anywhere,
    },
    RuleText {
        name: "nest",
        sides: "G[a,b] G[c,d] f = G[a+c,b+d] f",
        condition: "bounds are numbers of steps; b may be `end`",
        reason: "instants of instants; beyond the record nothing is added",
        place: Place::Anywhere,
    },
    RuleText {
        name: "nest-slots",
        sides: "G[?,end] G[?,end] f = G[?,end] f; G[a,end] G[0,?] f = G[a,end] f; G[0,end] \
         G[?,end] f = G[?,end] f; G[0,?] G[0,?] f = G[0,?] f",
        condition: "always",
        reason: "every instant is asked anyway",
        place: Place::Anywhere,
    },
    RuleText {
        name: "nest-order",
        sides: "G[a,b] G[c,d] f = G[c,d] G[a,b] f",
        condition: "both windows bounded",
        reason: "both read f in the reading in which they stand",
        place: Place::Anywhere,
    },
    RuleText {
        name: "strip",
        sides: "G[a,end](f and G[0,d] g) = G[a,end](f and g)",
        condition: "d a number, a slot or `end`",
        reason: "every instant is asked anyway",
        place: Place::Anywhere,
    },
    RuleText {
        name: "fixed",
        sides: "G[a,end](f or L) = (G[a,end] f) or L; the same for the right side of \
         `until` with `end`",
        condition: "L is the same at all instants of the record, in all verdicts",
        reason: "pointwise",
        place: Place::Anywhere,
    },
    RuleText {
        name: "stays",
        sides: "G[0,end] X = X; G[0,b](f and X) = (G[0,b] f) and X",
        condition: "X, once true, stays true; outermost it reads weak; with `end` all readings \
         agree",
        reason: "X now is X later",
        place: Place::Anywhere,
    },
    RuleText {
        name: "until-last",
        sides: "G[0,end] D = D at the last instant; G[a,end](f and D) likewise",
        condition: "D, once false, stays false",
        reason: "the last instant decides",
        place: Place::Anywhere,
    },
    RuleText {
        name: "until-always",
        sides: "G[0,end](f until [0,b] g) = G[0,end](f or g) and G[0,end] F[0,b] g, where \
         g has one member; G[0,end](D until [0,end] g) = D until [0,end] G[0,end] \
         g, where D, once false, stays false",
        condition: "with `end` the readings of g agree",
        reason: "the next g is waited for at every instant",
        place: Place::Anywhere,
    },
    RuleText {
        name: "inner",
        sides: "G[0,end](f or G[0,b] f) = G[0,end] f",
        condition: "the members of f are nested; beside other operands: it has one",
        reason: "the stronger member decides",
        place: Place::Anywhere,
    },
    RuleText {
        name: "fallen",
        sides: "G[0,end](D or G[0,b] g) = G[0,end](D or g)",
        condition: "D, once false, stays false",
        reason: "once D fails, g must hold from then on",
        place: Place::Anywhere,
    },
    RuleText {
        name: "until-comes",
        sides: "F[a,end](f until [0,b] g) = F[a,end] g",
        condition: "always",
        reason: "the instant of g itself will do",
        place: Place::Anywhere,
    },
    RuleText {
        name: "until-now",
        sides: "f until [0,0] g = g",
        condition: "g outermost reads as in the strong reading",
        reason: "nothing must hold before the first instant",
        place: Place::Anywhere,
    },
    RuleText {
        name: "until-constant",
        sides: "true until [a,b] g = F[a,b] g; f until [0,b] true = true; f until [a,end] \
         false = false; false until [0,b] g = g",
        condition: "the last: g outermost reads strong, with `end` its readings agree",
        reason: "nothing to keep, or nothing to wait for",
        place: Place::Anywhere,
    },
    RuleText {
        name: "until-said",
        sides: "f until [0,b] g = g",
        condition: "f implies g; or b is `end` and g, once false, stays false, or g is \
         G[0,end] h with f implying h, or f stays and is opposed to g",
        reason: "waiting is of no use",
        place: Place::Anywhere,
    },
    RuleText {
        name: "until-strong",
        sides: "f until [0,end] g = false until [0,end] g; (F[0,b] g) until [0,end] g = \
         false until [0,end] F[0,b] g",
        condition: "f weakly true makes g strongly true; g has one member and one reading",
        reason: "only whether g is strongly true now matters",
        place: Place::Anywhere,
    },
    RuleText {
        name: "until-free",
        sides: "f until [0,b] g = F[0,b] g",
        condition: "f holds wherever g does not; or f is F[0,b] g; with `end` also: f is \
         F[0,end] h and g implies it (or h implies g: then g or f)",
        reason: "nothing can break off before the first g",
        place: Place::Anywhere,
    },
    RuleText {
        name: "until-stays",
        sides: "X until [a,b] g = X and F[a,b] g",
        condition: "X, once true, stays true; a > 0",
        reason: "X must hold now",
        place: Place::Anywhere,
    },
    RuleText {
        name: "until-or",
        sides: "(f or h) until [0,b] g = f until [0,b] g, where h implies g; (f and h) \
         until [0,b] g = f until [0,b] g, where h holds wherever g does not",
        condition: "g has one member; its readings or those of h agree",
        reason: "before the first g only f counts",
        place: Place::Anywhere,
    },
    RuleText {
        name: "until-nest",
        sides: "(f until [0,b] g) until [0,b] g = f until [0,b] g; f until [0,end] (f \
         until [0,b] g) = f until [0,end] g",
        condition: "g (or f) has one member; or b is `end` and the members of f are nested",
        reason: "one wait after another is one wait",
        place: Place::Anywhere,
    },
    RuleText {
        name: "last",
        sides: "the last instant of what is fixed is that itself",
        condition: "fixed: the same at all instants of the record, in all verdicts",
        reason: "it does not matter where one asks",
        place: Place::Anywhere,
    },
    RuleText {
        name: "last-window",
        sides: "at the last instant G[0,b] f is f, F[0,end] f is f, f until [0,end] g is \
         g; windows that lie beyond hold weakly and fail strongly",
        condition: "as the readings say",
        reason: "only one instant is left",
        place: Place::Anywhere,
    },
    RuleText {
        name: "last-part",
        sides: "at the last instant F[0,?] f is F[0,?] of f there",
        condition: "read weak (dual: strong)",
        reason: "only one instant is left",
        place: Place::Anywhere,
    },
    RuleText {
        name: "last-each",
        sides: "at the last instant `and` is `and` of its operands there",
        condition: "always",
        reason: "pointwise",
        place: Place::Anywhere,
    },
    RuleText {
        name: "last-reading",
        sides: "at the last instant read weak is read strong",
        condition: "the readings of f agree",
        reason: "no reading to choose",
        place: Place::Anywhere,
    },
    RuleText {
        name: "outermost-parts",
        sides: "rules for whole templates reach through `and` and `or`",
        condition: "always",
        reason: "a verdict of a connective is that of its operands",
        place: Place::Outermost,
    },
    RuleText {
        name: "outermost-absorb",
        sides: "G[0,end] f and G[a,b] f = G[0,end] f; f and G[0,b] f = G[0,b] f; G[0,b] f \
         and F[0,d] f = G[0,b] f",
        condition: "f has one member; it reads as the window does outermost",
        reason: "outermost a window is cut at the last instant",
        place: Place::Outermost,
    },
    RuleText {
        name: "outermost-opposed",
        sides: "f and g = false",
        condition: "they are opposed outermost",
        reason: "a contradiction",
        place: Place::Outermost,
    },
    RuleText {
        name: "outermost-stays",
        sides: "G[0,b] X = X",
        condition: "X, once true, stays true, and reads weak outermost",
        reason: "X now is X later",
        place: Place::Outermost,
    },
    RuleText {
        name: "outermost-fixed",
        sides: "G[0,b](f or L) = (G[0,b] f) or L",
        condition: "L is fixed",
        reason: "only instants of the record count",
        place: Place::Outermost,
    },
    RuleText {
        name: "outermost-said",
        sides: "f until [0,b] g = g",
        condition: "f weakly true makes g strongly true; or g, once false, stays false",
        reason: "waiting is of no use",
        place: Place::Outermost,
    },
    RuleText {
        name: "outermost-free",
        sides: "D until [0,b] g = F[0,b] g",
        condition: "D, once false, stays false, and g implies it",
        reason: "D holds before an instant at which it holds",
        place: Place::Outermost,
    },
];
