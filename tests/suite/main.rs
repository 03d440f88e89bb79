//! The suite: what several modules promise together, against values and files from outside.
//!
//! | module | what belongs there |
//! |---|---|
//! | `batch` | the bulk kernels: against 50-digit values, against the functions for one rotor, same bits at every level |
//! | `blend` | joining, mixing and layering: against scipy's slerp and mean, and clips that were cut or slowed |
//! | `blend_export` | time and ground alignment of real pairs, written for outsiders to find again |
//! | `blend_feet` | feet in blends: what slides after against what slides in the two clips, on pairs that stand |
//! | `blend_pairs` | blends of clips that differ in rate, unit, rest pose or body; whose way is taken; means; seams of loops |
//! | `bvh` | the outside BVH files: poses by another program, writing back, new files |
//! | `carry_targets` | captured walks and acrobatics onto figures built by code: 59 joints, two skins, a stubby game figure |
//! | `contacts` | feet: which limbs stand, when, and what holding them comes to |
//! | `csv` | the outside CSV files: the same walk as BVH, figures, a sensor; writing back, new files |
//! | `commands` | the real program: what it prints, how it ends, what it writes |
//! | `demo` | the demo scenes are what their generator makes, and their planted faults are found |
//! | `display` | a display without a screen and the real program on it; no tests of its own |
//! | `exchange` | files as a whole: every outside file opens, comes back, and goes into every other format |
//! | `formats` | files as the world has them, made by a writer of its own: many clips and skins, every encoding, odd BVH |
//! | `fuzz` | the fuzz targets without an engine, a second each or as long as asked |
//! | `gltf_broken` | glTF and GLB files, damaged: every error with place, expected and found; random damage without a panic |
//! | `gltf_forms` | glTF and GLB files, rare but right: encodings, node forms, channels of other things |
//! | `gltf_write` | glTF and GLB files, writing: patches that leave the rest alone, new files of clips |
//! | `gltf` | glTF and GLB files, reading: counts of every outside file, playing by the formulas of the standard |
//! | `golden` | comparing a picture with the one a person accepted |
//! | `half_turn_sides` | which side of a flip is taken for the wrong one, in captures with flips longer than what is right |
//! | `ground_faults` | seams planted into real loops and slides under real feet: found, closed, held |
//! | `hostile` | a hundred thousand damaged files of every format: no panic, no hang, no memory beyond the bound |
//! | `layers` | layers point down only, and the window's libraries stay in `app` |
//! | `limit_faults` | joints bent beyond their limits with known truth, planted into the real clips |
//! | `limits` | joint limits: clamps against outside values, what holds for every limit, limits learned; the preset on the real clips |
//! | `mend_order` | the order in which faults are mended and passes run, however they were accepted |
//! | `mended_spans` | what mends keep to: rates that meet at borders, the same at any rate and in any unit |
//! | `path_export` | paths, spacings and meant turns in files, played as each format says |
//! | `paths` | paths between keys, spacing, meant turns: 50-digit derivatives, scipy, and what holds for every track |
//! | `planter` | faults planted into the real clips: what share is found, what is told wrongly, how near the mend comes |
//! | `gui_curves` | editing on the rotation curves, by pointer and keyboard; what is asserted is the document |
//! | `gui_carry` | the retarget sheet, driven by accessible labels; what is asserted is the document |
//! | `gui_display` | the real program in a real window under Xvfb, driven by mouse and keyboard |
//! | `gui_fluid` | the window rests while nothing happens, and shows a change in the next frame |
//! | `gui_harness` | the whole window without a display, for the tests that drive it; no tests of its own |
//! | `gui_paint` | the painter of egui's meshes: known pixels, any number of threads |
//! | `gui_screen` | a screen driven as a person drives it, its picture drawn by our painter |
//! | `gui_space` | the skeleton view driven by pointer and keys: discs, tips, limits; asserted are the turns of the result |
//! | `gui_reach` | every control of the window has a name and is reached with the keyboard, at every size and scale |
//! | `gui_session` | a whole clean-up of a captured dance in a real window, from opening to the exported file |
//! | `gui_settings` | what is remembered from one run to the next, keys, areas, hints, recent files |
//! | `gui_snags` | the list of snags by keys and filters, what a scene remembers of it, a long search that is stopped |
//! | `gui_small` | a small window at a large scale: lists and menus in place of what finds no room |
//! | `gui_start` | the real program where no window can open |
//! | `gui_two` | two clips in the window: the blend lane, its pictures and forms, loops |
//! | `proof` | proof sheets: measured changes whose truth is known, the page and the object |
//! | `proof_sheet` | every figure of a proof sheet against another way to it, and the passes it tells |
//! | `gui_table` | the skeleton of a table that has none of its own |
//! | `gui_time` | turn map, timeline, passes and snags: choices, forms, markers, what is looked for |
//! | `gui_window` | the whole window, driven by accessible labels; what is asserted is the document |
//! | `raster` | small pictures of one subject each |
//! | `retarget` | clips carried to another skeleton: worked examples, identities, what must not matter, captures on figures |
//! | `roles` | which joint plays which part: families of names, hard cases, the outside files |
//! | `reduce` | key reduction on real clips: the bound checked by other means, the count against the fewest there could be |
//! | `rest_pose` | which pose turns are measured from: the candidates, the rule, what follows from it |
//! | `rotor_checks` | every case of the outside rotation checks (mpmath, scipy, numpy-quaternion), within its own tolerance |
//! | `rotor_methods` | the worked examples of the methods page that concern rotors |
//! | `rotor_practice` | facts of the trade about reflections, planes, signs and order |
//! | `rotor_properties` | what holds for every rotor, at random ones that lean to the hard places |
//! | `snags` | faults found and mended: built clips with one fault, and the real files with what is known of them |
//! | `strategies` | the random values; no tests of its own |
//! | `support` | where the outside files are, and comparing with a tolerance; tested by itself only |
mod batch;
mod blend;
mod blend_export;
mod blend_feet;
mod blend_pairs;
mod bvh;
mod carry_targets;
mod commands;
mod contacts;
mod csv;
mod demo;
mod exchange;
mod formats;
mod fuzz;
mod gltf;
mod gltf_broken;
mod gltf_forms;
mod gltf_write;
mod ground_faults;

#[cfg(feature = "gui-tests")]
mod display;
mod golden;
#[cfg(feature = "gui-tests")]
mod gui_carry;
#[cfg(feature = "gui-tests")]
mod gui_curves;
#[cfg(feature = "gui-tests")]
mod gui_display;
#[cfg(feature = "gui-tests")]
mod gui_files;
#[cfg(feature = "gui-tests")]
mod gui_fluid;
#[cfg(feature = "gui-tests")]
mod gui_harness;
#[cfg(feature = "gui-tests")]
mod gui_menus;
#[cfg(feature = "gui-tests")]
mod gui_paint;
#[cfg(feature = "gui-tests")]
mod gui_reach;
#[cfg(feature = "gui-tests")]
mod gui_screen;
#[cfg(feature = "gui-tests")]
mod gui_session;
#[cfg(feature = "gui-tests")]
mod gui_settings;
#[cfg(feature = "gui-tests")]
mod gui_small;
#[cfg(feature = "gui-tests")]
mod gui_snags;
#[cfg(feature = "gui-tests")]
mod gui_space;
#[cfg(feature = "gui-tests")]
mod gui_start;
#[cfg(feature = "gui-tests")]
mod gui_table;
#[cfg(feature = "gui-tests")]
mod gui_time;
#[cfg(feature = "gui-tests")]
mod gui_two;
#[cfg(feature = "gui-tests")]
mod gui_window;
mod half_turn_sides;
mod hostile;
mod layers;
mod limit_faults;
mod limits;
mod mend_order;
mod mended_spans;
mod path_export;
mod paths;
mod planter;
mod proof;
mod proof_sheet;
mod raster;
mod reduce;
mod rest_pose;
mod retarget;
mod roles;
mod rotor_checks;
mod rotor_methods;
mod rotor_practice;
mod rotor_properties;
mod snags;
mod stored_branches;
mod strategies;
mod support;
