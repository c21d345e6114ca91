//! The methods paragraph: what was done, with every parameter, ready to be pasted into a paper and edited; and its references.
use super::kinds;
use super::words::{self, NB};
use crate::recipe::{
    BipolarReference, Keep, KeepWord, Mask, Measure, Pairs, PairsWord, Reference, ReferenceWord,
    Shrink, ShrinkWord,
};
use crate::sheet::{ChannelState, Component, MovieCard, Sheet, SideCard};

/// A source: how the text cites it, and its entry in the list.
struct Work {
    cited: &'static str,
    entry: &'static str,
}

const WORKS: [Work; 17] = [
    Work {
        cited: "Arsigny et al., 2006",
        entry: "Arsigny, V., Fillard, P., Pennec, X. & Ayache, N. (2006). Log-Euclidean metrics for fast and simple calculus on diffusion tensors. Magnetic Resonance in Medicine 56, 411–421.",
    },
    Work {
        cited: "Breiman et al., 1984",
        entry: "Breiman, L., Friedman, J. H., Olshen, R. A. & Stone, C. J. (1984). Classification and Regression Trees. Wadsworth.",
    },
    Work {
        cited: "Chen et al., 2010",
        entry: "Chen, Y., Wiesel, A., Eldar, Y. C. & Hero, A. O. (2010). Shrinkage algorithms for MMSE covariance estimation. IEEE Transactions on Signal Processing 58, 5016–5029.",
    },
    Work {
        cited: "de Cheveigné & Arzounian, 2015",
        entry: "de Cheveigné, A. & Arzounian, D. (2015). Scanning for oscillations. Journal of Neural Engineering 12, 066020.",
    },
    Work {
        cited: "de Cheveigné & Simon, 2008",
        entry: "de Cheveigné, A. & Simon, J. Z. (2008). Denoising based on spatial filtering. Journal of Neuroscience Methods 171, 331–339.",
    },
    Work {
        cited: "Efron & Tibshirani, 1993",
        entry: "Efron, B. & Tibshirani, R. J. (1993). An Introduction to the Bootstrap. Chapman & Hall.",
    },
    Work {
        cited: "Fukunaga, 1990",
        entry: "Fukunaga, K. (1990). Introduction to Statistical Pattern Recognition, 2nd edition. Academic Press.",
    },
    Work {
        cited: "Halko et al., 2011",
        entry: "Halko, N., Martinsson, P.-G. & Tropp, J. A. (2011). Finding structure with randomness: probabilistic algorithms for constructing approximate matrix decompositions. SIAM Review 53, 217–288.",
    },
    Work {
        cited: "Haufe et al., 2014",
        entry: "Haufe, S., Meinecke, F., Görgen, K., Dähne, S., Haynes, J.-D., Blankertz, B. & Bießmann, F. (2014). On the interpretation of weight vectors of linear models in multivariate neuroimaging. NeuroImage 87, 96–110.",
    },
    Work {
        cited: "Ledoit & Wolf, 2004",
        entry: "Ledoit, O. & Wolf, M. (2004). A well-conditioned estimator for large-dimensional covariance matrices. Journal of Multivariate Analysis 88, 365–411.",
    },
    Work {
        cited: "Nichols & Holmes, 2002",
        entry: "Nichols, T. E. & Holmes, A. P. (2002). Nonparametric permutation tests for functional neuroimaging: a primer with examples. Human Brain Mapping 15, 1–25.",
    },
    Work {
        cited: "Nikulin et al., 2011",
        entry: "Nikulin, V. V., Nolte, G. & Curio, G. (2011). A novel method for reliable and fast extraction of neuronal EEG/MEG oscillations on the basis of spatio-spectral decomposition. NeuroImage 55, 1528–1535.",
    },
    Work {
        cited: "Perrin et al., 1989",
        entry: "Perrin, F., Pernier, J., Bertrand, O. & Echallier, J. F. (1989). Spherical splines for scalp potential and current density mapping. Electroencephalography and Clinical Neurophysiology 72, 184–187.",
    },
    Work {
        cited: "Phipson & Smyth, 2010",
        entry: "Phipson, B. & Smyth, G. K. (2010). Permutation P-values should never be zero: calculating exact P-values when permutations are randomly drawn. Statistical Applications in Genetics and Molecular Biology 9, article 39.",
    },
    Work {
        cited: "Prim, 1957",
        entry: "Prim, R. C. (1957). Shortest connection networks and some generalizations. Bell System Technical Journal 36, 1389–1401.",
    },
    Work {
        cited: "Welch, 1967",
        entry: "Welch, P. D. (1967). The use of fast Fourier transform for the estimation of power spectra: a method based on time averaging over short, modified periodograms. IEEE Transactions on Audio and Electroacoustics 15, 70–73.",
    },
    Work {
        cited: "Widmann et al., 2015",
        entry: "Widmann, A., Schröger, E. & Maess, B. (2015). Digital filter design for electrophysiological data – a practical approach. Journal of Neuroscience Methods 250, 34–46.",
    },
];

/// One paragraph in the past tense, for what the sheet holds so far. It names channels and events, and no file.
pub fn methods(sheet: &Sheet) -> String {
    let parts = [
        channels(sheet),
        filters(sheet),
        windows(sheet),
        rejection(sheet),
        compression(sheet),
        filters_in_space(sheet),
        held_out(sheet),
        permutation(sheet),
        looks(sheet),
        Some(format!(
            "All computations were done with {} {} (seed {} for everything drawn at random).",
            crate::PROGRAM,
            crate::VERSION,
            sheet.recipe.evidence.seed
        )),
    ];
    parts.into_iter().flatten().collect::<Vec<_>>().join(" ")
}

/// The works that [`methods`] cites, in alphabetical order.
pub fn references(sheet: &Sheet) -> Vec<String> {
    let text = methods(sheet);
    WORKS
        .iter()
        .filter(|work| text.contains(work.cited))
        .map(|work| work.entry.into())
        .collect()
}

/// The same works as BibTeX.
pub fn bibtex(sheet: &Sheet) -> String {
    let entries: Vec<String> = references(sheet)
        .iter()
        .map(|line| super::bibliography::entry(line))
        .collect();
    entries.join("\n")
}

/// The paragraph with the list of its references below, as plain text.
pub fn methods_text(sheet: &Sheet) -> String {
    let cited = references(sheet);
    if cited.is_empty() {
        return methods(sheet);
    }
    format!("{}\n\n{}", methods(sheet), cited.join("\n"))
}

/// Up to a dozen names, and how many more.
fn names(names: &[String]) -> String {
    let shown: Vec<String> = names.iter().take(12).map(|n| words::name(n)).collect();
    if names.len() > 12 {
        format!("{} and {} more", shown.join(", "), names.len() - 12)
    } else {
        words::list(&shown)
    }
}

fn channels(sheet: &Sheet) -> Option<String> {
    let all = sheet.channels.len();
    if all == 0 {
        return None;
    }
    if let Some(card) = &sheet.movie {
        return Some(movie(sheet, card));
    }
    let of = |pick: fn(&ChannelState) -> bool| -> Vec<String> {
        sheet
            .channels
            .iter()
            .filter(|c| pick(&c.state))
            .map(|c| c.name.clone())
            .collect()
    };
    let out = of(|s| matches!(s, ChannelState::LeftOut));
    let unusable = of(|s| matches!(s, ChannelState::Unusable(_)));
    let replaced = of(|s| matches!(s, ChannelState::Interpolated));
    let used = all - out.len() - unusable.len();
    let mut text = format!(
        "{} channels sampled at {} were analysed",
        if used == all {
            format!("All {all}")
        } else {
            format!("{used} of {all}")
        },
        words::hertz(sheet.recording.rate_hz)
    );
    let mut notes = Vec::new();
    if !out.is_empty() {
        notes.push(format!("left out: {}", names(&out)));
    }
    if !unusable.is_empty() {
        notes.push(format!("unusable: {}", names(&unusable)));
    }
    if !replaced.is_empty() {
        notes.push(format!(
            "{} replaced by {} spherical-spline {} from the others; Perrin et al., 1989",
            names(&replaced),
            words::one(replaced.len(), "its", "their"),
            words::one(replaced.len(), "estimate", "estimates")
        ));
    }
    if !notes.is_empty() {
        text.push_str(&format!(" ({})", notes.join("; ")));
    }
    text.push_str(&match &sheet.recipe.channels.reference {
        Reference::Word(ReferenceWord::AsRecorded) => {
            ", in the reference they were recorded with.".into()
        }
        Reference::Word(ReferenceWord::Average) => ", referred to their average.".into(),
        Reference::Named(list) if list.len() == 1 => format!(", referred to {}.", names(list)),
        Reference::Named(list) => format!(", referred to the mean of {}.", names(list)),
        Reference::Bipolar(BipolarReference {
            bipolar: Pairs::Word(PairsWord::Neighbours),
        }) => ", as differences of neighbouring channels (the edges of the shortest tree that joins all; Prim, 1957).".into(),
        Reference::Bipolar(BipolarReference {
            bipolar: Pairs::List(pairs),
        }) => {
            let pairs: Vec<String> = pairs.iter().map(|[a, b]| format!("{a}–{b}")).collect();
            format!(", as the differences {}.", names(&pairs))
        }
    });
    Some(text)
}

/// What became of a movie's pixels before they were channels, in the order in which it was done.
fn movie(sheet: &Sheet, card: &MovieCard) -> String {
    let mut text = format!(
        "The movie of {} × {} pixels at {} was analysed",
        card.height,
        card.width,
        words::hertz(sheet.recording.rate_hz)
    );
    let side = words::side(card);
    let all = card.rows as usize * card.columns as usize;
    let what = words::carrier(sheet, all);
    text.push_str(&match side {
        1 => format!(", one channel a pixel ({} in all", words::grouped(all)),
        _ => format!(
            " after averaging over bins of {side} × {side} pixels ({} in all",
            words::grouped(all)
        ),
    });
    let used = words::grouped(card.used.len());
    let mask = match &sheet.recipe.movie.mask {
        None => String::new(),
        Some(Mask::Quantile(q)) => format!(
            "; the {used} {what} whose mean exceeded the {} quantile of the mean picture were used",
            words::as_chosen(q.quantile)
        ),
        Some(Mask::Above(a)) => format!(
            "; the {used} {what} whose mean exceeded {} were used",
            words::as_chosen(a.above)
        ),
        Some(Mask::Painted(_)) => {
            format!("; {used} {what} were chosen by hand on the mean picture")
        }
    };
    text.push_str(&format!("{mask})."));
    if let Some(dff) = sheet.recipe.movie.dff {
        text.push_str(&format!(
            " Each was expressed as its change relative to a running baseline, (F{NB}−{NB}F₀)/F₀, with F₀ the {}th percentile of a window of {} centred on each frame.",
            words::as_chosen(dff.percentile),
            words::seconds(dff.window_s)
        ));
    }
    text
}

fn filters(sheet: &Sheet) -> Option<String> {
    let card = sheet.preparation.as_ref()?;
    let before = match card.before_filters.as_slice() {
        [] => String::new(),
        list => format!("First, {}. ", words::list(list)),
    };
    if card.filters.is_empty() {
        return Some(format!("{before}No filter was applied."));
    }
    Some(format!(
        "{before}They were filtered with zero phase by linear-phase FIR filters (windowed sinc, Hamming window; {}; the named edges are those of the pass band; Widmann et al., 2015).",
        card.filters.join("; ")
    ))
}

fn dropped(side: &SideCard) -> String {
    match side.dropped.values().sum() {
        0 => "none".into(),
        n => words::grouped(n),
    }
}

fn windows(sheet: &Sheet) -> Option<String> {
    let card = sheet.windows.as_ref()?;
    let Some((signal, reference)) = words::windows(&sheet.recipe.contrast) else {
        return kinds::method(sheet);
    };
    let same = signal.event == reference.event;
    let counts = if card.paired {
        format!(
            "{}; {} left out",
            count(card.signal.used, "pair", "pairs"),
            dropped(&card.signal)
        )
    } else {
        format!(
            "{} against {}; {} and {} left out",
            count(card.signal.used, "signal window", "signal windows"),
            count(card.reference.used, "reference window", "reference windows"),
            dropped(&card.signal),
            dropped(&card.reference)
        )
    };
    Some(format!(
        "Signal windows ran from {} relative to the onset of “{}”, reference windows from {} relative to {} ({counts}).",
        words::window(signal),
        words::name(&signal.event),
        words::window(reference),
        if same {
            "the same onset".into()
        } else {
            format!("the onset of “{}”", words::name(&reference.event))
        }
    ))
}

/// Windows dropped for what is in them.
fn rejection(sheet: &Sheet) -> Option<String> {
    let card = sheet.rejection.as_ref()?;
    let criteria: Vec<String> = card
        .criteria
        .iter()
        .map(|c| {
            let limit = match c.unit.as_str() {
                "" => words::three(c.limit),
                unit => format!("{}{NB}{}", words::three(c.limit), words::plain(unit, 8)),
            };
            match c.name.as_str() {
                "amplitude" => format!("a channel’s peak-to-peak amplitude exceeded {limit}"),
                "step" => format!("a step between two samples exceeded {limit}"),
                "flat" => format!("a channel’s peak-to-peak amplitude was below {limit}"),
                _ => format!("the variance relative to the pooled covariance exceeded {limit}"),
            }
        })
        .collect();
    Some(format!(
        "Windows were dropped where {} ({} of {}); the limits were set over the windows of both sides together, blind to the labels.",
        criteria.join(" or where "),
        words::grouped(card.windows[0] - card.windows[1]),
        words::grouped(card.windows[0])
    ))
}

fn count(n: usize, single: &str, many: &str) -> String {
    format!("{} {}", words::grouped(n), words::one(n, single, many))
}

/// "the channels were first projected onto …; " where there are too many for a covariance matrix.
fn basis(sheet: &Sheet) -> String {
    let Some(card) = sheet.compression.as_ref().and_then(|c| c.basis.as_ref()) else {
        return String::new();
    };
    let how = if card.exact {
        "an orthonormal basis of {} dimensions from the eigenvectors of the Gram matrix of the samples in the windows"
    } else {
        "an orthonormal basis of {} dimensions found by a randomised range finder with power iterations (Halko et al., 2011)"
    };
    format!(
        "the {} were first projected onto {} ({} of their variance lies outside); ",
        words::carrier(sheet, 2),
        how.replace("{}", &card.dimensions.to_string()),
        words::percent(card.left_out)
    )
}

fn compression(sheet: &Sheet) -> Option<String> {
    let card = sheet.compression.as_ref()?;
    let choice = match sheet.recipe.keep {
        Keep::Number(_) => "set by hand",
        Keep::Word(KeepWord::Auto) => "the smaller of the rank and 150",
        Keep::Word(KeepWord::Best) => {
            "the smallest number within one standard error of the best held-out ratio (Breiman et al., 1984), chosen again inside every fold and every permutation"
        }
    };
    let caveat = match sheet.recipe.keep {
        Keep::Number(_) => {
            " Had this number been chosen after looking at these results, neither the held-out ratios nor p would account for that."
        }
        Keep::Word(_) => "",
    };
    Some(format!(
        "Each window’s covariance was taken about the window’s own {} means; {}the {} (rank {}) were compressed to {} dimensions ({} of the variance; {choice}) by the leading principal components of the covariance pooled over both sides, that is without use of the labels.{caveat}",
        words::carrier(sheet, 1),
        basis(sheet),
        match &card.basis {
            Some(_) => "dimensions of this basis",
            None => words::carrier(sheet, 2),
        },
        card.rank,
        card.kept,
        words::percent(card.share)
    ))
}

fn filters_in_space(sheet: &Sheet) -> Option<String> {
    let amount = words::as_chosen(sheet.shrinkage?);
    let text = match sheet.recipe.measure {
        Measure::Typical => {
            let mean = if sheet.windows.as_ref().is_some_and(|w| w.paired) {
                "the mean over trials of the difference between the matrix logarithms of the signal and the reference window’s covariance"
            } else {
                "the difference between the two sides’ mean matrix logarithms of the windows’ covariances"
            };
            format!(
                "Spatial filters were the eigenvectors of {mean} (a difference of log-Euclidean means; Arsigny et al., 2006), in the space whitened by the pooled covariance, with every window’s covariance shrunk toward the identity there (ρ{NB}={NB}{amount}); they order components by the ratio of signal to reference variance in a typical trial."
            )
        }
        Measure::Total => {
            let how = match sheet.recipe.shrink {
                Shrink::Number(_) => "set by hand",
                Shrink::Word(ShrinkWord::Auto) => "chosen by inner cross-validation",
                Shrink::Word(ShrinkWord::LedoitWolf) => "Ledoit & Wolf, 2004",
                Shrink::Word(ShrinkWord::Oas) => "Chen et al., 2010",
            };
            format!(
                "Spatial filters solved the generalised eigenproblem S{NB}w{NB}={NB}λ{NB}R{NB}w of the pooled signal and reference covariances (Fukunaga, 1990), with R shrunk toward a multiple of the identity (γ{NB}={NB}{amount}, {how}); they order components by the ratio of total signal to total reference variance."
            )
        }
    };
    Some(format!(
        "{text} Patterns are P{NB}w{NB}/{NB}(wᵀPw), with P the pooled covariance (Haufe et al., 2014)."
    ))
}

/// The leading component, or the first of the other end where its end is empty.
fn first(sheet: &Sheet) -> Option<&Component> {
    sheet
        .first()
        .or(sheet.stronger.first())
        .or(sheet.weaker.first())
}

fn held_out(sheet: &Sheet) -> Option<String> {
    let first = first(sheet)?;
    let evidence = &sheet.recipe.evidence;
    if first.typical.held_out.is_none() && first.total.held_out.is_none() {
        return None;
    }
    let mut text = format!(
        "Ratios were estimated on held-out trials: {} folds of trials contiguous in time, each scored by filters for which everything from the compression on was fitted to the other folds",
        evidence.folds
    );
    if first.typical.interval.is_some() {
        text.push_str(&format!(
            "; 95{NB}% intervals are percentile bootstrap intervals over trials with the filters held fixed ({} samples; Efron & Tibshirani, 1993); in simulations they held the ratio of the reported filter in 85 to 91{NB}% of recordings, less often than their name says",
            words::grouped(evidence.bootstrap)
        ));
    }
    text.push('.');
    Some(text)
}

fn permutation(sheet: &Sheet) -> Option<String> {
    let test = sheet.permutation.as_ref()?;
    let how = kinds::arrangements(sheet, test);
    let p = if test.exact {
        "p is the share of arrangements at least as extreme, the observed one among them"
    } else {
        "p = (b + 1)/(m + 1), with b of m arrangements at least as extreme; Phipson & Smyth, 2010"
    };
    let null = words::plain(&test.null, 300);
    Some(format!(
        "The components were tested against {how} (null hypothesis: {}); each component was compared with the largest ratio of every arrangement (the smallest, at the weaker end), which controls the family-wise error over components (Nichols & Holmes, 2002; {p}).",
        quoted_lower(null.trim_end_matches('.'))
    ))
}

/// A sentence inside another.
fn quoted_lower(sentence: &str) -> String {
    let mut letters = sentence.chars();
    letters
        .next()
        .map_or_else(String::new, |c| c.to_lowercase().chain(letters).collect())
}

fn looks(sheet: &Sheet) -> Option<String> {
    let first = first(sheet)?;
    let mut parts = Vec::new();
    if let (Some(spectra), Some(card)) = (&first.spectra, &sheet.preparation) {
        parts.push(format!(
            "Power spectral densities were averaged periodograms (Hann windows of {}, half overlapping; Welch, 1967).",
            words::seconds(spectra.segment as f64 / card.rate_hz)
        ));
    }
    if sheet.channels.iter().any(|c| c.position.is_some()) {
        parts.push("Maps were drawn by spherical splines (Perrin et al., 1989).".into());
    }
    (!parts.is_empty()).then(|| parts.join(" "))
}
