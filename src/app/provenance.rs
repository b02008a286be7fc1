//! What a saved session says about its making. No clock and no place: the same session gives the same bytes.

/// The lines below the header.
pub fn provenance() -> Vec<String> {
    vec![format!("recorded by ketwork {}", env!("CARGO_PKG_VERSION"))]
}
