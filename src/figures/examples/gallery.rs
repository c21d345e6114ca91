//! Writes every figure of a made-up sheet as SVG, light and dark: `cargo run -p teasel-figures --example gallery -- FOLDER`.
use std::path::Path;
use teasel_figures::{Figure, Look, Scheme};

#[path = "../src/sample.rs"]
mod sample;

/// The widths at which the page shows each figure.
fn width(name: &str) -> u32 {
    let part = name
        .rsplit_once(|c: char| c.is_ascii_digit())
        .map_or(name, |(_, p)| p.trim_start_matches('-'));
    match part {
        "channels-map" => 250,
        "channels" => 650,
        "map" | "filter" => 250,
        "spectrum" | "course" | "average" | "trials" => 520,
        "ratio" | "ratio-axis" => 210,
        "map-small" => 48,
        "spectrum-small" => 120,
        "beside" => 510,
        "alike" | "alike-weaker" => 338,
        _ => 888,
    }
}

fn write(folder: &Path, name: &str, figure: &Figure, width: u32) -> std::io::Result<()> {
    for (scheme, suffix) in [(Scheme::Light, "light"), (Scheme::Dark, "dark")] {
        let look = Look {
            scheme,
            ..Look::default()
        };
        let height = teasel_figures::height(figure, width);
        let text = teasel_figures::svg(figure, width, height, &look);
        std::fs::write(folder.join(format!("{name}.{suffix}.svg")), text)?;
    }
    Ok(())
}

/// Every figure of the Night watch demo, computed.
fn night_watch(folder: &Path) -> Result<(), Box<dyn std::error::Error>> {
    std::fs::create_dir_all(folder)?;
    let demo = teasel_core::demo::night_watch(1);
    let mut analysis = teasel_core::analysis::Analysis::new(demo.recording, demo.recipe)?;
    analysis.run(|_| ())?;
    for (name, _) in teasel_figures::names(analysis.sheet()) {
        if let Some(figure) = teasel_figures::from_sheet(analysis.sheet(), &name) {
            write(folder, &name, &figure, width(&name))?;
        }
    }
    let shown: Vec<usize> = (0..8).collect();
    let traces = teasel_figures::traces(analysis.recording(), 60.0, 10.0, &shown);
    write(folder, "traces", &traces, 888)?;
    Ok(())
}

fn main() -> Result<(), Box<dyn std::error::Error>> {
    let folder = std::env::args()
        .nth(1)
        .unwrap_or_else(|| "gallery".to_owned());
    let folder = Path::new(&folder);
    for (part, channels, trials) in [("", 32, 40), ("many/", 128, 400), ("narrow/", 32, 40)] {
        let sheet = sample::sheet(channels, trials);
        let folder = folder.join(part);
        std::fs::create_dir_all(&folder)?;
        for (name, _) in teasel_figures::names(&sheet) {
            if let Some(figure) = teasel_figures::from_sheet(&sheet, &name) {
                let width = match part {
                    "narrow/" => width(&name).min(320),
                    _ => width(&name),
                };
                write(&folder, &name, &figure, width)?;
            }
        }
        let recording = sample::recording(channels);
        let shown: Vec<usize> = (0..if channels == 32 { 8 } else { 64 }).collect();
        write(
            &folder,
            "traces",
            &teasel_figures::traces(&recording, 112.0, 10.0, &shown),
            888,
        )?;
        write(
            &folder,
            "traces-minute",
            &teasel_figures::traces(&recording, 70.0, 60.0, &shown),
            888,
        )?;
        write(
            &folder,
            "traces-short",
            &teasel_figures::traces(&recording, 20.0, 2.0, &shown[..4]),
            888,
        )?;
    }
    night_watch(&folder.join("watch"))
}
