//! The Rimeshift command line: reads day folders, asks the service, reports its answers.
//!
//! Reading order: `args` (what can be asked), `commands` (one file each), `day_folder` (folders in),
//! `connect` (the service, within this process or elsewhere), `plan_folder` (plans out and in),
//! `report` (answers for people and programs), `exit` (exit codes).

#![cfg_attr(
    not(test),
    warn(
        clippy::indexing_slicing,
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        clippy::cast_possible_wrap
    )
)]

mod args;
mod commands;
mod connect;
mod day_folder;
mod exit;
mod plan_folder;
mod report;
mod screen;
mod tables;

use clap::Parser;
use std::process::ExitCode;

fn main() -> ExitCode {
    let args = args::Args::parse();
    let screen = screen::Screen::detect(args.global.json);
    exit::report(commands::run(args, &screen), &screen)
}
