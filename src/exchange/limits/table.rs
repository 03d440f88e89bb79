//! Limits as CSV: `joint,swing_deg,twist_min_deg,twist_max_deg`.

use std::collections::BTreeSet;
use std::path::Path;

use super::error::LimitsError;
use super::mirror::{Joint, Swing};

const HEAD: [&str; 4] = ["joint", "swing_deg", "twist_min_deg", "twist_max_deg"];

/// Name, line and limit of each joint. Lines that begin with `#` and empty ones say nothing.
pub(super) fn joints(path: &Path, text: &str) -> Result<Vec<(String, usize, Joint)>, LimitsError> {
    let error = |line: usize, joint: Option<&str>, expected: String, found: String| LimitsError::Line {
        path: path.to_owned(),
        line,
        joint: joint.map(ToOwned::to_owned),
        expected,
        found,
    };
    let text = text.strip_prefix('\u{feff}').unwrap_or(text);
    let mut rows = text
        .lines()
        .enumerate()
        .map(|(index, line)| (index + 1, line.trim()))
        .filter(|(_, line)| !line.is_empty() && !line.starts_with('#'));
    let head = rows.next();
    let is_head = |line: &str| line.split(',').map(|cell| cell.trim().to_lowercase()).eq(HEAD);
    if !head.is_some_and(|(_, line)| is_head(line)) {
        let (line, found) =
            head.map_or((1, "nothing".to_owned()), |(line, text)| (line, format!("`{}`", short(text))));
        return Err(error(line, None, format!("the head `{}`", HEAD.join(",")), found));
    }
    let mut joints = Vec::new();
    let mut seen = BTreeSet::new();
    for (line, row) in rows {
        let (name, rest) = name_and_rest(row);
        let cells: Vec<&str> = rest.split(',').map(str::trim).collect();
        let Ok([swing, least, most]) = <[&str; 3]>::try_from(cells.as_slice()) else {
            let found = format!("{} cells", cells.len() + 1);
            return Err(error(line, Some(&name), "4 cells".to_owned(), found));
        };
        let number = |cell: &str, column: &str| match cell {
            "" => Ok(None),
            text => text.parse::<f64>().ok().filter(|value| value.is_finite()).map(Some).ok_or_else(|| {
                error(
                    line,
                    Some(&name),
                    format!("{column} in degrees, or nothing"),
                    format!("`{}`", short(text)),
                )
            }),
        };
        let swing = number(swing, HEAD[1])?;
        let twist = (number(least, HEAD[2])?, number(most, HEAD[3])?);
        if let Some(swing) = swing.filter(|swing| !(0.0..=180.0).contains(swing)) {
            return Err(error(line, Some(&name), "swing_deg from 0 to 180".to_owned(), swing.to_string()));
        }
        let twist = match twist {
            (None, None) => None,
            (Some(least), Some(most)) if least <= most && least >= -360.0 && most <= 360.0 => {
                Some((least, most))
            }
            (least, most) => {
                let told = |value: Option<f64>| {
                    value.map_or_else(|| "nothing".to_owned(), |value| value.to_string())
                };
                let expected =
                    "twist_min_deg not above twist_max_deg, from -360 to 360, or both empty".to_owned();
                return Err(error(
                    line,
                    Some(&name),
                    expected,
                    format!("{} and {}", told(least), told(most)),
                ));
            }
        };
        if name.is_empty() {
            return Err(error(line, None, "the name of a joint".to_owned(), "none".to_owned()));
        }
        if !seen.insert(name.clone()) {
            return Err(error(
                line,
                Some(&name),
                "each joint once".to_owned(),
                "it a second time".to_owned(),
            ));
        }
        joints.push((
            name,
            line,
            Joint {
                zero: None,
                twist_axis: None,
                bend_axis: None,
                swing: swing.map_or(Swing::Free, Swing::Cone),
                twist,
                comfort: None,
                fault: None,
                confidence: None,
            },
        ));
    }
    Ok(joints)
}

/// The first cell, which may stand in quotes, and what follows its comma.
fn name_and_rest(row: &str) -> (String, &str) {
    if let Some((name, rest)) = row.strip_prefix('"').and_then(|quoted| quoted.split_once('"')) {
        let rest = rest.trim_start();
        return (name.to_owned(), rest.strip_prefix(',').unwrap_or(rest));
    }
    let (name, rest) = row.split_once(',').unwrap_or((row, ""));
    (name.trim().to_owned(), rest)
}

/// So much of a text as a message can hold.
fn short(text: &str) -> String {
    const MOST: usize = 60;
    if text.chars().count() <= MOST {
        text.to_owned()
    } else {
        text.chars().take(MOST).collect::<String>() + "…"
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_wrong_line_is_told_with_its_joint() {
        let check = |rows: &str, expected: &str| {
            let text = format!("# mine\njoint,swing_deg,twist_min_deg,twist_max_deg\n{rows}");
            let error = joints(Path::new("l.csv"), &text).unwrap_err().to_string();
            assert_eq!(error, format!("l.csv: {expected}"));
        };
        check("Knee,90,-10", "line 3, joint `Knee`: expected 4 cells, found 3 cells");
        check(
            "Hip,1,2,3\nKnee,x,0,1",
            "line 4, joint `Knee`: expected swing_deg in degrees, or nothing, found `x`",
        );
        check("Knee,200,0,1", "line 3, joint `Knee`: expected swing_deg from 0 to 180, found 200");
        check(
            "Knee,90,20,-20",
            "line 3, joint `Knee`: expected twist_min_deg not above twist_max_deg, from -360 to 360, or both empty, found 20 and -20",
        );
        check(
            "Knee,90,,\nKnee,80,,",
            "line 4, joint `Knee`: expected each joint once, found it a second time",
        );
        let error = joints(Path::new("l.csv"), "a,b\n").unwrap_err().to_string();
        assert_eq!(
            error,
            "l.csv: line 1: expected the head `joint,swing_deg,twist_min_deg,twist_max_deg`, found `a,b`"
        );
    }

    #[test]
    fn an_empty_cell_sets_no_limit() {
        let text = "joint,swing_deg,twist_min_deg,twist_max_deg\n\"Arm, left\",,-20,30\nLeg,45,,\n";
        let own = joints(Path::new("l.csv"), text).unwrap();
        assert_eq!(own[0].0, "Arm, left");
        assert_eq!((&own[0].2.swing, own[0].2.twist), (&Swing::Free, Some((-20.0, 30.0))));
        assert_eq!((&own[1].2.swing, own[1].2.twist), (&Swing::Cone(45.0), None));
    }
}
