//! Reading and writing scene files, and fitting a scene to the skeletons its sources have now.

use std::collections::{BTreeMap, BTreeSet};
use std::path::{Component, Path, PathBuf};
use std::sync::Arc;

use crate::scene::{ClipWork, Document, Marker, Others, Pass, PassId, Reading, SnagMark, SourceRef};
use crate::skeleton::{RestChoice, Skeleton};

use super::super::csv::{NamedColumns, TimeUnit};
use super::super::disk;
use super::error::SceneError;
use super::limits::{limits_from, limits_to};
use super::mirror;
use super::steps::{kind_from, step_from, step_to};

/// A scene as read: the document, and by what names it knew the joints.
#[derive(Clone, Debug, PartialEq)]
pub struct SceneFile {
    /// The document. Source paths are joined to the scene's folder. Joint numbers are those of the day it was saved.
    pub document: Document,
    /// By what labels each clip's work knew its joints.
    pub labels: Vec<WorkLabels>,
}

/// The labels of the joints that the work on a clip names by number.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct WorkLabels {
    /// Of the snags that are left as they are.
    pub left: BTreeMap<usize, String>,
    /// Of the joints that have limits.
    pub limits: BTreeMap<usize, String>,
    /// Of each pass. Behind a pass that carries the clip to another skeleton the same number is another joint.
    pub passes: Vec<BTreeMap<usize, String>>,
}

impl SceneFile {
    /// Renumbers the joints of a clip's work to those that bear their labels now. `skeleton` is the source's; passes that
    /// lead to another one ask `others`. What names a joint that is no longer there is taken out; gives the labels that
    /// were lost.
    pub fn fit(&mut self, work: usize, skeleton: &Arc<Skeleton>, others: &dyn Others) -> Vec<String> {
        let (Some(labels), Some(clip)) = (self.labels.get(work), self.document.works.get_mut(work)) else {
            return Vec::new();
        };
        let mut lost = BTreeSet::new();
        let left = Fitted::new(&labels.left, skeleton, &mut lost);
        clip.left.retain_mut(|mark| left.now(mark.joint).map(|joint| mark.joint = joint).is_some());
        let limited = Fitted::new(&labels.limits, skeleton, &mut lost);
        clip.limits =
            clip.limits.take().map(|limits| Arc::new(limits.renumbered(&|joint| limited.now(joint))));
        let unknown = BTreeMap::new();
        let mut current = Arc::clone(skeleton);
        for (place, pass) in clip.passes.iter_mut().enumerate() {
            let own = Fitted::new(labels.passes.get(place).unwrap_or(&unknown), &current, &mut lost);
            pass.step.kind_mut().renumber(&|joint| own.now(joint));
            if pass.on
                && let Some(next) = pass.step.kind().skeleton_after(others)
            {
                current = next;
            }
        }
        lost.into_iter().collect()
    }
}

/// Joint numbers of the day a scene was saved, and what they are now.
struct Fitted(BTreeMap<usize, Option<usize>>);

impl Fitted {
    fn new(labels: &BTreeMap<usize, String>, skeleton: &Skeleton, lost: &mut BTreeSet<String>) -> Self {
        let now: BTreeMap<usize, Option<usize>> =
            labels.iter().map(|(&number, label)| (number, skeleton.find(label))).collect();
        let gone = now.iter().filter(|(_, joint)| joint.is_none()).map(|(number, _)| labels[number].clone());
        lost.extend(gone);
        Self(now)
    }

    fn now(&self, number: usize) -> Option<usize> {
        self.0.get(&number).copied().flatten()
    }
}

/// Reads a scene file. Its sources are not opened.
///
/// # Errors
/// When the file can't be read, is no scene, is from a newer version, or its parts do not fit each other.
pub fn read(path: &Path) -> Result<SceneFile, SceneError> {
    let bytes = disk::read(path)?;
    let text = std::str::from_utf8(&bytes)
        .map_err(|error| SceneError::NoText { path: path.to_owned(), at: error.valid_up_to() })?;
    from_text(path, text)
}

/// Writes a scene file at one stroke. `label` names joint `.2` of clip work `.0` as the pass at place `.1` numbers it; place
/// 0 is also asked for the snags that are left, which are the source's.
///
/// # Errors
/// When the system refuses; the old file then stays.
pub fn write(
    path: &Path,
    document: &Document,
    label: &dyn Fn(usize, usize, usize) -> String,
) -> Result<(), SceneError> {
    let text = to_text(path, document, label)?;
    Ok(disk::write(path, text.as_bytes())?)
}

/// Reads a scene from text that is already here; `path` gives its folder and serves messages.
///
/// # Errors
/// As [`read`], but for the disk.
pub fn from_text(path: &Path, text: &str) -> Result<SceneFile, SceneError> {
    let syntax = |error: ron::error::SpannedError| SceneError::Syntax {
        path: path.to_owned(),
        line: error.span.start.line,
        column: error.span.start.col,
        what: error.code.to_string(),
    };
    let head: mirror::Head = ron::from_str(text).map_err(syntax)?;
    if head.turnwright_scene > mirror::VERSION {
        return Err(SceneError::TooNew {
            path: path.to_owned(),
            known: mirror::VERSION,
            found: head.turnwright_scene,
        });
    }
    let scene: mirror::Saved = ron::from_str(text).map_err(syntax)?;
    let folder = path.parent().unwrap_or(Path::new(""));
    let mut file = SceneFile { document: Document::default(), labels: Vec::new() };
    for (index, source) in scene.sources.into_iter().enumerate() {
        let reading = reading_from(folder, &source).map_err(|what| SceneError::Meaning {
            path: path.to_owned(),
            place: format!("sources[{index}]"),
            what,
        })?;
        let source = SourceRef { path: folder.join(source.path), sha256: source.sha256, reading };
        file.document.sources.push(source);
    }
    for (index, clip) in scene.clips.into_iter().enumerate() {
        let meaning = |what: String| SceneError::Meaning {
            path: path.to_owned(),
            place: format!("clips[{index}]"),
            what,
        };
        let sources = file.document.sources.len();
        if clip.source >= sources {
            return Err(meaning(format!("expected a source below {sources}, found {}", clip.source)));
        }
        let (work, labels) = work_from(clip).map_err(meaning)?;
        file.document.works.push(work);
        file.labels.push(labels);
    }
    Ok(file)
}

/// The words for what is looked for beside the usual kinds.
const LOOP: &str = "loop";
const SLIDE: &str = "slide";

fn work_from(clip: mirror::ClipWork) -> Result<(ClipWork, WorkLabels), String> {
    let mut labels = WorkLabels::default();
    let mut work = ClipWork::new(clip.source, clip.clip, clip.name);
    if let Some(limits) = &clip.limits {
        work.limits = Some(Arc::new(limits_from(limits)?));
        labels.limits = limits.joints.iter().map(|(joint, label, _)| (*joint, label.clone())).collect();
    }
    for word in clip.search {
        match word.as_str() {
            LOOP => work.search.is_loop = true,
            SLIDE => work.search.finds_slides = true,
            other => return Err(format!("search: expected {LOOP} or {SLIDE}, found `{other}`")),
        }
    }
    for (secs, name) in clip.markers {
        if !secs.is_finite() {
            return Err(format!("markers: expected seconds, found {secs} at `{name}`"));
        }
        work.markers.push(Marker { secs, name });
    }
    work.markers.sort_by(|a, b| a.secs.total_cmp(&b.secs));
    for pass in clip.passes {
        let mut own: BTreeMap<usize, String> = pass.joints.into_iter().collect();
        if let mirror::Step::Mend { snags, .. } = &pass.step {
            own.extend(snags.iter().map(|snag| (snag.joint_index, snag.joint.clone())));
        }
        labels.passes.push(own);
        let id = PassId(pass.id);
        if work.pass(id).is_some() {
            return Err(format!("expected every pass to have its own id, found {} twice", pass.id));
        }
        work.passes.push(Pass { id, on: pass.on, step: step_from(pass.step)? });
    }
    for left in clip.left {
        let (first_key, last_key) = left.keys;
        work.left.push(SnagMark {
            kind: kind_from(&left.kind)?,
            joint: left.joint_index,
            first_key,
            last_key,
        });
        labels.left.insert(left.joint_index, left.joint);
    }
    Ok((work, labels))
}

/// The text that [`write()`] writes; `path` is where it will stand.
///
/// # Errors
/// When a value can't be said in RON.
pub fn to_text(
    path: &Path,
    document: &Document,
    label: &dyn Fn(usize, usize, usize) -> String,
) -> Result<String, SceneError> {
    let folder = path.parent().unwrap_or(Path::new(""));
    let sources = document.sources.iter().map(|source| mirror::Source {
        path: relative(folder, &source.path),
        sha256: source.sha256.clone(),
        columns: source.reading.columns.clone(),
        time_unit: source.reading.time_unit.clone(),
        skeleton: source.reading.skeleton.as_ref().map(|own| relative(folder, own)),
        rest: source.reading.rest.map(|rest| rest.name().to_owned()),
    });
    let sources: Vec<mirror::Source> = sources.collect();
    let clips = document.works.iter().enumerate().map(|(index, work)| mirror::ClipWork {
        source: work.source,
        clip: work.clip,
        name: work.name.clone(),
        passes: work
            .passes
            .iter()
            .enumerate()
            .map(|(place, pass)| {
                let named = |joint: usize| label(index, place, joint);
                // Mends say the label beside each number.
                let joints = match pass.step.as_mend() {
                    Some(mend) => mend.limb_joints(),
                    None => pass.step.kind().joints().into_iter().collect(),
                };
                mirror::Pass {
                    id: pass.id.0,
                    on: pass.on,
                    joints: joints.into_iter().map(|joint| (joint, named(joint))).collect(),
                    step: step_to(&pass.step, &named),
                }
            })
            .collect(),
        left: work
            .left
            .iter()
            .map(|mark| mirror::Left {
                kind: mark.kind.to_string(),
                joint: label(index, 0, mark.joint),
                joint_index: mark.joint,
                keys: (mark.first_key, mark.last_key),
            })
            .collect(),
        limits: work.limits.as_ref().map(|limits| limits_to(limits, &|joint| label(index, 0, joint))),
        search: [(work.search.is_loop, LOOP), (work.search.finds_slides, SLIDE)]
            .into_iter()
            .filter(|(on, _)| *on)
            .map(|(_, word)| word.to_owned())
            .collect(),
        markers: work.markers.iter().map(|marker| (marker.secs, marker.name.clone())).collect(),
    });
    let clips: Vec<mirror::ClipWork> = clips.collect();
    let versions = clips.iter().flat_map(|clip| &clip.passes).map(|pass| pass.step.version());
    let versions = versions.chain(sources.iter().map(mirror::Source::version));
    let versions = versions.chain(clips.iter().map(mirror::ClipWork::version));
    let turnwright_scene = versions.max().unwrap_or(1);
    let scene = mirror::Saved { turnwright_scene, sources, clips };
    let pretty = ron::ser::PrettyConfig::new().depth_limit(7).struct_names(false).new_line("\n");
    let text = ron::ser::to_string_pretty(&scene, pretty)
        .map_err(|error| SceneError::Encode { path: path.to_owned(), what: error.to_string() })?;
    Ok(text + "\n")
}

/// How a source is read, each part checked.
fn reading_from(folder: &Path, source: &mirror::Source) -> Result<Reading, String> {
    let checked = |name: &str, text: &Option<String>, check: &dyn Fn(&str) -> Result<(), String>| {
        let wrong = |error: String| format!("{name}: {error}");
        text.as_deref().map_or(Ok(()), check).map_err(wrong)?;
        Ok::<_, String>(text.clone())
    };
    let columns = checked("columns", &source.columns, &|text| {
        text.parse::<NamedColumns>().map(drop).map_err(|error| error.to_string())
    })?;
    let time_unit = checked("time_unit", &source.time_unit, &|text| {
        text.parse::<TimeUnit>().map(drop).map_err(|error| error.to_string())
    })?;
    let rest = source.rest.as_deref().map(str::parse::<RestChoice>).transpose();
    let rest = rest.map_err(|error| format!("rest: {error}"))?;
    let skeleton = source.skeleton.as_ref().map(|own| folder.join(own));
    Ok(Reading { columns, time_unit, skeleton, rest })
}

/// `path` as seen from `folder`, with `/` between, so that a scene can move with its sources.
/// What can't be told apart from `folder` (another drive) stays absolute.
fn relative(folder: &Path, path: &Path) -> String {
    let absolute = |path: &Path| std::path::absolute(path).unwrap_or_else(|_| path.to_owned());
    let (folder, path) = (tidy(&absolute(folder)), tidy(&absolute(path)));
    let own: Vec<Component<'_>> = folder.components().collect();
    let others: Vec<Component<'_>> = path.components().collect();
    let shared = own.iter().zip(&others).take_while(|(a, b)| a == b).count();
    if shared == 0 {
        return path.to_string_lossy().into_owned();
    }
    let up = std::iter::repeat_n("..".to_owned(), own.len() - shared);
    let down = others[shared..].iter().map(|part| part.as_os_str().to_string_lossy().into_owned());
    up.chain(down).collect::<Vec<_>>().join("/")
}

/// The path with `.` and `x/..` taken out, by its text alone.
fn tidy(path: &Path) -> PathBuf {
    path.components().fold(PathBuf::new(), |mut tidied, part| {
        match part {
            Component::CurDir => {}
            Component::ParentDir => {
                tidied.pop();
            }
            other => tidied.push(other),
        }
        tidied
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::clip::{
        Kernel, KeyChange, KeyEdit, MeantTurn, NewKey, PathKind, Push, PushFrame, Smoothing, Spacing,
    };
    use crate::rotor::Bivector;
    use crate::rotor::Rotor;
    use crate::scene::{
        KeysPass, MendPass, NoOthers, PassStep, PushPass, ReducePass, ResamplePass, Scope, SearchChoice,
        SmoothPass,
    };
    use crate::snag::{Remedy, Snag, SnagKind};

    fn snag(kind: SnagKind, joint: usize, remedy: Remedy) -> Snag {
        Snag {
            kind,
            joint,
            first_key: 3,
            last_key: 5,
            first_frame: 3,
            last_frame: 5,
            first_secs: 0.1,
            last_secs: 1.0 / 6.0,
            size_rad: 3.0,
            confidence: 0.75,
            remedy,
            safe: true,
            text: "Hip flips 172° at frame 3 and back at 6".to_owned(),
        }
    }

    fn document(folder: &Path) -> Document {
        let offset = Rotor::from_xyzw([0.6, 0.0, 0.8, 0.0]);
        let mut work = ClipWork::new(0, 0, "walk");
        work.passes.push(Pass {
            id: PassId(4),
            on: false,
            step: MendPass {
                kind: SnagKind::HalfTurn,
                snags: vec![snag(SnagKind::HalfTurn, 2, Remedy::TakeOut(offset))],
                amount: 0.5,
            }
            .into(),
        });
        work.left.push(SnagMark::of(&snag(SnagKind::Spike, 1, Remedy::Redraw)));
        let source = SourceRef {
            path: folder.join("takes/walk.bvh"),
            sha256: "00".repeat(32),
            reading: Reading::default(),
        };
        Document { sources: vec![source], works: vec![work] }
    }

    fn label(_work: usize, _pass: usize, joint: usize) -> String {
        ["Root", "Spine", "Hip"][joint].to_owned()
    }

    #[test]
    fn a_scene_comes_back_as_it_was_saved() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("scenes/night.ron");
        let document = document(folder.path());
        write(&path, &document, &label).unwrap();
        let mut back = read(&path).unwrap();
        assert_eq!(tidy(&back.document.sources[0].path), document.sources[0].path);
        back.document.sources[0].path.clone_from(&document.sources[0].path);
        // An angle in degrees and back may move by its last bit.
        let mend = back.document.works[0].passes[0].step.as_mend_mut().unwrap();
        assert!((mend.snags[0].size_rad - 3.0).abs() < 1e-15);
        mend.snags[0].size_rad = 3.0;
        assert_eq!(back.document, document);
        let text = std::str::from_utf8(&disk::read(&path).unwrap()).unwrap().to_owned();
        assert!(text.contains("path: \"../takes/walk.bvh\""), "{text}");
    }

    #[test]
    fn how_a_source_is_read_is_remembered() {
        let folder = PathBuf::from("/somewhere");
        let mut document = document(&folder);
        document.sources[0].reading = Reading {
            columns: Some("time=t,w=a,x=b,y=c,z=d".to_owned()),
            time_unit: Some("ms".to_owned()),
            skeleton: Some(folder.join("takes/figure.glb")),
            rest: Some(RestChoice::FirstFrame),
        };
        let path = folder.join("a.ron");
        let text = to_text(&path, &document, &label).unwrap();
        assert!(text.contains("turnwright_scene: 2,"), "an older program would not know what to do with it");
        let back = from_text(&path, &text).unwrap();
        assert_eq!(back.document.sources[0].reading, document.sources[0].reading);
        for (right, wrong, message) in [
            ("time=t,w=a,x=b,y=c,z=d", "t", "sources[0]: columns: expected columns as time=NAME,w=NAME"),
            ("\"ms\"", "\"h\"", "sources[0]: time_unit: expected s, ms or us, found `h`"),
            ("first-frame", "last", "sources[0]: rest: expected bind, defaults or first-frame, found `last`"),
        ] {
            let error = from_text(&path, &text.replace(right, wrong)).unwrap_err().to_string();
            assert!(error.contains(message), "{error}");
        }
    }

    #[test]
    fn markers_and_what_is_looked_for_are_remembered() {
        let folder = PathBuf::from("/somewhere");
        let mut document = document(&folder);
        let marker = |secs: f64, name: &str| Marker { secs, name: name.to_owned() };
        document.works[0].markers = vec![marker(0.1 + 0.2, "left foot down"), marker(2.0, "turn \"away\"")];
        document.works[0].search = SearchChoice { is_loop: true, finds_slides: true };
        let path = folder.join("a.ron");
        let text = to_text(&path, &document, &label).unwrap();
        assert!(text.contains("turnwright_scene: 3,"), "an older program would not know them");
        let back = from_text(&path, &text).unwrap().document;
        assert_eq!(back.works[0].markers, document.works[0].markers);
        assert_eq!(back.works[0].search, document.works[0].search);
        for (right, wrong, message) in [
            ("\"slide\"", "\"hop\"", "clips[0]: search: expected loop or slide, found `hop`"),
            ("(2.0,", "(inf,", "clips[0]: markers: expected seconds, found inf"),
        ] {
            let error = from_text(&path, &text.replace(right, wrong)).unwrap_err().to_string();
            assert!(error.contains(message), "{error}");
        }
    }

    #[test]
    fn the_oldest_version_that_holds_a_scene_is_written() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("night.ron");
        let mut document = document(folder.path());
        let version = |document: &Document| {
            let text = to_text(&path, document, &label).unwrap();
            let back = from_text(&path, &text).unwrap().document.works.swap_remove(0);
            assert_eq!(back.passes.len(), document.works[0].passes.len());
            (text.lines().find(|line| line.contains("turnwright_scene")).unwrap().trim().to_owned(), back)
        };
        assert_eq!(version(&document).0, "turnwright_scene: 1,");
        let scope = Scope { joints: Some(vec![0, 2]), span_secs: Some([0.5, 1.5]), fade_secs: 0.25 };
        let smoothing = Smoothing { kernel: Kernel::Binomial, cutoff_hz: 6.0, most_rad: None };
        let turn = Bivector::new(0.0, 0.5, 0.0);
        let push = Push { joint: 1, center_secs: 0.5, reach_secs: 0.25, turn, frame: PushFrame::World };
        let reduce = ReducePass {
            scope: scope.clone(),
            tip_bound: Some(0.5),
            keep_secs: vec![1.0],
            ..ReducePass::within(0.0)
        };
        let masks = vec![scope.clone()];
        let rotor = Rotor::from_xyzw([0.6, 0.0, 0.8, 0.0]);
        let spacing = Spacing::handles([[0.2, 0.0], [0.7, 1.0]]).unwrap();
        let changes = [
            KeyChange::Insert(vec![
                NewKey { secs: 0.5, rotor: None },
                NewKey { secs: 0.7, rotor: Some(rotor) },
            ]),
            KeyChange::Set(vec![(1.0, rotor)]),
            KeyChange::Move(vec![[1.0, 1.25]]),
            KeyChange::Delete(vec![2.0]),
            KeyChange::Path(vec![0.0], PathKind::Squad),
            KeyChange::Space(vec![0.0, 1.0], spacing),
            KeyChange::Space(vec![2.0], Spacing::EaseBoth),
            KeyChange::Turn(vec![0.0], MeantTurn::OTHER_WAY),
            KeyChange::Turn(vec![0.0], MeantTurn::in_plane(2, Bivector::new(0.0, 1.0, 0.0)).unwrap()),
        ];
        let edits = changes.into_iter().map(|change| KeyEdit { joint: 1, change }).collect();
        let steps: [PassStep; 5] = [
            ResamplePass { rate: 30.0 }.into(),
            SmoothPass { scope, masks, with_places: true, ..SmoothPass::new(smoothing) }.into(),
            PushPass { pushes: vec![push] }.into(),
            reduce.into(),
            KeysPass { edits }.into(),
        ];
        let passes = steps.into_iter().zip(5..).map(|(step, id)| Pass { id: PassId(id), on: true, step });
        document.works[0].passes.extend(passes);
        let (line, back) = version(&document);
        assert_eq!(line, "turnwright_scene: 2,");
        assert_eq!(back.passes[1..3], document.works[0].passes[1..3]);
        assert_eq!(back.passes[4..], document.works[0].passes[4..]);
        let PassStep::Push(own) = &back.passes[3].step else { panic!("{:?}", back.passes[3]) };
        assert!((own.pushes[0].turn - turn).length() < 1e-15 && own.pushes[0].frame == PushFrame::World);
    }

    #[test]
    fn joints_are_found_again_by_name() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("night.ron");
        write(&path, &document(folder.path()), &label).unwrap();
        let mut back = read(&path).unwrap();
        let joint = |name: &str, number| crate::skeleton::Joint {
            name: name.to_owned(),
            number,
            parent: None,
            rest: crate::skeleton::Transform::IDENTITY,
            kind: crate::skeleton::JointKind::Joint,
            tips: vec![],
        };
        let skeleton = Skeleton::new(vec![joint("Hip", 0), joint("Root", 1)]).unwrap();
        assert_eq!(back.fit(0, &Arc::new(skeleton), &NoOthers), ["Spine"]);
        let mend = back.document.works[0].passes[0].step.as_mend().unwrap();
        assert_eq!(mend.snags[0].joint, 0);
        assert!(back.document.works[0].left.is_empty());
    }

    #[test]
    fn what_is_no_scene_is_told_with_its_place() {
        let check = |text: &str, expected: &str| {
            let error = from_text(Path::new("x.ron"), text).unwrap_err().to_string();
            assert!(error.contains(expected), "{text}: {error}");
        };
        check("", "x.ron: line 1, column 1: expected a Turnwright scene");
        check("(turnwright_scene: 99)", "expected scene version 3 or older, found 99");
        check(
            "(turnwright_scene: 1, sources: [], clips: [(source: 0, clip: 0, name: \"a\")])",
            "expected a source below 0, found 0",
        );
        check("(turnwright_scene: 1, sources: 7, clips: [])", "line 1, column 31");
    }
}
