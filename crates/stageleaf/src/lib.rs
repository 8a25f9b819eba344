//! stageleaf
