//! Faults of the data that are found while the files are brought together: one record for each kind.

/// Declares the record of a fault that reading finds. The doc comment is its "why".
macro_rules! reading {
    ($($(#[doc = $why:literal])+ $id:ident $name:literal, $compares:literal, [$(($old:literal, $new:literal)),+ $(,)?];)+) => { $(
        pub mod $id {
            //! A fault of the data.
            fault! {
                $(#[doc = $why])+
                $name,
                finds: $compares,
                example: "tern60", [$(($old, $new)),+],
            }
        }
    )+ };
}

reading! {
    /// A value far outside what such a part ever has, or a text with two readings. A slip of a
    /// thousand parses as well as the right value and passes every review that only looks at shape,
    /// so it is asked about until it is settled.
    unit_suspect "data.unit-suspect", "a value outside its plausible band, or with two readings", [("emitter             0R22", "emitter             22R")];

    /// A key stated twice, or two blocks of one name: only the first is used, and the writer of the
    /// second believes otherwise.
    duplicate "data.duplicate", "a key or a name stated twice", [("pairs               2", "pairs               2\n    pairs               3")];

    /// A name that nothing declares, or that is of another kind. The line that uses it says nothing
    /// until it is mended.
    missing "data.missing", "a name that nothing declares", [("heatsink           fins per channel", "heatsink           finns per channel")];

    /// A `use` that cannot be followed: a missing file, a circle, a path that leaves the folder being
    /// checked.
    used "data.use", "a file that cannot be taken in", [("ampspec 1\n", "ampspec 1\nuse \"parts/no-such-file.ampspec\"\n")];

    /// A block that starts from itself, by way of others. Where the circle closes no line can be
    /// taken over, so the block says less than its writer believes.
    cycle "data.cycle", "a circle of `from`", [("device n16 npn {", "device n16 npn from p16 {")];

    /// An impedance table that cannot be read. The load is not checked until it is mended.
    table "data.table", "an impedance table that cannot be used", [("load bench-8 { resistive 8 ohm ±5 % }", "load bench-8 { table \"no-such-table.csv\" }")];

    /// A rule that does not exist. Whoever wrote the line believes that it does something.
    unknown_rule "data.unknown-rule", "a rule name that no rule has", [("build mono {", "waive thermal.tuch because \"locked rack\"\nbuild mono {")];

    /// A waiver that waives nothing: it matches no finding, gives no reason, or its date has passed.
    /// Left in place it hides nothing, but everybody who reads it believes that it does.
    stale_waiver "data.stale-waiver", "a waiver that waives nothing", [("build mono {", "waive thermal.sink because \"locked rack\"\nbuild mono {")];
}
