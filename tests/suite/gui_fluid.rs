//! The window keeps up: nothing is drawn while nothing happens, and what is changed is seen in the next frame.

use turnwright::app::commands::{Action, Command};
use turnwright::app::paint::Headless;
use turnwright::app::{Start, Window};
use turnwright::clip::{KeyChange, KeyEdit};
use turnwright::rotor::{Bivector, Rotor};
use turnwright::scene::{Edit, KeysPass};

struct Desk {
    headless: Headless,
    window: Window,
}

impl Desk {
    /// The demo, at rest, with all work done at once.
    fn new() -> Self {
        let mut headless = Headless::new(egui::vec2(1280.0, 720.0), 1.0, 2);
        let mut window = Window::unthreaded(headless.context(), Start::Demo);
        headless.settle(&mut window);
        Self { headless, window }
    }

    fn frame(&mut self) {
        self.headless.frame(&mut self.window, Vec::new());
    }

    fn pixels(&mut self) -> Vec<u32> {
        let meshes = self.headless.tessellate();
        self.headless.paint(&meshes).to_vec()
    }
}

#[test]
fn a_window_drawn_frame_by_frame_looks_like_one_drawn_once() {
    let steps = [
        Command::Scrub(0.4),
        Command::Do(Action::NextSnag),
        Command::Scrub(0.9),
        Command::Do(Action::Mend),
        Command::ChooseJoint(Some(3)),
        Command::Do(Action::Light),
        Command::Do(Action::Undo),
        Command::Do(Action::Play),
        Command::Scrub(1.3),
    ];
    let step = |desk: &mut Desk, step: &Command, seen: &mut dyn FnMut(&mut Desk)| {
        desk.window.ask(step.clone());
        for _ in 0..3 {
            desk.frame();
            seen(desk);
        }
    };
    let mut each = Desk::new();
    for (number, next) in steps.iter().enumerate() {
        let mut pixels = Vec::new();
        step(&mut each, next, &mut |desk| pixels = desk.pixels());
        let mut once = Desk::new();
        steps[..=number].iter().for_each(|own| step(&mut once, own, &mut |_| ()));
        assert!(pixels == once.pixels(), "after {next:?}");
    }
}

#[test]
fn nothing_is_drawn_again_while_nothing_happens() {
    let mut desk = Desk::new();
    // Whatever was asked for before, the window comes to rest, and then asks for nothing, ever.
    for doing in [None, Some(Action::NextSnag), Some(Action::Mend), Some(Action::Undo), Some(Action::Light)] {
        if let Some(action) = doing {
            desk.window.ask(Command::Do(action));
        }
        // Without threads one answer may lead to the next order; a real window is woken for each.
        let rests = |desk: &Desk| desk.headless.repaint_delay() > std::time::Duration::from_hours(1);
        let frames = (0..30)
            .take_while(|_| {
                desk.frame();
                !rests(&desk)
            })
            .count();
        assert!(rests(&desk), "after {doing:?} and {frames} frames");
        desk.frame();
        assert!(rests(&desk), "a frame more after {doing:?}");
    }
    desk.window.ask(Command::Do(Action::Play));
    desk.headless.settle(&mut desk.window);
    desk.frame();
    let pause = desk.headless.repaint_delay();
    assert!(pause < std::time::Duration::from_millis(20), "while it plays: {pause:?}");
}

#[test]
fn a_change_of_one_joint_is_seen_in_the_next_frame() {
    let mut desk = Desk::new();
    desk.frame();
    let before = desk.pixels();
    let joint = desk.window.bench().session.joint.expect("a chosen joint");
    let turn = Rotor::from_plane_angles(Bivector::new(1.0, 0.0, 0.4));
    let edits = vec![KeyEdit { joint, change: KeyChange::Set(vec![(0.0, turn)]) }];
    desk.window.ask(Command::Edit(Edit::AddPass {
        work: 0,
        step: KeysPass { edits }.into(),
        at: usize::MAX,
    }));
    // This frame takes the wish; the next shows what came of it.
    desk.frame();
    desk.frame();
    let result = desk.window.bench().result().expect("a clip");
    assert!(result.rotation(joint).expect("it turns").at(0.0).turn_to(turn) < 1e-9);
    let curves = desk.window.bench().curves.as_ref().expect("curves");
    assert!(std::sync::Arc::ptr_eq(&curves.result, result), "the curves are of the new result");
    let after = desk.pixels();
    let changed = before.iter().zip(&after).filter(|(old, new)| old != new).count();
    assert!(changed > 500, "{changed} pixels changed");
}
