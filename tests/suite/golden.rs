//! Golden pictures: what a picture looked like when a person last looked at it and found it good.
//!
//! A picture that differs is written beside its golden as `NAME.new.png`, with `NAME.diff.png` that shows where.
//! `UPDATE_SNAPSHOTS=1 cargo test` accepts what is drawn now: look at it first.

use std::fs::{File, remove_file};
use std::io::{BufReader, Write as _};
use std::path::{Path, PathBuf};

use turnwright::raster::{Color, Image};

/// The one tolerance. Our pixels come from our own arithmetic; only the sines of the machine's library may differ in
/// the last bit, which can tip a pixel of an edge by a little.
const SAME_WITHIN: u8 = 6;
/// The share of pixels that may differ by more than that.
const STRAY_SHARE: f64 = 0.001;

/// Compares a picture with `tests/golden/NAME.png`.
#[track_caller]
pub(crate) fn check(name: &str, image: &Image) {
    let path = |kind: &str| -> PathBuf {
        Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/golden").join(format!("{name}{kind}.png"))
    };
    let accepts = std::env::var_os("UPDATE_SNAPSHOTS").is_some_and(|value| value == "1");
    let golden = read(&path(""));
    let verdict = match &golden {
        Some(golden) => compare(golden, image),
        None => Err(("there is no golden picture yet".to_owned(), None)),
    };
    match verdict {
        Ok(()) => {
            for kind in [".new", ".diff"] {
                // Left over from an earlier failure, or not there at all.
                let _ = remove_file(path(kind));
            }
        }
        Err(_) if accepts => write(&path(""), image),
        Err((what, diff)) => {
            write(&path(".new"), image);
            if let Some(diff) = diff {
                write(&path(".diff"), &diff);
            }
            panic!(
                "{name}: {what}; look at {}, and accept it with UPDATE_SNAPSHOTS=1",
                path(".new").display()
            );
        }
    }
}

/// Whether two pictures are alike; what is not, and a picture of it.
fn compare(golden: &Picture, image: &Image) -> Result<(), (String, Option<Image>)> {
    let (width, height) = (image.width(), image.height());
    if (golden.width, golden.height) != (width, height) {
        let what = format!("expected {} × {} pixels, found {width} × {height}", golden.width, golden.height);
        return Err((what, None));
    }
    let mut diff = Image::new(width, height, Color::rgb(0));
    let mut stray = 0;
    let pixels = golden.pixels.iter().zip(image.pixels()).zip(diff.pixels_mut());
    for ((&expected, found), shown) in pixels {
        let apart = expected.iter().zip(found).map(|(e, f)| e.abs_diff(*f)).max().unwrap_or(0);
        if apart > SAME_WITHIN {
            stray += 1;
            *shown = [255, 255_u8.saturating_sub(apart), 0, 255];
        } else {
            *shown = [expected[0] / 4, expected[1] / 4, expected[2] / 4, 255];
        }
    }
    let allowed = (STRAY_SHARE * (width * height) as f64).floor() as usize;
    if stray > allowed {
        return Err((format!("{stray} pixels differ, allowed {allowed}"), Some(diff)));
    }
    Ok(())
}

/// An opaque picture read back.
struct Picture {
    width: usize,
    height: usize,
    pixels: Vec<[u8; 4]>,
}

fn read(path: &Path) -> Option<Picture> {
    let mut reader =
        png::Decoder::new(BufReader::new(File::open(path).ok()?)).read_info().expect("a golden is a PNG");
    let mut data = vec![0; reader.output_buffer_size().expect("a golden is small")];
    let info = reader.next_frame(&mut data).expect("a golden is whole");
    assert_eq!(info.color_type, png::ColorType::Rgb, "{}: goldens are opaque", path.display());
    let pixels = data.chunks_exact(3).map(|p| [p[0], p[1], p[2], 255]).collect();
    Some(Picture { width: info.width as usize, height: info.height as usize, pixels })
}

fn write(path: &Path, image: &Image) {
    let bytes = image.encode_png().expect("a drawn picture can be encoded");
    let folder = path.parent().expect("goldens lie in a folder");
    std::fs::create_dir_all(folder).expect("the folder of goldens can be made");
    File::create(path)
        .and_then(|mut file| file.write_all(&bytes))
        .expect("the folder of goldens can be written to");
}

#[test]
fn another_picture_is_told_apart_and_a_trembling_pixel_is_not() {
    let image = Image::new(40, 30, Color::rgb(0x80_80_80));
    let golden = |change: &dyn Fn(&mut [[u8; 4]])| {
        let mut pixels = image.pixels().to_vec();
        change(&mut pixels);
        Picture { width: 40, height: 30, pixels }
    };
    assert!(compare(&golden(&|_| {}), &image).is_ok());
    assert!(compare(&golden(&|pixels| pixels.fill([0x84, 0x7C, 0x80, 255])), &image).is_ok());
    assert!(compare(&golden(&|pixels| pixels[7] = [0, 0, 0, 255]), &image).is_ok());
    let (what, diff) = compare(&golden(&|pixels| pixels[7..9].fill([0, 0, 0, 255])), &image).unwrap_err();
    assert_eq!(what, "2 pixels differ, allowed 1");
    assert_eq!(diff.unwrap().pixels().iter().filter(|pixel| pixel[0] == 255).count(), 2);
    let (what, _) = compare(&golden(&|_| {}), &Image::new(40, 31, Color::rgb(0))).unwrap_err();
    assert_eq!(what, "expected 40 × 30 pixels, found 40 × 31");
}
