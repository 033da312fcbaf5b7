//! The program `tiltgap`; everything is in the library.

use std::io::{self, IsTerminal};
use std::process::ExitCode;

fn main() -> ExitCode {
    let begun = std::time::Instant::now();
    let terminal = io::stderr().is_terminal();
    let mut streams = tiltgap::Streams {
        stdin: &mut io::stdin(),
        stdout: &mut io::stdout(),
        stderr: &mut io::stderr(),
        terminal,
    };
    ExitCode::from(tiltgap::run(std::env::args_os(), &mut streams, begun))
}
