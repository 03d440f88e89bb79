//! Curves of one joint as an inline drawing.

use std::fmt::Write as _;

use super::curves::JointCurves;
use super::sheet_html::{breakable, escape};

const WIDTH: f64 = 560.0;
const HEIGHT: f64 = 190.0;
/// Room for the numbers of the axes: left, top, right, bottom.
const MARGIN: [f64; 4] = [44.0, 10.0, 26.0, 24.0];
const PLANES: [&str; 3] = ["yz", "zx", "xy"];

/// An SVG with the curves before, thin and grey, under those after. Styled by the page.
pub(super) fn curve_svg(curves: &JointCurves) -> String {
    let (Some(&start), Some(&end)) = (curves.times_secs.first(), curves.times_secs.last()) else {
        return String::new();
    };
    let all = curves.before_deg.iter().chain(&curves.after_deg).flatten();
    let (low, high) =
        all.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), &v| (low.min(v), high.max(v)));
    let pad = (0.06 * (high - low)).max(1.0);
    let (low, high) = (low - pad, high + pad);
    let [left, top, right, bottom] = MARGIN;
    let x = |secs: f64| left + (WIDTH - left - right) * (secs - start) / (end - start).max(1e-9);
    let y = |degrees: f64| top + (HEIGHT - top - bottom) * (high - degrees) / (high - low);

    let mut svg = String::new();
    let label = escape(&curves.label);
    let _ = write!(
        svg,
        "<figure class=\"curve\"><figcaption><b>{}</b> up to {:.3}° at {:.3} s</figcaption>\n<svg viewBox=\"0 0 {WIDTH} {HEIGHT}\" role=\"img\" \
         aria-label=\"Plane angles of {label} before and after, {start:.2} to {end:.2} seconds\">\n",
        breakable(&curves.label),
        curves.change_rad.to_degrees(),
        curves.worst_secs,
    );
    for degrees in ticks(low, high, 4.0) {
        let at = y(degrees);
        let _ = writeln!(
            svg,
            "<line class=\"grid\" x1=\"{left}\" x2=\"{:.1}\" y1=\"{at:.1}\" y2=\"{at:.1}\"/><text x=\"{:.1}\" y=\"{:.1}\" text-anchor=\"end\">{}°</text>",
            WIDTH - right,
            left - 6.0,
            at + 3.5,
            degrees.round() + 0.0,
        );
    }
    for secs in ticks(start, end, 6.0) {
        let at = x(secs);
        let _ = writeln!(
            svg,
            "<line class=\"grid\" x1=\"{at:.1}\" x2=\"{at:.1}\" y1=\"{top}\" y2=\"{:.1}\"/><text x=\"{at:.1}\" y=\"{:.1}\" text-anchor=\"middle\">{} s</text>",
            HEIGHT - bottom,
            HEIGHT - 7.0,
            (secs * 100.0).round() / 100.0,
        );
    }
    for (rows, class) in [(&curves.before_deg, "before"), (&curves.after_deg, "after")] {
        for (plane, name) in PLANES.into_iter().enumerate() {
            let _ = write!(svg, "<polyline class=\"{class} {name}\" points=\"");
            for (&secs, row) in curves.times_secs.iter().zip(rows.iter()) {
                let _ = write!(svg, "{:.1},{:.1} ", x(secs), y(row[plane]));
            }
            svg.push_str("\"/>\n");
        }
    }
    plane_letters(&mut svg, curves, &y);
    let at = x(curves.worst_secs.clamp(start, end));
    let _ = writeln!(
        svg,
        "<path class=\"worst\" d=\"M{:.1} {HEIGHT} l-4 -7 h8 z\" transform=\"translate(0 -{})\"><title>largest change</title></path>",
        at,
        bottom - 8.0
    );
    svg.push_str("</svg></figure>\n");
    svg
}

/// The plane's name at the end of each curve after, moved apart where curves meet.
fn plane_letters(svg: &mut String, curves: &JointCurves, y: &dyn Fn(f64) -> f64) {
    const LEAST_GAP: f64 = 11.0;
    let Some(last) = curves.after_deg.last() else { return };
    let mut ends: Vec<(f64, &str)> = PLANES.into_iter().zip(last).map(|(name, &v)| (y(v), name)).collect();
    ends.sort_by(|a, b| a.0.total_cmp(&b.0));
    for place in 1..ends.len() {
        ends[place].0 = ends[place].0.max(ends[place - 1].0 + LEAST_GAP);
    }
    // All up again where the lowest has left the plot.
    let over = (ends[ends.len() - 1].0 - (HEIGHT - MARGIN[3])).max(0.0);
    for (at, name) in ends {
        let _ = writeln!(
            svg,
            "<text class=\"plane {name}\" x=\"{:.1}\" y=\"{:.1}\">{name}</text>",
            WIDTH - MARGIN[2] + 5.0,
            at - over + 3.5
        );
    }
}

/// Round values from `low` to `high`, about `wished` of them.
fn ticks(low: f64, high: f64, wished: f64) -> Vec<f64> {
    let rough = ((high - low) / wished).max(1e-9);
    let power = 10_f64.powf(rough.log10().floor());
    let step = [1.0, 2.0, 5.0, 10.0].into_iter().map(|part| part * power).find(|&step| step >= rough);
    let step = step.unwrap_or(10.0 * power);
    let first = (low / step).ceil() as i64;
    let last = (high / step).floor() as i64;
    (first..=last).map(|count| count as f64 * step).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ticks_are_round_and_inside() {
        assert_eq!(ticks(-182.0, 31.0, 4.0), [-100.0, 0.0]);
        assert_eq!(ticks(0.0, 5.0, 6.0), [0.0, 1.0, 2.0, 3.0, 4.0, 5.0]);
    }
}
