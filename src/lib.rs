//! Fixability: before the dive, how soon can the vehicle find itself again?
//!
//! The crate loads a map of look-alike landmarks, each known only within a box, simulates planned lines with
//! bounded errors, runs a set-membership position solver from an unknown start, and scores how many metres each
//! segment of a line needs before the position is unambiguous.
//!
//! *Frames and units.* Inside the crate positions are [`frame::LocalPoint`]: metres east and north in one
//! projected (or local) frame. Headings and bearings are radians, clockwise from grid north. Seconds, metres,
//! metres per second. Degrees and knots exist only where files are read and results are shown.
//!
//! *Guaranteed and estimated.* A feasible set returned by [`locate`] contains the true position for **every**
//! error within the stated bounds. A statistic made from simulated dives by [`assess`] is an *estimate*, carries
//! its confidence interval, and is never mixed with the former.
//!
//! Data flows one way: files → [`map`], [`track`], [`vehicle`] (gathered in a [`dive::Dive`]) → [`detect`] →
//! [`locate`] → [`assess`] → [`report`] → [`export`] and [`render`] → [`cli`].

pub mod alias;
pub mod assess;
pub mod bibliography;
pub mod bounds;
pub mod cli;
pub mod detect;
pub mod dive;
pub mod export;
pub mod frame;
pub mod input;
pub mod interval;
pub mod locate;
pub mod map;
pub mod order;
pub mod problem;
pub mod render;
pub mod report;
pub mod track;
pub mod units;
pub mod vehicle;
