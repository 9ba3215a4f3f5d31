//! The picture: shift, and errors of frequency and phase with their bounds, over time.

use super::{Column, Outcome, report};
use anyhow::anyhow;
use plotters::coord::Shift;
use plotters::prelude::*;
use std::path::Path;

const SIZE: (u32, u32) = (960, 900);
/// Ink and its lighter companions; the two colours keep apart for any kind of colour vision (Okabe and Ito).
const INK: RGBColor = RGBColor(38, 42, 48);
const FAINT: RGBColor = RGBColor(224, 226, 230);
const SEEN: RGBColor = RGBColor(0, 114, 178);
const BOUND: RGBColor = RGBColor(213, 94, 0);

type Area<'a> = DrawingArea<SVGBackend<'a>, Shift>;

/// One panel: a curve or a band of least and largest, and a bound to both sides.
struct Panel<'a> {
    title: String,
    unit: &'a str,
    band: Vec<(f64, [f64; 2])>,
    bound: Option<f64>,
    largest: f64,
}

/// Draws into an SVG file.
///
/// # Errors
/// When the file cannot be written.
pub fn draw(path: &Path, heading: &str, outcome: &Outcome) -> anyhow::Result<()> {
    let mut svg = String::new();
    {
        let root = SVGBackend::with_string(&mut svg, SIZE).into_drawing_area();
        paint(&root, heading, outcome).map_err(|error| anyhow!("the picture cannot be drawn: {error}"))?;
    }
    std::fs::write(path, svg).map_err(|error| anyhow!("{} cannot be written: {error}", path.display()))
}

fn paint(root: &Area<'_>, heading: &str, outcome: &Outcome) -> Result<(), Box<dyn std::error::Error>> {
    root.fill(&WHITE)?;
    let root = root.margin(14, 10, 12, 18);
    let (top, rest) = root.split_vertically(34);
    top.draw_text(heading, &("sans-serif", 19).into_font().color(&INK).into_text_style(&root), (6, 4))?;
    let total = outcome.proven.total();
    let band = |pick: fn(&Column) -> [f64; 2], scale: f64| {
        outcome.columns.iter().map(|column| (column.time, pick(column).map(|value| value * scale))).collect::<Vec<_>>()
    };
    let shift = |column: &Column| [column.shift, column.shift];
    let mut panels = vec![
        Panel {
            title: "Shift of the carrier".to_string(),
            unit: "kHz",
            band: band(shift, 1e-3),
            bound: None,
            largest: outcome.columns.iter().fold(0.0, |most, column| column.shift.abs().max(most)) * 1e-3,
        },
        Panel {
            title: format!(
                "Frequency error: worst {} of {} proven",
                report::hertz(outcome.worst.hertz),
                report::hertz(total.hertz)
            ),
            unit: "mHz",
            band: band(|column| column.hertz, 1e3),
            bound: Some(total.hertz * 1e3),
            largest: outcome.worst.hertz * 1e3,
        },
    ];
    if total.cycles.is_finite() {
        panels.push(Panel {
            title: format!(
                "Phase error: worst {:.4} of {:.4} cycle proven",
                outcome.worst.cycles, total.cycles
            ),
            unit: "millicycles",
            band: band(|column| column.cycles, 1e3),
            bound: Some(total.cycles * 1e3),
            largest: outcome.worst.cycles * 1e3,
        });
    }
    let areas = rest.split_evenly((panels.len(), 1));
    let last = panels.len() - 1;
    for (at, (panel, area)) in panels.iter().zip(&areas).enumerate() {
        panel.paint(area, outcome.span, at == last)?;
    }
    root.present()?;
    Ok(())
}

impl Panel<'_> {
    fn paint(
        &self,
        area: &Area<'_>,
        span: (f64, f64),
        names_time: bool,
    ) -> Result<(), Box<dyn std::error::Error>> {
        let reach = self.bound.unwrap_or(0.0).max(self.largest) * 1.15;
        let from = 0.0;
        let to = span.1 - span.0;
        let mut chart = ChartBuilder::on(area)
            .caption(&self.title, ("sans-serif", 15).into_font().color(&INK))
            .x_label_area_size(if names_time { 44 } else { 24 })
            .y_label_area_size(72)
            .margin_bottom(6)
            .build_cartesian_2d(from..to, -reach..reach)?;
        let label = ("sans-serif", 13).into_font().color(&INK);
        let time_text = |seconds: &f64| format!("{seconds:.0}");
        let value_text = |value: &f64| signed(*value, reach);
        let mut mesh = chart.configure_mesh();
        mesh.light_line_style(TRANSPARENT)
            .bold_line_style(FAINT)
            .axis_style(INK)
            .label_style(label.clone())
            .axis_desc_style(label)
            .y_desc(self.unit)
            .y_labels(7)
            .x_labels(10)
            .x_label_formatter(&time_text)
            .y_label_formatter(&value_text);
        if names_time {
            mesh.x_desc("seconds from the start of the table");
        }
        mesh.draw()?;
        let place = |time: f64| time - span.0;
        let upper = self.band.iter().map(|(time, [_, most])| (place(*time), *most));
        let lower = self.band.iter().rev().map(|(time, [least, _])| (place(*time), *least));
        if self.bound.is_some() {
            let outline: Vec<(f64, f64)> = upper.chain(lower).collect();
            chart.draw_series(std::iter::once(Polygon::new(outline.clone(), SEEN.mix(0.35).filled())))?;
            chart.draw_series(LineSeries::new(outline, SEEN.stroke_width(1)))?;
        } else {
            chart.draw_series(LineSeries::new(upper, SEEN.stroke_width(2)))?;
        }
        if let Some(bound) = self.bound {
            for side in [bound, -bound] {
                chart.draw_series(DashedLineSeries::new([(from, side), (to, side)], 7, 5, BOUND.stroke_width(2)))?;
            }
        }
        Ok(())
    }
}

/// A number of an axis, with its sign and the digits that the axis needs.
fn signed(value: f64, reach: f64) -> String {
    let digits = (1.0 - (reach / 4.0).log10().floor()).clamp(0.0, 6.0) as usize;
    let text = format!("{value:+.digits$}");
    if text.trim_matches(['+', '-', '0', '.']).is_empty() { "0".to_string() } else { text }
}
