//! Helpers shared by the tests (and by the benches).

pub mod demo;
pub mod exact;
pub mod layout;
pub mod outside;
#[allow(dead_code, reason = "the benchmarks use more of it")]
pub mod plain;
pub mod program;
pub mod scenes;
