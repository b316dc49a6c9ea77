//! The program as its users meet it: the built binary, run in a fresh folder, judged by its exit code, what it
//! says and the files it leaves.

mod advise;
mod bad_input;
mod catalogue;
mod contract;
mod desk;
mod endings;
mod gate;
mod mark;
mod odd_input;
mod options;
#[cfg(unix)]
mod outside;
mod results;
mod shards;
mod store;
