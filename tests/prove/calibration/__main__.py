"""``make calibration``: measure every cell, then write docs/calibration.md and its figures."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path

from tests.prove.calibration import plan
from tests.prove.calibration.page import Study, page_of
from tests.prove.calibration.pictures import pictures_of
from tests.prove.calibration.real import real_histories
from tests.prove.calibration.run import CHOICE, COVERAGE, results_of

DOCS = Path(__file__).parents[3] / "docs"
PARTS = ("core", "spokes", "choice", "daily")


def main(arguments: list[str]) -> int:
    """Run, or finish, the study."""
    parser = argparse.ArgumentParser(prog="python -m tests.prove.calibration", description=__doc__)
    parser.add_argument("--homes", type=int, default=2000, help="homes a cell (default 2000)")
    parser.add_argument("--spoke-homes", type=int, help="of the spokes (default: as the core)")
    parser.add_argument("--choice-homes", type=int, help="of the choice of form (default: half)")
    parser.add_argument("--daily-homes", type=int, help="of daily data (default: a quarter)")
    parser.add_argument("--cells", default=",".join(PARTS), help=f"some of {', '.join(PARTS)}")
    parser.add_argument("--processes", type=int, default=2)
    parser.add_argument("--cache", type=Path, help="folder of kept results")
    parser.add_argument("--out", type=Path, default=DOCS, help="folder of the page")
    options = parser.parse_args(arguments)
    wanted = options.cells.split(",")
    if not set(wanted) <= set(PARTS):
        parser.error(f"--cells is a list of {', '.join(PARTS)}")
    study = study_of(options, wanted)
    options.out.mkdir(parents=True, exist_ok=True)
    for picture in pictures_of(study):
        file = options.out / f"calibration-{picture.key}.svg"
        file.write_text(picture.standalone(), encoding="utf-8")
    (options.out / "calibration.md").write_text(page_of(study), encoding="utf-8")
    return 0


def study_of(options: argparse.Namespace, wanted: list[str]) -> Study:
    """Every part that is wanted, measured or taken from the cache."""
    how = {"processes": options.processes, "cache": options.cache}
    core = plan.core()
    spokes = plan.spokes() if "spokes" in wanted else {}
    some = options.spoke_homes or options.homes
    found = results_of(COVERAGE, [c for rows in spokes.values() for c in rows], some, **how)
    found |= results_of(COVERAGE, core, options.homes, **how)
    half = options.choice_homes or max(options.homes // 2, 1)
    choices = results_of(CHOICE, plan.choice() if "choice" in wanted else [], half, **how)
    few = options.daily_homes or max(options.homes // 4, 1)
    daily = results_of(COVERAGE, plan.daily() if "daily" in wanted else [], few, **how)
    return Study(
        [found[c] for c in core],
        {name: [found[c] for c in rows] for name, rows in spokes.items()},
        list(choices.values()),
        list(daily.values()),
        real_histories(),
    )


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
