//! The table of equalities that the normaliser applies. Every one holds in any
//! place (weak, strong and outermost), and has passed the brute force in
//! `tests/equivalence.rs`, which runs instances of each row by its name.

/// One equality.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct RuleText {
    /// Its name.
    pub name: &'static str,
    /// What is replaced, and by what. G is `throughout`, F is `sometime`.
    pub sides: &'static str,
    /// When it holds.
    pub condition: &'static str,
    /// Why it holds.
    pub reason: &'static str,
}

/// The rules. Each has a dual with and/or, G/F swapped, applied under the dual
/// condition and counted with it.
pub const RULES: &[RuleText] = &[
    RuleText {
        name: "order",
        sides: "f and g = g and f; nested `and` is flat",
        condition: "always",
        reason: "pointwise in every reading",
    },
    RuleText {
        name: "repeat",
        sides: "f and f = f",
        condition: "the family is closed under `and` (dual: under `or`)",
        reason: "two members together are a member again",
    },
    RuleText {
        name: "absorb",
        sides: "f and (f or g) = f",
        condition: "f has one member",
        reason: "pointwise",
    },
    RuleText {
        name: "swap",
        sides: "f and (f or g) = f or (f and g)",
        condition: "the members of f are nested",
        reason: "of two nested members the smaller decides",
    },
    RuleText {
        name: "nest",
        sides: "G[a,b] G[c,d] f = G[a+c,b+d] f",
        condition: "bounds are numbers in one unit of time; b and d may both be `end`, or b alone",
        reason: "instants of instants; beyond the record nothing is added",
    },
    RuleText {
        name: "nest-slots",
        sides: "G[?,end] G[?,end] f = G[?,end] f; G[a,end] G[0,?] f = G[a,end] f; \
                G[0,end] G[?,end] f = G[?,end] f; G[0,?] G[0,?] f = G[0,?] f",
        condition: "always",
        reason: "every instant is asked anyway",
    },
    RuleText {
        name: "strip",
        sides: "G[a,end](f and G[0,d] g) = G[a,end](f and g)",
        condition: "d a number, a slot or `end`",
        reason: "every instant is asked anyway",
    },
    RuleText {
        name: "spread",
        sides: "G[a,b] f and G[a,b] g = G[a,b](f and g)",
        condition: "no slot in the window",
        reason: "pointwise",
    },
    RuleText {
        name: "inner",
        sides: "G[0,end](f or G[0,b] f) = G[0,end] f",
        condition: "the members of f are nested",
        reason: "the stronger member decides",
    },
    RuleText {
        name: "now",
        sides: "G[0,0] f = f",
        condition: "f outermost reads as in the weak reading (dual: strong)",
        reason: "one instant",
    },
    RuleText {
        name: "until-now",
        sides: "f until [0,0] g = g",
        condition: "g outermost reads as in the strong reading",
        reason: "nothing must hold before the first instant",
    },
    RuleText {
        name: "until-or",
        sides: "(f or g) until [0,b] g = f until [0,b] g",
        condition: "g has one member, and reads the same weak and strong",
        reason: "before the first g only f can help",
    },
    RuleText {
        name: "until-comes",
        sides: "F[a,end](f until [0,b] g) = F[a,end] g",
        condition: "always",
        reason: "the instant of g itself will do",
    },
    RuleText {
        name: "levels",
        sides: "x <= 1 and x <= 2 = x <= 1",
        condition: "atoms without slots",
        reason: "the order of numbers",
    },
];
