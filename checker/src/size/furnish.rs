//! Sizing a build that states no supply: usual parts are written into its text, and the text is solved
//! as anybody would who pastes it. Must not know how the answer is shown.

use std::collections::BTreeSet;
use std::path::{Path, PathBuf};
use std::sync::Arc;

use super::item::{BRIDGE_VOLTS, BRIDGES, RESERVOIRS, fuses, heatsinks, members, nearest};
use super::{Left, Row, Sized, blocking, collapsed, fails, left, moved};
use crate::Options;
use crate::build::statement::{Declared, Statement};
use crate::finding::{Margin, Measure};
use crate::quantity::{Dimension, Series, format_exact};
use crate::solver::Solver;
use crate::source::Files;

/// Melting I²t of a slow fuse over the square of its rated current, s. From memory, at the low end of
/// what makers state: the sheet of the one bought goes before.
const MELTS: f64 = 9.0;
/// A change of one thing at a time, so often at most.
const ROUNDS: usize = 6;

/// The text of a build, and where things are to be written into it.
pub(super) struct Board<'b> {
    files: &'b dyn Files,
    path: &'b Path,
    shown: &'b str,
    options: Options,
    /// The file of the build, its text, and where its block ends.
    place: (PathBuf, Arc<str>, usize),
    /// The build.
    pub(super) build: String,
    /// The loads by name, and each region as the file words it.
    pub(super) loads: Vec<String>,
    pub(super) mains: Vec<String>,
    /// Amplifier channels as stated.
    pub(super) channels: u32,
    claimed: f64,
    taps: Vec<f64>,
    sink_stated: bool,
}

/// A text over the file it stands for.
struct Pasted<'p> {
    files: &'p dyn Files,
    path: &'p Path,
    text: Arc<str>,
}

impl Files for Pasted<'_> {
    fn read(&self, path: &Path) -> Result<Arc<str>, String> {
        if path == self.path {
            Ok(self.text.clone())
        } else {
            self.files.read(path)
        }
    }
    fn tree(&self, path: &Path) -> Result<Arc<ampspec_grammar::Tree>, String> {
        if path == self.path {
            Ok(Arc::new(ampspec_grammar::parse(self.text.clone())))
        } else {
            self.files.tree(path)
        }
    }
    fn resolve(&self, path: &Path) -> PathBuf {
        self.files.resolve(path)
    }
}

/// The positions of what is chosen in the lists of usual values.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Choice {
    secondary: usize,
    rating: usize,
    reservoir: usize,
    sink: usize,
    capacitor_volts: usize,
    bridge: usize,
    bridge_volts: usize,
    ripple: usize,
    rail_fuse: usize,
    /// For each tap.
    mains_fuse: [usize; 4],
}

/// The lists of usual values.
pub(super) struct Lists {
    secondary: Vec<f64>,
    rating: Vec<f64>,
    sink: Vec<f64>,
    capacitor_volts: Vec<f64>,
    ripple: Vec<f64>,
    fuse: Vec<f64>,
}

pub(super) fn lists() -> Lists {
    Lists {
        secondary: members(Series::SecondaryVoltage, 6.0, 60.0),
        rating: members(Series::TransformerRating, 15.0, 3000.0),
        sink: heatsinks(),
        capacitor_volts: members(Series::CapacitorVoltage, 16.0, 450.0),
        ripple: members(Series::E24, 0.5, 60.0),
        fuse: fuses(),
    }
}

/// A choice that passes, or why none does.
pub(super) struct Found {
    pub(super) choice: Choice,
    pub(super) margins: Vec<Margin>,
    pub(super) moved: BTreeSet<String>,
}

impl<'b> Board<'b> {
    /// The build as its file stands.
    pub(super) fn of(
        solver: &Solver,
        build: &Declared,
        files: &'b dyn Files,
        path: &'b Path,
        shown: &'b str,
        options: &Options,
    ) -> Self {
        let view = solver.view(build, &[]);
        let seen = view.seen(build);
        let sources = &solver.project.sources;
        let text_of = |line: &Statement, group: usize| {
            let site = line.groups.get(group)?.site;
            let text = sources
                .text(site.file)
                .get(site.span.start..site.span.end)?;
            Some(text.split_whitespace().collect::<Vec<_>>().join(" "))
        };
        let (mut mains, mut taps) = (Vec::new(), Vec::new());
        if let Some(line) = seen.line("mains") {
            for (at, group) in line.groups.iter().enumerate() {
                mains.extend(text_of(line, at));
                taps.extend(group.number("tap").or_else(|| group.number("V")));
            }
        }
        let loads = seen
            .line("loads")
            .into_iter()
            .flat_map(|l| crate::build::view::names(l));
        let loads = loads.map(str::to_owned).collect();
        let channels = seen.group("channels").and_then(|g| g.number("n"));
        let file = sources.file(build.whole.file);
        let place = file.map(|f| (f.path.clone(), f.tree.text.clone(), build.whole.span.end));
        let amplifier = seen
            .group("amplifier")
            .and_then(|g| g.name("amplifier").map(str::to_owned));
        Self {
            files,
            path,
            shown,
            options: Options {
                build: None,
                ..options.clone()
            },
            place: place.unwrap_or_default(),
            build: build.name.clone(),
            loads,
            mains,
            channels: channels.map_or(1, |n| n.clamp(1.0, 64.0) as u32),
            claimed: claimed(solver, amplifier.as_deref()),
            taps,
            sink_stated: seen.line("heatsink").is_some_and(|l| !l.none),
        }
    }

    /// The text with a choice written in, for a use of the board.
    pub(super) fn pasted(&self, lists: &Lists, choice: &Choice, usage: &Use) -> String {
        let (_, text, end) = &self.place;
        // before the brace that closes the block
        let inside = end.saturating_sub(1);
        let (head, tail) = match (text.get(..inside), text.get(inside..)) {
            (Some(head), Some(tail)) => (head, tail),
            _ => (text.as_ref(), ""),
        };
        let (lines, blocks) = (self.lines(usage), self.blocks(lists, choice, usage));
        if usage.cell {
            // what the build says of channels, loads and mains gives way to this use
            let (name, from) = (self.name(usage), &self.build);
            return format!("{text}\n\nbuild {name} from {from} {{\n{lines}}}\n\n{blocks}");
        }
        format!("{head}\n{lines}{tail}\n\n{blocks}")
    }

    /// The build that is solved.
    fn name(&self, usage: &Use) -> String {
        if usage.cell {
            format!("{}-use", self.build)
        } else {
            self.build.clone()
        }
    }

    /// The lines of the build.
    pub(super) fn lines(&self, usage: &Use) -> String {
        let name = &self.build;
        let mut lines = format!(
            "    supply             {name}-supply per {}\n",
            usage.supply
        );
        if !self.sink_stated || usage.cell {
            lines.push_str(&format!("    heatsink           {name}-sink per channel\n"));
        }
        if usage.cell {
            lines.push_str(&format!(
                "    channels           {}\n    loads              {}\n    mains              {}\n",
                usage.channels, usage.loads, usage.mains
            ));
        }
        lines
    }

    /// The blocks to paste.
    fn blocks(&self, lists: &Lists, choice: &Choice, usage: &Use) -> String {
        let name = &self.build;
        let pick = |list: &[f64], at: usize| list.get(at).copied().unwrap_or_default();
        let say = |value: f64, dimension| format_exact(value, dimension);
        let mut taps = usage.taps.clone();
        taps.dedup();
        let primary: Vec<String> = taps.iter().map(|t| say(*t, Dimension::Voltage)).collect();
        let secondary = pick(&lists.secondary, choice.secondary);
        let rating = pick(&lists.rating, choice.rating);
        let several = taps.len() > 1;
        let mains_fuse: Vec<String> = taps
            .iter()
            .zip(choice.mains_fuse)
            .map(|(tap, at)| {
                let amps = pick(&lists.fuse, at);
                let tap = if several {
                    format!(" tap {}", say(*tap, Dimension::Voltage))
                } else {
                    String::new()
                };
                format!(
                    "{} slow melts {:.0} A2s{tap}",
                    say(amps, Dimension::Current),
                    (MELTS * amps * amps).max(1.0)
                )
            })
            .collect();
        let (bridge, surge) = BRIDGES.get(choice.bridge).copied().unwrap_or_default();
        let volts = pick(BRIDGE_VOLTS, choice.bridge_volts);
        let farads = pick(RESERVOIRS, choice.reservoir);
        let working = pick(&lists.capacitor_volts, choice.capacitor_volts);
        let ripple = pick(&lists.ripple, choice.ripple);
        let soft = soft_start(secondary, rating, farads, *taps.first().unwrap_or(&230.0));
        let mut text = format!(
            "transformer {name}-transformer {{\n    primary            {}\n    secondary          2 x {}ac\n    rating             {} per transformer\n    thermal-fuse       130 degC\n}}\n\nsupply {name}-supply {{\n    transformer        {name}-transformer\n    rectifier          1 x bridge {} {} surge {} drop 1.0 V\n    reservoir          1 x {} ±20 % {} ripple {} life 5000 h life-at 105 degC per rail\n    bleeder            {}\n    fuse mains         {}\n    fuse rail          {} fast\n    soft-start         {soft}\n}}\n",
            primary.join(", "),
            say(secondary, Dimension::Voltage),
            say(rating, Dimension::ApparentPower),
            say(volts, Dimension::Voltage),
            say(bridge, Dimension::Current),
            say(surge, Dimension::Current),
            say(farads, Dimension::Capacitance),
            say(working, Dimension::Voltage),
            say(ripple, Dimension::Current),
            bleeder(secondary, farads),
            mains_fuse.join(", "),
            say(pick(&lists.fuse, choice.rail_fuse), Dimension::Current),
        );
        if !self.sink_stated || usage.cell {
            text.push_str(&format!(
                "\nheatsink {name}-sink {{\n    resistance         {} at 50 K\n    touchable          no\n}}\n",
                say(pick(&lists.sink, choice.sink), Dimension::ThermalResistance)
            ));
        }
        text
    }

    /// Each region as the file words it, with the tap it uses.
    pub(super) fn regions(&self) -> impl Iterator<Item = (String, f64)> {
        self.mains.iter().cloned().zip(self.taps.iter().copied())
    }

    fn solve(&self, lists: &Lists, choice: &Choice, usage: &Use) -> Option<Vec<Margin>> {
        let text = self.pasted(lists, choice, usage);
        let files = Pasted {
            files: self.files,
            path: &self.place.0,
            text: text.into(),
        };
        let solver = Solver::read(&files, self.path, self.shown, &self.options).ok()?;
        let build = solver.project.find(&self.name(usage))?;
        Some(counted(solver.solve(build, &[]).margins, usage))
    }
}

/// A use of the board to be furnished.
#[derive(Clone, Debug)]
pub(super) struct Use {
    /// Channels, loads and mains in place of those that the build states.
    pub(super) cell: bool,
    pub(super) channels: u32,
    pub(super) loads: String,
    pub(super) mains: String,
    /// `build` or `channel`: how many supplies.
    pub(super) supply: &'static str,
    /// The claimed power need not be reached.
    pub(super) unclaimed: bool,
    pub(super) taps: Vec<f64>,
}

/// The margins that count for a use. What is unchecked for want of a figure of the supply's is none.
fn counted(mut margins: Vec<Margin>, usage: &Use) -> Vec<Margin> {
    margins.retain(|m| {
        let claim = usage.unclaimed && m.rule.starts_with("power.");
        !(claim || m.rule.starts_with("bom.") || m.rule.starts_with("data."))
    });
    margins
}

/// Watts that an amplifier claims into any load, at most.
fn claimed(solver: &Solver, amplifier: Option<&str>) -> f64 {
    let of = |b: &&Declared| amplifier.is_none_or(|a| b.name == a);
    let blocks = solver.project.of_kind("amplifier").filter(of);
    let lines = blocks
        .flat_map(|b| &b.lines)
        .filter(|l| l.key.name == "rated");
    let watts = lines.flat_map(|l| &l.groups).filter_map(|g| g.number("W"));
    watts.fold(0.0, f64::max)
}

/// A bleeder that brings the reservoir down within half a minute, and its watts twice over: E12.
fn bleeder(secondary: f64, farads: f64) -> String {
    let rail = secondary * 1.6;
    // from the rail to 20 V takes about RC·ln(V/20)
    let ohms = (20.0 / (farads * (rail / 20.0).max(2.0))).clamp(470.0, 10_000.0);
    let ohms = Series::E12.at_or_below(ohms).unwrap_or(1000.0);
    let watts = Series::ResistorPower
        .at_or_above(3.2 * rail * rail / ohms)
        .unwrap_or(100.0);
    format!(
        "{} ±5 % {} per rail",
        format_exact(ohms, Dimension::Resistance),
        format_exact(watts, Dimension::Power)
    )
}

/// A soft start that lets about twice the rated current through, bypassed when the reservoir is full.
fn soft_start(secondary: f64, rating: f64, farads: f64, tap: f64) -> String {
    let ohms = Series::E12
        .at_or_below(0.3 * tap * tap / rating.max(1.0))
        .unwrap_or(22.0)
        .clamp(2.2, 100.0);
    // the charge of both rails through the resistor as the secondary sees it
    let seen = ohms * (2.0 * secondary / tap) * (2.0 * secondary / tap) / 2.0;
    let seconds = (20.0 * seen * farads).clamp(0.5, 5.0);
    let milli = (seconds * 10.0).ceil() * 100.0;
    format!(
        "{} 50 W bypass {milli:.0} ms thermal-fuse 130 degC",
        format_exact(ohms, Dimension::Resistance)
    )
}

/// One coordinate of a choice.
pub(super) struct Coordinate {
    pub(super) name: &'static str,
    pub(super) of: fn(&mut Choice) -> &mut usize,
    /// The rule that rates just this value, and the end of the name of its part.
    rated: Option<(&'static str, &'static str)>,
}

const fn coordinate(
    name: &'static str,
    of: fn(&mut Choice) -> &mut usize,
    rated: Option<(&'static str, &'static str)>,
) -> Coordinate {
    Coordinate { name, of, rated }
}

/// Everything that is chosen. What couples with other things comes first, what only its own rating
/// decides comes last.
pub(super) const COORDINATES: &[Coordinate] = &[
    coordinate("transformer secondary", |c| &mut c.secondary, None),
    coordinate(
        "transformer rating",
        |c| &mut c.rating,
        Some(("current.transformer-duty", "")),
    ),
    coordinate("reservoir", |c| &mut c.reservoir, None),
    coordinate("heatsink", |c| &mut c.sink, None),
    coordinate(
        "reservoir volts",
        |c| &mut c.capacitor_volts,
        Some(("voltage.reservoir", "supply reservoir")),
    ),
    coordinate(
        "reservoir ripple",
        |c| &mut c.ripple,
        Some(("current.reservoir-ripple", "supply reservoir")),
    ),
    coordinate(
        "bridge amperes",
        |c| &mut c.bridge,
        Some(("current.rectifier-mean", "")),
    ),
    coordinate(
        "bridge volts",
        |c| &mut c.bridge_volts,
        Some(("voltage.rectifier-reverse", "")),
    ),
    coordinate(
        "rail fuse",
        |c| &mut c.rail_fuse,
        Some(("current.fuse-rms", "fuse rail")),
    ),
    coordinate(
        "mains fuse",
        |c| &mut c.mains_fuse[0],
        Some(("current.fuse-rms", "fuse mains")),
    ),
    coordinate(
        "mains fuse, second tap",
        |c| &mut c.mains_fuse[1],
        Some(("current.fuse-rms", "fuse mains")),
    ),
    coordinate(
        "mains fuse, third tap",
        |c| &mut c.mains_fuse[2],
        Some(("current.fuse-rms", "fuse mains")),
    ),
    coordinate(
        "mains fuse, fourth tap",
        |c| &mut c.mains_fuse[3],
        Some(("current.fuse-rms", "fuse mains")),
    ),
];

/// Where the search begins: generous in everything but the secondary.
fn start(board: &Board<'_>, lists: &Lists, usage: &Use) -> Choice {
    let carried = if usage.supply == "channel" {
        1
    } else {
        usage.channels
    };
    let watts = board.claimed.max(10.0) * f64::from(carried);
    // Vs·√2·0.9 = √(2PR) + 4 V, R about 8 ohm
    let secondary = ((2.0 * board.claimed.max(10.0) * 8.0).sqrt() + 4.0) / 1.27;
    let rating = nearest(&lists.rating, 5.0 * watts);
    let mut choice = Choice {
        secondary: nearest(&lists.secondary, secondary),
        rating,
        reservoir: nearest(RESERVOIRS, 22_000e-6),
        sink: nearest(&lists.sink, 0.15),
        capacitor_volts: lists.capacitor_volts.len().saturating_sub(1),
        bridge: BRIDGES.len() - 1,
        bridge_volts: 4,
        ripple: lists.ripple.len().saturating_sub(1),
        rail_fuse: nearest(&lists.fuse, 20.0),
        mains_fuse: [0; 4],
    };
    refuse(lists, usage, &mut choice);
    choice
}

/// Mains fuses at twice the rated primary current of each tap: in the middle of their band.
fn refuse(lists: &Lists, usage: &Use, choice: &mut Choice) {
    let rating = lists.rating.get(choice.rating).copied().unwrap_or_default();
    for (fuse, tap) in choice.mains_fuse.iter_mut().zip(&usage.taps) {
        *fuse = nearest(&lists.fuse, 2.0 * rating / tap);
    }
}

/// The smallest usual parts with which a use passes, or the margin that stands in the way of all.
pub(super) fn furnish(board: &Board<'_>, usage: &Use) -> Result<Found, Option<Left>> {
    let lists = lists();
    if usage.taps.is_empty() || usage.taps.len() > 4 {
        return Err(None);
    }
    let mut choice = start(board, &lists, usage);
    let mut margins = board.solve(&lists, &choice, usage).ok_or(None)?;
    // what no choice moves is not a matter of size
    let mut other = choice;
    other.secondary = (choice.secondary + 2).min(lists.secondary.len() - 1);
    other.rating = choice.rating.saturating_sub(2);
    other.sink = choice.sink.saturating_sub(8);
    other.reservoir = choice.reservoir.saturating_sub(3);
    for coordinate in COORDINATES.iter().skip(4) {
        let at = (coordinate.of)(&mut other);
        *at = at.saturating_sub(2);
    }
    let others = board.solve(&lists, &other, usage).ok_or(None)?;
    let moved = moved(&[&margins, &others]);
    if usage.unclaimed {
        // no power asks for a high rail: the highest that everything else stands
        return down(board, &lists, usage, choice, moved, None);
    }
    // up to the first secondary that passes; where a higher one is too much for something, down
    let mut first = None;
    let from = choice.secondary.saturating_sub(2);
    let mut passes = false;
    for at in from..lists.secondary.len().min(from + 10) {
        choice.secondary = at;
        margins = board.solve(&lists, &choice, usage).ok_or(None)?;
        let Some(why) = blocking(&margins, &moved) else {
            passes = true;
            break;
        };
        first = Some(Left::of(why));
        if !too_low(why) {
            break;
        }
    }
    if !passes {
        return down(board, &lists, usage, choice, moved, first);
    }
    settle(board, &lists, usage, choice, margins, moved)
}

/// Whether a margin asks for more volts: a power not reached, a supply that gives out.
fn too_low(why: &Margin) -> bool {
    why.rule.starts_with("power.") || collapsed(why)
}

/// Lower secondaries, where a higher one is too much for something.
fn down(
    board: &Board<'_>,
    lists: &Lists,
    usage: &Use,
    mut choice: Choice,
    moved: BTreeSet<String>,
    first: Option<Left>,
) -> Result<Found, Option<Left>> {
    while choice.secondary > 0 {
        choice.secondary -= 1;
        let margins = board.solve(lists, &choice, usage).ok_or(None)?;
        match blocking(&margins, &moved) {
            None => return settle(board, lists, usage, choice, margins, moved),
            // neither too high nor too low, but never right
            Some(why) if too_low(why) => break,
            Some(_) => {}
        }
    }
    Err(first)
}

/// Every part down to the smallest that passes, one at a time, until none can go down.
fn settle(
    board: &Board<'_>,
    lists: &Lists,
    usage: &Use,
    choice: Choice,
    margins: Vec<Margin>,
    moved: BTreeSet<String>,
) -> Result<Found, Option<Left>> {
    let mut found = Found {
        choice,
        margins,
        moved,
    };
    for _ in 0..ROUNDS {
        let before = found.choice;
        // without a claim the secondary is the highest, not the lowest
        for coordinate in COORDINATES.iter().skip(usize::from(usage.unclaimed)) {
            lower(board, lists, usage, coordinate, &mut found);
        }
        if found.choice == before {
            break;
        }
    }
    Ok(found)
}

/// One part down to the smallest that passes: straight to what its rating needs where a rule rates just
/// this, else in growing steps, then halving. What passes lies above what fails; the value before the
/// one that stands has been seen to fail.
fn lower(
    board: &Board<'_>,
    lists: &Lists,
    usage: &Use,
    coordinate: &Coordinate,
    found: &mut Found,
) {
    let mut passes = *(coordinate.of)(&mut found.choice.clone());
    let mut fails: Option<usize> = None;
    let mut step = 1;
    let mut guess = leap(coordinate, lists, found);
    while passes > fails.map_or(0, |f| f + 1) {
        let low = fails.map_or(0, |f| f + 1);
        let at = match (guess.take(), fails) {
            (Some(at), _) if at >= low && at < passes => at,
            (_, None) => passes.saturating_sub(step),
            (_, Some(f)) => usize::midpoint(f, passes).clamp(low, passes - 1),
        };
        let mut next = found.choice;
        *(coordinate.of)(&mut next) = at;
        let mut solved = passing(board, lists, usage, &next, &found.moved);
        if solved.is_none() && coordinate.name == "transformer rating" {
            // a smaller transformer may want a smaller fuse
            refuse(lists, usage, &mut next);
            solved = passing(board, lists, usage, &next, &found.moved);
        }
        match solved {
            Some(margins) => {
                (found.choice, found.margins, passes) = (next, margins, at);
                step *= 2;
            }
            None => fails = Some(at),
        }
    }
}

/// The margins of a choice, where it passes.
fn passing(
    board: &Board<'_>,
    lists: &Lists,
    usage: &Use,
    choice: &Choice,
    moved: &BTreeSet<String>,
) -> Option<Vec<Margin>> {
    let solved = board.solve(lists, choice, usage)?;
    blocking(&solved, moved).is_none().then_some(solved)
}

/// The position that a rating needs at least, of what its margin uses of the one that it has.
fn leap(coordinate: &Coordinate, lists: &Lists, found: &Found) -> Option<usize> {
    let (rule, part) = coordinate.rated?;
    let of = |m: &&Margin| m.rule == rule && m.part.name.ends_with(part);
    let used = found
        .margins
        .iter()
        .filter(of)
        .filter_map(|m| m.used_percent)
        .reduce(f64::max)?;
    let now = *(coordinate.of)(&mut found.choice.clone());
    let needed = said(lists, coordinate.name, now)?.0 * used / 100.0;
    (0..now).find(|at| said(lists, coordinate.name, *at).is_some_and(|s| s.0 >= needed))
}

/// The use that a build itself states.
pub(super) fn own(board: &Board<'_>) -> Use {
    Use {
        cell: false,
        channels: board.channels,
        loads: String::new(),
        mains: String::new(),
        supply: "build",
        unclaimed: false,
        taps: board.taps.clone(),
    }
}

/// One row for every part of the supply and the sink, and the text to paste.
pub(super) fn rows(board: &Board<'_>, sized: &mut Sized) {
    let usage = own(board);
    let lists = lists();
    let found = match furnish(board, &usage) {
        Ok(found) => found,
        Err(why) => {
            sized.rows.push(Row {
                build: board.build.clone(),
                item: "supply",
                needed: None,
                offered: None,
                stated: String::new(),
                statements: Vec::new(),
                margins: Vec::new(),
                limited: why.map(|left| ("any usual supply".to_owned(), left)),
            });
            return;
        }
    };
    let pasted = self::Board::blocks(board, &lists, &found.choice, &usage);
    for coordinate in COORDINATES {
        sized
            .rows
            .extend(row(board, &lists, &usage, &found, coordinate));
    }
    let lines = board.lines(&usage);
    sized.pasted.push((
        board.build.clone(),
        format!("{pasted}\nbuild {}:\n{lines}", board.build),
    ));
    let open = found
        .margins
        .iter()
        .filter(|m| fails(m) && !found.moved.contains(&m.id));
    sized
        .elsewhere
        .extend(open.map(|m| (board.build.clone(), Left::of(m))));
}

fn row(
    board: &Board<'_>,
    lists: &Lists,
    usage: &Use,
    found: &Found,
    coordinate: &Coordinate,
) -> Option<Row> {
    let name = coordinate.name;
    let at = *(coordinate.of)(&mut found.choice.clone());
    let (value, dimension, unit, line) = said(lists, name, at)?;
    // a tap that is not there has no fuse
    let tap = COORDINATES
        .iter()
        .filter(|c| c.name.starts_with("mains fuse"))
        .position(|c| c.name == name);
    if tap.is_some_and(|k| k >= usage.taps.len())
        || (name == "heatsink" && board.sink_stated && !usage.cell)
    {
        return None;
    }
    // the next smaller, or, where there is none, the next greater shows what the choice moves
    let beside = if at > 0 { at - 1 } else { at + 1 };
    let mut next = found.choice;
    *(coordinate.of)(&mut next) = beside;
    let solved = board.solve(lists, &next, usage)?;
    let why = blocking(&solved, &found.moved)
        .filter(|_| at > 0)
        .map(Left::of);
    let text = |at: usize| said(lists, name, at).map(|s| format_exact(s.0, s.1));
    let only = moved(&[&found.margins, &solved]);
    Some(Row {
        build: board.build.clone(),
        item: name,
        needed: Some(Measure::new(value, unit)),
        offered: Some(format_exact(value, dimension)),
        stated: String::new(),
        statements: vec![format!("{line} {}", format_exact(value, dimension))],
        margins: left(&found.margins, &only),
        limited: text(beside).zip(why),
    })
}

/// A choice in words: value, dimension, unit and the key of its line.
fn said(
    lists: &Lists,
    name: &str,
    at: usize,
) -> Option<(f64, Dimension, &'static str, &'static str)> {
    let of = |list: &[f64]| list.get(at).copied();
    Some(match name {
        "transformer secondary" => (
            of(&lists.secondary)?,
            Dimension::Voltage,
            "V",
            "transformer secondary 2 x",
        ),
        "transformer rating" => (
            of(&lists.rating)?,
            Dimension::ApparentPower,
            "VA",
            "transformer rating",
        ),
        "reservoir" => (
            of(RESERVOIRS)?,
            Dimension::Capacitance,
            "F",
            "supply reservoir, per rail",
        ),
        "heatsink" => (
            of(&lists.sink)?,
            Dimension::ThermalResistance,
            "K/W",
            "heatsink resistance",
        ),
        "reservoir volts" => (
            of(&lists.capacitor_volts)?,
            Dimension::Voltage,
            "V",
            "supply reservoir, working",
        ),
        "reservoir ripple" => (
            of(&lists.ripple)?,
            Dimension::Current,
            "A",
            "supply reservoir ripple",
        ),
        "bridge amperes" => (
            BRIDGES.get(at)?.0,
            Dimension::Current,
            "A",
            "supply rectifier bridge",
        ),
        "bridge volts" => (
            of(BRIDGE_VOLTS)?,
            Dimension::Voltage,
            "V",
            "supply rectifier bridge",
        ),
        "rail fuse" => (
            of(&lists.fuse)?,
            Dimension::Current,
            "A",
            "supply fuse rail",
        ),
        _ => (
            of(&lists.fuse)?,
            Dimension::Current,
            "A",
            "supply fuse mains",
        ),
    })
}

/// What a choice comes to in a few words: `2 x 25 Vac 160 VA, 10000 uF a rail, sinks of 0.47 K/W`.
pub(super) fn brief(found: &Found) -> String {
    let lists = lists();
    let c = &found.choice;
    let say = |name: &str, at: usize| {
        said(&lists, name, at)
            .map(|s| format_exact(s.0, s.1))
            .unwrap_or_default()
    };
    format!(
        "2 x {}ac {}, {} a rail, sinks of {}",
        say("transformer secondary", c.secondary),
        say("transformer rating", c.rating),
        say("reservoir", c.reservoir),
        say("heatsink", c.sink)
    )
}
