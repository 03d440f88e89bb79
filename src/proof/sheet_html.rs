//! The proof sheet for people: one HTML page that needs nothing beside it.

use std::fmt::Write as _;

use base64::Engine as _;

use crate::limit::{Keeping, adult};
use crate::scene::PassNumber;
use crate::snag::SnagKind;

use super::curve_svg::curve_svg;
use super::measure::{JointMeasure, Measurement};
use super::passes::PassFacts;
use super::rates::Peak;
use super::sheet::{CAUTION, ClipProof, FoundSnag, LimitRow, LimitsProof, Sheet, SheetPicture};

/// Light and dark, screen and paper. The planes' colours are Okabe and Ito's (2008).
const STYLE: &str = include_str!("sheet.css");

/// Changes below this many degrees are what file formats round away.
const ROUNDING_DEG: f64 = 1e-3;

/// So many snags are counted at a glance; more are counted by kind.
const MOST_UNCOUNTED: usize = 12;

/// The sheet as an HTML page.
pub fn sheet_html(sheet: &Sheet) -> String {
    let mut page = String::with_capacity(64 << 10);
    let title = format!("Proof sheet: {}", file_name(&sheet.after.file));
    let _ = write!(
        page,
        "<!doctype html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\">\n\
         <meta name=\"viewport\" content=\"width=device-width, initial-scale=1\">\n\
         <meta name=\"color-scheme\" content=\"light dark\">\n<title>{}</title>\n<style>\n{STYLE}</style>\n</head>\n<body>\n<main>\n",
        escape(&title)
    );
    head(&mut page, sheet);
    let foot = foot(sheet);
    for (number, clip) in (1..).zip(&sheet.clips) {
        let is_last = number == sheet.clips.len();
        clip_section(&mut page, clip, sheet.clips.len() > 1, is_last.then_some(&foot));
    }
    if sheet.clips.is_empty() {
        page.push_str(&foot);
    }
    page.push_str("</main>\n</body>\n</html>\n");
    page
}

fn head(page: &mut String, sheet: &Sheet) {
    page.push_str(
        "<header>\n<h1>Proof sheet</h1>\n<div class=\"wide\"><table class=\"files\">\n<thead><tr><th></th><th>File</th><th>Format</th>\
         <th class=\"n\">Bytes</th><th class=\"n\">Clips</th><th>SHA-256</th></tr></thead>\n<tbody>\n",
    );
    for (which, facts) in [("Before", &sheet.before), ("After", &sheet.after)] {
        let _ = writeln!(
            page,
            "<tr><th scope=\"row\">{which}</th><td>{}</td><td>{}</td><td class=\"n\">{}</td><td class=\"n\">{}</td><td class=\"hash\">{}</td></tr>",
            escape(&facts.file),
            escape(&facts.format),
            whole(facts.bytes as f64),
            facts.clips,
            escape(&facts.sha256),
        );
    }
    page.push_str("</tbody>\n</table></div>\n");
    for note in &sheet.notes {
        let _ = writeln!(page, "<p class=\"note\">{}</p>", breakable(note));
    }
    page.push_str("</header>\n");
}

/// `foot` comes after the last clip: with the table before it, so that it does not stand alone on a printed page.
fn clip_section(page: &mut String, clip: &ClipProof, is_one_of_several: bool, foot: Option<&String>) {
    let measurement = &clip.measurement;
    page.push_str("<section>\n");
    if is_one_of_several {
        let _ = writeln!(page, "<h2>Clip {}</h2>", breakable(&clip.label));
    }
    came_in(page, clip);
    if let Some(warning) = unlike(measurement) {
        let _ = writeln!(page, "<p class=\"note\">{}</p>", breakable(&warning));
    }
    tiles(page, clip);
    passes(page, &clip.passes);
    snags(page, clip);
    pictures(page, &clip.pictures);
    if !clip.curves.is_empty() {
        page.push_str(
            "<h3>Joints that changed most</h3>\n<p class=\"legend\"><span class=\"swatch before\"></span>before \
             <span class=\"swatch yz\"></span>yz <span class=\"swatch zx\"></span>zx <span class=\"swatch xy\"></span>xy \
             after. Plane angles in degrees, away from one orientation of the joint.</p>\n<div class=\"curves\">\n",
        );
        for curves in &clip.curves {
            page.push_str(&curve_svg(curves));
        }
        page.push_str("</div>\n");
    }
    if let Some(proof) = &clip.limits {
        limits(page, proof);
    }
    joints(page, measurement);
    page.push_str("<div class=\"end\">\n");
    tips(page, measurement);
    page.push_str(foot.map_or("", String::as_str));
    page.push_str("</div>\n</section>\n");
}

/// What came in, in a line.
fn came_in(page: &mut String, clip: &ClipProof) {
    let measurement = &clip.measurement;
    let forms = &measurement.stored[0];
    let forms = [
        (forms.rotors, "as rotors"),
        (forms.file_angles, "as the file’s own angles"),
        (forms.plane_angles, "as plane angles"),
    ];
    let held: Vec<String> = forms
        .into_iter()
        .filter(|(count, _)| *count > 0)
        .map(|(count, how)| format!("{} {how}", counted(count, "track")))
        .collect();
    let _ = writeln!(
        page,
        "<p class=\"facts\"><b>{}</b> came in with {}, {} at {} a second ({} s) and {} of turns, {}.</p>",
        breakable(&clip.label),
        counted(measurement.joints.len() + measurement.only_before.len(), "joint"),
        counted(measurement.frames, "frame"),
        plain(measurement.rate, 3),
        plain(measurement.durations_secs[0], 3),
        counted(measurement.keys[0], "key"),
        held.join(", "),
    );
}

/// A number of things: `1 joint`, `22 joints`.
fn counted(count: usize, thing: &str) -> String {
    format!("{} {thing}{}", whole(count as f64), if count == 1 { "" } else { "s" })
}

/// Numbers with their names: `cut-off 6 Hz, amount 80 %`.
fn numbers(numbers: &[PassNumber]) -> String {
    let words = numbers.iter().map(|number| {
        let gap = if matches!(number.unit, "" | "°") { "" } else { "\u{a0}" };
        format!("{} {}{gap}{}", number.name, plain(number.value, 3), number.unit)
    });
    words.collect::<Vec<_>>().join(", ")
}

fn passes(page: &mut String, passes: &[PassFacts]) {
    if passes.is_empty() {
        return;
    }
    page.push_str(
        "<h3>Passes that ran</h3>\n<div class=\"wide\"><table>\n<thead><tr><th class=\"n\">No.</th><th>Pass</th><th>Numbers</th>\
         <th class=\"n\">Joints<br>changed</th><th class=\"n\">Largest<br>change</th><th>What it does</th></tr></thead>\n<tbody>\n",
    );
    for (place, pass) in passes.iter().enumerate() {
        let mut words = vec![pass.explanation.to_owned()];
        words.extend(pass.notes.iter().map(|note| sentence(note)));
        words.extend(pass.problem.iter().map(|problem| sentence(&format!("Left out: {problem}"))));
        let _ = writeln!(
            page,
            "<tr><td class=\"n\">{}</td><td>{}</td><td>{}</td><td class=\"n\">{}</td><td class=\"n\">{}</td><td>{}</td></tr>",
            place + 1,
            breakable(&pass.title),
            escape(&numbers(&pass.numbers)),
            pass.joints_changed,
            pass.change_rad.map_or_else(|| "–".to_owned(), degrees),
            breakable(&words.join(" ")),
        );
    }
    page.push_str("</tbody>\n</table></div>\n");
}

/// With a capital letter and one full stop at its end.
fn sentence(words: &str) -> String {
    let mut letters = words.trim_end_matches('.').chars();
    let first = letters.next().map(|letter| letter.to_uppercase().to_string()).unwrap_or_default();
    format!("{first}{}.", letters.as_str())
}

/// What the two clips do not share, in words.
fn unlike(measurement: &Measurement) -> Option<String> {
    let mut parts = Vec::new();
    let [before, after] = measurement.durations_secs;
    if (before - after).abs() > 0.5 / measurement.rate.max(1e-9) {
        let (before, after) = (plain(before, 3), plain(after, 3));
        parts.push(format!("The clips last {before} s and {after} s; compared is what both have."));
    }
    for (names, which) in [(&measurement.only_before, "before"), (&measurement.only_after, "after")] {
        if !names.is_empty() {
            parts.push(format!("Only {which}: {}.", names.join(", ")));
        }
    }
    (!parts.is_empty()).then(|| parts.join(" "))
}

fn tiles(page: &mut String, clip: &ClipProof) {
    let measurement = &clip.measurement;
    page.push_str("<dl class=\"tiles\">\n");
    let mut tile = |label: &str, value: &str, more: &str| {
        let _ = writeln!(
            page,
            "<div><dt>{label}</dt><dd>{value}</dd><dd class=\"more\">{more}</dd></div>",
            value = escape(value),
            more = breakable(more)
        );
    };
    let counts = [(clip.left(), "left"), (clip.meant(), "meant"), (clip.new.len(), "new")];
    let counts: Vec<String> = counts
        .into_iter()
        .filter(|(count, _)| *count > 0)
        .map(|(count, state)| format!("{count} {state}"))
        .collect();
    let more = if counts.is_empty() { "none left".to_owned() } else { counts.join(", ") };
    tile("Snags gone", &format!("{} of {}", clip.gone(), clip.found.len()), &more);
    let where_most = measurement.most_changed().filter(|joint| joint.change.value > 0.0);
    let change =
        where_most.map_or_else(String::new, |joint| format!("{} at {}", joint.label, at(joint.change)));
    tile("Largest change", &degrees(measurement.max_change_rad()), &change);
    let farthest = measurement.farthest_tip().filter(|tip| tip.moved.value > 0.0);
    tile(
        "Farthest limb end",
        &farthest.map_or_else(|| "0".to_owned(), |tip| significant(tip.moved.value)),
        &farthest
            .map_or_else(String::new, |tip| format!("{} at {}, file's lengths", tip.label, at(tip.moved))),
    );
    let untouched = measurement.joints_untouched();
    let bits = if measurement.joints.iter().any(|joint| joint.keys_changed.is_none()) {
        "the two files hold turns in different forms".to_owned()
    } else {
        "the same in every bit".to_owned()
    };
    tile("Joints untouched", &format!("{untouched} of {}", measurement.joints.len()), &bits);
    if let Some(frames) = measurement.frames_untouched {
        tile(
            "Frames untouched",
            &format!("{frames} of {}", measurement.frames),
            "in all joints, in every bit",
        );
    }
    let [before, after] = measurement.fastest_rad().map(|rate| whole(rate.to_degrees()));
    tile("Fastest turn", &format!("{before} → {after}"), "degrees per second, frame to frame");
    let [before, after] = measurement.jerk_rad().map(|jerk| significant(jerk.to_degrees()));
    tile("Largest jerk", &format!("{before} → {after}"), "degrees per second cubed");
    let off = measurement.off_unit.map(significant);
    let [lost_before, lost_after] = measurement.not_finite;
    tile(
        "Off unit length",
        &format!("{} → {}", off[0], off[1]),
        &format!("largest of any stored rotor; no numbers: {lost_before} → {lost_after}"),
    );
    page.push_str("</dl>\n");
}

fn snags(page: &mut String, clip: &ClipProof) {
    if clip.found.is_empty() && clip.new.is_empty() {
        page.push_str("<p>No snag was found in the clip before, and none after.</p>\n");
        return;
    }
    page.push_str("<h3>What was found</h3>\n");
    if clip.found.len() + clip.new.len() > MOST_UNCOUNTED {
        kinds(page, clip);
    }
    page.push_str(
        "<div class=\"wide\"><table class=\"snags\">\n<colgroup><col span=\"2\"><col class=\"joint\"><col span=\"4\">\
         <col class=\"mend\"><col span=\"2\"><col class=\"text\"></colgroup>\n<thead><tr><th>State</th><th>Kind</th><th>Joint</th><th class=\"n\">Frames</th>\
         <th class=\"n\">Seconds</th><th class=\"n\">Size</th><th class=\"n\">Sure</th><th>Mend</th><th class=\"n\">Change</th>\
         <th class=\"n\">Limb<br>end</th><th>What it is</th></tr></thead>\n<tbody>\n",
    );
    let mut row = |snag: &FoundSnag, state: &str| {
        let range = |a: String, b: String| if a == b { a } else { format!("{a}–{b}") };
        let made = clip.mend_of(snag);
        let mend = made.map_or_else(
            || snag.mend.to_owned(),
            |made| match numbers(&made.numbers) {
                none if none.is_empty() => made.mend.to_owned(),
                numbers => format!("{}: {numbers}", made.mend),
            },
        );
        let [change, length] = made.map_or_else(
            || ["–", "–"].map(str::to_owned),
            |made| [degrees(made.change_rad), significant(made.change_length)],
        );
        let advice = if state == "left" && !snag.safe { " A person has to decide." } else { "" };
        let _ = writeln!(
            page,
            "<tr><td class=\"{state}\">{state}</td><td class=\"kind\"><b class=\"letter\">{}</b> {}</td><td>{}</td><td class=\"n\">{}</td>\
             <td class=\"n\">{}</td><td class=\"n\">{}</td><td class=\"n\">{:.0}\u{a0}%</td><td>{}</td><td class=\"n\">{change}</td>\
             <td class=\"n\">{length}</td><td>{}</td></tr>",
            snag.kind.letter(),
            snag.kind,
            breakable(&snag.joint),
            range(snag.frames[0].to_string(), snag.frames[1].to_string()),
            range(plain(snag.secs[0], 2), plain(snag.secs[1], 2)),
            format_args!("{:.1}°", snag.size_rad.to_degrees()),
            100.0 * snag.confidence,
            escape(&mend),
            breakable(&(sentence(without_joint(snag)) + advice)),
        );
    };
    for snag in &clip.found {
        row(snag, snag.state());
    }
    for snag in &clip.new {
        row(snag, "new");
    }
    page.push_str("</tbody>\n</table></div>\n");
}

/// How many snags of each kind there are, in a table of its own.
fn kinds(page: &mut String, clip: &ClipProof) {
    // Known only where the passes are.
    let knows_mends = !clip.passes.is_empty();
    let row = |name: &str, is_own: &dyn Fn(&FoundSnag) -> bool| {
        let of = |is_counted: &dyn Fn(&FoundSnag) -> bool| {
            clip.found.iter().filter(|snag| is_own(snag) && is_counted(snag)).count()
        };
        let mended =
            if knows_mends { of(&|snag| clip.mend_of(snag).is_some()).to_string() } else { "–".into() };
        let state = |state: &'static str| of(&|snag| snag.state() == state);
        format!(
            "<tr>{name}<td class=\"n\">{}</td><td class=\"n\">{mended}</td><td class=\"n\">{}</td><td class=\"n\">{}</td>\
             <td class=\"n\">{}</td><td class=\"n\">{}</td></tr>\n",
            of(&|_| true),
            state("gone"),
            state("left"),
            state("meant"),
            clip.new.iter().filter(|snag| is_own(snag)).count(),
        )
    };
    page.push_str(
        "<table class=\"kinds\">\n<thead><tr><th>Kind</th><th class=\"n\">Found</th><th class=\"n\">Mended</th><th class=\"n\">Gone</th>\
         <th class=\"n\">Left</th><th class=\"n\">Meant</th><th class=\"n\">New</th></tr></thead>\n<tbody>\n",
    );
    for kind in SnagKind::ALL {
        if clip.found.iter().chain(&clip.new).any(|snag| snag.kind == kind) {
            let name = format!("<td class=\"kind\"><b class=\"letter\">{}</b> {kind}</td>", kind.letter());
            page.push_str(&row(&name, &|snag| snag.kind == kind));
        }
    }
    page.push_str("</tbody>\n<tfoot>\n");
    page.push_str(&row("<th scope=\"row\">All</th>", &|_| true));
    page.push_str("</tfoot>\n</table>\n");
}

/// What a snag is, without the name of its joint where that comes first: it has a column of its own.
fn without_joint(snag: &FoundSnag) -> &str {
    let rest = snag.text.strip_prefix(snag.joint.as_str()).and_then(|rest| rest.strip_prefix(' '));
    rest.unwrap_or(&snag.text)
}

fn pictures(page: &mut String, pictures: &[SheetPicture]) {
    let encode = |png: &[u8]| base64::engine::general_purpose::STANDARD.encode(png);
    for picture in pictures {
        let (title, caption) = (escape(&picture.title), escape(&picture.caption));
        let told = breakable(&picture.caption);
        let _ = writeln!(
            page,
            "<h3>{title}</h3>\n<figure><picture><source media=\"screen and (prefers-color-scheme: dark)\" srcset=\"data:image/png;base64,{}\">\
             <img alt=\"{title}: {caption}\" src=\"data:image/png;base64,{}\"></picture><figcaption>{told}</figcaption></figure>",
            encode(&picture.dark_png),
            encode(&picture.light_png),
        );
    }
}

fn joints(page: &mut String, measurement: &Measurement) {
    let is_same = |joint: &&JointMeasure| joint.untouched || joint.change.value.to_degrees() < ROUNDING_DEG;
    let mut rows: Vec<&JointMeasure> = measurement.joints.iter().collect();
    rows.sort_by(|a, b| b.change.value.total_cmp(&a.change.value));
    let changed = rows.iter().position(is_same).unwrap_or(rows.len());
    page.push_str("<h3>Joints</h3>\n");
    if changed == 0 {
        page.push_str("<p>No joint turns otherwise than before by a thousandth of a degree.</p>\n");
    } else {
        joint_table(page, &rows[..changed]);
    }
    if changed < rows.len() {
        let count = rows.len() - changed;
        let _ = writeln!(
            page,
            "<details><summary>{count} {} whose motion is the same to a thousandth of a degree</summary>",
            if count == 1 { "joint" } else { "joints" }
        );
        joint_table(page, &rows[changed..]);
        page.push_str("</details>\n");
    }
}

fn limits(page: &mut String, proof: &LimitsProof) {
    let is_beyond = |row: &&LimitRow| {
        row.before.beyond_limit > 0 || row.after.as_ref().is_some_and(|after| after.beyond_limit > 0)
    };
    let _ = writeln!(page, "<h3>Limits before and after: {}</h3>", escape(&proof.title));
    if proof.title == "adult" {
        let _ = writeln!(page, "<p class=\"note\">{}</p>", adult::CAUTION);
    }
    let beyond: Vec<&LimitRow> = proof.rows.iter().filter(is_beyond).collect();
    let within = proof.rows.len() - beyond.len();
    if !beyond.is_empty() {
        page.push_str(
            "<div class=\"wide\"><table>\n<thead><tr><th rowspan=\"2\">Joint</th><th colspan=\"2\">Frames beyond the limit</th>\
             <th colspan=\"2\">Degrees beyond it at most</th><th colspan=\"2\">Frames told as past-limit</th>\
             <th colspan=\"2\">Degrees beyond that at most</th></tr>\n<tr>\
             <th class=\"n\">before</th><th class=\"n\">after</th><th class=\"n\">before</th><th class=\"n\">after</th>\
             <th class=\"n\">before</th><th class=\"n\">after</th><th class=\"n\">before</th><th class=\"n\">after</th></tr></thead>\n<tbody>\n",
        );
        for row in beyond {
            let after =
                |value: &dyn Fn(&Keeping) -> String| row.after.as_ref().map_or_else(|| "–".to_owned(), value);
            let cells = |value: &dyn Fn(&Keeping) -> String| {
                format!("<td class=\"n\">{}</td><td class=\"n\">{}</td>", value(&row.before), after(value))
            };
            let _ = writeln!(
                page,
                "<tr><td>{}</td>{}{}{}{}</tr>",
                breakable(&row.joint),
                cells(&|kept| kept.beyond_limit.to_string()),
                cells(&|kept| plain(kept.most_beyond_limit_rad.to_degrees(), 1)),
                cells(&|kept| kept.beyond_fault.to_string()),
                cells(&|kept| plain(kept.most_beyond_fault_rad.to_degrees(), 1)),
            );
        }
        page.push_str("</tbody>\n</table></div>\n");
    }
    let _ =
        writeln!(page, "<p>{within} of {} joints keep within their limits throughout.</p>", proof.rows.len());
}

fn joint_table(page: &mut String, rows: &[&JointMeasure]) {
    page.push_str(
        "<div class=\"wide\"><table>\n<thead><tr><th rowspan=\"2\">Joint</th><th colspan=\"4\">Change, degrees</th><th rowspan=\"2\" class=\"n\">Keys<br>changed</th>\
         <th colspan=\"2\">Fastest turn, °/s</th><th colspan=\"2\">RMS jerk, °/s³</th></tr>\n<tr><th class=\"n\">largest</th><th class=\"n\">at</th>\
         <th class=\"n\">mean</th><th class=\"n\">95 %</th><th class=\"n\">before</th><th class=\"n\">after</th><th class=\"n\">before</th><th class=\"n\">after</th></tr></thead>\n<tbody>\n",
    );
    for joint in rows {
        let keys = match &joint.keys_changed {
            None => "–".to_owned(),
            Some(_) if joint.untouched => "none".to_owned(),
            Some(keys) => keys.len().to_string(),
        };
        let when = if joint.change.value > 0.0 { at(joint.change) } else { String::new() };
        let (before, after) = (&joint.rates_before, &joint.rates_after);
        let number = |radians: f64| significant(radians.to_degrees());
        let _ = writeln!(
            page,
            "<tr><td>{}</td><td class=\"n\">{}</td><td class=\"n\">{when}</td><td class=\"n\">{}</td><td class=\"n\">{}</td><td class=\"n\">{keys}</td>\
             <td class=\"n\">{}</td><td class=\"n\">{}</td><td class=\"n\">{}</td><td class=\"n\">{}</td></tr>",
            breakable(&joint.label),
            small(joint.change.value.to_degrees()),
            small(joint.mean_rad.to_degrees()),
            small(joint.p95_rad.to_degrees()),
            whole(before.fastest.value.to_degrees()),
            whole(after.fastest.value.to_degrees()),
            number(before.rms_jerk),
            number(after.rms_jerk),
        );
    }
    page.push_str("</tbody>\n</table></div>\n");
}

fn tips(page: &mut String, measurement: &Measurement) {
    let moved: Vec<_> = measurement.tips.iter().filter(|tip| tip.moved.value > 1e-9).collect();
    if moved.is_empty() {
        return;
    }
    page.push_str(
        "<h3>Ends of limbs</h3>\n<div class=\"wide\"><table>\n<thead><tr><th>Joint</th><th class=\"n\">Farthest</th><th class=\"n\">at</th><th class=\"n\">Mean</th></tr></thead>\n<tbody>\n",
    );
    for tip in moved {
        let _ = writeln!(
            page,
            "<tr><td>{}</td><td class=\"n\">{}</td><td class=\"n\">{}</td><td class=\"n\">{}</td></tr>",
            breakable(&tip.label),
            significant(tip.moved.value),
            at(tip.moved),
            significant(tip.mean)
        );
    }
    page.push_str("</tbody>\n</table></div>\n");
}

fn foot(sheet: &Sheet) -> String {
    let what = if sheet.is_computed {
        "the results of a scene, worked out and not read from a written file"
    } else {
        "the written file as read back"
    };
    let times: usize = sheet.clips.iter().map(|clip| clip.measurement.times_compared).sum();
    format!(
        "<footer>\n<p>Measured on {what}, played as its format says, at {times} times: every frame and key of both files and the middles \
         between. Change: the turn from a joint's orientation before to that after, relative to its parent. Ends of limbs: distance in the scene, in the file's lengths. \
         Fastest turn and jerk: differences from frame to frame.</p>\n<p class=\"caution\">{CAUTION}</p>\n<p>Turnwright {}</p>\n</footer>\n",
        env!("CARGO_PKG_VERSION")
    )
}

fn at(peak: Peak) -> String {
    format!("{} s", plain(peak.at_secs, 3))
}

fn degrees(radians: f64) -> String {
    format!("{}°", small(radians.to_degrees()))
}

/// A change in degrees: fine when small, and 0 only when nothing at all changed.
fn small(degrees: f64) -> String {
    match degrees {
        0.0 => "0".to_owned(),
        tiny if tiny < 0.0005 => "< 0.001".to_owned(),
        large if large >= 100.0 => format!("{large:.1}"),
        usual => format!("{usual:.3}"),
    }
}

/// With at most so many decimals, and none that are zeros at the end.
fn plain(value: f64, decimals: usize) -> String {
    let text = format!("{value:.decimals$}");
    if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.').to_owned() } else { text }
}

/// A whole number with thin gaps between thousands.
fn whole(value: f64) -> String {
    let digits = format!("{:.0}", value.abs());
    let mut text = String::new();
    for (place, digit) in digits.chars().enumerate() {
        if place > 0 && (digits.len() - place).is_multiple_of(3) {
            text.push('\u{202f}');
        }
        text.push(digit);
    }
    text
}

/// Three significant digits.
fn significant(value: f64) -> String {
    // Below this is what f64 rounds away.
    if value < 1e-12 {
        return "0".to_owned();
    }
    if !(1e-3..1e12).contains(&value) {
        return format!("{value:.2e}");
    }
    if value >= 100.0 {
        let unit = 10_f64.powf(value.log10().floor() - 2.0);
        return whole((value / unit).round() * unit);
    }
    let decimals = (2 - value.log10().floor() as i32).max(0) as usize;
    plain(value, decimals)
}

fn file_name(path: &str) -> &str {
    path.rsplit(['/', '\\']).next().unwrap_or(path)
}

/// Text that a browser shows as it is, and may break behind what joins the parts of a name.
pub(super) fn breakable(text: &str) -> String {
    let mut safe = escape(text);
    for joint in ["_", ":", "|"] {
        safe = safe.replace(joint, &format!("{joint}<wbr>"));
    }
    safe
}

/// Text that a browser shows as it is.
pub(super) fn escape(text: &str) -> String {
    let mut safe = String::with_capacity(text.len());
    for letter in text.chars() {
        match letter {
            '&' => safe.push_str("&amp;"),
            '<' => safe.push_str("&lt;"),
            '>' => safe.push_str("&gt;"),
            '"' => safe.push_str("&quot;"),
            '\'' => safe.push_str("&#39;"),
            _ => safe.push(letter),
        }
    }
    safe
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_short_and_never_hide_a_change() {
        assert_eq!([0.0, 0.0001, 0.25, 179.96].map(small), ["0", "< 0.001", "0.250", "180.0"]);
        assert_eq!(
            [0.0, 0.01234, 7.5, 48.06, 12_345.0].map(significant),
            ["0", "0.0123", "7.5", "48.1", "12\u{202f}300"]
        );
        assert_eq!(plain(60.0, 3), "60");
    }

    #[test]
    fn names_from_files_cannot_become_markup() {
        assert_eq!(escape("<b>\"A&B\"</b>"), "&lt;b&gt;&quot;A&amp;B&quot;&lt;/b&gt;");
        assert_eq!(breakable("rig:<L>_'arm'|up"), "rig:<wbr>&lt;L&gt;_<wbr>&#39;arm&#39;|<wbr>up");
    }
}
