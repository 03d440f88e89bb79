//! Scene files: what can be read is saved, and reads again.
#![no_main]

use std::path::Path;

use turnwright::exchange::ron;

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| {
    let Ok(text) = std::str::from_utf8(bytes) else { return };
    let path = Path::new("nowhere/any.ron");
    let Ok(scene) = ron::from_text(path, text) else { return };
    let label = |work: usize, pass: usize, joint: usize| {
        let labels = scene.labels.get(work).and_then(|labels| labels.passes.get(pass));
        labels.and_then(|labels| labels.get(&joint)).cloned().unwrap_or_default()
    };
    let saved = ron::to_text(path, &scene.document, &label).expect("a scene is saved");
    let again = ron::from_text(path, &saved).expect("what was saved can be read");
    assert_eq!(again.document.works.len(), scene.document.works.len());
});
