//! bom.quantity: designators and stated counts against the count the spec itself gives.

use crate::analysis::{Case, Margins, Stress};
use crate::build::statement::Bought;
use crate::finding::{Part, Site, Verdict};

rule! {
    /// A board that holds two pairs has four output devices and four emitter resistors. When the
    /// designators say otherwise, either the spec or the parts list is of another revision, and the
    /// kits are packed wrong, all of them.
    "bom.quantity",
    compares: "designators and `qty` of a line with the count worked out from pairs, rails and channels",
    stress: "parts named",
    rating: "parts needed",
    formula: "devices and emitter resistors: 2·pairs·channels-per-board; reservoir: count·2 rails",
    source: "common practice, no source",
    reads: ["stage.devices", "stage.pairs", "stage.emitter", "supply.reservoir", "amplifier.channels-per-board"],
    sense: Fault,
    unit: "1",
    allow: crate::rule::Allow::None, "the counts must agree",
    remedies: [],
    example: "tern60", [("ref R21-R24", "ref R21-R22")],
}

/// One margin for each line that names designators or a count.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let board = case
        .build
        .amplifier
        .channels_per_board
        .get()
        .copied()
        .unwrap_or(1);
    for stage in case.followers() {
        let Some(pairs) = stage.pairs.get() else {
            continue;
        };
        let needed = 2 * pairs * board;
        let part = case.device_part(stage, crate::analysis::case::Side::Upper);
        judge(
            out,
            part,
            stage.devices.site(),
            &stage.bought,
            needed,
            "2 x pairs x channels on a board",
        );
        if let Some(bought) = &stage.emitter_bought {
            let part = crate::analysis::case::line_part(&stage.emitter);
            judge(
                out,
                part,
                stage.emitter.site(),
                bought,
                needed,
                "2 x pairs x channels on a board",
            );
        }
    }
    if let Some((supply, _)) = case.build.supply.get() {
        let groups = supply
            .reservoir
            .get()
            .map(Vec::as_slice)
            .unwrap_or_default();
        for group in groups {
            let part = crate::analysis::case::line_part(&supply.reservoir);
            judge(
                out,
                part,
                group.site,
                &group.bought,
                2 * group.count,
                "count x two rails",
            );
        }
    }
}

fn judge(out: &mut Margins<'_>, part: Part, site: Site, bought: &Bought, needed: u32, how: &str) {
    let named = if bought.refs.is_empty() {
        bought.quantity
    } else {
        u32::try_from(bought.refs.len()).ok()
    };
    let Some(named) = named else { return };
    let (verdict, note) = if named == needed {
        (Verdict::Ok, String::new())
    } else {
        (
            Verdict::Over,
            format!("the line names {named}; {needed} are needed ({how})"),
        )
    };
    out.judge(
        &RULE,
        part,
        site,
        verdict,
        Stress {
            note,
            ..Stress::default()
        },
    );
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{tern60, verdict};

    #[test]
    fn counts_agree_on_the_demo_kit() {
        assert_eq!(
            verdict(&tern60(&[]), "bom.quantity", "out emitter"),
            Verdict::Ok
        );
        assert_eq!(
            verdict(&tern60(&[]), "bom.quantity", "toroid reservoir"),
            Verdict::Ok
        );
    }

    #[test]
    fn three_pairs_need_more_than_four_resistors() {
        let three = tern60(&[("pairs               2", "pairs               3")]);
        assert_eq!(
            verdict(&three, "bom.quantity", "out emitter"),
            Verdict::Over
        );
    }
}
