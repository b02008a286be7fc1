//! Arguments in, exit status out.

use std::process::ExitCode;

fn main() -> ExitCode {
    ketwork::app::run(std::env::args_os())
}
