//! One JSON object a line for each clip.

use serde_json::{Map, Value, json};

use crate::snag::Snag;

use super::text::ClipReport;

/// The object of a clip, on one line. Degrees and seconds.
pub(in crate::cli) fn clip(report: &ClipReport<'_>) -> String {
    let mut object = Map::new();
    object.insert("clip".to_owned(), json!(report.label));
    object.insert("index".to_owned(), json!(report.index));
    object.insert("joints".to_owned(), json!(report.joints()));
    object.insert("frames".to_owned(), json!(report.clip.grid.count()));
    object.insert("rate".to_owned(), json!(report.clip.grid.rate));
    if let Some(mends) = report.mends {
        object.insert("mended".to_owned(), json!(mends.count()));
        object.insert("left".to_owned(), json!(report.snags.len() - mends.count()));
        object.insert("max_change_deg".to_owned(), json!(mends.max_change_rad.to_degrees()));
    }
    let snags: Vec<Value> =
        report.snags.iter().enumerate().map(|(index, snag)| self::snag(report, index, snag)).collect();
    object.insert("snags".to_owned(), Value::Array(snags));
    Value::Object(object).to_string()
}

fn snag(report: &ClipReport<'_>, index: usize, snag: &Snag) -> Value {
    let mut object = json!({
        "kind": snag.kind.name(),
        "joint": report.clip.skeleton.label(snag.joint),
        "first_frame": snag.first_frame,
        "last_frame": snag.last_frame,
        "first_time": snag.first_secs,
        "last_time": snag.last_secs,
        "size_deg": snag.size_rad.to_degrees(),
        "mend": snag.remedy.name(),
        "safe": snag.safe,
        "text": snag.text,
    });
    if let Some(mends) = report.mends {
        object["mended"] = json!(mends.mended[index]);
        object["left"] = json!(!mends.mended[index]);
        object["change_deg"] = json!(mends.changes_rad[index].to_degrees());
        object["change_length"] = json!(mends.changes_length[index]);
    }
    object
}
