//! supply.shared-count: the channels on one supply against those it carries.

use crate::analysis::case::{solved, stated};
use crate::analysis::loads::Driven;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::three;
use crate::finding::Part;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// The buyer doubles the boards and keeps the transformer. Two channels on a supply meant for
    /// one sag together, and the transformer runs at twice its share of heat. The figure says how
    /// many channels this supply carries at the duty, so that nobody has to find out by smell.
    "supply.shared-count",
    compares: "channels on one supply with the channels its transformer carries at the duty",
    stress: "channels on one supply",
    rating: "channels it carries at the duty",
    formula: "greatest n with Σ windings Vs·Irms <= VA at Idc = n·(Î/π + N·Iq)",
    source: "periodic solution of the rectifier, after O. H. Schade, Proc. IRE 31 (1943) 341",
    reads: ["build.supply", "build.channels", "transformer.rating", "transformer.secondary", "transformer.regulation", "supply.rectifier", "supply.reservoir", "build.duty", "build.loads", "build.mains", "stage.idle", "amplifier.drop"],
    sense: AtMost,
    unit: "1",
    allow: Allow::Percent(100.0), "the transformer's rating",
    remedies: [
        Remedy { key: "transformer.rating", slot: "VA", series: Series::TransformerVa, up: true },
    ],
    example: "tern60", [("300 VA", "30 VA")],
}

/// One margin for the build's supply: the load that draws most.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let Some(supply) = case.fitted(&RULE, out) else {
        return;
    };
    let part = Part {
        name: supply.owner.name.clone(),
        block: case.build.owner.name.clone(),
        key: "supply",
        quantity: case.supplies(),
        ..Part::default()
    };
    for found in case.per_load(|load| stress(case, load)) {
        out.compare(&RULE, part.clone(), case.build.supply.site(), found);
    }
}

fn stress(case: &Case<'_>, load: &Driven) -> Result<Stress, Needs> {
    let rating = &case.supply()?.transformer.rating;
    let (channels, most, rated) = three(
        case.channels_per_supply(),
        case.most_channels(load),
        rating.need().copied(),
    )?;
    let duty = case.duty_signal(load)?;
    Ok(Stress {
        value: f64::from(channels),
        rating: f64::from(most),
        witness: crate::finding::Witness {
            mains_v: case.mains_volts(crate::analysis::rails::Mains::Nominal),
            load: Some(load.name.clone()),
            frequency_hz: Some(1000.0),
            amplitude_v: Some(duty.amplitude.0),
            duty: Some(case.duty().shown.clone()),
            ..case.witness()
        },
        working: vec![
            stated(
                "n",
                "channels on one supply",
                f64::from(channels),
                "1",
                [case.build.supply.site()],
            ),
            stated(
                "VA",
                "rating of one transformer",
                rated,
                "VA",
                rating.stated_at(),
            ),
            solved(
                "V̂",
                "duty amplitude",
                "√(2·d·Pref·R)",
                duty.amplitude.0,
                "V",
                "definition of the duty",
            ),
            solved(
                "n max",
                "channels it carries",
                "greatest n with Σ windings Vs·Irms <= VA",
                f64::from(most),
                "1",
                "periodic solution of the rectifier",
            ),
        ],
        related: case.loading_sites(load),
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    /// One channel takes 88.5 VA at the duty by a small-step integration written apart from this
    /// program, further ones a little less each as the pulses widen: 300 VA carry three or four.
    #[test]
    fn how_many_it_carries() {
        let m = margin(&tern60(&[]), super::RULE.name, "toroid");
        let most = m.rating.unwrap().value;
        assert!((3.0..=4.0).contains(&most), "{most}");
        let with = |channels: u32| {
            let text = tern60(&[(
                "    channels           1\n",
                &format!("    channels           {channels}\n"),
            )]);
            margin(&text, super::RULE.name, "toroid").verdict
        };
        assert_eq!(with(most as u32), Verdict::Ok);
        assert_eq!(with(most as u32 + 1), Verdict::Over);
    }

    /// Over exactly where the transformer is past its rating.
    #[test]
    fn agrees_with_the_transformer() {
        for channels in 1..=5 {
            let text = tern60(&[(
                "    channels           1\n",
                &format!("    channels           {channels}\n"),
            )]);
            let over = margin(&text, super::RULE.name, "toroid").verdict == Verdict::Over;
            let transformer = margin(&text, "current.transformer-duty", "t300");
            assert_eq!(
                over,
                transformer.verdict == Verdict::Over,
                "{channels} channels"
            );
        }
    }

    #[test]
    fn not_even_one() {
        let m = margin(&tern60(&[("300 VA", "30 VA")]), super::RULE.name, "toroid");
        assert_eq!((m.verdict, m.used_percent), (Verdict::Over, None));
    }
}
