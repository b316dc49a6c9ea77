//! The command-line program: it reads what was typed and calls the library.

mod cli;

fn main() -> std::process::ExitCode {
    cli::main()
}
