//! Which keys do what: those of the table, and those that a person has chosen in their place.

use std::collections::BTreeMap;
use std::sync::Arc;

use egui::{Context, Id, Key, KeyboardShortcut, Modifiers};

use super::super::commands::{Action, HOLD_FOR_SOURCE, MORE_KEYS, TABLE};

/// The keys of all actions.
#[derive(Clone, Debug, PartialEq)]
pub struct Keymap {
    own: Vec<(Action, Option<KeyboardShortcut>)>,
}

impl Default for Keymap {
    fn default() -> Self {
        Self { own: TABLE.iter().map(|entry| (entry.action, entry.shortcut)).collect() }
    }
}

/// Why keys can't be given to an action.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum Conflict {
    /// Another action has them.
    #[error("{keys} is `{label}` already", label = .action.entry().label)]
    Taken {
        /// The keys in words.
        keys: String,
        /// Whose they are.
        action: Action,
    },
    /// The window itself needs them.
    #[error("{keys} can't be given away: {why}")]
    Kept {
        /// The keys in words.
        keys: String,
        /// What for.
        why: &'static str,
    },
}

impl Keymap {
    /// The table's keys with those of `changes` in place of them. Names and keys that nobody knows are passed over.
    pub fn with_changes(changes: &BTreeMap<String, Option<String>>) -> Self {
        let mut map = Self::default();
        for (action, keys) in &mut map.own {
            match changes.get(&name(*action)) {
                Some(None) => *keys = None,
                Some(Some(text)) => *keys = parse_keys(text).or(*keys),
                None => {}
            }
        }
        map
    }

    /// The keys of an action.
    pub fn keys_of(&self, action: Action) -> Option<KeyboardShortcut> {
        self.own.iter().find(|(own, _)| *own == action).and_then(|(_, keys)| *keys)
    }

    /// All keys and what they do, with the second keys of the table as far as nobody has taken them. Those with more modifiers
    /// first: Ctrl+Shift+Z must be tried before Ctrl+Z, which would take it as well.
    pub fn all(&self) -> Vec<(KeyboardShortcut, Action)> {
        let mut all: Vec<_> =
            self.own.iter().filter_map(|(action, keys)| Some(((*keys)?, *action))).collect();
        let is_free = |keys: &KeyboardShortcut| all.iter().all(|(own, _)| own != keys);
        let more: Vec<_> = MORE_KEYS.iter().filter(|(keys, _)| is_free(keys)).copied().collect();
        all.extend(more);
        all.sort_by_key(|(keys, _)| std::cmp::Reverse(modifier_count(keys.modifiers)));
        all
    }

    /// Whether an action may have these keys.
    ///
    /// # Errors
    /// When another has them, or the window needs them.
    pub fn check(&self, action: Action, keys: KeyboardShortcut) -> Result<(), Conflict> {
        let words = keys_text(&keys);
        let kept = |why| Err(Conflict::Kept { keys: words.clone(), why });
        let KeyboardShortcut { modifiers, logical_key } = keys;
        let is_letter = logical_key.name().chars().count() == 1;
        if keys == HOLD_FOR_SOURCE {
            return kept("held down, it shows the source");
        }
        if is_letter && !(modifiers.command || modifiers.alt) {
            return kept("letters and digits are for typing; hold Ctrl or Alt as well");
        }
        if modifiers.command && !modifiers.shift && matches!(logical_key, Key::C | Key::X | Key::V | Key::A) {
            return kept("it copies, cuts, pastes or chooses all");
        }
        if matches!(logical_key, Key::Tab | Key::Escape) || (logical_key == Key::Enter && modifiers.is_none())
        {
            return kept("it goes from one control to the next");
        }
        match self.own.iter().find(|(other, own)| *own == Some(keys) && *other != action) {
            Some(&(action, _)) => Err(Conflict::Taken { keys: words, action }),
            None => Ok(()),
        }
    }

    /// Makes it the one that the window shows keys from.
    pub(in super::super) fn install(self, ctx: &Context) {
        ctx.data_mut(|data| data.insert_temp(Id::NULL, Arc::new(self)));
    }

    /// The one that was installed.
    pub(in super::super) fn of(ctx: &Context) -> Arc<Self> {
        ctx.data(|data| data.get_temp(Id::NULL)).unwrap_or_default()
    }
}

/// The name of an action in the settings file.
pub(super) fn name(action: Action) -> String {
    format!("{action:?}")
}

/// Records keys for an action among `changes`; the table's own are no change.
pub(in super::super) fn change(
    changes: &mut BTreeMap<String, Option<String>>,
    action: Action,
    keys: Option<KeyboardShortcut>,
) {
    if keys == action.entry().shortcut {
        changes.remove(&name(action));
    } else {
        changes.insert(name(action), keys.map(|keys| keys_text(&keys)));
    }
}

fn modifier_count(modifiers: Modifiers) -> usize {
    [modifiers.alt, modifiers.ctrl, modifiers.shift, modifiers.mac_cmd, modifiers.command]
        .into_iter()
        .filter(|&on| on)
        .count()
}

/// Keys as they are written in the settings file: `Ctrl+Shift+Z`.
pub fn keys_text(keys: &KeyboardShortcut) -> String {
    let KeyboardShortcut { modifiers, logical_key } = keys;
    let mut text = String::new();
    for (is_held, word) in
        [(modifiers.command || modifiers.ctrl, "Ctrl+"), (modifiers.alt, "Alt+"), (modifiers.shift, "Shift+")]
    {
        if is_held {
            text.push_str(word);
        }
    }
    text + logical_key.name()
}

/// The way back; `None` for what are no keys.
pub fn parse_keys(text: &str) -> Option<KeyboardShortcut> {
    let mut modifiers = Modifiers::NONE;
    let mut rest = text;
    loop {
        let (word, more) = match rest.split_once('+') {
            Some((word, more)) if !word.is_empty() && !more.is_empty() => (word, more),
            _ => return Some(KeyboardShortcut::new(modifiers, Key::from_name(rest)?)),
        };
        modifiers |= match word {
            "Ctrl" => Modifiers::COMMAND,
            "Alt" => Modifiers::ALT,
            "Shift" => Modifiers::SHIFT,
            _ => return None,
        };
        rest = more;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn keys_go_into_words_and_back() {
        for entry in TABLE {
            let Some(keys) = entry.shortcut else { continue };
            assert_eq!(parse_keys(&keys_text(&keys)), Some(keys), "{}", keys_text(&keys));
        }
        for text in ["", "Ctrl+", "Hyper+Z", "Ctrl+Nothing", "+"] {
            assert!(parse_keys(text).is_none_or(|keys| keys.modifiers.is_none()), "{text}");
        }
    }

    #[test]
    fn changed_keys_take_the_place_of_the_table_s_and_conflicts_are_told() {
        let mut changes = BTreeMap::new();
        change(&mut changes, Action::Play, parse_keys("F9"));
        change(&mut changes, Action::Undo, None);
        changes.insert("NoSuchAction".to_owned(), Some("Ctrl+J".to_owned()));
        changes.insert("Redo".to_owned(), Some("nonsense".to_owned()));
        let map = Keymap::with_changes(&changes);
        assert_eq!(map.keys_of(Action::Play), parse_keys("F9"));
        assert_eq!(map.keys_of(Action::Undo), None);
        assert_eq!(map.keys_of(Action::Redo), Action::Redo.entry().shortcut);
        let check = |keys: &str| map.check(Action::Save, parse_keys(keys).unwrap());
        assert!(matches!(check("F9"), Err(Conflict::Taken { action: Action::Play, .. })));
        assert!(matches!(check("Ctrl+B"), Err(Conflict::Kept { .. })));
        assert!(matches!(check("K"), Err(Conflict::Kept { .. })));
        assert_eq!(check("Ctrl+Z"), Ok(()), "it was taken from Undo");
        assert_eq!(check("Ctrl+S"), Ok(()), "its own keys are no conflict");
        change(&mut changes, Action::Play, Action::Play.entry().shortcut);
        assert!(!changes.contains_key("Play"), "the table's own keys are no change");
    }
}
