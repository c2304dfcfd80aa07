//! Tells the program which commit it is built from.

use std::process::Command;

fn main() {
    println!("cargo::rerun-if-env-changed=SOURCE_COMMIT");
    let given = std::env::var("SOURCE_COMMIT").ok().filter(|commit| !commit.is_empty());
    let commit = given.or_else(|| git(&["rev-parse", "HEAD"])).unwrap_or_else(|| "unknown".to_owned());
    println!("cargo::rustc-env=SOURCE_COMMIT={commit}");
    // Also where the repository is a worktree: `git` knows where its head is kept.
    for file in ["HEAD", "logs/HEAD"] {
        if let Some(path) = git(&["rev-parse", "--path-format=absolute", "--git-path", file]) {
            println!("cargo::rerun-if-changed={path}");
        }
    }
}

fn git(arguments: &[&str]) -> Option<String> {
    let output =
        Command::new("git").args(arguments).output().ok().filter(|output| output.status.success())?;
    String::from_utf8(output.stdout).ok().map(|text| text.trim().to_owned())
}
