//! The program: one sentence.

fn main() -> std::process::ExitCode {
    bandwright::cli::run(std::env::args_os()).into()
}
