//! Time and ground alignment of real pairs, written for `tests/outside/alignment_check.py`, which finds them again by other means; and
//! what can be said of them here.

use std::path::Path;

use glam::DVec3;
use serde_json::{Value, json};
use turnwright::blend::{Cloud, Landmarks, time_warp};
use turnwright::clip::Clip;
use turnwright::exchange::disk;

use crate::blend_feet;

/// How many equal steps of a way may follow each other, and how far it may leave the diagonal.
const MOST: usize = 2;
const BAND: f64 = 0.3;

fn even(clip: &Clip, count: usize) -> Vec<f64> {
    (0..count).map(|frame| clip.duration_secs * frame as f64 / (count - 1) as f64).collect()
}

fn places(clip: &Clip, secs: f64, landmarks: &Landmarks) -> Vec<DVec3> {
    let world = clip.world_at(secs);
    landmarks.joints.iter().map(|&(joint, _)| world[joint].position()).collect()
}

/// Two poses with the move that was found, as JSON; and how far the move is from what it says of itself.
fn fit(a: &Clip, b: &Clip, at: [f64; 2], landmarks: &Landmarks) -> (Value, f64) {
    let weights: Vec<f64> = landmarks.joints.iter().map(|&(_, weight)| weight).collect();
    let (own, other) = (places(a, at[0], landmarks), places(b, at[1], landmarks));
    let cloud = |points: &[DVec3]| Cloud::from_points(weights.clone(), points.to_vec());
    let (mean, place) = cloud(&own).fit(0, &cloud(&other), 0, 0);
    let moved = own.iter().zip(&other).zip(&weights);
    let sum: f64 = moved.map(|((p, q), w)| w * p.distance_squared(place.apply(*q))).sum();
    let rows = |points: &[DVec3]| points.iter().map(DVec3::to_array).collect::<Vec<[f64; 3]>>();
    let case = json!({
        "own": rows(&own), "other": rows(&other), "weights": weights,
        "turn_rad": place.turn_rad, "x": place.x, "z": place.z, "mean": mean,
    });
    (case, (sum - mean).abs() / mean.max(1e-12))
}

#[test]
fn alignments_of_real_pairs_are_written_for_outsiders() {
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join("blend-export");
    std::fs::create_dir_all(&folder).expect("a folder for the tests");
    for (name, a, b) in blend_feet::pairs() {
        let landmarks = Landmarks::of(&a);
        let mut fits = Vec::new();
        for (first, second) in [(0.1, 0.2), (0.5, 0.5), (0.9, 0.35)] {
            let at = [first * a.duration_secs, second * b.duration_secs];
            let (case, off) = fit(&a, &b, at, &landmarks);
            assert!(off < 1e-6, "{name}: the move does not do what it says: {off}");
            fits.push(case);
        }
        let (rows, columns) = (48, 40);
        let own = Cloud::of(&a, &even(&a, rows), &landmarks);
        let other = Cloud::of(&b, &even(&b, columns), &landmarks);
        let distance = |i: usize, j: usize| own.fit(i, &other, j, 2).0;
        let total = |most, share| time_warp(rows, columns, most, share, distance).expect("a way").total;
        let [free, bounded, banded] = [total(None, 1.0), total(Some(MOST), 1.0), total(Some(MOST), BAND)];
        assert!(free <= bounded && bounded <= banded, "{name}: {free} {bounded} {banded}");
        let grid: Vec<Vec<f64>> =
            (0..rows).map(|row| (0..columns).map(|column| distance(row, column)).collect()).collect();
        let data = json!({
            "fits": fits, "distances": grid, "most": MOST, "band": BAND,
            "free": free, "bounded": bounded, "banded": banded,
        });
        let file = folder.join(format!("{}.json", name.replace([' ', '\''], "-")));
        disk::write(&file, data.to_string().as_bytes()).expect("written");
    }
}
