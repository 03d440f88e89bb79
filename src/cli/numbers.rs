//! Numbers as they are typed after an option. A minus belongs to the number, and does not begin another option.

/// A number. What is not finite is one too: the commands say of each option what it may be.
pub(super) fn number(text: &str) -> Result<f64, String> {
    let read = text.trim().parse().ok();
    read.ok_or_else(|| format!("expected a number such as 0.5, found `{text}`"))
}

/// How many of something.
pub(super) fn count(text: &str) -> Result<usize, String> {
    let read = text.trim().parse().ok();
    read.ok_or_else(|| format!("expected a whole number, 0 or more, found `{text}`"))
}

/// A number in a message: as it is typed, not with hundreds of zeros.
pub(super) fn shown(value: f64) -> String {
    let is_usual = value == 0.0 || !value.is_finite() || (1e-6..1e15).contains(&value.abs());
    if is_usual { value.to_string() } else { format!("{value:e}") }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_read_or_told() {
        assert_eq!(number("-2.5e-1"), Ok(-0.25));
        assert_eq!([0.0, -5.0, 1e300, -1e-300].map(shown), ["0", "-5", "1e300", "-1e-300"]);
        assert!(number("nan").is_ok_and(f64::is_nan));
        assert_eq!(number("1,5"), Err("expected a number such as 0.5, found `1,5`".to_owned()));
        assert_eq!(count("12"), Ok(12));
        for wrong in ["-3", "2.5", "", "99999999999999999999"] {
            assert_eq!(count(wrong), Err(format!("expected a whole number, 0 or more, found `{wrong}`")));
        }
    }
}
