//! Python with general-purpose numerical libraries, in `target/py`: the other side of checks and benchmarks.
use crate::{house, packages, shell};
use anyhow::{Context, Result};
use std::fs;
use std::path::PathBuf;
use std::process::Command;

const REQUIREMENTS: &str = "tests/reference/requirements.txt";

/// A Python that has the pinned libraries, with one thread and no bytecode beside the sources.
pub struct Python {
    program: PathBuf,
}

/// Makes the environment when it does not answer the list of requirements.
pub fn ready() -> Result<Python> {
    let folder = house::root().join("target/py");
    let program = folder.join("bin/python");
    let list = house::root().join(REQUIREMENTS);
    let wanted = house::sha256_hex(&house::read(&list)?);
    let stamp = folder.join("installed");
    if program.exists() && fs::read_to_string(&stamp).is_ok_and(|kept| kept == wanted) {
        return Ok(Python { program });
    }
    if shell::find("python3").is_none() || !can_make_environments() {
        packages::install(
            "Python with its venv module is needed by the checks",
            &["python3", "python3-venv"],
        )?;
    }
    println!("Installing the Python libraries of {REQUIREMENTS} into target/py.");
    let mut make = Command::new("python3");
    shell::output(
        "python3 -m venv",
        make.args(["-m", "venv", "--clear"]).arg(&folder),
    )?;
    let mut install = Command::new(&program);
    install
        .args([
            "-m",
            "pip",
            "install",
            "--quiet",
            "--only-binary",
            ":all:",
            "-r",
        ])
        .arg(&list);
    shell::output("pip install", &mut install)?;
    house::write(&stamp, wanted.as_bytes())?;
    Ok(Python { program })
}

fn can_make_environments() -> bool {
    let mut ask = Command::new("python3");
    shell::output("python3", ask.args(["-c", "import ensurepip, venv"])).is_ok()
}

impl Python {
    /// A call of it on one thread.
    pub fn command(&self) -> Command {
        let mut command = Command::new(&self.program);
        for threads in ["OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"] {
            command.env(threads, "1");
        }
        command
            .env("PYTHONDONTWRITEBYTECODE", "1")
            .current_dir(house::root());
        command
    }

    /// The program itself.
    pub fn program(&self) -> &PathBuf {
        &self.program
    }

    /// The folder of the recordings that pyEDFlib's own tests read; they stay in the installed package.
    pub fn recordings(&self) -> Result<PathBuf> {
        let ask = "import os, pyedflib; print(os.path.join(os.path.dirname(pyedflib.__file__), 'tests', 'data'))";
        let mut command = self.command();
        let said = shell::output("python", command.args(["-c", ask]))?;
        let folder = PathBuf::from(said.trim());
        folder
            .is_dir()
            .then_some(folder)
            .context("the installed pyedflib holds no test recordings")
    }
}

/// Makes the check values anew.
pub fn reference() -> Result<()> {
    let python = ready()?;
    let mut make = python.command();
    make.arg("tests/reference/make_reference.py")
        .args(["--out", "tests/reference", "--edf"])
        .arg(python.recordings()?);
    shell::run("tests/reference/make_reference.py", &mut make)?;
    println!("tests/reference is made anew; git diff shows what changed.");
    Ok(())
}
