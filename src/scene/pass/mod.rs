//! Passes: the ordered, switchable steps from a source clip to the result. One file a kind.

mod blend;
mod error;
mod keys;
mod kind;
mod limits;
mod mend;
mod number;
mod others;
mod push;
mod reduce;
mod resample;
mod retarget;
mod rounds;
mod scope;
mod smooth;

pub use blend::{BlendForm, BlendPass};
pub use error::PassError;
pub use keys::KeysPass;
pub use kind::{Outcome, PassKind, PassMemory};
pub use limits::LimitsPass;
pub use mend::{MendPass, SnagMark};
pub use number::PassNumber;
pub use others::{ClipRef, Need, NoOthers, Others};
pub use push::PushPass;
pub use reduce::ReducePass;
pub use resample::ResamplePass;
pub use retarget::{RetargetPass, RetargetSetting};
pub use rounds::{Closing, LoopPass};
pub use scope::Scope;
pub use smooth::SmoothPass;

/// Names a pass for as long as the document lives; never used twice in one clip's list.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct PassId(pub u64);

/// One step of the list.
#[derive(Clone, Debug, PartialEq)]
pub struct Pass {
    /// Its name for edits.
    pub id: PassId,
    /// Whether it takes part.
    pub on: bool,
    /// What it does.
    pub step: PassStep,
}

/// Makes the list of kinds: the enum and the two places that look into it.
macro_rules! steps {
    ($($(#[$doc:meta])* $name:ident($pass:ty),)+) => {
        /// What a pass does.
        #[derive(Clone, Debug, PartialEq)]
        pub enum PassStep {
            $($(#[$doc])* $name($pass),)+
        }

        impl PassStep {
            /// What every kind can tell and do.
            pub fn kind(&self) -> &dyn PassKind {
                match self {
                    $(Self::$name(pass) => pass,)+
                }
            }

            /// The same, to change its parameters.
            pub fn kind_mut(&mut self) -> &mut dyn PassKind {
                match self {
                    $(Self::$name(pass) => pass,)+
                }
            }
        }

        $(impl From<$pass> for PassStep {
            fn from(pass: $pass) -> Self {
                Self::$name(pass)
            }
        })+
    };
}

steps! {
    /// Mends snags of one kind.
    Mend(MendPass),
    /// Another rate.
    Resample(ResamplePass),
    /// Another clip blended in.
    Blend(BlendPass),
    /// Another skeleton.
    Retarget(RetargetPass),
    /// Fewer keys.
    Reduce(ReducePass),
    /// Smoothing.
    Smooth(SmoothPass),
    /// Soft pushes by hand.
    Push(PushPass),
    /// Keys edited by hand.
    Keys(KeysPass),
    /// Keeps joints within their limits.
    Limits(LimitsPass),
    /// A loop, closed and played several times over.
    Loop(LoopPass),
}

impl PassStep {
    /// A short title for lists.
    pub fn title(&self) -> String {
        self.kind().title()
    }

    /// The mends, where it is a pass of such.
    pub fn as_mend(&self) -> Option<&MendPass> {
        if let Self::Mend(pass) = self { Some(pass) } else { None }
    }

    /// The mends to change, where it is a pass of such.
    pub fn as_mend_mut(&mut self) -> Option<&mut MendPass> {
        if let Self::Mend(pass) = self { Some(pass) } else { None }
    }
}
