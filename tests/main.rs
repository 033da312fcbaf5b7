//! All integration tests, in one binary.

mod cases;
mod cli;
mod coverage;
mod discrete;
mod ideal_limit;
mod plates;
mod strips;
mod threads;
mod wrench;
