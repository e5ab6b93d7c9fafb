//! The parts that one build of a spec wants: how many, under which designators, and what of each is
//! compared. Must not know what a list looks like.

use std::rc::Rc;

use crate::build::parts::{Build, Device, Reader, Stage};
use crate::build::statement::{Group, Select, Value};
use crate::build::view::{Seen, View};
use crate::finding::Site;
use crate::quantity::Quantity;

/// What the quantities of a list are for.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Basis {
    /// One build: all its boards, supplies and heatsinks.
    #[default]
    Build,
    /// One board, with one of everything it shares with others.
    Board,
}

/// How what is ordered may differ from what was checked.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Sense {
    /// Not at all.
    Equal,
    /// It may be more.
    AtLeast,
    /// It may be less.
    AtMost,
}

/// A figure that the list should agree with.
#[derive(Clone, Debug)]
pub(super) struct Figure {
    pub(super) quantity: Quantity,
    pub(super) sense: Sense,
    /// As the spec writes it.
    pub(super) text: String,
}

/// One part that is wanted.
#[derive(Clone, Debug)]
pub(super) struct Wanted {
    /// As a template names it, and the same in every alternate: `out emitter`, `out upper`.
    pub(super) handle: String,
    /// What the spec calls it, `n16`; the handle where it has no name of its own.
    pub(super) name: String,
    /// The block whose line wants it.
    pub(super) block: String,
    /// In words, for a template: `emitter resistor`.
    pub(super) what: &'static str,
    /// Designators on one board.
    pub(super) refs: Vec<String>,
    /// Order code.
    pub(super) code: Option<String>,
    /// How many; `None` where it cannot be worked out and is not stated.
    pub(super) count: Option<u32>,
    /// What is compared.
    pub(super) figures: Vec<Figure>,
    /// `slow` or `fast`, of a fuse.
    pub(super) speed: Option<&'static str>,
    /// `npn` and its like.
    pub(super) flavour: Option<&'static str>,
    /// The line.
    pub(super) site: Site,
}

impl Wanted {
    /// Value and ratings as the spec writes them.
    pub(super) fn figures_text(&self) -> String {
        let figures = self.figures.iter().map(|f| f.text.as_str());
        figures.chain(self.speed).collect::<Vec<_>>().join(" ")
    }

    /// `n16, npn transistor`, `emitter resistor`.
    pub(super) fn described(&self) -> String {
        let what = match self.flavour {
            Some(flavour) => format!("{flavour} {}", self.what),
            None => self.what.to_owned(),
        };
        if self.name.contains(' ') {
            what
        } else {
            format!("{}, {what}", self.name)
        }
    }

    /// `4 x WW5-0R22J 0R22 ±5 % 5 W`.
    pub(super) fn text(&self) -> String {
        let count = self.count.map(|n| format!("{n} x"));
        let said = [count, self.code.clone(), Some(self.figures_text())];
        let said: Vec<String> = said
            .into_iter()
            .flatten()
            .filter(|t| !t.is_empty())
            .collect();
        if said.is_empty() {
            self.name.clone()
        } else {
            said.join(" ")
        }
    }
}

/// What is wanted with one alternate.
#[derive(Clone, Debug)]
pub(super) struct Alternative {
    pub(super) name: String,
    pub(super) wanted: Vec<Wanted>,
}

/// One part of a line: what it is, the first letter of its designators where a line holds two, and
/// which slots are compared how.
struct Piece {
    what: &'static str,
    suffix: &'static str,
    letter: Option<char>,
    slots: &'static [(&'static str, Sense)],
}

const RESISTOR: &[(&str, Sense)] = &[("ohm", Sense::Equal), ("W", Sense::AtLeast)];
const CAPACITOR: &[(&str, Sense)] = &[("F", Sense::Equal), ("V", Sense::AtLeast)];
const COOLING: &[(&str, Sense)] = &[("K/W", Sense::AtMost)];

/// A whole line that is one part.
const fn one(what: &'static str, slots: &'static [(&'static str, Sense)]) -> Piece {
    Piece {
        what,
        suffix: "",
        letter: None,
        slots,
    }
}

/// The lines that are bought, with their pieces.
const LINES: &[(&str, &str, &[Piece])] = &[
    ("stage", "emitter", &[one("emitter resistor", RESISTOR)]),
    (
        "stage",
        "base-emitter",
        &[one("base-emitter resistor", RESISTOR)],
    ),
    ("stage", "insulator", &[one("insulator", COOLING)]),
    ("stage", "own-sink", &[one("heatsink of its own", COOLING)]),
    (
        "amplifier",
        "board-reservoir",
        &[one("reservoir on the board", CAPACITOR)],
    ),
    (
        "supply",
        "rectifier",
        &[one(
            "bridge rectifier",
            &[("V", Sense::AtLeast), ("A", Sense::AtLeast)],
        )],
    ),
    ("supply", "reservoir", &[one("reservoir", CAPACITOR)]),
    ("supply", "bleeder", &[one("bleeder", RESISTOR)]),
    ("supply", "fuse", &[one("fuse", &[("A", Sense::Equal)])]),
    (
        "supply",
        "soft-start",
        &[one("soft-start resistor", RESISTOR)],
    ),
    (
        "protection",
        "contacts",
        &[one("relay", &[("coil", Sense::Equal)])],
    ),
    (
        "protection",
        "switch",
        &[one("solid-state switch", &[("V", Sense::AtLeast)])],
    ),
    (
        "protection",
        "crowbar",
        &[one("crowbar", &[("V", Sense::AtLeast)])],
    ),
    (
        "protection",
        "cutout",
        &[one("thermal cutout", &[("degC", Sense::Equal)])],
    ),
    (
        "network",
        "zobel",
        &[
            Piece {
                what: "Zobel resistor",
                suffix: " resistor",
                letter: Some('R'),
                slots: RESISTOR,
            },
            Piece {
                what: "Zobel capacitor",
                suffix: " capacitor",
                letter: Some('C'),
                slots: CAPACITOR,
            },
        ],
    ),
    (
        "network",
        "coil",
        &[
            Piece {
                what: "output coil",
                suffix: "",
                letter: Some('L'),
                slots: &[("H", Sense::Equal)],
            },
            Piece {
                what: "resistor across the coil",
                suffix: " damp",
                letter: Some('R'),
                slots: &[("damp", Sense::Equal), ("W", Sense::AtLeast)],
            },
        ],
    ),
];

/// How many of each there are.
#[derive(Clone, Copy)]
struct Numbers {
    channels: u32,
    boards: u32,
    supplies: u32,
    sinks: u32,
}

/// Every part that a build wants, in the order in which a signal meets them.
///
/// # Errors
/// When the build lacks what makes it one.
pub(super) fn of(view: &View<'_>, basis: Basis) -> Result<Vec<Wanted>, String> {
    let build = Reader::new(view).build().map_err(|needs| {
        let keys: Vec<&str> = needs.keys.iter().map(|n| n.key.as_str()).collect();
        format!("build {} lacks {}", view.build.name, keys.join(", "))
    })?;
    let mut search = Search {
        view,
        numbers: numbers(&build, basis),
        taps: build
            .mains
            .get()
            .into_iter()
            .flatten()
            .filter_map(|r| r.tap.map(|t| t.0))
            .collect(),
        out: Vec::new(),
    };
    let amplifier = &build.amplifier;
    let stages = [
        &amplifier.voltage_amplifier,
        &amplifier.predriver,
        &amplifier.driver,
    ];
    for stage in stages.into_iter().flatten() {
        search.stage(stage);
    }
    search.stage(&amplifier.output);
    search.lines("amplifier", &amplifier.owner.name, 1);
    if let Some(network) = &amplifier.network {
        search.lines("network", &network.owner.name, 1);
    }
    if let Some((supply, _)) = build.supply.get() {
        search.transformer(&supply.owner.name, supply.transformers);
        search.lines("supply", &supply.owner.name, supply.transformers);
    }
    if let Some((sink, _)) = build.heatsink.get() {
        search.heatsink(&sink.owner.name);
    }
    if let Some(protection) = build.protection.get() {
        search.lines("protection", &protection.owner.name, 1);
    }
    Ok(search.out)
}

fn numbers(build: &Build, basis: Basis) -> Numbers {
    let on_board = build
        .amplifier
        .channels_per_board
        .get()
        .copied()
        .unwrap_or(1)
        .max(1);
    if basis == Basis::Board {
        return Numbers {
            channels: on_board,
            boards: 1,
            supplies: 1,
            sinks: 1,
        };
    }
    let channels = build.channels.get().copied().unwrap_or(1);
    let shared = |by: Option<u32>| channels.div_ceil(by.unwrap_or(channels).max(1));
    Numbers {
        channels,
        boards: channels.div_ceil(on_board),
        supplies: shared(build.supply.get().map(|s| s.1)),
        sinks: shared(build.heatsink.get().map(|s| s.1)),
    }
}

struct Search<'s, 'v> {
    view: &'s View<'v>,
    numbers: Numbers,
    /// Straps in use.
    taps: Vec<f64>,
    out: Vec<Wanted>,
}

impl<'v> Search<'_, 'v> {
    fn seen(&self, kind: &str, name: &str) -> Option<Rc<Seen<'v>>> {
        self.view.block(name, kind)
    }

    /// The devices of a stage and its other parts.
    fn stage(&mut self, stage: &Stage) {
        let name = &stage.owner.name;
        let follower = stage.connection != "common-emitter";
        let pairs = stage.pairs.get().copied();
        // how a voltage amplifier is made up is not stated
        let each = pairs
            .filter(|_| follower)
            .map(|n| n * self.numbers.channels);
        let stated = stage.bought.quantity.map(|n| n * self.numbers.boards);
        let single = Rc::ptr_eq(&stage.upper, &stage.lower)
            || stage.upper.owner.name == stage.lower.owner.name;
        let site = stage.devices.site();
        let mut put = |side: &str, device: &Device, code: Option<String>, count: Option<u32>| {
            self.out.push(Wanted {
                handle: format!("{name} {side}"),
                name: device.owner.name.clone(),
                block: name.clone(),
                what: "transistor",
                refs: stage.bought.refs.clone(),
                code,
                count: count.or(stated),
                figures: Vec::new(),
                speed: None,
                flavour: device.kind.filter(|k| *k != "complementary"),
                site,
            });
        };
        match (single, stage.upper.codes.as_slice()) {
            (true, [upper, lower]) => {
                put("upper", &stage.upper, Some(upper.clone()), each);
                put("lower", &stage.upper, Some(lower.clone()), each);
            }
            (true, codes) => {
                put(
                    "devices",
                    &stage.upper,
                    codes.first().cloned(),
                    each.map(|n| 2 * n),
                );
            }
            (false, codes) => {
                put("upper", &stage.upper, codes.first().cloned(), each);
                put(
                    "lower",
                    &stage.lower,
                    stage.lower.codes.first().cloned(),
                    each,
                );
            }
        }
        self.lines("stage", name, pairs.unwrap_or(1));
    }

    /// Every bought line of a block. `each` is the pairs of a stage, the transformers of a supply.
    fn lines(&mut self, kind: &'static str, name: &str, each: u32) {
        let Some(seen) = self.seen(kind, name) else {
            return;
        };
        for (_, key, pieces) in LINES.iter().filter(|l| l.0 == kind) {
            for line in seen.all(key) {
                for (at, group) in line.groups.iter().enumerate() {
                    if self.other_strap(group) {
                        continue;
                    }
                    let mut handle = format!("{name} {key}");
                    if let Some(Select::Word(word)) = line.select {
                        handle.push_str(&format!(" {word}"));
                    }
                    if at > 0 {
                        handle.push_str(&format!(" {}", at + 1));
                    }
                    let count = self.count(kind, key, group, each);
                    for piece in *pieces {
                        self.piece(name, &handle, piece, group, count);
                    }
                }
            }
        }
    }

    /// A fuse for a strap that no region of the build uses.
    fn other_strap(&self, group: &Group) -> bool {
        let Some(tap) = group.number("tap") else {
            return false;
        };
        !self.taps.is_empty() && !self.taps.iter().any(|t| (t - tap).abs() < 1e-6 * tap.abs())
    }

    fn piece(
        &mut self,
        block: &str,
        handle: &str,
        piece: &Piece,
        group: &Group,
        count: Option<u32>,
    ) {
        let figures = self.figures(group, piece.slots);
        if figures.is_empty() && piece.letter.is_some() {
            return;
        }
        let refs = group
            .bought
            .refs
            .iter()
            .filter(|r| piece.letter.is_none_or(|letter| r.starts_with(letter)))
            .cloned()
            .collect();
        let handle = format!("{handle}{}", piece.suffix);
        self.out.push(Wanted {
            name: handle.clone(),
            handle,
            block: block.to_owned(),
            what: piece.what,
            refs,
            code: group.bought.part.clone(),
            count: count.or(group.bought.quantity),
            figures,
            speed: group.word("slow"),
            flavour: None,
            site: group.site,
        });
    }

    /// How many of a line there are, where that can be worked out.
    fn count(&self, kind: &str, key: &str, group: &Group, each: u32) -> Option<u32> {
        let n = self.numbers;
        let per = group.per().map(|(word, _)| word);
        Some(match (kind, key, per) {
            ("stage", "emitter" | "insulator", _) => 2 * each * n.channels,
            ("stage", "own-sink", Some("device")) => 2 * each * n.channels,
            ("stage", "own-sink", _) => n.channels,
            ("amplifier", "board-reservoir", _) => 2 * group.count() * n.boards,
            ("supply", "rectifier", _) => group.count() * n.supplies,
            ("supply", "reservoir", _) => 2 * group.count() * n.supplies,
            ("supply", "bleeder" | "fuse", Some("rail")) => 2 * n.supplies,
            ("supply", "bleeder" | "fuse", Some("supply")) => n.supplies,
            ("supply", "fuse", Some("transformer")) => each * n.supplies,
            ("supply", "fuse", Some("channel")) | ("network", ..) => n.channels,
            ("supply", "soft-start", _) => n.supplies,
            _ => return None,
        })
    }

    fn figures(&self, group: &Group, slots: &[(&'static str, Sense)]) -> Vec<Figure> {
        let mut out = Vec::new();
        for (slot, sense) in slots {
            let Some(slot) = group.get(slot) else {
                continue;
            };
            if let Value::Quantity(quantity) = slot.value {
                let text = self.view.project.sources.text(slot.site.file);
                out.push(Figure {
                    quantity,
                    sense: *sense,
                    text: words(slot.site.span.slice(text)),
                });
            }
        }
        out
    }

    /// The transformers, which stand in a block of their own.
    fn transformer(&mut self, supply: &str, each: u32) {
        let Some(seen) = self.seen("supply", supply) else {
            return;
        };
        let Some(line) = seen.line("transformer") else {
            return;
        };
        let Some(name) = crate::build::view::names(line).next() else {
            return;
        };
        let name = self.view.name(name).to_owned();
        let mut figures = Vec::new();
        if let Some(block) = self.seen("transformer", &name) {
            if let Some(group) = block.group("secondary") {
                figures.extend(self.figures(group, &[("V", Sense::Equal)]));
                for volts in &mut figures {
                    volts.text = format!("{} x {}", group.count(), volts.text);
                }
            }
            if let Some(group) = block.group("rating") {
                figures.extend(self.figures(group, &[("VA", Sense::AtLeast)]));
            }
        }
        let count = each * self.numbers.supplies;
        self.named(
            format!("{supply} transformer"),
            name,
            "mains transformer",
            supply,
            figures,
            count,
            line.site,
        );
    }

    fn heatsink(&mut self, sink: &str) {
        let Some(block) = self.seen("heatsink", sink) else {
            return;
        };
        let figures = block
            .group("resistance")
            .map(|g| self.figures(g, COOLING))
            .unwrap_or_default();
        let site = block.declared.site;
        let count = self.numbers.sinks;
        self.named(
            "heatsink".to_owned(),
            sink.to_owned(),
            "heatsink",
            sink,
            figures,
            count,
            site,
        );
    }

    #[allow(clippy::too_many_arguments, reason = "one place each, two callers")]
    fn named(
        &mut self,
        handle: String,
        name: String,
        what: &'static str,
        block: &str,
        figures: Vec<Figure>,
        count: u32,
        site: Site,
    ) {
        self.out.push(Wanted {
            handle,
            name,
            block: block.to_owned(),
            what,
            refs: Vec::new(),
            code: None,
            count: Some(count),
            figures,
            speed: None,
            flavour: None,
            site,
        });
    }
}

/// Text with single spaces.
fn words(text: &str) -> String {
    text.split_whitespace().collect::<Vec<_>>().join(" ")
}
