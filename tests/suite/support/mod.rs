//! Helpers shared by the tests (and by the benches).

pub mod demo;
pub mod exact;
pub mod outside;
pub mod program;
pub mod scenes;
