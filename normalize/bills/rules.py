"""Every rule of the repair of bills: its threshold, its source, its words in the ledger.

What belongs here: numbers that decide what becomes of a bill, the codes the kernel writes and
the sentences a reader of the ledger sees.  The code that applies them is in repair_kernel.py.

These constants are frozen into compiled code, so this file must count among the kernel
sources whose hash names the cache; naming normalize.jit here is what makes it count.
"""

from __future__ import annotations

from normalize.days import FIRST_SANE_DAY, LAST_SANE_DAY

# --- Thresholds -------------------------------------------------------------------------

FIRST_DAY = (
    FIRST_SANE_DAY  # 1900-01-01; an earlier date is a typing error (common practice, no source)
)
LAST_DAY = LAST_SANE_DAY  # 2100-01-01; likewise
ABSURD_USE = (
    1e12  # of any unit in one bill: no building uses a PJ a month (common practice, no source)
)

CANCEL_TOLERANCE = 1e-6  # relative: a cancelling row repeats the cancelled number to rounding
#                          (common practice, no source)

JOIN_GAP_DAYS = 3  # an estimate is joined across so small a gap, for the meter runs on and only
#                    the written date is off (common practice, no source)
TRIM_OVERLAP_DAYS = 3  # so small an overlap is a slip of dates: the later bill starts where the
#                        earlier ends, its use untouched (common practice, no source)
SUBTOTAL_TOLERANCE = 0.005  # relative: a bill over two or more others whose use is their sum
#                             (rounded) is a subtotal (common practice, no source)

STUB_DAYS = 5  # a shorter period is joined to the next (design.md, Defaults; no outside source)

# Ordinary lengths of a (joined) period, days: outside it is kept and flagged.
# 20-75: folded monthly periods, program evaluation practice (DOE Uniform Methods Project
# ch. 8, *(memory)*); 40-130 and 5-400: common practice, no source.
MONTHLY_DAYS = (20, 75)
TWO_MONTHLY_DAYS = (40, 130)
DELIVERY_DAYS = (5, 400)
TWO_MONTHLY_MEDIAN = 45  # days: half-way between one month and two

MAX_TANGLE = 500  # rows that all overlap, or share one period: more is a fault of the file, and
#                   comparing each with each would take for ever (safety, no source)

# A register that falls has passed its highest number if the rise through zero is at most so many
# times the largest ordinary rise a day; else the meter was replaced (our own, no source).
ROLLOVER_TIMES = 3.0
DIAL_DIGITS = (3, 9)  # fewest and most digits of a register (common practice, no source)

# An interval or a day is a small thing to estimate; a day or period of which so much was estimated
# is more guess than reading, and says so in the ledger (our own, no source).
ESTIMATED_SHARE = 0.25
# Readings of a period against its bill: a day's use more or less, when the meter was read at noon,
# is 3 % of a month (our own, no source).
SUM_MISMATCH = 0.05

# Solar panels, by their signature: electricity that all but vanishes in sunny months of the
# northern half of the earth.  An occupied house always runs a refrigerator (our own, no source).
DARK_MONTHS = (11, 12, 1, 2)
SUNNY_MONTHS = (4, 5, 6, 7, 8, 9)
SOLAR_SHARE = 0.10  # of the dark months' median use a day
SOLAR_MIN_DAYS = 45  # so low: more than one bill
SOLAR_MIN_PERIODS = 6

# --- Why a row was left out ---------------------------------------------------------------

KEPT = 0
BAD_DATE = 1
BACKWARDS = 2
NO_DAYS = 3
BAD_USE = 4
NEGATIVE = 5
DUPLICATE = 6
REPLACED = 7
CANCELLED = 8
OVERLAP = 9
SUBTOTAL = 10
OPEN_ESTIMATE = 11
TANGLE = 12

REASONS = {
    BAD_DATE: "a date outside 1900 to 2100",
    BACKWARDS: "ends before it starts",
    NO_DAYS: "covers no days",
    BAD_USE: "usage is missing or not a number that can be billed",
    NEGATIVE: "negative usage, and no earlier bill that it corrects",
    DUPLICATE: "the same bill as line {other}",
    REPLACED: "replaced by a later version of the same bill on line {other}",
    CANCELLED: "cancelled against line {other}, and not billed again for the same dates",
    OVERLAP: "overlaps the bill on line {other}, which was preferred "
    "(actual before estimated, then the later in the file)",
    SUBTOTAL: "covers other bills and repeats their sum",
    OPEN_ESTIMATE: "estimated reading, and no actual reading follows it directly",
    TANGLE: f"more than {MAX_TANGLE} rows overlap here, so none can be trusted",
}

OPEN_PARTIAL = "partial fill, and no full fill follows it directly"

# --- What was done to a row that became (part of) a period --------------------------------

ESTIMATE_JOINED = 1
CLOSES_ESTIMATE = 2
STUB_JOINED = 4
STUB_JOINED_BACK = 8
TOOK_STUB = 16
MOVED_START = 32
NETTED = 64
CORRECTION = 128
CREDIT = 256
LAST_VERSION = 512
SHORT = 1024
LONG = 2048
SAME_DAY = 4096

NOTES = {
    ESTIMATE_JOINED: "estimated reading, joined to the next actual one",
    CLOSES_ESTIMATE: "actual reading, takes in the estimated one before it",
    STUB_JOINED: f"shorter than {STUB_DAYS} days, joined to the next period",
    STUB_JOINED_BACK: f"shorter than {STUB_DAYS} days, joined to the period before",
    TOOK_STUB: f"takes in a bill shorter than {STUB_DAYS} days",
    MOVED_START: "overlapped the bill before it by a few days; starts where that one ends",
    NETTED: "cancelled against line {other} and billed again",
    CORRECTION: "a correction, added to the bill on line {other}",
    CREDIT: "a credit without usage, counted with the bill on line {other}",
    LAST_VERSION: "the last of several versions of this bill",
    SHORT: "unusually short period, kept",
    LONG: "unusually long period, kept",
    SAME_DAY: "second delivery of the same day, added to line {other}",
}

DELIVERY_NOTES = {
    ESTIMATE_JOINED: "partial fill, counted with the next full one",
    CLOSES_ESTIMATE: "full fill, takes in the partial fill before it",
}

# --- What is odd about a period and was left as it is --------------------------------------

ZERO_USE = 1
REPEATED_NUMBER = 2
TIMES_10 = 4
TIMES_100 = 8
EMPTY_HOUSE = 16
ALTERNATING = 32

REPEATS = 3  # the same number so often in a row is a guess written down again (our own, no source)
YEAR_SLACK_DAYS = 20  # "the same season": the middle of a period within so much of a year
JUMP_DECADES = 0.12  # within a third of 10 or 100 times, so that no cold month passes for a
#                      multiplier (our own, no source)
SPIKE_DECADES = 0.25  # a single bill, against the geometric mean of its neighbours, which lie on
#                       either side of it in season (our own, no source)
SPIKE_LEAST = 3.5  # and at least so many times the nearer of the two
JUMP_RUN = 3  # bills in a row ten times those of the year before (our own, no source)
EMPTY_SHARE = 0.25  # of the same season's use, the year before and (where known) the year after
EMPTY_DAYS = 45  # so long (both our own, no source)
SEASON_TERMS = 5  # of the season taken out before looking for a sway: level and two waves a year
ALTERNATING_MIN_PERIODS = 18
ALTERNATING_SIGMAS = 2.5  # of white noise's lag-1 correlation, 1/sqrt(n) (Bartlett 1946)

# Bit → (name, words for the ledger and cautions).
FLAGS = {
    ZERO_USE: ("zero use", "no use at all"),
    REPEATED_NUMBER: (
        "repeated number",
        f"the same use {REPEATS} times or more in a row: probably estimated, though not marked",
    ),
    TIMES_10: ("multiplier", "ten times more or less than its neighbours or the year before"),
    TIMES_100: (
        "multiplier",
        "a hundred times more or less than its neighbours or the year before",
    ),
    EMPTY_HOUSE: (
        "empty house",
        "a quarter or less of the same season's use in other years: perhaps nobody lived there, "
        "or the heating failed or was replaced",
    ),
    ALTERNATING: (
        "alternating",
        "bills sway high and low in turn: readings may be estimated, though not marked",
    ),
}
