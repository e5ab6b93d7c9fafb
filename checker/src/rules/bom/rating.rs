//! bom.rating: what is ordered against what was checked. Found by `crate::bom`.

use crate::rule::Allow;

rule! {
    /// Every margin holds for the part that the spec describes. When the list says `10000u/50V` where the
    /// spec was checked with 63 V, or names another transistor, nothing that was computed speaks of the
    /// parts in the box. Values and fuse ratings must agree; volts, watts and amperes may be higher.
    "bom.rating",
    compares: "order code, value and ratings of a row of the bill of materials with the line of the spec",
    stress: "",
    rating: "",
    formula: "",
    source: "common practice, no source",
    reads: ["stage.emitter", "supply.reservoir", "supply.rectifier", "supply.fuse", "network.zobel", "device.part"],
    sense: Fault,
    unit: "",
    allow: Allow::None, "",
    remedies: [],
    example: "tern60", [("±20 % 63 V", "±20 % 80 V")],
}
