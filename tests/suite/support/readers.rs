//! Programs from outside that read what this one writes. They are no part of a plain test run.

/// Set to 1 where the outside readers are installed, so that none is skipped unseen.
const REQUIRED: &str = "FIXABILITY_REQUIRE_READERS";

/// Says that a reader is missing and what is therefore not checked.
///
/// # Panics
/// Where readers are required.
pub fn missing_reader(reader: &str, checks: &str) {
    assert!(
        std::env::var_os(REQUIRED).is_none_or(|value| value != "1"),
        "{reader} is missing, and {REQUIRED} is set"
    );
    eprintln!("skipped, {reader} is not installed: {checks}");
}
