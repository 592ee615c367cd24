//! The browser's page.

mod bridge;
mod page;

fn main() {
    bridge::host::report_panics();
    page::mount();
}
