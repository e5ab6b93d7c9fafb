"""Checks the margins of `derate` from outside: random builds, worked again by brute force.

    python brute_force.py --derate PATH [--count 200] [--seed 1]

Every build is written as an ampspec; `derate check` reads the folder once; each margin is then
recomputed from the same figures by small steps in time, fine samples and root finding (the modules
in `brute/`, numpy and scipy only, none of the program's shortcuts). A table is printed; the exit is
1 on any disagreement, on a rule never exercised, or on too few builds.
"""

import argparse
import concurrent.futures
import json
import os
import pathlib
import subprocess
import sys
import tempfile

sys.path.insert(0, str(pathlib.Path(__file__).parent))

from brute import build, margins, published  # noqa: E402

SAME = 1e-6  # the same model on both sides; reports print nine digits
SEARCHED = 1e-5  # a greatest value over frequency, amplitude and angle, sought on a kinked ridge
SPENT = 1e5  # more than this of an allowance, per cent, is as good as no rating at all
STEPPED = 1e-4  # this side marches in fixed small steps, or samples a minimum

# Rule: (relative tolerance, what is compared, why it is looser than SAME).
RULES = {
    "voltage.device": (SAME, "stress rating used", ""),
    "voltage.driver": (SAME, "stress rating used", ""),
    "voltage.voltage-stage": (SAME, "stress rating used", ""),
    "voltage.reservoir": (SAME, "stress rating used", ""),
    "voltage.rectifier-reverse": (SAME, "stress rating used", ""),
    "power.rated-power": (SAME, "stress rating used", ""),
    "power.low-frequency-sag": (STEPPED, "stress rating used", "fixed steps; least headroom by samples"),
    "current.device-peak": (SAME, "stress rating used", ""),
    "current.device-share": (SAME, "stress rating used", ""),
    "current.emitter-mean": (SAME, "stress rating used", ""),
    "current.rectifier-mean": (SAME, "stress rating used", ""),
    "current.rectifier-surge": (4e-3, "used", "fixed steps; derate starts the second surge from the lower of two rails, at the worse moment"),
    "current.reservoir-ripple": (2e-5, "stress rating used", "the signal's form factor is stated to four digits: 0.3856"),
    "current.transformer-duty": (SAME, "stress rating used", ""),
    "current.fuse-rms": (SAME, "stress rating used", ""),
    "soa.resistive": (SEARCHED, "used", "searched"),
    "soa.reactive": (SEARCHED, "used", "searched"),
    "soa.idle": (SAME, "stress rating used", ""),
    "soa.limiter-soa": (SEARCHED, "used", "searched"),
    "soa.limiter-music": (SEARCHED, "used", "searched"),
    "thermal.junction": (SAME, "stress rating used", ""),
    "thermal.junction-peak": (SAME, "stress rating used", ""),
    "thermal.sink": (SAME, "stress rating used", ""),
    "thermal.driver": (SAME, "stress rating used", ""),
    "thermal.reservoir-life": (1e-5, "stress used", "follows reservoir-ripple"),
    "bias.stability": (SAME, "stress rating used", ""),
    "drive.output-gain-droop": (SAME, "used", ""),
    "drive.driver-current": (SAME, "stress rating used", ""),
    "drive.driver-soa": (SEARCHED, "used", "searched"),
    "drive.slew": (SAME, "used", ""),
    "supply.core-flux": (SAME, "stress rating used", ""),
    "supply.soft-start-timing": (STEPPED, "stress used", "fixed steps"),
    "supply.inrush-resistor-energy": (STEPPED, "stress", "fixed steps"),
    "protection.dc-fault-time": (SAME, "stress used", ""),
    "protection.dc-fault-false-trip": (SAME, "used", ""),
    "protection.bleed-down": (SAME, "stress used", ""),
    "protection.zobel": (SAME, "stress used", ""),
}


def said(derate, folder):
    """{build name: {(rule, part): margin}} from one run over the folder."""
    run = subprocess.run([derate, "check", str(folder), "--form", "json"], capture_output=True, text=True, check=False)
    if run.returncode not in (0, 1):
        sys.exit(f"derate failed ({run.returncode}): {run.stderr[:2000]}")
    report = json.loads(run.stdout)
    wrong = [f for file in report["files"] for f in file["findings"] if f["severity"] == "error" and f["rule"].split(".")[0] in ("syntax", "data")]
    for f in wrong[:5]:
        print("not accepted:", f["span"]["path"], f["rule"], f["message"])
    return {b["name"]: {(m["rule"], m["part"]["name"]): m for m in b["margins"]} for b in report["builds"]}, len(wrong)


def value(margin, field):
    if field == "used":
        return margin["used_percent"]
    return margin[field] and margin[field]["value"]


def apart(a, b):
    """Relative difference of two figures."""
    return abs(a - b) / max(abs(a), abs(b), 1e-12)


def main():
    ask = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    ask.add_argument("--derate", default="derate", help="the binary to check")
    ask.add_argument("--count", type=int, default=200)
    ask.add_argument("--seed", type=int, default=1)
    ask.add_argument("--jobs", type=int, default=os.cpu_count() or 1, help="processes")
    ask.add_argument("--keep", help="write the specs to this folder and leave them")
    ask.add_argument("--quick", action="store_true", help="leave out the published cases")
    ask.add_argument("--show", type=int, default=3, help="disagreements shown for each rule")
    ask.add_argument("--rules", nargs="*", default=sorted(RULES), help="rules that must be exercised")
    options = ask.parse_args()

    failed = published.check() if not options.quick else 0
    with tempfile.TemporaryDirectory() as scratch:
        folder = pathlib.Path(options.keep or scratch)
        folder.mkdir(parents=True, exist_ok=True)
        builds = [build.generate(options.seed, k, folder) for k in range(options.count)]
        theirs, refused = said(options.derate, folder)
        ours = work(builds, options.jobs)
        table = {rule: [] for rule in options.rules}
        unchecked = {}
        compared = 0
        for k, b in enumerate(builds):
            answer = theirs.get(b["name"])
            if answer is None:
                print("no answer for", b["file"])
                failed += 1
                continue
            compared += 1
            compare(b, ours[k], answer, table, unchecked)
    failed += refused
    failed += report(table, unchecked, options.show)
    if compared < options.count:
        print(f"only {compared} of {options.count} builds were compared")
        failed += 1
    print(f"{compared} builds, seed {options.seed}:", "agreed" if not failed else f"{failed} failures")
    return 1 if failed else 0


def work(builds, jobs):
    """Every margin of every build, worked in so many processes; a process takes every n-th build."""
    shares = [builds[k::jobs] for k in range(jobs)]
    with concurrent.futures.ProcessPoolExecutor(jobs) as pool:
        done = list(pool.map(together, shares))
    return [done[k % jobs][k // jobs] for k in range(len(builds))]


def together(builds):
    """The margins of some builds; what marches in time is marched for all of them side by side."""
    marched = [margins.bottom_of_band(builds), margins.switching_on(builds)]
    found = [margins.expected(b) for b in builds]
    for k, mine in enumerate(found):
        for more in marched:
            mine.update(more.get(k, {}))
    return found


def compare(b, mine, answer, table, unchecked):
    """Adds (difference, build, part, field, mine, theirs) to each rule's row."""
    for (rule, part), expected in mine.items():
        if rule not in table:
            continue
        margin = answer.get((rule, part))
        if margin is None:
            unchecked.setdefault(rule, []).append((b["file"], part, "no margin"))
            continue
        if (rule, part) in mine.past and margin["verdict"] == "ok":
            unchecked.setdefault(rule, []).append((b["file"], part, "ok, though the curve ends before the stress"))
        if margin["used_percent"] is None:
            # No rating left (the case is at Tj,max): over, without a percentage.
            left = margin["rating"] and margin["rating"]["value"] > 0
            spent = margin["verdict"] == "over" and not left and not 0 < expected["used"] < SPENT
            if (rule, part) not in mine.past and not spent:
                unchecked.setdefault(rule, []).append((b["file"], part, margin.get("note") or f"needs {margin['needs']}"))
            continue
        # With next to no rating left a case a microkelvin off moves what is used of it.
        scale = max(1.0, expected["used"] / 500)
        for field in RULES[rule][1].split():
            a, c = expected[field], value(margin, field)
            if a is None or c is None:
                continue
            table[rule].append((apart(a, c) / scale, b["file"], part, field, a, c))


def report(table, unchecked, show):
    """Prints the table; returns how many rows fail."""
    failed = 0
    print(f"{'rule':34} {'figures':>7} {'worst':>9} {'allowed':>8}  result")
    for rule, rows in table.items():
        tolerance, _fields, why = RULES[rule]
        rows.sort(key=lambda r: -r[0])
        worst = rows[0][0] if rows else float("nan")
        silent = unchecked.get(rule, [])
        ok = bool(rows) and worst <= tolerance and not silent
        failed += not ok
        verdict = "ok" if ok else ("never exercised" if not rows else "DISAGREES")
        print(f"{rule:34} {len(rows):7d} {worst:9.1e} {tolerance:8.0e}  {verdict}{'  (' + why + ')' if why else ''}")
        bad = [r for r in rows if r[0] > tolerance]
        if bad:
            print(f"      {len(bad)} of {len(rows)} figures, in {len({r[1] for r in bad})} builds")
        for gap, file, part, field, a, c in bad[:show]:
            print(f"      {file} {part} {field}: here {a:.9g}, derate {c:.9g} ({gap:.2e})")
        if silent:
            print(f"      {len(silent)} without a figure, e.g. " + "; ".join(" ".join(map(str, s)) for s in silent[:show]))
    return failed


if __name__ == "__main__":
    sys.exit(main())
