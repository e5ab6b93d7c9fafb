//! A bill of materials written from a spec: what a list must hold to agree with it.
//! Must not know what a list is checked for.

use super::wanted::Wanted;
use crate::finding::Site;
use crate::render::escape;

/// The headings, all of which a list is read by.
const HEADINGS: [&str; 6] = [
    "ref",
    "quantity",
    "order code",
    "value",
    "description",
    "spec",
];

/// The list as comma-separated values after RFC 4180.
pub(super) fn write(wanted: &[Wanted]) -> String {
    let mut out = line(HEADINGS.map(str::to_owned));
    let mut placed: Vec<(Site, &str)> = Vec::new();
    for one in wanted {
        let refs = share(one, wanted, &mut placed);
        out.push_str(&line([
            refs.join(" "),
            one.count.map(|n| n.to_string()).unwrap_or_default(),
            one.code.clone().unwrap_or_default(),
            one.figures_text(),
            one.described(),
            one.handle.clone(),
        ]));
    }
    out
}

/// The designators of one part. Two parts of one line share its designators, the upper device's
/// first, which is the order of the spec.
fn share<'w>(one: &'w Wanted, all: &[Wanted], placed: &mut Vec<(Site, &'w str)>) -> Vec<&'w str> {
    let sharing = all
        .iter()
        .filter(|w| w.refs == one.refs && w.site == one.site)
        .count()
        .max(1);
    let mine: Vec<&str> = one
        .refs
        .iter()
        .map(String::as_str)
        .filter(|r| !placed.contains(&(one.site, r)))
        .collect();
    let part = if sharing > 1 {
        one.refs.len().div_ceil(sharing)
    } else {
        mine.len()
    };
    let mine: Vec<&str> = mine.into_iter().take(part).collect();
    placed.extend(mine.iter().map(|r| (one.site, *r)));
    mine
}

fn line(cells: [String; 6]) -> String {
    let cells: Vec<String> = cells.iter().map(|c| escape::csv(c)).collect();
    format!("{}\r\n", cells.join(","))
}
