//! Checks of a grammar that need no data: names, reach, recursion with a base.

use std::ops::Range;

use petgraph::algo::kosaraju_scc;
use petgraph::graph::{DiGraph, NodeIndex};
use petgraph::visit::Dfs;

use super::file::Rule;
use crate::template::{Ast, AstKind, Function, TextError};

/// Words that stand for durations taken from the data.
pub(super) const DURATIONS: [&str; 3] = ["short", "long", "hold"];

/// What the checks found out.
pub(super) struct Checked {
    pub(super) goal: usize,
    pub(super) warnings: Vec<String>,
}

/// Checks the rules of a grammar.
pub(super) fn check(rules: &[Rule]) -> Result<Checked, TextError> {
    for (position, rule) in rules.iter().enumerate() {
        check_name(rule, &rules[..position])?;
        for alternative in &rule.alternatives {
            check_bindings(rule, rules, alternative)?;
        }
    }
    let goal = rules
        .iter()
        .position(|rule| rule.name == "goal")
        .ok_or_else(|| {
            let end = rules.last().map_or(0, |rule| rule.span.end);
            TextError::new(
                "there is no rule `goal`",
                0..end.min(1),
                "a rule called `goal` is needed",
            )
            .with_help("`goal` is the rule that templates start from")
        })?;
    check_graph(rules, goal)?;
    Ok(Checked {
        goal,
        warnings: rules.iter().flat_map(constant_shapes).collect(),
    })
}

fn check_name(rule: &Rule, before: &[Rule]) -> Result<(), TextError> {
    let name = rule.name.as_str();
    if before.iter().any(|other| other.name == name) {
        return Err(TextError::new(
            format!("the rule `{name}` is defined twice"),
            rule.span.clone(),
            "second definition",
        )
        .with_help("join the two with `|`"));
    }
    let taken = DURATIONS.contains(&name)
        || crate::template::RESERVED.contains(&name)
        || Function::from_name(name).is_some();
    if taken {
        return Err(TextError::new(
            format!("`{name}` is a word of the language and cannot name a rule"),
            rule.span.clone(),
            "choose another name",
        ));
    }
    Ok(())
}

fn check_bindings(
    rule: &Rule,
    rules: &[Rule],
    alternative: &super::file::Alternative,
) -> Result<(), TextError> {
    let mut bound: Vec<&str> = Vec::new();
    let used = names(&alternative.ast);
    for binding in &alternative.bindings {
        for name in &binding.names {
            let clash = rules.iter().any(|rule| rule.name == *name)
                || DURATIONS.contains(&name.as_str())
                || bound.contains(&name.as_str());
            if clash {
                return Err(TextError::new(
                    format!("the binding `{name}` has the name of something else"),
                    binding.span.clone(),
                    "choose another name",
                ));
            }
            if !used.iter().any(|(other, _)| other == name) {
                return Err(TextError::new(
                    format!("the binding `{name}` is not used in its alternative"),
                    binding.span.clone(),
                    "remove it, or use it",
                ));
            }
            bound.push(name);
        }
    }
    for (name, span) in used {
        let known = bound.contains(&name.as_str())
            || rules.iter().any(|rule| rule.name == name)
            || DURATIONS.contains(&name.as_str())
            || matches!(name.as_str(), "CHANNEL" | "FLAG");
        if !known {
            return Err(unknown(&name, span, rule, rules, &bound));
        }
    }
    Ok(())
}

fn unknown(
    name: &str,
    span: Range<usize>,
    rule: &Rule,
    rules: &[Rule],
    bound: &[&str],
) -> TextError {
    let candidates = rules
        .iter()
        .map(|rule| rule.name.as_str())
        .chain(bound.iter().copied())
        .chain(DURATIONS)
        .chain(["CHANNEL", "FLAG"]);
    let nearest = candidates
        .filter(|other| distance(name, other) <= 1 + name.len() / 4)
        .min_by_key(|other| distance(name, other));
    let help = match nearest {
        Some(nearest) => format!("did you mean `{nearest}`?"),
        None => format!("a channel or flag of the data is written in quotes: \"{name}\""),
    };
    TextError::new(
        format!(
            "`{name}`, used in the rule `{}`, is no rule and no binding",
            rule.name
        ),
        span,
        "unknown name",
    )
    .with_help(help)
}

/// Names used in a tree, without quoted ones and names of functions.
fn names(ast: &Ast) -> Vec<(String, Range<usize>)> {
    let mut found = Vec::new();
    visit(ast, &mut |ast| {
        if let AstKind::Name {
            name,
            quoted: false,
        } = &ast.kind
        {
            found.push((name.clone(), ast.span.clone()));
        }
    });
    found
}

/// Calls `look` with every node of a tree.
pub(super) fn visit(ast: &Ast, look: &mut impl FnMut(&Ast)) {
    look(ast);
    match &ast.kind {
        AstKind::Name { .. } | AstKind::Number(..) | AstKind::Slot(_) | AstKind::End => {}
        AstKind::Call(_, parts) | AstKind::And(parts) | AstKind::Or(parts) => {
            parts.iter().for_each(|part| visit(part, look));
        }
        AstKind::Minus(left, right)
        | AstKind::Compare(left, _, right)
        | AstKind::Implies(left, right) => {
            visit(left, look);
            visit(right, look);
        }
        AstKind::Not(operand) => visit(operand, look),
        AstKind::Throughout(bounds, operand) | AstKind::Sometime(bounds, operand) => {
            bounds.iter().for_each(|part| visit(part, look));
            visit(operand, look);
        }
        AstKind::Until(left, bounds, right) => {
            visit(left, look);
            bounds.iter().for_each(|part| visit(part, look));
            visit(right, look);
        }
    }
}

/// Refuses rules that the goal cannot reach, and recursion without a base.
fn check_graph(rules: &[Rule], goal: usize) -> Result<(), TextError> {
    let mut graph: DiGraph<usize, ()> = DiGraph::new();
    let nodes: Vec<NodeIndex> = (0..rules.len()).map(|rule| graph.add_node(rule)).collect();
    let used = |alternative: &super::file::Alternative| -> Vec<usize> {
        names(&alternative.ast)
            .iter()
            .filter_map(|(name, _)| rules.iter().position(|rule| rule.name == *name))
            .collect()
    };
    for (from, rule) in rules.iter().enumerate() {
        for to in rule.alternatives.iter().flat_map(&used) {
            graph.update_edge(nodes[from], nodes[to], ());
        }
    }
    let mut reached = vec![false; rules.len()];
    let mut search = Dfs::new(&graph, nodes[goal]);
    while let Some(node) = search.next(&graph) {
        reached[graph[node]] = true;
    }
    if let Some(lost) = reached.iter().position(|reached| !reached) {
        return Err(TextError::new(
            format!(
                "the rule `{}` cannot be reached from `goal`",
                rules[lost].name
            ),
            rules[lost].span.clone(),
            "not used by any template",
        )
        .with_help("use it in another rule, or remove it"));
    }
    // A rule has a base when one of its alternatives uses only rules that do.
    let mut based = vec![false; rules.len()];
    let mut changed = true;
    while changed {
        changed = false;
        for (position, rule) in rules.iter().enumerate() {
            let has_base = |a| used(a).into_iter().all(|other| based[other]);
            if !based[position] && rule.alternatives.iter().any(has_base) {
                based[position] = true;
                changed = true;
            }
        }
    }
    if based.iter().all(|based| *based) {
        return Ok(());
    }
    // A rule may lack a base only because it uses another that does; the one
    // to mend lies on a cycle.
    let cycles = kosaraju_scc(&graph);
    let on_cycle = |node: NodeIndex| {
        graph.contains_edge(node, node)
            || cycles
                .iter()
                .any(|cycle| cycle.len() > 1 && cycle.contains(&node))
    };
    let guilty = (0..rules.len()).find(|rule| !based[*rule] && on_cycle(nodes[*rule]));
    Err(endless(rules, &graph, nodes[guilty.unwrap_or(goal)]))
}

fn endless(rules: &[Rule], graph: &DiGraph<usize, ()>, node: NodeIndex) -> TextError {
    let rule = &rules[graph[node]];
    let cycle = kosaraju_scc(graph)
        .into_iter()
        .find(|component| component.contains(&node))
        .unwrap_or_default();
    let mut names: Vec<&str> = cycle
        .iter()
        .map(|n| rules[graph[*n]].name.as_str())
        .collect();
    names.sort_unstable();
    TextError::new(
        format!(
            "the rule `{}` never ends: every alternative uses it again",
            rule.name
        ),
        rule.span.clone(),
        format!("recursion without a base through {}", names.join(", ")),
    )
    .with_help("add an alternative without recursion")
}

/// Shapes that are constant on finite records, whatever the data: an operator
/// with `end` directly under one of the other kind with `end`.
fn constant_shapes(rule: &Rule) -> Vec<String> {
    let mut warnings = Vec::new();
    for alternative in &rule.alternatives {
        visit(&alternative.ast, &mut |ast| {
            let (bounds, operand, outer) = match &ast.kind {
                AstKind::Throughout(bounds, operand) => (bounds, operand, true),
                AstKind::Sometime(bounds, operand) => (bounds, operand, false),
                _ => return,
            };
            let (inner_bounds, inner) = match &operand.kind {
                AstKind::Throughout(bounds, _) => (bounds, true),
                AstKind::Sometime(bounds, _) => (bounds, false),
                _ => return,
            };
            let open = |bounds: &[Ast; 2]| bounds[1].kind == AstKind::End;
            if outer != inner && open(bounds) && open(inner_bounds) {
                warnings.push(format!(
                    "the rule `{}` puts an operator with `end` directly under one of the other \
                     kind with `end`: on a record that stops, this looks at the last sample only, \
                     or is constant",
                    rule.name
                ));
            }
        });
    }
    warnings
}

/// Edit distance (Levenshtein 1966), for suggestions.
fn distance(a: &str, b: &str) -> usize {
    let b: Vec<char> = b.chars().collect();
    let mut row: Vec<usize> = (0..=b.len()).collect();
    for (i, ca) in a.chars().enumerate() {
        let mut diagonal = row[0];
        row[0] = i + 1;
        for (j, cb) in b.iter().enumerate() {
            let substituted = diagonal + usize::from(ca != *cb);
            diagonal = row[j + 1];
            row[j + 1] = substituted.min(row[j] + 1).min(diagonal + 1);
        }
    }
    row[b.len()]
}
