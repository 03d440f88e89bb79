//! What the retarget sheet shows: rows of the joint map, bars of contacts, what was not met; and the changes that it makes to the pass.

use std::sync::Arc;

use crate::clip::{Clip, FootPart};
use crate::retarget::{
    Driver, Figure, FootContact, HandHold, HoldAt, LinkKind, Report, Transfer, find_contacts,
};
use crate::scene::{Others, RetargetPass, RetargetSetting};
use crate::skeleton::Skeleton;
use crate::skeleton::roles::{Role, Side};

/// Links less sure than this are shown as questions.
const SURE: f64 = 0.5;

/// What a retarget works with, made ready for one clip and one state of its pass.
#[derive(Clone, Debug)]
pub struct CarryFacts {
    /// The figures and the map.
    pub setting: RetargetSetting,
    /// How joints are driven; `None` where nothing is mapped.
    pub transfer: Option<Transfer>,
    /// The contacts that are there when nobody says others.
    pub found: Vec<FootContact>,
    /// The rows of the table.
    pub rows: Vec<CarryRow>,
    /// Doubts that belong to no row: of the figures as wholes, of joints of the source, of the map. Nothing answers these, so long as nobody has
    /// corrected the map.
    pub open: Vec<String>,
}

impl CarryFacts {
    /// Why a contact in this lane could not be held; `None` where it can.
    pub fn missing_for(&self, lane: Lane) -> Option<String> {
        let lacks =
            |figure: &Figure, roles: &[Role]| roles.iter().any(|role| figure.roles.joint(*role).is_none());
        let (part, is_missing) = match lane {
            Lane::Foot(side, _) => {
                let leg = [Role::UpperLeg(side), Role::LowerLeg(side), Role::Foot(side)];
                let both = [&self.setting.source, &self.setting.target];
                (format!("{} leg", side.name()), both.map(|figure| lacks(figure, &leg)))
            }
            Lane::Hand(side) => {
                let arm = [Role::UpperArm(side), Role::LowerArm(side), Role::Hand(side)];
                (format!("{} arm", side.name()), [false, lacks(&self.setting.target, &arm)])
            }
        };
        let who = match is_missing {
            [false, false] => return None,
            [true, false] => "the source figure has no",
            [false, true] => "the target figure has no",
            [true, true] => "neither figure has a",
        };
        Some(format!("It could not be held: {who} {part}"))
    }

    /// How much a person should look at: rows that are questions, and doubts without a row.
    pub fn questions(&self) -> usize {
        self.rows.iter().filter(|row| row.is_question).count() + self.open.len()
    }
}

/// Works them out.
///
/// # Errors
/// When the target's skeleton is not there.
pub fn carry_facts(clip: &Arc<Clip>, pass: &RetargetPass, others: &dyn Others) -> Result<CarryFacts, String> {
    let setting = pass.setting(clip, others).map_err(|error| error.to_string())?;
    let transfer = Transfer::new(clip, &setting.source, &setting.target, &setting.map).ok();
    let found = find_contacts(clip, &setting.source);
    let rows = carry_rows(&setting, transfer.as_ref());
    let open = if pass.rows.is_empty() { open_doubts(&setting) } else { Vec::new() };
    Ok(CarryFacts { setting, transfer, found, rows, open })
}

/// How a target joint comes to its turns.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum CarryState {
    /// A source joint drives it.
    Linked,
    /// A person said which.
    ByHand,
    /// A source chain of another length drives it.
    Spread,
    /// It shares in the twist of a limb.
    Twist,
    /// It moves as the joint does that it is a copy of.
    Copy,
    /// A person keeps it at rest.
    KeptAtRest,
    /// Nothing drives it.
    Free,
}

impl CarryState {
    /// In a word.
    pub const fn word(self) -> &'static str {
        match self {
            Self::Linked => "found",
            Self::ByHand => "by hand",
            Self::Spread => "spread",
            Self::Twist => "twist",
            Self::Copy => "copy",
            Self::KeptAtRest => "at rest",
            Self::Free => "free",
        }
    }
}

/// A row of the joint map.
#[derive(Clone, Debug, PartialEq)]
pub struct CarryRow {
    /// The target joint.
    pub target: usize,
    /// Its label.
    pub target_label: String,
    /// The source joint that drives it, the first of a chain.
    pub source: Option<usize>,
    /// Its label, or what else drives the joint.
    pub source_label: String,
    /// How it is driven.
    pub state: CarryState,
    /// How sure a link is, 0 to 1; `None` without one.
    pub confidence: Option<f64>,
    /// Why.
    pub reason: String,
    /// A person should look at it.
    pub is_question: bool,
}

impl CarryRow {
    /// The row in one sentence, for those who do not see the table.
    pub fn sentence(&self) -> String {
        let sure = self.confidence.map_or(String::new(), |own| format!(", {:.0} % sure", own * 100.0));
        let question = if self.is_question { ", to be looked at" } else { "" };
        format!("Map {} from {}, {}{sure}{question}", self.target_label, self.source_label, self.state.word())
    }
}

/// Doubts of the map but for those that rows show.
fn open_doubts(setting: &RetargetSetting) -> Vec<String> {
    let target = &setting.target;
    let listed: Vec<usize> = target.skeleton.listed().collect();
    let shown: Vec<String> = listed
        .iter()
        .filter_map(|joint| target.roles.doubts.iter().find(|doubt| doubt.joint == Some(*joint)))
        .map(|doubt| format!("target: {}", doubt.text))
        .collect();
    setting.map.doubts.iter().filter(|doubt| !shown.contains(doubt)).cloned().collect()
}

fn carry_rows(setting: &RetargetSetting, transfer: Option<&Transfer>) -> Vec<CarryRow> {
    let (source, target) = (&setting.source, &setting.target);
    let label = |joint: usize| source.skeleton.label(joint).to_owned();
    let doubt = |joint: usize| {
        let own = target.roles.doubts.iter().find(|doubt| doubt.joint == Some(joint));
        own.map(|doubt| doubt.text.clone())
    };
    target
        .skeleton
        .listed()
        .map(|joint| {
            let link = setting.map.of_target(joint);
            let driver = transfer.map_or(Driver::Rest, |transfer| transfer.driver(joint));
            let (source, source_label, state, confidence, reason) = match (&driver, link) {
                (Driver::Joint(from), Some(link)) => {
                    let state =
                        if link.kind == LinkKind::Hand { CarryState::ByHand } else { CarryState::Linked };
                    (Some(*from), label(*from), state, Some(link.confidence), link.reason.clone())
                }
                (Driver::Joint(from), None) => {
                    (Some(*from), label(*from), CarryState::Linked, None, String::new())
                }
                (Driver::Chain(chain), _) => {
                    let words = match chain.as_slice() {
                        [] => String::new(),
                        [only] => label(*only),
                        [first, .., last] => format!("{} to {}", label(*first), label(*last)),
                    };
                    let reason = format!("a chain of {} is spread along this one", chain.len());
                    (
                        chain.first().copied(),
                        words,
                        CarryState::Spread,
                        link.map(|link| link.confidence),
                        reason,
                    )
                }
                (Driver::Twist(of), _) => {
                    let words = format!("twist of {}", target.skeleton.label(*of));
                    (
                        None,
                        words,
                        CarryState::Twist,
                        None,
                        "it lies on that limb and shares in its twist".to_owned(),
                    )
                }
                (Driver::Copy(of), _) => {
                    let words = format!("as {}", target.skeleton.label(*of));
                    (None, words, CarryState::Copy, None, target.roles.joints[joint].reason.clone())
                }
                (Driver::Rest, _) if setting.map.at_rest.contains(&joint) => (
                    None,
                    "nothing".to_owned(),
                    CarryState::KeptAtRest,
                    None,
                    "kept at rest by hand".to_owned(),
                ),
                (Driver::Rest, _) => {
                    let reason = target.roles.joints[joint].reason.clone();
                    (None, "nothing".to_owned(), CarryState::Free, None, reason)
                }
            };
            let is_asked = !matches!(state, CarryState::ByHand | CarryState::KeptAtRest);
            let asked = doubt(joint).filter(|_| is_asked);
            let is_question = asked.is_some() || (is_asked && confidence.is_some_and(|own| own < SURE));
            CarryRow {
                target: joint,
                target_label: target.skeleton.label(joint).to_owned(),
                source,
                source_label,
                state,
                confidence,
                reason: asked.unwrap_or(reason),
                is_question,
            }
        })
        .collect()
}

/// The pass with a target joint driven by that source joint, or kept at rest.
pub fn with_link(pass: &RetargetPass, target: &str, source: Option<&str>) -> RetargetPass {
    let mut pass = without_link(pass, target);
    pass.rows.push((source.map(str::to_owned), Some(target.to_owned())));
    pass
}

/// The pass without what a person said of a target joint.
pub fn without_link(pass: &RetargetPass, target: &str) -> RetargetPass {
    let mut pass = pass.clone();
    pass.rows.retain(|(_, own)| own.as_deref() != Some(target));
    pass
}

/// The lanes of contacts, from top to bottom.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Lane {
    /// A part of a foot.
    Foot(Side, FootPart),
    /// A hand.
    Hand(Side),
}

impl Lane {
    /// All of them.
    pub const ALL: [Self; 6] = [
        Self::Foot(Side::Left, FootPart::Heel),
        Self::Foot(Side::Left, FootPart::Ball),
        Self::Foot(Side::Right, FootPart::Heel),
        Self::Foot(Side::Right, FootPart::Ball),
        Self::Hand(Side::Left),
        Self::Hand(Side::Right),
    ];

    /// `Left heel`.
    pub fn words(self) -> String {
        let (side, part) = match self {
            Self::Foot(side, part) => (side, part.name()),
            Self::Hand(side) => (side, "hand"),
        };
        let name = side.name();
        format!("{}{} {part}", name[..1].to_uppercase(), &name[1..])
    }
}

/// Names a contact of a pass: its lane and its place in the pass's own list, or in that of the contacts found.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct BarMark {
    /// Which lane.
    pub lane: Lane,
    /// Which of the feet's, or of the hands', list.
    pub index: usize,
}

/// A contact as a bar.
#[derive(Clone, Debug, PartialEq)]
pub struct CarryBar {
    /// Which.
    pub mark: BarMark,
    /// First and last second.
    pub span_secs: [f64; 2],
    /// It was found in the clip, and nobody has said so.
    pub is_found: bool,
    /// Where a hand is held.
    pub at: Option<HoldAt>,
}

impl CarryBar {
    /// For those who do not see the bars.
    pub fn sentence(&self) -> String {
        let [first, last] = self.span_secs;
        let how = match self.at {
            Some(HoldAt::Still) => " held still",
            Some(HoldAt::Place(_)) => " held at a point",
            Some(HoldAt::OtherHand) => " held at the other hand",
            None if self.is_found => " found",
            None => "",
        };
        format!("{}{how} from {first:.3} to {last:.3} s", self.mark.lane.words())
    }
}

/// All contacts of a pass as bars.
pub fn carry_bars(pass: &RetargetPass, found: &[FootContact]) -> Vec<CarryBar> {
    let feet = pass.feet.as_deref().unwrap_or(found);
    let feet = feet.iter().enumerate().map(|(index, own)| CarryBar {
        mark: BarMark { lane: Lane::Foot(own.side, own.part), index },
        span_secs: own.span_secs,
        is_found: pass.feet.is_none(),
        at: None,
    });
    let hands = pass.hands.iter().enumerate().map(|(index, own)| CarryBar {
        mark: BarMark { lane: Lane::Hand(own.side), index },
        span_secs: own.span_secs,
        is_found: false,
        at: Some(own.at),
    });
    feet.chain(hands).collect()
}

/// The pass with the contacts that were found written into it, so that they can be changed.
fn said(pass: &RetargetPass, found: &[FootContact]) -> RetargetPass {
    let mut pass = pass.clone();
    pass.feet.get_or_insert_with(|| found.to_vec());
    pass
}

/// The pass with a contact at other times, the earlier first; `None` where there is no such contact.
pub fn with_bar_at(
    pass: &RetargetPass,
    found: &[FootContact],
    mark: BarMark,
    [first, last]: [f64; 2],
) -> Option<RetargetPass> {
    let span_secs = [first.min(last), first.max(last)];
    let mut pass = pass.clone();
    match mark.lane {
        Lane::Foot(..) => {
            pass = said(&pass, found);
            pass.feet.as_mut()?.get_mut(mark.index)?.span_secs = span_secs;
        }
        Lane::Hand(_) => pass.hands.get_mut(mark.index)?.span_secs = span_secs,
    }
    Some(pass)
}

/// The pass with one more contact, and its mark. A foot that is put down is held too.
pub fn with_bar(
    pass: &RetargetPass,
    found: &[FootContact],
    lane: Lane,
    span_secs: [f64; 2],
) -> (RetargetPass, BarMark) {
    match lane {
        Lane::Foot(side, part) => {
            let mut pass = said(pass, found);
            pass.plant_feet = true;
            let feet = pass.feet.get_or_insert_default();
            feet.push(FootContact { side, part, span_secs });
            let index = feet.len() - 1;
            (pass, BarMark { lane, index })
        }
        Lane::Hand(side) => {
            let mut pass = pass.clone();
            pass.hands.push(HandHold { side, span_secs, at: HoldAt::Still });
            let index = pass.hands.len() - 1;
            (pass, BarMark { lane, index })
        }
    }
}

/// The pass without a contact.
pub fn without_bar(pass: &RetargetPass, found: &[FootContact], mark: BarMark) -> RetargetPass {
    let mut pass = pass.clone();
    match mark.lane {
        Lane::Foot(..) => {
            pass = said(&pass, found);
            if let Some(feet) = pass.feet.as_mut().filter(|feet| mark.index < feet.len()) {
                feet.remove(mark.index);
            }
        }
        Lane::Hand(_) if mark.index < pass.hands.len() => {
            pass.hands.remove(mark.index);
        }
        Lane::Hand(_) => {}
    }
    pass
}

/// The pass with a hand held elsewhere.
pub fn with_hold(pass: &RetargetPass, mark: BarMark, at: HoldAt) -> RetargetPass {
    let mut pass = pass.clone();
    if let (Lane::Hand(_), Some(own)) = (mark.lane, pass.hands.get_mut(mark.index)) {
        own.at = at;
    }
    pass
}

/// A line of the report.
#[derive(Clone, Debug, PartialEq)]
pub struct CarryLine {
    /// The words.
    pub text: String,
    /// The frame it is about.
    pub frame: Option<usize>,
    /// Something that could not be met.
    pub is_miss: bool,
}

/// The report in lines, what was not met first.
pub fn carry_lines(report: &Report, target: &Skeleton) -> Vec<CarryLine> {
    let mut lines: Vec<CarryLine> = report
        .missed
        .iter()
        .map(|own| CarryLine { text: own.sentence(target), frame: Some(own.frame), is_miss: true })
        .collect();
    let mut say = |text: String, frame: Option<usize>| lines.push(CarryLine { text, frame, is_miss: false });
    say(
        format!("{} of {} joints driven, lengths × {:.4}", report.driven[0], report.driven[1], report.scale),
        None,
    );
    let worst = report.directions.iter().max_by(|a, b| a.worst_rad.total_cmp(&b.worst_rad));
    if let Some(worst) = worst {
        let unheld = report.unheld_direction_rad;
        let before = if unheld < worst.worst_rad {
            format!("; {:.2}° before anything was held", unheld.to_degrees())
        } else {
            String::new()
        };
        let text = format!(
            "Arms and legs point within {:.2}° of the source's ({}{before})",
            worst.worst_rad.to_degrees(),
            target.label(worst.joint)
        );
        say(text, Some(worst.worst_frame));
    }
    if let Some([before, after]) = report.slide {
        say(format!("{} plants: slide {before:.4} before, {after:.4} after", report.n_plants), None);
    }
    if let Some([before, after]) = report.deepest_dip {
        say(format!("Feet between plants dip {before:.4} before, {after:.4} after"), None);
    }
    if let Some(own) = report.largest_correction {
        let by = own.by_rad.to_degrees();
        say(format!("Largest correction {by:.1}°: {}", target.label(own.joint)), Some(own.frame));
    }
    if let Some(own) = report.largest_clamp {
        let by = own.by_rad.to_degrees();
        say(format!("Largest change by limits {by:.1}°: {}", target.label(own.joint)), Some(own.frame));
    }
    if let Some(own) = report.limits.iter().max_by(|a, b| a.most_use.total_cmp(&b.most_use)) {
        let beyond: usize = report.limits.iter().map(|own| own.beyond).sum();
        let text = format!(
            "Limits {}: {beyond} joint frames beyond, most used {:.0} % ({})",
            report.limits_title,
            own.most_use * 100.0,
            target.label(own.joint)
        );
        say(text, None);
    }
    for note in &report.notes {
        say(note.clone(), None);
    }
    for line in &mut lines {
        line.text.get_mut(..1).map(str::make_ascii_uppercase);
    }
    lines
}

#[cfg(test)]
mod tests {
    use super::*;

    fn contact(first: f64) -> FootContact {
        FootContact { side: Side::Left, part: FootPart::Heel, span_secs: [first, first + 0.5] }
    }

    #[test]
    fn a_found_contact_is_written_into_the_pass_once_it_is_changed() {
        let found = [contact(0.0), contact(1.0)];
        let pass = RetargetPass::new(1);
        let bars = carry_bars(&pass, &found);
        assert!(bars.len() == 2 && bars.iter().all(|bar| bar.is_found));
        let changed = with_bar_at(&pass, &found, bars[1].mark, [1.6, 1.1]).unwrap();
        assert_eq!(changed.feet.as_ref().unwrap()[0], found[0]);
        assert_eq!(changed.feet.as_ref().unwrap()[1].span_secs, [1.1, 1.6]);
        assert!(pass.feet.is_none(), "the old pass stays");
        let (more, mark) = with_bar(&changed, &found, Lane::Hand(Side::Right), [0.2, 0.4]);
        assert_eq!(more.hands.len(), 1);
        let held = with_hold(&more, mark, HoldAt::OtherHand);
        assert_eq!(held.hands[0].at, HoldAt::OtherHand);
        assert!(without_bar(&held, &found, mark).hands.is_empty());
        assert_eq!(without_bar(&pass, &found, bars[0].mark).feet, Some(vec![found[1]]));
    }

    #[test]
    fn what_a_person_says_of_a_joint_takes_the_place_of_what_was_said() {
        let pass = with_link(&RetargetPass::new(1), "hand", Some("lhand"));
        let pass = with_link(&pass, "hand", None);
        assert_eq!(pass.rows, [(None, Some("hand".to_owned()))]);
        assert!(without_link(&pass, "hand").rows.is_empty());
    }
}
