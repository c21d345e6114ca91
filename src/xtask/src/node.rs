//! Node and the npm packages that bundle, check and drive the page; their versions stand in `package-lock.json`.
use crate::{house, packages, shell};
use anyhow::{Result, bail};
use std::fs;
use std::path::PathBuf;
use std::process::Command;

const STAMP: &str = "node_modules/.teasel-lock";

/// Installs the packages when `node_modules` does not answer the lock file.
pub fn ready() -> Result<()> {
    if shell::find("node").is_none() || shell::find("npm").is_none() {
        packages::install("Node.js is needed to bundle the page", &["nodejs", "npm"])?;
    }
    let root = house::root();
    let lock = house::sha256_hex(&house::read(root.join("package-lock.json"))?);
    if fs::read_to_string(root.join(STAMP)).is_ok_and(|stamp| stamp == lock) {
        return Ok(());
    }
    println!("Installing the npm packages of package-lock.json.");
    let mut install = Command::new("npm");
    install
        .args(["ci", "--no-audit", "--no-fund", "--loglevel=error"])
        .current_dir(&root);
    shell::output("npm ci", &mut install)?;
    house::write(root.join(STAMP), lock.as_bytes())
}

/// A command of an installed npm package.
pub fn tool(name: &str) -> Result<Command> {
    let path: PathBuf = house::root().join("node_modules/.bin").join(name);
    if !path.exists() {
        bail!(
            "{} is missing; delete node_modules and run this again",
            path.display()
        );
    }
    let mut command = Command::new(path);
    command.current_dir(house::root());
    Ok(command)
}
