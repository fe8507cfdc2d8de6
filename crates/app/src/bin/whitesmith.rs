//! The program: everything it does is in the library.

fn main() -> std::process::ExitCode {
    whitesmith::headless::run(std::env::args_os())
}
