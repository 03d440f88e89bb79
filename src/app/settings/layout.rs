//! How the window is divided into its areas.

use egui::{Rangef, Rect, Vec2, pos2, vec2};
use serde::{Deserialize, Serialize};

/// A line between two areas that can be moved.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Divider {
    /// Between space on the left and time on the right.
    Space,
    /// Above the joint sheet.
    JointSheet,
    /// Below the turn map.
    Map,
    /// Below the blend lane, where there is one.
    Lane,
    /// Above snags and passes.
    Lists,
    /// Between snags and passes.
    Passes,
}

impl Divider {
    /// All of them.
    pub const ALL: [Self; 6] =
        [Self::Space, Self::JointSheet, Self::Map, Self::Lane, Self::Lists, Self::Passes];

    /// What a screen reader says.
    pub const fn label(self) -> &'static str {
        match self {
            Self::Space => "Divider between skeleton and charts",
            Self::JointSheet => "Divider above joints",
            Self::Map => "Divider below turn map",
            Self::Lane => "Divider below blend lane",
            Self::Lists => "Divider above snags and passes",
            Self::Passes => "Divider between snags and passes",
        }
    }

    /// Whether it stands upright and is moved to left and right.
    pub const fn is_upright(self) -> bool {
        matches!(self, Self::Space | Self::Passes)
    }
}

/// Sizes of areas as shares of the whole, where they were changed; where not, a rule that suits the window's size.
#[derive(Clone, Copy, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(default)]
pub struct Layout {
    /// Width of the left side.
    pub space: Option<f32>,
    /// Height of the joint sheet.
    pub joint_sheet: Option<f32>,
    /// Height of the turn map.
    pub map: Option<f32>,
    /// Height of the blend lane.
    pub lane: Option<f32>,
    /// Height of snags and passes.
    pub lists: Option<f32>,
    /// Width of the passes.
    pub passes: Option<f32>,
}

/// Where each area is.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Areas {
    /// The skeleton view.
    pub skeleton: Rect,
    /// The joint sheet.
    pub joint_sheet: Rect,
    /// The turn map.
    pub map: Rect,
    /// The blend lane above the curves; of no height where there is none.
    pub lane: Rect,
    /// The curves.
    pub curves: Rect,
    /// The snags.
    pub snags: Rect,
    /// The passes.
    pub passes: Rect,
}

/// Narrower or lower than this an area is of no use, points.
const LEAST: Vec2 = Vec2::new(190.0, 96.0);

/// The blend lane needs so many points for its two bars.
const LEAST_LANE: f32 = 72.0;
/// The most that the blend lane takes of the room for itself and the curves: by rule, and where somebody wants it so.
const USUAL_OF_CHARTS: f32 = 0.55;
const MOST_OF_CHARTS: f32 = 0.7;

impl Layout {
    fn share(&mut self, divider: Divider) -> &mut Option<f32> {
        match divider {
            Divider::Space => &mut self.space,
            Divider::JointSheet => &mut self.joint_sheet,
            Divider::Map => &mut self.map,
            Divider::Lane => &mut self.lane,
            Divider::Lists => &mut self.lists,
            Divider::Passes => &mut self.passes,
        }
    }

    /// Sets one share; `None`: by the rule again.
    pub fn set(&mut self, divider: Divider, share: Option<f32>) {
        *self.share(divider) = share;
    }

    /// Without what can't be a share.
    #[must_use]
    pub fn sound(mut self) -> Self {
        for divider in Divider::ALL {
            let share = self.share(divider);
            *share = share.filter(|share| (0.02..=0.98).contains(share));
        }
        self
    }

    /// The size in points that a divider sets, for a window's inside of `size`.
    pub fn size_of(&self, divider: Divider, size: Vec2) -> f32 {
        let mut own = *self;
        let share = *own.share(divider);
        let whole = if divider.is_upright() { size.x } else { size.y };
        let by_rule = match divider {
            Divider::Space => (size.x * 0.34).clamp(280.0, 760.0),
            Divider::JointSheet => (size.y * 0.42).clamp(180.0, 540.0),
            // Of a low window the map takes what the curves can spare, or it would show three joints.
            Divider::Map => (size.y * 0.31).clamp(134.0, 520.0),
            Divider::Lists => (size.y * 0.31).clamp(126.0, 520.0),
            Divider::Lane => (size.y * 0.20).clamp(144.0, 260.0),
            Divider::Passes => (size.x * 0.235).clamp(250.0, 460.0),
        };
        let wanted = share.map_or(by_rule, |share| share * whole);
        // What is left over must suffice for the areas on the other side.
        let least = if divider.is_upright() { LEAST.x } else { LEAST.y };
        let others = match divider {
            Divider::Lane => {
                // Lane and curves share what map and lists leave.
                let room = size.y - self.size_of(Divider::Map, size) - self.size_of(Divider::Lists, size);
                let most = if share.is_some() { MOST_OF_CHARTS } else { USUAL_OF_CHARTS };
                return wanted.clamp(LEAST_LANE.min(most * room), most * room);
            }
            Divider::Space => 2.0 * LEAST.x,
            Divider::Passes => {
                return wanted
                    .clamp(least, (size.x - self.size_of(Divider::Space, size) - LEAST.x).max(least));
            }
            Divider::JointSheet => LEAST.y,
            Divider::Map => {
                return wanted
                    .clamp(least, (size.y - self.size_of(Divider::Lists, size) - LEAST.y).max(least));
            }
            Divider::Lists => 2.0 * LEAST.y,
        };
        wanted.clamp(least, (whole - others).max(least))
    }

    /// Divides `bounds`, with a blend lane above the curves.
    pub fn areas_with_lane(&self, bounds: Rect) -> Areas {
        let mut areas = self.areas(bounds);
        let bottom = areas.curves.top() + self.size_of(Divider::Lane, bounds.size()).round();
        areas.lane.max.y = bottom;
        areas.curves.min.y = bottom;
        areas
    }

    /// Divides `bounds`.
    pub fn areas(&self, bounds: Rect) -> Areas {
        let size = bounds.size();
        // Whole points, so that nothing is drawn between pixels.
        let of = |divider| self.size_of(divider, size).round();
        let middle = bounds.left() + of(Divider::Space);
        let (left, right) = (Rangef::new(bounds.left(), middle), Rangef::new(middle, bounds.right()));
        let sheet = bounds.bottom() - of(Divider::JointSheet);
        let lists = bounds.bottom() - of(Divider::Lists);
        let map = bounds.top() + of(Divider::Map);
        let passes = bounds.right() - of(Divider::Passes);
        let below = Rangef::new(lists, bounds.bottom());
        Areas {
            skeleton: Rect::from_x_y_ranges(left, Rangef::new(bounds.top(), sheet)),
            joint_sheet: Rect::from_x_y_ranges(left, Rangef::new(sheet, bounds.bottom())),
            map: Rect::from_x_y_ranges(right, Rangef::new(bounds.top(), map)),
            lane: Rect::from_x_y_ranges(right, Rangef::point(map)),
            curves: Rect::from_x_y_ranges(right, Rangef::new(map, lists)),
            snags: Rect::from_x_y_ranges(Rangef::new(middle, passes), below),
            passes: Rect::from_x_y_ranges(Rangef::new(passes, bounds.right()), below),
        }
    }

    /// The line of a divider.
    pub fn line(areas: &Areas, divider: Divider) -> Rect {
        let across = |y: f32, x: Rangef| Rect::from_min_max(pos2(x.min, y), pos2(x.max, y));
        let down = |x: f32, y: Rangef| Rect::from_min_max(pos2(x, y.min), pos2(x, y.max));
        match divider {
            Divider::Space => down(areas.map.left(), Rangef::new(areas.map.top(), areas.snags.bottom())),
            Divider::JointSheet => across(areas.joint_sheet.top(), areas.joint_sheet.x_range()),
            Divider::Map => across(areas.map.bottom(), areas.map.x_range()),
            Divider::Lane => across(areas.lane.bottom(), areas.lane.x_range()),
            Divider::Lists => {
                across(areas.snags.top(), Rangef::new(areas.snags.left(), areas.passes.right()))
            }
            Divider::Passes => down(areas.passes.left(), areas.passes.y_range()),
        }
    }

    /// The share that brings a divider under the pointer.
    pub fn share_at(&self, bounds: Rect, divider: Divider, pointer: egui::Pos2) -> f32 {
        let from_start = (pointer - bounds.min) / bounds.size().max(vec2(1.0, 1.0));
        match divider {
            Divider::Space => from_start.x,
            Divider::Passes => 1.0 - from_start.x,
            Divider::Map => from_start.y,
            Divider::Lane => {
                from_start.y - self.size_of(Divider::Map, bounds.size()) / bounds.height().max(1.0)
            }
            Divider::JointSheet | Divider::Lists => 1.0 - from_start.y,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_areas_fill_the_window_whatever_the_shares_are() {
        for size in [vec2(640.0, 300.0), vec2(1280.0, 630.0), vec2(2560.0, 1350.0)] {
            for share in [None, Some(0.02), Some(0.5), Some(0.98)] {
                let layout = Layout {
                    space: share,
                    joint_sheet: share,
                    map: share,
                    lane: share,
                    lists: share,
                    passes: share,
                };
                let bounds = Rect::from_min_size(pos2(0.0, 24.0), size);
                let with_lane = layout.areas_with_lane(bounds);
                assert!(
                    with_lane.curves.height() >= 0.29 * (with_lane.lane.height() + with_lane.curves.height())
                );
                for areas in [layout.areas(bounds), with_lane] {
                    let all = [
                        areas.skeleton,
                        areas.joint_sheet,
                        areas.map,
                        areas.lane,
                        areas.curves,
                        areas.snags,
                        areas.passes,
                    ];
                    let sum: f32 = all.iter().map(Rect::area).sum();
                    assert!((sum - bounds.area()).abs() < 1.0, "{size} {share:?}: {sum}");
                }
                let areas = layout.areas(bounds);
                let all =
                    [areas.skeleton, areas.joint_sheet, areas.map, areas.curves, areas.snags, areas.passes];
                if size.x > 1000.0 {
                    let least =
                        all.iter().map(|area| area.width().min(2.0 * area.height())).fold(1e9, f32::min);
                    assert!(least >= 185.0, "{size} {share:?}: {least}");
                }
            }
        }
    }

    #[test]
    fn a_divider_comes_to_where_it_is_dragged() {
        let bounds = Rect::from_min_size(pos2(10.0, 20.0), vec2(1400.0, 800.0));
        let mut layout = Layout::default();
        for divider in Divider::ALL {
            let line = Layout::line(&layout.areas_with_lane(bounds), divider).center();
            let to = line + vec2(-20.0, 15.0);
            layout.set(divider, Some(layout.share_at(bounds, divider, to)));
            let now = Layout::line(&layout.areas_with_lane(bounds), divider).center();
            let off = if divider.is_upright() { now.x - to.x } else { now.y - to.y };
            assert!(off.abs() <= 0.5, "{divider:?}: {off}");
        }
    }
}
