//! soa.low-frequency: loads at the bottom of the band against the derated safe area.

use crate::analysis::safe_area::Angle;
use crate::analysis::{Case, Margins};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// At the bottom of the band one half-cycle lasts tens of milliseconds, long enough for the chip to follow
    /// it, and bass is what music plays loudest. The figure is part of the one over the whole band; it
    /// stands alone because a loudspeaker's phase turns fastest round its bass resonance, and because a
    /// pulse curve that helps in the midrange may not help here.
    "soa.low-frequency",
    compares: "current of the most loaded device at the bottom of the band with the temperature-derated safe area",
    stress: "current of the most loaded device at the bottom of the band",
    rating: "safe area, derated to the case temperature",
    formula: "i(t)/Iallowed(v(t)) at the lowest frequency of the band; Vu at nominal mains, at high mains where the policy says so (`strict`)",
    source: "derating of data sheets: power straight to Tj,max, second breakdown alike where not stated (onsemi MJ15022/D, 2N3055A/D, read); log-log between points",
    reads: ["device.soa", "device.power", "device.current", "device.junction", "device.vceo", "device.structure", "device.second-breakdown", "stage.pairs", "stage.emitter", "stage.vbe-spread", "stage.insulator", "amplifier.drop", "build.loads", "build.mains", "build.ambient", "build.duty", "heatsink.resistance", "amplifier.band"],
    sense: AtMost,
    unit: "A",
    allow: Allow::Percent(80.0), "common practice, no source",
    remedies: [
        Remedy { key: "stage.pairs", slot: "n", series: Series::Count, up: true },
        Remedy { key: "heatsink.resistance", slot: "K/W", series: Series::Heatsink, up: false },
        Remedy { key: "transformer.secondary", slot: "V", series: Series::SecondaryVolts, up: false },
    ],
    example: "tern60", [("pairs              2", "pairs              1"), ("resistive 8 ohm ±5 %", "nominal 4 ohm")],
}

/// One margin for each declared output device: every load, at the bottom of the band.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    case.compare_loci(&RULE, out, Angle::OwnAtBottom);
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::testing::{margin, tern60};

    /// A voice coil alone far below its resonance is Re, its stiffness and mass out of the way: 20 Hz
    /// with fs at 2 kHz. Cold coil: 5.9·(1 + 0.0039·(10 - 20)) = 5.6699 ohm. Le adds j0.088 ohm and
    /// the resonance, Res 55.07 ohm over 1 - j·4.2·99.99, 0.0003 + j0.1311 ohm. The modulus is then
    /// √(5.6702² + 0.2191²) = 5.6744 ohm.
    #[test]
    fn the_coil_decides_far_below_resonance() {
        let m = margin(
            &tern60(&[
                ("resonance          42 Hz", "resonance          2 kHz"),
                (
                    "loads              hall-8, bench-8",
                    "loads              hall-8",
                ),
            ]),
            RULE.name,
            "n16",
        );
        let z = m.working.iter().find(|s| s.symbol == "|Z|").unwrap().value;
        assert!((z - 5.6744).abs() < 1e-3, "{z}");
        assert_eq!(m.witness.frequency_hz.map(f64::round), Some(20.0));
    }

    /// Part of the band, so never more than all of it.
    #[test]
    fn it_is_part_of_the_band() {
        let used = |rule: &str| margin(&tern60(&[]), rule, "n16").used_percent.unwrap();
        assert!(used(RULE.name) <= used("soa.reactive") * (1.0 + 1e-9));
    }
}
