//! Tests of the special functions and of the central and noncentral distributions.

mod battery;
#[path = "../../examples/tabulate/functions.rs"]
mod functions;
mod inverses;
mod library;
mod limits;
mod published;
mod tables;
