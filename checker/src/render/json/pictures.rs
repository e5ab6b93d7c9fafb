//! The points of the pictures as JSON.
//! Must not know anything that the picture does not say.

use crate::curves;

use super::form::{self, Number};
use super::{qty, some};

pub(super) fn picture(p: &curves::Picture) -> form::Picture {
    form::Picture {
        facts: p.facts.iter().map(fact).collect(),
        kind: p.kind.name().to_owned(),
        of: p.of.clone(),
        panels: p.panels.iter().map(panel).collect(),
        region: some(&p.region),
    }
}

fn fact(f: &curves::Fact) -> form::Fact {
    form::Fact {
        name: f.name.to_owned(),
        of: some(&f.of),
        value: qty(f.value),
    }
}

fn panel(p: &curves::Panel) -> form::Panel {
    let axis = |a: &curves::Axis| form::Axis {
        log: a.log,
        name: a.name.to_owned(),
        unit: a.unit.to_owned(),
    };
    let line = |l: &curves::Line| form::Line {
        label: l.label.clone(),
        points: l
            .points
            .iter()
            .map(|(x, y)| [Number(*x), Number(*y)])
            .collect(),
        role: l.role.name().to_owned(),
    };
    let mark = |m: &curves::Mark| form::Mark {
        label: m.label.clone(),
        role: m.role.name().to_owned(),
        value: m.value.map(qty),
        x: Number(m.x),
        y: Number(m.y),
    };
    form::Panel {
        lines: p.lines.iter().map(line).collect(),
        marks: p.marks.iter().map(mark).collect(),
        x: axis(&p.x),
        y: axis(&p.y),
    }
}
