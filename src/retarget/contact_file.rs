//! Contacts of feet and hands as text: CSV rows `side,part,first_s,last_s,at`.

use glam::DVec3;

use crate::clip::FootPart;
use crate::skeleton::roles::Side;

use super::options::{FootContact, HandHold, HoldAt};

/// What a file of contacts says.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Contacts {
    /// Feet; `None` where no row speaks of any, so that they are looked for.
    pub feet: Option<Vec<FootContact>>,
    /// Hands.
    pub hands: Vec<HandHold>,
}

/// A file of contacts that can't be read.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
#[error("line {line}: expected {expected}, found `{found}`")]
pub struct ContactError {
    /// From 1.
    pub line: usize,
    /// What would do.
    pub expected: &'static str,
    /// What stands there.
    pub found: String,
}

const HEADING: &str = "side,part,first_s,last_s,at";

/// Reads contacts: a heading `side,part,first_s,last_s,at`, then a row for each. The side is `left` or `right`, the part `heel`, `ball` or
/// `hand`, times are seconds. `at` is for hands: empty or `still`, `other` for the other hand, or a point of the target's scene as three numbers with
/// blanks between. Lines that begin with `#` are passed over. A row `none` says that no foot stands.
///
/// # Errors
/// With the line, what was expected and what was found.
pub fn read_contacts(text: &str) -> Result<Contacts, ContactError> {
    let mut contacts = Contacts::default();
    let mut has_heading = false;
    for (index, row) in text.trim_start_matches('\u{feff}').lines().enumerate() {
        let error =
            |expected, found: &str| ContactError { line: index + 1, expected, found: found.to_owned() };
        let row = row.trim();
        if row.is_empty() || row.starts_with('#') {
            continue;
        }
        let cells: Vec<&str> = row.split(',').map(str::trim).collect();
        if !has_heading {
            if !(cells.len() >= 4
                && cells.iter().zip(HEADING.split(',')).all(|(own, name)| own.eq_ignore_ascii_case(name)))
            {
                return Err(error("the heading side,part,first_s,last_s,at", row));
            }
            has_heading = true;
            continue;
        }
        if cells == ["none"] {
            contacts.feet.get_or_insert_default();
            continue;
        }
        if cells.len() < 4 {
            return Err(error("side, part, first and last second", row));
        }
        let side = Side::BOTH.into_iter().find(|side| side.name() == cells[0]);
        let side = side.ok_or_else(|| error("left or right", cells[0]))?;
        let number = |cell: &str| cell.parse::<f64>().ok().filter(|own| own.is_finite());
        let secs = |cell: &str| number(cell).ok_or_else(|| error("a time in seconds", cell));
        let span_secs = [secs(cells[2])?, secs(cells[3])?];
        if span_secs[0] > span_secs[1] {
            return Err(error("a last second that is not before the first", row));
        }
        let at = cells.get(4).copied().unwrap_or_default();
        if cells[1] == "hand" {
            let at = match at {
                "" | "still" => HoldAt::Still,
                "other" => HoldAt::OtherHand,
                point => {
                    let numbers: Option<Vec<f64>> = point.split_whitespace().map(number).collect();
                    match numbers.as_deref() {
                        Some([x, y, z]) => HoldAt::Place(DVec3::new(*x, *y, *z)),
                        _ => {
                            return Err(error(
                                "still, other, or a point as three numbers with blanks between",
                                point,
                            ));
                        }
                    }
                }
            };
            contacts.hands.push(HandHold { side, span_secs, at });
            continue;
        }
        let part = FootPart::BOTH.into_iter().find(|part| part.name() == cells[1]);
        let part = part.ok_or_else(|| error("heel, ball or hand", cells[1]))?;
        contacts.feet.get_or_insert_default().push(FootContact { side, part, span_secs });
    }
    if has_heading {
        Ok(contacts)
    } else {
        Err(ContactError {
            line: 1,
            expected: "the heading side,part,first_s,last_s,at",
            found: "nothing".to_owned(),
        })
    }
}

/// The contacts as text that [`read_contacts`] reads.
pub fn write_contacts(contacts: &Contacts) -> String {
    let mut lines = vec![format!("{HEADING}\n")];
    for own in contacts.feet.iter().flatten() {
        let [first, last] = own.span_secs;
        lines.push(format!("{},{},{first},{last},\n", own.side.name(), own.part.name()));
    }
    if contacts.feet.as_ref().is_some_and(Vec::is_empty) {
        lines.push("none\n".to_owned());
    }
    for own in &contacts.hands {
        let [first, last] = own.span_secs;
        let at = match own.at {
            HoldAt::Still => "still".to_owned(),
            HoldAt::OtherHand => "other".to_owned(),
            HoldAt::Place(place) => format!("{} {} {}", place.x, place.y, place.z),
        };
        lines.push(format!("{},hand,{first},{last},{at}\n", own.side.name()));
    }
    lines.concat()
}
