//! Numbers as people read them.

use crate::clip::FrameGrid;

/// Degrees with as many decimals as are useful: `0.25°`, `7.5°`, `148°`; never `-0°`.
pub fn degrees(angle_deg: f64) -> String {
    let decimals = match angle_deg.abs() {
        size if size < 1.0 => 2,
        size if size < 100.0 => 1,
        _ => 0,
    };
    let text = format!("{angle_deg:.decimals$}°");
    let is_zero = text.chars().all(|letter| !letter.is_ascii_digit() || letter == '0');
    if is_zero { "0°".to_owned() } else { text }
}

/// Degrees with two decimals, for columns that must not dance while a clip plays.
pub fn degrees_fixed(angle_deg: f64) -> String {
    if !angle_deg.is_finite() {
        return "not a number".to_owned();
    }
    let text = format!("{angle_deg:.2}°");
    if text == "-0.00°" { "0.00°".to_owned() } else { text }
}

/// Seconds with three decimals.
pub fn seconds(time_secs: f64) -> String {
    format!("{time_secs:.3} s")
}

/// `1 frame`, `12 frames`.
pub fn counted(count: usize, noun: &str) -> String {
    format!("{count} {noun}{}", if count == 1 { "" } else { "s" })
}

/// One frame or a run of them: `812` or `812–815`.
pub fn frames_text(first: usize, last: usize) -> String {
    if first == last { first.to_string() } else { format!("{first}–{last}") }
}

/// The usual rate nearest to a clip's own where it is as good as that one, else the exact number.
pub fn rate_text(grid: &FrameGrid) -> String {
    const USUAL: [f64; 14] =
        [10.0, 12.0, 15.0, 23.976, 24.0, 25.0, 29.97, 30.0, 48.0, 50.0, 59.94, 60.0, 100.0, 120.0];
    let near = USUAL.into_iter().min_by(|a, b| (a - grid.rate).abs().total_cmp(&(b - grid.rate).abs()));
    match near {
        Some(near) if (near - grid.rate).abs() < 0.002 * near => format!("{near} fps"),
        _ => format!("{:.2} fps", grid.rate),
    }
}

/// A name that has to fit into `room`, cut in its middle: names of one figure often begin alike and tell themselves apart by their ends, and by
/// the side that some begin with. `width_of` measures words. Where not even the cut has room the cut alone is left.
pub fn cut_in_middle(name: &str, room: f32, width_of: impl Fn(&str) -> f32) -> String {
    /// The end gets this share of the letters.
    const END: f64 = 0.65;
    if width_of(name) <= room {
        return name.to_owned();
    }
    let letters: Vec<char> = name.chars().collect();
    let cut = |kept: usize| -> String {
        let end = (kept as f64 * END).ceil() as usize;
        let start = &letters[..kept - end];
        start.iter().chain(&['…']).chain(&letters[letters.len() - end..]).collect()
    };
    // The most letters that fit; more letters are never narrower.
    let most = (0..letters.len()).collect::<Vec<_>>().partition_point(|&kept| width_of(&cut(kept)) <= room);
    cut(most.saturating_sub(1))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_without_room_keep_their_ends() {
        let width = |words: &str| words.chars().count() as f32;
        let cut = |name: &str, room: f32| cut_in_middle(name, room, width);
        assert_eq!(cut("LeftFoot", 8.0), "LeftFoot");
        assert_eq!(cut("figure_01_body_LeftFoot", 14.0), "figu…_LeftFoot");
        assert_eq!(cut("figure_01_body_LeftToe", 14.0), "figu…y_LeftToe");
        assert_eq!(cut("LeftFoot", 1.0), "…");
        assert_eq!(cut("LeftFoot", 0.0), "…");
        assert_eq!(cut("足首左足首左", 4.0), "足…首左");
        assert_eq!(cut("", 4.0), "");
    }

    #[test]
    fn degrees_keep_useful_decimals() {
        let cases = [
            (0.0, "0°"),
            (-0.001, "0°"),
            (0.254, "0.25°"),
            (7.46, "7.5°"),
            (148.4, "148°"),
            (-9.96, "-10.0°"),
        ];
        for (value, text) in cases {
            assert_eq!(degrees(value), text);
        }
        assert_eq!(degrees_fixed(-0.0001), "0.00°");
        assert_eq!(degrees_fixed(f64::NAN), "not a number");
    }

    #[test]
    fn rates_near_a_usual_one_are_told_as_that() {
        assert_eq!(rate_text(&FrameGrid::even(1.0 / 0.008_333_3, 1.0)), "120 fps");
        assert_eq!(rate_text(&FrameGrid::even(1.0 / 0.033_333, 1.0)), "30 fps");
        assert_eq!(rate_text(&FrameGrid::even(37.5, 1.0)), "37.50 fps");
    }
}
