//! What the crates may depend on.

use std::collections::BTreeSet;
use std::process::Command;

/// Everything that the computations are built from, themselves and the compiler's helpers included.
const MECHANICS: [&str; 17] = [
    "approx",
    "autocfg",
    "libm",
    "mechanics",
    "nalgebra",
    "num-complex",
    "num-integer",
    "num-rational",
    "num-traits",
    "proc-macro2",
    "quote",
    "simba",
    "syn",
    "thiserror",
    "thiserror-impl",
    "typenum",
    "unicode-ident",
];

/// No clock, thread pool, JSON or logging can come in behind the computations' back: each new dependency, however
/// indirect, has to be allowed here.
#[test]
fn the_computations_depend_on_what_is_allowed_and_nothing_else() {
    let output = Command::new(env!("CARGO"))
        .args(["tree", "--package", "mechanics", "--edges", "normal,build", "--target", "all"])
        .args(["--prefix", "none", "--format", "{p}", "--offline", "--locked"])
        .current_dir(env!("CARGO_MANIFEST_DIR"))
        .output()
        .unwrap();
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
    let tree = String::from_utf8(output.stdout).unwrap();
    let found: BTreeSet<&str> = tree.lines().filter_map(|line| line.split(' ').next()).collect();
    assert_eq!(found, BTreeSet::from(MECHANICS));
}
