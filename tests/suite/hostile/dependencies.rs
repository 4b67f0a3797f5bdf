//! What the program is built from: the list in DEVELOPERS.md is that of Cargo.toml, and nothing in the tree builds or links C.

use std::collections::{BTreeMap, BTreeSet};
use std::process::Command;

use serde_json::Value;

/// Crates that build or look for code in other languages.
const BUILDERS: [&str; 7] = ["bindgen", "cc", "cmake", "nasm-rs", "pkg-config", "system-deps", "vcpkg"];

/// Names in the first column of the table under a heading of DEVELOPERS.md.
fn listed(heading: &str) -> BTreeSet<String> {
    let text = include_str!("../../../DEVELOPERS.md");
    let start = text.find(heading).unwrap_or_else(|| panic!("no {heading:?} in DEVELOPERS.md"));
    let section = &text[start + heading.len()..];
    let section = &section[..section.find("\n##").unwrap_or(section.len())];
    section
        .lines()
        .filter_map(|line| line.strip_prefix("| `"))
        .flat_map(|line| line.split('|').next().unwrap_or_default().split(','))
        .map(|name| name.trim().trim_matches('`').to_owned())
        .collect()
}

fn cargo_toml() -> toml::Table {
    include_str!("../../../Cargo.toml").parse().unwrap()
}

/// Names in a table of Cargo.toml, and in the same one for a platform.
fn names(table: &str) -> BTreeSet<String> {
    let manifest = cargo_toml();
    let of_platforms =
        manifest.get("target").and_then(toml::Value::as_table).into_iter().flat_map(|t| t.values());
    let tables = of_platforms.filter_map(|platform| platform.get(table)).chain(manifest.get(table));
    tables.flat_map(|table| table.as_table().unwrap().keys().cloned()).collect()
}

#[test]
fn every_direct_dependency_has_its_reason() {
    assert_eq!(listed("\n## Dependencies\n"), names("dependencies"));
    assert_eq!(listed("\n### Of tests and benchmarks\n"), names("dev-dependencies"));
}

fn cargo(arguments: &[&str]) -> String {
    let output = Command::new(env!("CARGO"))
        .args(arguments)
        .args(["--offline", "--locked"])
        .current_dir(env!("CARGO_MANIFEST_DIR"))
        .output()
        .unwrap();
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
    String::from_utf8(output.stdout).unwrap()
}

/// The packages that the program is made of on this platform: those of tests and benchmarks are left out.
fn tree() -> Vec<Value> {
    let text = cargo(&["tree", "--edges", "normal,build", "--prefix", "none", "--format", "{p}"]);
    let held: BTreeSet<(&str, &str)> = text
        .lines()
        .filter_map(|line| {
            let (name, rest) = line.split_once(" v")?;
            Some((name, rest.split(' ').next()?))
        })
        .collect();
    let rustc = Command::new("rustc").arg("-vV").output().unwrap();
    let about = String::from_utf8(rustc.stdout).unwrap();
    let host = about.lines().find_map(|line| line.strip_prefix("host: ")).unwrap();
    let all = cargo(&["metadata", "--format-version", "1", "--filter-platform", host]);
    let all: Value = serde_json::from_str(&all).unwrap();
    let text = |package: &Value, key: &str| package[key].as_str().unwrap().to_owned();
    let packages: Vec<Value> = all["packages"]
        .as_array()
        .unwrap()
        .iter()
        .filter(|p| held.contains(&(text(p, "name").as_str(), text(p, "version").as_str())))
        .cloned()
        .collect();
    assert_eq!(packages.len(), held.len());
    packages
}

#[test]
fn nothing_builds_or_links_c() {
    let tree = tree();
    assert!(tree.len() > 50, "only {} packages: is the tree still read?", tree.len());
    for package in &tree {
        let name = package["name"].as_str().unwrap();
        assert!(!BUILDERS.contains(&name), "{name} builds code in another language");
        // rayon-core states a link so that a program holds it once only; there is no library of that name.
        assert!(package["links"].is_null() || name == "rayon-core", "{name} links {}", package["links"]);
    }
}

#[test]
fn every_licence_is_permissive() {
    /// Licences of which one must be offered.
    const PERMISSIVE: [&str; 8] =
        ["0BSD", "Apache-2.0", "BSD-2-Clause", "BSD-3-Clause", "CC0-1.0", "MIT", "Unlicense", "Zlib"];
    for package in tree() {
        let licence = package["license"].as_str().unwrap_or_default();
        let is_permissive = |one: &str| {
            one.split(" AND ").all(|part| {
                let part = part.trim_matches(|c| matches!(c, '(' | ')' | ' '));
                part.split(" WITH ").next().is_some_and(|name| PERMISSIVE.contains(&name))
                    || part == "Unicode-3.0"
                    || part.split(" OR ").any(|name| PERMISSIVE.contains(&name))
            })
        };
        let one_of = licence.replace('/', " OR ");
        assert!(
            is_permissive(&one_of) || one_of.split(" OR ").any(is_permissive),
            "{}: licence {licence:?}",
            package["name"]
        );
    }
}

/// Crates of which the program holds two versions, each with the reason in DEVELOPERS.md.
#[test]
fn crates_held_twice_are_known() {
    let mut versions: BTreeMap<String, BTreeSet<String>> = BTreeMap::new();
    for package in tree() {
        let text = |key: &str| package[key].as_str().unwrap().to_owned();
        versions.entry(text("name")).or_default().insert(text("version"));
    }
    let twice: BTreeSet<String> =
        versions.into_iter().filter(|(_, versions)| versions.len() > 1).map(|(name, _)| name).collect();
    assert_eq!(twice, listed("\n### Held twice\n"));
}
