//! Weights, results, series and archives: schemas, precision, hostile names, the same bytes twice.
use super::sample::{self, HOSTILE};
use serde_json::Value;
use std::io::Read;
use teasel_core::analysis::Series;
use teasel_core::recording::Stretch;
use teasel_core::takeaway::*;

fn json(text: &str) -> Value {
    serde_json::from_str(text).unwrap()
}

#[test]
fn results_follow_the_schema_in_full_precision() {
    let mut sheet = sample::sheet();
    sheet.stronger[0].filter[0] = 0.1 + 0.2;
    let text = results_json(&sheet).unwrap();
    assert!(text.contains("0.30000000000000004"));
    assert_eq!(text, results_json(&sheet.clone()).unwrap());
    let results = json(&text);
    let paths = [
        ("/teasel_results", "1"),
        ("/recipe/keep", "5"),
        ("/recording/name", "\"night-watch.edf\""),
        ("/recording/rate_hz", "250.0"),
        ("/recording/channels/3/name", "\"CP1\""),
        ("/recording/channels/3/unit", "\"µV\""),
        ("/recording/duration_s", "240.0"),
        ("/recording/events/buoy", "42"),
        ("/windows/paired", "true"),
        ("/windows/signal/used", "40"),
        ("/windows/reference/dropped/partner", "1"),
        ("/rank", "6"),
        ("/compression/kept", "5"),
        ("/compression/share", "0.991"),
        ("/compression/eigenvalues/6", "1e-13"),
        ("/compression/guides/held_out_peak", "5"),
        ("/measure", "\"typical\""),
        ("/shrinkage", "0.1"),
        ("/components/0/typical/held_out", "2.83"),
        ("/components/0/typical/interval/1", "3.47"),
        ("/components/0/total/held_out", "3.06"),
        ("/components/0/p", "0.004"),
        ("/weaker/0/typical/held_out", "0.35"),
        ("/compare/first_pc/typical/held_out", "1.38"),
        ("/compare/first_pc/index", "1"),
        ("/compare/best_pc/index", "3"),
        ("/compare/best_channel/name", "\"C3\""),
        ("/warnings/0", "\"T7 was left out.\""),
    ];
    for (path, expected) in paths {
        let found = results.pointer(path).map(Value::to_string);
        assert_eq!(found.as_deref(), Some(expected), "{path}");
    }
    let component = &results["components"][0];
    assert_eq!(component["filter"].as_array().unwrap().len(), 7);
    assert_eq!(component["filter_raw"].as_array().unwrap().len(), 8);
    assert_eq!(component["pattern"].as_array().unwrap().len(), 7);
    assert_eq!(component["total"]["folds"].as_array().unwrap().len(), 3);
    // The recipe inside is one that can be used again.
    let recipe = recipe_from_json(&results["recipe"].to_string()).unwrap();
    assert_eq!(recipe, sheet.recipe);
}

#[test]
fn results_before_anything_is_computed_are_null_and_empty() {
    let results = json(&results_json(&sample::bare()).unwrap());
    assert!(results["windows"].is_null() && results["compression"].is_null());
    assert_eq!(results["components"], json("[]"));
    assert_eq!(results["compare"], json("{}"));
    assert!(weights_json(&sample::bare()).is_err() && weights_csv(&sample::bare()).is_err());
}

#[test]
fn weights_read_back_bit_for_bit() {
    let sheet = sample::sheet();
    let text = weights_json(&sheet).unwrap();
    assert_eq!(text, weights_json(&sheet).unwrap());
    let weights = Weights::from_json(&text).unwrap();
    assert_eq!(
        weights.component_names(),
        ["stronger 1", "stronger 2", "weaker 1", "weaker 2"]
    );
    assert_eq!(weights.rate_hz, 250.0);
    assert_eq!(weights.preparation.filter, sheet.recipe.filter);
    assert_eq!(weights.preparation.channels, sheet.recipe.channels);
    // T7 is left out: no filter and no pattern uses it.
    let names: Vec<&str> = weights.channels.iter().map(|c| c.name.as_str()).collect();
    assert_eq!(names, &sample::CHANNELS[..7]);
    let all = sheet.stronger.iter().chain(&sheet.weaker);
    for (k, component) in all.enumerate() {
        assert_eq!(weights.filters[k], component.filter_raw[..7]);
        let pattern: Vec<f64> = weights.patterns[k].iter().map(|a| a.unwrap()).collect();
        assert_eq!(pattern, component.pattern);
        assert_eq!(weights.ratios[k], component.typical.fitted);
        assert_eq!(weights.held_out[k], component.typical.held_out);
    }
}

#[test]
fn a_channel_that_only_the_filter_uses_has_no_pattern() {
    let mut sheet = sample::sheet();
    sheet.stronger[0].filter_raw[7] = 0.5;
    let weights = Weights::from_json(&weights_json(&sheet).unwrap()).unwrap();
    assert_eq!(weights.channels[7].name, "T7");
    assert_eq!((weights.filters[0][7], weights.patterns[0][7]), (0.5, None));
    let csv = weights_csv(&sheet).unwrap();
    assert!(csv.lines().last().unwrap().ends_with(",,,,"), "{csv}");
}

#[test]
fn broken_weights_are_refused_with_their_place() {
    let good = weights_json(&sample::sheet()).unwrap();
    let change = |path: &str, value: Value| {
        let mut weights = json(&good);
        *weights.pointer_mut(path).unwrap() = value;
        weights.to_string()
    };
    let cases = [
        (
            change("/teasel_weights", 2.into()),
            "another version",
            "teasel_weights",
        ),
        (change("/rate_hz", 0.into()), "breaks its rules", "rate_hz"),
        (
            change("/rate_hz", Value::Null),
            "breaks its rules",
            "rate_hz",
        ),
        (
            change("/filters/0", json("[1]")),
            "breaks its rules",
            "filters",
        ),
        (
            change("/filters/0/0", "x".into()),
            "breaks its rules",
            "filters.1.1",
        ),
        (
            change("/patterns", json("[]")),
            "breaks its rules",
            "patterns",
        ),
        (change("/ratios", json("[1]")), "breaks its rules", "ratios"),
        (
            change("/filters", json("[]")),
            "breaks its rules",
            "filters",
        ),
        (
            change("/preparation/filter", json("{\"high\": 1}")),
            "breaks its rules",
            "preparation.filter",
        ),
        (
            good.replacen('{', "{\"more\": 1,", 1),
            "breaks its rules",
            "line 1",
        ),
        (String::new(), "is empty", ""),
        (good[..good.len() / 2].into(), "not JSON", "line"),
    ];
    for (text, what, place) in cases {
        let problem = Weights::from_json(&text).expect_err(what);
        assert!(problem.what.contains(what), "{problem}");
        assert!(
            problem.place.clone().unwrap_or_default().contains(place),
            "{problem}"
        );
    }
}

/// Reads a table back by the csv library and undoes nothing.
fn rows(text: &str) -> Vec<Vec<String>> {
    csv::ReaderBuilder::new()
        .has_headers(false)
        .from_reader(text.as_bytes())
        .records()
        .map(|r| r.unwrap().iter().map(String::from).collect())
        .collect()
}

#[test]
fn weights_csv_has_one_channel_a_row_and_exact_numbers() {
    let sheet = sample::sheet();
    let table = rows(&weights_csv(&sheet).unwrap());
    assert_eq!(
        table[0].join(","),
        "channel,unit,filter_1,filter_2,filter_3,filter_4,pattern_1,pattern_2,pattern_3,pattern_4"
    );
    assert_eq!(table.len(), 8);
    for (k, row) in table[1..].iter().enumerate() {
        assert_eq!(row[0], sample::CHANNELS[k]);
        assert_eq!(
            row[2].parse::<f64>().unwrap(),
            sheet.stronger[0].filter_raw[k]
        );
        assert_eq!(row[9].parse::<f64>().unwrap(), sheet.weaker[1].pattern[k]);
    }
}

#[test]
fn hostile_names_stay_text_in_tables_and_exact_in_json() {
    let sheet = sample::hostile();
    for row in &rows(&weights_csv(&sheet).unwrap())[1..] {
        for cell in row {
            let formula = cell.starts_with(['=', '+', '@', '\t', '\0']);
            let minus = cell.starts_with('-') && cell.parse::<f64>().is_err();
            assert!(!formula && !minus, "{cell:?}");
        }
    }
    let weights = Weights::from_json(&weights_json(&sheet).unwrap()).unwrap();
    assert_eq!(weights.channels[0].name, HOSTILE[0]);
    assert_eq!(weights.channels[3].name, HOSTILE[3]);
    let results = json(&results_json(&sheet).unwrap());
    assert_eq!(results["recording"]["channels"][1]["name"], HOSTILE[1]);
}

#[test]
fn series_keep_every_bit_as_csv_and_npy() {
    let series = Series {
        names: vec!["stronger 1".into(), "weaker 1".into()],
        samples: vec![
            vec![0.1 + 0.2, -1.5e-9, 3.0],
            vec![f64::MIN_POSITIVE, 0.0, -7.25],
        ],
        rate_hz: 250.0,
        stretches: vec![
            Stretch {
                first: 0,
                count: 2,
                onset_s: 0.0,
            },
            Stretch {
                first: 2,
                count: 1,
                onset_s: 10.5,
            },
        ],
    };
    let table = rows(&series_csv(&series).unwrap());
    assert_eq!(table[0], ["time_s", "stronger_1", "weaker_1"]);
    for k in 0..3 {
        for c in 0..2 {
            assert_eq!(
                table[k + 1][c + 1].parse::<f64>().unwrap(),
                series.samples[c][k]
            );
        }
    }
    let times: Vec<&str> = table[1..].iter().map(|r| r[0].as_str()).collect();
    assert_eq!(times, ["0", "0.004", "10.5"]);
    let bytes = series_npy(&series).unwrap();
    let npy = npyz::NpyFile::new(&bytes[..]).unwrap();
    assert_eq!(npy.shape(), [2, 3]);
    assert_eq!(npy.order(), npyz::Order::C);
    assert_eq!(npy.into_vec::<f64>().unwrap(), series.samples.concat());
}

#[test]
fn archives_are_whole_safe_and_the_same_twice() {
    let files: Vec<(String, Vec<u8>)> = vec![
        ("weights.json".into(), b"{}".to_vec()),
        ("figures/stronger-1-map.svg".into(), b"<svg/>".to_vec()),
        ("../../etc/passwd".into(), b"x".to_vec()),
        ("C:\\Windows\\con.txt".into(), b"y".to_vec()),
        ("=1+1".into(), b"z".to_vec()),
        ("a b".into(), b"1".to_vec()),
        ("A_b".into(), b"2".to_vec()),
        ("\u{202e}gnp.🦔".into(), b"3".to_vec()),
        ("README.txt".into(), b"mine".to_vec()),
        (format!("{}.svg", "n".repeat(300)), b"4".to_vec()),
        ("".into(), vec![]),
    ];
    let bytes = archive(&files).unwrap();
    assert_eq!(bytes, archive(&files).unwrap());
    let mut zip = zip::ZipArchive::new(std::io::Cursor::new(&bytes)).unwrap();
    let names: Vec<String> = (0..zip.len())
        .map(|k| zip.by_index(k).unwrap().name().unwrap().to_string())
        .collect();
    assert_eq!(names.len(), files.len() + 2);
    let mut lower: Vec<String> = names.iter().map(|n| n.to_ascii_lowercase()).collect();
    lower.sort();
    lower.dedup();
    assert_eq!(lower.len(), names.len(), "{names:?}");
    for name in &names {
        assert!(
            !name.contains("..") && !name.starts_with('/') && name.len() <= 170,
            "{name}"
        );
        assert!(
            name.chars()
                .all(|c| c.is_ascii_alphanumeric() || "._-/".contains(c)),
            "{name}"
        );
    }
    let mut manifest = String::new();
    zip.by_name("manifest.txt")
        .unwrap()
        .read_to_string(&mut manifest)
        .unwrap();
    for line in manifest.lines() {
        let (sum, name) = line.split_once("  ").unwrap();
        let mut content = Vec::new();
        zip.by_name(name)
            .unwrap()
            .read_to_end(&mut content)
            .unwrap();
        use sha2::Digest;
        let digest: String = sha2::Sha256::digest(&content)
            .iter()
            .map(|b| format!("{b:02x}"))
            .collect();
        assert_eq!(digest, sum, "{name}");
    }
    assert_eq!(manifest.lines().count(), names.len() - 1);
    let mut readme = String::new();
    zip.by_name("README.txt")
        .unwrap()
        .read_to_string(&mut readme)
        .unwrap();
    assert!(readme.contains(teasel_core::CAUTION) && readme.contains("weights.json"));
    assert!(readme.lines().count() < 24, "{readme}");
}

#[test]
fn file_names_are_safe_everywhere() {
    let cases = [
        ("night watch.edf", "night_watch.edf"),
        ("..", "file"),
        (".hidden", "hidden"),
        ("-rf", "rf"),
        ("nul", "_nul"),
        ("COM1.svg", "_COM1.svg"),
        ("<script>", "_script_"),
        ("a/b", "a_b"),
    ];
    for (name, safe) in cases {
        assert_eq!(safe_name(name), safe);
    }
}

#[test]
fn channels_of_one_name_keep_their_own_numbers() {
    let mut sheet = sample::sheet();
    for at in [1, 4] {
        sheet.channels[at].name = "EEG".into();
        sheet.preparation.as_mut().unwrap().channels[at] = "EEG".into();
    }
    let weights = Weights::from_json(&weights_json(&sheet).unwrap()).unwrap();
    let pattern: Vec<f64> = weights.patterns[0].iter().map(|a| a.unwrap()).collect();
    assert_eq!(pattern, sheet.stronger[0].pattern);
    assert_eq!(weights.filters[0], sheet.stronger[0].filter_raw[..7]);
}
