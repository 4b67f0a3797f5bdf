//! Helpers shared by the tests (and by the benches).

pub mod scenes;
