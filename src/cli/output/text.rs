//! Lists for people.

use std::io;
use std::path::Path;

use crate::clip::Clip;
use crate::snag::Snag;

use super::Output;

/// What is told of one clip.
pub(in crate::cli) struct ClipReport<'a> {
    /// The file as the user named it.
    pub(in crate::cli) path: &'a Path,
    /// What the clip is called.
    pub(in crate::cli) label: &'a str,
    /// Its index in the file.
    pub(in crate::cli) index: usize,
    /// The clip itself.
    pub(in crate::cli) clip: &'a Clip,
    /// Its snags.
    pub(in crate::cli) snags: &'a [Snag],
    /// What was done about each of them; `None` when nothing was to be done.
    pub(in crate::cli) mends: Option<&'a MendReport>,
}

/// What was done about the snags of a clip.
pub(in crate::cli) struct MendReport {
    /// Whether each snag was mended.
    pub(in crate::cli) mended: Vec<bool>,
    /// The largest change of orientation each mend made, radians.
    pub(in crate::cli) changes_rad: Vec<f64>,
    /// How far each mend moved the ends of limbs, in the clip's length.
    pub(in crate::cli) changes_length: Vec<f64>,
    /// The largest change of the clip as it plays, radians.
    pub(in crate::cli) max_change_rad: f64,
}

impl ClipReport<'_> {
    /// Its joints that are listed.
    pub(in crate::cli) fn joints(&self) -> usize {
        self.clip.skeleton.listed().count()
    }
}

impl MendReport {
    /// How many were mended.
    pub(in crate::cli) fn count(&self) -> usize {
        self.mended.iter().filter(|&&mended| mended).count()
    }
}

/// `1 joint`, `2 joints`.
fn counted(count: usize, what: &str) -> String {
    format!("{count} {what}{}", if count == 1 { "" } else { "s" })
}

/// A heading for the clip and a line for each snag.
pub(in crate::cli) fn clip(output: &mut Output, report: &ClipReport<'_>) -> io::Result<()> {
    let grid = &report.clip.grid;
    let found = match report.snags.len() {
        0 => "no snags".to_owned(),
        count => counted(count, "snag"),
    };
    let done = report.mends.map_or_else(String::new, |mends| {
        let left = report.snags.len() - mends.count();
        format!(", {} mended, {left} left, largest change {}", mends.count(), degrees(mends.max_change_rad))
    });
    output.line(format_args!(
        "{}: {}: {}, {} at {} a second: {found}{done}",
        report.path.display(),
        report.label,
        counted(report.joints(), "joint"),
        counted(grid.count(), "frame"),
        short(grid.rate),
    ))?;
    let label = |snag: &Snag| report.clip.skeleton.label(snag.joint).to_owned();
    let width = report.snags.iter().map(|snag| label(snag).chars().count()).max().unwrap_or(0);
    for (index, snag) in report.snags.iter().enumerate() {
        let frames = if snag.first_frame == snag.last_frame {
            snag.first_frame.to_string()
        } else {
            format!("{}-{}", snag.first_frame, snag.last_frame)
        };
        let state = match report.mends {
            None => String::new(),
            Some(mends) if mends.mended[index] => {
                format!("mended {:>9}  ", degrees(mends.changes_rad[index]))
            }
            Some(_) => format!("{:<16}  ", "left"),
        };
        output.line(format_args!(
            "  {} {:<15} {:<width$} {frames:>11} {:>9.3} s {:>8}  {state}{}",
            snag.kind.letter(),
            snag.kind.name(),
            label(snag),
            snag.first_secs,
            degrees(snag.size_rad),
            snag.text,
        ))?;
    }
    Ok(())
}

/// An angle with as many decimals as it needs to be told from 0.
pub(in crate::cli) fn degrees(radians: f64) -> String {
    let degrees = radians.to_degrees();
    match degrees.abs() {
        none if none < 1e-9 => "0°".to_owned(),
        small if small < 0.095 => format!("{degrees:.2e}°"),
        _ => format!("{degrees:.1}°"),
    }
}

/// With at most three decimals, none of them zeros at the end.
pub(in crate::cli) fn short(value: f64) -> String {
    let text = format!("{value:.3}");
    text.trim_end_matches('0').trim_end_matches('.').to_owned()
}
