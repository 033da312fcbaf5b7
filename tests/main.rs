//! All integration tests, in one binary.

mod cases;
mod cli;
mod convergence;
mod coverage;
mod discrete;
mod draw;
mod film;
mod guard;
mod ideal_limit;
mod operator;
mod plates;
mod random;
mod squares;
mod strips;
mod tables;
mod thick;
mod threads;
mod validate;
mod walls;
mod wrench;
