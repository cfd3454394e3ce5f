//! Arguments, commands, exit status: the only place that prints.

mod arguments;
mod check;
mod columns;
mod families;
mod fit;
mod interrupt;
mod job;
mod mistakes;
mod output;
mod sentence;
mod status;

use std::process::ExitCode;

use clap::{CommandFactory, Parser};

use arguments::{Arguments, Command};
use status::{Status, Stop};

/// Runs the program on the process's arguments.
pub fn run() -> ExitCode {
    interrupt::watch();
    let arguments = match Arguments::try_parse() {
        Ok(arguments) => arguments,
        Err(shown) => return told(&shown),
    };
    let done = match &arguments.command {
        Command::Fit(fit) => fit::run(fit),
        Command::Check(check) => check::run(check),
        Command::Families(families) => families::run(families),
        Command::Completions { shell } => completions(*shell),
    };
    match done {
        Ok(status) => status.into(),
        Err(Stop { status, message }) => {
            output::say(&message);
            status.into()
        }
    }
}

/// Writes a shell's completions.
fn completions(shell: clap_complete::Shell) -> Result<Status, Stop> {
    let mut script = Vec::new();
    clap_complete::generate(shell, &mut Arguments::command(), "guyline", &mut script);
    output::deliver(&String::from_utf8_lossy(&script), None)?;
    Ok(Status::Done)
}

/// What clap has to say: help and version are results, all else is a wrong command line.
fn told(shown: &clap::Error) -> ExitCode {
    let text = shown.render();
    if shown.use_stderr() {
        output::say(text.to_string().trim_end());
        return Status::Study.into();
    }
    match output::deliver(&text.to_string(), None) {
        Ok(()) => Status::Done.into(),
        Err(stop) => {
            output::say(&stop.message);
            stop.status.into()
        }
    }
}
