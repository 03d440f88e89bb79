//! Named moments of a clip.

/// A moment with a name: a contact, a cue, the place of a note.
#[derive(Clone, Debug, PartialEq)]
pub struct Marker {
    /// When, seconds of the result.
    pub secs: f64,
    /// What it is called.
    pub name: String,
}

/// One change of a clip's markers, which stand in the order of their times. `at` is a marker's place in that order.
#[derive(Clone, Debug, PartialEq)]
pub enum MarkerChange {
    /// A new one.
    Add(Marker),
    /// Another name.
    Rename {
        /// Which.
        at: usize,
        /// What it is called from now on.
        name: String,
    },
    /// Another time.
    Move {
        /// Which.
        at: usize,
        /// When it is from now on, seconds.
        secs: f64,
    },
    /// One less.
    Remove {
        /// Which.
        at: usize,
    },
}

impl MarkerChange {
    /// What the history calls it.
    pub(super) fn label(&self) -> String {
        match self {
            Self::Add(marker) => format!("Add marker {}", marker.name),
            Self::Rename { name, .. } => format!("Rename marker to {name}"),
            Self::Move { .. } => "Move marker".to_owned(),
            Self::Remove { .. } => "Remove marker".to_owned(),
        }
    }

    /// The markers after it, in the order of their times; `None` when there is none of that number or a time is no number.
    pub(super) fn applied(&self, markers: &[Marker]) -> Option<Vec<Marker>> {
        let mut next = markers.to_vec();
        match self {
            Self::Add(marker) => next.push(marker.clone()),
            Self::Rename { at, name } => next.get_mut(*at)?.name.clone_from(name),
            Self::Move { at, secs } => next.get_mut(*at)?.secs = *secs,
            Self::Remove { at } => {
                next.get(*at)?;
                next.remove(*at);
            }
        }
        // Stable: markers of one moment stay in the order in which they were made.
        next.sort_by(|a, b| a.secs.total_cmp(&b.secs));
        next.iter().all(|marker| marker.secs.is_finite()).then_some(next)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn markers_stay_in_the_order_of_their_times() {
        let marker = |secs: f64, name: &str| Marker { secs, name: name.to_owned() };
        let add = |secs, name| MarkerChange::Add(marker(secs, name));
        let two = add(0.5, "step").applied(&[marker(1.0, "land")]).unwrap();
        assert_eq!(two, [marker(0.5, "step"), marker(1.0, "land")]);
        let moved = MarkerChange::Move { at: 0, secs: 2.0 }.applied(&two).unwrap();
        assert_eq!(moved, [marker(1.0, "land"), marker(2.0, "step")]);
        let named = MarkerChange::Rename { at: 1, name: "hop".to_owned() }.applied(&moved).unwrap();
        assert_eq!(named[1], marker(2.0, "hop"));
        assert_eq!(MarkerChange::Remove { at: 0 }.applied(&named).unwrap(), [marker(2.0, "hop")]);
        assert_eq!(MarkerChange::Remove { at: 2 }.applied(&named), None);
        assert_eq!(add(f64::NAN, "x").applied(&named), None);
    }
}
