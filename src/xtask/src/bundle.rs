//! The page as one file: `index.html` with the style sheet, the scripts, the worker and the module inside, under its policy.
//!
//! `index.html` must hold, each exactly once:
//!
//! | text | becomes |
//! |---|---|
//! | `<meta charset="utf-8">` | the same, followed by the policy with the script's hash |
//! | `<link rel="stylesheet" href="www/style.css">` | `<style>…</style>` |
//! | `<script type="module" src="www/main.js"></script>` | two data blocks (module, worker) and one classic script |
//!
//! Data blocks are not scripts to the browser, so the policy's hash list holds one hash: that of the page's script. The worker
//! starts as a classic worker from a Blob, because a module worker from a Blob does not start from `file://`.
use crate::{house, node, shell, wasm};
use anyhow::{Context, Result, bail};
use base64::prelude::{BASE64_STANDARD, Engine};
use flate2::{Compression, write::GzEncoder};
use sha2::{Digest, Sha256};
use std::io::Write;
use std::path::{Path, PathBuf};
use std::time::SystemTime;

const CHARSET: &str = r#"<meta charset="utf-8">"#;
const STYLE: &str = r#"<link rel="stylesheet" href="www/style.css">"#;
const SCRIPT: &str = r#"<script type="module" src="www/main.js"></script>"#;

/// A built page.
pub struct Page {
    /// Where it lies.
    pub path: PathBuf,
    /// What it holds.
    pub html: Vec<u8>,
}

/// Where the page is written.
pub fn page_path() -> PathBuf {
    house::root().join("dist/teasel.html")
}

/// Builds everything that is stale and writes `dist/teasel.html` and `dist/teasel.html.sha256`.
pub fn build(finish: wasm::Finish) -> Result<Page> {
    node::ready()?;
    let module = wasm::build(finish)?;
    let www = house::root().join("www");
    let html = assemble(
        &house::read_text(house::root().join("index.html"))?,
        &bundled(&www.join("style.css"))?,
        &bundled(&www.join("main.js"))?,
        &bundled(&www.join("worker.js"))?,
        &module,
    )?
    .into_bytes();
    let path = page_path();
    house::write(&path, &html)?;
    let sum = format!("{}  teasel.html\n", house::sha256_hex(&html));
    house::write(
        house::root().join("dist/teasel.html.sha256"),
        sum.as_bytes(),
    )?;
    Ok(Page { path, html })
}

/// Prints the page's place, size and sum.
pub fn say_size(page: &Page) {
    println!(
        "{}: {} bytes, {} bytes gzipped\nSHA-256 {}",
        page.path.display(),
        page.html.len(),
        gzip(&page.html).len(),
        house::sha256_hex(&page.html)
    );
}

/// Whether a source of the page is younger than the page.
pub fn stale() -> bool {
    let root = house::root();
    let sources: Vec<PathBuf> = [
        "src/core",
        "src/figures",
        "src/page",
        "src/xtask/src",
        "www",
        "index.html",
        "Cargo.lock",
        "package-lock.json",
    ]
    .iter()
    .map(|name| root.join(name))
    .collect();
    let built: Option<SystemTime> = house::youngest(&[page_path()]);
    built.is_none() || house::youngest(&sources) > built
}

/// Gzip at its smallest.
pub fn gzip(bytes: &[u8]) -> Vec<u8> {
    let mut encoder = GzEncoder::new(Vec::new(), Compression::best());
    // Writing to memory cannot fail; an empty result would be seen at once.
    let _ = encoder.write_all(bytes);
    encoder.finish().unwrap_or_default()
}

/// One entry with all it imports, as one classic script or one style sheet.
fn bundled(entry: &Path) -> Result<String> {
    let module = wasm::folder()?.join("teasel_page.js");
    let mut command = node::tool("esbuild")?;
    command.arg(entry).args([
        "--bundle",
        "--minify",
        "--format=iife",
        "--target=es2022",
        "--charset=utf8",
        "--legal-comments=none",
        "--log-level=warning",
        // The bindings would fetch the module from beside themselves; ours is always handed over.
        "--define:import.meta.url=\"about:blank\"",
    ]);
    command.arg(format!("--alias:teasel-module={}", module.display()));
    shell::output("esbuild", &mut command)
}

fn assemble(index: &str, style: &str, script: &str, worker: &str, packed: &[u8]) -> Result<String> {
    let (script, worker) = (script.trim(), worker.trim());
    for (name, text) in [("www/main.js", script), ("www/worker.js", worker)] {
        let lower = text.to_ascii_lowercase();
        if lower.contains("</script") || lower.contains("<!--") {
            bail!("{name} holds text that would end its element: break it up in the source");
        }
    }
    if style.to_ascii_lowercase().contains("</style") {
        bail!("www/style.css holds text that would end its element");
    }
    let policy = format!(
        "default-src 'none'; script-src 'sha256-{}' 'wasm-unsafe-eval'; worker-src blob:; connect-src 'none'; \
         img-src data: blob:; style-src 'unsafe-inline'; form-action 'none'; base-uri 'none'",
        BASE64_STANDARD.encode(Sha256::digest(script))
    );
    let head =
        format!("{CHARSET}\n<meta http-equiv=\"Content-Security-Policy\" content=\"{policy}\">");
    let scripts = format!(
        "<script type=\"application/gzip\" id=\"teasel-module\">{}</script>\n\
         <script type=\"text/plain\" id=\"teasel-worker\">{worker}</script>\n<script>{script}</script>",
        BASE64_STANDARD.encode(packed)
    );
    let html = replaced(index, CHARSET, &head)?;
    let html = replaced(&html, STYLE, &format!("<style>{}</style>", style.trim()))?;
    // The script last: what it holds is never searched for placeholders.
    replaced(&html, SCRIPT, &scripts)
}

fn replaced(html: &str, placeholder: &str, with: &str) -> Result<String> {
    let (before, after) = html
        .split_once(placeholder)
        .with_context(|| format!("index.html lacks  {placeholder}"))?;
    if after.contains(placeholder) {
        bail!("index.html holds more than once  {placeholder}");
    }
    Ok([before, with, after].concat())
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used, reason = "a failed unwrap fails the test")]
    use super::*;

    fn index() -> String {
        format!("<!doctype html><head>{CHARSET}{STYLE}</head><body>{SCRIPT}</body>")
    }

    #[test]
    fn policy_pins_the_script_that_is_inlined() {
        let html = assemble(&index(), "a{}", "run();\n", "work();", b"module").unwrap();
        let inlined = html
            .rsplit_once("<script>")
            .unwrap()
            .1
            .split_once("</script>")
            .unwrap()
            .0;
        let hash = BASE64_STANDARD.encode(Sha256::digest(inlined));
        assert!(html.contains(&format!("script-src 'sha256-{hash}' 'wasm-unsafe-eval';")));
        assert!(html.find("Content-Security-Policy").unwrap() < html.find("<style>").unwrap());
    }

    #[test]
    fn text_that_would_end_its_element_is_refused() {
        assert!(assemble(&index(), "", "'</SCRIPT>'", "", b"").is_err());
        assert!(assemble(&index(), "", "", "'<!--'", b"").is_err());
        assert!(assemble(&index(), "/*</style>*/", "", "", b"").is_err());
    }

    #[test]
    fn a_page_without_its_placeholders_is_refused() {
        for missing in [CHARSET, STYLE, SCRIPT] {
            let problem = assemble(&index().replace(missing, ""), "", "", "", b"").unwrap_err();
            assert!(problem.to_string().contains(missing));
        }
        let twice = index().replace(STYLE, &format!("{STYLE}{STYLE}"));
        assert!(assemble(&twice, "", "", "", b"").is_err());
    }

    #[test]
    fn the_module_comes_back_from_its_data_block() {
        let html = assemble(&index(), "", "", "", &gzip(b"a module's bytes")).unwrap();
        let block = html
            .split_once("id=\"teasel-module\">")
            .unwrap()
            .1
            .split_once('<')
            .unwrap()
            .0;
        let packed = BASE64_STANDARD.decode(block).unwrap();
        let mut bytes = Vec::new();
        std::io::copy(&mut flate2::read::GzDecoder::new(&packed[..]), &mut bytes).unwrap();
        assert_eq!(bytes, b"a module's bytes");
    }
}
