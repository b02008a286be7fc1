//! The reference page is what the vocabulary says now. `KETWORK_REFRESH=1` writes it anew.

use std::path::PathBuf;

#[test]
fn the_reference_page_is_fresh() {
    let path = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("grammar/reference.md");
    let page = ketwork::report::reference::markdown();
    if std::env::var_os("KETWORK_REFRESH").is_some() {
        std::fs::write(&path, &page).expect("the page is written");
    }
    let written = std::fs::read_to_string(&path).unwrap_or_default();
    assert!(written == page, "grammar/reference.md is stale: run this test with KETWORK_REFRESH=1");
    assert!(page.len() > 10_000, "the page is empty");
}
