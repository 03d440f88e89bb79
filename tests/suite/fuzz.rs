//! The fuzz targets without a fuzzing engine: damaged files of damaged files, of those that could still be read.
//!
//! `TURNWRIGHT_FUZZ_SECS=120` makes each target run for so long; unasked it is a second. What fails is kept under
//! `target/fuzz`.

#[path = "../fuzz/bodies.rs"]
mod bodies;

use std::panic::{AssertUnwindSafe, catch_unwind};
use std::path::{Path, PathBuf};
use std::time::{Duration, Instant};

use turnwright::exchange::disk;

use crate::gltf_broken::Dice;
use crate::hostile::{Seed, damage, seeds};

/// Files that are damaged further, at most.
const MOST_KEPT: usize = 4000;
/// The largest of them, in bytes.
const MOST_BYTES: usize = 64 << 10;
/// Nothing of that size may take so long, on a machine that is busy with much else.
const LONGEST: Duration = Duration::from_secs(20);

fn run_time() -> Duration {
    let asked = std::env::var("TURNWRIGHT_FUZZ_SECS").ok().and_then(|secs| secs.parse().ok());
    Duration::from_secs(asked.unwrap_or(1))
}

/// Runs one target; the same number of rounds meets the same files, however long they take.
#[expect(clippy::print_stdout, reason = "how far it came is what a long run is for")]
fn run(name: &str, target: fn(&[u8]) -> bool, endings: &[&str], dice: u64) {
    let seeds = seeds();
    let is_own = |seed: &&Seed| endings.iter().any(|ending| seed.name.ends_with(ending));
    let mut kept: Vec<Vec<u8>> = seeds.iter().filter(is_own).map(|seed| seed.bytes.clone()).collect();
    if kept.is_empty() {
        kept.push(b" 1.5 -20.25 1e5 .5\n-0.000001 123456789.123456789 ".to_vec());
    }
    let mut dice = Dice::new(dice);
    let (started, secs) = (Instant::now(), run_time());
    let (mut rounds, mut read) = (0_usize, 0_usize);
    while started.elapsed() < secs {
        let mut bytes = kept[dice.below(kept.len())].clone();
        for _ in 0..=dice.below(3) {
            damage(&mut bytes, &seeds, &mut dice);
        }
        let round = Instant::now();
        let Ok(is_read) = catch_unwind(AssertUnwindSafe(|| target(&bytes))) else {
            let path = Path::new(env!("CARGO_MANIFEST_DIR")).join(format!("target/fuzz/{name}-{rounds}"));
            disk::write(&path, &bytes).expect("target can be written to");
            panic!("round {rounds} of {name} fails; its bytes are kept as {}", path.display());
        };
        assert!(round.elapsed() < LONGEST, "round {rounds} of {name} took {:?}", round.elapsed());
        rounds += 1;
        if is_read {
            read += 1;
            if bytes.len() <= MOST_BYTES {
                if kept.len() < MOST_KEPT {
                    kept.push(bytes);
                } else {
                    let place = dice.below(kept.len());
                    kept[place] = bytes;
                }
            }
        }
    }
    println!("{name}: {rounds} files in {:.0} s, {read} of them read", started.elapsed().as_secs_f64());
    assert!(rounds > 20 && read > 0, "{rounds} rounds, {read} read");
}

#[test]
fn bvh_files() {
    run("bvh", bodies::bvh, &[".bvh"], 1);
}

#[test]
fn csv_files() {
    run("csv", bodies::csv, &[".csv"], 2);
}

#[test]
fn gltf_files() {
    run("gltf", bodies::gltf, &[".gltf", ".glb"], 3);
}

#[test]
fn scenes() {
    run("scene", bodies::scene, &[".ron"], 4);
}

#[test]
fn numbers() {
    run("numbers", bodies::numbers, &[], 5);
}

/// Files that once failed: what is kept in `tests/data/broken` is read or refused, and does no harm.
#[test]
fn what_once_failed_fails_no_more() {
    let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/data/broken");
    let Ok(entries) = disk::entries(&folder) else { return };
    for entry in entries {
        let bytes = disk::read(&folder.join(&entry.name)).expect("it is there");
        for target in [bodies::bvh, bodies::csv, bodies::gltf, bodies::scene, bodies::numbers] {
            let outcome = catch_unwind(AssertUnwindSafe(|| target(&bytes)));
            assert!(outcome.is_ok(), "{}", entry.name);
        }
    }
}
