//! Rules of the house that a compiler does not hold: the layer order, the
//! length of functions and files, where printing and unsafe code may stand,
//! and that the README shows commands that exist.

use std::fs;
use std::path::{Path, PathBuf};

/// The modules in the order in which one may use those before it.
const LAYERS: &[&str] = &[
    "support",
    "template",
    "grammar",
    "equivalence",
    "traces",
    "kernels",
    "embedding",
    "comparison",
    "grouping",
    "scoring",
    "description",
    "search",
    "store",
    "handover",
    "report",
    "cli",
];

/// Longest function and file, in lines.
const LONGEST_FUNCTION: usize = 70;
const LONGEST_FILE: usize = 500;

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

fn rust_files(folder: &str) -> Vec<(PathBuf, String)> {
    let mut found = Vec::new();
    let mut folders: Vec<PathBuf> = vec![root().join(folder)];
    while let Some(folder) = folders.pop() {
        for entry in fs::read_dir(&folder).unwrap() {
            let path = entry.unwrap().path();
            if path.is_dir() {
                folders.push(path);
            } else if path.extension().is_some_and(|ending| ending == "rs") {
                let text = fs::read_to_string(&path).unwrap();
                found.push((path.strip_prefix(root()).unwrap().to_owned(), text));
            }
        }
    }
    found.sort();
    assert!(!found.is_empty(), "no source in {folder}");
    found
}

/// The part of a file before its unit tests.
fn without_tests(text: &str) -> &str {
    text.split("#[cfg(test)]").next().unwrap()
}

fn layer_of(path: &Path) -> Option<usize> {
    let module = path.components().nth(1)?.as_os_str().to_str()?;
    LAYERS.iter().position(|layer| *layer == module)
}

#[test]
fn a_module_uses_only_those_before_it() {
    let mut wrong = Vec::new();
    for (path, text) in rust_files("src") {
        let Some(own) = layer_of(&path) else { continue };
        for (number, line) in without_tests(&text).lines().enumerate() {
            if line.trim_start().starts_with("//") {
                continue;
            }
            for (used, layer) in LAYERS.iter().enumerate() {
                if used > own && line.contains(&format!("crate::{layer}")) {
                    wrong.push(format!("{}:{}: uses {layer}", path.display(), number + 1));
                }
            }
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn the_layers_are_the_modules_of_the_library() {
    let library = fs::read_to_string(root().join("src/lib.rs")).unwrap();
    let declared: Vec<&str> = library
        .lines()
        .filter_map(|line| line.strip_prefix("pub mod ")?.strip_suffix(';'))
        .collect();
    assert_eq!(declared, LAYERS);
}

#[test]
fn functions_and_files_are_short_and_files_say_what_they_are_for() {
    let mut wrong = Vec::new();
    for folder in ["src", "tests", "benchmarks"] {
        for (path, text) in rust_files(folder) {
            let lines: Vec<&str> = text.lines().collect();
            if !lines[0].starts_with("//!") {
                wrong.push(format!("{}: no doc at the top", path.display()));
            }
            if folder == "src" && lines.len() > LONGEST_FILE {
                wrong.push(format!("{}: {} lines", path.display(), lines.len()));
            }
            for (start, length) in function_lengths(&lines) {
                if length > LONGEST_FUNCTION {
                    let place = format!("{}:{}", path.display(), start + 1);
                    wrong.push(format!("{place}: a function of {length} lines"));
                }
            }
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

/// Start and length of each function, by indentation: rustfmt puts the closing
/// brace of an item in the column where the item starts.
fn function_lengths(lines: &[&str]) -> Vec<(usize, usize)> {
    let mut found = Vec::new();
    for (start, line) in lines.iter().enumerate() {
        let code = line.trim_start();
        let words: Vec<&str> = code.split_whitespace().take(5).collect();
        let has_body = !code.trim_end().ends_with(';');
        let is_function = words.contains(&"fn") && !code.starts_with("//") && has_body;
        if !is_function {
            continue;
        }
        let closing = format!("{}}}", &line[..line.len() - code.len()]);
        let length = lines[start..].iter().position(|l| *l == closing);
        if let Some(length) = length {
            found.push((start, length + 1));
        }
    }
    found
}

#[test]
fn a_long_function_would_be_found() {
    let mut lines = vec!["    pub fn long() {"];
    lines.extend(vec!["        let _ = 1;"; 80]);
    lines.push("    }");
    assert_eq!(function_lengths(&lines), [(0, 82)]);
}

#[test]
fn printing_and_unsafe_code_stand_where_they_may() {
    let mut wrong = Vec::new();
    for (path, text) in rust_files("src") {
        let place = path.to_str().unwrap();
        for (number, line) in without_tests(&text).lines().enumerate() {
            let code = line.split("//").next().unwrap();
            let prints = ["println!", "eprintln!", "print!(", "eprint!("]
                .iter()
                .any(|call| code.contains(call));
            let is_unsafe = code.contains("unsafe ") || code.contains("unsafe_code");
            if prints && !place.starts_with("src/cli/") && place != "src/main.rs" {
                wrong.push(format!("{place}:{}: prints", number + 1));
            }
            if is_unsafe && place != "src/kernels/dispatch.rs" {
                wrong.push(format!("{place}:{}: unsafe", number + 1));
            }
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

/// Files, the clock and hash maps (whose order is not fixed) stay where they
/// are allowed.
#[test]
fn files_clock_and_hash_order_stand_where_they_may() {
    let allowed: &[(&str, &[&str])] = &[
        (
            "std::fs",
            &[
                "src/traces/",
                "src/grammar/",
                "src/store/",
                "src/handover/",
                "src/report/",
                "src/cli/",
            ],
        ),
        ("Instant::now", &["src/search/budget.rs", "src/cli/"]),
        ("SystemTime", &["src/search/budget.rs", "src/cli/"]),
    ];
    let mut wrong = Vec::new();
    for (path, text) in rust_files("src") {
        let place = path.to_str().unwrap();
        for (word, places) in allowed {
            let used = without_tests(&text).lines().any(|line| line.contains(word));
            if used && !places.iter().any(|start| place.starts_with(start)) {
                wrong.push(format!("{place}: {word}"));
            }
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

/// Every file of the repository a reader may open speaks of the project alone.
#[test]
fn text_has_no_paths_of_one_machine() {
    let needles = [
        ["/wo", "rk/"].concat(),
        ["/tm", "p/bash"].concat(),
        ["/home", "/"].concat(),
    ];
    for folder in ["src", "tests", "benchmarks"] {
        for (path, text) in rust_files(folder) {
            for needle in &needles {
                assert!(
                    !text.contains(needle.as_str()),
                    "{}: {needle}",
                    path.display()
                );
            }
        }
    }
}
