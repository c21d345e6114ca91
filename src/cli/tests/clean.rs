//! `teasel clean`: the files, what is said, and what is refused.
#![allow(
    clippy::unwrap_used,
    clippy::expect_used,
    reason = "a check that cannot go on fails"
)]
mod program;

use program::teasel;
use std::fs;
use std::process::Output;
use teasel_core::demo::night_watch;
use teasel_core::recipe::Keep;
use teasel_core::recording::edf;
use teasel_core::takeaway::recipe_json;

fn said(output: &Output) -> String {
    String::from_utf8_lossy(&output.stderr).into_owned()
}

#[test]
fn components_are_taken_out_in_the_terminal() {
    let desk = tempfile::tempdir().unwrap();
    let at = desk.path();
    let mut demo = night_watch(1);
    demo.recipe.keep = Keep::Number(12);
    demo.recipe.components = 1;
    let bytes = edf::write(&demo.recording, &edf::Identity::default()).unwrap();
    fs::write(at.join("watch.edf"), bytes).unwrap();
    fs::write(at.join("recipe.json"), recipe_json(&demo.recipe).unwrap()).unwrap();
    let run = |more: &[&str]| {
        let all = [
            &["clean", "recipe.json", "watch.edf", "--out", "out"][..],
            more,
        ]
        .concat();
        teasel(&all, at)
    };
    let edf = run(&["--remove", "stronger 1", "--remove", "weaker 1"]);
    assert_eq!(edf.status.code(), Some(0), "{}", said(&edf));
    assert!(
        said(&edf).contains("Removed from the prepared channels: stronger 1 and weaker 1."),
        "{}",
        said(&edf)
    );
    let written = fs::read(at.join("out/watch/cleaned.edf")).unwrap();
    let header = String::from_utf8_lossy(&written[..256]).into_owned();
    assert!(header.contains("removed_stronger-1_weaker-1"), "{header}");
    let shares = fs::read_to_string(at.join("out/watch/cleaned.csv")).unwrap();
    assert_eq!(shares.lines().count(), 33);
    let npy = run(&["--only", "stronger 1", "--as", "npy"]);
    assert_eq!(npy.status.code(), Some(0), "{}", said(&npy));
    let array = fs::read(at.join("out/watch/cleaned.npy")).unwrap();
    // Writers differ in the blanks and the last comma of a shape; readers take all of them.
    let shape = String::from_utf8_lossy(&array[..128]).replace(' ', "");
    assert!(
        shape.contains("'shape':(32,60000)") || shape.contains("'shape':(32,60000,)"),
        "{shape}"
    );
    let unknown = run(&["--remove", "stronger 7"]);
    assert_eq!(unknown.status.code(), Some(1));
    assert!(
        said(&unknown).contains("stronger 1, weaker 1"),
        "{}",
        said(&unknown)
    );
    // Nothing chosen, or both at once, is a question of usage.
    assert_eq!(run(&[]).status.code(), Some(2));
    assert_eq!(
        run(&["--remove", "stronger 1", "--only", "weaker 1"])
            .status
            .code(),
        Some(2)
    );
}
