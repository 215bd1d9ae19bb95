//! The program as its users meet it: commands, documents, tampering, hostile input, and the repository's own promises.

mod commands;
mod determinism;
mod examples;
mod hostile;
mod repository;
mod support;
mod tampering;
