//! bom.missing: parts of the spec that the bill of materials does not hold. Found by `crate::bom`.

use crate::rule::Allow;

rule! {
    /// What is not on the list is not ordered, and three hundred kits go out without it. A line of the
    /// spec that names neither designator nor order code cannot be looked for: it is unchecked, never
    /// taken as present.
    "bom.missing",
    compares: "the parts and designators of the spec with those of the bill of materials",
    stress: "",
    rating: "",
    formula: "",
    source: "common practice, no source",
    reads: ["stage.devices", "stage.emitter", "supply.reservoir"],
    sense: Fault,
    unit: "",
    allow: Allow::None, "",
    remedies: [],
    example: "tern60", [("devices             n16 p16 ref Q7-Q10", "devices             n16 p16 ref Q7-Q11")],
}
