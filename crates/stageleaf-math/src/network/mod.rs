//! The nodal network that a stage kind lays out.

/// Collects nodes and elements.
#[derive(Debug, Default)]
pub struct Builder;
