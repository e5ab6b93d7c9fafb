//! power.low-frequency-sag: the claimed power at the bottom of the band.

use crate::analysis::case::{line_part, solved, stated};
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{Claim, both};
use crate::finding::Witness;
use crate::rule::{Allow, Remedy, Series};

use super::rated_power::{CLAIM, HALF_DECIBEL, related, witness};

rule! {
    /// At mid-band a rail feels the mean of the signal. At 20 Hz one half-cycle of the signal lasts
    /// as long as two or three of the mains, and the reservoir must carry the peak current through
    /// it: the rail sags under every bass note. A claim that holds at 1 kHz and not at the bottom of
    /// the band is a claim that the buyer hears fail.
    "power.low-frequency-sag",
    compares: "power sustained at the bottom of the band with the claimed power",
    stress: "power at the onset of clipping, bottom of the band",
    rating: "claimed power less 1 dB",
    formula: "greatest V̂ with rail(t) - v(t) >= drop(|i(t)|) over the signal period, worst phase against the mains; P = V̂²/2R, bridged (2V̂)²/2R",
    source: "exact march of rail and reservoir through charging and discharging, half-sine load",
    reads: ["amplifier.rated", "amplifier.band", "amplifier.drop", "stage.idle", "stage.pairs", "transformer.secondary", "transformer.rating", "transformer.regulation", "supply.rectifier", "supply.reservoir", "supply.wiring", "build.mains", "build.channels", "build.supply"],
    sense: AtLeast,
    unit: "W",
    // the claim less 0.5 dB, out of a rating that is the claim less 1 dB
    allow: Allow::Percent(CLAIM), "0.5 dB short of the claim, 1 dB at most: common practice, no source",
    remedies: [
        Remedy { key: "supply.reservoir", slot: "F", series: Series::Reservoir, up: true },
        Remedy { key: "transformer.secondary", slot: "V", series: Series::SecondaryVolts, up: true },
        Remedy { key: "transformer.rating", slot: "VA", series: Series::TransformerVa, up: true },
    ],
    example: "tern60", [("2 x 4700 uF ±20 %", "2 x 1500 uF ±20 %")],
}

/// One margin for the line of claims: the claim that is met least.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let field = &case.build.amplifier.rated;
    match case.claims() {
        Err(needs) => out.compare(&RULE, line_part(field), field.site(), Err(needs)),
        Ok(claims) => {
            for claim in claims {
                out.compare(&RULE, line_part(field), claim.site, stress(case, &claim));
            }
        }
    }
}

fn stress(case: &Case<'_>, claim: &Claim) -> Result<Stress, Needs> {
    let (asked, band) = both(case.asked(claim), case.band())?;
    let frequency = band.bottom();
    let clip = case.sustained_low(asked.mains, asked.driven, asked.seen, frequency)?;
    let power = case.power_of(clip, asked.seen);
    let known = Witness { amplitude_v: Some(clip.0), power_w: Some(power.0), frequency_hz: Some(frequency.0), ..case.witness() };
    Ok(Stress {
        value: power.0,
        rating: claim.power.0 * HALF_DECIBEL * HALF_DECIBEL,
        witness: witness(case, claim, &asked, known),
        working: vec![
            stated("Pclaim", "claimed", claim.power.0, "W", [claim.site]),
            stated("f", "bottom of the band", frequency.0, "Hz", case.build.amplifier.band.stated_at()),
            solved("V̂", "peak output of one channel", "rail(t) >= v(t) + drop(|i(t)|) throughout", clip.0, "V", ""),
            solved("P", "power into the load", if case.build.bridged { "(2V̂)²/2R" } else { "V̂²/2R" }, power.0, "W", "power of a sine"),
        ],
        related: related(case),
        ..Stress::default()
    })
}
