//! The arguments as typed. Checked ones are made of them in `input` and by each command.

use std::path::PathBuf;

use clap::{Args, Parser, Subcommand, ValueEnum};

use crate::blend::{MixAlong, Reference, RootFrom, Side};
use crate::clip::PathKind;
use crate::exchange::OpenOptions;
use crate::exchange::csv::{CsvOptions, NamedColumns, TimeUnit};
use crate::scene::Closing;
use crate::skeleton::RestChoice;
use crate::snag::SnagKind;

use super::limits::LimitsName;
use super::numbers::{count, number};

/// Finds, mends and proves rotation faults in animation clips.
///
/// Without a command it opens the window on the files given, or on the demo scene. Clips are .gltf, .glb, .bvh and
/// .csv files, and .ron scenes; FILE#NAME or FILE#INDEX names one clip of a file that holds several.
#[derive(Debug, Parser)]
#[command(
    name = "turnwright",
    version,
    args_conflicts_with_subcommands = true,
    disable_help_subcommand = true
)]
pub(super) struct Arguments {
    #[command(subcommand)]
    pub(super) command: Option<Command>,
    /// Clips and scenes to open in the window
    #[arg(value_name = "SCENE|CLIP")]
    pub(super) files: Vec<PathBuf>,
}

#[derive(Debug, Subcommand)]
pub(super) enum Command {
    Demo(DemoArgs),
    Snags(SnagsArgs),
    Mend(MendArgs),
    Blend(BlendArgs),
    Retarget(RetargetArgs),
    Convert(ConvertArgs),
    Sample(SampleArgs),
    Proof(ProofArgs),
    Picture(PictureArgs),
}

/// Do the main job on the demo scenes: name the snags, mend them, write clips, proof sheets and pictures
///
/// Needs no display. Opens the window afterwards if there is one. Exported curves that drive a machine need that
/// machine's own limits and guarding, local safety codes and a licensed or qualified person.
#[derive(Debug, Args)]
pub(super) struct DemoArgs {
    /// Folder to write to
    #[arg(short, long, value_name = "DIR", default_value = "turnwright-demo")]
    pub(super) output: PathBuf,
}

/// List the rotation faults of clips; ends with 1 if there are any, 0 if there are none
#[derive(Debug, Args)]
pub(super) struct SnagsArgs {
    /// Clips to look through
    #[arg(value_name = "CLIP", required = true)]
    pub(super) clips: Vec<String>,
    /// Print one JSON object a line for each clip
    #[arg(long)]
    pub(super) json: bool,
    /// Look for these kinds only
    #[arg(long, value_name = "K,…", value_delimiter = ',')]
    pub(super) kinds: Option<Vec<SnagKind>>,
    /// Hold the joints against the limits in a file (.csv with the columns joint, `swing_deg`, `twist_min_deg`,
    /// `twist_max_deg`; or .ron), against what a clean take (.bvh, .gltf, .glb) keeps to, or against the preset adult, for human
    /// figures
    ///
    /// The preset adult is made of published ranges, put on the skeleton by the roles of its joints. Population norms for
    /// plausible animation, not clinical advice and not limits for a person; machines need their own limits.
    #[arg(long, value_name = "FILE|adult")]
    pub(super) limits: Option<LimitsName>,
    /// The clips are loops: look for seams too, where the end does not meet the start
    #[arg(long = "loop")]
    pub(super) is_loop: bool,
    #[command(flatten)]
    pub(super) csv: CsvArgs,
}

/// Write clips with their faults mended; all else keeps its numbers
///
/// Mends that need a person's judgement are left alone unless their kind is named in --kinds. Exported curves that
/// drive a machine need that machine's own limits and guarding, local safety codes and a licensed or qualified person.
#[derive(Debug, Args)]
pub(super) struct MendArgs {
    /// Clips to mend
    #[arg(value_name = "CLIP", required = true)]
    pub(super) clips: Vec<String>,
    /// File to write, or folder for several
    #[arg(short, long, value_name = "OUT|DIR")]
    pub(super) output: PathBuf,
    /// Mend these kinds only
    #[arg(long, value_name = "K,…", value_delimiter = ',')]
    pub(super) kinds: Option<Vec<SnagKind>>,
    /// Leave these kinds alone
    #[arg(long, value_name = "K,…", value_delimiter = ',')]
    pub(super) skip: Vec<SnagKind>,
    /// Hold the joints against the limits in a file (.csv with the columns joint, `swing_deg`, `twist_min_deg`,
    /// `twist_max_deg`; or .ron), against what a clean take (.bvh, .gltf, .glb) keeps to, or against the preset adult, for human
    /// figures
    ///
    /// The preset adult is made of published ranges, put on the skeleton by the roles of its joints. Population norms for
    /// plausible animation, not clinical advice and not limits for a person; machines need their own limits.
    #[arg(long, value_name = "FILE|adult")]
    pub(super) limits: Option<LimitsName>,
    /// The clips are loops: look for seams too, where the end does not meet the start
    #[arg(long = "loop")]
    pub(super) is_loop: bool,
    /// Write a proof sheet, .html or .json; for several files one each, named after them
    #[arg(long, value_name = "FILE")]
    pub(super) proof: Option<PathBuf>,
    /// Print one JSON object a line for each clip
    #[arg(long)]
    pub(super) json: bool,
    /// Allow an input to be replaced
    #[arg(long)]
    pub(super) force: bool,
    #[command(flatten)]
    pub(super) csv: CsvArgs,
}

/// Make one clip of two: joined, mixed or layered
///
/// The result has the first clip's skeleton, rate and file. Exported curves that drive a machine need that machine's
/// own limits and guarding, local safety codes and a licensed or qualified person.
#[derive(Debug, Args)]
#[command(group = clap::ArgGroup::new("how").required(true).args(["join", "mix", "add", "mean"]))]
#[expect(clippy::struct_excessive_bools, reason = "switches as they are typed")]
pub(super) struct BlendArgs {
    /// First clip
    #[arg(value_name = "A")]
    pub(super) first: String,
    /// Second clip; with --mean as many as there are
    #[arg(value_name = "B", required = true)]
    pub(super) others: Vec<String>,
    /// File to write; its extension gives the format
    #[arg(short, long, value_name = "OUT")]
    pub(super) output: PathBuf,
    /// B after A, overlapping so many seconds, set down where A is and as it is heading
    #[arg(long, value_name = "SECONDS", value_parser = number, allow_hyphen_values = true)]
    pub(super) join: Option<f64>,
    /// Between A (0) and B (1), frame by frame up to the shorter end; a weight, or a curve of weights at seconds of A, smooth
    /// between them, such as 0:0,1.5:1
    #[arg(long, value_name = "W|S:W,…", value_parser = parse_weights, allow_hyphen_values = true)]
    pub(super) mix: Option<WeightCurve>,
    /// What B does beyond its first frame laid over A, so many times
    #[arg(long, value_name = "W", value_parser = number, allow_hyphen_values = true)]
    pub(super) add: Option<f64>,
    /// The mean of A and all B, frame by frame up to the shortest end: a weight for A and one for each B, such as 1,1,2; only
    /// their ratio matters
    #[arg(long, value_name = "W,…", value_parser = number, allow_hyphen_values = true, value_delimiter = ',')]
    pub(super) mean: Option<Vec<f64>>,
    /// With --join: overlap where the poses of both are nearest, not the end of A and the start of B
    #[arg(long, requires = "join", conflicts_with_all = ["mix", "add", "mean"])]
    pub(super) find_place: bool,
    /// With --add: what the difference of B is taken from
    #[arg(long, value_enum, value_name = "first|rest|mean", default_value_t, conflicts_with_all = ["join", "mix", "mean"])]
    pub(super) reference: ReferenceName,
    /// With --add: whether it is composed in the joint's own frame or in its parent's
    #[arg(long, value_enum, value_name = "body|parent", default_value_t, conflicts_with_all = ["join", "mix", "mean"])]
    pub(super) side: SideName,
    /// With --mix and --mean: bring steps into time with A's, and all onto A's ground
    #[arg(long, conflicts_with_all = ["join", "add"])]
    pub(super) align: bool,
    /// With --mix: whose path and heading on the ground is taken
    #[arg(long, value_enum, value_name = "both|a|b", default_value_t, conflicts_with_all = ["join", "add", "mean"])]
    pub(super) root: RootName,
    /// With --mix and --mean alone: hold feet where they stand, as --align and --join do; it is then no longer frame by frame in the legs
    #[arg(long, conflicts_with_all = ["join", "add"])]
    pub(super) plant_feet: bool,
    /// With --align or --join: leave feet as they come out
    #[arg(long, conflicts_with_all = ["plant_feet", "add"])]
    pub(super) no_plant_feet: bool,
    /// Reach these joints only; all others follow A. J=F takes the share F of the blend, from 0 to 1
    #[arg(long, value_name = "J[=F],…", value_delimiter = ',')]
    pub(super) joints: Option<Vec<String>>,
    /// Reach these joints and all below them; J=F as with --joints, which has the last word on a joint of both
    #[arg(long, value_name = "J[=F],…", value_delimiter = ',')]
    pub(super) limbs: Option<Vec<String>>,
    /// With --limbs: take so many joints above each along, less and less
    #[arg(long, value_name = "N", value_parser = count, allow_hyphen_values = true, requires = "limbs", default_value_t = 0)]
    pub(super) soft: usize,
    /// Allow an input to be replaced
    #[arg(long)]
    pub(super) force: bool,
    #[command(flatten)]
    pub(super) csv: CsvArgs,
}

/// Carry a clip to another skeleton
///
/// Joints are matched by names and shape; what is doubtful is said and left out. The result goes into the file of --onto as
/// one more clip, or under its hierarchy. Exported curves that drive a machine need that machine's own limits and guarding,
/// local safety codes and a licensed or qualified person.
#[derive(Debug, Args)]
#[expect(clippy::struct_excessive_bools, reason = "independent switches of the command line")]
pub(super) struct RetargetArgs {
    /// Clip to carry over
    #[arg(value_name = "CLIP")]
    pub(super) clip: String,
    /// File with the skeleton to carry it to; it need not have a clip
    #[arg(long, value_name = "SKELETON")]
    pub(super) onto: String,
    /// File to write; its extension gives the format
    #[arg(short, long, value_name = "OUT")]
    pub(super) output: PathBuf,
    /// Corrections of the joint map: CSV with the columns source,target
    #[arg(long, value_name = "FILE")]
    pub(super) map: Option<PathBuf>,
    /// Write the joint map that was used
    #[arg(long, value_name = "FILE")]
    pub(super) save_map: Option<PathBuf>,
    /// Keep the joint map that was used for these two skeletons: the next clip gets it without being asked
    #[arg(long)]
    pub(super) keep_map: bool,
    /// Use no joint map that was kept
    #[arg(long)]
    pub(super) no_kept_map: bool,
    /// Hold feet where they stand
    #[arg(long)]
    pub(super) plant_feet: bool,
    /// When feet stand, and which hands are held where: CSV with the columns `side,part,first_s,last_s,at`
    ///
    /// The part is heel, ball or hand. A hand is held still, at a point (`at` is three numbers), or at the other hand (`at` is other).
    /// Rows of feet take the place of what is found in the clip; with them feet are held without --plant-feet.
    #[arg(long, value_name = "FILE")]
    pub(super) contacts: Option<PathBuf>,
    /// Write the contacts that were found or read
    #[arg(long, value_name = "FILE")]
    pub(super) save_contacts: Option<PathBuf>,
    /// Bring joints within limits after all else: those in a file for the target's joints, those a clean clip of the target keeps to, or the
    /// preset adult
    #[arg(long, value_name = "FILE|adult")]
    pub(super) limits: Option<LimitsName>,
    /// Bring joints within the limits of the clip's own joints, carried over by the joint map: those in a file, or without one those that a scene
    /// has for the clip
    #[arg(long, value_name = "FILE", num_args = 0..=1, conflicts_with = "limits")]
    pub(super) carry_limits: Option<Vec<LimitsName>>,
    /// Take the clip's pose at this second for the source's rest pose
    #[arg(long, value_name = "S", value_parser = number, allow_hyphen_values = true)]
    pub(super) rest_at: Option<f64>,
    /// Take the target clip's pose at this second for the target's rest pose
    #[arg(long, value_name = "S", value_parser = number, allow_hyphen_values = true)]
    pub(super) onto_rest_at: Option<f64>,
    /// Turn the arms of a rest pose level and its legs down before rest poses are compared
    #[arg(long, value_name = "source|target|both")]
    pub(super) straighten: Option<Straighten>,
    /// The joint that the source's figure hangs on, where its file holds several
    #[arg(long, value_name = "JOINT")]
    pub(super) root: Option<String>,
    /// The joint that the target's figure hangs on, where its file holds several
    #[arg(long, value_name = "JOINT")]
    pub(super) onto_root: Option<String>,
    /// Write what it came to, .html or .json
    #[arg(long, value_name = "FILE")]
    pub(super) proof: Option<PathBuf>,
    /// Allow an input to be replaced
    #[arg(long)]
    pub(super) force: bool,
    #[command(flatten)]
    pub(super) csv: CsvArgs,
}

/// Whose rest pose is straightened.
#[derive(Clone, Copy, Debug, PartialEq, Eq, clap::ValueEnum)]
pub(super) enum Straighten {
    Source,
    Target,
    Both,
}

/// Write a clip in another format, at another rate, or a part of it
#[derive(Debug, Args)]
pub(super) struct ConvertArgs {
    /// Clip to convert
    #[arg(value_name = "CLIP")]
    pub(super) clip: String,
    /// File to write; its extension gives the format
    #[arg(short, long, value_name = "OUT")]
    pub(super) output: PathBuf,
    /// Frames per second to resample at
    #[arg(long, value_name = "FPS", value_parser = number, allow_hyphen_values = true)]
    pub(super) rate: Option<f64>,
    /// Second at which the part begins
    #[arg(long, value_name = "S", value_parser = number, allow_hyphen_values = true)]
    pub(super) from: Option<f64>,
    /// Second at which the part ends
    #[arg(long, value_name = "S", value_parser = number, allow_hyphen_values = true)]
    pub(super) to: Option<f64>,
    /// Keep as few keys as leave every joint within so many degrees, at all times; into glTF and CSV
    #[arg(long, value_name = "DEG", value_parser = number, allow_hyphen_values = true)]
    pub(super) reduce: Option<f64>,
    /// Play it so many times over, each round set down where the one before has ended
    #[arg(long, value_name = "N", value_parser = count, allow_hyphen_values = true)]
    pub(super) repeat: Option<usize>,
    /// Close the loop: let the end meet the start in pose and rate, the root's stride kept; by the size of what is missing, spread
    /// over the whole length, or in a window near the seam
    #[arg(long, value_name = "auto|spread|window", num_args = 0..=1, default_missing_value = "auto", require_equals = true)]
    pub(super) close_loop: Option<CloseLoop>,
    /// Take the part that closes on itself best, at least so many seconds long
    #[arg(long, value_name = "SECONDS", value_parser = number, allow_hyphen_values = true, conflicts_with_all = ["from", "to"])]
    pub(super) find_loop: Option<f64>,
    /// Allow the input to be replaced
    #[arg(long)]
    pub(super) force: bool,
    /// Pose that becomes the zero pose of a new BVH: the bind pose of the skins, the joints as the file has them (as without
    /// this option), or the first frame
    #[arg(long, value_name = "bind|defaults|first-frame")]
    pub(super) rest: Option<RestChoice>,
    #[command(flatten)]
    pub(super) csv: CsvArgs,
}

/// Print where every joint stands and turns at some times
#[derive(Debug, Args)]
#[command(group = clap::ArgGroup::new("times").required(true).args(["at", "rate"]))]
pub(super) struct SampleArgs {
    /// Clip to sample
    #[arg(value_name = "CLIP")]
    pub(super) clip: String,
    /// At these seconds
    #[arg(long, value_name = "T,…", value_parser = number, allow_hyphen_values = true, value_delimiter = ',')]
    pub(super) at: Option<Vec<f64>>,
    /// At this many evenly spaced times a second
    #[arg(long, value_name = "FPS", value_parser = number, allow_hyphen_values = true)]
    pub(super) rate: Option<f64>,
    /// Go from key to key on this path in place of the file's own
    #[arg(long, value_enum, value_name = "PATH")]
    pub(super) path: Option<PathName>,
    /// In the scene, all ancestors applied, in place of relative to the parent
    #[arg(long)]
    pub(super) world: bool,
    /// Form of the output
    #[arg(long, value_enum, default_value_t = SampleFormat::Json)]
    pub(super) format: SampleFormat,
    #[command(flatten)]
    pub(super) csv: CsvArgs,
}

/// What a CSV file of another make does not say itself.
#[derive(Clone, Debug, Default, Args)]
pub(super) struct CsvArgs {
    /// Columns of a CSV file with other headers than ours: time and the four numbers of one joint's quaternion
    #[arg(long, value_name = "time=…,w=…,x=…,y=…,z=…")]
    pub(super) columns: Option<NamedColumns>,
    /// Unit of the time column of a CSV file: s, ms or us
    #[arg(long, value_name = "UNIT")]
    pub(super) time_unit: Option<TimeUnit>,
    /// Skeleton of a CSV file that has none: another clip whose joints bear the same names, or a table joint,parent,offset.x,offset.y,offset.z
    #[arg(long, value_name = "FILE")]
    pub(super) skeleton: Option<PathBuf>,
}

impl CsvArgs {
    /// For opening files.
    pub(super) fn open_options(&self) -> OpenOptions {
        let csv = CsvOptions {
            columns: self.columns.clone(),
            time_unit: self.time_unit,
            hierarchy: None,
            skeleton: self.skeleton.clone(),
        };
        OpenOptions { csv, rest: None }
    }
}

/// A path between keys, as typed.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub(super) enum PathName {
    /// The short arc at constant rate
    Slerp,
    /// Smooth through the keys, without a jump in rate
    Squad,
    /// Smooth through the keys, without a jump in rate or acceleration
    Spline,
    /// Smoothing: near the keys, without a jump in rate or acceleration
    BSpline,
    /// Each key held until the next
    Hold,
}

impl PathName {
    /// The track's own path kind.
    pub(super) const fn kind(self) -> PathKind {
        match self {
            Self::Slerp => PathKind::Slerp,
            Self::Squad => PathKind::Squad,
            Self::Spline => PathKind::Spline,
            Self::BSpline => PathKind::BSpline,
            Self::Hold => PathKind::Hold,
        }
    }
}

/// How samples are printed.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub(super) enum SampleFormat {
    /// One object: times, and for each joint lists of rotations (x, y, z, w) and positions
    Json,
    /// A row for each time, columns NAME.qx .qy .qz .qw .tx .ty .tz
    Csv,
}

/// Measure what changed between two clips
///
/// Exported curves that drive a machine need that machine's own limits and guarding, local safety codes and a licensed
/// or qualified person.
#[derive(Debug, Args)]
pub(super) struct ProofArgs {
    /// Clip as it was
    #[arg(value_name = "BEFORE")]
    pub(super) before: String,
    /// Clip as it is now
    #[arg(value_name = "AFTER")]
    pub(super) after: String,
    /// Sheet to write: .html for people, .json for machines
    #[arg(short, long, value_name = "FILE")]
    pub(super) output: PathBuf,
    /// Allow an input to be replaced
    #[arg(long)]
    pub(super) force: bool,
    #[command(flatten)]
    pub(super) csv: CsvArgs,
}

/// Draw the skeleton at some times into a PNG file
#[derive(Debug, Args)]
pub(super) struct PictureArgs {
    /// Clip, or scene to see before and after
    #[arg(value_name = "CLIP|SCENE")]
    pub(super) clip: String,
    /// PNG file to write
    #[arg(short, long, value_name = "PNG")]
    pub(super) output: PathBuf,
    /// Draw the window with the clip open in it, its playhead at the first of the times
    #[arg(long)]
    pub(super) window: bool,
    /// At these seconds; eight spread over the clip if not given
    #[arg(long, value_name = "T,…", value_parser = number, allow_hyphen_values = true, value_delimiter = ',')]
    pub(super) at: Option<Vec<f64>>,
    /// Width and height of the picture in pixels
    #[arg(long, value_name = "WxH", default_value = "1600x900", value_parser = parse_size, allow_hyphen_values = true)]
    pub(super) size: [usize; 2],
    /// Allow an input to be replaced
    #[arg(long)]
    pub(super) force: bool,
    #[command(flatten)]
    pub(super) csv: CsvArgs,
}

/// What a layer is measured from, as typed.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, ValueEnum)]
pub(super) enum ReferenceName {
    /// Its first frame
    #[default]
    First,
    /// The skeleton's rest pose
    Rest,
    /// Its mean over time
    Mean,
}

impl ReferenceName {
    /// For the blend.
    pub(super) const fn reference(self) -> Reference {
        match self {
            Self::First => Reference::First,
            Self::Rest => Reference::Rest,
            Self::Mean => Reference::Mean,
        }
    }
}

/// Where a layer is composed, as typed.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, ValueEnum)]
pub(super) enum SideName {
    /// In the joint's own frame
    #[default]
    Body,
    /// In the parent's frame
    Parent,
}

impl SideName {
    /// For the blend.
    pub(super) const fn side(self) -> Side {
        match self {
            Self::Body => Side::Body,
            Self::Parent => Side::Parent,
        }
    }
}

/// Whose way on the ground a mix takes, as typed.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, ValueEnum)]
pub(super) enum RootName {
    /// Both, by the weight
    #[default]
    Both,
    /// The first clip's
    A,
    /// The second clip's
    B,
}

impl RootName {
    /// For the blend.
    pub(super) const fn root(self) -> RootFrom {
        match self {
            Self::Both => RootFrom::Both,
            Self::A => RootFrom::First,
            Self::B => RootFrom::Second,
        }
    }
}

/// How a loop is closed, as typed.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub(super) enum CloseLoop {
    /// For each joint by the size of what is missing
    Auto,
    /// Over the whole length
    Spread,
    /// Near the seam alone
    Window,
}

impl CloseLoop {
    /// For the pass.
    pub(super) const fn closing(self) -> Closing {
        match self {
            Self::Auto => Closing::BySize,
            Self::Spread => Closing::Spread,
            Self::Window => Closing::Window,
        }
    }
}

/// A weight over time, as typed: knots of seconds and weight.
pub(super) type WeightCurve = MixAlong;

/// One weight, or pairs of seconds and weight.
fn parse_weights(text: &str) -> Result<WeightCurve, String> {
    let error =
        || format!("expected a weight such as 0.5, or seconds and weights such as 0:0,1.5:1, found `{text}`");
    let number = |text: &str| text.trim().parse::<f64>().ok().filter(|number| number.is_finite());
    if let Some(weight) = number(text) {
        return Ok(WeightCurve::constant(weight));
    }
    let knots: Option<Vec<[f64; 2]>> = text
        .split(',')
        .map(|knot| {
            let (secs, weight) = knot.split_once(':')?;
            Some([number(secs)?, number(weight)?])
        })
        .collect();
    Ok(WeightCurve { knots: knots.ok_or_else(error)? })
}

/// Smallest and largest side of a picture, in pixels.
const SIDES: std::ops::RangeInclusive<usize> = 16..=8192;

fn parse_size(text: &str) -> Result<[usize; 2], String> {
    let error = || {
        let (least, most) = (SIDES.start(), SIDES.end());
        format!(
            "expected width x height in pixels, each from {least} to {most}, such as 1600x900, found `{text}`"
        )
    };
    let (width, height) = text.split_once(['x', 'X', '×']).ok_or_else(error)?;
    let side = |text: &str| text.trim().parse().ok().filter(|side| SIDES.contains(side)).ok_or_else(error);
    Ok([side(width)?, side(height)?])
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_command_line_is_sound() {
        <Arguments as clap::CommandFactory>::command().debug_assert();
    }

    #[test]
    fn sizes_are_two_numbers_within_bounds() {
        assert_eq!(parse_size("640x360"), Ok([640, 360]));
        for wrong in ["", "640", "640x", "x360", "-1x5", "9000x100", "640x360x2", "1e3x5"] {
            let error = parse_size(wrong).unwrap_err();
            assert!(error.contains(&format!("found `{wrong}`")), "{error}");
        }
    }
}
