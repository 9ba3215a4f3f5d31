//! The picture: shift, and errors with their bounds, over time.

use super::alternatives::Alternative;
use super::estimates::Followed;
use super::{Column, Outcome, report};
use anyhow::anyhow;
use plotters::coord::Shift;
use plotters::coord::types::RangedCoordf64;
use plotters::prelude::*;
use plotters::style::text_anchor::{HPos, Pos, VPos};
use std::path::Path;

/// Drawn this much larger than shown: the drawing counts in whole pixels, and curves want finer ones.
const FINER: u32 = 8;
/// Shown size.
const WIDTH: u32 = 960;
const HEADING: u32 = 86;
const PANEL: u32 = 250;
const BAR: u32 = 22;
/// Ink and its lighter companions; the two colours keep apart for any kind of colour vision (Okabe and Ito).
const INK: RGBColor = RGBColor(38, 42, 48);
const QUIET: RGBColor = RGBColor(98, 104, 112);
const FAINT: RGBColor = RGBColor(222, 225, 229);
const SEEN: RGBColor = RGBColor(0, 114, 178);
const BOUND: RGBColor = RGBColor(213, 94, 0);
const OTHER: RGBColor = RGBColor(150, 156, 164);

type Area<'a> = DrawingArea<SVGBackend<'a>, Shift>;
type Chart<'a, 'b> = ChartContext<'a, SVGBackend<'b>, Cartesian2d<RangedCoordf64, RangedCoordf64>>;
type Drawn = Result<(), Box<dyn std::error::Error>>;

/// What limits an error.
#[derive(Clone, Debug)]
enum Limit {
    /// Nothing.
    None,
    /// The same to both sides all along: what it is called, and how much.
    Level(String, f64),
    /// A band of its own: what it is called.
    Band(String, Vec<(f64, [f64; 2])>),
}

/// One panel: a curve, or a band of least and largest, and its limit.
#[derive(Clone, Debug)]
struct Panel {
    title: String,
    unit: &'static str,
    seen: Vec<(f64, [f64; 2])>,
    limit: Limit,
    largest: f64,
}

/// Worst errors side by side, each with its name and colour, Hz.
type Bars = Vec<(String, f64, RGBColor)>;

/// All of it.
#[derive(Clone, Debug)]
pub struct Picture {
    heading: Vec<String>,
    span: (f64, f64),
    panels: Vec<Panel>,
    bars: Bars,
}

/// A column's band, scaled.
fn band(columns: &[Column], pick: fn(&Column) -> [f64; 2], scale: f64) -> Vec<(f64, [f64; 2])> {
    columns.iter().map(|column| (column.time, pick(column).map(|value| value * scale))).collect()
}

fn shift_panel(columns: &[Column]) -> Panel {
    Panel {
        title: "Shift of the carrier".to_string(),
        unit: "kHz",
        seen: band(columns, |column| [column.shift; 2], 1e-3),
        limit: Limit::None,
        largest: columns.iter().fold(0.0, |most, column| column.shift.abs().max(most)) * 1e-3,
    }
}

/// Hertz or millihertz, whichever gives the shorter numbers.
fn unit_of(hertz: f64) -> (&'static str, f64) {
    if hertz < 0.5 { ("mHz", 1e3) } else { ("Hz", 1.0) }
}

/// Of a rehearsal by a table.
pub fn of_table(heading: &[String], outcome: &Outcome, alternatives: &[Alternative]) -> Picture {
    let total = outcome.proven.total();
    let (unit, scale) = unit_of(total.hertz);
    let worst = report::hertz(outcome.worst.hertz);
    let mut panels = vec![
        shift_panel(&outcome.columns),
        Panel {
            title: format!("Frequency error: worst {worst}, proven {}", report::hertz(total.hertz)),
            unit,
            seen: band(&outcome.columns, |column| column.hertz, scale),
            limit: Limit::Level("proven".to_string(), total.hertz * scale),
            largest: outcome.worst.hertz * scale,
        },
    ];
    if total.cycles.is_finite() {
        panels.push(Panel {
            title: format!(
                "Phase error: worst {:.4} cycle, proven {:.4} cycle",
                outcome.worst.cycles, total.cycles
            ),
            unit: "millicycles",
            seen: band(&outcome.columns, |column| column.cycles, 1e3),
            limit: Limit::Level("proven".to_string(), total.cycles * 1e3),
            largest: outcome.worst.cycles * 1e3,
        });
    }
    let mut bars = vec![
        ("this oscillator, seen".to_string(), outcome.worst.hertz, SEEN),
        ("this oscillator, proven".to_string(), total.hertz, BOUND),
    ];
    bars.extend(alternatives.iter().map(|row| (row.name.to_string(), row.worst_hz, OTHER)));
    Picture { heading: heading.to_vec(), span: outcome.span, panels, bars }
}

/// Of a rehearsal by estimates.
pub fn of_estimates(heading: &[String], followed: &Followed) -> Picture {
    let [median, _] = followed.stated_hertz;
    let (unit, scale) = unit_of(median);
    // A long gap would squeeze everything else: the panel ends at 25 medians.
    let most = (25.0 * median).min(followed.worst_hertz.max(2.0 * median)) * scale;
    let error = Panel {
        title: format!(
            "Frequency error: worst {}, rms {}; not proven, the stated band holds in about 95 %",
            report::hertz(followed.worst_hertz),
            report::hertz(followed.rms_hertz)
        ),
        unit,
        seen: band(&followed.columns, |column| column.hertz, scale),
        limit: Limit::Band("stated".to_string(), band(&followed.columns, |column| column.cycles, scale)),
        largest: most,
    };
    Picture {
        heading: heading.to_vec(),
        span: followed.span,
        panels: vec![shift_panel(&followed.columns), error],
        bars: Vec::new(),
    }
}

/// Draws into an SVG file.
///
/// # Errors
/// When the file cannot be written.
pub fn draw(path: &Path, picture: &Picture) -> anyhow::Result<()> {
    let (width, height) = (WIDTH, HEADING + PANEL * picture.panels.len() as u32 + picture.bars_height() + 40);
    let mut svg = String::new();
    {
        let root = SVGBackend::with_string(&mut svg, (width * FINER, height * FINER)).into_drawing_area();
        picture.paint(&root).map_err(|error| anyhow!("the picture cannot be drawn: {error}"))?;
    }
    let drawn = format!("width=\"{}\" height=\"{}\"", width * FINER, height * FINER);
    let shown = format!("width=\"{width}\" height=\"{height}\"");
    let svg = svg.replacen(&drawn, &shown, 1);
    crate::commands::bake::write_whole(path, svg.as_bytes())
}

/// A length of the shown picture in the drawing's pixels.
fn px(length: f64) -> i32 {
    (length * f64::from(FINER)) as i32
}

fn font(size: f64, colour: RGBColor) -> TextStyle<'static> {
    ("sans-serif", size * f64::from(FINER)).into_font().color(&colour)
}

impl Picture {
    fn paint(&self, root: &Area<'_>) -> Drawn {
        root.fill(&WHITE)?;
        let (top, rest) = root.split_vertically(px(f64::from(HEADING)));
        for (line, text) in self.heading.iter().enumerate() {
            let style = if line == 0 { font(18.0, INK) } else { font(12.0, QUIET) };
            let below = if line == 0 { 12.0 } else { 22.0 + 15.0 * line as f64 };
            top.draw_text(text.trim(), &style, (px(20.0), px(below)))?;
        }
        let mut rest = rest.margin(0, px(10.0), px(10.0), px(20.0));
        let last = self.panels.len() - 1;
        for (at, panel) in self.panels.iter().enumerate() {
            let names_time = at == last;
            let (area, below) = rest.split_vertically(px(f64::from(PANEL + if names_time { 18 } else { 0 })));
            panel.paint(&area, self.span, names_time)?;
            rest = below;
        }
        if !self.bars.is_empty() {
            self.paint_bars(&rest)?;
        }
        root.present()?;
        Ok(())
    }

    fn bars_height(&self) -> u32 {
        if self.bars.is_empty() { 0 } else { 78 + BAR * self.bars.len() as u32 }
    }

    /// Worst errors on a logarithmic scale.
    fn paint_bars(&self, area: &Area<'_>) -> Drawn {
        let sizes = self.bars.iter().map(|(_, hertz, _)| hertz.max(1e-9));
        let least = sizes.clone().fold(f64::INFINITY, f64::min);
        let most = sizes.fold(0.0, f64::max);
        let (from, to) = (10f64.powf((least / 2.0).log10().floor()), 10f64.powf((most * 3.0).log10().ceil()));
        area.draw_text(
            "Worst frequency error, and what others would make of this pass",
            &font(13.0, INK),
            (px(66.0), px(10.0)),
        )?;
        let count = self.bars.len() as f64;
        let mut chart = ChartBuilder::on(area)
            .margin_top(px(30.0))
            .margin_right(px(58.0))
            .margin_bottom(px(4.0))
            .x_label_area_size(px(38.0))
            .y_label_area_size(px(330.0))
            .build_cartesian_2d((from..to).log_scale(), 0.0..count)?;
        let decade = |hertz: &f64| {
            let (number, unit) = if *hertz < 0.1 { (hertz * 1e3, "mHz") } else { (*hertz, "Hz") };
            format!("{} {unit}", (number * 1e6).round() / 1e6)
        };
        chart
            .configure_mesh()
            .disable_y_mesh()
            .disable_y_axis()
            .light_line_style(TRANSPARENT)
            .bold_line_style(FAINT.stroke_width(FINER))
            .axis_style(QUIET.stroke_width(FINER))
            .label_style(font(11.5, INK))
            .axis_desc_style(font(12.0, INK))
            .set_all_tick_mark_size(px(4.0))
            .x_labels(8)
            .x_label_formatter(&decade)
            .x_desc("largest difference from the reference")
            .draw()?;
        for (at, (name, hertz, colour)) in self.bars.iter().enumerate() {
            let middle = count - at as f64 - 0.5;
            let bar = [(from, middle - 0.28), (hertz.max(from), middle + 0.28)];
            chart.draw_series([Rectangle::new(bar, colour.filled())])?;
            let right = font(11.5, INK).pos(Pos::new(HPos::Left, VPos::Center));
            let beside = hertz.max(from) * (to / from).powf(0.012);
            chart.plotting_area().draw(&Text::new(report::hertz(*hertz), (beside, middle), right))?;
            let place = chart.backend_coord(&(from, middle));
            let left = font(11.5, INK).pos(Pos::new(HPos::Right, VPos::Center));
            let corner = area.get_pixel_range();
            let inside = (place.0 - corner.0.start - px(8.0), place.1 - corner.1.start);
            area.draw_text(name, &left, inside)?;
        }
        Ok(())
    }
}

impl Panel {
    fn reach(&self) -> f64 {
        let limit = if let Limit::Level(_, level) = &self.limit { *level } else { 0.0 };
        limit.max(self.largest) * 1.2
    }

    fn paint(&self, area: &Area<'_>, span: (f64, f64), names_time: bool) -> Drawn {
        let reach = self.reach();
        let length = span.1 - span.0;
        area.draw_text(&self.title, &font(13.0, INK), (px(66.0), px(10.0)))?;
        let mut chart = ChartBuilder::on(area)
            .margin_top(px(30.0))
            .margin_right(px(58.0))
            .x_label_area_size(px(if names_time { 38.0 } else { 20.0 }))
            .y_label_area_size(px(66.0))
            .build_cartesian_2d(0.0..length, -reach..reach)?;
        let time_text = |seconds: &f64| format!("{seconds:.0}");
        let value_text = |value: &f64| signed(*value, reach);
        let mut mesh = chart.configure_mesh();
        mesh.light_line_style(TRANSPARENT)
            .bold_line_style(FAINT.stroke_width(FINER))
            .axis_style(QUIET.stroke_width(FINER))
            .label_style(font(11.5, INK))
            .axis_desc_style(font(12.0, INK))
            .set_all_tick_mark_size(px(4.0))
            .y_desc(self.unit)
            .y_labels(7)
            .x_labels(10)
            .x_label_formatter(&time_text)
            .y_label_formatter(&value_text);
        if names_time {
            mesh.x_desc("seconds after the start");
        }
        mesh.draw()?;
        self.paint_inside(&mut chart, span)
    }

    fn paint_inside(&self, chart: &mut Chart<'_, '_>, span: (f64, f64)) -> Drawn {
        let (reach, length) = (self.reach(), span.1 - span.0);
        let inside = |value: f64| value.clamp(-reach, reach);
        let outline = |band: &[(f64, [f64; 2])]| {
            let upper = band.iter().map(|(time, [_, most])| (time - span.0, inside(*most)));
            let lower = band.iter().rev().map(|(time, [least, _])| (time - span.0, inside(*least)));
            upper.chain(lower).collect::<Vec<_>>()
        };
        let beside = |text: &str, value: f64| {
            let style = font(11.5, BOUND).pos(Pos::new(HPos::Left, VPos::Center));
            Text::new(text.to_string(), (length * 1.013, inside(value)), style)
        };
        match &self.limit {
            Limit::None => {
                let curve = self.seen.iter().map(|(time, [value, _])| (time - span.0, *value));
                chart.draw_series(LineSeries::new(curve, SEEN.stroke_width(2 * FINER)))?;
                return Ok(());
            }
            Limit::Level(name, level) => {
                for side in [*level, -level] {
                    let line = [(0.0, side), (length, side)];
                    let style = BOUND.stroke_width(FINER * 3 / 2);
                    chart.draw_series(DashedLineSeries::new(line, 7 * FINER, 5 * FINER, style))?;
                    chart.plotting_area().draw(&beside(name, side))?;
                }
            }
            Limit::Band(name, band) => {
                chart.draw_series([Polygon::new(outline(band), BOUND.mix(0.22).filled())])?;
                let last = band.last().map_or(0.0, |(_, [_, most])| *most);
                chart.plotting_area().draw(&beside(name, last))?;
            }
        }
        let shape = outline(&self.seen);
        chart.draw_series([Polygon::new(shape.clone(), SEEN.mix(0.45).filled())])?;
        chart.draw_series(LineSeries::new(shape, SEEN.stroke_width(FINER)))?;
        Ok(())
    }
}

/// A number of an axis, with its sign and the digits that the axis needs.
fn signed(value: f64, reach: f64) -> String {
    let digits = (1.0 - (reach / 2.0).log10().floor()).clamp(0.0, 6.0) as usize;
    let text = format!("{value:+.digits$}");
    if text.trim_matches(['+', '-', '0', '.']).is_empty() { "0".to_string() } else { text }
}
