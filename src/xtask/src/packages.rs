//! Debian packages: what is there, and installing for root what is not.
use crate::shell;
use anyhow::{Result, bail};
use std::process::Command;

/// Whether every one of these packages is installed.
pub fn installed(packages: &[&str]) -> bool {
    shell::find("dpkg-query").is_some() && packages.iter().all(|package| has(package))
}

fn has(package: &str) -> bool {
    let asked = Command::new("dpkg-query")
        .args(["-W", "-f=${Status}", package])
        .output();
    asked.is_ok_and(|output| {
        output.status.success() && output.stdout.ends_with(b"install ok installed")
    })
}

/// Whether `apt-get` may be used: it is there and we are root.
pub fn may_install() -> bool {
    shell::find("apt-get").is_some()
        && shell::output("id", Command::new("id").arg("-u")).is_ok_and(|uid| uid.trim() == "0")
}

/// Installs what is missing of these packages, saying so first.
pub fn install(why: &str, packages: &[&str]) -> Result<()> {
    let missing: Vec<&str> = packages
        .iter()
        .copied()
        .filter(|package| !has(package))
        .collect();
    if missing.is_empty() {
        return Ok(());
    }
    let line = missing.join(" ");
    if !may_install() {
        bail!("{why}: as root, run  apt-get install --no-install-recommends {line}");
    }
    println!("{why}: installing Debian's packages {line}.");
    shell::output(
        "apt-get update",
        Command::new("apt-get").args(["update", "-qq"]),
    )?;
    let mut command = Command::new("apt-get");
    command
        .args(["install", "-y", "-qq", "--no-install-recommends"])
        .args(&missing)
        .env("DEBIAN_FRONTEND", "noninteractive");
    shell::output("apt-get install", &mut command).map(drop)
}
