//! data.gain-order: whether gain points can be the gain of one device.

use crate::analysis::reach::data_part;
use crate::analysis::{Case, Margins, Stress};
use crate::build::parts::GainLine;
use crate::finding::Verdict;
use crate::rule::Allow;

rule! {
    /// Gain rises a little with current, then falls. Points out of order, a second rise after a fall, or
    /// a gain that grows faster than the current are slips of the pen: by the last the base current
    /// would shrink while the collector current grows, which no transistor does. Base drive at full
    /// output stands on these few points.
    "data.gain-order",
    compares: "gain points with the gain of one transistor",
    stress: "",
    rating: "",
    formula: "currents rise; i/hFE rises; hFE does not rise again once it has fallen",
    source: "definition of current gain",
    reads: ["device.hfe"],
    sense: Fault,
    unit: "",
    allow: Allow::None, "",
    remedies: [],
    example: "tern60", [("60 at 5 A, 38 at 8 A", "60 at 5 A, 380 at 8 A")],
}

/// One margin for each device that states gain.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    for device in case.devices() {
        for line in &device.hfe {
            let (verdict, note) = disorder(line).unwrap_or((Verdict::Ok, String::new()));
            out.judge(
                &RULE,
                data_part(device, "hfe"),
                line.site,
                verdict,
                Stress {
                    note,
                    ..Stress::default()
                },
            );
        }
    }
}

/// The worst that is wrong with the points.
fn disorder(line: &GainLine) -> Option<(Verdict, String)> {
    let mut points = line.points.clone();
    let ascending = points
        .windows(2)
        .all(|pair| matches!(pair, [a, b] if a.0 < b.0));
    points.sort_by(|a, b| a.0.0.total_cmp(&b.0.0));
    let mut fallen = false;
    let mut thin = (!ascending).then(|| "the points are not in order of current".to_owned());
    for pair in points.windows(2) {
        let [(i0, h0), (i1, h1)] = pair else { continue };
        let both = format!("{h0} at {} A and {h1} at {} A", i0.0, i1.0);
        if i0 >= i1 {
            return Some((Verdict::Over, format!("{both}: two gains at one current")));
        }
        if i1.0 / h1 <= i0.0 / h0 {
            return Some((
                Verdict::Over,
                format!("{both}: base current would fall while the current rises"),
            ));
        }
        if fallen && h1 > h0 {
            thin = Some(format!("{both}: the gain rises again after it has fallen"));
        }
        fallen |= h1 < h0;
    }
    thin.map(|note| (Verdict::Thin, note))
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    #[test]
    fn slips_of_the_pen_are_named() {
        let with = |text: &str| {
            margin(
                &tern60(&[("80 at 1 A, 60 at 5 A, 38 at 8 A, 16 at 16 A", text)]),
                "data.gain-order",
                "n16",
            )
        };
        assert_eq!(
            with("60 at 0.5 A, 80 at 1 A, 60 at 5 A, 16 at 16 A").verdict,
            Verdict::Ok
        );
        // 8 A/380 = 21 mA is less base current than 5 A/60 = 83 mA
        let steep = with("80 at 1 A, 60 at 5 A, 380 at 8 A, 16 at 16 A");
        assert_eq!(steep.verdict, Verdict::Over);
        assert!(steep.note.contains("base current"), "{}", steep.note);
        assert_eq!(
            with("80 at 1 A, 60 at 5 A, 65 at 8 A, 16 at 16 A").verdict,
            Verdict::Thin
        );
        assert_eq!(
            with("60 at 5 A, 80 at 1 A, 16 at 16 A").verdict,
            Verdict::Thin
        );
        assert_eq!(
            with("80 at 1 A, 60 at 1 A, 16 at 16 A").verdict,
            Verdict::Over
        );
    }
}
