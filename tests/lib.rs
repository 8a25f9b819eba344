//! What spans crates: outside checks, browser, hostile input, outlets.
