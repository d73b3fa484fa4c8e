"""The answer with and without each driver, side by side: a driver's part in it is seen."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

from normalize.fitting.align import Aligned
from normalize.savings.compare import Comparison
from normalize.savings.drivers import Chosen, DriverTrial
from normalize.savings.results import Estimate

WEATHER_ALONE: Final = "the weather alone"


@dataclass(frozen=True, slots=True)
class DriverAnswer:
    """The answer with one set of drivers.

    drivers : their names; none for the weather alone.  reported : the answer of the report.
    n_before, n_after : bills on either side.  form_before, form_after, cv_before, cv_after :
    of the fits then, "" and None where there is none.
    """

    drivers: tuple[str, ...]
    reported: bool
    normalized: Estimate
    avoided: Estimate
    n_before: int
    n_after: int
    form_before: str = ""
    form_after: str = ""
    cv_before: float | None = None
    cv_after: float | None = None


@dataclass(frozen=True, slots=True)
class DriverReport:
    """Every driver of an account as it was tried, and the answers with and without.

    answers : as reported first, then the weather alone, then every other set that was asked.
    """

    trials: tuple[DriverTrial, ...]
    answers: tuple[DriverAnswer, ...]

    @property
    def kept(self) -> tuple[str, ...]:
        """Names of the drivers that earned their place."""
        return tuple(trial.name for trial in self.trials if trial.kept)


def with_and_without(
    chosen: Chosen, found: Comparison, compare: Callable[[Aligned], Comparison]
) -> DriverReport:
    """The reported answer beside those with other drivers: each left out, each added.

    found : the reported comparison.  compare : the same comparison over other periods.
    The bills are those of the reported answer; a driver that is added may set some aside.
    """
    kept = chosen.kept
    sets: list[tuple[str, ...]] = [()]
    for trial in chosen.trials:
        if trial.kept:
            sets.append(tuple(name for name in kept if name != trial.name))
        elif trial.before is not None or trial.after is not None:
            more = {*kept, trial.name}
            sets.append(tuple(t.name for t in chosen.trials if t.name in more))
    others = [
        _answer(names, False, compare(chosen.with_only(names)))
        for names in dict.fromkeys(sets)
        if names != kept
    ]
    return DriverReport(chosen.trials, (_answer(kept, True, found), *others))


def _answer(names: tuple[str, ...], reported: bool, found: Comparison) -> DriverAnswer:
    savings = found.savings
    return DriverAnswer(
        drivers=names,
        reported=reported,
        normalized=savings.normalized,
        avoided=savings.avoided,
        n_before=found.labels.count("before"),
        n_after=found.labels.count("after"),
        form_before=savings.before.form if savings.before else "",
        form_after=savings.after.form if savings.after else "",
        cv_before=savings.before.cv_rmse if savings.before else None,
        cv_after=savings.after.cv_rmse if savings.after else None,
    )
