//! Every colour, distance, letter and line style of the window: nothing else in the room names one.
//!
//! *Conventions*: one accent for what can be pressed; amber only for what misses a requirement; red only for an entry that
//! cannot be used. The roles of curves come from a set that stays apart for the common kinds of colour blindness, and
//! each has its own line style as well, so that no reading hangs on colour alone.

use std::sync::Arc;

use crate::figure::{Dash, Role};
use eframe::egui::{
    self, Color32, CornerRadius, FontData, FontDefinitions, FontFamily, FontId, Margin, Stroke, TextStyle,
    style::WidgetVisuals,
};

/// Colours of one theme, by what they are for.
#[derive(Debug)]
pub(super) struct Palette {
    /// Ground of the plots' column.
    pub canvas: Color32,
    /// Ground of the columns beside the plots.
    pub panel: Color32,
    /// Ground of the top bar.
    pub bar: Color32,
    /// Ground of fields and of the chooser in the bar.
    pub field: Color32,
    /// Edge of fields.
    pub field_edge: Color32,
    /// Hairlines between columns.
    pub hairline: Color32,
    /// Text that is read first.
    pub ink: Color32,
    /// Text that explains.
    pub weak: Color32,
    /// Lines of the grid.
    pub grid: Color32,
    /// Frame of a plot, its decades, its zero line.
    pub grid_strong: Color32,
    /// Rail of a lane and of a requirement bar.
    pub rail: Color32,
    /// What can be pressed.
    pub accent: Color32,
    /// Ground under what is pressed or chosen.
    pub accent_ground: Color32,
    /// A margin or a met requirement.
    pub good: Color32,
    /// A missed requirement.
    pub amber: Color32,
    /// An entry that cannot be used.
    pub problem: Color32,
    /// The plant.
    pub plant: Color32,
    /// The compensator.
    pub compensator: Color32,
    /// The loop gain.
    pub loop_gain: Color32,
    /// The exact plant and the exact loop gain, broad and pale under the averaged ones.
    pub exact: [Color32; 2],
    /// A held curve, and the open loop beside the closed one.
    pub held: Color32,
    /// A landmark of the plant.
    pub landmark: Color32,
    /// Band over the nine conditions.
    pub band: Color32,
    /// Band a response has to settle into.
    pub settle: Color32,
    /// Veil over frequencies at which an averaged model says nothing.
    pub veil: Color32,
}

const LIGHT: Palette = Palette {
    canvas: Color32::from_rgb(0xfd, 0xfd, 0xfb),
    panel: Color32::from_rgb(0xfa, 0xfa, 0xf7),
    bar: Color32::from_rgb(0xf1, 0xf1, 0xec),
    field: Color32::from_rgb(0xff, 0xff, 0xff),
    field_edge: Color32::from_rgb(0xd6, 0xd6, 0xcf),
    hairline: Color32::from_rgb(0xdf, 0xdf, 0xd8),
    ink: Color32::from_rgb(0x1c, 0x1d, 0x1f),
    weak: Color32::from_rgb(0x66, 0x68, 0x6c),
    grid: Color32::from_rgb(0xec, 0xec, 0xe6),
    grid_strong: Color32::from_rgb(0xd2, 0xd2, 0xca),
    rail: Color32::from_rgb(0xdc, 0xdc, 0xd4),
    accent: Color32::from_rgb(0x1a, 0x5f, 0xb4),
    accent_ground: Color32::from_rgb(0xdf, 0xe9, 0xf6),
    good: Color32::from_rgb(0x12, 0x7a, 0x56),
    amber: Color32::from_rgb(0xb4, 0x5a, 0x00),
    problem: Color32::from_rgb(0xb3, 0x26, 0x1e),
    plant: Color32::from_rgb(0x00, 0x86, 0xa8),
    compensator: Color32::from_rgb(0x9c, 0x3f, 0x8a),
    loop_gain: Color32::from_rgb(0x16, 0x17, 0x19),
    exact: [Color32::from_rgb(0x9f, 0xd6, 0xe4), Color32::from_rgb(0xbc, 0xbe, 0xc4)],
    held: Color32::from_rgb(0x8c, 0x8e, 0x92),
    landmark: Color32::from_rgb(0x78, 0x7a, 0x7e),
    band: Color32::from_rgb(0xe3, 0xe7, 0xee),
    settle: Color32::from_rgb(0xe4, 0xf0, 0xea),
    veil: Color32::from_rgb(0xf3, 0xf3, 0xee),
};

const DARK: Palette = Palette {
    canvas: Color32::from_rgb(0x15, 0x16, 0x19),
    panel: Color32::from_rgb(0x19, 0x1b, 0x1e),
    bar: Color32::from_rgb(0x20, 0x22, 0x26),
    field: Color32::from_rgb(0x22, 0x25, 0x29),
    field_edge: Color32::from_rgb(0x3a, 0x3e, 0x44),
    hairline: Color32::from_rgb(0x2d, 0x30, 0x35),
    ink: Color32::from_rgb(0xec, 0xed, 0xee),
    weak: Color32::from_rgb(0x9c, 0xa0, 0xa6),
    grid: Color32::from_rgb(0x23, 0x26, 0x2a),
    grid_strong: Color32::from_rgb(0x3c, 0x40, 0x46),
    rail: Color32::from_rgb(0x38, 0x3c, 0x42),
    accent: Color32::from_rgb(0x78, 0xb0, 0xf5),
    accent_ground: Color32::from_rgb(0x27, 0x36, 0x4a),
    good: Color32::from_rgb(0x4f, 0xc9, 0x95),
    amber: Color32::from_rgb(0xf2, 0xa0, 0x48),
    problem: Color32::from_rgb(0xff, 0x8d, 0x85),
    plant: Color32::from_rgb(0x4f, 0xc3, 0xe0),
    compensator: Color32::from_rgb(0xdc, 0x8f, 0xcc),
    loop_gain: Color32::from_rgb(0xf4, 0xf4, 0xf4),
    exact: [Color32::from_rgb(0x1e, 0x5f, 0x70), Color32::from_rgb(0x66, 0x6a, 0x72)],
    held: Color32::from_rgb(0x80, 0x85, 0x8c),
    landmark: Color32::from_rgb(0x8a, 0x8f, 0x96),
    band: Color32::from_rgb(0x2c, 0x32, 0x3c),
    settle: Color32::from_rgb(0x1f, 0x2f, 0x29),
    veil: Color32::from_rgb(0x1b, 0x1d, 0x20),
};

/// The colours of the theme a `Ui` is drawn in.
pub(super) fn palette(ui: &egui::Ui) -> &'static Palette {
    if ui.visuals().dark_mode { &DARK } else { &LIGHT }
}

/// The colour a mark of a figure has in the window.
pub(super) fn of_role(role: Role, palette: &Palette) -> Color32 {
    match role {
        Role::Ink => palette.ink,
        Role::Quiet => palette.weak,
        Role::Grid => palette.grid,
        Role::GridStrong => palette.grid_strong,
        Role::Ground => palette.panel,
        Role::Good => palette.good,
        Role::Missed => palette.amber,
        Role::Plant => palette.plant,
        Role::Compensator => palette.compensator,
        Role::LoopGain => palette.loop_gain,
        Role::ExactPlant => palette.exact[0],
        Role::ExactLoop => palette.exact[1],
        Role::Held | Role::Measured => palette.held,
        Role::Band => palette.band,
        Role::Settle => palette.settle,
        Role::Landmark => palette.landmark,
    }
}

/// Colours of the icon: ground, zero, pole, axis.
pub(super) fn icon_colours() -> (Color32, Color32, Color32, Color32) {
    (DARK.bar, DARK.plant, DARK.compensator, DARK.held)
}

/// How a line is broken up, so that a role is known without its colour.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum LineStyle {
    /// Unbroken: the loop, closed-loop responses.
    Solid,
    /// Dashes: the plant.
    Dashed,
    /// Dash and dot: the compensator.
    DashDot,
    /// Dots: what is held, and the open loop.
    Dotted,
}

/// The style of a figure's line.
pub(super) fn style_of(dash: Dash) -> LineStyle {
    match dash {
        Dash::Solid => LineStyle::Solid,
        Dash::Dashed => LineStyle::Dashed,
        Dash::DashDot => LineStyle::DashDot,
        Dash::Dotted => LineStyle::Dotted,
    }
}

impl LineStyle {
    /// Lengths of strokes and of the gaps after them [points]; empty for an unbroken line.
    pub(super) fn pattern(self) -> (&'static [f32], &'static [f32]) {
        match self {
            LineStyle::Solid => (&[], &[]),
            LineStyle::Dashed => (&[7.0], &[4.0]),
            LineStyle::DashDot => (&[9.0, 1.8], &[3.4, 3.4]),
            LineStyle::Dotted => (&[1.6], &[3.2]),
        }
    }
}

/// Width of the column of the power stage [points].
pub(super) const LEFT_COLUMN: f32 = 276.0;
/// Width of the column of read-outs [points].
pub(super) const RIGHT_COLUMN: f32 = 296.0;
/// Width of the column of the power stage in a wide window [points].
pub(super) const WIDE_LEFT_COLUMN: f32 = 336.0;
/// Width of the column of read-outs in a wide window [points].
pub(super) const WIDE_RIGHT_COLUMN: f32 = 364.0;
/// Height of the top bar [points].
pub(super) const BAR_HEIGHT: f32 = 38.0;
/// Room left of a plot for its labels [points].
pub(super) const GUTTER: f32 = 56.0;
/// Room right of a plot [points].
pub(super) const RIGHT_GUTTER: f32 = 16.0;
/// Height of one lane [points].
pub(super) const LANE_HEIGHT: f32 = 23.0;
/// Height of a form row [points].
pub(super) const ROW: f32 = 23.0;
/// Radius of a lane's handle [points].
pub(super) const HANDLE: f32 = 6.5;
/// How much of stale results is left to see.
pub(super) const STALE: f32 = 0.42;
/// Width of the main curve [points].
pub(super) const CURVE: f32 = 1.9;
/// Width of an exact curve, under the averaged one [points].
pub(super) const EXACT_CURVE: f32 = 5.5;
/// Width of the curves beside it [points].
pub(super) const THIN_CURVE: f32 = 1.4;

const SEMIBOLD: &str = "semibold";

/// Letters of plots and remarks.
pub(super) fn small() -> FontId {
    FontId::new(11.5, FontFamily::Proportional)
}

/// Letters of labels and fields.
pub(super) fn body() -> FontId {
    FontId::new(13.0, FontFamily::Proportional)
}

/// Letters of headings and of what is marked in a plot.
pub(super) fn strong(size: f32) -> FontId {
    FontId::new(size, FontFamily::Name(SEMIBOLD.into()))
}

/// Letters of the numbers decisions are made on.
pub(super) fn figure() -> FontId {
    FontId::new(19.5, FontFamily::Proportional)
}

/// Letters of the same numbers on a page for reading.
pub(super) fn large() -> FontId {
    FontId::new(27.0, FontFamily::Proportional)
}

/// Loads the fonts and sets both themes; called once.
pub(super) fn install(ctx: &egui::Context) {
    ctx.set_fonts(fonts());
    ctx.set_style_of(egui::Theme::Light, style(&LIGHT, egui::Visuals::light()));
    ctx.set_style_of(egui::Theme::Dark, style(&DARK, egui::Visuals::dark()));
    ctx.options_mut(|options| options.zoom_with_keyboard = false);
}

fn fonts() -> FontDefinitions {
    let mut fonts = FontDefinitions::default();
    let regular = FontData::from_static(include_bytes!("../../assets/fonts/inter-regular.otf"));
    let semibold = FontData::from_static(include_bytes!("../../assets/fonts/inter-semibold.otf"));
    fonts.font_data.insert("inter".to_owned(), Arc::new(regular));
    fonts.font_data.insert("inter-semibold".to_owned(), Arc::new(semibold));
    let proportional = fonts.families.entry(FontFamily::Proportional).or_default();
    let mut semibold_family = proportional.clone();
    proportional.insert(0, "inter".to_owned());
    semibold_family.insert(0, "inter-semibold".to_owned());
    fonts.families.insert(FontFamily::Name(SEMIBOLD.into()), semibold_family);
    fonts
}

fn style(palette: &Palette, visuals: egui::Visuals) -> egui::Style {
    let mut style = egui::Style { visuals, ..egui::Style::default() };
    style.text_styles = [
        (TextStyle::Small, small()),
        (TextStyle::Body, body()),
        (TextStyle::Button, body()),
        (TextStyle::Monospace, body()),
        (TextStyle::Heading, strong(13.5)),
    ]
    .into();
    style.spacing.item_spacing = egui::vec2(8.0, 4.0);
    style.spacing.button_padding = egui::vec2(7.0, 2.0);
    style.spacing.interact_size.y = 21.0;
    style.spacing.menu_margin = Margin::same(7);
    style.spacing.window_margin = Margin::same(18);
    style.spacing.scroll = egui::style::ScrollStyle::floating();
    style.spacing.tooltip_width = 340.0;
    style.interaction.tooltip_delay = 0.4;
    style.interaction.selectable_labels = false;
    style.animation_time = 0.0;
    colour(&mut style.visuals, palette);
    style
}

fn colour(visuals: &mut egui::Visuals, palette: &Palette) {
    visuals.panel_fill = palette.panel;
    visuals.window_fill = palette.panel;
    visuals.window_stroke = Stroke::new(1.0, palette.field_edge);
    visuals.window_corner_radius = CornerRadius::same(8);
    visuals.menu_corner_radius = CornerRadius::same(6);
    visuals.extreme_bg_color = palette.field;
    visuals.text_edit_bg_color = Some(palette.field);
    visuals.faint_bg_color = palette.band;
    visuals.hyperlink_color = palette.accent;
    visuals.warn_fg_color = palette.amber;
    visuals.error_fg_color = palette.problem;
    visuals.weak_text_color = Some(palette.weak);
    visuals.selection.bg_fill = palette.accent_ground;
    visuals.selection.stroke = Stroke::new(1.5, palette.accent);
    visuals.indent_has_left_vline = false;
    visuals.button_frame = true;
    let calm = WidgetVisuals {
        bg_fill: palette.field,
        weak_bg_fill: Color32::TRANSPARENT,
        bg_stroke: Stroke::new(1.0, palette.hairline),
        corner_radius: CornerRadius::same(4),
        fg_stroke: Stroke::new(1.0, palette.ink),
        expansion: 0.0,
    };
    visuals.widgets.noninteractive = calm;
    visuals.widgets.inactive = WidgetVisuals { bg_stroke: Stroke::new(1.0, palette.field_edge), ..calm };
    visuals.widgets.hovered =
        WidgetVisuals { weak_bg_fill: palette.accent_ground, bg_stroke: Stroke::new(1.0, palette.accent), ..calm };
    visuals.widgets.active =
        WidgetVisuals { weak_bg_fill: palette.accent_ground, bg_stroke: Stroke::new(1.5, palette.accent), ..calm };
    visuals.widgets.open = visuals.widgets.hovered;
}
