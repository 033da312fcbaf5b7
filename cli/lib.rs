//! Charge, force and torque of a hinged-plate electrostatic balance, from the command line.
//!
//! Raw arguments ([`arguments`]) become a checked job ([`assess`]), the job becomes a report, the report becomes a
//! table ([`screen`]) or JSON ([`report_json`]);
//! [`draw`] makes pictures. The physics is in `tiltgap-solver`, the geometry in `tiltgap-meshes`.

pub mod apply;
pub mod arguments;
pub mod assess;
pub mod bench;
pub mod caution;
pub mod concise;
pub mod document;
pub mod draw;
pub mod effort;
pub mod error;
#[cfg(test)]
mod fixture;
pub mod inputs;
pub mod interrupt;
pub mod key_error;
pub mod keys;
pub mod lock;
pub mod memory;
pub mod nearest;
pub mod progress;
pub mod quantity;
pub mod ranges;
pub mod readings;
pub mod report_json;
pub mod schema;
pub mod screen;
pub mod settings;
pub mod show;
pub mod source;
pub mod store;
pub mod table;
pub mod table_job;
pub mod tables;
pub mod tabulate;
pub mod validate;

use std::ffi::OsString;
use std::io::{Read, Write};
use std::panic::{catch_unwind, AssertUnwindSafe};
use std::time::Instant;

use clap::Parser;

use arguments::{Arguments, Command};
use error::Error;

/// Where input comes from and output goes.
pub struct Streams<'a> {
    /// For the bench `-`.
    pub stdin: &'a mut dyn Read,
    /// Results.
    pub stdout: &'a mut dyn Write,
    /// Everything else.
    pub stderr: &'a mut (dyn Write + Send),
    /// Whether standard error is a terminal, where progress is shown.
    pub terminal: bool,
}

/// Runs the program and returns its exit code. `arguments` begins with the program's name, `begun` is when it started.
///
/// Results are written whole or not at all.
pub fn run(
    arguments: impl IntoIterator<Item = impl Into<OsString> + Clone>,
    streams: &mut Streams,
    begun: Instant,
) -> u8 {
    let arguments = match Arguments::try_parse_from(arguments) {
        Ok(arguments) => arguments,
        Err(usage) => {
            let text = usage.render().to_string();
            let written = if usage.use_stderr() {
                streams.stderr.write_all(text.as_bytes())
            } else {
                write(streams.stdout, &text)
            };
            return match written {
                Ok(()) if usage.use_stderr() => error::BAD_INPUT,
                Ok(()) => error::GOOD,
                Err(e) => Error::from(e).exit_code(),
            };
        }
    };
    // A panic is a mistake in the program; its message is already on standard error.
    let done = catch_unwind(AssertUnwindSafe(|| command(&arguments.command, streams, begun)));
    let message = match done {
        Ok(Ok(())) => return error::GOOD,
        Ok(Err(error)) if error.exit_code() == error::GOOD => return error::GOOD,
        Ok(Err(error)) => (error.exit_code(), format!("tiltgap: {error}\n")),
        Err(_) => (error::INTERNAL, "tiltgap: internal error; please report it with the bench file\n".into()),
    };
    // If even that cannot be written, the exit code has to do.
    let _ = streams.stderr.write_all(message.1.as_bytes());
    message.0
}

fn write(stdout: &mut dyn Write, text: &str) -> std::io::Result<()> {
    stdout.write_all(text.as_bytes())?;
    stdout.flush()
}

fn command(command: &Command, streams: &mut Streams, begun: Instant) -> Result<(), Error> {
    let text = match command {
        Command::Assess(arguments) => {
            let job = assess::Job::new(arguments, streams.stdin)?;
            let report = job.run(begun, streams.stderr, streams.terminal)?;
            if arguments.json {
                report_json::report_json(&report)?
            } else {
                screen::screen(&report)?
            }
        }
        Command::Draw(arguments) => {
            let job = draw::Job::new(arguments, streams.stdin)?;
            return job.run(streams.stdout, streams.stderr, streams.terminal);
        }
        Command::Tabulate(arguments) => {
            tabulate::tabulate(arguments, streams.stdin, streams.stderr, streams.terminal)?
        }
        Command::Join(arguments) => tabulate::join(arguments, streams.stderr, streams.terminal)?,
        Command::Apply(arguments) => {
            let outcome = apply::apply(arguments, streams.stdin)?;
            write(streams.stdout, &outcome.text)?;
            apply::tell(&outcome, streams.stderr);
            let (failed, all) = outcome.failed;
            return if failed == 0 { Ok(()) } else { Err(Error::Rows { failed, all }) };
        }
        Command::Table(arguments) => show::show(arguments, streams.stdin)?,
        Command::Validate(arguments) => {
            let job = validate::Job::new(arguments, streams.stdin)?;
            let holds = validate::validate(&job, arguments, streams, begun)?;
            return if holds { Ok(()) } else { Err(Error::NotValid) };
        }
        Command::Schema => format!("{:#}\n", schema::bench_schema()),
        Command::Demo => source::DEMO.into(),
    };
    Ok(write(streams.stdout, &text)?)
}
