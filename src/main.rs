//! `ebbmark`: reads its arguments, calls the library, sets the exit code.

fn main() -> std::process::ExitCode {
    ebbmark::cli::run(std::env::args_os())
}
