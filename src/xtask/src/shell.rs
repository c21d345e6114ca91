//! Other programs: found, run, timed out, and free of what the outer cargo left in the environment.
use anyhow::{Context, Result, bail};
use std::env;
use std::ffi::OsStr;
use std::path::PathBuf;
use std::process::{Command, Stdio};
use std::thread::sleep;
use std::time::{Duration, Instant};

/// Set by an outer cargo for its own toolchain and flags: another toolchain must not see them.
const OUTER: &[&str] = &[
    "CARGO",
    "RUSTC",
    "RUSTDOC",
    "RUSTFLAGS",
    "RUSTC_WRAPPER",
    "RUSTC_WORKSPACE_WRAPPER",
    "RUSTUP_TOOLCHAIN",
    "RUST_RECURSION_COUNT",
    "CARGO_ENCODED_RUSTFLAGS",
    "CARGO_BUILD_RUSTFLAGS",
    "CARGO_BUILD_TARGET",
    "CARGO_TARGET_DIR",
    "LD_LIBRARY_PATH",
];

/// A command that does not see the outer cargo's toolchain and flags.
pub fn fresh(program: impl AsRef<OsStr>) -> Command {
    let mut command = Command::new(program);
    for (name, _) in env::vars_os() {
        let text = name.to_string_lossy();
        if OUTER.contains(&&*text)
            || text.starts_with("CARGO_PKG_")
            || text.starts_with("CARGO_MANIFEST_")
        {
            command.env_remove(name);
        }
    }
    command
}

/// The cargo that runs this task.
pub fn cargo() -> Command {
    let mut command = Command::new(env::var_os("CARGO").unwrap_or_else(|| "cargo".into()));
    command.current_dir(crate::house::root());
    command
}

/// The first program of this name on the path.
pub fn find(program: &str) -> Option<PathBuf> {
    let path = env::var_os("PATH")?;
    env::split_paths(&path)
        .map(|folder| folder.join(program))
        .find(|candidate| candidate.is_file())
}

/// Runs it with our own output; an exit other than 0 is an error that names it.
pub fn run(what: &str, command: &mut Command) -> Result<()> {
    let status = command
        .status()
        .with_context(|| format!("{what}: cannot start {:?}", command.get_program()))?;
    if !status.success() {
        bail!("{what} failed ({status})");
    }
    Ok(())
}

/// Runs it quietly and gives its standard output; on failure the error holds what it said.
pub fn output(what: &str, command: &mut Command) -> Result<String> {
    let output = command
        .stdin(Stdio::null())
        .output()
        .with_context(|| format!("{what}: cannot start {:?}", command.get_program()))?;
    if !output.status.success() {
        bail!(
            "{what} failed ({})\n{}{}",
            output.status,
            String::from_utf8_lossy(&output.stdout),
            String::from_utf8_lossy(&output.stderr)
        );
    }
    Ok(String::from_utf8_lossy(&output.stdout).into_owned())
}

/// Runs it quietly for at most this long; whether it ended well.
pub fn succeeds_within(limit: Duration, command: &mut Command) -> bool {
    let started = Instant::now();
    let Ok(mut child) = command
        .stdin(Stdio::null())
        .stdout(Stdio::null())
        .stderr(Stdio::null())
        .spawn()
    else {
        return false;
    };
    loop {
        match child.try_wait() {
            Ok(Some(status)) => return status.success(),
            Ok(None) if started.elapsed() < limit => sleep(Duration::from_millis(50)),
            _ => {
                // Ended by its own handle; what it left behind is the tool's own to clean up.
                let _ = child.kill();
                let _ = child.wait();
                return false;
            }
        }
    }
}
