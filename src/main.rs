//! The browser binary: mounts the page, or, started inside a worker, serves it.

mod bridge;
mod page;

fn main() {
    bridge::host::report_panics();
    match bridge::host::place() {
        bridge::host::Place::Page => page::mount(),
        bridge::host::Place::Worker(scope) => bridge::worker::serve(&scope),
        bridge::host::Place::Elsewhere => {}
    }
}
