//! Holds the picture of the architecture true: data flows one way.

use std::collections::BTreeMap;
use std::fs;
use std::path::{Path, PathBuf};

/// Module → rank. A module may use modules of lower rank only (and itself).
fn ranks() -> BTreeMap<&'static str, u32> {
    BTreeMap::from([
        ("bibliography", 0),
        ("bounds", 0),
        ("order", 0),
        ("problem", 0),
        ("units", 0),
        ("frame", 1),
        ("interval", 2),
        ("input", 3),
        ("map", 4),
        ("vehicle", 4),
        ("track", 4),
        ("dive", 5),
        ("detect", 6),
        ("locate", 7),
        ("assess", 9),
        ("alias", 9),
        ("report", 8),
        ("export", 10),
        ("render", 10),
        ("cli", 11),
    ])
}

fn rust_files(dir: &Path, found: &mut Vec<PathBuf>) {
    for entry in fs::read_dir(dir).expect("a folder of sources") {
        let path = entry.expect("an entry").path();
        if path.is_dir() {
            rust_files(&path, found);
        } else if path.extension().is_some_and(|e| e == "rs") {
            found.push(path);
        }
    }
}

#[test]
fn modules_use_lower_ranks_only() {
    let ranks = ranks();
    let src = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    let mut files = Vec::new();
    rust_files(&src, &mut files);
    let mut wrong = Vec::new();
    let mut seen = 0;
    for file in files {
        let relative = file.strip_prefix(&src).expect("below src");
        let top = relative.components().next().expect("a name").as_os_str().to_string_lossy();
        let module = top.trim_end_matches(".rs").to_owned();
        if module == "lib" || module == "main" {
            continue;
        }
        let rank =
            *ranks.get(module.as_str()).unwrap_or_else(|| panic!("give src/{module} a rank in this test"));
        for line in fs::read_to_string(&file).expect("a source").lines() {
            let code = line.split("//").next().unwrap_or_default();
            for used in code.split("crate::").skip(1) {
                let name: String = used.chars().take_while(|c| c.is_alphanumeric() || *c == '_').collect();
                let Some(&other) = ranks.get(name.as_str()) else { continue };
                seen += 1;
                let is_sibling_reach = other == rank && name != module;
                if other > rank || is_sibling_reach {
                    wrong.push(format!("{}: {module} must not use {name}", relative.display()));
                }
            }
        }
    }
    assert!(seen > 50, "the scan found only {seen} uses; is it still reading the sources?");
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn nothing_between_detect_and_report_touches_the_world() {
    let src = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    for module in ["detect", "locate", "assess", "alias", "report", "render"] {
        let mut files = Vec::new();
        rust_files(&src.join(module), &mut files);
        for file in files {
            let text = fs::read_to_string(&file).expect("a source");
            for word in ["std::fs", "std::env", "std::time", "println!", "eprintln!", "current_num_threads"] {
                assert!(!text.contains(word), "{} uses {word}", file.display());
            }
        }
    }
}
