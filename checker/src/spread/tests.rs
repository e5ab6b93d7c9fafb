//! The model against full solutions, and the same kits on any number of threads.

use super::{Ask, BuildSpread, spread};
use crate::Options;
use crate::finding::Verdict;
use crate::testing::{beside, report, tern60};

fn drawn(text: &str, kits: u32) -> BuildSpread {
    let options = Options {
        today: "2026-06-01".to_owned(),
        ..Options::default()
    };
    let ask = Ask { kits, seed: 7 };
    let out = beside(text, |files, path| {
        spread(files, path, "under-test.ampspec", &options, ask, &|_, _| {})
    });
    out.unwrap().remove(0)
}

/// Every kit of a build solved in full gives the same shares as the model does, on a kit in which a
/// margin straddles its allowance, and percentiles within the stated error.
#[test]
fn the_model_says_what_full_solutions_say() {
    let text = tern60(&[("2 x 4700 uF", "2 x 3000 uF")]);
    let modelled = drawn(&text, 400);
    assert!(
        modelled.modelled && modelled.pass.0 < 1.0 && modelled.pass.0 > 0.0,
        "{modelled:?}"
    );
    let full = in_full(&text, 400);
    assert!((modelled.pass.0 - full.pass.0).abs() < 1e-12);
    assert!((modelled.pass.1 - full.pass.1).abs() < 1e-12);
    for m in &modelled.margins {
        let twin = full.margins.iter().find(|f| f.id == m.id).unwrap();
        // measured at other places than these: the band, not the error itself, is what holds
        for (a, b) in m.percentiles.iter().zip(twin.percentiles) {
            assert!(
                (a - b).abs() <= super::CAUTION * m.error + 1e-6,
                "{} {a} {b}",
                m.id
            );
        }
        assert!((m.past.0 - twin.past.0).abs() < 1e-12, "{}", m.id);
    }
}

/// The same without a model.
fn in_full(text: &str, kits: u32) -> BuildSpread {
    let options = Options {
        today: "2026-06-01".to_owned(),
        ..Options::default()
    };
    beside(text, |files, path| {
        let solver =
            crate::solver::Solver::read(files, path, "under-test.ampspec", &options).unwrap();
        let build = solver.builds().next().unwrap();
        super::of_build_with(&solver, build, Ask { kits, seed: 7 }, false, &|_| {})
    })
}

#[test]
fn any_number_of_threads_draws_the_same() {
    let text = tern60(&[]);
    let on = |threads| {
        let pool = rayon::ThreadPoolBuilder::new()
            .num_threads(threads)
            .build()
            .unwrap();
        pool.install(|| drawn(&text, 3000))
    };
    assert_eq!(on(1), on(3));
}

/// A reservoir that is thin at the low end of ±20 % is ample in most kits: both are said. No kit uses
/// more than the worst case of the check, and every verdict of the check stands beside the shares.
#[test]
fn worst_case_and_statistics_stand_side_by_side() {
    let text = tern60(&[("2 x 4700 uF", "2 x 3000 uF")]);
    let build = drawn(&text, 4000);
    let sag = build
        .margins
        .iter()
        .find(|m| m.rule == "power.low-frequency-sag")
        .unwrap();
    assert!(sag.disagrees(), "{sag:?}");
    assert_eq!(sag.by.as_ref().unwrap().0, "toroid reservoir");
    let checked = report(&text);
    for m in &build.margins {
        let margin = checked.builds[0]
            .margins
            .iter()
            .find(|c| c.id == m.id)
            .unwrap();
        assert_eq!((margin.used_percent.unwrap(), margin.verdict), m.worst_case);
        assert!(!m.beyond(), "{m:?}");
        if margin.verdict == Verdict::Ok {
            assert!(m.past.0 <= 0.0, "{m:?}");
        }
    }
}
