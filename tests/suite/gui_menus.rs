//! Menus in windows that are lower than they are.

use egui::{Key, Modifiers};
use egui_kittest::kittest::{NodeT as _, Queryable as _};
use turnwright::app::Start;
use turnwright::app::commands::{Entry, Menu, TABLE};

use crate::gui_harness::Bench;

#[test]
fn every_entry_of_a_menu_can_be_reached_in_a_low_window() {
    for size in [[1440.0, 900.0], [1000.0, 600.0], [720.0, 450.0]] {
        for menu in Menu::ALL {
            let mut bench = Bench::of_size(Start::Demo, size);
            bench.0.get_by_label(menu.title()).click();
            // The menu is measured in its first frame.
            bench.run();
            let bar = bench.0.get_by_label(menu.title()).rect();
            let entries: Vec<&Entry> = TABLE.iter().filter(|entry| entry.menu == menu).collect();
            let rect = |bench: &Bench<'_>, entry: &Entry| {
                let nodes = bench.0.query_all_by_label(entry.label);
                let node =
                    nodes.filter(|node| node.accesskit_node().role() == egui::accesskit::Role::MenuItem);
                node.map(|node| node.rect()).next().unwrap_or_else(|| panic!("{} is drawn", entry.label))
            };
            let first = rect(&bench, entries[0]);
            assert!(
                first.top() >= bar.bottom() - 1.0,
                "{} covers the bar at {size:?}: {first:?}",
                menu.title()
            );
            let fits = rect(&bench, entries[entries.len() - 1]).bottom() < size[1] - 30.0;
            // Up goes to the last entry that can be chosen, Down from there to the first.
            for (key, entries) in [
                (Key::ArrowUp, entries.iter().rev().collect::<Vec<_>>()),
                (Key::ArrowDown, entries.iter().collect()),
            ] {
                bench.press(Modifiers::NONE, key);
                bench.run();
                let focused = entries.into_iter().find(|entry| {
                    bench.0.query_all_by_label(entry.label).any(|node| node.accesskit_node().is_focused())
                });
                let entry = focused.unwrap_or_else(|| panic!("{key:?} goes into {}", menu.title()));
                let place = rect(&bench, entry);
                let is_seen = place.top() >= bar.bottom() - 1.0 && place.bottom() <= size[1];
                assert!(is_seen, "{} of {} is at {place:?} in {size:?}", entry.label, menu.title());
            }
            // Opened again it begins at its beginning, and what the window has room for is not scrolled at all.
            bench.press(Modifiers::NONE, Key::ArrowUp);
            bench.run();
            assert!(!fits || rect(&bench, entries[0]) == first, "{} is scrolled at {size:?}", menu.title());
            bench.press(Modifiers::NONE, Key::Escape);
            bench.0.get_by_label(menu.title()).click();
            bench.run();
            assert_eq!(rect(&bench, entries[0]), first, "{} at {size:?}", menu.title());
        }
    }
}
