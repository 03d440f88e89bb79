//! What the window explains: each snag kind and each pass, in two sentences and a picture made from a tiny clip.

mod example;
mod picture;
mod topic;

pub use picture::help_picture;
pub use topic::{Subject, Topic, topics};
