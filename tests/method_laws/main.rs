//! Laws that every method must keep, held on every built-in method and against published values.

mod bayesian;
mod cases;
mod cost;
mod linear;
mod polynomial;
mod precision;
mod published;
mod refusals;
mod robust;
mod rotation;
mod sampling;
