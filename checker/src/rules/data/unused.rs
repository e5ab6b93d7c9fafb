//! data.unused: blocks that no build reaches.

use std::collections::HashSet;

use crate::build::Project;
use crate::build::view::names;
use crate::finding::{Finding, Severity};

fault! {
    /// A block that no build reaches is never checked. Often the build names an older part, and the
    /// new one, carefully typed in, proves nothing. Blocks of files taken in with `use` are exempt:
    /// a library is meant to hold more than one kit needs.
    "data.unused",
    finds: "a block that no build reaches",
    example: "tern60", [("network            net", "network            none")],
}

/// Walk from the builds and alternates along every name; what is left over is unused. A file that
/// has neither builds nor an amplifier is a library, and is left alone.
pub fn check(project: &Project, findings: &mut Vec<Finding>) {
    let builds = project.of_kind("build").count();
    if builds == 0 {
        if let Some(amplifier) = project.of_kind("amplifier").next() {
            let message = "no build is declared, so nothing is checked".to_owned();
            let hint =
                "add one: `build mono {` with channels, supply, heatsink, mains, loads and ambient"
                    .to_owned();
            findings.push(
                Finding::error("data.unused", amplifier.name_site, message, hint)
                    .at(Severity::Warning),
            );
        }
        return;
    }
    let root = project.sources.iter().next().map(|(id, _)| id);
    let mut seen: HashSet<&str> = HashSet::new();
    let mut open: Vec<&str> = project
        .blocks
        .iter()
        .filter(|b| matches!(b.kind.kind, "build" | "alternate"))
        .map(|b| b.name.as_str())
        .collect();
    if project.of_kind("amplifier").count() == 1 {
        open.extend(project.of_kind("amplifier").map(|b| b.name.as_str()));
    }
    while let Some(name) = open.pop() {
        let Some(block) = project.find(name) else {
            continue;
        };
        if !seen.insert(&block.name) {
            continue;
        }
        open.extend(block.from.iter().map(|f| f.0.as_str()));
        for line in &block.lines {
            open.extend(names(line));
            if let Some((changed, inner)) = &line.change {
                open.push(changed);
                open.extend(names(inner));
            }
        }
    }
    for block in project
        .blocks
        .iter()
        .filter(|b| Some(b.site.file) == root && !seen.contains(b.name.as_str()))
    {
        let message = format!("no build reaches {} `{}`", block.kind.kind, block.name);
        let hint = "name it where it is used, or remove it".to_owned();
        findings.push(
            Finding::error("data.unused", block.name_site, message, hint).at(Severity::Warning),
        );
    }
}

#[cfg(test)]
mod tests {
    use crate::testing::{kit, report, tern60};

    #[test]
    fn a_library_is_left_alone_and_a_lone_amplifier_is_not() {
        let library = report("ampspec 1\ndevice small npn { vceo 80 V }\n").findings;
        assert!(library.is_empty(), "{library:#?}");
        let lone = kit("tern60");
        let lone = lone.split("build mono").next().unwrap().to_owned();
        assert!(
            report(&lone)
                .findings
                .iter()
                .any(|f| f.message.contains("no build is declared"))
        );
    }

    #[test]
    fn what_an_alternate_brings_in_is_used() {
        let text = tern60(&[(
            "build mono {",
            "alternate maker-b \"maker B\" { replace n16 with n16b }\ndevice n16b npn from n16 { part \"N16-B\" }\nbuild mono {",
        )]);
        assert!(
            report(&text).findings.is_empty(),
            "{:#?}",
            report(&text).findings
        );
    }
}
