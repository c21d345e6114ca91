//! How many records there are, and what is said when the file and its header disagree.
use super::header::{Header, damaged};
use crate::error::{Kind, Problem, Result, Salvage};
use crate::recording::names::{counted, opened_before};
use crate::recording::opening::OpenOptions;

/// Whole records to read, with what does not fit said in warnings or as the problem.
pub(super) fn count(
    header: &Header,
    file_bytes: u64,
    options: &OpenOptions,
    warnings: &mut Vec<String>,
) -> Result<u64> {
    let body = file_bytes - header.bytes;
    let (whole, rest) = (body / header.record_bytes, body % header.record_bytes);
    let stated = match header.records {
        Some(0) | None if body == 0 => return Err(no_records(header)),
        Some(stated) if stated > 0 && stated <= whole => {
            let left = body - stated * header.record_bytes;
            if left > 0 {
                warnings.push(format!(
                    "The header counts {}; {left} bytes after them were not read (a record has {} bytes).",
                    counted(stated, "record"),
                    header.record_bytes
                ));
            }
            return Ok(stated);
        }
        stated => stated,
    };
    let problem = match stated {
        Some(0) => damaged("the header counts no record, but data follow it")
            .at("file header, number of records, byte 236")
            .expected_found(counted(whole, "record"), 0),
        stated => cut(header, stated, whole, rest),
    };
    if whole == 0 {
        return Err(problem);
    }
    if stated.is_none() {
        let ending = match rest {
            0 => String::new(),
            _ => format!(", and {rest} bytes of an unfinished one were not read"),
        };
        warnings.push(format!(
            "The header does not say how many records there are (-1): the file holds {}{ending}.",
            counted(whole, "whole record")
        ));
        return Ok(whole);
    }
    let problem = salvageable(problem, header, whole);
    if options.salvage {
        warnings.push(opened_before(&problem, whole, "whole record"));
        return Ok(whole);
    }
    Err(problem)
}

fn no_records(header: &Header) -> Problem {
    Problem::new(
        Kind::Empty,
        "the file has a header and no record",
        "check whether the recording was stopped before it was saved",
    )
    .at(format!("record 1, byte {}", header.bytes))
    .expected_found(format!("{} bytes", header.record_bytes), "0 bytes")
}

fn cut(header: &Header, stated: Option<u64>, whole: u64, rest: u64) -> Problem {
    let problem = damaged("the file is cut short").at(header.place(whole, rest));
    match stated {
        Some(stated) if rest == 0 => problem
            .at(format!(
                "record {}, byte {}",
                whole + 1,
                header.bytes + whole * header.record_bytes
            ))
            .expected_found(counted(stated, "record"), counted(whole, "record")),
        _ => problem.expected_found(
            format!("{} bytes of this record", header.record_bytes),
            counted(rest, "byte"),
        ),
    }
}

/// Adds what can still be opened, if anything.
pub(super) fn salvageable(mut problem: Problem, header: &Header, whole: u64) -> Problem {
    if whole > 0 {
        let seconds = whole as f64 * header.record_s;
        problem.advice = "copy the file again from where it was recorded".into();
        problem.salvage = Some(Salvage {
            records: whole,
            seconds,
        });
    }
    problem
}
