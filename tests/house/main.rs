//! The repository tests itself: imports flow one way, documents name what exists, licences are known.

#![allow(
    clippy::unwrap_used,
    clippy::expect_used,
    reason = "helpers of tests, outside a test function"
)]

use std::collections::BTreeSet;
use std::path::{Path, PathBuf};
use std::process::Command;

fn root() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("..")
}

fn files(folder: &Path, extension: &str, out: &mut Vec<PathBuf>) {
    for entry in std::fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        let name = path.file_name().unwrap().to_string_lossy().into_owned();
        if path.is_dir() {
            if !matches!(name.as_str(), "target" | "node_modules" | ".git") {
                files(&path, extension, out);
            }
        } else if path.extension().is_some_and(|e| e == extension) {
            out.push(path);
        }
    }
}

fn sources(folder: &str) -> Vec<(PathBuf, String)> {
    let mut paths = Vec::new();
    files(&root().join(folder), "rs", &mut paths);
    paths.sort();
    paths
        .into_iter()
        .map(|p| (p.clone(), std::fs::read_to_string(p).unwrap()))
        .collect()
}

/// What a folder must never name, as DEVELOPERS.md says.
const MUST_NOT_KNOW: &[(&str, &[&str])] = &[
    ("grammar/src", &["derate::", "Volt(", "tower_lsp"]),
    (
        "checker/src/physics",
        &[
            "crate::build",
            "crate::finding",
            "crate::rule",
            "crate::policy",
            "crate::analysis",
            "crate::vocabulary",
            "crate::quantity",
            "ampspec_grammar",
            "Span",
        ],
    ),
    (
        "checker/src/quantity",
        &[
            "crate::build",
            "crate::finding",
            "crate::rule",
            "crate::analysis",
            "crate::vocabulary",
            "ampspec_grammar",
        ],
    ),
    (
        "checker/src/vocabulary",
        &[
            "crate::physics",
            "crate::build",
            "crate::analysis",
            "crate::rules",
        ],
    ),
    (
        "checker/src/build",
        &[
            "crate::analysis",
            "crate::rules",
            "crate::policy",
            "crate::render",
            "crate::physics::supply",
            "crate::physics::load",
        ],
    ),
    (
        "checker/src/analysis",
        &["crate::render", "crate::rules", "crate::waiver"],
    ),
    ("checker/src/rules", &["crate::render", "tower_lsp"]),
    ("checker/src/size", &["crate::render", "crate::physics"]),
    ("checker/src/spread", &["crate::render", "crate::physics"]),
    (
        "checker/src/assist",
        &["crate::physics", "crate::analysis", "tower_lsp"],
    ),
    ("checker/src/bom", &["crate::physics", "crate::analysis"]),
    (
        "lsp/src",
        &[
            "derate::physics",
            "derate::analysis",
            "derate::rules",
            "derate::build",
        ],
    ),
    (
        "checker/src/render",
        &[
            "crate::physics::supply",
            "crate::physics::output_stage",
            "tower_lsp",
        ],
    ),
];

#[test]
fn imports_flow_one_way() {
    for (folder, names) in MUST_NOT_KNOW {
        for (path, text) in sources(folder) {
            for name in *names {
                let line = text
                    .lines()
                    .position(|l| l.contains(name) && !l.trim_start().starts_with("//"));
                assert_eq!(line, None, "{} knows {name}", path.display());
            }
        }
    }
}

#[test]
fn every_file_says_what_it_is() {
    for folder in ["grammar/src", "checker/src", "lsp/src"] {
        for (path, text) in sources(folder) {
            assert!(
                text.starts_with("//!"),
                "{} begins without a module header",
                path.display()
            );
        }
    }
}

/// Paths in backticks that begin with a folder of the house.
#[test]
fn documents_name_what_exists() {
    for document in ["README.md", "DEVELOPERS.md"] {
        let text = std::fs::read_to_string(root().join(document)).unwrap();
        for word in text
            .split('`')
            .skip(1)
            .step_by(2)
            .flat_map(str::split_whitespace)
        {
            let house = ["grammar/", "checker/", "lsp/", "editors/", "tests/", ".ci/"];
            // a place in a file is written `file:line`
            let word = word.split(':').next().unwrap();
            let sample =
                word.contains(['*', '<']) || word.contains("FAMILY") || word.contains("NAME");
            if house.iter().any(|h| word.starts_with(h)) && !sample {
                assert!(
                    root().join(word.trim_end_matches([',', '.', ':'])).exists(),
                    "{document} names {word}"
                );
            }
        }
    }
}

/// Every rule file is in the registry: a file that is not compiled checks nothing.
#[test]
fn every_rule_file_is_registered() {
    let registry = std::fs::read_to_string(root().join("checker/src/rules.rs")).unwrap();
    for (path, _) in sources("checker/src/rules") {
        let name = path.file_stem().unwrap().to_string_lossy().into_owned();
        assert!(
            registry.contains(&format!("pub mod {name};")),
            "{} is not in rules.rs",
            path.display()
        );
    }
}

/// Licences that may be shipped with a program under MIT OR Apache-2.0.
const LICENCES: &[&str] = &[
    "MIT",
    "Apache-2.0",
    "Apache-2.0 WITH LLVM-exception",
    "BSD-2-Clause",
    "BSD-3-Clause",
    "ISC",
    "Unicode-3.0",
    "Zlib",
    "CC0-1.0",
    "MIT-0",
    "BSL-1.0",
    "Unlicense",
    "0BSD",
];

/// One alternative of every dependency's licence expression is in the list.
#[test]
fn licences_are_known() {
    let output = Command::new(env!("CARGO"))
        .args(["metadata", "--format-version", "1", "--locked"])
        .current_dir(root())
        .output()
        .unwrap();
    assert!(
        output.status.success(),
        "{}",
        String::from_utf8_lossy(&output.stderr)
    );
    let metadata: serde_json::Value = serde_json::from_slice(&output.stdout).unwrap();
    let mut unknown = BTreeSet::new();
    for package in metadata["packages"].as_array().unwrap() {
        let licence = package["license"]
            .as_str()
            .unwrap_or("none stated")
            .replace('/', " OR ");
        let allowed = licence.split(" OR ").any(|one| {
            one.split(" AND ")
                .all(|l| LICENCES.contains(&l.trim().trim_matches(['(', ')'])))
        });
        if !allowed {
            unknown.insert(format!(
                "{} {}: {licence}",
                package["name"], package["version"]
            ));
        }
    }
    assert!(unknown.is_empty(), "{unknown:#?}");
}
