//! Proof: what changed between two clips, measured, and the sheet that tells it.
//!
//! Measures clips as they play; whoever calls reads the written file back first.

mod build;
mod compare;
mod curve_svg;
mod curves;
mod error;
mod measure;
mod passes;
mod pictures;
mod rates;
mod retarget_sheet;
mod sheet;
mod sheet_html;
mod sheet_json;

pub use build::{Pair, sheet};
pub use compare::{Looked, compare, compare_with};
pub use curves::{JointCurves, joint_curves};
pub use error::ProofError;
pub use measure::{JointMeasure, Measurement, StoredForms, TipMeasure, measure};
pub use passes::{MendFacts, PassFacts, passes_run};
pub use rates::{Peak, RateMeasure, rates};
pub use retarget_sheet::retarget_sheet;
pub use sheet::{CAUTION, ClipProof, FileFacts, FoundSnag, LimitRow, LimitsProof, Sheet, SheetPicture};
pub use sheet_html::sheet_html;
pub use sheet_json::sheet_json;
