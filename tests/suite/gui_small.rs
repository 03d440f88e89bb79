//! A small window at a large scale: what finds no room side by side is in a list, behind a button or under the pointer, and does the same.

use egui_kittest::kittest::{NodeT as _, Queryable as _};
use turnwright::app::Start;
use turnwright::app::commands::{Action, Command, SettingsCommand};
use turnwright::app::settings::Divider;
use turnwright::app::view_models::{CurveView, HeatKind};

use crate::gui_harness::Bench;

impl Bench<'_> {
    /// Whether any words of the window hold these.
    fn tells(&self, words: &str) -> bool {
        self.0.root().children_recursive().any(|node| {
            let node = node.accesskit_node();
            let own = [node.label(), node.value()];
            own.into_iter().flatten().any(|own| own.contains(words))
        })
    }
}

/// 1440 × 900 pixels at 200 %.
const SIZE: [f32; 2] = [720.0, 450.0];

#[test]
fn what_charts_show_is_chosen_from_lists() {
    let mut bench = Bench::of_size(Start::Demo, SIZE);
    bench.click("What curves show");
    bench.click(Action::SwingTwist.entry().label);
    assert_eq!(bench.window().bench().session.curve_view, CurveView::SwingTwist);
    let mut bench = Bench::of_size(Start::Demo, [600.0, 450.0]);
    bench.click("What colours show");
    bench.click(Action::HeatChange.entry().label);
    assert_eq!(bench.window().bench().session.heat_kind, HeatKind::Change);
    // With room they stand side by side.
    let bench = Bench::open(Start::Demo);
    assert!(bench.0.query_by_label("What curves show").is_none());
    assert!(bench.0.query_by_label("What colours show").is_none());
}

#[test]
fn every_mend_is_within_reach() {
    let mut bench = Bench::of_size(Start::Demo, SIZE);
    bench.click("More");
    bench.click("Mend all safe");
    let mended = bench.window().bench().work().expect("a clip").mended().count();
    assert!(mended > 3, "{mended}");
    bench.undo();
    assert_eq!(bench.window().bench().work().expect("a clip").mended().count(), 0);
    bench.act(Action::NextSnag);
    bench.click("More");
    bench.click("Mend all of this kind");
    let kind = bench.window().bench().chosen_snag().expect("a snag").kind;
    assert!(bench.window().bench().work().expect("a clip").mended().all(|snag| snag.kind == kind));
    bench.undo();
    bench.click("More");
    bench.click("Look at mend");
    assert!(bench.window().bench().looks_at_mend());
}

#[test]
fn the_whole_name_of_a_joint_is_under_the_pointer() {
    let mut bench = Bench::of_size(Start::Demo, SIZE);
    let row = bench.0.get_all_by_label_contains("Snag wrap, Hips").next().expect("a row").rect();
    assert!(!bench.tells("wrap of Hips"));
    bench.0.hover_at(row.center());
    bench.0.run_steps(40);
    assert!(bench.tells("wrap of Hips"));
}

#[test]
fn the_turn_map_shows_half_a_dozen_joints() {
    // Around what it tests the harness keeps 8 points, a window has none.
    let mut bench = Bench::of_size(Start::Demo, SIZE.map(|side| side + 16.0));
    // What the file's reader had to say.
    bench.ask(Command::Dismiss(0));
    let map = bench.0.get_by_label("Turn map rows").rect();
    let rows = bench
        .0
        .get_all_by_label_contains("Map row ")
        .filter(|row| map.contains_rect(row.rect().with_min_x(map.left())));
    let count = rows.count();
    assert!(count >= 6, "{count} rows are whole");
}

#[test]
fn what_is_looked_for_and_the_filter_stay_within_a_narrow_strip() {
    let mut bench = Bench::open(Start::Demo);
    bench.act(Action::AdultLimits);
    assert!(bench.0.query_by_label_contains("Search: limits").is_some(), "with room it is written out");
    bench.ask(Command::Settings(SettingsCommand::Divide(Divider::Space, Some(0.7))));
    let strip = bench.0.get_by_label_contains("Snags: ").rect();
    assert!(strip.width() < 240.0, "{strip}");
    let menu = bench.0.get_by_label("Search…").rect();
    assert!(strip.contains_rect(menu), "{menu} in {strip}");
    // One menu holds both.
    bench.click("Search…");
    bench.click("Open only");
    assert!(bench.window().bench().session.filter.only_open);
    bench.click("Search…");
    bench.click(Action::NoLimits.entry().label);
    assert!(bench.window().bench().work().expect("a clip").limits.is_none());
}

#[test]
fn the_chosen_joint_stays_in_view_when_lists_become_lower() {
    let mut bench = Bench::open(Start::Demo);
    let joint = bench.window().bench().result().expect("a clip").skeleton.find("RightHand");
    bench.ask(Command::ChooseJoint(joint));
    bench.0.run_steps(20);
    bench.ask(Command::Settings(SettingsCommand::Divide(Divider::Map, Some(0.2))));
    bench.ask(Command::Settings(SettingsCommand::Divide(Divider::JointSheet, Some(0.25))));
    bench.0.run_steps(20);
    let map = bench.0.get_by_label("Turn map rows").rect();
    let row = bench.0.get_by_label("Map row RightHand").rect();
    assert!(map.y_range().contains(row.top()) && map.y_range().contains(row.bottom()), "{row} in {map}");
    let (sheet, transport) =
        (bench.0.get_by_label_contains("Joints: ").rect(), bench.0.get_by_label("Scrub bar").rect());
    let item = bench.0.get_by_label("Joint RightHand").rect();
    assert!(item.top() >= sheet.bottom() && item.bottom() < transport.top(), "{item}");
}
