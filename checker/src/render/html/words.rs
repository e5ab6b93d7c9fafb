//! The title, the sentence and the key of each picture.
//! Must not know how a picture is drawn.

use crate::curves::{Kind, Line, Mark, Picture, Role};
use crate::finding::Measure;
use crate::render::figure::{figure, number, percent};

/// A heading: what the picture shows, and of what.
pub(super) fn title(picture: &Picture) -> String {
    let of = picture.of.join(" and ");
    let what = match picture.kind {
        Kind::SafeArea => format!("Safe area of {of}"),
        Kind::Limiter => format!("Limit line against loads and safe area of {of}"),
        Kind::Impedance => format!("Impedance of {of}"),
        Kind::Rail => "Rail against current".to_owned(),
        Kind::Ripple => "Rail over one cycle of the mains".to_owned(),
        Kind::Heat => "Heat of one channel against its output".to_owned(),
        Kind::Ladder => format!("From the air to the junction of {of}"),
    };
    if picture.region.is_empty() {
        what
    } else {
        format!("{what}, {} mains", picture.region)
    }
}

/// What there is to see, in words.
pub(super) fn caption(picture: &Picture) -> String {
    match picture.kind {
        Kind::SafeArea => safe_area(picture),
        Kind::Limiter => limiter(picture),
        Kind::Impedance => impedance(picture),
        Kind::Rail => rail(picture),
        Kind::Ripple => ripple(picture),
        Kind::Heat => heat(picture),
        Kind::Ladder => ladder(picture),
    }
}

fn said(picture: &Picture, name: &str) -> String {
    picture.fact(name).map(shown).unwrap_or_default()
}

fn shown(m: Measure) -> String {
    figure(m).replace("degC", "°C").replace(" deg", "°")
}

fn marks(picture: &Picture, role: Role) -> impl Iterator<Item = &Mark> {
    picture
        .panels
        .iter()
        .flat_map(|p| &p.marks)
        .filter(move |m| m.role == role)
}

/// The mark with the greatest figure.
fn greatest<'p>(all: impl Iterator<Item = &'p Mark>) -> Option<&'p Mark> {
    let value = |m: &Mark| m.value.map_or(f64::NEG_INFINITY, |v| v.value);
    all.max_by(|a, b| value(a).total_cmp(&value(b)))
}

fn safe_area(p: &Picture) -> String {
    let mut text = format!(
        "Each loop is the most loaded device over half a period at full drive into one load, unsagged rail at {} mains, at the frequency that is worst for it. It must stay below the line marked allowed, {} of the curve derated to the case at the duty in the hottest room.",
        said(p, "mains"),
        said(p, "allowed")
    );
    if let Some(worst) = greatest(marks(p, Role::Worst)) {
        let used = worst.value.map(|v| percent(v.value)).unwrap_or_default();
        let (v, i) = (Measure::new(worst.x, "V"), Measure::new(worst.y, "A"));
        text.push_str(&format!(
            " The nearest is {}: {used} of the allowance used at {} and {}.",
            worst.label,
            figure(v),
            figure(i)
        ));
    }
    text
}

fn limiter(p: &Picture) -> String {
    let mut text = format!(
        "The limiter at the ends of its tolerances, as the current of the most loaded device. It protects where the upper line stays below the derated curve (case {}) up to both rails at {} mains; music is clear of it where every loop stays below the lower line.",
        said(p, "case"),
        said(p, "mains")
    );
    for mark in marks(p, Role::Worst) {
        if let Some(used) = mark.value {
            let at = figure(Measure::new(mark.x, "V"));
            text.push_str(&format!(
                " Limit line {}: {} used, at {at}.",
                mark.label,
                percent(used.value)
            ));
        }
    }
    text
}

fn impedance(p: &Picture) -> String {
    let mark = |label: &str| {
        let found = p
            .panels
            .iter()
            .flat_map(|p| &p.marks)
            .find(|m| m.label == label);
        found.map(|m| {
            (
                m.value.map(shown).unwrap_or_default(),
                figure(Measure::new(m.x, "Hz")),
            )
        })
    };
    let mut text = String::from(
        "The equivalent peak dissipation resistance is the resistor that would make the output devices as hot at the worst instant as this load does at its own phase.",
    );
    if let (Some(modulus), Some(heat)) = (mark("least modulus"), mark("least dissipation")) {
        text.push_str(&format!(
            " The modulus is least with {} at {}, the peak dissipation resistance with {} at {}.",
            modulus.0, modulus.1, heat.0, heat.1
        ));
    }
    if p.fact("bridged").is_some_and(|b| b.value > 0.5) {
        text.push_str(" Bridged: each channel sees half of it.");
    }
    text
}

fn rail(p: &Picture) -> String {
    let channels = match p.fact("channels") {
        Some(one) if one.value < 1.5 => "one channel".to_owned(),
        many => format!("{} channels", number(many.map_or(0.0, |c| c.value))),
    };
    let mut text = format!(
        "Mean of one rail with a steady current drawn from both, {channels} on the supply; the trough with the reservoir at its least."
    );
    for mark in marks(p, Role::Point) {
        let at = figure(Measure::new(mark.x, "A"));
        text.push_str(&format!(
            " {}: {} at {at}.",
            capital(&mark.label),
            mark.value.map(shown).unwrap_or_default()
        ));
    }
    text
}

fn ripple(p: &Picture) -> String {
    format!(
        "Nominal mains, the reservoir at its least, {} drawn from each rail: the duty in {}, all channels. Mean {}, ripple {} peak to peak; the rectifier conducts over {} of each half-cycle and peaks at {}.",
        said(p, "current"),
        p.of.join(" and "),
        said(p, "mean"),
        said(p, "ripple"),
        said(p, "conduction"),
        said(p, "charging")
    )
}

fn heat(p: &Picture) -> String {
    let mut text = String::from(
        "A 1 kHz sine from every channel into the nominal resistance of each load, mean rail at nominal mains, idle current added at every level; drawn to where it clips.",
    );
    for mark in p
        .panels
        .iter()
        .flat_map(|p| &p.marks)
        .filter(|m| !m.label.is_empty())
    {
        let (heat, out) = (
            mark.value.map(shown).unwrap_or_default(),
            figure(Measure::new(mark.x, "W")),
        );
        text.push_str(&format!(
            " {} in {}: {heat} of heat at {out} out.",
            capital(&mark.label),
            p.of.join(" and ")
        ));
    }
    text
}

fn ladder(p: &Picture) -> String {
    let mut text = format!(
        "Hottest room, the duty in the load that heats most: {} on the sink, {} in the hottest device. Each bar runs from the temperature before it to its own.",
        said(p, "sink"),
        said(p, "device")
    );
    for mark in marks(p, Role::Allowed) {
        text.push_str(&format!(
            " Allowed {}: {}.",
            mark.label,
            mark.value.map(shown).unwrap_or_default()
        ));
    }
    text
}

fn capital(text: &str) -> String {
    let mut chars = text.chars();
    match chars.next() {
        Some(first) => first.to_uppercase().chain(chars).collect(),
        None => String::new(),
    }
}

/// What a line is, for the key under a picture.
pub(super) fn key(picture: &Picture, line: &Line) -> String {
    match (picture.kind, line.role) {
        (_, Role::Stated) => "the data sheet's curve, case at 25 °C".to_owned(),
        (Kind::Limiter, Role::Derated) => {
            format!("the curve derated to a case at {}", said(picture, "case"))
        }
        (_, Role::Derated) => format!(
            "derated to the case at the duty in {}{}",
            line.label,
            of(picture, "case", &line.label)
        ),
        (_, Role::Allowed) => format!("what the policy allows of it, in {}", line.label),
        (_, Role::Limit) if line.label.is_empty() => "limit line".to_owned(),
        (_, Role::Limit) => format!("limit line, {}", line.label),
        (Kind::SafeArea, Role::Locus) => format!(
            "{}: {} at {}{}, {} peak",
            line.label,
            figure_of(picture, "modulus", &line.label),
            figure_of(picture, "angle", &line.label),
            of(picture, "frequency", &line.label),
            figure_of(picture, "amplitude", &line.label)
        ),
        (Kind::Impedance, Role::Beside) if line.label == "phase" => {
            "phase, most leading of what the load may be".to_owned()
        }
        (Kind::Ladder, _) => String::new(),
        _ => line.label.clone(),
    }
}

fn figure_of(picture: &Picture, name: &str, load: &str) -> String {
    let found = picture
        .facts
        .iter()
        .find(|f| f.name == name && f.of == load);
    found.map(|f| shown(f.value)).unwrap_or_default()
}

/// `, case 77 °C`.
fn of(picture: &Picture, name: &str, load: &str) -> String {
    match figure_of(picture, name, load) {
        said if said.is_empty() => String::new(),
        said => format!(", {said}"),
    }
}
