//! A small window at a large scale: what finds no room side by side is in a list, behind a button or under the pointer, and does the same.

use egui_kittest::kittest::{NodeT as _, Queryable as _};
use turnwright::app::Start;
use turnwright::app::commands::Action;
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
