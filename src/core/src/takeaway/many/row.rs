//! `row.json`: what one recording gives to the group.
use super::super::summary::SummaryRow;
use crate::error::{Kind, Problem, Result};
use crate::recipe::Recipe;
use crate::sheet::{Component, Course, Sheet, Spectra};
use serde::{Deserialize, Serialize};

/// `row.json` holds at most this many bytes: a few curves and a pattern.
const MOST_BYTES: usize = 64 << 20;

/// One recording of a set: its row of the table, and what the group's figures are made from.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Row {
    /// Version of the schema: 1.
    pub teasel_row: u32,
    /// Its row of the table.
    pub summary: SummaryRow,
    /// The recipe that it answers; `None` for a recording that could not be analysed.
    pub recipe: Option<Recipe>,
    /// The first stronger component.
    pub stronger: Option<Portrait>,
    /// The first weaker component.
    pub weaker: Option<Portrait>,
}

/// What the group takes from a component.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Portrait {
    /// Names of the channels of `pattern`.
    pub channels: Vec<String>,
    /// Where they lie on the unit sphere.
    pub positions: Vec<Option<[f64; 3]>>,
    /// Pattern over them.
    pub pattern: Vec<f64>,
    /// Held-out ratio in the recipe's measure.
    pub held_out: Option<f64>,
    /// Spectra of both sides.
    pub spectra: Option<Spectra>,
    /// Power and average around the event.
    pub course: Option<Course>,
}

/// Whether every value is a number.
fn whole(curves: &[&Vec<f64>]) -> bool {
    curves
        .iter()
        .all(|curve| curve.iter().all(|x| x.is_finite()))
}

impl Row {
    /// The row of a recording that was analysed. `folder` tells it from the others.
    pub fn of(sheet: &Sheet, folder: &str) -> Row {
        let portrait = |components: &[Component]| {
            let component = components.first()?;
            let channels = sheet.preparation.as_ref()?.channels.clone();
            let position = |name: &String| {
                let card = sheet.channels.iter().find(|c| c.name == *name);
                card.and_then(|c| c.position)
            };
            Some(Portrait {
                positions: channels.iter().map(position).collect(),
                channels,
                // JSON holds no number that is none.
                pattern: component
                    .pattern
                    .iter()
                    .map(|x| if x.is_finite() { *x } else { 0.0 })
                    .collect(),
                held_out: super::super::weights::held_out(component, sheet.recipe.measure)
                    .filter(|x| x.is_finite()),
                spectra: component.spectra.clone().filter(|s| {
                    let sides = [
                        &s.signal,
                        &s.signal_low,
                        &s.signal_high,
                        &s.reference,
                        &s.reference_low,
                        &s.reference_high,
                    ];
                    whole(&sides)
                }),
                course: component.course.clone().filter(|c| {
                    whole(&[
                        &c.mean_db,
                        &c.low_db,
                        &c.high_db,
                        &c.average,
                        &c.average_low,
                        &c.average_high,
                    ])
                }),
            })
        };
        Row {
            teasel_row: 1,
            summary: SummaryRow::of(sheet, folder),
            recipe: Some(sheet.recipe.clone()),
            stronger: portrait(&sheet.stronger),
            weaker: portrait(&sheet.weaker),
        }
    }

    /// The row of a recording that could not be analysed.
    pub fn failed(recording: &str, folder: &str, problem: &Problem) -> Row {
        Row {
            teasel_row: 1,
            summary: SummaryRow::failed(recording, folder, problem),
            recipe: None,
            stronger: None,
            weaker: None,
        }
    }

    /// Writes `row.json`.
    ///
    /// # Errors
    /// Those of a writer into memory.
    pub fn json(&self) -> Result<String> {
        super::super::to_json(self)
    }

    /// Reads `row.json`.
    ///
    /// # Errors
    /// `Recipe` for a text that is none, with the place.
    pub fn from_json(text: &str) -> Result<Row> {
        let broken = |what: &str| Problem::new(Kind::Recipe, what, "run this recording again");
        if text.len() > MOST_BYTES {
            return Err(broken("the row of a recording is too large")
                .expected_found(format!("at most {MOST_BYTES} bytes"), text.len()));
        }
        let row: Row = serde_json::from_str(text).map_err(|e| {
            broken("this is not the row of a recording, as `teasel run` writes it")
                .at(format!("line {}, column {}", e.line(), e.column()))
                .expected_found("a row", e)
        })?;
        if row.teasel_row != 1 {
            return Err(broken("the row is of another version of the schema")
                .expected_found(1, row.teasel_row));
        }
        let whole = [&row.stronger, &row.weaker]
            .into_iter()
            .flatten()
            .all(|p| p.channels.len() == p.pattern.len() && p.channels.len() == p.positions.len());
        if whole {
            Ok(row)
        } else {
            Err(broken("the row breaks its rules").expected_found(
                "one value of the pattern and one position for each channel",
                "another number",
            ))
        }
    }
}
