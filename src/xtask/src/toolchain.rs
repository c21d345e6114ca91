//! Which Rust compiles the page to WebAssembly.
//!
//! The first that holds:
//! 1. this Rust has the target installed;
//! 2. Debian's Rust for the web is installed with the source of its standard library, which is then compiled along;
//! 3. we are root on a Debian that offers those packages: install them;
//! 4. rustup can add the target.
//!
//! What needs no download comes first.
use crate::wasm::Finish;
use crate::{house, packages, shell};
use anyhow::{Result, bail};
use std::env;
use std::path::{Path, PathBuf};
use std::process::Command;
use std::time::Duration;

/// The target triple of the page.
pub const TARGET: &str = "wasm32-unknown-unknown";
const DEBIAN: &[&str] = &["rustc-web", "cargo-web", "rust-web-src", "lld-22"];
/// rustup retries an unreachable server for long; a download of 20 MB on a slow line must still fit.
const RUSTUP_LIMIT: Duration = Duration::from_secs(120);

/// The Rust in use for the page.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Toolchain {
    /// The Rust that runs this task, with the target installed.
    Own,
    /// Debian's Rust, which compiles its own standard library along.
    Debian,
}

/// Finds one, installs one, or says what to install.
pub fn choose() -> Result<Toolchain> {
    if target_installed() {
        return Ok(Toolchain::Own);
    }
    if packages::installed(DEBIAN) {
        return Ok(Toolchain::Debian);
    }
    let why = format!("This Rust cannot compile for {TARGET} yet");
    if packages::may_install() {
        match packages::install(&why, DEBIAN) {
            Ok(()) => return Ok(Toolchain::Debian),
            Err(problem) => println!("{problem:#}"),
        }
    }
    if shell::find("rustup").is_some() {
        println!("{why}: trying  rustup target add {TARGET}");
        let mut add = Command::new("rustup");
        add.args(["target", "add", TARGET])
            .env("RUSTUP_MAX_RETRIES", "1");
        if shell::succeeds_within(RUSTUP_LIMIT, &mut add) && target_installed() {
            return Ok(Toolchain::Own);
        }
        println!("rustup could not add it.");
    }
    bail!(
        "{why}. Install one of these, then run this again:\n  rustup target add {TARGET}\n  \
         on Debian, as root: apt-get install --no-install-recommends {}",
        DEBIAN.join(" ")
    )
}

fn target_installed() -> bool {
    let mut ask = Command::new(env::var_os("RUSTC").unwrap_or_else(|| "rustc".into()));
    ask.args(["--print", "target-libdir", "--target", TARGET]);
    shell::output("rustc", &mut ask).is_ok_and(|folder| {
        Path::new(folder.trim())
            .read_dir()
            .is_ok_and(|mut entries| entries.next().is_some())
    })
}

impl Toolchain {
    /// `cargo build --profile …` for the page's crate, without what the outer cargo left in the environment.
    pub fn cargo_build(self, finish: Finish) -> Result<Command> {
        let mut command = match self {
            Toolchain::Own => {
                let mut command =
                    shell::fresh(env::var_os("CARGO").unwrap_or_else(|| "cargo".into()));
                if let Some(toolchain) = env::var_os("RUSTUP_TOOLCHAIN") {
                    command.env("RUSTUP_TOOLCHAIN", toolchain);
                }
                command
            }
            Toolchain::Debian => {
                let mut command = shell::fresh("/usr/bin/cargo");
                command
                    .env("RUSTC_BOOTSTRAP", "1")
                    .env("RUSTC", "/usr/bin/rustc")
                    .env("RUSTDOC", "/usr/bin/rustdoc");
                command
            }
        };
        command
            .args([
                "build",
                "--quiet",
                "--profile",
                finish.profile(),
                "--target",
                TARGET,
            ])
            .args(["--package", "teasel-page", "--target-dir"])
            .arg(house::target("wasm")?)
            .current_dir(house::root())
            .env("CARGO_ENCODED_RUSTFLAGS", flags(finish).join("\u{1f}"));
        if self == Toolchain::Debian {
            command.args([
                "-Zbuild-std=std,panic_abort",
                "-Zbuild-std-features=optimize_for_size",
            ]);
        }
        Ok(command)
    }
}

/// Vector instructions, and no paths of this machine in the messages of a module that is given away.
fn flags(finish: Finish) -> Vec<String> {
    let mut flags = vec!["-Ctarget-feature=+simd128,+bulk-memory".to_owned()];
    if finish == Finish::Draft {
        return flags;
    }
    let home = env::var_os("HOME").map(PathBuf::from);
    let cargo_home = env::var_os("CARGO_HOME")
        .map(PathBuf::from)
        .or_else(|| home.map(|home| home.join(".cargo")));
    let mut rename = |from: &Path, to: &str| {
        flags.push(format!("--remap-path-prefix={}={to}", from.display()));
    };
    if let Some(cargo_home) = cargo_home {
        rename(&cargo_home, "crates");
    }
    rename(&house::root(), "teasel");
    flags
}
