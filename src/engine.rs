//! The worker's binary: the engine behind the bridge.

mod bridge;

fn main() {
    bridge::worker::report_panics();
    if let Some(scope) = bridge::worker::scope() {
        bridge::worker::serve(&scope);
    }
}
