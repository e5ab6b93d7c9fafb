//! A build that states no supply, with usual parts written into its text: the text is solved as by
//! anybody who pastes it. Must not know which parts are chosen.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use super::choice::{Choice, Lists};
use super::item::{BRIDGE_VOLTS, BRIDGES, RESERVOIRS};
use crate::Options;
use crate::build::statement::{Declared, Statement};
use crate::finding::Margin;
use crate::quantity::{Dimension, Series, format_exact};
use crate::solver::Solver;
use crate::source::Files;

/// Melting I²t of a slow fuse over the square of its rated current, s. From memory, at the low end of
/// what makers state: the sheet of the one bought goes before.
const MELTS: f64 = 9.0;

/// The text of a build, and where things are to be written into it.
pub(super) struct Board<'b> {
    pub(super) files: &'b dyn Files,
    pub(super) path: &'b Path,
    pub(super) shown: &'b str,
    pub(super) options: Options,
    /// The file of the build, its text, and where its block ends.
    pub(super) place: (PathBuf, Arc<str>, usize),
    /// The build.
    pub(super) build: String,
    /// The loads by name, and each region as the file words it.
    pub(super) loads: Vec<String>,
    pub(super) mains: Vec<String>,
    /// Amplifier channels as stated.
    pub(super) channels: u32,
    pub(super) claimed: f64,
    pub(super) taps: Vec<f64>,
    pub(super) sink_stated: bool,
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
    pub(super) fn blocks(&self, lists: &Lists, choice: &Choice, usage: &Use) -> String {
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

    pub(super) fn solve(&self, lists: &Lists, choice: &Choice, usage: &Use) -> Option<Vec<Margin>> {
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

/// A soft start that lets about three times the rated current through, bypassed when the reservoir is full.
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
