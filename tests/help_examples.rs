//! Replays every example of `help`: what a page shows is what comes out.

use std::process::Command;

use ketwork::lang::file::HEADER;
use ketwork::lang::vocabulary::{Status, vocabulary};

#[test]
fn every_example_of_help_replays_to_its_records() {
    let folder = tempfile::tempdir().expect("a folder for the examples");
    // The data file that examples name is the one the grammar documents.
    let data = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("grammar/level-table.csv");
    std::fs::copy(data, folder.path().join("level-table.csv")).expect("the data file is there");
    let (mut count, mut failures) = (0, Vec::new());
    for word in vocabulary().words().iter().filter(|word| word.status == Status::Here) {
        for example in word.examples.iter() {
            let file = folder.path().join(format!("example_{count}.ketwork"));
            std::fs::write(&file, format!("{HEADER}\n{}\n", example.trim_end())).expect("an example can be written");
            let run =
                Command::new(env!("CARGO_BIN_EXE_ketwork")).arg("replay").arg(&file).output().expect("ketwork runs");
            if !run.status.success() {
                let told = [run.stdout, run.stderr].concat();
                failures.push(format!("help {}\n{example}\n{}", word.name, String::from_utf8_lossy(&told)));
            }
            count += 1;
        }
    }
    assert!(count > 60, "only {count} examples");
    assert!(failures.is_empty(), "{} of {count} examples differ\n{}", failures.len(), failures.join("\n"));
}
