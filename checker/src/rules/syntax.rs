//! Faults of the text itself, found while it is read: one record for each kind.

/// Declares the record of a fault that reading finds. The doc comment is its "why".
macro_rules! reading {
    ($($(#[doc = $why:literal])+ $id:ident $name:literal, $compares:literal, [$(($old:literal, $new:literal)),+ $(,)?];)+) => { $(
        pub mod $id {
            //! A fault of the text.
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
    /// Text that cannot be read at all: a stray brace or comma, an unclosed block or string, a hidden
    /// character. The line is left out of every check and everything else is still checked, so its
    /// margins show as unchecked until it is mended.
    text "syntax.text", "text that cannot be read", [("pairs              2", "pairs              2 }")];

    /// The first line names the version of the language the file is written in, so that a later
    /// program can still read an old file as it was meant.
    version "syntax.version", "the version line", [("ampspec 1\n", "ampspec 9\n")];

    /// A line outside blocks that is no statement is ignored; what it was meant to say would be
    /// silently missing if nobody said so.
    statement "syntax.statement", "a line outside blocks that is no statement", [("ampspec 1\n", "ampspec 1\nincludes \"x\"\n")];

    /// A block of a kind that does not exist is ignored with all its lines, and whatever names it
    /// finds nothing.
    block "syntax.block", "a kind of block that does not exist", [("heatsink fins {", "heatsinks fins {")];

    /// A key that a block does not have states nothing. A typing slip here would leave a part
    /// unchecked that the writer believes to be stated.
    key "syntax.key", "a key that a block does not have", [("    insulator           0.35", "    isulator            0.35")];

    /// A name may not be a unit, or no line could tell the two apart.
    name "syntax.name", "a name that cannot be one", [("network net {", "network V {"), ("network            net", "network            V")];

    /// A word that the key does not know: a choice mistyped, a label of another key.
    word "syntax.word", "a word that means nothing where it stands", [("connection          emitter-follower", "connection          emiter-follower")];

    /// A key whose value is missing or incomplete states nothing, and what needs it goes unchecked.
    value "syntax.value", "a missing or incomplete value", [("muting             3 s", "muting")];

    /// A number that is not one number: two decimal marks, letters among the digits, not finite.
    number "syntax.number", "digits that make no number", [("pairs               2", "pairs               2.5")];

    /// A quantity without a unit, or with the unit of something else. Nothing is guessed: a bare 22
    /// could be ohms, volts or thousands of either.
    unit "syntax.unit", "a missing or wrong unit", [("vceo               240 V", "vceo               240")];

    /// A tolerance where none is used, or one that cannot be read.
    tolerance "syntax.tolerance", "a tolerance that is not used or not readable", [("junction-case      0.69 K/W", "junction-case      0.69 K/W ±5 %")];

    /// A spelling that was accepted and could be misread by people: shown once with the usual one.
    spelling "syntax.spelling", "an unusual spelling", [("zobel              8R2 3 W", "zobel              8,2 ohm 3 W")];
}
