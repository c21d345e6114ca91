//! A folder for each recording of a set.
use std::collections::BTreeSet;

/// One name a recording, from file names: the name without its last extension; of several with one name (letters' case is not told
/// apart) the later ones are numbered.
pub fn folder_names(files: &[String]) -> Vec<String> {
    let mut taken = BTreeSet::new();
    files
        .iter()
        .map(|file| {
            let stem = match file.rsplit_once('.') {
                Some((stem, _)) if !stem.is_empty() => stem,
                _ => file,
            };
            let mut name = stem.to_owned();
            let mut count = 2;
            while !taken.insert(name.to_ascii_lowercase()) {
                name = format!("{stem}-{count}");
                count += 1;
            }
            name
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::folder_names;

    #[test]
    fn folders_are_named_after_files_and_never_shared() {
        let files = [
            "night.edf",
            "night.bdf",
            "Night.edf",
            "c.d.edf",
            ".edf",
            "plain",
        ];
        let names = folder_names(&files.map(String::from));
        assert_eq!(
            names,
            ["night", "night-2", "Night-3", "c.d", ".edf", "plain"]
        );
    }
}
