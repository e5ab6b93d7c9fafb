//! The one table of the language: every block kind and key.
//! Must not know how a value is used; rules name the keys they read.
//!
//! A shape reads: `V` one quantity in that unit; `±` a tolerance may follow; `label:V` labelled;
//! `{a b}` one of the words; `label{a b}` the same after a label; `per{a b}` how many there are,
//! `per{a N}` also `per 3 channels`; `<kind>` a declared name; `"text"`; `n` whole number; `num` plain
//! number; `nx` a count such as `2 x`; `V..V` a range; `V(..V)` one value or a range; `?` optional;
//! `,...` a list of groups; `+bom` a bought part; `@…` the selector.

use super::{Block, Key, block, key};

/// Statements outside blocks.
pub const STATEMENTS: &[Key] = &[
    key("ampspec", "n", "req", "language version, first line"),
    key(
        "use",
        "\"text\"",
        "req",
        "another file, relative to this one",
    ),
    key(
        "waive",
        "WAIVE",
        "req",
        "accept a finding: `waive RULE of PART in BUILD with ALTERNATE because \"reason\" by \"who\" until DATE`",
    ),
];

/// Every block kind, in the order the reference lists them.
pub const BLOCKS: &[Block] = &[
    block("amplifier", &[], "one channel of the board: its stages and what it claims", &[
        key("output", "<stage>", "req", "the output stage"),
        key("driver", "<stage>", "-", "its driver"),
        key("predriver", "<stage>", "-", "third follower"),
        key("voltage-amplifier", "<stage>", "-", "what drives the first follower"),
        key(
            "rated",
            "W into ohm {one-channel all-channels}? {nominal-mains low-mains}? ,...",
            "-",
            "claimed sine power; all-channels nominal-mains if not said",
        )
        .band("W", 0.5, 5000.0)
        .band("ohm", 0.5, 100.0),
        key("band", "Hz..Hz", "20 Hz to 20 kHz", "full-power band").band("Hz", 1.0, 1e6),
        key("drop", "V at A? ,...", "-", "loaded rail to peak output, emitter resistors included; one figure holds at every current")
            .band("V", 0.0, 30.0)
            .band("A", 0.0, 200.0),
        key("gain", "dB", "-", "closed loop").band("dB", 6.0, 60.0),
        key("channels-per-board", "n", "1", "for counts and `per board`").band("n", 1.0, 16.0),
        key(
            "board-reservoir",
            "nx? F± V esr:ohm? ripple:A? life:h? life-at:degC? per{rail} +bom",
            "none",
            "capacitors on each board, added to the supply's",
        )
        .band("F", 20e-6, 0.5)
        .band("V", 6.0, 450.0)
        .band("life", 200.0 * 3600.0, 500e3 * 3600.0)
        .band("life-at", 40.0, 150.0),
        key("network", "<network>", "-", "output network"),
    ]),
    block("stage", &[], "one stage of the board", &[
        key(
            "connection",
            "{emitter-follower compound-pair source-follower common-emitter}",
            "emitter-follower",
            "how its devices are connected",
        ),
        key("devices", "<device> <device>? +bom", "req", "upper then lower; one name if it is a complementary device"),
        key("pairs", "n", "1", "devices of each polarity in one channel").band("n", 1.0, 40.0),
        key("emitter", "ohm± W? pulse:A? +bom", "-", "resistor of each device")
            .band("ohm", 0.05, 1.0)
            .band("W", 0.1, 50.0),
        key("base-emitter", "ohm± W? +bom", "none", "across the base-emitter of the bank").band("ohm", 1.0, 100e3),
        key(
            "idle",
            "A? V? per{device channel}? across{emitter both-emitters}? ,...",
            "-",
            "bias; two groups must agree",
        )
        .band("A", 1e-3, 3.0)
        .band("V", 1e-3, 1.0),
        key("insulator", "K/W \"text\"? +bom", "-", "case to sink, each device").symbol("Rth(c-s)").band("K/W", 0.01, 5.0),
        key("own-sink", "K/W per{device stage} +bom", "none", "a sink of its own; absent is on the build's sink")
            .band("K/W", 0.1, 100.0),
        key("vbe-spread", "V", "20 mV", "between devices in parallel").band("V", 0.0, 0.2),
        key("spread-across-sink", "K", "0 K", "hottest to coolest device").band("K", 0.0, 60.0),
        key("gate-zener", "V", "none", "clamp from gate to source").band("V", 3.0, 40.0),
        key("driver-rail", "V", "0 V", "driver supply above the output rail").band("V", 0.0, 60.0),
        key("sensor", "on{sink device driver board} cooler:K?", "-", "what the bias sensor of this stage is mounted on"),
        key("output-current", "A", "-", "what a voltage amplifier can give either way").band("A", 0.2e-3, 2.0),
        key("tail", "A compensation:F", "-", "input pair current and the capacitor it slews")
            .band("A", 50e-6, 0.1)
            .band("compensation", 1e-12, 10e-9),
    ]),
    block("device", &["npn", "pnp", "nmos", "pmos", "complementary"], "a transistor", &[
        key("vceo", "V", "-", "collector-emitter breakdown, base open").symbol("V(BR)CEO").band("V", 10.0, 2000.0),
        key("vdss", "V", "-", "drain-source breakdown").symbol("V(BR)DSS").band("V", 10.0, 2000.0),
        key("vgs", "V", "-", "gate limit").symbol("VGSS").band("V", 3.0, 100.0),
        key("structure", "{lateral vertical}", "-", "MOSFET: which safe-area rule holds"),
        key("gate-source", "V at A ,...", "-", "transfer points, gate voltage against drain current").symbol("VGS"),
        key("gate-drift", "mV/K at A ,...", "-", "temperature coefficient of the gate voltage").symbol("dVGS/dT"),
        key("on-resistance", "ohm", "-", "at 25 degC").symbol("RDS(on)").band("ohm", 1e-4, 20.0),
        key("second-breakdown", "%/K", "as thermal", "derating of the segments steeper than -1.05").band("%/K", 0.0, 0.02),
        key("current", "A peak:A?", "-", "continuous collector or drain current, and the pulsed one")
            .symbol("IC, ID; ICM, IDM")
            .band("A", 10e-3, 400.0),
        key("base", "A", "-", "base current limit").symbol("IB").band("A", 1e-3, 50.0),
        key("power", "W at degC?", "-", "total dissipation, case at 25 degC").symbol("Ptot").band("W", 0.1, 3000.0),
        key("junction", "degC", "-", "highest junction temperature").symbol("Tj,max").band("degC", 85.0, 250.0),
        key("junction-case", "K/W", "from power", "thermal resistance").symbol("Rth(j-c)").band("K/W", 0.03, 200.0),
        key("foster", "K/W s ,...", "-", "transient thermal terms").symbol("Zth(j-c)"),
        key("soa", "@{dc}|s A at V ,...", "-", "safe-area points; the selector is dc or a pulse length")
            .repeats()
            .symbol("SOA")
            .band("V", 0.5, 2000.0)
            .band("A", 1e-4, 1000.0),
        key("hfe", "@{minimum typical} num at A ,...", "-", "gain; typical alone is halved by the policy")
            .repeats()
            .symbol("hFE")
            .band("num", 2.0, 50e3)
            .band("A", 1e-6, 400.0),
        key("vbe", "V at A?", "0.65 V", "base-emitter voltage").symbol("VBE").band("V", 0.4, 3.0),
        key("transition", "Hz at A?", "-", "transition frequency, for substitution").symbol("fT").band("Hz", 0.2e6, 20e9),
        key("part", "\"text\" \"text\"?", "-", "order code; complementary: upper then lower"),
        key("source", "{authorised open-market tested} \"text\"?", "-", "where bought"),
    ]),
    block("load", &[], "a loudspeaker or test load; one of resistive, nominal, voice-coil, table, parallel", &[
        key("resistive", "ohm±", "-", "a resistor").band("ohm", 0.2, 10e3),
        key("nominal", "ohm", "-", "rated impedance").band("ohm", 0.5, 1000.0),
        key("minimum", "ohm", "80 % of nominal", "least modulus").band("ohm", 0.2, 1000.0),
        key("angle", "deg", "policy", "at the minimum, both signs").band("deg", 0.0, 89.0),
        key("dc", "ohm", "-", "d.c. resistance, for fault current").band("ohm", 0.1, 1000.0),
        key("voice-coil", "ohm H lossy:num?", "-", "coil resistance and inductance")
            .symbol("Re, Le")
            .band("ohm", 0.2, 1000.0)
            .band("H", 1e-6, 50e-3)
            .band("lossy", 0.3, 1.0),
        key("resonance", "Hz mechanical:num electrical:num", "-", "a resonance of the drive unit or its box")
            .repeats()
            .symbol("fs, Qms, Qes")
            .band("Hz", 5.0, 20e3)
            .band("mechanical", 0.05, 100.0)
            .band("electrical", 0.02, 100.0),
        key("table", "\"text\"", "-", "CSV file with a header: frequency, modulus, phase"),
        key("parallel", "<load> ,...", "-", "several loads at once on one channel"),
        key("endurance", "J? W?", "-", "what the coil stands in a d.c. fault").band("J", 0.1, 1e5).band("W", 0.5, 1e4),
    ]),
    block("heatsink", &[], "a heatsink", &[
        key("resistance", "K/W at K?", "-", "sink to air at that rise; 50 K assumed")
            .symbol("Rth(s-a)")
            .band("K/W", 0.02, 5.0)
            .band("K", 5.0, 120.0),
        key("mass", "kg", "-", "for the time it takes to warm").band("kg", 0.01, 100.0),
        key("touchable", "{no brushed held}", "-", "judged only where stated"),
        key("plate", "width:mm height:mm thick:mm", "-", "geometry in place of resistance")
            .band("width", 0.01, 2.0)
            .band("height", 0.01, 2.0)
            .band("thick", 0.5e-3, 0.05),
        key("fins", "n length:mm thick:mm gap:mm {vertical horizontal}", "-", "fins on the plate")
            .band("n", 1.0, 400.0)
            .band("length", 1e-3, 0.3)
            .band("thick", 0.2e-3, 0.02)
            .band("gap", 1e-3, 0.1),
    ]),
    block("transformer", &[], "a mains transformer", &[
        key("primary", "V ,...", "req", "every voltage it can be strapped or tapped for").band("V", 80.0, 500.0),
        key("secondary", "nx? V {centre-tapped-total}?", "req", "r.m.s. of each winding at rated load on the matching tap")
            .band("V", 6.0, 130.0),
        key("rating", "VA per{transformer winding}?", "req", "per transformer assumed").band("VA", 5.0, 10_000.0),
        key("regulation", "% of{full-load no-load}", "assumed by VA", "no-load less full-load, over this").band("%", 0.005, 0.4),
        key("resistance", "primary:ohm secondary:ohm", "from regulation", "of the windings, cold"),
        key("thermal-fuse", "degC", "-", "in the winding").band("degC", 70.0, 200.0),
    ]),
    block("supply", &[], "transformer, rectifier and reservoir", &[
        key("transformer", "nx? <transformer>", "req", "which, and how many"),
        key("rectifier", "nx? {bridge} V? A? surge:A? drop:V? +bom", "drop 0.9 V", "1 x on a centre tap, 2 x one per winding; drop of one diode")
            .band("V", 20.0, 3000.0)
            .band("A", 0.2, 500.0)
            .band("surge", 2.0, 10e3)
            .band("drop", 0.2, 2.0),
        key(
            "reservoir",
            "nx? F± V esr:ohm? ripple:A? life:h? life-at:degC? per{rail} +bom ,...",
            "req",
            "count is per rail",
        )
        .band("F", 100e-6, 0.5)
        .band("V", 6.0, 450.0)
        .band("esr", 0.2e-3, 5.0)
        .band("ripple", 0.05, 100.0)
        .band("life", 200.0 * 3600.0, 500e3 * 3600.0)
        .band("life-at", 40.0, 150.0),
        key("bleeder", "ohm± W? per{rail supply} +bom", "-", "per supply is rail to rail").band("ohm", 50.0, 1e6),
        key(
            "fuse",
            "@{mains secondary rail speaker} A {slow fast} melts:A2s? tap:V? per{transformer supply rail channel}? +bom ,...",
            "-",
            "melts is the melting I2t; tap: for that strap only",
        )
        .repeats()
        .band("A", 0.05, 63.0),
        key(
            "soft-start",
            "ohm? W? bypass:s? ntc:ohm? hot:ohm? energy:J? thermal-fuse:degC? +bom",
            "-",
            "a resistor that is bypassed, or an NTC",
        )
        .band("ohm", 0.5, 1000.0)
        .band("bypass", 10e-3, 30.0),
        key("wiring", "ohm", "0 ohm", "secondary leads, each").band("ohm", 0.0, 1.0),
        key("terminals", "{enclosed touchable}", "enclosed", "how fast they must discharge"),
    ]),
    block("protection", &[], "what acts in a fault", &[
        key("limit-line", "@{bank device} A at V ,...", "-", "straight lines through these; flat beyond the last; lower side mirrored"),
        key(
            "limiter",
            "sense:ohm base:ohm shunt:ohm? rail:ohm? on:V?",
            "-",
            "of one device: sense to base, base to output, shunt in parallel with base, base to rail; turn-on 0.6 V",
        ),
        key("limiter-break", "V ohm? from-rail:ohm? to-base:ohm?", "none", "second slope: zener volts, rail to zener, zener to base"),
        key("detector", "V below:V? ohm F watches{output both-halves across-load}", "-", "d.c. threshold and filter; symmetrical unless below")
            .band("V", 0.3, 20.0)
            .band("ohm", 100.0, 10e6)
            .band("F", 10e-9, 10e-3),
        key("relay", "A at V ,...", "-", "what one contact breaks: `8 A at 60 Vdc`; groups in Vac are never used for d.c."),
        key("contacts", "series:n? release:s? coil:V? {open grounded}? +bom", "series 1, open", "contacts in series in one speaker line; unused throw open or grounded"),
        key("switch", "V A nx ohm release:s? +bom", "-", "solid-state switch in the speaker line"),
        key("crowbar", "V A +bom", "none", "shorts the output in a fault"),
        key("muting", "s", "-", "switch-on delay").band("s", 0.05, 60.0),
        key("cutout", "degC± on{device sink chassis air} cooler:K? +bom", "-", "how much cooler its place is than the sink beside the output devices")
            .band("degC", 50.0, 110.0),
    ]),
    block("network", &[], "what stands between the output stage and the terminals", &[
        key("zobel", "ohm W F V? +bom", "-", "series resistor and capacitor across the output")
            .band("ohm", 0.5, 100.0)
            .band("W", 0.1, 50.0)
            .band("F", 1e-9, 10e-6),
        key("coil", "H damp:ohm? W? +bom", "-", "series inductor, its damping resistor").band("H", 0.1e-6, 50e-6),
    ]),
    block("build", &[], "one use of the board", &[
        key("amplifier", "<amplifier>", "the only one", "which board"),
        key("channels", "n {bridged}?", "req", "amplifier channels; bridged joins them two by two").band("n", 1.0, 64.0),
        key("supply", "<supply> per{channel board build N}", "req or rails", "which, and how many"),
        key("rails", "idle:V loaded:V at A? high:V?", "-", "given rails; with a supply they are cross-checked")
            .band("idle", 6.0, 250.0)
            .band("loaded", 6.0, 250.0),
        key("heatsink", "<heatsink> per{channel board build N}", "req", "which, and how many"),
        key("protection", "<protection> per{channel board build N}", "-", "which, and how many"),
        key(
            "mains",
            "V± range:V..V? Hz loop:ohm? tap:V? ,...",
            "req with supply",
            "each group is a region, all are checked; no range is +-10 %; tap needed if the primary has several",
        )
        .band("V", 85.0, 277.0)
        .band("Hz", 45.0, 66.0)
        .band("loop", 0.0, 5.0),
        key("loads", "<load> ,...", "req", "tried in turn, every channel alike"),
        key("ambient", "degC(..degC)", "req", "air round the case").band("degC", -40.0, 80.0),
        key("enclosure", "K", "0 K", "rise inside").band("K", 0.0, 60.0),
        key("duty", "fraction? {full}? crest:dB?", "policy", "fraction of the power at clip, nominal mains, in the load in hand"),
        key("policy", "<policy>", "bench", "table of allowances"),
        key("survives-short", "{yes no}", "no", "a claim that is then checked"),
        key("change", "CHANGE", "-", "a line of another block, for this build only").repeats(),
    ]),
    block("alternate", &[], "a substitution that gets its own full check", &[
        key("replace", "<any> with <any> ,...", "-", "a named part by another"),
        key("change", "CHANGE", "-", "a value on a line").repeats(),
        key("builds", "<build> ,...", "every", "the builds it may be used in"),
    ]),
    block("policy", &[], "a table of allowances; always from another", &[
        key("allow", "@RULE %? K? num?", "built-in", "allowance for that rule").repeats(),
        key("severity", "@RULE {error warning information}", "built-in", "of a margin outside its allowance").repeats(),
        key("duty", "fraction? {full}? crest:dB?", "1/8", "deciding duty"),
        key("angle", "deg", "45 deg", "where a load states none").band("deg", 0.0, 89.0),
        key("curve", "{dc pulse}", "dc", "which safe-area curves count"),
        key("detector-time", "s", "50 ms", "how soon a d.c. fault must be off"),
    ]),
];
