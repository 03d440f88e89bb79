//! What is open: the document with its history, the files behind it, and what has been worked out about its clips.

use std::path::{Path, PathBuf};
use std::sync::{Arc, Mutex};

use crate::clip::{Clip, KeyEdit};
use crate::exchange::Source;
use crate::limit::Limits;
use crate::scene::{
    ClipWork, Document, Edit, Evaluation, Evaluator, History, Library, Loaded, Pass, PassId, PassStep,
    Revision, SearchChoice, SnagMark, SourceRef,
};
use crate::skeleton::Skeleton;
use crate::skeleton::roles::Roles;
use crate::snag::Snag;

use super::blend_state::BlendWork;
use super::carry_state::{CarryMeasured, CarryWork};
use super::commands::Situation;
use super::curve_hand::CurveHand;
use super::session::Session;
use super::view_models::{
    Changes, CurveKey, CurveSet, HeatMap, HeatWish, Memo, SnagFilter, SnagOrder, SnagRow, SnagState,
    snag_rows, snag_states,
};

/// A file of the document.
#[derive(Clone, Debug)]
pub enum SourceState {
    /// Open, and the same as when the scene was saved.
    Ready(Arc<Source>),
    /// Open, but its bytes are not those that the scene was saved with.
    Changed(Arc<Source>),
    /// Not to be opened; why.
    Missing(String),
}

impl SourceState {
    /// The file, if it is open.
    pub fn source(&self) -> Option<&Arc<Source>> {
        match self {
            Self::Ready(source) | Self::Changed(source) => Some(source),
            Self::Missing(_) => None,
        }
    }
}

/// What the passes of one clip came to.
#[derive(Clone, Debug)]
pub struct Evaluated {
    /// The passes that were run.
    pub passes: Vec<Pass>,
    /// What else they needed.
    pub behind: Behind,
    /// What they gave.
    pub evaluation: Arc<Evaluation>,
    /// Their sum in a few numbers.
    pub changes: Changes,
}

/// What a work's result hangs on beside its own clip and passes.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Behind {
    /// Other clips, by rising work.
    pub works: Vec<WorkBehind>,
    /// Skeletons that clips are carried to, by rising source. Another rest pose makes another one.
    pub skeletons: Vec<SkeletonBehind>,
}

/// A skeleton that a clip is carried to.
#[derive(Clone, Debug)]
pub struct SkeletonBehind {
    /// Of which source.
    pub source: usize,
    /// As it is measured now, if the file is open.
    pub skeleton: Option<Arc<Skeleton>>,
}

impl PartialEq for SkeletonBehind {
    fn eq(&self, other: &Self) -> bool {
        self.source == other.source && is_same(self.skeleton.as_ref(), other.skeleton.as_ref())
    }
}

/// Whether both are the very same.
pub(super) fn is_same<T>(a: Option<&Arc<T>>, b: Option<&Arc<T>>) -> bool {
    match (a, b) {
        (Some(a), Some(b)) => Arc::ptr_eq(a, b),
        (None, None) => true,
        _ => false,
    }
}

/// A clip that another one's result hangs on: as its file was read, and what is done to it.
#[derive(Clone, Debug)]
pub struct WorkBehind {
    /// Which work.
    pub work: usize,
    /// Its source clip, if its file is open. Another rest pose, or the file found again, makes another one.
    pub source: Option<Arc<Clip>>,
    /// Its passes.
    pub passes: Vec<Pass>,
}

impl PartialEq for WorkBehind {
    fn eq(&self, other: &Self) -> bool {
        let same_source = is_same(self.source.as_ref(), other.source.as_ref());
        same_source && self.work == other.work && self.passes == other.passes
    }
}

/// What a search for snags hangs on, beside the clip.
#[derive(Clone, Debug, PartialEq)]
pub struct Searched {
    /// The limits that joints are held against.
    pub limits: Option<Arc<Limits>>,
    /// What else is looked for.
    pub search: SearchChoice,
}

impl Searched {
    /// As the document says.
    pub fn of(work: &ClipWork) -> Self {
        Self { limits: work.limits.clone(), search: work.search }
    }
}

/// What has been worked out about one clip.
#[derive(Clone, Debug, Default)]
pub struct Findings {
    /// The snags of the source.
    pub snags: Option<Arc<Vec<Snag>>>,
    /// What they were looked for with, or were to be when the search was stopped.
    pub searched: Option<Searched>,
    /// The search was stopped by hand: it does not start again by itself.
    pub search_is_stopped: bool,
    /// What is on show: the result, or what came of passes that are only tried.
    pub evaluated: Option<Evaluated>,
    /// What the document's own passes came to, as far as they have been run.
    pub settled: Option<Evaluated>,
    /// Remembers the passes that did not change.
    pub evaluator: Arc<Mutex<Evaluator>>,
}

impl Findings {
    /// Takes in what passes came to. `own` are those of the document.
    pub fn take(&mut self, evaluated: Evaluated, own: &[Pass]) {
        let before = self.evaluated.replace(evaluated.clone());
        let newest = [Some(evaluated), before].into_iter().flatten().find(|known| known.passes == own);
        self.settled = newest.or_else(|| self.settled.take());
    }

    /// What these very passes came to, if that is known.
    pub fn came_of(&self, passes: &[Pass]) -> Option<&Evaluated> {
        self.evaluated.iter().chain(&self.settled).find(|known| known.passes == passes)
    }
}

/// An open document.
#[derive(Debug)]
pub struct Project {
    /// Tells answers for this project from those for an older one.
    pub serial: u64,
    /// The documents there were.
    pub history: History,
    /// The files, in the document's order.
    pub sources: Vec<SourceState>,
    /// Where the scene is saved.
    pub scene_path: Option<PathBuf>,
    /// For each clip's work.
    pub findings: Vec<Findings>,
    /// Files as they were read before, or will be again: undo and redo change one for another.
    pub other_readings: Vec<Arc<Source>>,
}

/// Whether a file was read as the document says, its rest pose aside.
fn is_read_as(source: &Source, known: &SourceRef) -> bool {
    let (own, said) = (&source.reading, &known.reading);
    source.path == known.path && own.skeleton == said.skeleton && source.sha256() == known.sha256
}

impl Project {
    /// A new document on files just opened: work on each of their clips.
    pub fn of_sources(serial: u64, sources: Vec<Arc<Source>>) -> Self {
        let mut document = Document::default();
        for (index, source) in sources.iter().enumerate() {
            document.sources.push(SourceRef {
                path: source.path.clone(),
                sha256: source.sha256().to_owned(),
                reading: source.reading.clone(),
            });
            let works = source.clips.iter().enumerate();
            document.works.extend(works.map(|(clip, _)| ClipWork::new(index, clip, source.clip_label(clip))));
        }
        let sources = sources.into_iter().map(SourceState::Ready).collect();
        Self::of_document(serial, document, sources, None)
    }

    /// A document read from a scene file, with its files as far as they were found.
    pub fn of_document(
        serial: u64,
        document: Document,
        sources: Vec<SourceState>,
        scene_path: Option<PathBuf>,
    ) -> Self {
        let findings = document.works.iter().map(|_| Findings::default()).collect();
        let history = History::new(document);
        Self { serial, history, sources, scene_path, findings, other_readings: Vec::new() }
    }

    /// Brings each file in line with what the document says of it: in which of the ways that it has been read, and from which rest pose
    /// its clips are measured. Gives the files whose joints are others now; of their clips nothing is known.
    pub fn follow_readings(&mut self) -> Vec<usize> {
        let document = Arc::clone(self.document());
        let mut others = Vec::new();
        for (index, (state, known)) in self.sources.iter_mut().zip(&document.sources).enumerate() {
            let (SourceState::Ready(source) | SourceState::Changed(source)) = state else { continue };
            let mut readings = self.other_readings.iter_mut();
            if !is_read_as(source, known)
                && let Some(other) = readings.find(|other| is_read_as(other, known))
            {
                std::mem::swap(source, other);
                others.push(index);
            }
            let wanted = known.reading.rest;
            if source.reading.rest != wanted
                && let Some(other) = source.with_rest(wanted)
            {
                *source = Arc::new(other);
            }
        }
        for (work, findings) in document.works.iter().zip(&mut self.findings) {
            if others.contains(&work.source) {
                *findings = Findings::default();
            }
        }
        others
    }

    /// The file of the clip on show.
    pub fn source_of(&self, work: usize) -> Option<&Arc<Source>> {
        self.sources.get(self.document().works.get(work)?.source)?.source()
    }

    /// The current document.
    pub fn document(&self) -> &Arc<Document> {
        self.history.document()
    }

    /// The source clip of a work.
    pub fn source_clip(&self, work: usize) -> Option<&Arc<Clip>> {
        let work = self.document().works.get(work)?;
        self.sources.get(work.source)?.source()?.clips.get(work.clip)
    }

    /// The document with its open files, for passes that need other clips.
    pub fn library(&self) -> Library {
        let loaded = |source: &SourceState| {
            source.source().map(|source| Loaded { clips: source.clips.clone(), skeleton: source.skeleton() })
        };
        let evaluators = self.findings.iter().map(|findings| Arc::clone(&findings.evaluator)).collect();
        let sources = self.sources.iter().map(loaded).collect();
        Library::new(Arc::clone(self.document()), sources).with_evaluators(evaluators)
    }

    /// What a work's result hangs on beside its own clip and passes.
    pub fn behind(&self, work: usize) -> Behind {
        let document = self.document();
        let skeleton = |source: usize| SkeletonBehind {
            source,
            skeleton: self.sources.get(source).and_then(|state| state.source()?.skeleton()),
        };
        let skeletons = document.skeletons_behind(work).into_iter().map(skeleton).collect();
        let behind = |work: usize| WorkBehind {
            work,
            source: self.source_clip(work).cloned(),
            passes: document.works[work].passes.clone(),
        };
        Behind { works: document.leans_on(work).into_iter().map(behind).collect(), skeletons }
    }

    /// The result of a work as far as it is known: until passes have been run, what they gave before.
    pub fn result_clip(&self, work: usize) -> Option<&Arc<Clip>> {
        let evaluated = self.findings.get(work).and_then(|findings| findings.evaluated.as_ref());
        evaluated.map(|evaluated| &evaluated.evaluation.result).or_else(|| self.source_clip(work))
    }

    /// A short name for the title bar.
    pub fn name(&self) -> String {
        let path = self.scene_path.as_deref().or(self
            .document()
            .sources
            .first()
            .map(|source| source.path.as_path()));
        path.map_or_else(|| "Untitled".to_owned(), file_name)
    }

    /// The first file that is missing or not the same, its index.
    pub fn trouble(&self) -> Option<usize> {
        self.sources.iter().position(|source| !matches!(source, SourceState::Ready(_)))
    }
}

/// The last part of a path, for people.
pub fn file_name(path: &Path) -> String {
    path.file_name().map_or_else(|| path.display().to_string(), |name| name.to_string_lossy().into_owned())
}

/// A computed value and the clips it was computed from.
#[derive(Clone, Debug)]
pub struct FromClips<K, V> {
    /// The source.
    pub source: Arc<Clip>,
    /// The result.
    pub result: Arc<Clip>,
    /// Other parameters.
    pub parameters: K,
    /// The value.
    pub value: V,
}

impl<K: PartialEq, V> FromClips<K, V> {
    /// Whether it is of these very clips and parameters.
    pub fn is_of(&self, source: &Arc<Clip>, result: &Arc<Clip>, parameters: &K) -> bool {
        Arc::ptr_eq(&self.source, source)
            && Arc::ptr_eq(&self.result, result)
            && self.parameters == *parameters
    }
}

impl<K> FromClips<K, ()> {
    /// The order together with its answer.
    pub fn with<V>(self, value: V) -> FromClips<K, V> {
        FromClips { source: self.source, result: self.result, parameters: self.parameters, value }
    }
}

/// Everything that panels read.
#[derive(Debug, Default)]
pub struct Bench {
    /// What is open.
    pub project: Option<Project>,
    /// What is looked at.
    pub session: Session,
    /// What a pass would do while one of its parameters is dragged; the document changes on letting go.
    pub preview: Option<(PassId, PassStep)>,
    /// The passes as they would be if what is being dragged by hand were let go now.
    pub trial: Option<Vec<Pass>>,
    /// The turn map.
    pub heat: Option<FromClips<HeatWish, Arc<HeatMap>>>,
    /// The curves of the chosen joint.
    pub curves: Option<FromClips<CurveKey, Arc<CurveSet>>>,
    /// The curves of the further chosen joints.
    pub more_curves: Vec<FromClips<CurveKey, Arc<CurveSet>>>,
    /// What is being done to the curves by hand.
    pub curve_hand: CurveHand,
    /// Which joint of a skeleton plays which part.
    pub roles: Option<(Arc<Skeleton>, Arc<Roles>)>,
    /// What is known of the blend that is looked at.
    pub blend: Option<BlendWork>,
    /// The retarget that is looked at, made ready.
    pub carry: Option<CarryWork>,
    /// The same, carried whole and measured.
    pub carry_measured: Option<CarryMeasured>,
    models: Models,
}

/// What panels show of the snags; worked out when what it hangs on has changed.
#[derive(Debug, Default)]
struct Models {
    states: Memo<SnagKey, Arc<Vec<SnagState>>>,
    rows: Memo<(SnagKey, SnagFilter, SnagOrder), Arc<Vec<SnagRow>>>,
}

#[derive(Clone, Debug)]
struct SnagKey {
    snags: Option<Arc<Vec<Snag>>>,
    work: usize,
    revision: Option<(u64, Revision)>,
}

impl PartialEq for SnagKey {
    fn eq(&self, other: &Self) -> bool {
        let same_snags = is_same(self.snags.as_ref(), other.snags.as_ref());
        same_snags && self.work == other.work && self.revision == other.revision
    }
}

impl Bench {
    /// The work that is looked at.
    pub fn work(&self) -> Option<&ClipWork> {
        self.project.as_ref()?.document().works.get(self.session.work)
    }

    /// The edits of the last pass, where it is on and made of edits of keys: what is done to keys by hand goes on there.
    pub fn last_key_edits(&self) -> &[KeyEdit] {
        match self.work().and_then(|work| work.passes.last()).filter(|pass| pass.on).map(|pass| &pass.step) {
            Some(PassStep::Keys(keys)) => &keys.edits,
            _ => &[],
        }
    }

    /// Its source clip.
    pub fn source(&self) -> Option<&Arc<Clip>> {
        self.project.as_ref()?.source_clip(self.session.work)
    }

    /// Its result as far as it is known.
    pub fn result(&self) -> Option<&Arc<Clip>> {
        self.project.as_ref()?.result_clip(self.session.work)
    }

    /// What the curves of a joint hang on; limits are of the source's joints, and hold where the result has the same.
    pub fn curve_key(&self, joint: usize) -> CurveKey {
        let limits = self.limits().map(|limits| limits.get(joint).copied());
        CurveKey { joint, view: self.session.curve_view, limit: limits.flatten() }
    }

    /// Which joint of this skeleton plays which part, once it has been worked out.
    pub fn roles_of(&self, skeleton: &Arc<Skeleton>) -> Option<&Roles> {
        let (known, roles) = self.roles.as_ref()?;
        Arc::ptr_eq(known, skeleton).then_some(&**roles)
    }

    /// The limits of the joints on show.
    pub fn limits(&self) -> Option<&Arc<Limits>> {
        let (source, result) = (self.source()?, self.result()?);
        self.work()?.limits.as_ref().filter(|_| source.has_skeleton_of(result))
    }

    /// The curves of all chosen joints as far as they are sampled in this view, the chosen joint's first.
    pub fn curve_sets(&self) -> Vec<Arc<CurveSet>> {
        let known = || self.curves.iter().chain(&self.more_curves);
        let of_joint = |joint: usize| {
            let wanted = self.curve_key(joint);
            known().find(|curves| curves.parameters == wanted).map(|curves| Arc::clone(&curves.value))
        };
        self.session.joints().into_iter().filter_map(of_joint).collect()
    }

    /// Another number for each document that is opened: what is kept of how a list was looked at belongs to one.
    pub fn document_serial(&self) -> u64 {
        self.project.as_ref().map_or(0, |project| project.serial)
    }

    /// The clip that the result is compared with: the source, unless a pass has carried it to another skeleton. Joint numbers
    /// of the two mean the same joints.
    pub fn before(&self) -> Option<&Arc<Clip>> {
        let (source, result) = (self.source()?, self.result()?);
        Some(if source.has_skeleton_of(result) { source } else { result })
    }

    /// The result's joint for one of the source: that of the same label, where the result has another skeleton.
    pub fn shown_joint(&self, joint: usize) -> Option<usize> {
        let (source, result) = (self.source()?, self.result()?);
        if source.has_skeleton_of(result) {
            return Some(joint);
        }
        (joint < source.skeleton.len()).then(|| result.skeleton.find(source.skeleton.label(joint)))?
    }

    /// The same for each joint of the source.
    pub fn shown_joints(&self) -> Vec<Option<usize>> {
        let count = self.source().map_or(0, |source| source.skeleton.len());
        (0..count).map(|joint| self.shown_joint(joint)).collect()
    }

    /// What has been worked out about it.
    pub fn findings(&self) -> Option<&Findings> {
        self.project.as_ref()?.findings.get(self.session.work)
    }

    /// Its snags; none while they are being looked for.
    pub fn snags(&self) -> &[Snag] {
        self.findings().and_then(|findings| findings.snags.as_ref()).map_or(&[], |snags| snags.as_slice())
    }

    /// The chosen snag.
    pub fn chosen_snag(&self) -> Option<&Snag> {
        let mark = self.session.snag?;
        self.snags().iter().find(|snag| SnagMark::of(snag) == mark)
    }

    /// The passes to run: those of the document, with the parameters that are being dragged.
    pub fn passes(&self) -> Vec<Pass> {
        if let Some(trial) = &self.trial {
            return trial.clone();
        }
        let mut passes = self.work().map(|work| work.passes.clone()).unwrap_or_default();
        if let Some(more) = self.looked_at() {
            passes = more;
        }
        if let Some((id, step)) = &self.preview {
            for pass in passes.iter_mut().filter(|pass| pass.id == *id) {
                pass.step = step.clone();
            }
        }
        passes
    }

    /// The passes with the chosen snag mended as well, while it is open and its mend is looked at before it is accepted.
    fn looked_at(&self) -> Option<Vec<Pass>> {
        let snag = self.chosen_snag().filter(|_| self.session.looks)?;
        let mark = SnagMark::of(snag);
        let work = self.work().filter(|work| !work.mends(mark) && !work.leaves(mark))?;
        let edit = Edit::Mend { work: 0, snags: vec![snag.clone()] };
        let alone = Document { sources: Vec::new(), works: vec![work.clone()] };
        edit.apply(&alone).ok().and_then(|mut after| after.works.pop()).map(|work| work.passes)
    }

    /// Whether the chosen snag is shown mended though it is open.
    pub fn looks_at_mend(&self) -> bool {
        self.looked_at().is_some()
    }

    /// What is told of the passes in numbers: of those of the document. Only what is being dragged is told as it would be, since letting go
    /// makes it so; a mend that is looked at may never be accepted.
    pub fn told(&self) -> Option<&Evaluated> {
        let findings = self.findings()?;
        let is_dragged = self.preview.is_some() || self.trial.is_some();
        if is_dragged {
            return findings.evaluated.as_ref();
        }
        findings.came_of(&self.work()?.passes).or(findings.settled.as_ref())
    }

    /// What an export would write: what the document's passes as they are now came to, once they have been run.
    pub fn to_be_written(&self) -> Option<&Evaluated> {
        self.findings()?.came_of(&self.work()?.passes)
    }

    /// Whether what is shown is not what the document says: a parameter is dragged, or a mend is looked at.
    pub fn is_trying(&self) -> bool {
        self.preview.is_some() || self.trial.is_some() || self.looked_at().is_some()
    }

    /// Open snags that may be mended unasked.
    pub fn safe_open_snags(&mut self) -> Vec<Snag> {
        self.open_snags(|snag| snag.safe)
    }

    /// Open snags of some sort.
    pub fn open_snags(&mut self, wanted: impl Fn(&Snag) -> bool) -> Vec<Snag> {
        let states = self.snag_states();
        let both = self.snags().iter().zip(states.iter());
        both.filter(|(snag, state)| **state == SnagState::Open && wanted(snag))
            .map(|(snag, _)| snag.clone())
            .collect()
    }

    fn snag_key(&self) -> SnagKey {
        SnagKey {
            snags: self.findings().and_then(|findings| findings.snags.clone()),
            work: self.session.work,
            revision: self.project.as_ref().map(|project| (project.serial, project.history.revision())),
        }
    }

    /// What has been decided about each snag, in their order.
    pub fn snag_states(&mut self) -> Arc<Vec<SnagState>> {
        let key = self.snag_key();
        let Self { models, project, session, .. } = self;
        let work = project.as_ref().and_then(|project| project.document().works.get(session.work));
        let states = models.states.get_or_compute(key, |key| {
            let snags = key.snags.as_ref().map_or(&[][..], |snags| snags.as_slice());
            Arc::new(work.map(|work| snag_states(snags, work)).unwrap_or_default())
        });
        Arc::clone(states)
    }

    /// The rows of the snag table.
    pub fn snag_rows(&mut self) -> Arc<Vec<SnagRow>> {
        let states = self.snag_states();
        let clip = self.source().cloned();
        let key = (self.snag_key(), self.session.filter.clone(), self.session.order);
        let rows = self.models.rows.get_or_compute(key, |(key, filter, order)| {
            let snags = key.snags.as_ref().map_or(&[][..], |snags| snags.as_slice());
            Arc::new(clip.map(|clip| snag_rows(&clip, snags, &states, filter, *order)).unwrap_or_default())
        });
        Arc::clone(rows)
    }

    /// What can be done now.
    pub fn situation(&mut self, is_finding: bool, is_light: bool) -> Situation {
        let states = self.snag_states();
        let safe_snags = self
            .snags()
            .iter()
            .zip(states.iter())
            .filter(|(snag, state)| snag.safe && **state == SnagState::Open)
            .count();
        let session = &self.session;
        let history = self.project.as_ref().map(|project| &project.history);
        let mark = self.chosen_snag().map(SnagMark::of);
        let work = self.work();
        Situation {
            has_document: self.project.is_some(),
            has_clip: self.source().is_some(),
            has_several_clips: self
                .project
                .as_ref()
                .is_some_and(|project| project.document().works.len() > 1),
            has_trouble: self.project.as_ref().is_some_and(|project| project.trouble().is_some()),
            has_table: self
                .project
                .as_ref()
                .and_then(|project| project.source_of(session.work))
                .is_some_and(|source| source.takes_skeleton()),
            undo: history.and_then(|history| history.undo_label()).map(str::to_owned),
            redo: history.and_then(|history| history.redo_label()).map(str::to_owned),
            has_joint: session.joint.is_some(),
            snags: self.snags().len(),
            safe_snags,
            has_snag: mark.is_some(),
            snag_is_mended: mark.zip(work).is_some_and(|(mark, work)| work.mends(mark)),
            snag_is_left: mark.zip(work).is_some_and(|(mark, work)| work.leaves(mark)),
            is_finding,
            is_playing: session.playback.is_playing,
            is_looping: session.playback.is_looping,
            has_loop_range: session.playback.range.is_some(),
            looks: session.looks,
            has_choice: !session.choice.is_everything(),
            has_chosen_span: session.choice.span_secs.is_some(),
            plays_choice: session.playback.only_choice,
            follows: session.follows,
            is_parallel: session.camera.lens == crate::raster::Lens::Orthographic,
            shows_before: session.shows_before,
            shows_source_alone: session.shows_source_alone(),
            is_light,
            worst_first: session.worst_first,
            markers: work.map_or(0, |work| work.markers.len()),
            limits: work.and_then(|work| work.limits.as_ref()).map(|limits| limits.title.clone()),
            search: work.map(|work| work.search).unwrap_or_default(),
            carries: session.carry.is_open,
            curve_view: Some(session.curve_view),
            chosen_keys: session.curves.keys.len(),
            has_segment: session.curves.segment.is_some(),
            can_paste: self.curve_hand.can_paste(self.result()),
            snaps_to_frames: session.curves.snaps_to_frames,
            heat_kind: Some(session.heat_kind),
            has_blend: self.shown_blend().is_some(),
            shows_blend_lane: session.blend.shows_lane,
            shows_blend_clips: session.blend.shows_clips,
            space: session.space.clone(),
            is_mirrored: session.camera.is_mirrored,
        }
    }
}
