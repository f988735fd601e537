//! House rules that a reader cannot see are kept.

use std::fs;
use std::path::{Path, PathBuf};

/// Who may import whom inside the engine: each module, and the modules of ours that it may name.
/// `units` and `ids` may be named by all but `search` and each other.
const MAY_IMPORT: &[(&str, &[&str])] = &[
    ("units", &[]),
    ("ids", &[]),
    ("geometry", &[]),
    ("air", &["geometry"]),
    ("day", &["geometry", "air"]),
    ("answer", &["geometry", "air", "day"]),
    ("path", &["geometry", "air", "day", "answer"]),
    ("change", &["geometry", "air", "day", "answer", "path"]),
    ("separation", &["geometry", "air", "day", "answer", "path", "change"]),
    ("load", &["geometry", "air", "day", "answer", "path", "change"]),
    ("benefit", &["geometry", "air", "day", "answer", "path", "change"]),
    ("search", &[]),
    ("audit", &["geometry", "air", "day", "answer"]),
    (
        "traffic",
        &["geometry", "air", "day", "answer", "path", "change", "separation", "load", "benefit"],
    ),
    (
        "check",
        &[
            "geometry",
            "day",
            "answer",
            "path",
            "change",
            "separation",
            "load",
            "benefit",
            "traffic",
        ],
    ),
    (
        "ask",
        &[
            "geometry",
            "day",
            "answer",
            "path",
            "change",
            "separation",
            "load",
            "benefit",
            "traffic",
            "plan",
        ],
    ),
    (
        "plan",
        &[
            "geometry",
            "day",
            "answer",
            "path",
            "change",
            "separation",
            "load",
            "benefit",
            "traffic",
            "search",
            "audit",
        ],
    ),
];

/// Words that would give the engine a mouth, a clock or a file.
const BANNED_IN_ENGINE: &[&str] = &["tonic", "prost", "tokio", "serde", "std::fs", "std::net"];

fn repository() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).parent().expect("the tests lie in the repository").into()
}

fn rust_files(folder: &Path) -> Vec<PathBuf> {
    let mut found = Vec::new();
    for entry in fs::read_dir(folder).expect("a folder of the repository") {
        let path = entry.expect("an entry").path();
        if path.is_dir() {
            found.extend(rust_files(&path));
        } else if path.extension().is_some_and(|e| e == "rs") {
            found.push(path);
        }
    }
    found.sort();
    found
}

/// Lines of code, without comments.
fn code(path: &Path) -> Vec<String> {
    let text = fs::read_to_string(path).expect("a source file");
    text.lines().map(|line| line.split("//").next().unwrap_or("").to_owned()).collect()
}

#[test]
fn the_engine_imports_downwards_only() {
    let root = repository().join("service/engine/src");
    let mut faults = Vec::new();
    for (module, allowed) in MAY_IMPORT {
        let folder = root.join(module);
        let single = root.join(format!("{module}.rs"));
        let files = if folder.is_dir() { rust_files(&folder) } else { vec![single] };
        for file in files {
            for (number, line) in code(&file).iter().enumerate() {
                for named in line.split("crate::").skip(1) {
                    let named: String =
                        named.chars().take_while(|c| c.is_alphanumeric() || *c == '_').collect();
                    let base = ["units", "ids", "fixture"].contains(&named.as_str());
                    let fine = named == *module
                        || allowed.contains(&named.as_str())
                        || (base && *module != "search")
                        || named.is_empty();
                    if !fine {
                        faults.push(format!("{}:{}: {named}", file.display(), number + 1));
                    }
                }
            }
        }
    }
    assert!(faults.is_empty(), "imports against the table:\n{}", faults.join("\n"));
}

#[test]
fn every_module_of_the_engine_is_in_the_table() {
    let lib = fs::read_to_string(repository().join("service/engine/src/lib.rs")).expect("lib.rs");
    for line in lib.lines() {
        if let Some(module) = line.strip_prefix("pub mod ").and_then(|m| m.strip_suffix(';')) {
            assert!(MAY_IMPORT.iter().any(|(name, _)| *name == module), "{module} is missing");
        }
    }
}

#[test]
fn the_audit_knows_only_two_things_of_geometry() {
    for file in rust_files(&repository().join("service/engine/src/audit")) {
        for line in code(&file) {
            for named in line.split("geometry::").skip(1) {
                assert!(
                    named.starts_with("geodesic") || named.starts_with("polygon::Polygon"),
                    "{}: {line}",
                    file.display()
                );
            }
        }
    }
}

#[test]
fn the_engine_has_no_mouth_no_clock_and_no_files() {
    let manifest = fs::read_to_string(repository().join("service/engine/Cargo.toml")).expect("it");
    let dependencies = manifest.split("[dev-dependencies]").next().unwrap_or("");
    for word in ["tonic", "prost", "tokio", "serde"] {
        assert!(!dependencies.contains(word), "the engine depends on {word}");
    }
    for file in rust_files(&repository().join("service/engine/src")) {
        for line in code(&file) {
            for word in BANNED_IN_ENGINE {
                let named = format!("use {word}");
                assert!(!line.contains(&named), "{}: {line}", file.display());
            }
        }
    }
}

#[test]
fn rust_files_open_with_what_they_answer() {
    for folder in
        ["service/engine/src", "service/src", "client/src", "proto/src", "demo-sectors/src"]
    {
        for file in rust_files(&repository().join(folder)) {
            let name = file.file_name().and_then(|n| n.to_str()).unwrap_or("");
            if name == "tests.rs" || file.components().any(|c| c.as_os_str() == "tests") {
                continue;
            }
            let text = fs::read_to_string(&file).expect("a source file");
            assert!(text.starts_with("//!"), "{} has no opening sentence", file.display());
        }
    }
}
