//! stageleaf-note
