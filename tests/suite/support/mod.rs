//! What several tests share.

pub mod exact;
