//! The built program, called in a folder.
use std::path::Path;
use std::process::{Command, Output};

pub fn teasel(arguments: &[&str], folder: &Path) -> Output {
    Command::new(env!("CARGO_BIN_EXE_teasel"))
        .args(arguments)
        .current_dir(folder)
        .output()
        .unwrap()
}
