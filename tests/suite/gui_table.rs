//! The skeleton of a table that has none of its own: asked for, taken from another file, undone, saved with the scene.

use std::path::{Path, PathBuf};

use egui::{Key, Modifiers};
use egui_kittest::kittest::Queryable as _;
use turnwright::app::commands::{Action, Command, TimeCommand};
use turnwright::app::view_models::TimeChoice;
use turnwright::exchange::{OpenOptions, disk, open};
use turnwright::scene::PassStep;

use crate::gui_harness::Bench;
use crate::support::shared;

/// From the hand up, as no hierarchy would have it.
const TABLE: &str = "\
time,Hand.qw,Hand.qx,Hand.qy,Hand.qz,Arm.qw,Arm.qx,Arm.qy,Arm.qz,Hips.qw,Hips.qx,Hips.qy,Hips.qz
0,1,0,0,0,1,0,0,0,1,0,0,0
0.1,0.8,0.6,0,0,0.96,0.28,0,0,1,0,0,0
0.2,1,0,0,0,1,0,0,0,1,0,0,0
0.3,0.8,0.6,0,0,0.96,0.28,0,0,1,0,0,0
";

const CLIP: &str = "\
HIERARCHY
ROOT Hips
{
OFFSET 0 90 0
CHANNELS 3 Zrotation Xrotation Yrotation
JOINT Arm
{
OFFSET 0 40 0
CHANNELS 3 Zrotation Xrotation Yrotation
JOINT Hand
{
OFFSET 0 30 0
CHANNELS 3 Zrotation Xrotation Yrotation
End Site
{
OFFSET 0 10 0
}
}
}
}
MOTION
Frames: 1
Frame Time: 0.1
0 0 0 0 0 0 0 0 0
";

fn written(folder: &Path, name: &str, text: &str) -> PathBuf {
    let path = folder.join(name);
    disk::write(&path, text.as_bytes()).expect("it writes");
    path
}

impl Bench<'_> {
    #[track_caller]
    fn joint(&self, label: &str) -> usize {
        let clip = self.window().bench().source().expect("a clip");
        clip.skeleton.find(label).expect("the joint")
    }

    /// What the hand hangs on.
    fn above_hand(&self) -> Option<String> {
        let skeleton = &self.window().bench().source().expect("a clip").skeleton;
        let above = skeleton.parent_joint(self.joint("Hand"));
        above.map(|joint| skeleton.label(joint).to_owned())
    }

    fn smoothed(&self) -> Vec<usize> {
        let steps = self.passes();
        let PassStep::Smooth(smooth) = &steps[0] else { panic!("{steps:?}") };
        smooth.scope.joints.iter().flatten().copied().collect()
    }

    fn type_path(&mut self, path: &Path) {
        self.0.get_by_role(egui::accesskit::Role::TextInput).focus();
        self.run();
        self.press(Modifiers::COMMAND, Key::A);
        let field = self.0.get_by_role(egui::accesskit::Role::TextInput);
        field.type_text(&path.display().to_string());
        self.run();
    }
}

#[test]
fn a_table_gets_the_skeleton_of_a_clip_its_passes_go_along_and_a_scene_remembers_it() {
    let folder = tempfile::tempdir().expect("a folder");
    let table = written(folder.path(), "sway.csv", TABLE);
    let clip = written(folder.path(), "figure.bvh", CLIP);
    let other = written(
        folder.path(),
        "other.bvh",
        &CLIP
            .replace("JOINT Arm", "JOINT Wing")
            .replace("JOINT Hand", "JOINT Tip")
            .replace("ROOT Hips", "ROOT Body"),
    );
    let mut bench = Bench::of_file(&table);
    assert!(bench.messages().contains("no joint hangs on another"), "{}", bench.messages());
    assert_eq!(bench.above_hand(), None);
    // Something is done to the hand before.
    let hand = bench.joint("Hand");
    bench.ask(Command::ChooseJoint(Some(hand)));
    bench.ask(Command::Time(TimeCommand::Choose(TimeChoice::of_joints([hand]))));
    bench.act(Action::AddSmooth);
    assert_eq!(bench.smoothed(), [hand]);
    let steps = bench.steps();

    // A file that knows none of its joints is no help, and nothing changes.
    bench.click("Skeleton of the table…");
    bench.type_path(&other);
    bench.click("Use this file");
    let told = "other.bvh: skeleton: expected joints named as in the table, such as `Hand`";
    assert!(bench.0.get_all_by_label_contains(told).next().is_some());
    assert_eq!(bench.steps(), steps);

    bench.type_path(&clip);
    bench.click("Use this file");
    assert!(bench.0.query_by_label("Use this file").is_none(), "the sheet goes");
    assert_eq!(bench.above_hand().as_deref(), Some("Arm"));
    assert_eq!(bench.steps(), steps + 1);
    assert!(!bench.messages().contains("no joint hangs on another"), "{}", bench.messages());
    let now = bench.joint("Hand");
    assert_ne!(now, hand, "the joints are numbered from the root down");
    assert_eq!(bench.smoothed(), [now], "the pass acts on the hand still");
    assert_eq!(bench.window().bench().session.joint, Some(now));
    let result = bench.window().bench().result().expect("a result").clone();
    assert!(bench.window().bench().source().expect("a source").has_skeleton_of(&result));

    // Back and forth.
    bench.undo();
    assert_eq!((bench.above_hand(), bench.smoothed()), (None, vec![hand]));
    assert_eq!(bench.window().bench().session.joint, Some(hand));
    bench.press(Modifiers::COMMAND | Modifiers::SHIFT, Key::Z);
    assert_eq!((bench.above_hand().as_deref(), bench.smoothed()), (Some("Arm"), vec![now]));

    let scene = folder.path().join("sway.ron");
    bench.ask(Command::SaveTo(scene.clone()));
    let mut again = Bench::of_file(&scene);
    assert_eq!((again.above_hand().as_deref(), again.smoothed()), (Some("Arm"), vec![now]));
    // The file says so in its menu too; without is the table by itself.
    again.act(Action::TableSkeleton);
    assert!(again.0.get_all_by_label_contains("Taken from figure.bvh").next().is_some());
    again.click("Without");
    assert_eq!((again.above_hand(), again.smoothed()), (None, vec![hand]));
    again.undo();
    assert_eq!(again.above_hand().as_deref(), Some("Arm"));
}

#[test]
fn the_window_reads_a_table_as_the_command_line_does() {
    let (Some(turns), Some(bvh)) = (shared("data/csv/walk01_rot.csv"), shared("data/bvh/walk01.bvh")) else {
        return;
    };
    let folder = tempfile::tempdir().expect("a folder");
    let table = folder.path().join("turns.csv");
    disk::write(&table, &disk::read(&turns).expect("it reads")).expect("it writes");
    let mut bench = Bench::of_file(&table);
    bench.ask(Command::UseSkeleton(Some(bvh.clone())));
    let mut options = OpenOptions::default();
    options.csv.skeleton = Some(bvh);
    let expected = open(&table, &options).expect("it opens");
    let own = bench.window().bench().source().expect("a clip");
    assert!(own.skeleton.joints() == expected.clips[0].skeleton.joints());
    assert!(own.local_at(1.0) == expected.clips[0].local_at(1.0));
}

#[test]
fn a_table_with_a_skeleton_of_its_own_takes_no_other() {
    let folder = tempfile::tempdir().expect("a folder");
    let lines = "# joint Hips parent - offset 0 90 0\n# joint Arm parent Hips offset 0 40 0\n# joint Hand parent Arm offset 0 30 0\n";
    let table = written(folder.path(), "own.csv", &format!("{lines}{TABLE}"));
    let mut bench = Bench::of_file(&table);
    assert_eq!(bench.above_hand().as_deref(), Some("Arm"));
    assert!(!bench.messages().contains("hangs on another"));
    bench.act(Action::TableSkeleton);
    assert!(bench.0.query_by_label("Use this file").is_none(), "it is not on offer");
}
