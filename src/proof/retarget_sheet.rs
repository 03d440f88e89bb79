//! What carrying a clip to another skeleton came to, as a sheet.

use std::path::Path;

use serde_json::{Value, json};

use crate::retarget::{Figure, JointMap, Report};

/// The sheet of a retarget by its extension: `.html` for people, anything else JSON. Angles in degrees, lengths as in the target.
///
/// `names` are the file names of source and target.
pub fn retarget_sheet(
    path: &Path,
    report: &Report,
    map: &JointMap,
    [source, target]: [&Figure; 2],
    names: &[String; 2],
) -> String {
    let value = numbers(report, map, [source, target], names);
    let is_page = path.extension().is_some_and(|extension| extension.eq_ignore_ascii_case("html"));
    if is_page { page(&value) } else { format!("{value:#}\n") }
}

fn numbers(report: &Report, map: &JointMap, [source, target]: [&Figure; 2], names: &[String; 2]) -> Value {
    let label = |joint: usize| target.skeleton.label(joint);
    json!({
        "source": names[0],
        "target": names[1],
        "length_factor": report.scale,
        "source_standing_height": report.source_level,
        "joints_driven": report.driven[0],
        "joints": report.driven[1],
        "max_direction_error_deg": report.worst_direction_rad().to_degrees(),
        "max_direction_error_before_holding_deg": report.unheld_direction_rad.to_degrees(),
        "hips_moved_by": report.hips_shift,
        "directions": report.directions.iter().map(|own| json!({
            "joint": label(own.joint),
            "mean_deg": own.mean_rad.to_degrees(),
            "max_deg": own.worst_rad.to_degrees(),
            "frame": own.worst_frame,
        })).collect::<Vec<_>>(),
        "tips": report.tips.iter().map(|(joint, [mean, most])| json!({
            "joint": label(*joint),
            "mean_of_height": mean,
            "max_of_height": most,
        })).collect::<Vec<_>>(),
        "planted_spans": report.n_plants,
        "slide_before": report.slide.map(|slide| slide[0]),
        "slide_after": report.slide.map(|slide| slide[1]),
        "drift_before": report.drift.map(|drift| drift[0]),
        "drift_after": report.drift.map(|drift| drift[1]),
        "largest_correction": report.largest_correction.map(|own| json!({
            "joint": label(own.joint),
            "deg": own.by_rad.to_degrees(),
            "frame": own.frame,
        })),
        "dip_before": report.deepest_dip.map(|dip| dip[0]),
        "dip_after": report.deepest_dip.map(|dip| dip[1]),
        "limits": report.limits_title,
        "largest_change_by_limits": report.largest_clamp.map(|own| json!({
            "joint": label(own.joint),
            "deg": own.by_rad.to_degrees(),
            "frame": own.frame,
        })),
        "limit_use": report.limits.iter().map(|own| json!({
            "joint": label(own.joint),
            "most_use": own.most_use,
            "frames_beyond_before": own.beyond_before,
            "most_beyond_before_deg": own.most_beyond_before_rad.to_degrees(),
            "frames_beyond": own.beyond,
            "most_beyond_deg": own.most_beyond_rad.to_degrees(),
        })).collect::<Vec<_>>(),
        "not_met": report.missed.iter().map(|own| json!({
            "what": own.what,
            "joint": label(own.joint),
            "frame": own.frame,
            "by": own.by,
        })).collect::<Vec<_>>(),
        "map": map.links.iter().map(|link| json!({
            "source": source.skeleton.label(link.source),
            "target": label(link.target),
            "confidence": link.confidence,
            "reason": link.reason,
        })).collect::<Vec<_>>(),
        "doubts": map.doubts,
        "notes": report.notes,
    })
}

/// The same numbers as a page: single values as a list, rows as tables.
fn page(value: &Value) -> String {
    let escape = |text: &str| text.replace('&', "&amp;").replace('<', "&lt;").replace('>', "&gt;");
    let cell = |value: &Value| match value {
        Value::String(text) => escape(text),
        Value::Null => "none".to_owned(),
        Value::Number(number) => number.as_f64().map_or_else(
            || number.to_string(),
            |own| if own.fract() == 0.0 { number.to_string() } else { format!("{own:.5}") },
        ),
        other => escape(&other.to_string()),
    };
    let mut body: Vec<String> = Vec::new();
    let empty = serde_json::Map::new();
    for (name, own) in value.as_object().unwrap_or(&empty) {
        let title = escape(&name.replace('_', " "));
        match own {
            Value::Array(rows) if rows.is_empty() => body.push(format!("<p><b>{title}</b>: none</p>\n")),
            Value::Array(rows) => {
                body.push(format!("<h2>{title}</h2>\n<table>\n"));
                if let Some(first) = rows[0].as_object() {
                    let heads: Vec<String> = first
                        .keys()
                        .map(|key| format!("<th>{}</th>", escape(&key.replace('_', " "))))
                        .collect();
                    body.push(format!("<tr>{}</tr>\n", heads.concat()));
                }
                for row in rows {
                    let cells: Vec<String> = match row.as_object() {
                        Some(row) => row.values().map(|own| format!("<td>{}</td>", cell(own))).collect(),
                        None => vec![format!("<td>{}</td>", cell(row))],
                    };
                    body.push(format!("<tr>{}</tr>\n", cells.concat()));
                }
                body.push("</table>\n".to_owned());
            }
            Value::Object(parts) => {
                let parts: Vec<String> = parts
                    .iter()
                    .map(|(key, own)| format!("{} {}", escape(&key.replace('_', " ")), cell(own)))
                    .collect();
                body.push(format!("<p><b>{title}</b>: {}</p>\n", parts.join(", ")));
            }
            other => body.push(format!("<p><b>{title}</b>: {}</p>\n", cell(other))),
        }
    }
    format!(
        "<!DOCTYPE html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\">\n<title>A clip carried to another skeleton</title>\n\
         <style>\nbody {{ font: 15px sans-serif; margin: 2em; }}\ntable {{ border-collapse: collapse; }}\n\
         td, th {{ border: 1px solid #999; padding: 2px 8px; text-align: left; }}\n</style>\n</head>\n<body>\n\
         <h1>A clip carried to another skeleton</h1>\n{}</body>\n</html>\n",
        body.concat()
    )
}
