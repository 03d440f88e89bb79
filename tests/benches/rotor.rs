//! How many times as fast as the general libraries are the bulk kernels, for the same work in the same run?
//!
//! `cargo bench --no-default-features --bench rotor`; a name behind it, as in `-- slerp`, runs a part. One thread, time of the processor. Each
//! library keeps its rotations as it likes them best: ours in streams, theirs one after the other.

mod cpu_time;

use std::hint::black_box;

use cpu_time::CpuTime;
use criterion::{BenchmarkGroup, Throughput, criterion_group, criterion_main};
use glam::{DQuat, DVec3, EulerRot, Quat, Vec3};
use nalgebra::{UnitQuaternion, Vector3};
use turnwright::rotor::batch::{self, Level, Real, Streams};
use turnwright::rotor::{Axis, Bivector, EndRates, EulerOrder, RotationSpline, Rotor};
use ultraviolet::interp::Slerp;
use ultraviolet::{DRotor3, DVec3 as UDVec3, Rotor3, Vec3 as UVec3};

/// Many more than fit any cache near a core; `ROTATIONS=2048 cargo bench …` tells what the kernels take without waiting for memory.
/// (The peers gain more than they should there: the processor learns the way through their branches by heart.)
fn count() -> usize {
    std::env::var("ROTATIONS").ok().and_then(|count| count.parse().ok()).unwrap_or(1_000_000)
}

/// Numbers from 0 to 1 in a fixed order without a pattern (a Weyl sequence, mixed).
struct Numbers(u64);

impl Numbers {
    fn next(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mixed = (self.0 ^ (self.0 >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        ((mixed ^ (mixed >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb) >> 11) as f64 / (1_u64 << 53) as f64
    }

    fn rotors(&mut self) -> Vec<Rotor> {
        let part = |numbers: &mut Self| numbers.next() - 0.5;
        (0..count()).map(|_| Rotor::new(part(self), part(self), part(self), part(self)).normalize()).collect()
    }

    fn angles(&mut self) -> Vec<[f64; 3]> {
        (0..count()).map(|_| std::array::from_fn(|_| 3.6 * (self.next() - 0.5))).collect()
    }
}

fn streams<F: Real>(rotors: &[Rotor], narrowed: impl Fn(f64) -> F) -> Streams<F, 4> {
    Streams::from_rows(rotors.iter().map(|r| [r.s, r.yz, r.zx, r.xy].map(&narrowed)))
}

fn glam_f32(rotors: &[Rotor]) -> Vec<Quat> {
    rotors.iter().map(|r| Quat::from_array(r.to_xyzw().map(|part| part as f32))).collect()
}

fn glam_f64(rotors: &[Rotor]) -> Vec<DQuat> {
    rotors.iter().map(|r| DQuat::from_array(r.to_xyzw())).collect()
}

fn nalgebra_f32(rotors: &[Rotor]) -> Vec<UnitQuaternion<f32>> {
    let unit = |[x, y, z, w]: [f64; 4]| nalgebra::Quaternion::new(w as f32, x as f32, y as f32, z as f32);
    rotors.iter().map(|r| UnitQuaternion::new_unchecked(unit(r.to_xyzw()))).collect()
}

fn nalgebra_f64(rotors: &[Rotor]) -> Vec<UnitQuaternion<f64>> {
    let unit = |[x, y, z, w]: [f64; 4]| nalgebra::Quaternion::new(w, x, y, z);
    rotors.iter().map(|r| UnitQuaternion::new_unchecked(unit(r.to_xyzw()))).collect()
}

fn ultraviolet_f32(rotors: &[Rotor]) -> Vec<Rotor3> {
    let part = |r: &Rotor| ultraviolet::Bivec3::new(r.xy as f32, -r.zx as f32, r.yz as f32);
    rotors.iter().map(|r| Rotor3::new(r.s as f32, part(r))).collect()
}

fn ultraviolet_f64(rotors: &[Rotor]) -> Vec<DRotor3> {
    rotors.iter().map(|r| DRotor3::new(r.s, ultraviolet::DBivec3::new(r.xy, -r.zx, r.yz))).collect()
}

type Criterion = criterion::Criterion<CpuTime>;
type Group<'a> = BenchmarkGroup<'a, CpuTime>;

fn group<'a>(criterion: &'a mut Criterion, name: &str) -> Group<'a> {
    let mut group = criterion.benchmark_group(name);
    group.throughput(Throughput::Elements(count() as u64)).sample_size(10);
    group.warm_up_time(std::time::Duration::from_millis(300));
    group.measurement_time(std::time::Duration::from_millis(1500));
    group
}

/// A library that works on one rotation after the other.
fn peer<A, T: Clone>(group: &mut Group<'_>, name: &str, arguments: &[A], zero: T, one: impl Fn(&A) -> T) {
    let mut out = vec![zero; arguments.len()];
    group.bench_function(name, |bencher| {
        bencher.iter(|| {
            for (out, argument) in out.iter_mut().zip(black_box(arguments)) {
                *out = one(argument);
            }
            black_box(&mut out);
        });
    });
}

/// One of our kernels at all levels of this machine.
fn ours<F: Real, const N: usize>(group: &mut Group<'_>, mut kernel: impl FnMut(Level, &mut Streams<F, N>)) {
    let mut out = Streams::zeros(count());
    for (name, level) in Level::all() {
        let name = format!("ours, {name}");
        group.bench_function(name, |bencher| bencher.iter(|| kernel(level, black_box(&mut out))));
    }
}

fn triples<T: Clone>(a: &[T], b: &[T], t: &[f64]) -> Vec<(T, T, f64)> {
    a.iter().zip(b).zip(t).map(|((a, b), t)| (a.clone(), b.clone(), *t)).collect()
}

fn slerp(criterion: &mut Criterion) {
    let mut numbers = Numbers(1);
    let (a, b) = (numbers.rotors(), numbers.rotors());
    let t: Vec<f64> = (0..count()).map(|_| numbers.next()).collect();
    let narrow: Vec<f32> = t.iter().map(|t| *t as f32).collect();

    let mut group = group(criterion, "slerp f32");
    let (from, to) = (streams(&a, |part| part as f32), streams(&b, |part| part as f32));
    copy(&mut group, &[&from.parts()[..], &to.parts(), &[&narrow]].concat(), 4);
    ours(&mut group, |level, out| batch::slerp(level, from.parts(), to.parts(), &narrow, out.parts_mut()));
    let pairs = triples(&glam_f32(&a), &glam_f32(&b), &t);
    peer(&mut group, "glam", &pairs, Quat::IDENTITY, |(a, b, t)| a.slerp(*b, *t as f32));
    let pairs = triples(&nalgebra_f32(&a), &nalgebra_f32(&b), &t);
    peer(&mut group, "nalgebra", &pairs, UnitQuaternion::identity(), |(a, b, t)| a.slerp(b, *t as f32));
    let pairs = triples(&ultraviolet_f32(&a), &ultraviolet_f32(&b), &t);
    peer(&mut group, "ultraviolet", &pairs, Rotor3::identity(), |(a, b, t)| a.slerp(*b, *t as f32));
    group.finish();

    let mut group = self::group(criterion, "slerp f64");
    let (from, to) = (streams(&a, |part| part), streams(&b, |part| part));
    copy(&mut group, &[&from.parts()[..], &to.parts(), &[&t]].concat(), 4);
    ours(&mut group, |level, out| batch::slerp(level, from.parts(), to.parts(), &t, out.parts_mut()));
    let pairs = triples(&glam_f64(&a), &glam_f64(&b), &t);
    peer(&mut group, "glam", &pairs, DQuat::IDENTITY, |(a, b, t)| a.slerp(*b, *t));
    let pairs = triples(&nalgebra_f64(&a), &nalgebra_f64(&b), &t);
    peer(&mut group, "nalgebra", &pairs, UnitQuaternion::identity(), |(a, b, t)| a.slerp(b, *t));
    let pairs = triples(&ultraviolet_f64(&a), &ultraviolet_f64(&b), &t);
    peer(&mut group, "ultraviolet", &pairs, DRotor3::identity(), |(a, b, t)| a.slerp(*b, *t));
    group.finish();
}

/// What it costs to read and write the same bytes: of the streams read some are copied, the rest summed.
fn copy<F: Real>(group: &mut Group<'_>, read: &[&[F]], written: usize) {
    let mut copies = vec![vec![F::ZERO; count()]; written];
    group.bench_function("reading and copying the same bytes", |bencher| {
        bencher.iter(|| {
            let (copied, summed) = black_box(read).split_at(written.min(read.len()));
            for (index, copy) in copies.iter_mut().enumerate() {
                copy.copy_from_slice(copied[index % copied.len()]);
            }
            black_box(&mut copies);
            black_box(summed.iter().fold(F::ZERO, |all, stream| all + sum(stream)));
        });
    });
}

/// Reads a stream as fast as memory gives it.
fn sum<F: Real>(stream: &[F]) -> F {
    let mut sums = [F::ZERO; 32];
    for chunk in stream.as_chunks::<32>().0 {
        for (sum, number) in sums.iter_mut().zip(chunk) {
            *sum = *sum + *number;
        }
    }
    sums.into_iter().fold(F::ZERO, |all, sum| all + sum)
}

fn squad(criterion: &mut Criterion) {
    let mut numbers = Numbers(2);
    let a = numbers.rotors();
    let near = |numbers: &mut Numbers, a: &Rotor, most: f64| {
        let part = |numbers: &mut Numbers| most * (numbers.next() - 0.5);
        *a * Rotor::from_plane_angles(Bivector::new(part(numbers), part(numbers), part(numbers)))
    };
    let b: Vec<Rotor> = a.iter().map(|a| near(&mut numbers, a, 1.5)).collect();
    let inner_a: Vec<Rotor> = a.iter().map(|a| near(&mut numbers, a, 0.2)).collect();
    let inner_b: Vec<Rotor> = b.iter().map(|b| near(&mut numbers, b, 0.2)).collect();
    let t: Vec<f64> = (0..count()).map(|_| numbers.next()).collect();
    let narrow: Vec<f32> = t.iter().map(|t| *t as f32).collect();
    let four = [&a, &inner_a, &inner_b, &b];

    let mut group = group(criterion, "squad f32");
    let ends = four.map(|rotors| streams(rotors, |part| part as f32));
    ours(&mut group, |level, out| {
        batch::squad(level, ends.each_ref().map(Streams::parts), &narrow, out.parts_mut());
    });
    let rows = quadruples(&four.map(|rotors| glam_f32(rotors)), &t);
    peer(&mut group, "glam", &rows, Quat::IDENTITY, |([a, ia, ib, b], t)| {
        let t = *t as f32;
        a.slerp(*b, t).slerp(ia.slerp(*ib, t), 2.0 * t * (1.0 - t))
    });
    let rows = quadruples(&four.map(|rotors| ultraviolet_f32(rotors)), &t);
    peer(&mut group, "ultraviolet", &rows, Rotor3::identity(), |([a, ia, ib, b], t)| {
        let t = *t as f32;
        a.slerp(*b, t).slerp(ia.slerp(*ib, t), 2.0 * t * (1.0 - t))
    });
    group.finish();

    let mut group = self::group(criterion, "squad f64");
    let ends = four.map(|rotors| streams(rotors, |part| part));
    ours(&mut group, |level, out| {
        batch::squad(level, ends.each_ref().map(Streams::parts), &t, out.parts_mut());
    });
    let rows = quadruples(&four.map(|rotors| glam_f64(rotors)), &t);
    peer(&mut group, "glam", &rows, DQuat::IDENTITY, |([a, ia, ib, b], t)| {
        a.slerp(*b, *t).slerp(ia.slerp(*ib, *t), 2.0 * t * (1.0 - t))
    });
    let rows = quadruples(&four.map(|rotors| ultraviolet_f64(rotors)), &t);
    peer(&mut group, "ultraviolet", &rows, DRotor3::identity(), |([a, ia, ib, b], t)| {
        a.slerp(*b, *t).slerp(ia.slerp(*ib, *t), 2.0 * t * (1.0 - t))
    });
    group.finish();
}

fn quadruples<T: Clone>(four: &[Vec<T>; 4], t: &[f64]) -> Vec<([T; 4], f64)> {
    t.iter().enumerate().map(|(i, t)| (four.each_ref().map(|rotors| rotors[i].clone()), *t)).collect()
}

fn exp_and_log(criterion: &mut Criterion) {
    let mut numbers = Numbers(3);
    let angles = numbers.angles();
    let rotors = numbers.rotors();

    let mut group = group(criterion, "exp f32");
    let rows = Streams::from_rows(angles.iter().map(|angles| angles.map(|part| part as f32)));
    copy(&mut group, &rows.parts(), 4);
    ours(&mut group, |level, out| batch::exp(level, rows.parts(), out.parts_mut()));
    let vectors: Vec<Vec3> = angles.iter().map(|a| DVec3::from_array(*a).as_vec3()).collect();
    peer(&mut group, "glam", &vectors, Quat::IDENTITY, |v| Quat::from_scaled_axis(*v));
    let vectors: Vec<Vector3<f32>> = vectors.iter().map(|v| Vector3::new(v.x, v.y, v.z)).collect();
    peer(&mut group, "nalgebra", &vectors, UnitQuaternion::identity(), |v| UnitQuaternion::new(*v));
    group.finish();

    let mut group = self::group(criterion, "exp f64");
    let rows = Streams::from_rows(angles.iter().copied());
    copy(&mut group, &rows.parts(), 4);
    ours(&mut group, |level, out| batch::exp(level, rows.parts(), out.parts_mut()));
    let vectors: Vec<DVec3> = angles.iter().map(|a| DVec3::from_array(*a)).collect();
    peer(&mut group, "glam", &vectors, DQuat::IDENTITY, |v| DQuat::from_scaled_axis(*v));
    let vectors: Vec<Vector3<f64>> = vectors.iter().map(|v| Vector3::new(v.x, v.y, v.z)).collect();
    peer(&mut group, "nalgebra", &vectors, UnitQuaternion::identity(), |v| UnitQuaternion::new(*v));
    group.finish();

    let mut group = self::group(criterion, "log f32");
    let rows = streams(&rotors, |part| part as f32);
    copy(&mut group, &rows.parts(), 3);
    ours(&mut group, |level, out| batch::log(level, rows.parts(), out.parts_mut()));
    peer(&mut group, "glam", &glam_f32(&rotors), Vec3::ZERO, |q| q.to_scaled_axis());
    peer(&mut group, "nalgebra", &nalgebra_f32(&rotors), Vector3::zeros(), UnitQuaternion::scaled_axis);
    group.finish();

    let mut group = self::group(criterion, "log f64");
    let rows = streams(&rotors, |part| part);
    copy(&mut group, &rows.parts(), 3);
    ours(&mut group, |level, out| batch::log(level, rows.parts(), out.parts_mut()));
    peer(&mut group, "glam", &glam_f64(&rotors), DVec3::ZERO, |q| q.to_scaled_axis());
    peer(&mut group, "nalgebra", &nalgebra_f64(&rotors), Vector3::zeros(), UnitQuaternion::scaled_axis);
    group.finish();
}

fn euler(criterion: &mut Criterion) {
    let order = EulerOrder::new([Axis::Z, Axis::Y, Axis::X]).expect("an order");
    let mut numbers = Numbers(4);
    let angles = numbers.angles();
    let rotors = numbers.rotors();

    let mut group = group(criterion, "Euler to rotation f64");
    let rows = Streams::from_rows(angles.iter().copied());
    ours(&mut group, |level, out| batch::euler_rotors(level, order, rows.parts(), out.parts_mut()));
    peer(&mut group, "glam", &angles, DQuat::IDENTITY, |[a, b, c]| {
        DQuat::from_euler(EulerRot::ZYX, *a, *b, *c)
    });
    peer(&mut group, "nalgebra", &angles, UnitQuaternion::identity(), |[a, b, c]| {
        UnitQuaternion::from_euler_angles(*c, *b, *a)
    });
    peer(&mut group, "ultraviolet", &angles, DRotor3::identity(), |[a, b, c]| {
        DRotor3::from_euler_angles(*a, *b, *c)
    });
    group.finish();

    let mut group = self::group(criterion, "rotation to Euler f64");
    let rows = streams(&rotors, |part| part);
    ours(&mut group, |level, out| batch::euler_angles(level, order, rows.parts(), 0.0, out.parts_mut()));
    peer(&mut group, "glam", &glam_f64(&rotors), (0.0, 0.0, 0.0), |q| q.to_euler(EulerRot::ZYX));
    peer(&mut group, "nalgebra", &nalgebra_f64(&rotors), (0.0, 0.0, 0.0), UnitQuaternion::euler_angles);
    group.finish();
}

fn products(criterion: &mut Criterion) {
    let mut numbers = Numbers(5);
    let (a, b) = (numbers.rotors(), numbers.rotors());
    let places = numbers.angles();
    let pairs = |count: usize| (0..count).map(|i| (i, i));

    let mut group = group(criterion, "compose f32");
    let (left, right) = (streams(&a, |part| part as f32), streams(&b, |part| part as f32));
    ours(&mut group, |level, out| batch::compose(level, left.parts(), right.parts(), out.parts_mut()));
    let (glam_a, glam_b) = (glam_f32(&a), glam_f32(&b));
    let both: Vec<(Quat, Quat)> = pairs(count()).map(|(i, j)| (glam_a[i], glam_b[j])).collect();
    peer(&mut group, "glam", &both, Quat::IDENTITY, |(a, b)| *a * *b);
    let (nalgebra_a, nalgebra_b) = (nalgebra_f32(&a), nalgebra_f32(&b));
    let both: Vec<_> = pairs(count()).map(|(i, j)| (nalgebra_a[i], nalgebra_b[j])).collect();
    peer(&mut group, "nalgebra", &both, UnitQuaternion::identity(), |(a, b)| a * b);
    let (ultraviolet_a, ultraviolet_b) = (ultraviolet_f32(&a), ultraviolet_f32(&b));
    let both: Vec<_> = pairs(count()).map(|(i, j)| (ultraviolet_a[i], ultraviolet_b[j])).collect();
    peer(&mut group, "ultraviolet", &both, Rotor3::identity(), |(a, b)| *a * *b);
    group.finish();

    let mut group = self::group(criterion, "apply f32");
    let points = Streams::from_rows(places.iter().map(|place| place.map(|part| part as f32)));
    ours(&mut group, |level, out| batch::apply(level, left.parts(), points.parts(), out.parts_mut()));
    let vectors: Vec<Vec3> = places.iter().map(|place| DVec3::from_array(*place).as_vec3()).collect();
    let both: Vec<_> = pairs(count()).map(|(i, j)| (glam_a[i], vectors[j])).collect();
    peer(&mut group, "glam", &both, Vec3::ZERO, |(q, v)| *q * *v);
    let both: Vec<_> =
        pairs(count()).map(|(i, j)| (nalgebra_a[i], Vector3::from(vectors[j].to_array()))).collect();
    peer(&mut group, "nalgebra", &both, Vector3::zeros(), |(q, v)| q * v);
    let both: Vec<_> =
        pairs(count()).map(|(i, j)| (ultraviolet_a[i], UVec3::from(vectors[j].to_array()))).collect();
    peer(&mut group, "ultraviolet", &both, UVec3::zero(), |(r, v)| *r * *v);
    group.finish();

    let mut group = self::group(criterion, "apply f64");
    let (left, points) = (streams(&a, |part| part), Streams::from_rows(places.iter().copied()));
    ours(&mut group, |level, out| batch::apply(level, left.parts(), points.parts(), out.parts_mut()));
    let glam_a = glam_f64(&a);
    let both: Vec<_> = pairs(count()).map(|(i, j)| (glam_a[i], DVec3::from_array(places[j]))).collect();
    peer(&mut group, "glam", &both, DVec3::ZERO, |(q, v)| *q * *v);
    let nalgebra_a = nalgebra_f64(&a);
    let both: Vec<_> = pairs(count()).map(|(i, j)| (nalgebra_a[i], Vector3::from(places[j]))).collect();
    peer(&mut group, "nalgebra", &both, Vector3::zeros(), |(q, v)| q * v);
    let ultraviolet_a = ultraviolet_f64(&a);
    let both: Vec<_> = pairs(count()).map(|(i, j)| (ultraviolet_a[i], UDVec3::from(places[j]))).collect();
    peer(&mut group, "ultraviolet", &both, UDVec3::zero(), |(r, v)| *r * *v);
    group.finish();
}

/// The peer is scipy: `tests/benches/scipy_spline.py` prints its times for the same keys.
fn spline(criterion: &mut Criterion) {
    const KEYS: u32 = 1000;
    const TIMES: u32 = 100_000;
    let secs: Vec<f64> = (0..KEYS).map(|key| f64::from(key) * 0.1 + f64::from(key % 3) * 0.02).collect();
    let turn =
        |key: f64| Bivector::new((0.4 * key).sin(), 0.7 * (0.53 * key).cos(), 0.4 * (0.31 * key).cos());
    let keys: Vec<Rotor> = (0..KEYS).map(|key| Rotor::from_plane_angles(turn(f64::from(key)))).collect();
    let build = || RotationSpline::new(black_box(&secs), &keys, EndRates::Secant).expect("sound keys");
    let mut group = group(criterion, "C2 spline");
    group.throughput(Throughput::Elements(u64::from(KEYS)));
    group.bench_function("build", |bencher| bencher.iter(build));
    let spline = build();
    let step = secs[secs.len() - 1] / f64::from(TIMES);
    let asked: Vec<f64> = (0..TIMES).map(|time| f64::from(time) * step).collect();
    group.throughput(Throughput::Elements(u64::from(TIMES)));
    group.bench_function("evaluate", |bencher| bencher.iter(|| spline.at_all(black_box(&asked))));
    group.bench_function("evaluate one by one", |bencher| {
        bencher.iter(|| black_box(&asked).iter().map(|&secs| spline.at(secs)).collect::<Vec<_>>());
    });
    group.finish();
}

criterion_group! {
    name = benches;
    config = criterion::Criterion::default().with_measurement(CpuTime);
    targets = slerp, squad, exp_and_log, euler, products, spline
}
criterion_main!(benches);
