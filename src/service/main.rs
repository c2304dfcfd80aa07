//! The `synodia` command.

fn main() {}
