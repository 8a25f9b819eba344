//! stageleaf-sheet
