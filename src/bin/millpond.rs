//! The terminal program; see [`millpond::terminal`].

fn main() -> std::process::ExitCode {
    millpond::terminal::main()
}
