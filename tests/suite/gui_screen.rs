//! A screen driven as a person drives it, with the painter as the renderer of the test harness.

use egui_kittest::Harness;
use egui_kittest::kittest::Queryable as _;
use turnwright::app::Screen;
use turnwright::app::paint::CpuRenderer;

#[derive(Default)]
struct Counter {
    count: usize,
    text: String,
}

impl Screen for Counter {
    fn ui(&mut self, ui: &mut egui::Ui) {
        egui::CentralPanel::default().show(ui, |ui| {
            if ui.button("Count").clicked() {
                self.count += 1;
            }
            ui.label(format!("Counted {}", self.count));
            let label = ui.label("Name");
            ui.text_edit_singleline(&mut self.text).labelled_by(label.id);
        });
    }

    fn title(&self) -> String {
        format!("{} counted", self.count)
    }
}

#[test]
fn clicks_and_text_reach_the_screen_and_show_in_its_picture() {
    let mut harness = Harness::builder()
        .with_size(egui::vec2(220.0, 110.0))
        .renderer(CpuRenderer::new(2))
        .build_ui_state(|ui, counter: &mut Counter| counter.ui(ui), Counter::default());
    harness.run();
    let before = harness.render().unwrap();
    harness.get_by_label("Count").click();
    harness.run();
    harness.get_by_label("Name").focus();
    harness.run();
    harness.get_by_role(egui::accesskit::Role::TextInput).type_text("wrist");
    harness.run();
    assert_eq!(harness.state().count, 1);
    assert_eq!(harness.state().text, "wrist");
    assert_eq!(harness.state().title(), "1 counted");
    harness.get_by_label("Counted 1");

    let after = harness.render().unwrap();
    assert_eq!((after.width(), after.height()), (220, 110));
    let changed =
        before.enumerate_pixels().zip(after.pixels()).filter(|((.., before), after)| before != after);
    let rows: Vec<u32> = changed.map(|((_, y, _), _)| y).collect();
    assert!(rows.len() > 30, "{} pixels changed", rows.len());
    // The heading part of the picture above the button stays as it was.
    assert!(rows.iter().all(|y| *y >= 8), "first changed row {:?}", rows.iter().min());
    assert_eq!(after.get_pixel(0, 0).0, egui::Visuals::dark().panel_fill.to_array());
}
