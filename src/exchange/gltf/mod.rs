//! glTF 2.0 (ISO/IEC 12113:2022), `.glb` and `.gltf`: animation in, and corrected animation back into the same document.
//!
//! Two layers. Syntax: `container`, `json`, `uri`, `buffers` and `accessor` know bytes, JSON and typed numbers, and
//! check them. Meaning: `nodes`, `channels`, `tracks` and `rate` make skeletons and clips of them.
//!
//! | convention | glTF | here |
//! |---|---|---|
//! | quaternion | `x, y, z, w` | [`Rotor::from_xyzw`](crate::rotor::Rotor::from_xyzw) |
//! | lengths, times, angles | metres, seconds, radians | the same |
//! | axes | right-handed, y up, front +z | the same |
//! | numbers of keys | 32 bits or normalised integers | the same values in 64 bits |
//! | time before the first key | the first value is held, from 0 on | the same |

mod accessor;
mod bind;
mod buffers;
mod channels;
mod container;
mod curve;
mod document;
mod error;
mod finish;
mod follow;
mod json;
mod limbs;
mod new_file;
mod nodes;
mod patch;
mod rate;
mod read;
mod tracks;
mod uri;
mod write;

pub use document::{Document, Form};
pub use error::{GltfError, GltfErrorKind};
pub use new_file::from_clip;
pub use read::read;
pub use write::{Output, write, write_added, write_as};
