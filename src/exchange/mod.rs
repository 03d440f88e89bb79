//! Reading and writing: BVH, glTF 2.0, CSV and our own RON scenes.
//!
//! Each format has a folder that turns bytes into clips and clips into bytes; [`disk`] alone touches files.

mod address;
pub mod advice;
pub mod bvh;
pub mod csv;
pub mod decimal;
pub mod disk;
mod export;
pub mod gltf;
pub mod joint_maps;
pub mod limits;
mod losses;
mod note;
pub mod ron;
mod room;
mod rows;
mod source;
mod text_file;
mod turns;

pub use address::ClipAddress;
pub use export::{Encoded, Guard, WriteError, Written, encode, encode_onto, write, write_onto};
pub use note::Note;
pub use room::SearchTooLarge;
pub use source::{Format, OpenError, OpenOptions, Source, open, open_bytes};
