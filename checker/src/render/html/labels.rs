//! Where the names of lines and marks stand in a drawing.
//! Must not know what they name.

use std::fmt::{self, Write};

use crate::render::escape::xml as plain;

/// Size of a letter, for laying out labels.
const LETTER: (f64, f64) = (6.6, 14.0);

/// Puts names where they cover neither lines nor each other.
pub(super) struct Labels {
    frame: (f64, f64, f64, f64),
    taken: Vec<(f64, f64, f64, f64)>,
    points: Vec<(f64, f64)>,
}

impl Labels {
    pub(super) fn new(frame: (f64, f64, f64, f64)) -> Self {
        Self {
            frame,
            taken: Vec::new(),
            points: Vec::new(),
        }
    }

    pub(super) fn avoid(&mut self, points: &[(f64, f64)]) {
        self.points.extend(between(points));
    }

    pub(super) fn avoid_around(&mut self, x: f64, y: f64) {
        self.taken.push((x - 10.0, y - 10.0, x + 10.0, y + 10.0));
    }

    /// Write a name beside the best of some places.
    pub(super) fn write(
        &mut self,
        out: &mut String,
        text: &str,
        near: &[(f64, f64)],
        class: &str,
    ) -> fmt::Result {
        if text.is_empty() {
            return Ok(());
        }
        let (width, height) = (text.chars().count() as f64 * LETTER.0, LETTER.1);
        let mut best: Option<(f64, (f64, f64))> = None;
        for (x, y) in near {
            for (dx, dy) in [
                (12.0, -4.0 - height),
                (12.0, 4.0),
                (-12.0 - width, -4.0 - height),
                (-12.0 - width, 4.0),
                (14.0, -height / 2.0),
                (-14.0 - width, -height / 2.0),
                (-width / 2.0, -14.0 - height),
                (-width / 2.0, 14.0),
            ] {
                let at = (x + dx, y + dy);
                let cost = self.cost((at.0, at.1, at.0 + width, at.1 + height));
                if best.is_none_or(|b| cost < b.0) {
                    best = Some((cost, at));
                }
            }
        }
        let Some((_, (x, y))) = best else {
            return Ok(());
        };
        self.taken
            .push((x - 2.0, y - 1.0, x + width + 2.0, y + height + 1.0));
        writeln!(
            out,
            "<text class=\"name {class}\" x=\"{x:.1}\" y=\"{:.1}\">{}</text>",
            y + height - 3.0,
            plain(text)
        )
    }

    /// What a box would cover: other names and what leaves the frame cost most.
    fn cost(&self, b: (f64, f64, f64, f64)) -> f64 {
        let overlap = |o: &(f64, f64, f64, f64)| {
            (b.2.min(o.2) - b.0.max(o.0)).max(0.0) * (b.3.min(o.3) - b.1.max(o.1)).max(0.0)
        };
        let inside = overlap(&self.frame);
        let outside = (b.2 - b.0) * (b.3 - b.1) - inside;
        let named: f64 = self.taken.iter().map(overlap).sum();
        let lines = self
            .points
            .iter()
            .filter(|p| (b.0..=b.2).contains(&p.0) && (b.1..=b.3).contains(&p.1));
        50.0 * outside + 20.0 * named + 10.0 * lines.count() as f64
    }
}

/// Points along a line, close enough together that one of them is near any good place for its name.
pub(super) fn between(points: &[(f64, f64)]) -> Vec<(f64, f64)> {
    let mut out = Vec::new();
    for pair in points.windows(2) {
        if let [a, b] = pair {
            let steps = (((b.0 - a.0).abs() + (b.1 - a.1).abs()) / 12.0)
                .ceil()
                .clamp(1.0, 60.0);
            for k in 0..steps as u32 {
                let share = f64::from(k) / steps;
                out.push((a.0 + (b.0 - a.0) * share, a.1 + (b.1 - a.1) * share));
            }
        }
    }
    out.extend(points.last());
    out
}
