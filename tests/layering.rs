//! The direction of the data: a module imports only from modules above it, and only `command` sees the outside.
//!
//! Unit tests inside `src` are exempt, as are `tests` and `benches`.

#![allow(clippy::disallowed_methods)]

use std::collections::BTreeSet;
use std::path::{Path, PathBuf};

/// The folders of `src`, from the top: each may use itself and those before it.
const ORDER: [&str; 11] = [
    "intake",
    "diagnostic",
    "numeric",
    "quantity",
    "graph",
    "method",
    "record",
    "block",
    "report",
    "register",
    "command",
];

/// What the crate's root holds besides folders, with the first folder that may use it.
const OF_THE_ROOT: [(&str, &str); 2] = [("VERSION", "intake"), ("reduce", "command")];

/// A source file: its path below `src`, and its code without comments and unit tests.
struct Source {
    path: String,
    code: String,
}

impl Source {
    fn folder(&self) -> &str {
        self.path.split(['/', '.']).next().unwrap_or_default()
    }

    fn is_command(&self) -> bool {
        self.folder() == "command"
    }
}

fn sources() -> Vec<Source> {
    let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    let mut paths = Vec::new();
    walk(&root, &mut paths);
    paths.sort();
    let relative = |path: &PathBuf| {
        let names: Vec<_> =
            path.strip_prefix(&root).expect("below src").iter().map(|name| name.to_string_lossy()).collect();
        names.join("/")
    };
    let is_test = |path: &str| path.ends_with("_tests.rs") || path.ends_with("/tests.rs");
    let read = |path: PathBuf| Source {
        path: relative(&path),
        code: code(&std::fs::read_to_string(&path).expect("a source")),
    };
    paths.into_iter().filter(|path| !is_test(&relative(path))).map(read).collect()
}

fn walk(folder: &Path, found: &mut Vec<PathBuf>) {
    for entry in std::fs::read_dir(folder).expect("a folder") {
        let path = entry.expect("an entry").path();
        match path.is_dir() {
            true => walk(&path, found),
            false if path.extension().is_some_and(|ending| ending == "rs") => found.push(path),
            false => {}
        }
    }
}

/// The text without comments, and without the unit tests at its end.
fn code(text: &str) -> String {
    let production = text.find("#[cfg(test)]\nmod tests {").map_or(text, |end| &text[..end]);
    production
        .lines()
        .map(|line| line.split("//").next().unwrap_or_default())
        .fold(String::new(), |all, line| all + line + "\n")
}

/// The first names behind every `crate::`, and behind `super::` where it leads out of the folder.
fn imports(source: &Source) -> BTreeSet<String> {
    let depth = source.path.trim_end_matches(".rs").trim_end_matches("/mod").split('/').count();
    let to_the_root = "super::".repeat(depth);
    let mut found = BTreeSet::new();
    for start in ["crate::", to_the_root.as_str()] {
        for (at, _) in source.code.match_indices(start) {
            let longer = source.code[..at].ends_with("super::")
                || source.code[..at].ends_with(|c: char| c.is_alphanumeric() || c == '_');
            if !longer {
                found.extend(first_names(&source.code[at + start.len()..]));
            }
        }
    }
    found
}

/// `graph::Node` gives `graph`; `{graph::{Node, Op}, method}` gives `graph` and `method`.
fn first_names(rest: &str) -> Vec<String> {
    let word =
        |text: &str| text.trim_start().chars().take_while(|c| c.is_alphanumeric() || *c == '_').collect::<String>();
    let Some(group) = rest.strip_prefix('{') else { return vec![word(rest)] };
    let (mut depth, mut start, mut names) = (0, 0, Vec::new());
    for (at, c) in group.char_indices() {
        match c {
            '{' => depth += 1,
            '}' if depth > 0 => depth -= 1,
            '}' => {
                names.push(word(&group[start..]));
                break;
            }
            ',' if depth == 0 => {
                names.push(word(&group[start..]));
                start = at + 1;
            }
            _ => {}
        }
    }
    names.retain(|name| !name.is_empty());
    names
}

fn rank(folder: &str) -> Option<usize> {
    ORDER.iter().position(|name| *name == folder)
}

#[test]
fn every_folder_has_its_place_in_the_order() {
    let folders: BTreeSet<String> = sources()
        .iter()
        .map(|source| source.folder().to_string())
        .filter(|name| name != "lib" && name != "main")
        .collect();
    assert_eq!(folders, ORDER.iter().map(|name| (*name).to_string()).collect());
}

#[test]
fn modules_import_only_from_modules_above_them() {
    let mut violations = Vec::new();
    for source in sources() {
        let Some(own) = rank(source.folder()) else { continue };
        for name in imports(&source) {
            let root = OF_THE_ROOT.iter().find(|(item, _)| *item == name).map(|(_, folder)| *folder);
            match rank(root.unwrap_or(&name)) {
                Some(other) if other <= own => {}
                Some(_) => violations.push(format!("src/{} uses crate::{name}, which lies below it", source.path)),
                None => {
                    violations.push(format!("src/{} uses crate::{name}, which has no place in the order", source.path))
                }
            }
        }
    }
    assert!(violations.is_empty(), "{}", violations.join("\n"));
}

#[test]
fn only_commands_touch_disk_environment_clock_and_network() {
    let outside = [
        "std::fs",
        "std::env",
        "std::net",
        "std::process",
        "std::time::SystemTime",
        "std::time::Instant",
        "SystemTime::now",
        "Instant::now",
        "Utc::now",
        "Local::now",
        "std::io::stdin",
        "std::io::stdout",
        "std::io::stderr",
        "println!",
        "eprintln!",
        "getrandom",
        "thread_rng",
        "RandomState",
    ];
    let mut violations = Vec::new();
    for source in sources().iter().filter(|source| !source.is_command() && source.path != "main.rs") {
        let found = outside.iter().filter(|word| source.code.contains(**word));
        violations.extend(found.map(|word| format!("src/{} uses {word}", source.path)));
    }
    assert!(violations.is_empty(), "the compiler proper sees only the intake door:\n{}", violations.join("\n"));
}

/// Functions of `f64` whose bits depend on the machine, or on whether it fuses multiplication and addition.
const ELEMENTARY: [&str; 24] = [
    "exp", "exp2", "exp_m1", "ln", "ln_1p", "log", "log2", "log10", "powf", "powi", "sin", "sin_cos", "cos", "tan",
    "asin", "acos", "atan", "atan2", "sinh", "cosh", "tanh", "cbrt", "hypot", "mul_add",
];

/// Whether a path stands in the code as a whole word.
fn calls(code: &str, path: &str) -> bool {
    code.match_indices(path)
        .any(|(at, _)| !code[at + path.len()..].starts_with(|c: char| c.is_alphanumeric() || c == '_'))
}

#[test]
fn elementary_functions_come_from_numeric() {
    let mut violations = Vec::new();
    for source in sources() {
        for name in ELEMENTARY {
            let method = source.code.contains(&format!(".{name}(")) && source.folder() != "command";
            let function =
                calls(&source.code, &format!("f64::{name}")) || calls(&source.code, &format!("libm::{name}"));
            if (method || function) && source.folder() != "numeric" {
                violations.push(format!("src/{} uses {name} other than from numeric::elementary", source.path));
            }
        }
    }
    assert!(violations.is_empty(), "{}", violations.join("\n"));
}

#[test]
fn clippy_holds_both_promises_too() {
    let rules =
        std::fs::read_to_string(Path::new(env!("CARGO_MANIFEST_DIR")).join("clippy.toml")).expect("clippy.toml");
    for name in ELEMENTARY {
        assert!(rules.contains(&format!("\"f64::{name}\"")), "clippy.toml does not ban f64::{name}");
    }
    let exempt: Vec<String> = sources()
        .into_iter()
        .filter(|source| source.code.contains("disallowed_methods"))
        .map(|source| source.path)
        .collect();
    assert_eq!(exempt, ["command/mod.rs"], "only commands are exempt from the banned functions");
}
