//! stageleaf-web
