//! `trials.csv`: the power of every component in every window, for statistics elsewhere.
use super::cells::{Cell, table};
use super::weights::ordered;
use crate::error::Result;
use crate::sheet::{Sheet, TrialScore};

/// One row a window and component: `component`, `side`, `trial` (from 1), `onset_s`, `power` (its mean over reference windows is 1),
/// `log_power` (natural), and for paired contrasts the fold and the held-out log ratio of the trial, on its signal row.
///
/// # Errors
/// Those of a writer into memory.
pub fn trials_csv(sheet: &Sheet) -> Result<String> {
    let header = [
        "component",
        "side",
        "trial",
        "onset_s",
        "power",
        "log_power",
        "fold",
        "held_out_log_ratio",
    ];
    let mut rows = vec![Vec::from(header.map(Cell::Text))];
    for (name, component) in ordered(sheet) {
        for window in &component.powers {
            let own = |t: &&TrialScore| window.signal && t.onset_s == window.onset_s;
            let scored = component.trials.iter().find(own);
            rows.push(vec![
                Cell::Owned(super::series::column(&name)),
                Cell::Text(if window.signal { "signal" } else { "reference" }),
                Cell::Number(Some((window.trial + 1) as f64)),
                Cell::Number(Some(window.onset_s)),
                Cell::Number(Some(window.power)),
                Cell::Number(Some(window.power.ln())),
                Cell::Number(scored.map(|t| (t.fold + 1) as f64)),
                Cell::Number(scored.map(|t| t.log_ratio)),
            ]);
        }
    }
    table(rows)
}
