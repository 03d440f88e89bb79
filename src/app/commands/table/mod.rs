//! The table of everything that has a menu entry: words, keys, and when it can be done. A file for each menu.

use egui::{Key, KeyboardShortcut, Modifiers};

use super::super::session::Disc;
use super::{Action, Menu, Situation};

mod edit;
mod file;
mod help;
mod keys;
mod snags;
mod space;
mod time;
mod view;

/// One entry of the table.
#[derive(Clone, Copy, Debug)]
pub struct Entry {
    /// What it does.
    pub action: Action,
    /// Where it stands.
    pub menu: Menu,
    /// A line is drawn above it.
    pub starts_group: bool,
    /// Its words.
    pub label: &'static str,
    /// What it does, in a sentence.
    pub tooltip: &'static str,
    /// Its keys.
    pub shortcut: Option<KeyboardShortcut>,
    /// Whether it can be done.
    pub is_available: fn(&Situation) -> bool,
    /// Whether it is on, for entries that are switches.
    pub is_on: Option<fn(&Situation) -> bool>,
}

const fn plain(key: Key) -> KeyboardShortcut {
    KeyboardShortcut::new(Modifiers::NONE, key)
}

const fn ctrl(key: Key) -> KeyboardShortcut {
    KeyboardShortcut::new(Modifiers::COMMAND, key)
}

const fn ctrl_shift(key: Key) -> KeyboardShortcut {
    KeyboardShortcut::new(Modifiers::COMMAND.plus(Modifiers::SHIFT), key)
}

const fn shift(key: Key) -> KeyboardShortcut {
    KeyboardShortcut::new(Modifiers::SHIFT, key)
}

const fn ctrl_alt(key: Key) -> KeyboardShortcut {
    KeyboardShortcut::new(Modifiers::COMMAND.plus(Modifiers::ALT), key)
}

const fn alt(key: Key) -> KeyboardShortcut {
    KeyboardShortcut::new(Modifiers::ALT, key)
}

const fn alt_shift(key: Key) -> KeyboardShortcut {
    KeyboardShortcut::new(Modifiers::ALT.plus(Modifiers::SHIFT), key)
}

/// An entry of the menu whose file it stands in.
const fn entry(
    action: Action,
    label: &'static str,
    tooltip: &'static str,
    shortcut: Option<KeyboardShortcut>,
    is_available: fn(&Situation) -> bool,
) -> Entry {
    Entry {
        action,
        menu: Menu::File,
        starts_group: false,
        label,
        tooltip,
        shortcut,
        is_available,
        is_on: None,
    }
}

impl Entry {
    const fn group(self) -> Self {
        Self { starts_group: true, ..self }
    }

    const fn switch(self, is_on: fn(&Situation) -> bool) -> Self {
        Self { is_on: Some(is_on), ..self }
    }
}

const ALWAYS: fn(&Situation) -> bool = |_| true;
const DOCUMENT: fn(&Situation) -> bool = |now| now.has_document;
const CLIP: fn(&Situation) -> bool = |now| now.has_clip;
const JOINT: fn(&Situation) -> bool = |now| now.has_clip && now.has_joint;
const BLEND: fn(&Situation) -> bool = |now| now.has_clip && now.has_blend;
const KEYS: fn(&Situation) -> bool = |now| now.has_joint && now.chosen_keys > 0;
const TURNS: fn(&Situation) -> bool =
    |now| now.has_clip && now.has_joint && !matches!(now.space.disc, Disc::Free);
const SNAG: fn(&Situation) -> bool = |now| now.has_snag;
const MARKERS: fn(&Situation) -> bool = |now| now.markers > 0;
const SNAGS: fn(&Situation) -> bool = |now| now.snags > 0;

/// The menus from left to right, as [`Menu::ALL`].
const MENUS: [&[Entry]; Menu::ALL.len()] = [
    file::ENTRIES,
    edit::ENTRIES,
    view::ENTRIES,
    space::ENTRIES,
    snags::ENTRIES,
    keys::ENTRIES,
    time::ENTRIES,
    help::ENTRIES,
];

/// The table.
pub const TABLE: &[Entry] = &joined();

const COUNT: usize = {
    let (mut count, mut menu) = (0, 0);
    while menu < MENUS.len() {
        count += MENUS[menu].len();
        menu += 1;
    }
    count
};

/// The entries of all menus, each with its menu.
const fn joined() -> [Entry; COUNT] {
    let mut all = [file::ENTRIES[0]; COUNT];
    let (mut place, mut menu) = (0, 0);
    while menu < MENUS.len() {
        let mut own = 0;
        while own < MENUS[menu].len() {
            all[place] = Entry { menu: Menu::ALL[menu], ..MENUS[menu][own] };
            (place, own) = (place + 1, own + 1);
        }
        menu += 1;
    }
    all
}

/// Keys that do the same as an entry's own shortcut.
pub const MORE_KEYS: &[(KeyboardShortcut, Action)] = &[
    (KeyboardShortcut::new(Modifiers::COMMAND, Key::Y), Action::Redo),
    // On most keyboards + is the shifted =.
    (KeyboardShortcut::new(Modifiers::COMMAND, Key::Equals), Action::Larger),
];

/// Held down, these show the source in place of the result.
pub const HOLD_FOR_SOURCE: KeyboardShortcut = KeyboardShortcut::new(Modifiers::COMMAND, Key::B);

impl Action {
    /// Its entry.
    ///
    /// # Panics
    /// Never: a test sees to it that every action has one.
    pub fn entry(self) -> &'static Entry {
        TABLE.iter().find(|entry| entry.action == self).unwrap_or(&TABLE[0])
    }
}

#[cfg(test)]
mod tests {
    use std::collections::BTreeSet;

    use super::*;

    #[test]
    fn every_action_has_one_entry_with_words() {
        let mut seen = BTreeSet::new();
        for entry in TABLE {
            assert!(seen.insert(entry.action), "{:?} stands twice", entry.action);
            assert_eq!(entry.action.entry().label, entry.label);
            assert!(!entry.label.is_empty() && entry.tooltip.len() > 3, "{:?}", entry.action);
            assert!(!entry.tooltip.ends_with('.') && !entry.label.ends_with('.'), "{}", entry.tooltip);
        }
    }

    #[test]
    fn no_two_entries_share_keys() {
        let own = TABLE.iter().filter_map(|entry| entry.shortcut.map(|shortcut| (shortcut, entry.action)));
        let mut seen: Vec<(KeyboardShortcut, Action)> = Vec::new();
        for (shortcut, action) in own.chain(MORE_KEYS.iter().copied()) {
            let twin = seen.iter().find(|(other, _)| *other == shortcut);
            assert!(twin.is_none(), "{action:?} and {twin:?}");
            assert_ne!(shortcut, HOLD_FOR_SOURCE);
            seen.push((shortcut, action));
        }
    }

    #[test]
    fn letters_and_digits_come_with_a_modifier() {
        for entry in TABLE {
            let Some(KeyboardShortcut { modifiers, logical_key }) = entry.shortcut else { continue };
            let is_letter = logical_key.name().chars().count() == 1;
            assert!(!is_letter || modifiers.any(), "{:?}", entry.action);
        }
    }

    #[test]
    fn without_a_document_only_what_needs_none_is_on_offer() {
        use Action as A;
        let nothing = Situation::default();
        let offered: Vec<Action> =
            TABLE.iter().filter(|entry| (entry.is_available)(&nothing)).map(|entry| entry.action).collect();
        let expected = [
            A::Open,
            A::OpenPath,
            A::OpenDemo,
            A::Quit,
            A::Light,
            A::Larger,
            A::Smaller,
            A::UsualSize,
            A::UsualLayout,
            A::Explain,
            A::ShowHints,
            A::Shortcuts,
            A::WhatsNew,
            A::About,
        ];
        assert_eq!(offered, expected);
    }
}
