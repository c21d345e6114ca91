//! The page's crate as a WebAssembly module with its bindings, in `target/page/`.
use crate::{house, node, shell, toolchain};
use anyhow::{Context, Result};
use std::fs;
use std::path::{Path, PathBuf};
use std::time::Instant;
use wasm_bindgen_cli_support::Bindgen;

/// What the compiler may have used: the optimiser must allow the same.
const FEATURES: &[&str] = &[
    "--enable-simd",
    "--enable-bulk-memory",
    "--enable-nontrapping-float-to-int",
    "--enable-sign-ext",
    "--enable-mutable-globals",
    "--enable-multivalue",
    "--enable-reference-types",
    "--enable-extended-const",
];

/// The folder of `teasel_page.js`, its types, and the module as compiled.
pub fn folder() -> Result<PathBuf> {
    house::target("page")
}

/// How much work goes into the module.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Finish {
    /// As it is given away: small and fast.
    Shipped,
    /// While one works on it: built in a fraction of the time.
    Draft,
}

impl Finish {
    /// Draft or not.
    pub fn draft(draft: bool) -> Self {
        if draft {
            Finish::Draft
        } else {
            Finish::Shipped
        }
    }

    /// The cargo profile.
    pub fn profile(self) -> &'static str {
        match self {
            Finish::Shipped => "page",
            Finish::Draft => "draft",
        }
    }
}

/// Compiles, binds, shrinks and packs; gives the gzipped module that goes into the page.
pub fn build(finish: Finish) -> Result<Vec<u8>> {
    let chosen = toolchain::choose()?;
    let started = Instant::now();
    println!("Compiling the page's module.");
    shell::run("compiling the module", &mut chosen.cargo_build(finish)?)?;
    let compiled = house::target("wasm")?
        .join(toolchain::TARGET)
        .join(finish.profile())
        .join("teasel_page.wasm");
    let bound = bind(&compiled)?;
    let (module, packed) = match finish {
        Finish::Shipped => {
            let module = shrink(&bound)?;
            let packed = pack(&module)?;
            (module, packed)
        }
        Finish::Draft => {
            let module = house::read(&bound)?;
            let packed = crate::bundle::gzip(&module);
            (module, packed)
        }
    };
    println!(
        "Module: {} KB as compiled, {} KB as shipped, {} KB packed; {:.0} s.",
        bound.metadata()?.len() / 1000,
        module.len() / 1000,
        packed.len() / 1000,
        started.elapsed().as_secs_f64()
    );
    Ok(packed)
}

/// Writes the bindings as an ES module, which the bundler turns into classic scripts for the page and for the worker.
fn bind(compiled: &Path) -> Result<PathBuf> {
    let folder = folder()?;
    Bindgen::new()
        .input_path(compiled)
        .out_name("teasel_page")
        .web(true)?
        .typescript(true)
        .remove_name_section(true)
        .remove_producers_section(true)
        .generate(&folder)
        .context("making the bindings failed")?;
    Ok(folder.join("teasel_page_bg.wasm"))
}

/// Runs the size and speed pass of npm's binaryen, once for each input.
fn shrink(bound: &Path) -> Result<Vec<u8>> {
    let before = house::read(bound)?;
    let after = once("shrunk", &before, |beside| {
        let mut command = node::tool("wasm-opt")?;
        command
            .args(FEATURES)
            .args(["-O3", "--strip-debug", "--strip-producers"])
            .arg(bound)
            .arg("-o")
            .arg(beside);
        shell::output("wasm-opt", &mut command).map(drop)
    })?;
    Ok(if after.len() < before.len() {
        after
    } else {
        before
    })
}

/// Gzip by Zopfli, which searches longer and saves a twentieth; once for each input.
fn pack(module: &[u8]) -> Result<Vec<u8>> {
    once("packed", module, |beside| {
        let file = fs::File::create(beside)?;
        let options = zopfli::Options::default();
        Ok(zopfli::compress(
            options,
            zopfli::Format::Gzip,
            module,
            file,
        )?)
    })
}

/// What `make` writes for an input, kept in `target/page/` until the input changes.
fn once(kind: &str, input: &[u8], make: impl FnOnce(&Path) -> Result<()>) -> Result<Vec<u8>> {
    let folder = house::target("page")?.join(kind);
    let kept = folder.join(house::sha256_hex(input));
    if !kept.exists() {
        if folder.exists() {
            fs::remove_dir_all(&folder)?;
        }
        fs::create_dir_all(&folder)?;
        let beside = kept.with_extension("tmp");
        make(&beside)?;
        fs::rename(&beside, &kept)?;
    }
    house::read(&kept)
}
