//! Where things are, and how old they are.
use anyhow::{Context, Result};
use sha2::{Digest, Sha256};
use std::fs;
use std::path::{Path, PathBuf};
use std::time::SystemTime;

/// The folder that holds the workspace.
pub fn root() -> PathBuf {
    let here = Path::new(env!("CARGO_MANIFEST_DIR"));
    here.ancestors().nth(2).unwrap_or(here).to_path_buf()
}

/// A folder under `target/`, made when it is not there.
pub fn target(name: &str) -> Result<PathBuf> {
    let folder = root().join("target").join(name);
    fs::create_dir_all(&folder).with_context(|| format!("cannot make {}", folder.display()))?;
    Ok(folder)
}

/// The bytes of a file of the house.
pub fn read(path: impl AsRef<Path>) -> Result<Vec<u8>> {
    let path = path.as_ref();
    fs::read(path).with_context(|| format!("cannot read {}", path.display()))
}

/// The text of a file of the house.
pub fn read_text(path: impl AsRef<Path>) -> Result<String> {
    let path = path.as_ref();
    fs::read_to_string(path).with_context(|| format!("cannot read {}", path.display()))
}

/// Writes beside and renames, so that no reader sees half a file.
pub fn write(path: impl AsRef<Path>, bytes: &[u8]) -> Result<()> {
    let path = path.as_ref();
    if let Some(folder) = path.parent() {
        fs::create_dir_all(folder).with_context(|| format!("cannot make {}", folder.display()))?;
    }
    let beside = path.with_extension("tmp");
    fs::write(&beside, bytes).with_context(|| format!("cannot write {}", beside.display()))?;
    fs::rename(&beside, path).with_context(|| format!("cannot write {}", path.display()))
}

/// SHA-256 as 64 hexadecimal digits.
pub fn sha256_hex(bytes: &[u8]) -> String {
    Sha256::digest(bytes)
        .iter()
        .map(|byte| format!("{byte:02x}"))
        .collect()
}

/// When the youngest of these files, or files in these folders, was changed.
pub fn youngest(paths: &[PathBuf]) -> Option<SystemTime> {
    paths.iter().filter_map(|path| youngest_in(path)).max()
}

fn youngest_in(path: &Path) -> Option<SystemTime> {
    if path.is_dir() {
        let inside: Vec<PathBuf> = fs::read_dir(path)
            .ok()?
            .filter_map(|entry| Some(entry.ok()?.path()))
            .collect();
        return youngest(&inside);
    }
    path.metadata().ok()?.modified().ok()
}
