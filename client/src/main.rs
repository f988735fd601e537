//! The Rimeshift command line.

mod day_folder;
mod tables;

fn main() {}
