//! Every session file is a test: replayed through the binary, it agrees with its record.

use std::path::Path;
use std::process::Command;

fn replays(path: &Path) -> datatest_stable::Result<()> {
    let output = Command::new(env!("CARGO_BIN_EXE_ketwork")).arg("replay").arg(path).output()?;
    let shown = format!("{}\n{}", String::from_utf8_lossy(&output.stdout), String::from_utf8_lossy(&output.stderr));
    // The colleague's file is there to show a replay that differs in one entry.
    let wanted = if path.file_stem().is_some_and(|stem| stem == "colleague") { 1 } else { 0 };
    if output.status.code() != Some(wanted) {
        return Err(format!("status {:?}, {wanted} wanted\n{shown}", output.status.code()).into());
    }
    if wanted == 1 && !shown.contains("1 differs") {
        return Err(format!("one differing entry wanted\n{shown}").into());
    }
    if wanted == 0 && shown.contains("no record") {
        return Err(format!("an entry has no record\n{shown}").into());
    }
    Ok(())
}

datatest_stable::harness! {
    { test = replays, root = "sessions", pattern = r"\.ketwork$" },
    { test = replays, root = "tests/sessions", pattern = r"\.ketwork$" },
}
