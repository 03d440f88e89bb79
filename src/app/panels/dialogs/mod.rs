//! Questions and sheets that lie over the window, one file each.

mod about;
mod blend;
mod carry;
mod changes;
mod clips;
mod columns;
mod export;
mod form;
mod help;
mod history;
mod marker;
mod path;
mod relocate;
mod sheet;
mod shortcuts;
mod skeleton;
mod unsaved;

use std::path::PathBuf;

use egui::{Modal, vec2};

use super::super::commands::{CarrySheet, Command};
use super::super::file_picker::Purpose;
use super::Scope;

pub(crate) use form::Form;

/// What is to happen once unsaved work is dealt with.
#[derive(Clone, Debug, PartialEq)]
pub(crate) enum Then {
    /// Close the window.
    Quit,
    /// Open these files.
    Open(Vec<PathBuf>),
    /// Ask for files.
    AskForFiles,
    /// Ask for a path.
    AskForPath,
    /// Open the demo.
    OpenDemo,
}

/// Which one lies over the window.
#[derive(Clone, Debug, PartialEq)]
pub(crate) enum Dialog {
    /// A path to open.
    OpenPath,
    /// A path to save to.
    SavePath,
    /// A path to export to, and what changed.
    Export,
    /// Where a missing source is.
    Relocate(usize),
    /// A file with the skeleton of the table on show.
    TableSkeleton,
    /// A file of limits.
    LimitsPath,
    /// A marker's name.
    MarkerName(usize),
    /// What the columns of a CSV file are.
    Columns(PathBuf, Vec<String>),
    /// Which clip of several.
    ChooseClip,
    /// Unsaved work.
    Unsaved(Then),
    /// All changes.
    History,
    /// Snag kinds and passes explained.
    Help,
    /// All keys.
    Shortcuts,
    /// The change log.
    WhatsNew,
    /// Version, licences, cautions.
    About,
    /// A second clip to blend in.
    Blend,
    /// A file with it.
    SecondFile,
    /// A file of a retarget.
    Carry(CarrySheet),
}

/// Draws the dialog, if there is one.
pub(crate) fn dialogs_ui(ctx: &egui::Context, dialog: &Dialog, form: &mut Form, scope: &mut Scope<'_>) {
    let frame = egui::Frame::popup(&ctx.global_style()).inner_margin(egui::Margin::same(18));
    let modal = Modal::new(egui::Id::unique("dialog")).frame(frame);
    let response = modal.show(ctx, |ui| {
        let room = ctx.content_rect().size() - vec2(80.0, 80.0);
        let wanted = match dialog {
            Dialog::Shortcuts | Dialog::Help => vec2(720.0, 600.0),
            Dialog::WhatsNew | Dialog::History => vec2(560.0, 460.0),
            Dialog::Unsaved(_) | Dialog::MarkerName(_) => vec2(440.0, 160.0),
            Dialog::Export => vec2(580.0, 600.0),
            _ => vec2(580.0, 460.0),
        };
        let size = wanted.min(room.max(vec2(200.0, 160.0)));
        ui.set_width(size.x);
        ui.set_max_height(size.y);
        ui.spacing_mut().item_spacing.y = 6.0;
        match dialog {
            Dialog::OpenPath => path::path_sheet(ui, "Open path", "Open", Purpose::Open, form, scope),
            Dialog::SavePath => path::path_sheet(ui, "Save scene as", "Save", Purpose::Save, form, scope),
            Dialog::LimitsPath => {
                path::path_sheet(ui, "Limits from a file", "Use", Purpose::Limits, form, scope);
            }
            Dialog::MarkerName(at) => marker::marker_sheet(ui, *at, form, scope),
            Dialog::Relocate(source) => relocate::relocate_sheet(ui, *source, form, scope),
            Dialog::TableSkeleton => skeleton::skeleton_sheet(ui, form, scope),
            Dialog::Export => export::export_sheet(ui, form, scope),
            Dialog::Columns(path, names) => columns::columns_sheet(ui, path, names, form, scope),
            Dialog::ChooseClip => clips::clips_sheet(ui, form, scope),
            Dialog::Unsaved(_) => unsaved::unsaved_sheet(ui, scope),
            Dialog::History => history::history_sheet(ui, scope),
            Dialog::Help => help::help_sheet(ui, form, scope),
            Dialog::Shortcuts => shortcuts::shortcuts_sheet(ui, form, scope),
            Dialog::WhatsNew => changes::changes_sheet(ui, scope),
            Dialog::About => about::about_sheet(ui, scope),
            Dialog::Blend => blend::blend_sheet(ui, form, scope),
            Dialog::SecondFile => {
                path::path_sheet(ui, "Open the second clip", "Open", Purpose::Second, form, scope);
            }
            Dialog::Carry(sheet) => carry::carry_sheet(ui, *sheet, form, scope),
        }
    });
    if response.should_close() {
        scope.out.push(Command::CloseDialog);
    }
}
