//! Entries, names, the dependency graph, records, replay, the saved form.
