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

/// A time of a clip so many seconds long, as the ruler tells it: seconds, in a clip of minutes minutes and seconds, in one of hours all three.
pub fn clock(time_secs: f64, duration_secs: f64) -> String {
    /// From here on the ruler of a whole clip tells minutes.
    const LONG_SECS: f64 = 300.0;
    if duration_secs < LONG_SECS {
        return seconds(time_secs);
    }
    let thousandths = (time_secs * 1000.0).round() as i64;
    let (whole, rest) = (thousandths.div_euclid(1000), thousandths.rem_euclid(1000));
    let (minutes, own) = (whole / 60, whole % 60);
    if duration_secs < 3600.0 {
        format!("{minutes}:{own:02}.{rest:03}")
    } else {
        format!("{}:{:02}:{own:02}.{rest:03}", minutes / 60, minutes % 60)
    }
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

#[cfg(test)]
mod tests {
    use super::*;

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
    fn long_clips_are_told_in_minutes_and_hours() {
        assert_eq!(clock(59.9996, 61.0), "60.000 s");
        assert_eq!(clock(59.9996, 600.0), "1:00.000");
        assert_eq!(clock(0.0, 600.0), "0:00.000");
        assert_eq!(clock(3725.5, 7200.0), "1:02:05.500");
    }

    #[test]
    fn rates_near_a_usual_one_are_told_as_that() {
        assert_eq!(rate_text(&FrameGrid::even(1.0 / 0.008_333_3, 1.0)), "120 fps");
        assert_eq!(rate_text(&FrameGrid::even(1.0 / 0.033_333, 1.0)), "30 fps");
        assert_eq!(rate_text(&FrameGrid::even(37.5, 1.0)), "37.50 fps");
    }
}
