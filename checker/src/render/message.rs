//! The sentences of every margin: what was found, the limit, where it is worst, why it matters and
//! what would pass. Must not know where the sentences are shown.

use crate::finding::{BuildReport, Change, Margin, Measure, Verdict, Witness};
use crate::rule::{Allow, Rule, Sense};

use super::figure::{apart, at_least, at_most, figure, number, percent, plain};

/// One of the lines under a message: what it is about, and what it says.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Detail {
    /// `worst at`, `why`, `would pass`, `also`, `see`, `waived`.
    pub label: &'static str,
    /// The sentence.
    pub text: String,
}

impl Detail {
    /// A line.
    #[must_use]
    pub fn new(label: &'static str, text: impl Into<String>) -> Self {
        Self {
            label,
            text: text.into(),
        }
    }
}

/// How many things are named before "and N more".
const NAMED: usize = 4;

/// `stereo with second-source`.
#[must_use]
pub fn build_name(build: &BuildReport) -> String {
    match &build.alternate {
        Some(alternate) => format!("{} with {alternate}", build.name),
        None => build.name.clone(),
    }
}

/// `n16 of out`, or the name alone where it already says the block.
#[must_use]
pub fn part_name(margin: &Margin) -> String {
    let part = &margin.part;
    let said = part.block.is_empty() || part.name.split(' ').any(|word| word == part.block);
    if said {
        part.name.clone()
    } else {
        format!("{} of {}", part.name, part.block)
    }
}

/// Value, what it is, limit, used, margin and verdict: the first line of a finding.
#[must_use]
pub fn headline(rule: &Rule, margin: &Margin, build: &BuildReport) -> String {
    let who = format!("{} in {}", part_name(margin), build_name(build));
    let (Some(stress), Some(rating), Some(allowance)) =
        (margin.stress, margin.rating, margin.allowance)
    else {
        return format!("{who}: {}", without_numbers(rule, margin));
    };
    let (value, bound) = apart(stress, allowance);
    let limit = limit(rule, &bound, allowance, rating);
    let note = if margin.note.is_empty() {
        String::new()
    } else {
        format!("; {}", margin.note)
    };
    format!(
        "{who}: {value} {}; {limit}; {}{note}",
        rule.stress,
        used(margin)
    )
}

/// What is said where nothing was compared: what is missing, or what does not agree.
fn without_numbers(rule: &Rule, margin: &Margin) -> String {
    let verdict = verdict(margin.verdict);
    match (margin.note.as_str(), margin.verdict) {
        ("", Verdict::Unchecked) => format!(
            "{} is unchecked: needs {}",
            rule.compares,
            listed(&margin.needs)
        ),
        ("", _) => format!("{}: {verdict}", rule.compares),
        (note, Verdict::Unchecked) => format!("{} is unchecked: {note}", rule.compares),
        (note, _) => format!("{note}: {verdict}"),
    }
}

/// Whether something is asked of a part of which nothing is allowed, so that no share can be named.
#[must_use]
pub fn nothing_left(margin: &Margin) -> bool {
    let past = matches!(margin.verdict, Verdict::Over | Verdict::Thin);
    past && margin.used_percent.is_none() && margin.stress.is_some()
}

/// What is gone where no percentage can be told: within the rating only the allowance is.
#[must_use]
pub fn spent(margin: &Margin) -> &'static str {
    if margin.verdict == Verdict::Thin {
        "no allowance left"
    } else {
        "no rating left"
    }
}

/// `118 % used, margin -18 points: over`.
#[must_use]
pub fn used(margin: &Margin) -> String {
    let verdict = verdict(margin.verdict);
    match (margin.used_percent, margin.margin_percent()) {
        (Some(used), Some(left)) => format!(
            "{} used, margin {} points: {verdict}",
            percent(used),
            points(left)
        ),
        _ if nothing_left(margin) => format!("{}: {verdict}", spent(margin)),
        _ => verdict.to_owned(),
    }
}

/// `118 % used`, for the mark under the value.
#[must_use]
pub fn brief(margin: &Margin) -> String {
    match margin.used_percent {
        Some(used) => format!("{} used", percent(used)),
        None if nothing_left(margin) => spent(margin).to_owned(),
        None => verdict(margin.verdict).to_owned(),
    }
}

/// Points of margin, to a tenth, and never `0` for what is not.
#[must_use]
pub fn points(margin_percent: f64) -> String {
    let tenth = format!("{margin_percent:.1}");
    let tenth = tenth.strip_suffix(".0").unwrap_or(&tenth);
    if matches!(tenth, "0" | "-0") {
        number(margin_percent)
    } else {
        tenth.to_owned()
    }
}

/// The verdict as one word.
#[must_use]
pub fn verdict(verdict: Verdict) -> &'static str {
    match verdict {
        Verdict::Ok => "ok",
        Verdict::Unchecked => "unchecked",
        Verdict::Thin => "thin",
        Verdict::Over => "over",
    }
}

/// `limit 216 V (90 % of V(BR)CEO 240 V)`. Share and distance are read off the two figures, so that
/// they are those of the policy in force.
fn limit(rule: &Rule, bound: &str, allowance: Measure, rating: Measure) -> String {
    let lead = if rule.sense == Sense::AtLeast {
        format!("wants at least {bound}")
    } else {
        format!("limit {bound}")
    };
    let noun = if rule.rating.is_empty() {
        "hard limit"
    } else {
        rule.rating
    };
    let shown = figure(rating);
    let below = Measure::new(rating.value - allowance.value, "K");
    match (rule.allow, share(allowance, rating)) {
        // the rating is the lower of the two: a share of it would read as its opposite
        _ if rule.sense == Sense::AtLeast => format!("{lead} ({noun} {shown})"),
        (Allow::Percent(_), Some(p)) if (p - 100.0).abs() < 1e-9 => format!("{lead} ({noun})"),
        (Allow::Percent(_), Some(p)) => {
            let share = figure(Measure::new(p, "%"));
            format!("{lead} ({share} of {noun} {shown})")
        }
        (Allow::Below(..), _) => format!("{lead} ({noun} {shown} less {})", figure(below)),
        (Allow::Fixed(..), _) if shown == bound => lead,
        _ => format!("{lead} ({noun} {shown})"),
    }
}

/// The share of the rating that is allowed, per cent, where there is a rating.
fn share(allowance: Measure, rating: Measure) -> Option<f64> {
    (rating.value > 0.0 && allowance.value > 0.0).then(|| 100.0 * allowance.value / rating.value)
}

/// The operating point, only what plays a part, always in this order. Empty for an empty witness.
#[must_use]
pub fn worst_at(w: &Witness) -> String {
    let mut said: Vec<String> = Vec::new();
    let unit = |value: f64, unit: &str| format!("{} {unit}", plain(value));
    let mut say = |text: Option<String>| said.extend(text);
    say(match (w.mains_v, w.mains_hz) {
        (Some(v), Some(hz)) => Some(format!("mains {} {}", unit(v, "V"), unit(hz, "Hz"))),
        (Some(v), None) => Some(format!("mains {}", unit(v, "V"))),
        (None, hz) => hz.map(|hz| format!("mains {}", unit(hz, "Hz"))),
    });
    for (part, end) in &w.tolerance {
        say(Some(format!("{part} {end}")));
    }
    say(w
        .channels_driven
        .map(|n| format!("{n} {} driven", if n == 1 { "channel" } else { "channels" })));
    say(w.load.as_ref().map(|load| format!("load {load}")));
    say(w.frequency_hz.map(|hz| figure(Measure::new(hz, "Hz"))));
    say(w.amplitude_v.map(|v| format!("{} peak", unit(v, "V"))));
    say(w.power_w.map(|p| unit(p, "W")));
    say(w.angle_deg.map(|a| format!("at {} degrees", plain(a))));
    say(w.duty.as_ref().map(|duty| format!("duty {duty}")));
    for (name, t) in [
        ("ambient", w.ambient_c),
        ("sink", w.sink_c),
        ("case", w.case_c),
        ("junction", w.junction_c),
    ] {
        say(t.map(|t| format!("{name} {}", unit(t, "degC"))));
    }
    say(w.rail_v.map(|v| format!("rail {}", unit(v, "V"))));
    let device: Vec<_> = [
        w.device_v.map(|v| unit(v, "V")),
        w.device_a.map(|a| figure(Measure::new(a, "A"))),
    ]
    .into_iter()
    .flatten()
    .collect();
    say((!device.is_empty()).then(|| format!("device {}", device.join(" "))));
    say(w
        .bank_a
        .map(|a| format!("bank {}", figure(Measure::new(a, "A")))));
    say(w.curve.as_ref().map(|curve| format!("{curve} curve")));
    let mut text = said.join(", ");
    if !w.also_at.is_empty() {
        let lead = if text.is_empty() { "" } else { "; " };
        text.push_str(&format!("{lead}also at {}", w.also_at.join(", ")));
    }
    text
}

/// What would clear a margin: the proposed change where one was found, and the bare numbers.
#[must_use]
pub fn would_pass(rule: &Rule, margin: &Margin, build: &BuildReport) -> Option<String> {
    let numbers = numbers_that_pass(rule, margin);
    match margin.changes.first() {
        Some(change) => {
            let other = numbers
                .map(|n| format!("; otherwise {n}"))
                .unwrap_or_default();
            Some(format!("{}{other}", proposed(change, build)))
        }
        None => numbers,
    }
}

/// `3 pairs instead of 2 (change out pairs 3): re-solved, 91 % used; also moves
/// out.devices/soa.idle from 61 to 64 %`.
#[must_use]
pub fn proposed(change: &Change, build: &BuildReport) -> String {
    let here = format!(
        "{}/{}/",
        build.name,
        build.alternate.as_deref().unwrap_or("-")
    );
    let statements = if change.statements.is_empty() {
        String::new()
    } else {
        format!(" ({})", change.statements.join("; "))
    };
    let mut text = format!(
        "{}{statements}: re-solved, {} used",
        change.title,
        percent(change.used_after)
    );
    let moves: Vec<String> = change
        .also_moves
        .iter()
        .map(|m| {
            (
                m.id.strip_prefix(&here).unwrap_or(&m.id),
                number(m.used_before),
                percent(m.used_after),
            )
        })
        .map(|(id, before, after)| format!("{id} from {before} to {after}"))
        .collect();
    if !moves.is_empty() {
        text.push_str(&format!("; also moves {}", listed(&moves)));
    }
    text
}

/// The rating at which this stress would be allowed, and the stress that this rating allows.
fn numbers_that_pass(rule: &Rule, margin: &Margin) -> Option<String> {
    let (stress, allowance, rating) = (margin.stress?, margin.allowance?, margin.rating?);
    let gap = Measure {
        value: (stress.value - allowance.value).abs(),
        ..stress
    };
    match (rule.sense, rule.allow, share(allowance, rating)) {
        (Sense::Fault, ..) => None,
        (Sense::AtLeast, ..) => Some(format!(
            "{} or more, {} more than now",
            at_least(allowance),
            figure(gap)
        )),
        (Sense::Temperature, ..) => {
            let gap = figure(Measure { unit: "K", ..gap });
            Some(format!("{} or less, {gap} cooler", at_most(allowance)))
        }
        // a share of a share reads as nothing
        (Sense::AtMost, Allow::Percent(_), Some(share)) if stress.unit != "%" => {
            let needed = Measure {
                value: stress.value * 100.0 / share,
                ..stress
            };
            let (needed, allowed) = (at_least(needed), at_most(allowance));
            Some(format!(
                "{} of {needed} or more, or {allowed} {}",
                rule.rating, rule.stress
            ))
        }
        // no rating is left at this point, so that no number of this kind clears it
        (Sense::AtMost, ..) if allowance.value <= 0.0 => None,
        (Sense::AtMost, ..) => Some(format!(
            "{} or less, {} less than now",
            at_most(allowance),
            figure(gap)
        )),
    }
}

/// All that is said of a margin, one thing a line, for forms that have no place for details.
#[must_use]
pub fn whole(rule: Option<&Rule>, margin: &Margin, build: &BuildReport) -> String {
    let head = match rule {
        Some(rule) => headline(rule, margin, build),
        None => format!(
            "{} in {}: {}",
            part_name(margin),
            build_name(build),
            used(margin)
        ),
    };
    let worst = Some(worst_at(&margin.witness))
        .filter(|w| !w.is_empty())
        .map(|w| format!("worst at: {w}"));
    let pass = rule
        .and_then(|rule| would_pass(rule, margin, build))
        .map(|p| format!("would pass: {p}"));
    [Some(head), worst, pass]
        .into_iter()
        .flatten()
        .collect::<Vec<_>>()
        .join("\n")
}

/// Why a rule matters, its lines run together.
#[must_use]
pub fn prose(rule: &Rule) -> String {
    rule.why.split_whitespace().collect::<Vec<_>>().join(" ")
}

/// The first sentence of why a rule matters.
#[must_use]
pub fn why(rule: &Rule) -> String {
    let mut why = prose(rule);
    if let Some(end) = why.find(". ") {
        why.truncate(end + 1);
    }
    why
}

/// `a, b, c and 7 more`.
#[must_use]
pub fn listed(names: &[String]) -> String {
    let more = names.len().saturating_sub(NAMED);
    // naming one more is as short as counting it
    let shown = if more == 1 {
        names.len()
    } else {
        names.len() - more
    };
    let mut text = names
        .iter()
        .take(shown)
        .map(String::as_str)
        .collect::<Vec<_>>()
        .join(", ");
    if more > 1 {
        text.push_str(&format!(" and {more} more"));
    }
    text
}
