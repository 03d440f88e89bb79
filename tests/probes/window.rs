//! Opens a window that shows a bit of everything: `cargo run --example window_probe`.
//!
//! For trying the runners by hand and for measuring: `TURNWRIGHT_RUNNER=cpu` or `=gl` chooses one, `--time N` draws N
//! frames as fast as they come and prints processor time and wall time for each.

use egui::Color32;
use egui::ColorImage;
use std::time::Instant;
use turnwright::app::Screen;

/// Points in each of the plot's lines.
const N_PLOT_POINTS: usize = 2_000;

fn main() -> Result<(), turnwright::app::StartError> {
    let mut arguments = std::env::args().skip(1);
    let n_timed = match arguments.next().as_deref() {
        Some("--time") => arguments.next().and_then(|n| n.parse().ok()).unwrap_or(100),
        _ => 0,
    };
    turnwright::app::run(move |ctx| Box::new(Probe::new(ctx, n_timed)))
}

struct Probe {
    picture: egui::TextureHandle,
    text: String,
    n_clicks: usize,
    n_frames: usize,
    /// Frames to measure; 0 for a window to use by hand.
    n_timed: usize,
    began: Option<(Instant, f64)>,
    asks_to_close: bool,
    closes: bool,
}

impl Probe {
    fn new(ctx: &egui::Context, n_timed: usize) -> Self {
        let picture = ctx.load_texture("picture", picture(0), egui::TextureOptions::LINEAR);
        Self {
            picture,
            text: String::new(),
            n_clicks: 0,
            n_frames: 0,
            n_timed,
            began: None,
            asks_to_close: false,
            closes: false,
        }
    }

    fn measure(&mut self, ctx: &egui::Context) {
        const N_WARM_UP: usize = 20;
        self.n_frames += 1;
        if self.n_timed == 0 {
            return;
        }
        self.picture.set(picture(self.n_frames), egui::TextureOptions::LINEAR);
        ctx.request_repaint();
        if self.n_frames == N_WARM_UP {
            self.began = Some((Instant::now(), processor_secs()));
        }
        if let Some((began, processor_began)) = self.began
            && self.n_frames >= N_WARM_UP + self.n_timed
            && !self.closes
        {
            let per_frame = 1e3 / self.n_timed as f64;
            #[expect(clippy::print_stdout, reason = "the measurement is what the probe is asked for")]
            {
                println!(
                    "{} frames: {:.1} ms processor, {:.1} ms wall for each",
                    self.n_timed,
                    (processor_secs() - processor_began) * per_frame,
                    began.elapsed().as_secs_f64() * per_frame
                );
            }
            self.closes = true;
        }
    }
}

impl Screen for Probe {
    fn ui(&mut self, ui: &mut egui::Ui) {
        let ctx = ui.ctx().clone();
        self.measure(&ctx);
        egui::Panel::left("table").show(ui, |ui| {
            ui.heading("Table");
            if ui.button("Count").clicked() {
                self.n_clicks += 1;
            }
            ui.label(format!("Clicks: {}", self.n_clicks));
            let label = ui.label("Text");
            ui.text_edit_singleline(&mut self.text).labelled_by(label.id);
            for file in ctx.input(|input| input.raw.dropped_files.clone()) {
                self.text = file.path().display().to_string();
            }
            egui::ScrollArea::vertical().show(ui, |ui| {
                egui::Grid::new("rows").striped(true).num_columns(4).show(ui, |ui| {
                    for row in 0..40 {
                        ui.label(format!("joint {row}"));
                        ui.label(format!("{}", row * 7));
                        ui.label(format!("{:.2}°", f64::from(row) * 1.37));
                        ui.colored_label(Color32::from_rgb(0xd5, 0x5e, 0x00), "spike");
                        ui.end_row();
                    }
                });
            });
        });
        egui::Panel::bottom("plot").exact_size(300.0).show(ui, |ui| {
            egui_plot::Plot::new("plot").show(ui, |plot| {
                for line in 0..3 {
                    let points: egui_plot::PlotPoints<'_> = (0..N_PLOT_POINTS)
                        .map(|i| {
                            let t = i as f64 * 0.01;
                            [t, (t + f64::from(line)).sin() * (t * 0.3).cos()]
                        })
                        .collect();
                    plot.line(egui_plot::Line::new(format!("line {line}"), points));
                }
            });
        });
        egui::CentralPanel::default().show(ui, |ui| {
            ui.image((self.picture.id(), egui::vec2(900.0, 500.0)));
        });
        if self.asks_to_close {
            egui::Window::new("Close the window?").collapsible(false).show(&ctx, |ui| {
                ui.horizontal(|ui| {
                    self.closes |= ui.button("Close").clicked();
                    self.asks_to_close &= !ui.button("Stay").clicked();
                });
            });
        }
    }

    fn close_requested(&mut self) -> bool {
        // Only unsaved text is worth a question.
        self.asks_to_close = !self.text.is_empty();
        !self.asks_to_close
    }

    fn should_close(&self) -> bool {
        self.closes
    }

    fn title(&self) -> String {
        format!("Window probe: {} clicks", self.n_clicks)
    }
}

/// A 900 by 500 picture with soft rings, moved on by `shift`.
fn picture(shift: usize) -> ColorImage {
    let pixels = (0..500_i32).flat_map(|y| {
        (0..900_i32).map(move |x| {
            let radius = (x - 450).pow(2) + (y - 250).pow(2);
            let ring = ((radius >> 6) as usize + shift) as u8;
            Color32::from_rgb(ring, (x >> 2) as u8, (y >> 1) as u8)
        })
    });
    ColorImage::new([900, 500], pixels.collect())
}

/// Processor time of all threads of this process, where the system tells it in `/proc`.
fn processor_secs() -> f64 {
    use std::io::Read;
    let mut text = String::new();
    let file = std::fs::File::open("/proc/self/stat");
    if file.and_then(|mut file| file.read_to_string(&mut text)).is_err() {
        return f64::NAN;
    }
    // Fields 14 and 15, in hundredths of a second; the name in field 2 may hold spaces and ends with ')'.
    let fields: Vec<_> = text.rsplit(')').next().unwrap_or("").split_whitespace().collect();
    let field = |i: usize| fields.get(i).and_then(|field| field.parse::<f64>().ok()).unwrap_or(f64::NAN);
    (field(11) + field(12)) / 100.0
}
