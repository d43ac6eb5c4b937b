//! Arguments, one command, exit status.

fn main() -> std::process::ExitCode {
    libripens::command::run()
}
