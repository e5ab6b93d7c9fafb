//! The pictures say what the margins say: both are asked of the same build.

use crate::curves::{Kind, Line, Picture, Role};
use crate::finding::{BuildReport, Margin, Verdict};
use crate::physics::math;
use crate::testing::{all_kits, drawn, kit, tern60};

/// A line read between its points, straight in log-log, held beyond its ends: as it is drawn.
fn at(line: &Line, x: f64) -> f64 {
    let points = &line.points;
    let first = points.first().unwrap();
    let last = points.last().unwrap();
    if x <= first.0 {
        return first.1;
    }
    let pair = points.windows(2).find(|w| x >= w[0].0 && x <= w[1].0);
    let Some([a, b]) = pair.map(|w| [w[0], w[1]]) else {
        return last.1;
    };
    let share = math::ln(x / a.0) / math::ln(b.0 / a.0);
    a.1 * math::pow(b.1 / a.1, share)
}

fn lines(picture: &Picture, role: Role) -> impl Iterator<Item = &Line> {
    picture.panels[0]
        .lines
        .iter()
        .filter(move |l| l.role == role)
}

/// 100 x the greatest locus/curve over everything drawn, over what the policy allows.
fn used(picture: &Picture) -> f64 {
    let allowed = picture.fact("allowed").unwrap().value;
    let mut most: f64 = 0.0;
    for locus in lines(picture, Role::Locus) {
        // the load's own curve; loads that heat the case alike share that of the first
        let own = picture
            .facts
            .iter()
            .find(|f| f.name == "case" && f.of == locus.label);
        let same = |l: &&Line| {
            let case = picture
                .facts
                .iter()
                .find(|f| f.name == "case" && f.of == l.label);
            case.zip(own)
                .is_some_and(|(a, b)| (a.value.value - b.value.value).abs() < 1e-9)
        };
        let curve = lines(picture, Role::Derated).find(same).unwrap();
        for (v, i) in &locus.points {
            most = most.max(i / at(curve, *v));
        }
    }
    most * 1e4 / allowed
}

fn pictures(build: &BuildReport, kind: Kind) -> Vec<&Picture> {
    build
        .curves
        .as_ref()
        .unwrap()
        .iter()
        .filter(|p| p.kind == kind)
        .collect()
}

fn governing<'b>(build: &'b BuildReport, device: &str) -> Option<&'b Margin> {
    let rules = ["soa.reactive", "soa.resistive", "soa.low-frequency"];
    build
        .margins
        .iter()
        .filter(|m| rules.contains(&m.rule) && m.part.name == device)
        .filter(|m| m.verdict != Verdict::Unchecked && m.used_percent.is_some())
        .max_by(|a, b| a.used_percent.unwrap().total_cmp(&b.used_percent.unwrap()))
}

/// Every demo kit, every build: the greatest ratio of locus to curve over the points drawn, the worst
/// region counting, is the used of the governing safe-area margin within 1e-6.
#[test]
fn the_locus_touches_the_curve_where_the_margin_says() {
    let mut compared = 0;
    for path in all_kits() {
        let text = std::fs::read_to_string(&path).unwrap();
        if !text.contains("\nbuild ") || path.to_string_lossy().contains("parts") {
            continue;
        }
        for build in &drawn(&kit(path.file_stem().unwrap().to_str().unwrap())).builds {
            let areas = pictures(build, Kind::SafeArea);
            for device in areas
                .iter()
                .flat_map(|p| &p.of)
                .collect::<std::collections::BTreeSet<_>>()
            {
                let shown = areas
                    .iter()
                    .filter(|p| p.of.contains(device))
                    .map(|p| used(p));
                let shown = shown.fold(0.0, f64::max);
                let margin = governing(build, device).expect("a margin");
                let said = margin.used_percent.unwrap();
                assert!(
                    (shown - said).abs() <= 1e-6 * said.max(1.0),
                    "{} {} {device}: drawn {shown}, {} {said}",
                    path.display(),
                    build.name,
                    margin.rule
                );
                compared += 1;
            }
        }
    }
    assert!(compared >= 8, "{compared}");
}

/// The marked points lie on the loci, and the limit line meets the derated curve as its margin says.
#[test]
fn marks_lie_where_they_are_said_to() {
    let report = drawn(&kit("tern100-limiter"));
    let build = &report.builds[0];
    let area = pictures(build, Kind::SafeArea)[0];
    for mark in &area.panels[0].marks {
        let locus = lines(area, Role::Locus)
            .find(|l| l.label == mark.label)
            .unwrap();
        let there = |p: &&(f64, f64)| (p.0 - mark.x).abs() + (p.1 - mark.y).abs() < 1e-12;
        assert_eq!(locus.points.iter().filter(there).count(), 1);
    }
    let limiter = pictures(build, Kind::Limiter)[0];
    let margin = build
        .margins
        .iter()
        .find(|m| m.rule == "soa.limiter-soa")
        .unwrap();
    let (v, i) = (
        margin.witness.device_v.unwrap(),
        margin.witness.device_a.unwrap(),
    );
    let curve = lines(limiter, Role::Derated).next().unwrap();
    let ratio = 100.0 * i / at(curve, v);
    assert!(
        (ratio - margin.used_percent.unwrap()).abs() < 1e-6,
        "{ratio}"
    );
}

/// The ladder ends where thermal.junction does, and its limits are those of the margin.
#[test]
fn the_ladder_ends_at_the_junction() {
    let report = drawn(&tern60(&[]));
    let build = &report.builds[0];
    let ladder = pictures(build, Kind::Ladder)[0];
    let rung = |name: &str| {
        let line = ladder.panels[0]
            .lines
            .iter()
            .find(|l| l.label == name)
            .unwrap();
        line.points[1].0
    };
    let margin = |rule: &str| {
        let found = build
            .margins
            .iter()
            .find(|m| m.rule == rule && m.part.name != "p16")
            .unwrap();
        (found.stress.unwrap().value, found.allowance.unwrap().value)
    };
    assert!((rung("junction") - margin("thermal.junction").0).abs() < 1e-9);
    assert!((rung("junction, peak") - margin("thermal.junction-peak").0).abs() < 1e-9);
    assert!((rung("sink") - margin("thermal.sink").0).abs() < 1e-9);
    let allowed = ladder.panels[0]
        .marks
        .iter()
        .find(|m| m.role == Role::Allowed && m.label == "junction");
    assert!((allowed.unwrap().x - margin("thermal.junction").1).abs() < 1e-12);
}

/// By hand: one cycle of 50 Hz is 20 ms, the wave touches crest and trough, and its mean is the level
/// marked mean. 1/8 of the power at clip makes the heat that heats the sink.
#[test]
fn rail_and_heat_agree_with_themselves() {
    let report = drawn(&tern60(&[]));
    let build = &report.builds[0];
    let ripple = pictures(build, Kind::Ripple)[0];
    let wave = &ripple.panels[0].lines[0];
    let level = |label: &str| {
        let line = ripple.panels[0]
            .lines
            .iter()
            .find(|l| l.label == label)
            .unwrap();
        line.points[0].1
    };
    assert!((wave.points.last().unwrap().0 - 20.0).abs() < 1e-9);
    let volts = || wave.points.iter().map(|p| p.1);
    let (low, high) = (
        volts().fold(f64::INFINITY, f64::min),
        volts().fold(0.0, f64::max),
    );
    let swing = level("crest") - level("trough");
    assert!(low >= level("trough") - 1e-9 && low < level("trough") + 0.02 * swing);
    assert!(high <= level("crest") + 1e-9 && high > level("crest") - 0.02 * swing);
    let mean = volts().sum::<f64>() / volts().count() as f64;
    assert!((mean - level("mean")).abs() < 0.02 * swing, "{mean}");
    let heat = pictures(build, Kind::Heat)[0];
    let eighth = heat.panels[0]
        .marks
        .iter()
        .find(|m| m.label == "1/8")
        .unwrap();
    let ladder = pictures(build, Kind::Ladder)[0];
    assert!((eighth.y - ladder.fact("sink").unwrap().value).abs() < 1e-9);
}
