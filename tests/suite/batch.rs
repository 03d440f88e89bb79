use serde_json::Value;
use turnwright::rotor::batch::{self, Bone, Level, Place, Real, Streams, TREE_ROWS, TREE_TILES, Turns};
use turnwright::rotor::{Axis, Bivector, EndRates, EulerOrder, RotationSpline, Rotor, slerp, squad};

use crate::support::{Distance, Tally, list, number, numbers};

/// Lengths around the blocks that the kernels work in.
const COUNTS: [usize; 7] = [0, 1, 63, 64, 65, 128, 1000];

fn reference() -> Value {
    serde_json::from_str(include_str!("../data/batch_reference.json")).expect("our own file is JSON")
}

/// One case of the reference: its kind, the arguments, and the value as the sum of two numbers.
fn case<const I: usize, const O: usize>(value: &Value) -> (String, [f64; I], [[f64; 2]; O]) {
    let parts = list(value);
    let value: Vec<[f64; 2]> = list(&parts[2]).iter().map(numbers).collect();
    let kind = parts[0].as_str().expect("a kind").to_owned();
    (kind, numbers(&parts[1]), value.try_into().expect("as many numbers as the function gives"))
}

fn cases<const I: usize, const O: usize>(
    width: &str,
    function: &str,
) -> Vec<(String, [f64; I], [[f64; 2]; O])> {
    list(&reference()[width][function]).iter().map(case).collect()
}

/// The turn in radians between a rotor found and the exact unit one, and how far the length is from 1.
fn rotor_error(found: [f64; 4], exact: [[f64; 2]; 4]) -> [f64; 2] {
    let off: [f64; 4] = std::array::from_fn(|i| (found[i] - exact[i][0]) - exact[i][1]);
    let along: f64 = (0..4).map(|i| off[i] * exact[i][0]).sum();
    let across = (0..4).fold(0.0, |sum: f64, i| sum.hypot(off[i] - along * exact[i][0]));
    // A rotor and its opposite are the same; the reference takes the short way as the kernels do, so signs agree.
    [2.0 * across, along.abs()]
}

fn angles_error(found: [f64; 3], exact: [[f64; 2]; 3]) -> f64 {
    (0..3).fold(0.0, |sum: f64, i| sum.hypot((found[i] - exact[i][0]) - exact[i][1]))
}

fn column<F: Real, const I: usize>(rows: &[[f64; I]], narrowed: impl Fn(f64) -> F + Copy) -> Vec<Vec<F>> {
    (0..I).map(|part| rows.iter().map(|row| narrowed(row[part])).collect()).collect()
}

fn views<const N: usize, F>(columns: &[Vec<F>]) -> [&[F]; N] {
    std::array::from_fn(|part| columns[part].as_slice())
}

fn accuracy<F: Real + Into<f64>>(
    width: &str,
    narrowed: impl Fn(f64) -> F + Copy,
    allowed: f64,
    log_allowed: f64,
) {
    for (name, level) in Level::all() {
        let known = cases::<9, 4>(width, "slerp");
        let columns = column(&known.iter().map(|case| case.1).collect::<Vec<_>>(), narrowed);
        let mut out = Streams::zeros(known.len());
        let (a, b) = (views(&columns[..4]), views(&columns[4..8]));
        batch::slerp(level, a, b, &columns[8], out.parts_mut());
        let mut tally = Tally::new("bulk slerp");
        for (row, (kind, arguments, exact)) in known.iter().enumerate() {
            let [turn, length] = rotor_error(out.get(row).map(Into::into), *exact);
            tally.check(&format!("{width} {name} {kind} {arguments:?}"), turn.max(length), allowed);
        }
        tally.finish(96);

        let known = cases::<3, 4>(width, "exp");
        let columns = column(&known.iter().map(|case| case.1).collect::<Vec<_>>(), narrowed);
        batch::exp(level, views(&columns), out.parts_mut());
        let mut tally = Tally::new("bulk exp");
        for (row, (kind, arguments, exact)) in known.iter().enumerate() {
            let [turn, length] = rotor_error(out.get(row).map(Into::into), *exact);
            let [yz, zx, xy] = *arguments;
            let allowed = allowed * half_turns(yz.hypot(zx).hypot(xy));
            tally.check(&format!("{width} {name} {kind} {arguments:?}"), turn.max(length), allowed);
        }
        tally.finish(96);

        let known = cases::<4, 3>(width, "log");
        let columns = column(&known.iter().map(|case| case.1).collect::<Vec<_>>(), narrowed);
        let mut out = Streams::zeros(known.len());
        batch::log(level, views(&columns), out.parts_mut());
        let mut tally = Tally::new("bulk log");
        for (row, (kind, arguments, exact)) in known.iter().enumerate() {
            let error = angles_error(out.get(row).map(Into::into), *exact);
            tally.check(&format!("{width} {name} {kind} {arguments:?}"), error, log_allowed);
        }
        tally.finish(96);
    }
}

/// The length of a long turn has to be rounded before its sine is taken; so the error grows with it. At least 1.
fn half_turns(angle: f64) -> f64 {
    1.0_f64.max(angle / std::f64::consts::PI)
}

#[test]
fn kernels_in_double_precision_are_right_to_1e15() {
    accuracy::<f64>("f64", |part| part, 1e-15, 1e-15);
}

#[test]
fn kernels_in_single_precision_are_right_to_3e7() {
    // A rotor of such parts is unit to 6e-8 at best, and near a half turn log multiplies that by 2π.
    accuracy::<f32>("f32", |part| part as f32, 3e-7, 5e-7);
}

#[test]
fn the_functions_for_one_rotor_are_right_to_a_few_roundings() {
    // The unit of the table in DEVELOPERS.md; the factors are the k there.
    const UNIT: f64 = 4e-16;
    let mut tally = Tally::new("slerp of one");
    for (kind, [s, yz, zx, xy, os, oyz, ozx, oxy, t], exact) in cases::<9, 4>("f64", "slerp") {
        let found = slerp(Rotor::new(s, yz, zx, xy), Rotor::new(os, oyz, ozx, oxy), t);
        let turn = rotor_error([found.s, found.yz, found.zx, found.xy], exact)[0];
        tally.check(&kind, turn, 2.0 * UNIT);
    }
    tally.finish(96);
    let mut tally = Tally::new("exp of one");
    for (kind, [yz, zx, xy], exact) in cases::<3, 4>("f64", "exp") {
        let found = Rotor::from_plane_angles(Bivector::new(yz, zx, xy));
        let turn = rotor_error([found.s, found.yz, found.zx, found.xy], exact)[0];
        tally.check(&kind, turn, 2.0 * UNIT * half_turns(yz.hypot(zx).hypot(xy)));
    }
    tally.finish(96);
    let mut tally = Tally::new("log of one");
    for (kind, [s, yz, zx, xy], exact) in cases::<4, 3>("f64", "log") {
        let found = Rotor::new(s, yz, zx, xy).plane_angles();
        tally.check(&kind, angles_error([found.yz, found.zx, found.xy], exact), 3.0 * UNIT);
    }
    tally.finish(96);
}

/// Numbers from −1 to 1 in a fixed order without a pattern.
struct Numbers(u64);

impl Numbers {
    fn next(&mut self) -> f64 {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (self.0 >> 11) as f64 / (1_u64 << 52) as f64 - 1.0
    }

    fn rotor(&mut self) -> Rotor {
        Rotor::new(self.next(), self.next(), self.next(), self.next()).normalize()
    }

    fn rotors(&mut self, count: usize) -> Vec<Rotor> {
        (0..count).map(|_| self.rotor()).collect()
    }
}

fn rows(rotors: &[Rotor]) -> Streams<f64, 4> {
    Streams::from_rows(rotors.iter().map(|r| [r.s, r.yz, r.zx, r.xy]))
}

fn rotor([s, yz, zx, xy]: [f64; 4]) -> Rotor {
    Rotor::new(s, yz, zx, xy)
}

#[test]
fn kernels_agree_with_the_functions_for_one_rotor() {
    let mut numbers = Numbers(1);
    for count in COUNTS {
        let (a, b) = (numbers.rotors(count), numbers.rotors(count));
        let points: Vec<[f64; 3]> =
            (0..count).map(|_| [numbers.next(), numbers.next(), numbers.next()]).collect();
        let (left, right) = (rows(&a), rows(&b));
        let places = Streams::from_rows(points.iter().copied());
        for (name, level) in Level::all() {
            let mut out = Streams::zeros(count);
            batch::compose(level, left.parts(), right.parts(), out.parts_mut());
            for row in 0..count {
                assert_eq!(rotor(out.get(row)), a[row] * b[row], "{name} row {row}");
            }
            let mut turned = Streams::zeros(count);
            batch::apply(level, left.parts(), places.parts(), turned.parts_mut());
            let mut turns = vec![0.0; count];
            batch::turns(level, left.parts(), right.parts(), &mut turns);
            for row in 0..count {
                let exact = a[row].apply(points[row].into()).to_array();
                assert!(turned.get(row).distance_to(&exact) < 1e-15, "{name} row {row}");
                let error = (turns[row] - a[row].turn_to(b[row])).abs();
                assert!(error < 2e-15, "{name} row {row}: {error:e}");
            }
        }
    }
}

#[test]
fn the_smallest_turns_keep_their_digits() {
    for size in [1e-3, 1e-9, 1e-15, 0.0] {
        let small = rows(&[Rotor::from_plane_angles(Bivector::new(size, 0.0, 0.0))]);
        let none = rows(&[-Rotor::IDENTITY]);
        let mut found = [1.0];
        batch::turns(Level::best(), small.parts(), none.parts(), &mut found);
        assert!((found[0] - size).abs() <= 1e-12 * size, "{} for {size}", found[0]);
    }
}

#[test]
fn bulk_squad_goes_wherever_squad_goes() {
    let mut numbers = Numbers(2);
    let four: [Vec<Rotor>; 4] = std::array::from_fn(|_| numbers.rotors(1000));
    let t: Vec<f64> = (0..1000).map(|_| 0.5 + 0.5 * numbers.next()).collect();
    let streams = four.each_ref().map(|rotors| rows(rotors));
    let mut long_ways = 0;
    for (name, level) in Level::all() {
        let mut out = Streams::zeros(1000);
        batch::squad(level, streams.each_ref().map(Streams::parts), &t, out.parts_mut());
        for row in 0..1000 {
            let [a, inner_a, inner_b, b] = four.each_ref().map(|rotors| rotors[row]);
            long_ways += usize::from(a.dot(b) < 0.0);
            let exact = squad(a, inner_a, inner_b, b, t[row]);
            let error = rotor(out.get(row)).distance_to(&exact);
            // Near a full turn between two points the plane between them is their rounding: random ones come that near.
            let nearest_to_opposite = [a.dot(b), inner_a.dot(inner_b)].into_iter().fold(1.0, f64::min);
            assert!(error < 1e-14 / (1.0 + nearest_to_opposite).sqrt(), "{name} row {row}: {error:e}");
        }
    }
    assert!(long_ways > 500, "the rare case was tried: {long_ways}");
}

#[test]
fn near_the_middle_the_short_form_is_slerp() {
    let mut numbers = Numbers(6);
    let a = numbers.rotors(1000);
    let mut b = numbers.rotors(1000);
    // The hard places: equal, opposite, nearly so, and half a turn apart.
    for (row, off) in [0.0, 1e-15, 1e-9, 1e-4].into_iter().enumerate() {
        let near = Rotor::from_plane_angles(Bivector::new(off, 0.0, off));
        (b[2 * row], b[2 * row + 1]) = (a[2 * row] * near, -(a[2 * row + 1] * near));
    }
    b[8] = a[8] * Rotor::new(0.0, 0.0, 1.0, 0.0);
    let t: Vec<f64> =
        (0..1000).map(|row| 0.5 + if row % 2 == 0 { 1e-10 * numbers.next() } else { 0.0 }).collect();
    for (name, level) in Level::all() {
        let mut out = Streams::zeros(1000);
        batch::slerp_at_middle(level, rows(&a).parts(), rows(&b).parts(), &t, out.parts_mut());
        for row in 0..1000 {
            let (found, exact) = (rotor(out.get(row)), slerp(a[row], b[row], t[row]));
            // Halfway round a half turn either way is right.
            let is_either = row == 8 && a[row].dot(b[row]).abs() < 1e-15;
            let error = found.distance_to(&exact);
            assert!(error < 1.5e-15 || is_either, "{name} row {row}: {error:e}");
            assert!((found.norm() - 1.0).abs() < 1e-15, "{name} row {row}");
        }
    }
}

/// A joint alone: for each row the turn and place of the parent, and its own relative to it.
fn placed_alone(
    bones: &[Option<usize>],
    turns: &[[Rotor; TIMES]],
    places: &[[glam::DVec3; TIMES]],
) -> Vec<[(Rotor, glam::DVec3); TIMES]> {
    let mut worlds: Vec<[(Rotor, glam::DVec3); TIMES]> = vec![];
    for (joint, parent) in bones.iter().enumerate() {
        let world = std::array::from_fn(|time| {
            let (turn, place) = (turns[joint][time], places[joint][time]);
            parent.map_or((turn, place), |parent| {
                let (above, at) = worlds[parent][time];
                (above * turn, at + above.apply(place))
            })
        });
        worlds.push(world);
    }
    worlds
}

const TIMES: usize = TREE_ROWS * TREE_TILES;

#[test]
fn a_tree_is_the_product_and_the_place_in_the_parents_frame_joint_by_joint() {
    let mut numbers = Numbers(7);
    // A root that walks, two chains, one joint that slides in its parent's frame, and a second root that stands.
    let parents = [None, Some(0), Some(1), Some(0), Some(3), Some(4), None, Some(6)];
    let moves = [0, 4];
    let turns: Vec<[Rotor; TIMES]> =
        parents.iter().map(|_| std::array::from_fn(|_| numbers.rotor())).collect();
    let places: Vec<[glam::DVec3; TIMES]> = (0..parents.len())
        .map(|joint| {
            let mut place = || glam::DVec3::new(numbers.next(), numbers.next(), numbers.next());
            let still = place();
            std::array::from_fn(|_| if moves.contains(&joint) { place() } else { still })
        })
        .collect();
    let tile = |tile: usize| -> Vec<Turns<f64>> {
        let parts = |joint: usize| {
            std::array::from_fn(|part| {
                std::array::from_fn(|row| {
                    let turn = turns[joint][tile * TREE_ROWS + row];
                    [turn.s, turn.yz, turn.zx, turn.xy][part]
                })
            })
        };
        (0..parents.len()).map(parts).collect()
    };
    let tiles: [Vec<Turns<f64>>; TREE_TILES] = std::array::from_fn(tile);
    let each: Vec<[[[f64; TREE_ROWS]; 3]; TREE_TILES]> = places
        .iter()
        .map(|places| {
            std::array::from_fn(|tile| {
                std::array::from_fn(|part| std::array::from_fn(|row| places[tile * TREE_ROWS + row][part]))
            })
        })
        .collect();
    let bones: Vec<Bone<'_, f64>> = (0..parents.len())
        .map(|joint| Bone {
            parent: parents[joint],
            place: if moves.contains(&joint) {
                Place::Each(&each[joint])
            } else {
                Place::Fixed(places[joint][0].to_array())
            },
        })
        .collect();
    let alone = placed_alone(&parents, &turns, &places);
    let mut both = vec![];
    for (name, level) in Level::all() {
        let mut worlds = vec![[[[0.0; TREE_ROWS]; 7]; TREE_TILES]; parents.len()];
        batch::place_tree(level, &bones, tiles.each_ref().map(Vec::as_slice), &mut worlds);
        for (joint, alone) in alone.iter().enumerate() {
            for (time, (turn, place)) in alone.iter().enumerate() {
                let found = worlds[joint][time / TREE_ROWS].map(|column| column[time % TREE_ROWS]);
                let [s, yz, zx, xy, x, y, z] = found;
                assert_eq!(Rotor::new(s, yz, zx, xy), *turn, "{name} joint {joint} time {time}");
                let apart = place.distance(glam::DVec3::new(x, y, z));
                assert!(apart < 5e-15, "{name} joint {joint} time {time}: {apart:e}");
            }
        }
        both.push(
            worlds
                .as_flattened()
                .as_flattened()
                .as_flattened()
                .iter()
                .map(|x| x.to_bits())
                .collect::<Vec<_>>(),
        );
    }
    assert_eq!(both[0], both[1], "the same bits at both levels");
}

#[test]
#[should_panic(expected = "expected 2 joints, found 1")]
fn a_tree_of_other_size_than_its_turns_is_told() {
    let bone = Bone { parent: None, place: Place::Fixed([0.0; 3]) };
    let turns: [Turns<f64>; 1] = [[[1.0; TREE_ROWS]; 4]];
    batch::place_tree(Level::best(), &[bone; 2], [&turns[..]; TREE_TILES], &mut []);
}

#[test]
fn a_spline_at_many_times_is_the_spline_at_each() {
    let secs: Vec<f64> = (0..50).map(|key| f64::from(key) * 0.1 + f64::from(key % 3) * 0.02).collect();
    let turn = |key: f64| Bivector::new(key.sin(), 0.7 * (1.3 * key).cos(), 0.4 * key.cos());
    let keys: Vec<Rotor> = (0..50).map(|key| Rotor::from_plane_angles(turn(f64::from(key)))).collect();
    let spline = RotationSpline::new(&secs, &keys, EndRates::Secant).unwrap();
    let mut asked: Vec<f64> = (-10..600).map(|step| f64::from(step) * 0.01).collect();
    asked.extend([4.0, 0.3, f64::NAN, 2.2, f64::INFINITY, f64::NEG_INFINITY]);
    asked.extend(&secs);
    let found = spline.at_all(&asked);
    assert_eq!(found.len(), asked.len());
    for (found, secs) in found.iter().zip(asked) {
        let error = found.distance_to(&spline.at(secs));
        assert!(error < 2e-15, "at {secs}: {error:e}");
    }
}

#[test]
fn euler_kernels_agree_in_all_orders() {
    let mut numbers = Numbers(3);
    for order in EulerOrder::ALL {
        let mut angles: Vec<[f64; 3]> =
            (0..500).map(|_| std::array::from_fn(|_| 9.0 * numbers.next())).collect();
        // Poles and their neighbours, and what goes round so often that only the exact function will do.
        let middle = if order.is_proper() { 0.0 } else { std::f64::consts::FRAC_PI_2 };
        for off in [0.0, 1e-16, 1e-12, 1e-9, 1e-6] {
            angles.extend([[0.3, middle - off, -1.2], [2.5, middle + off, 0.9], [-0.4, -middle + off, 3.0]]);
        }
        angles.push([1e9, 0.2, 0.3]);
        let given = Streams::from_rows(angles.iter().copied());
        for (name, level) in Level::all() {
            let mut turned = Streams::zeros(angles.len());
            batch::euler_rotors(level, order, given.parts(), turned.parts_mut());
            let mut back = Streams::zeros(angles.len());
            batch::euler_angles(level, order, turned.parts(), 0.25, back.parts_mut());
            for (row, angles) in angles.iter().enumerate() {
                let exact = order.to_rotor(*angles);
                let found = rotor(turned.get(row));
                let error = found.distance_to(&exact);
                assert!(error < 2e-15, "{name} {order} {angles:?}: {error:e} rad to the rotor");
                let triple = back.get(row);
                let lost = order.to_rotor(triple).distance_to(&found);
                assert!(lost < 2e-15, "{name} {order} {angles:?} as {triple:?}: {lost:e} rad lost");
                let alone = order.from_rotor(found, 0.25);
                let same = order.nearest_equal(triple, alone).distance_to(&alone);
                let is_near_pole = row >= 500 && row + 1 < angles.len();
                assert!(is_near_pole || same < 1e-12, "{name} {order}: {triple:?}, for one {alone:?}");
                let most = std::f64::consts::PI + 1e-15;
                assert!((triple[0].abs() <= most) & (triple[2].abs() <= most), "{triple:?}");
            }
        }
    }
}

#[test]
fn at_a_pole_the_last_angle_is_the_one_asked_for() {
    let order = EulerOrder::ZXY;
    let at_pole = Axis::Z.rotor(0.7) * Axis::X.rotor(std::f64::consts::FRAC_PI_2);
    let mut out = Streams::zeros(1);
    batch::euler_angles(Level::best(), order, rows(&[at_pole]).parts(), 0.4, out.parts_mut());
    let [first, middle, last] = out.get(0);
    assert!((last - 0.4).abs() < 1e-15 && (middle - std::f64::consts::FRAC_PI_2).abs() < 1e-15, "{last}");
    assert!(order.to_rotor([first, middle, last]).distance_to(&at_pole) < 1e-15);
}

#[test]
fn all_levels_give_the_same_bits() {
    fn bits<F: Real, const N: usize>(run: impl Fn(Level, &mut Streams<F, N>), bits: impl Fn(F) -> u64) {
        let of_level = |level| {
            let mut out = Streams::zeros(1000);
            run(level, &mut out);
            (0..1000).map(|row| out.get(row).map(&bits)).collect::<Vec<_>>()
        };
        let plain = of_level(Level::baseline());
        for (name, level) in Level::all() {
            for (row, (found, plain)) in of_level(level).iter().zip(&plain).enumerate() {
                assert_eq!(found, plain, "{name} row {row}");
            }
        }
    }
    fn wide<const N: usize>(run: impl Fn(Level, &mut Streams<f64, N>)) {
        bits(run, f64::to_bits);
    }
    let mut numbers = Numbers(4);
    let (a, b) = (rows(&numbers.rotors(1000)), rows(&numbers.rotors(1000)));
    let (inner_a, inner_b) = (rows(&numbers.rotors(1000)), rows(&numbers.rotors(1000)));
    let t: Vec<f64> = (0..1000).map(|_| 0.5 + 0.5 * numbers.next()).collect();
    let angles: Streams<f64, 3> =
        Streams::from_rows((0..1000).map(|_| std::array::from_fn(|_| numbers.next())));
    wide(|level, out: &mut Streams<f64, 4>| batch::slerp(level, a.parts(), b.parts(), &t, out.parts_mut()));
    wide(|level, out: &mut Streams<f64, 4>| {
        batch::squad(level, [a.parts(), inner_a.parts(), inner_b.parts(), b.parts()], &t, out.parts_mut());
    });
    let middles: Vec<f64> = t.iter().map(|t| 0.5 + 1e-11 * t).collect();
    wide(|level, out: &mut Streams<f64, 4>| {
        batch::slerp_at_middle(level, a.parts(), b.parts(), &middles, out.parts_mut());
    });
    wide(|level, out: &mut Streams<f64, 4>| batch::exp(level, angles.parts(), out.parts_mut()));
    wide(|level, out: &mut Streams<f64, 3>| batch::log(level, a.parts(), out.parts_mut()));
    wide(|level, out: &mut Streams<f64, 4>| batch::compose(level, a.parts(), b.parts(), out.parts_mut()));
    wide(|level, out: &mut Streams<f64, 3>| batch::apply(level, a.parts(), angles.parts(), out.parts_mut()));
    wide(|level, out: &mut Streams<f64, 1>| {
        let [turns] = out.parts_mut();
        batch::turns(level, a.parts(), b.parts(), turns);
    });
    for order in EulerOrder::ALL {
        wide(|level, out: &mut Streams<f64, 4>| {
            batch::euler_rotors(level, order, angles.parts(), out.parts_mut());
        });
        wide(|level, out: &mut Streams<f64, 3>| {
            batch::euler_angles(level, order, a.parts(), 0.0, out.parts_mut());
        });
    }
    let narrow = |streams: &Streams<f64, 4>| {
        Streams::<f32, 4>::from_rows((0..1000).map(|row| streams.get(row).map(|part| part as f32)))
    };
    let (a, b) = (narrow(&a), narrow(&b));
    let t: Vec<f32> = t.iter().map(|t| *t as f32).collect();
    let slerp = |level, out: &mut Streams<f32, 4>| {
        batch::slerp(level, a.parts(), b.parts(), &t, out.parts_mut());
    };
    bits(slerp, |part| u64::from(part.to_bits()));
}

#[test]
fn what_is_no_number_stays_in_its_row() {
    let mut rotors = Numbers(5).rotors(100);
    rotors[70] = Rotor::new(f64::NAN, 0.0, 0.0, 0.0);
    let broken = rows(&rotors);
    let mut out = Streams::zeros(100);
    batch::log(Level::best(), broken.parts(), out.parts_mut());
    for row in 0..100 {
        assert_eq!(out.get(row).iter().all(|part| part.is_finite()), row != 70, "row {row}");
    }
}

#[test]
#[should_panic(expected = "expected streams of one length, found 3 and 2")]
fn streams_of_two_lengths_are_told() {
    let (three, two) = (Streams::<f64, 4>::zeros(3), Streams::<f64, 4>::zeros(2));
    let mut out = Streams::zeros(3);
    batch::compose(Level::best(), three.parts(), two.parts(), out.parts_mut());
}

#[test]
fn the_reference_is_what_its_script_says() {
    // A quarter turn halfway, by hand: so that the file itself is tied to something.
    let half = std::f64::consts::FRAC_1_SQRT_2;
    let quarter = Rotor::new(half, -half, 0.0, 0.0);
    let known = slerp(Rotor::IDENTITY, quarter, 0.5);
    let exact = [(22.5_f64).to_radians().cos(), -(22.5_f64).to_radians().sin()];
    assert!((known.s - exact[0]).abs() + (known.yz - exact[1]).abs() < 1e-15);
    let first = list(&reference()["f64"]["slerp"])[0].clone();
    let (_, arguments, exact) = case::<9, 4>(&first);
    let norm: f64 = exact.iter().map(|part| number(&Value::from(part[0])).powi(2)).sum();
    assert!((norm - 1.0).abs() < 1e-15 && (0.0..=1.0).contains(&arguments[8]));
}
