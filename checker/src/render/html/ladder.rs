//! The temperature ladder as an inline drawing: a row for each step from the air to the junction.
//! Must not know how a temperature was had.

use std::fmt::{self, Write};

use crate::curves::Picture;
use crate::render::escape::xml as plain;
use crate::render::figure::number;

use super::plot::{BOTTOM, WIDTH, axis_name, open};
use super::scale::{Scale, step};

const ROW: f64 = 34.0;
const TOP: f64 = 6.0;
/// Where the bars begin, right of names and figures.
const LEFT: f64 = 196.0;
const RIGHT: f64 = 18.0;

/// A bar from the temperature before to its own, a row each, with what is allowed of it.
pub(super) fn draw(
    out: &mut String,
    picture: &Picture,
    id: &str,
    title: &str,
    words: &str,
) -> fmt::Result {
    let Some(panel) = picture.panels.first() else {
        return Ok(());
    };
    let all = panel
        .lines
        .iter()
        .flat_map(|l| l.points.iter().map(|p| p.0));
    let all = all.chain(panel.marks.iter().map(|m| m.x));
    let (low, high) = all.fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), t| {
        (l.min(t), h.max(t))
    });
    let tick = step((high - low).max(1.0), 5.0);
    let (from, to) = ((low / tick).floor() * tick, (high / tick).ceil() * tick);
    let ends = (LEFT, WIDTH - RIGHT);
    let Some(x) = Scale::new(from, to, false, ends) else {
        return Ok(());
    };
    let bottom = TOP + panel.lines.len() as f64 * ROW;
    open(out, id, bottom + BOTTOM, title, words)?;
    for tick in x.ticks() {
        let at = x.place(tick.value);
        writeln!(
            out,
            "<path class=\"g\" d=\"M{at:.1} {TOP}V{bottom}\"/>\n<text class=\"tick mid\" x=\"{at:.1}\" y=\"{:.1}\">{}</text>",
            bottom + 15.0,
            number(tick.value)
        )?;
    }
    let mut top = TOP;
    for (row, line) in panel.lines.iter().enumerate() {
        let (Some(from), Some(to)) = (line.points.first(), line.points.last()) else {
            continue;
        };
        let base = top + 21.0;
        writeln!(
            out,
            "<text class=\"tick end\" x=\"{:.1}\" y=\"{base:.1}\">{}</text>\n<text class=\"name end\" x=\"{:.1}\" y=\"{base:.1}\">{} °C</text>",
            LEFT - 72.0,
            plain(&line.label),
            LEFT - 10.0,
            number(to.0)
        )?;
        let (a, b) = (x.place(from.0.min(to.0)), x.place(from.0.max(to.0)));
        writeln!(
            out,
            "<rect class=\"bar\" x=\"{a:.1}\" y=\"{:.1}\" width=\"{:.1}\" height=\"20\"/>",
            top + 7.0,
            (b - a).max(2.0)
        )?;
        for mark in panel
            .marks
            .iter()
            .filter(|m| (m.y - row as f64).abs() < 0.5)
        {
            let (at, role) = (x.place(mark.x), mark.role.name());
            writeln!(
                out,
                "<path class=\"l {role}\" d=\"M{at:.1} {:.1}v30\"/>",
                top + 2.0
            )?;
        }
        top += ROW;
    }
    writeln!(
        out,
        "<text class=\"axis end\" x=\"{:.1}\" y=\"{:.1}\">{}</text>\n</svg>",
        ends.1,
        bottom + 32.0,
        plain(&axis_name(&panel.x))
    )
}
