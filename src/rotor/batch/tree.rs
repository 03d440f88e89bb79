//! Forward kinematics of a whole tree of joints.

use super::blocks::Column;
use super::level::Level;
use super::product::{product, turned};
use super::real::Real;

/// Times of a tile. So a column is a cache line in `f64`, and the tiles of a tree of 65 joints stay in the caches of a core.
pub const TREE_ROWS: usize = 8;

/// Tiles that [`place_tree`] takes at once. A joint has to wait for its parent; of four tiles there is always one that need not.
/// And from four places in memory more is fetched ahead than from one.
pub const TREE_TILES: usize = 4;

/// How many joints ahead the turns are asked for, so that they are on the way from memory while others are worked on. Two and eight
/// gain less. (The streams of the other kernels the machine foresees by itself: asking for them gained nothing.)
const AHEAD: usize = 4;

/// The turns of a joint at the times of a tile, part by part: s, yz, zx, xy.
pub type Turns<F> = [[F; TREE_ROWS]; 4];

/// How a joint is turned in the scene and where it stands, tile by tile, each part by part: those of [`Turns`], x, y, z.
pub type World<F> = [[[F; TREE_ROWS]; 7]; TREE_TILES];

/// How a joint hangs in its tree.
#[derive(Clone, Copy, Debug)]
pub struct Bone<'a, F> {
    /// The joint that it hangs from, which comes before it; `None` for one that stands in the scene itself.
    pub parent: Option<usize>,
    /// Where it is in the frame of that joint, or in the scene.
    pub place: Place<'a, F>,
}

/// Where a joint is in its parent's frame.
#[derive(Clone, Copy, Debug)]
pub enum Place<'a, F> {
    /// At one point all the time.
    Fixed([F; 3]),
    /// At a point of its own at each time, tile by tile: x, y, z.
    Each(&'a [[[F; TREE_ROWS]; 3]; TREE_TILES]),
}

/// Forward kinematics: all joints in the scene, given how each is turned relative to its parent. As [`super::compose`] and
/// [`super::apply`] down the whole tree.
///
/// The times of the four tiles may be any. Where the turns of a long clip lie in memory, tiles from four parts of it that are far
/// from each other are fetched fastest.
///
/// ```
/// use turnwright::rotor::batch::{self, Bone, Level, Place, TREE_ROWS, TREE_TILES};
///
/// // An arm of two bones along x, at the root turned by a quarter turn in the plane xy, and back again at the elbow.
/// let half = std::f64::consts::FRAC_1_SQRT_2;
/// let turn = |s, xy| [s, 0.0, 0.0, xy].map(|part: f64| [part; TREE_ROWS]);
/// let turns = [turn(half, -half), turn(half, half)];
/// let bone = |parent, x| Bone { parent, place: Place::Fixed([x, 0.0, 0.0]) };
/// let bones = [bone(None, 1.0), bone(Some(0), 2.0)];
/// let mut worlds = [[[[0.0; TREE_ROWS]; 7]; TREE_TILES]; 2];
/// batch::place_tree(Level::best(), &bones, [&turns[..]; TREE_TILES], &mut worlds);
/// let [s, _, _, _, x, y, _] = worlds[1][3].map(|column| column[7]);
/// assert!((s - 1.0).abs() + (x - 1.0).abs() + (y - 2.0).abs() < 1e-14);
/// ```
///
/// # Panics
/// When there are not as many turns in each tile and as many worlds as bones, or a joint comes before its parent.
pub fn place_tree<F: Real>(
    level: Level,
    bones: &[Bone<'_, F>],
    turns: [&[Turns<F>]; TREE_TILES],
    worlds: &mut [World<F>],
) {
    let joints = bones.len();
    for found in turns.map(<[_]>::len).into_iter().chain([worlds.len()]) {
        assert!(found == joints, "expected {joints} joints, found {found}");
    }
    level.run(
        #[inline(always)]
        || {
            for (joint, bone) in bones.iter().enumerate() {
                for turns in turns.iter().filter_map(|tile| tile.get(joint + AHEAD)) {
                    ask_for(turns);
                }
                let (above, own) = worlds.split_at_mut(joint);
                let own = &mut own[0];
                let Some(parent) = bone.parent.map(|parent| &above[parent]) else {
                    for tile in 0..TREE_TILES {
                        stand(&turns[tile][joint], bone.place, tile, &mut own[tile]);
                    }
                    continue;
                };
                match bone.place {
                    Place::Fixed(place) => {
                        for tile in 0..TREE_TILES {
                            carry(
                                &parent[tile],
                                &turns[tile][joint],
                                #[inline(always)]
                                |_| place,
                                &mut own[tile],
                            );
                        }
                    }
                    Place::Each(places) => {
                        for tile in 0..TREE_TILES {
                            let [x, y, z] = &places[tile];
                            carry(
                                &parent[tile],
                                &turns[tile][joint],
                                #[inline(always)]
                                |row| [x[row], y[row], z[row]],
                                &mut own[tile],
                            );
                        }
                    }
                }
            }
        },
    );
}

/// Starts to read from memory, without waiting for it.
#[inline(always)]
fn ask_for<F>(turns: &Turns<F>) {
    #[cfg(target_arch = "x86_64")]
    for part in turns {
        safe_arch::prefetch_t0(part);
    }
    #[cfg(not(target_arch = "x86_64"))]
    let _ = turns;
}

/// A joint without a parent.
#[inline(always)]
fn stand<F: Real>(turns: &Turns<F>, place: Place<'_, F>, tile: usize, own: &mut [Column<F, TREE_ROWS>; 7]) {
    own[..4].copy_from_slice(turns);
    match place {
        Place::Each(places) => own[4..].copy_from_slice(&places[tile]),
        Place::Fixed(place) => {
            for (column, part) in own[4..].iter_mut().zip(place) {
                column.fill(part);
            }
        }
    }
}

/// A joint from its parent.
#[inline(always)]
fn carry<F: Real>(
    parent: &[Column<F, TREE_ROWS>; 7],
    turns: &Turns<F>,
    place: impl Fn(usize) -> [F; 3],
    own: &mut [Column<F, TREE_ROWS>; 7],
) {
    for row in 0..TREE_ROWS {
        let above = [parent[0][row], parent[1][row], parent[2][row], parent[3][row]];
        let turn = product(above, [turns[0][row], turns[1][row], turns[2][row], turns[3][row]]);
        let [x, y, z] = turned(above, place(row));
        own[0][row] = turn[0];
        own[1][row] = turn[1];
        own[2][row] = turn[2];
        own[3][row] = turn[3];
        own[4][row] = parent[4][row] + x;
        own[5][row] = parent[5][row] + y;
        own[6][row] = parent[6][row] + z;
    }
}
