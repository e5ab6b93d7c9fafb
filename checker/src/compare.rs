//! Two checks of one kit held against each other: which margins, figures and findings moved.
//! Must not know where the two texts came from, nor how a comparison is shown.

use std::cmp::Ordering;
use std::collections::{HashMap, VecDeque};

use crate::Outcome;
use crate::finding::{BuildReport, Derived, Margin, Part, Severity, Verdict};

/// A share of the allowance has moved when it differs by more than this, in points, unless asked
/// otherwise: what prints the same to a tenth has not moved.
pub const POINTS: f64 = 0.1;
/// A figure has moved when it differs by more than this share of itself.
pub const FIGURE: f64 = 1e-3;

/// What became of a margin, a figure or a finding.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum State {
    /// Only the later check has it.
    New,
    /// Only the earlier check had it.
    Gone,
    /// Both have it, and it differs.
    Moved,
    /// Both have it, alike.
    Same,
}

/// Which way it went.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Course {
    /// Less is left, or it can no longer be checked.
    Worse,
    /// Neither: alike, gone, or accepted by a waiver.
    Level,
    /// More is left.
    Better,
}

/// How much a margin or a finding weighs once waivers and policy are heard.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Weight {
    /// In order, accepted, or information.
    None,
    /// It could not be checked.
    Unchecked,
    /// A warning.
    Warning,
    /// An error.
    Error,
}

impl Weight {
    /// Of a margin.
    #[must_use]
    pub fn of(margin: &Margin) -> Self {
        match margin.verdict {
            _ if margin.waiver.is_some() => Self::None,
            Verdict::Ok => Self::None,
            Verdict::Unchecked => Self::Unchecked,
            Verdict::Thin | Verdict::Over => Self::from(margin.severity),
        }
    }
}

impl From<Severity> for Weight {
    fn from(severity: Severity) -> Self {
        match severity {
            Severity::Error => Self::Error,
            Severity::Warning => Self::Warning,
            Severity::Information => Self::None,
        }
    }
}

/// One margin before and after.
#[derive(Clone, Copy, Debug)]
pub struct Row<'a> {
    /// In the earlier check.
    pub before: Option<&'a Margin>,
    /// In the later check.
    pub after: Option<&'a Margin>,
    /// What became of it.
    pub state: State,
    /// Which way it went.
    pub course: Course,
}

impl<'a> Row<'a> {
    fn new(before: Option<&'a Margin>, after: Option<&'a Margin>, points: f64) -> Self {
        let (state, course) = match (before, after) {
            (Some(b), Some(a)) if moved(b, a, points) => (State::Moved, course(b, a)),
            (Some(_), Some(_)) | (None, None) => (State::Same, Course::Level),
            (Some(_), None) => (State::Gone, Course::Level),
            (None, Some(a)) if Weight::of(a) > Weight::None => (State::New, Course::Worse),
            (None, Some(_)) => (State::New, Course::Level),
        };
        Self {
            before,
            after,
            state,
            course,
        }
    }

    /// The margin it is known by: the later one, else the earlier.
    #[must_use]
    pub fn margin(&self) -> Option<&'a Margin> {
        self.after.or(self.before)
    }

    /// By how many points the share of the allowance rose.
    #[must_use]
    pub fn rise(&self) -> Option<f64> {
        let used = |m: Option<&Margin>| m.and_then(|m| m.used_percent);
        Some(used(self.after)? - used(self.before)?)
    }

    /// How much it weighs where it got worse.
    #[must_use]
    pub fn weight(&self) -> Weight {
        match (self.course, self.after) {
            (Course::Worse, Some(after)) => Weight::of(after),
            _ => Weight::None,
        }
    }
}

/// Verdict, severity or waiver differ, or the share of the allowance by more than `points`.
fn moved(before: &Margin, after: &Margin, points: f64) -> bool {
    let used = match (before.used_percent, after.used_percent) {
        (Some(b), Some(a)) => (a - b).abs() > points,
        (b, a) => b.is_some() != a.is_some(),
    };
    used || before.verdict != after.verdict || Weight::of(before) != Weight::of(after)
}

fn course(before: &Margin, after: &Margin) -> Course {
    if after.verdict == Verdict::Unchecked && before.verdict != Verdict::Unchecked {
        // also from over: what is no longer known is not better
        return Course::Worse;
    }
    if after.waiver.is_some() && before.waiver.is_none() {
        return Course::Level;
    }
    let left = |m: &Margin| (Weight::of(m), rank(m.verdict));
    match left(after).cmp(&left(before)) {
        Ordering::Greater => return Course::Worse,
        Ordering::Less => return Course::Better,
        Ordering::Equal => {}
    }
    // of an allowance of nothing no share can be named: that is more than any
    let used = |m: &Margin| m.used_percent.unwrap_or(f64::INFINITY);
    match used(after).total_cmp(&used(before)) {
        Ordering::Greater => Course::Worse,
        Ordering::Less => Course::Better,
        Ordering::Equal => Course::Level,
    }
}

fn rank(verdict: Verdict) -> u8 {
    match verdict {
        Verdict::Ok => 0,
        Verdict::Unchecked => 1,
        Verdict::Thin => 2,
        Verdict::Over => 3,
    }
}

/// One derived figure before and after, moved, new or gone.
#[derive(Clone, Copy, Debug)]
pub struct Figure<'a> {
    /// In the earlier check.
    pub before: Option<&'a Derived>,
    /// In the later check.
    pub after: Option<&'a Derived>,
    /// What became of it.
    pub state: State,
}

/// One build, in one alternate or none, in both checks.
#[derive(Debug)]
pub struct Build<'a> {
    /// In the earlier check.
    pub before: Option<&'a BuildReport>,
    /// In the later check.
    pub after: Option<&'a BuildReport>,
    /// Every margin, what got worse first.
    pub rows: Vec<Row<'a>>,
    /// The figures that moved.
    pub figures: Vec<Figure<'a>>,
}

impl<'a> Build<'a> {
    fn new(before: Option<&'a BuildReport>, after: Option<&'a BuildReport>, points: f64) -> Self {
        let margins = |b: Option<&'a BuildReport>| b.map_or(&[][..], |b| &b.margins);
        let by: [fn(&Margin) -> String; 3] = [
            |m| m.id.clone(),
            // another part in the same place
            |m| {
                format!(
                    "{} {}.{} {:?}",
                    m.rule, m.part.block, m.part.key, m.part.polarity
                )
            },
            // another block in the same use
            |m| format!("{} {} {:?}", m.rule, m.part.key, m.part.polarity),
        ];
        let mut rows: Vec<Row<'_>> = pairs(margins(before), margins(after), &by)
            .into_iter()
            .map(|(b, a)| Row::new(b, a, points))
            .collect();
        rows.sort_by(worst_first);
        let figures = |b: Option<&'a BuildReport>| b.map_or(&[][..], |b| &b.derived);
        let by: [fn(&Derived) -> String; 2] = [
            |d| format!("{} {} {:?}", d.name, d.of, d.corner),
            |d| format!("{} {:?}", d.name, d.corner),
        ];
        let figures = pairs(figures(before), figures(after), &by)
            .into_iter()
            .map(|(before, after)| Figure {
                before,
                after,
                state: figure_state(before, after),
            })
            .filter(|f| f.state != State::Same)
            .collect();
        Self {
            before,
            after,
            rows,
            figures,
        }
    }

    /// The report it is known by: the later one, else the earlier.
    #[must_use]
    pub fn report(&self) -> Option<&'a BuildReport> {
        self.after.or(self.before)
    }

    /// Whether anything in it moved.
    #[must_use]
    pub fn any(&self) -> bool {
        !self.figures.is_empty() || self.rows.iter().any(|r| r.state != State::Same)
    }
}

/// What got worse, then what is new or gone, then what got better; in each the weightiest first.
fn worst_first(a: &Row<'_>, b: &Row<'_>) -> Ordering {
    let key = |r: &Row<'_>| {
        let margin = r.margin();
        let used = margin
            .and_then(|m| m.used_percent)
            .unwrap_or(f64::NEG_INFINITY);
        (r.weight(), margin.map_or(0, |m| rank(m.verdict)), used)
    };
    let ((aw, av, au), (bw, bv, bu)) = (key(a), key(b));
    (a.state == State::Same)
        .cmp(&(b.state == State::Same))
        .then(a.course.cmp(&b.course))
        .then(bw.cmp(&aw))
        .then(bv.cmp(&av))
        .then(bu.total_cmp(&au))
}

fn figure_state(before: Option<&Derived>, after: Option<&Derived>) -> State {
    match (before, after) {
        (Some(b), Some(a)) => {
            let (b, a) = (b.value.value, a.value.value);
            if (a - b).abs() > FIGURE * a.abs().max(b.abs()) {
                State::Moved
            } else {
                State::Same
            }
        }
        (Some(_), None) => State::Gone,
        (None, _) => State::New,
    }
}

/// Each of the earlier with one of the later that agrees by the first key, what is left by the
/// second, and so on; the rest stands alone. In the order of the later, then what is gone.
fn pairs<'a, T>(
    before: &'a [T],
    after: &'a [T],
    keys: &[fn(&T) -> String],
) -> Vec<(Option<&'a T>, Option<&'a T>)> {
    let mut partner: Vec<Option<usize>> = vec![None; after.len()];
    let mut taken = vec![false; before.len()];
    for key in keys {
        let mut open: HashMap<String, VecDeque<usize>> = HashMap::new();
        for (at, one) in before.iter().enumerate() {
            if taken.get(at) == Some(&false) {
                open.entry(key(one)).or_default().push_back(at);
            }
        }
        for (mine, one) in partner.iter_mut().zip(after) {
            if mine.is_none()
                && let Some(at) = open.get_mut(&key(one)).and_then(VecDeque::pop_front)
                && let Some(flag) = taken.get_mut(at)
            {
                *flag = true;
                *mine = Some(at);
            }
        }
    }
    let both = partner
        .into_iter()
        .zip(after)
        .map(|(at, a)| (at.and_then(|at| before.get(at)), Some(a)));
    let gone = before
        .iter()
        .zip(&taken)
        .filter(|(_, taken)| !**taken)
        .map(|(b, _)| (Some(b), None));
    both.chain(gone).collect()
}

/// What is said of text or data in only one of the two.
#[derive(Clone, Debug)]
pub struct Said {
    /// New or gone.
    pub state: State,
    /// The rule.
    pub rule: &'static str,
    /// How loud.
    pub severity: Severity,
    /// What is wrong.
    pub message: String,
    /// A waiver accepts it.
    pub waived: bool,
}

/// The comparison.
#[derive(Debug)]
pub struct Comparison<'a> {
    /// The earlier check.
    pub old: &'a Outcome,
    /// The later check.
    pub new: &'a Outcome,
    /// Points by which a share must differ to have moved.
    pub points: f64,
    /// Every build.
    pub builds: Vec<Build<'a>>,
    /// Findings about text and data that are new or gone.
    pub said: Vec<Said>,
}

/// How many margins went which way.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Counts {
    /// Got worse.
    pub worse: usize,
    /// Of them, now an error; new errors of text and data counted.
    pub error: usize,
    /// Of them, now a warning; new warnings of text and data counted.
    pub warning: usize,
    /// Of them, no longer checked.
    pub unchecked: usize,
    /// Got better.
    pub better: usize,
    /// Only in the later.
    pub new: usize,
    /// Only in the earlier.
    pub gone: usize,
    /// Moved, neither worse nor better.
    pub level: usize,
    /// Alike.
    pub same: usize,
}

impl<'a> Comparison<'a> {
    /// Hold two checks against each other.
    #[must_use]
    pub fn new(old: &'a Outcome, new: &'a Outcome, points: f64) -> Self {
        let by: [fn(&BuildReport) -> String; 1] =
            [|b| format!("{}/{}", b.name, b.alternate.as_deref().unwrap_or("-"))];
        let builds = pairs(&old.report.builds, &new.report.builds, &by)
            .into_iter()
            .map(|(b, a)| Build::new(b, a, points))
            .collect();
        Self {
            old,
            new,
            points,
            builds,
            said: said(old, new),
        }
    }

    /// Whether anything moved at all.
    #[must_use]
    pub fn any(&self) -> bool {
        !self.said.is_empty() || self.builds.iter().any(Build::any)
    }

    /// How many margins went which way.
    #[must_use]
    pub fn counts(&self) -> Counts {
        let mut counts = Counts::default();
        for row in self.builds.iter().flat_map(|b| &b.rows) {
            match row.state {
                State::Same => counts.same += 1,
                State::New => counts.new += 1,
                State::Gone => counts.gone += 1,
                State::Moved if row.course == Course::Level => counts.level += 1,
                State::Moved => {}
            }
            match row.course {
                Course::Worse => counts.worse += 1,
                Course::Better => counts.better += 1,
                Course::Level => {}
            }
            counts.weigh(row.weight());
        }
        for said in self
            .said
            .iter()
            .filter(|s| s.state == State::New && !s.waived)
        {
            counts.weigh(Weight::from(said.severity));
        }
        counts
    }
}

impl Counts {
    fn weigh(&mut self, weight: Weight) {
        match weight {
            Weight::None => {}
            Weight::Unchecked => self.unchecked += 1,
            Weight::Warning => self.warning += 1,
            Weight::Error => self.error += 1,
        }
    }

    /// Whether something that weighs at least this much got worse.
    #[must_use]
    pub fn fails(&self, at: Weight) -> bool {
        let of = |weight| match weight {
            Weight::Error => self.error,
            Weight::Warning => self.warning,
            Weight::Unchecked => self.unchecked,
            Weight::None => self.worse,
        };
        [
            Weight::None,
            Weight::Unchecked,
            Weight::Warning,
            Weight::Error,
        ]
        .into_iter()
        .filter(|weight| *weight >= at)
        .any(|weight| of(weight) > 0)
    }
}

/// Findings about text and data by rule and message, wherever they stand.
fn said(old: &Outcome, new: &Outcome) -> Vec<Said> {
    let by: [fn(&crate::finding::Finding) -> String; 1] =
        [|f| format!("{} {} {:?}", f.rule, f.message, f.waiver.is_some())];
    pairs(&old.report.findings, &new.report.findings, &by)
        .into_iter()
        .filter_map(|(before, after)| {
            let (state, finding) = match (before, after) {
                (None, Some(f)) => (State::New, f),
                (Some(f), None) => (State::Gone, f),
                _ => return None,
            };
            Some(Said {
                state,
                rule: finding.rule,
                severity: finding.severity,
                message: finding.message.clone(),
                waived: finding.waiver.is_some(),
            })
        })
        .collect()
}

/// Whether two margins are about different parts.
#[must_use]
pub fn substituted(before: &Part, after: &Part) -> bool {
    before.name != after.name || before.order_code != after.order_code
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::testing::{outcome, tern60};

    fn moved_rules(edits: &[(&str, &str)]) -> Vec<String> {
        let (old, new) = (outcome(&tern60(&[])), outcome(&tern60(edits)));
        let comparison = Comparison::new(&old, &new, POINTS);
        let mut rules: Vec<String> = comparison
            .builds
            .iter()
            .flat_map(|b| &b.rows)
            .filter(|r| r.state != State::Same)
            .filter_map(|r| r.margin().map(|m| m.rule.to_owned()))
            .collect();
        rules.sort();
        rules.dedup();
        rules
    }

    #[test]
    fn a_kit_with_itself_is_empty() {
        for kit in [
            "tern60",
            "tern60-mistakes",
            "tern60-revisions",
            "tern-family",
        ] {
            let text = crate::testing::kit(kit);
            let (old, new) = (outcome(&text), outcome(&format!("# a comment\n\n{text}")));
            let comparison = Comparison::new(&old, &new, 0.0);
            assert!(!comparison.any(), "{kit}");
            assert!(!comparison.counts().fails(Weight::None));
        }
    }

    /// Who is coupled to what follows from the circuit: the Zobel resistor's watts are no part of
    /// anything else, the gain of the output devices only of the chain that drives them.
    #[test]
    fn one_substituted_part_moves_what_hangs_on_it_and_nothing_else() {
        assert_eq!(
            moved_rules(&[("8R2 3 W 82 nF", "8R2 5 W 82 nF")]),
            ["protection.zobel"]
        );
        let gain = moved_rules(&[(
            "hfe minimum 80 at 1 A, 60 at 5 A, 38 at 8 A, 16 at 16 A",
            "hfe minimum 40 at 1 A, 30 at 5 A, 20 at 8 A, 10 at 16 A",
        )]);
        assert!(!gain.is_empty());
        let chain = ["drive.", "thermal.driver", "soa.idle"];
        for rule in &gain {
            assert!(
                chain.iter().any(|c| rule.starts_with(c)),
                "{rule} moved: {gain:?}"
            );
        }
    }

    #[test]
    fn a_part_of_another_name_in_the_same_place_is_the_same_row() {
        let renamed = tern60(&[]).replace("n16", "n18");
        let (old, new) = (outcome(&tern60(&[])), outcome(&renamed));
        let comparison = Comparison::new(&old, &new, POINTS);
        assert!(!comparison.any(), "{:#?}", comparison.counts());
    }

    #[test]
    fn worse_is_worse() {
        let (old, new) = (
            outcome(&tern60(&[])),
            outcome(&tern60(&[("±20 % 63 V esr", "±20 % 50 V esr")])),
        );
        let there = Comparison::new(&old, &new, POINTS).counts();
        let back = Comparison::new(&new, &old, POINTS).counts();
        assert_eq!((there.worse, there.better), (back.better, back.worse));
        assert!(there.worse > 0 && there.fails(Weight::Warning) && !there.fails(Weight::Error));
        assert!(!back.fails(Weight::Unchecked));
    }

    /// Data taken away: no margin may count as better for it.
    #[test]
    fn what_is_no_longer_known_is_worse() {
        let (old, new) = (
            outcome(&tern60(&[])),
            outcome(&tern60(&[("esr 35 mohm ripple 4 A", "esr 35 mohm")])),
        );
        let counts = Comparison::new(&old, &new, POINTS).counts();
        assert!(counts.unchecked > 0);
        assert_eq!(counts.better, 0);
        assert!(counts.fails(Weight::Unchecked) && !counts.fails(Weight::Warning));
    }
}
