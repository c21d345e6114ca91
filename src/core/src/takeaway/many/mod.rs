//! Many recordings, one recipe.
//!
//! * [`Row`]: what one recording gives to the group; `row.json` in its folder, so that each may be made by a process of its own.
//! * [`Many`]: the rows in order of their folders, and what they say together; [`Many::csv`], [`Many::json`], [`Many::group_csv`].
//!
//! The terminal's `run` and `gather` and the page all make their table here, from the same rows, so they cannot differ.
mod group;
mod names;
mod row;

pub use group::{Group, GroupEnd};
pub use names::folder_names;
pub use row::{Portrait, Row};

use super::cells::{Cell, table};
use super::summary::{SummaryRow, summary_csv};
use crate::error::Result;
use serde::Serialize;

/// A set of recordings that one recipe was asked of.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Many {
    /// Version of the schema: 1.
    teasel_table: u32,
    made: super::results::Made,
    /// One row a recording, in the order of their folders' names.
    pub recordings: Vec<SummaryRow>,
    /// What they say together; `None` where fewer than two have a result, or where they answer different recipes.
    pub group: Option<Group>,
    /// What a careful reader should know of the table, each a sentence.
    pub notes: Vec<String>,
}

impl Many {
    /// Puts rows together; their order does not matter. Rows of one folder: the last one counts.
    pub fn of(rows: Vec<Row>) -> Many {
        let mut sorted: std::collections::BTreeMap<String, Row> = std::collections::BTreeMap::new();
        for row in rows {
            sorted.insert(row.summary.folder.clone(), row);
        }
        let rows: Vec<Row> = sorted.into_values().collect();
        let mut notes = Vec::new();
        let group = group::group(&rows, &mut notes);
        let mut recordings: Vec<SummaryRow> = rows.into_iter().map(|r| r.summary).collect();
        if let Some(group) = &group {
            for (k, row) in recordings.iter_mut().enumerate() {
                let ends = [
                    (&mut row.stronger_1, &group.stronger),
                    (&mut row.weaker_1, &group.weaker),
                ];
                for (leader, end) in ends {
                    if let (Some(leader), Some(end)) = (leader, end) {
                        leader.likeness = end.likeness.get(k).copied().flatten();
                    }
                }
            }
        }
        Many {
            teasel_table: 1,
            made: super::results::MADE,
            recordings,
            group,
            notes,
        }
    }

    /// `table.csv`: one row a recording.
    ///
    /// # Errors
    /// Those of a writer into memory.
    pub fn csv(&self) -> Result<String> {
        summary_csv(&self.recordings)
    }

    /// `table.json`: the rows, the group and the notes, in full precision.
    ///
    /// # Errors
    /// Those of a writer into memory.
    pub fn json(&self) -> Result<String> {
        super::to_json(self)
    }

    /// `group.csv`: the test of each end.
    ///
    /// # Errors
    /// Those of a writer into memory.
    pub fn group_csv(&self) -> Result<String> {
        let header = [
            "end",
            "recordings",
            "ratio",
            "low_95",
            "high_95",
            "own_side",
            "p",
            "arrangements",
            "exact",
            "null",
        ];
        let ends = self.group.iter().flat_map(|g| {
            [("stronger", &g.stronger), ("weaker", &g.weaker)]
                .into_iter()
                .filter_map(|(name, end)| Some((name, end.as_ref()?.test.as_ref()?)))
        });
        let rows = ends.map(|(name, test)| {
            let number = |x: usize| Cell::Number(Some(x as f64));
            vec![
                Cell::Text(name),
                number(test.recordings),
                Cell::Number(Some(test.ratio)),
                Cell::Number(test.interval.map(|i| i[0])),
                Cell::Number(test.interval.map(|i| i[1])),
                number(test.own_side),
                Cell::Number(test.p),
                number(test.arrangements),
                Cell::Text(if test.exact { "yes" } else { "no" }),
                Cell::Text(&test.null),
            ]
        });
        table(std::iter::once(Vec::from(header.map(Cell::Text))).chain(rows))
    }

    /// What the recordings say together, in sentences: first the finding, then what to doubt.
    pub fn reading(&self) -> (Vec<String>, Vec<String>) {
        let failed = self
            .recordings
            .iter()
            .filter(|r| r.problem.is_some())
            .count();
        let fine = self.recordings.len() - failed;
        let mut said = vec![format!(
            "{fine} of {} recordings have a result.",
            self.recordings.len()
        )];
        let mut but = Vec::new();
        for end in self
            .group
            .iter()
            .flat_map(|g| [&g.stronger, &g.weaker])
            .flatten()
        {
            said.push(end.sentence());
            but.extend(end.doubt());
        }
        if failed > 0 {
            but.push(format!(
                "{failed} of {} could not be analysed: a group without them is a selected group.",
                self.recordings.len()
            ));
        }
        but.extend(self.notes.iter().cloned());
        (said, but)
    }
}
