"""Every error that normalize raises on purpose, as one tree.

NormalizeError
├─ SiteError       the site folder: UnknownKey, MissingFile
├─ BillError       bills: UnreadableBills, AmbiguousBills, UnknownUnit, NoBills
├─ WeatherError    weather: UnreadableWeather, AmbiguousWeather, MissingWeather
├─ FitError        the fit: UnknownForm, TooFewPeriods
├─ SavingsError    before against after: NoUpgrade
└─ ReportError     writing results: UnwritableReport

A message says where, what was found, what was wanted and what to do next, in words a
homeowner can follow.  The front doors (cli, page, program) catch ``NormalizeError`` only:
anything else is a fault of the program.
"""

from __future__ import annotations


class NormalizeError(Exception):
    """A problem that a person can solve; the text says how.

    found : what is the matter, in one clause.
    where : file, line, account or option; empty if the caller knows.
    wanted : what would have been right; may be empty.
    next_step : what to do now; may be empty.

    >>> str(NormalizeError("no column is usage", where="gas.csv:1",
    ...     wanted="a header like 'kWh'", next_step="Name it with --usage-column."))
    "gas.csv:1: no column is usage; wanted a header like 'kWh'. Name it with --usage-column."
    """

    def __init__(
        self, found: str, *, where: str = "", wanted: str = "", next_step: str = ""
    ) -> None:
        self.found = found
        self.where = where
        self.wanted = wanted
        self.next_step = next_step
        super().__init__(self._text())

    def _text(self) -> str:
        head = f"{self.where}: {self.found}" if self.where else self.found
        if self.wanted:
            head += f"; wanted {self.wanted}"
        if not head.endswith((".", "?", "!")):
            head += "."
        return f"{head} {self.next_step}".rstrip()

    def __reduce__(self) -> tuple[object, ...]:
        # Errors cross process borders in a program run; keyword-only arguments do not
        # survive the default pickling.
        return (_rebuild, (type(self), self.found, self.where, self.wanted, self.next_step))


def _rebuild(
    kind: type[NormalizeError], found: str, where: str, wanted: str, next_step: str
) -> NormalizeError:
    return kind(found, where=where, wanted=wanted, next_step=next_step)


class SiteError(NormalizeError):
    """The site folder or its site.toml."""


class UnknownKey(SiteError):
    """A key of site.toml that normalize does not know."""


class MissingFile(SiteError):
    """A file that was named is not there."""


class BillError(NormalizeError):
    """Bills."""


class UnreadableBills(BillError):
    """A bill file that cannot be read as a table of bills."""


class AmbiguousBills(BillError):
    """A bill file that can be read in two ways; the message asks which."""


class UnknownUnit(BillError):
    """A unit that is unknown, does not fit the fuel, or has two meanings in the trade."""


class NoBills(BillError):
    """A file in which not a single bill could be used."""


class WeatherError(NormalizeError):
    """Weather."""


class UnreadableWeather(WeatherError):
    """A weather file that cannot be read."""


class AmbiguousWeather(WeatherError):
    """A weather file that can be read in two ways; the message asks which."""


class MissingWeather(WeatherError):
    """Days of weather that are needed and are not there."""


class FitError(NormalizeError):
    """The fit of use to weather."""


class UnknownForm(FitError):
    """A form that does not exist; the message lists those that do."""


class TooFewPeriods(FitError):
    """Fewer usage periods than the form has parameters to find."""


class SavingsError(NormalizeError):
    """Before against after."""


class NoUpgrade(SavingsError):
    """No upgrade, or one whose dates cannot be used."""


class ReportError(NormalizeError):
    """Reports."""


class UnwritableReport(ReportError):
    """A place that cannot be written to."""
