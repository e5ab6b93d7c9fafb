//! A picture as an inline drawing: no script, colours and dashes from the page's style.
//! Must not know what the numbers mean.

use std::fmt::{self, Write};

use crate::curves::{Axis, Line, Mark, Panel, Picture, Role};
use crate::render::escape::xml as plain;
use crate::render::figure::{figure, number};

use super::labels::{Labels, between};
use super::scale::{Scale, Tick, range};

/// Width of a drawing in its own units; on a phone it is drawn at three quarters of this.
pub(super) const WIDTH: f64 = 480.0;
const LEFT: f64 = 46.0;
pub(super) const RIGHT: f64 = 12.0;
pub(super) const TOP: f64 = 24.0;
pub(super) const BOTTOM: f64 = 38.0;
/// Height of the first panel, and of those below it.
const HEIGHTS: [f64; 2] = [290.0, 130.0];
/// Decades of a logarithmic axis at most: currents begin at zero.
const DECADES: f64 = 1000.0;
/// Looks of lines that stand for loads or mains levels, told apart by dashes as well as by colour.
pub(super) const LOOKS: usize = 6;
/// Longest label that is written beside its line; a longer one is cut, the key says all of it.
const LABEL: usize = 28;

/// The drawing, with `title` and `words` for those who cannot see it; `id` is unique on the page.
pub(super) fn draw(
    out: &mut String,
    picture: &Picture,
    id: &str,
    title: &str,
    words: &str,
) -> fmt::Result {
    let laid: Vec<_> = picture.panels.iter().filter_map(Layout::new).collect();
    let heights = |at: usize| HEIGHTS.get(at).copied().unwrap_or(130.0);
    let height: f64 = (0..laid.len()).map(|at| TOP + heights(at) + BOTTOM).sum();
    open(out, id, height, title, words)?;
    let mut top = 0.0;
    for (at, (panel, layout)) in picture.panels.iter().zip(&laid).enumerate() {
        layout.at(top + TOP, heights(at)).draw(out, panel)?;
        top += TOP + heights(at) + BOTTOM;
    }
    out.write_str("</svg>\n")
}

/// The head of a drawing.
pub(super) fn open(
    out: &mut String,
    id: &str,
    height: f64,
    title: &str,
    words: &str,
) -> fmt::Result {
    writeln!(
        out,
        "<svg class=\"plot\" viewBox=\"0 0 {WIDTH} {height}\" role=\"img\" aria-labelledby=\"{id}-t {id}-d\">\n<title id=\"{id}-t\">{}</title>\n<desc id=\"{id}-d\">{}</desc>",
        plain(title),
        plain(words)
    )
}

/// The class of a line: its role, and which of several it is.
pub(super) fn class(lines: &[Line], at: usize) -> String {
    let Some(line) = lines.get(at) else {
        return String::new();
    };
    let same = lines.iter().take(at).filter(|l| l.role == line.role);
    match line.role {
        Role::Locus | Role::Plain => format!("l c{}", same.count() % LOOKS),
        role => format!("l {}", role.name()),
    }
}

/// The ranges of the axes of a panel.
struct Layout {
    x: (f64, f64, bool),
    y: (f64, f64, bool),
}

impl Layout {
    /// `None` where there is nothing to draw.
    fn new(panel: &Panel) -> Option<Self> {
        let lines = panel.lines.iter().flat_map(|l| l.points.iter().copied());
        let points: Vec<(f64, f64)> = lines
            .chain(panel.marks.iter().map(|m| (m.x, m.y)))
            .collect();
        Some(Self {
            x: of(&panel.x, points.iter().map(|p| p.0))?,
            y: of(&panel.y, points.iter().map(|p| p.1))?,
        })
    }

    fn at(&self, top: f64, height: f64) -> Frame {
        let scale = |(from, to, log): (f64, f64, bool), ends| Scale::new(from, to, log, ends);
        Frame {
            x: scale(self.x, (LEFT, WIDTH - RIGHT)),
            y: scale(self.y, (top + height, top)),
            top,
            height,
        }
    }
}

fn of(axis: &Axis, values: impl Iterator<Item = f64> + Clone) -> Option<(f64, f64, bool)> {
    let some = values.clone().filter(|v| v.is_finite());
    let high = some.clone().fold(f64::NEG_INFINITY, f64::max);
    let mut low = some.fold(f64::INFINITY, f64::min);
    if axis.log {
        low = low.max(high / DECADES);
        // an impedance that is flat still needs an axis
        low = low.min(high / 3.0);
    }
    let (from, to) = range(low, high, axis.log)?;
    Some((from, to, axis.log))
}

/// A panel on paper.
struct Frame {
    x: Option<Scale>,
    y: Option<Scale>,
    top: f64,
    height: f64,
}

impl Frame {
    fn draw(&self, out: &mut String, panel: &Panel) -> fmt::Result {
        let (Some(x), Some(y)) = (self.x, self.y) else {
            return Ok(());
        };
        let bottom = self.top + self.height;
        grid(out, &x.ticks(), &y.ticks(), (&x, &y), (self.top, bottom))?;
        self.names(out, panel)?;
        // a drawing in a drawing cuts off what lies outside the axes
        let (width, height) = (WIDTH - LEFT - RIGHT, self.height);
        writeln!(
            out,
            "<svg x=\"{LEFT}\" y=\"{}\" width=\"{width}\" height=\"{height}\" viewBox=\"{LEFT} {} {width} {height}\">",
            self.top, self.top
        )?;
        let on_paper = |points: &[(f64, f64)]| -> Vec<(f64, f64)> {
            points
                .iter()
                .filter(|p| p.0.is_finite() && p.1.is_finite())
                .map(|p| (x.place(p.0), y.place(p.1)))
                .collect()
        };
        let marks = || {
            panel
                .marks
                .iter()
                .filter(|m| m.x.is_finite() && m.y.is_finite())
        };
        let mut labels = Labels::new((LEFT, self.top, WIDTH - RIGHT, bottom));
        for (at, line) in panel.lines.iter().enumerate() {
            let points = on_paper(&line.points);
            path(out, &class(&panel.lines, at), &points)?;
            labels.avoid(&points);
        }
        for mark in marks() {
            sign(out, mark.role, x.place(mark.x), y.place(mark.y))?;
        }
        out.write_str("</svg>\n")?;
        for mark in marks() {
            labels.avoid_around(x.place(mark.x), y.place(mark.y));
        }
        for mark in marks() {
            let near = [(x.place(mark.x), y.place(mark.y))];
            labels.write(out, &marked(mark), &near, "")?;
        }
        for (at, line) in panel.lines.iter().enumerate() {
            let inside: Vec<_> = line
                .points
                .iter()
                .copied()
                .filter(|p| x.holds(p.0) && y.holds(p.1))
                .collect();
            let colour = class(&panel.lines, at).replace("l ", "t ");
            labels.write(
                out,
                &named(panel, line),
                &between(&on_paper(&inside)),
                &colour,
            )?;
        }
        Ok(())
    }

    fn names(&self, out: &mut String, panel: &Panel) -> fmt::Result {
        let bottom = self.top + self.height;
        writeln!(
            out,
            "<text class=\"axis\" x=\"{LEFT}\" y=\"{:.1}\">{}</text>\n<text class=\"axis end\" x=\"{:.1}\" y=\"{:.1}\">{}</text>",
            self.top - 9.0,
            plain(&axis_name(&panel.y)),
            WIDTH - RIGHT,
            bottom + 32.0,
            plain(&axis_name(&panel.x))
        )
    }
}

/// `current, A`.
pub(super) fn axis_name(axis: &Axis) -> String {
    let unit = if axis.unit == "degC" {
        "°C"
    } else {
        axis.unit
    };
    if unit.is_empty() {
        axis.name.to_owned()
    } else {
        format!("{}, {unit}", axis.name)
    }
}

fn grid(
    out: &mut String,
    across: &[Tick],
    up: &[Tick],
    (x, y): (&Scale, &Scale),
    (top, bottom): (f64, f64),
) -> fmt::Result {
    let right = WIDTH - RIGHT;
    let class = |tick: &Tick| if tick.named { "g" } else { "g minor" };
    for tick in across {
        let at = x.place(tick.value);
        writeln!(
            out,
            "<path class=\"{}\" d=\"M{at:.1} {top:.1}V{bottom:.1}\"/>",
            class(tick)
        )?;
        if tick.named {
            let text = short(tick.value);
            writeln!(
                out,
                "<text class=\"tick mid\" x=\"{at:.1}\" y=\"{:.1}\">{text}</text>",
                bottom + 15.0
            )?;
        }
    }
    for tick in up {
        let at = y.place(tick.value);
        writeln!(
            out,
            "<path class=\"{}\" d=\"M{LEFT} {at:.1}H{right}\"/>",
            class(tick)
        )?;
        if tick.named {
            let text = short(tick.value);
            writeln!(
                out,
                "<text class=\"tick end\" x=\"{:.1}\" y=\"{:.1}\">{text}</text>",
                LEFT - 5.0,
                at + 4.0
            )?;
        }
    }
    writeln!(
        out,
        "<path class=\"frame\" d=\"M{LEFT} {top:.1}V{bottom:.1}H{right}\"/>"
    )
}

/// `20k` for 20 000.
fn short(value: f64) -> String {
    if value.abs() >= 1000.0 {
        format!("{}k", number(value / 1000.0))
    } else {
        number(value)
    }
}

/// A line through places.
fn path(out: &mut String, class: &str, points: &[(f64, f64)]) -> fmt::Result {
    write!(out, "<path class=\"{class}\" d=\"")?;
    for (at, (x, y)) in points.iter().enumerate() {
        write!(out, "{}{x:.1} {y:.1}", if at == 0 { 'M' } else { 'L' })?;
    }
    out.write_str("\"/>\n")
}

/// The worst point is a ring with a cross, another a dot.
fn sign(out: &mut String, role: Role, x: f64, y: f64) -> fmt::Result {
    match role {
        Role::Worst => writeln!(
            out,
            "<circle class=\"ring\" cx=\"{x:.1}\" cy=\"{y:.1}\" r=\"6\"/><path class=\"cross\" d=\"M{:.1} {y:.1}h20M{x:.1} {:.1}v20\"/>",
            x - 10.0,
            y - 10.0
        ),
        _ => writeln!(
            out,
            "<circle class=\"dot\" cx=\"{x:.1}\" cy=\"{y:.1}\" r=\"3.5\"/>"
        ),
    }
}

/// What stands beside a mark.
fn marked(mark: &Mark) -> String {
    let value = mark
        .value
        .map(|v| figure(v).replace("degC", "°C").replace(" deg", "°"));
    match (mark.label.as_str(), value) {
        ("", _) => String::new(),
        (label, Some(value)) => format!("{} {value}", cut(label)),
        (label, None) => cut(label),
    }
}

/// What stands beside a line; nothing where it is the only one of its kind, or a mark already says it.
fn named(panel: &Panel, line: &Line) -> String {
    let alike = panel.lines.iter().filter(|l| l.role == line.role).count();
    let which = |name: &str| match (alike, line.label.as_str()) {
        (1, _) | (_, "") => name.to_owned(),
        (_, label) => cut(&format!("{name}, {label}")),
    };
    match line.role {
        Role::Stated => "stated, 25 °C".to_owned(),
        Role::Derated => which("derated"),
        Role::Allowed => which("allowed"),
        Role::Limit => which("limit line"),
        Role::Plain if alike == 1 && panel.lines.len() != 2 => String::new(),
        _ if panel.marks.iter().any(|m| m.label == line.label) => String::new(),
        _ => cut(&line.label),
    }
}

/// A label short enough to stand in a drawing.
pub(super) fn cut(label: &str) -> String {
    if label.chars().count() <= LABEL {
        return label.to_owned();
    }
    let head: String = label.chars().take(LABEL - 1).collect();
    format!("{head}…")
}
