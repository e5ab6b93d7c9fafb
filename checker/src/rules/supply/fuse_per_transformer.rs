//! supply.fuse-per-transformer: one mains fuse for several transformers, against one of them.

use crate::analysis::{Case, Margins};
use crate::rule::{Allow, Remedy, Series};

use super::fuse_band::stress;

rule! {
    /// One fuse that feeds two transformers must carry both, so it lets twice as much into the one
    /// that fails. A shorted winding then burns behind a fuse that has no reason to open; this is
    /// how houses burn. A fuse for each transformer costs a holder.
    "supply.fuse-per-transformer",
    compares: "a mains fuse shared by several transformers with the rated primary current of one",
    stress: "shared mains fuse over the rated primary current of one transformer",
    rating: "limit",
    formula: "IN/(VA/Vtap) of one transformer",
    source: "common practice, no source",
    reads: ["supply.fuse", "supply.transformer", "transformer.rating", "transformer.primary", "build.mains"],
    sense: AtMost,
    unit: "1",
    allow: Allow::Fixed(3.0, 5.0), "common practice, no source",
    remedies: [
        Remedy { key: "supply.fuse", slot: "A", series: Series::R10, up: false },
    ],
    example: "tern60", [("    transformer        t300", "    transformer        2 x t300"), ("2.5 A slow melts 90 A2s", "5 A slow melts 250 A2s")],
}

/// One margin for the mains fuses that feed more than one transformer.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let Some(supply) = case.fitted(&RULE, out) else {
        return;
    };
    let fuses = case.mains_fuses().unwrap_or_default();
    for fuse in fuses
        .into_iter()
        .filter(|f| Case::transformers_behind(supply, f) > 1)
    {
        out.compare(
            &RULE,
            case.fuse_part(supply, "mains"),
            fuse.site,
            stress(case, supply, fuse, 1),
        );
    }
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, report, tern60};

    /// 5 A over 300 VA/230 V = 1.30435 A is 3.8333 for one, 1.9167 for both. By hand.
    #[test]
    fn a_shared_fuse_is_judged_against_one() {
        let shared = tern60(super::RULE.example.edits);
        let m = margin(&shared, super::RULE.name, "toroid fuse mains");
        assert!(m.verdict == Verdict::Thin && (m.stress.unwrap().value - 3.833_33).abs() < 1e-5);
        assert_eq!(
            margin(&shared, "supply.fuse-band", "toroid fuse mains").verdict,
            Verdict::Ok
        );
    }

    #[test]
    fn a_fuse_for_each_is_not_shared() {
        let each = tern60(&[
            (
                "    transformer        t300",
                "    transformer        2 x t300",
            ),
            ("A2s tap 230 V", "A2s tap 230 V per transformer"),
        ]);
        assert!(
            report(&each).builds[0]
                .margins
                .iter()
                .all(|m| m.rule != super::RULE.name)
        );
    }
}
