//! The proof sheet for machines: one JSON object of plain numbers.

use serde_json::{Map, Value, json};

use crate::limit::Keeping;
use crate::scene::PassNumber;

use super::measure::{JointMeasure, Measurement, StoredForms, TipMeasure};
use super::passes::{MendFacts, PassFacts};
use super::rates::Peak;
use super::sheet::{CAUTION, ClipProof, FoundSnag, LimitRow, Sheet};

/// The sheet as JSON text. Angles in degrees, times in seconds, lengths as in the file.
///
/// `joints`, `tips` and `snags` are flat lists over all clips; each entry names its clip.
pub fn sheet_json(sheet: &Sheet) -> String {
    let file = |facts: &super::FileFacts| {
        json!({
            "file": facts.file,
            "format": facts.format,
            "bytes": facts.bytes,
            "clips": facts.clips,
            "sha256": facts.sha256,
        })
    };
    let mut object = Map::new();
    object.insert("turnwright".to_owned(), json!(env!("CARGO_PKG_VERSION")));
    object.insert("before".to_owned(), file(&sheet.before));
    object.insert("after".to_owned(), file(&sheet.after));
    let worst = sheet
        .clips
        .iter()
        .filter_map(|clip| clip.measurement.most_changed())
        .max_by(|a, b| a.change.value.total_cmp(&b.change.value));
    object.insert("max_change_deg".to_owned(), json!(sheet.max_change_rad().to_degrees()));
    object.insert("max_change_joint".to_owned(), json!(worst.map(|joint| joint.label.as_str())));
    object.insert("max_change_time".to_owned(), json!(worst.map(|joint| joint.change.at_secs)));
    object.insert("clips".to_owned(), sheet.clips.iter().map(clip_object).collect());
    let all = |rows: fn(&ClipProof) -> Vec<Value>| -> Value { sheet.clips.iter().flat_map(rows).collect() };
    object.insert("joints".to_owned(), all(joint_rows));
    object.insert("tips".to_owned(), all(tip_rows));
    object.insert("passes".to_owned(), all(pass_rows));
    object.insert("snags".to_owned(), all(snag_rows));
    object.insert("limits".to_owned(), all(limit_rows));
    object.insert("after_is_read_back".to_owned(), json!(!sheet.is_computed));
    object.insert("notes".to_owned(), json!(sheet.notes));
    object.insert("caution".to_owned(), json!(CAUTION));
    let mut text = serde_json::to_string_pretty(&Value::Object(object)).unwrap_or_default();
    text.push('\n');
    text
}

fn clip_object(clip: &ClipProof) -> Value {
    let measurement: &Measurement = &clip.measurement;
    let [fastest_before, fastest_after] = measurement.fastest_rad().map(f64::to_degrees);
    let [jerk_before, jerk_after] = measurement.jerk_rad().map(f64::to_degrees);
    let farthest = measurement.farthest_tip();
    let mean =
        measurement.joints.iter().map(|joint| joint.mean_rad).sum::<f64>() / measurement.joints.len() as f64;
    json!({
        "clip": clip.label,
        "index": clip.index,
        "frames": measurement.frames,
        "rate": measurement.rate,
        "duration_before": measurement.durations_secs[0],
        "duration_after": measurement.durations_secs[1],
        "times_compared": measurement.times_compared,
        "joints_compared": measurement.joints.len(),
        "joints_untouched": measurement.joints_untouched(),
        "frames_untouched": measurement.frames_untouched,
        "joints_only_before": measurement.only_before,
        "joints_only_after": measurement.only_after,
        "max_change_deg": measurement.max_change_rad().to_degrees(),
        "mean_change_deg": mean.to_degrees(),
        "max_tip_change": farthest.map_or(0.0, |tip| tip.moved.value),
        "max_tip_joint": farthest.map(|tip| tip.label.as_str()),
        "fastest_before_deg_per_s": fastest_before,
        "fastest_after_deg_per_s": fastest_after,
        "max_jerk_before_deg_per_s3": jerk_before,
        "max_jerk_after_deg_per_s3": jerk_after,
        "keys_before": measurement.keys[0],
        "keys_after": measurement.keys[1],
        "stored_before": stored(&measurement.stored[0]),
        "stored_after": stored(&measurement.stored[1]),
        "off_unit_before": measurement.off_unit[0],
        "off_unit_after": measurement.off_unit[1],
        "not_finite_before": measurement.not_finite[0],
        "not_finite_after": measurement.not_finite[1],
        "snags_before": clip.found.len(),
        "snags_gone": clip.gone(),
        "snags_meant": clip.meant(),
        "snags_left": clip.left(),
        "snags_new": clip.new.len(),
    })
}

/// How many joints hold turns in which form.
fn stored(forms: &StoredForms) -> Value {
    json!({
        "rotors": forms.rotors,
        "file_angles": forms.file_angles,
        "plane_angles": forms.plane_angles,
    })
}

fn joint_rows(clip: &ClipProof) -> Vec<Value> {
    let row = |joint: &JointMeasure| {
        let deg = |peak: Peak| peak.value.to_degrees();
        let (before, after) = (&joint.rates_before, &joint.rates_after);
        json!({
            "clip": clip.label,
            "joint": joint.label,
            "max_change_deg": deg(joint.change),
            "max_change_time": joint.change.at_secs,
            "mean_change_deg": joint.mean_rad.to_degrees(),
            "p95_change_deg": joint.p95_rad.to_degrees(),
            "untouched": joint.untouched,
            "keys_changed": joint.keys_changed.as_ref().map(Vec::len),
            "fastest_before_deg_per_s": deg(before.fastest),
            "fastest_after_deg_per_s": deg(after.fastest),
            "max_jerk_before_deg_per_s3": deg(before.jerk),
            "max_jerk_after_deg_per_s3": deg(after.jerk),
            "rms_jerk_before_deg_per_s3": before.rms_jerk.to_degrees(),
            "rms_jerk_after_deg_per_s3": after.rms_jerk.to_degrees(),
        })
    };
    clip.measurement.joints.iter().map(row).collect()
}

fn tip_rows(clip: &ClipProof) -> Vec<Value> {
    let row = |tip: &TipMeasure| {
        json!({
            "clip": clip.label,
            "joint": tip.label,
            "max_change": tip.moved.value,
            "max_change_time": tip.moved.at_secs,
            "mean_change": tip.mean,
        })
    };
    clip.measurement.tips.iter().map(row).collect()
}

fn limit_rows(clip: &ClipProof) -> Vec<Value> {
    let Some(proof) = &clip.limits else { return Vec::new() };
    let row = |row: &LimitRow| {
        let after = |value: fn(&Keeping) -> Value| row.after.as_ref().map_or(Value::Null, value);
        json!({
            "clip": clip.label,
            "limits": proof.title,
            "joint": row.joint,
            "frames": row.before.frames,
            "frames_beyond_limit_before": row.before.beyond_limit,
            "frames_beyond_limit_after": after(|kept| json!(kept.beyond_limit)),
            "most_beyond_limit_before_deg": row.before.most_beyond_limit_rad.to_degrees(),
            "most_beyond_limit_after_deg": after(|kept| json!(kept.most_beyond_limit_rad.to_degrees())),
            "frames_past_limit_before": row.before.beyond_fault,
            "frames_past_limit_after": after(|kept| json!(kept.beyond_fault)),
            "most_past_limit_before_deg": row.before.most_beyond_fault_rad.to_degrees(),
            "most_past_limit_after_deg": after(|kept| json!(kept.most_beyond_fault_rad.to_degrees())),
        })
    };
    proof.rows.iter().map(row).collect()
}

fn numbers(numbers: &[PassNumber]) -> Value {
    let row = |number: &PassNumber| json!({"name": number.name, "value": number.value, "unit": number.unit});
    numbers.iter().map(row).collect()
}

fn pass_rows(clip: &ClipProof) -> Vec<Value> {
    let mend = |mend: &MendFacts| {
        json!({
            "kind": mend.kind.name(),
            "joint": mend.joint,
            "first_frame": mend.frames[0],
            "last_frame": mend.frames[1],
            "mend": mend.mend,
            "numbers": numbers(&mend.numbers),
            "change_deg": mend.change_rad.to_degrees(),
            "change_length": mend.change_length,
        })
    };
    let row = |pass: &PassFacts| {
        json!({
            "clip": clip.label,
            "pass": pass.title,
            "numbers": numbers(&pass.numbers),
            "joints_changed": pass.joints_changed,
            "change_deg": pass.change_rad.map(f64::to_degrees),
            "notes": pass.notes,
            "problem": pass.problem,
            "mends": pass.mends.iter().map(mend).collect::<Vec<_>>(),
        })
    };
    clip.passes.iter().map(row).collect()
}

fn snag_rows(clip: &ClipProof) -> Vec<Value> {
    let row = |snag: &FoundSnag, state: &str| {
        json!({
            "clip": clip.label,
            "kind": snag.kind.name(),
            "joint": snag.joint,
            "first_frame": snag.frames[0],
            "last_frame": snag.frames[1],
            "first_time": snag.secs[0],
            "last_time": snag.secs[1],
            "size_deg": snag.size_rad.to_degrees(),
            "confidence": snag.confidence,
            "mend": snag.mend,
            "safe": snag.safe,
            "state": state,
            "text": snag.text,
        })
    };
    let found = clip.found.iter().map(|snag| row(snag, snag.state()));
    found.chain(clip.new.iter().map(|snag| row(snag, "new"))).collect()
}
