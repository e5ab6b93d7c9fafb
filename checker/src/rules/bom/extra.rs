//! bom.extra: rows of the bill of materials that the spec does not speak of. Found by `crate::bom`.

use crate::rule::Allow;

rule! {
    /// A list holds much that no spec speaks of, screws and small signal parts, and that is only listed.
    /// It is an error where a designator stands on no line of the part it is listed under, or where the
    /// list allows a substitute that no `alternate` has had checked; a device that the spec declares and
    /// the build does not use is a warning.
    "bom.extra",
    compares: "rows, designators and substitutes of the bill of materials with the spec",
    stress: "",
    rating: "",
    formula: "",
    source: "common practice, no source",
    reads: ["stage.devices", "alternate.replace"],
    sense: Fault,
    unit: "",
    allow: Allow::None, "",
    remedies: [],
    example: "tern60", [("ref R21-R24", "ref R21-R23")],
}
