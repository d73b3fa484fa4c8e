"""The numbers of the open utility-data standard (NAESB REQ.21, ESPI) and what they mean here.

What belongs here: codes and plain words.  How a file is taken apart is in espi_xml.py, how its
parts are joined in espi_links.py, what is made of them in espi.py.  Codes as in the standard's
published schema; the words are ours.
"""

from __future__ import annotations

# uom → (canonical unit of normalize.units, how many of it one uom is).
USABLE_UNITS: dict[int, tuple[str, float]] = {
    72: ("kWh", 1e-3),
    31: ("MJ", 1e-6),
    132: ("kBtu", 1e-3),
    169: ("therm", 1.0),
    42: ("m3", 1.0),
    166: ("m3", 1.0),
    167: ("m3", 1.0),
    119: ("ccf", 1e-2),
    120: ("ccf", 1e-2),
    128: ("gal", 1.0),
    130: ("imp gal", 1.0),
    134: ("L", 1.0),
    156: ("L", 1.0),
    157: ("L", 1.0),
}

# uom → why its series cannot be used.
OTHER_UNITS: dict[int, str] = {
    38: "demand (the highest rate of use, in watts)",
    61: "apparent power",
    63: "reactive power",
    71: "apparent use",
    73: "reactive use",
    133: "a rate of heat (Btu per hour)",
    23: "temperatures",
    6: "temperatures",
    80: "money alone",
    111: "counts",
    0: "numbers without a unit",
}

# ServiceCategory kind and ReadingType commodity → fuel of normalize.units.  Above 2 the two
# editions of the standard disagree on what a kind is, so those are asked about.
FUEL_OF_KIND: dict[int, str] = {0: "electricity", 1: "natural gas"}
FUEL_OF_COMMODITY: dict[int, str] = {
    1: "electricity",
    2: "electricity",
    7: "natural gas",
    8: "propane",
    10: "district steam",
}
WATER_KIND, WATER_COMMODITY = 2, 9
OTHER_COMMODITIES: dict[int, str] = {
    12: "heating fluid",
    13: "cooling fluid",
    WATER_COMMODITY: "water",
}

# accumulationBehaviour
USE_BETWEEN_READINGS = (None, 0, 4)
REGISTER = (1, 2, 3, 9, 13)  # the meter as it stood: differences are use
INSTANTANEOUS = 12
SUMMATION_WORDS = {12: "momentary values", 6: "indicated values", 14: "momentary values"}

# flowDirection
IMPORT = (None, 0, 1, 20)
NET = 4
EXPORT = 19

# ReadingType kind
OTHER_KINDS = {3: "money alone", 8: "demand", 37: "power"}
EXTREMES = {8: "highest values", 9: "lowest values"}  # dataQualifier

# ReadingQuality
ESTIMATED_QUALITIES = (8, 9, 11, 12)
SUSPECT_QUALITY = 10
WEATHER_NORMALIZED = 15

MULTIPLIERS = (-12, -9, -6, -3, -2, -1, 0, 1, 2, 3, 6, 9, 12)
CURRENCIES = {840: "USD", 124: "CAD", 978: "EUR", 826: "GBP", 36: "AUD", 554: "NZD"}
MONEY = 1e-5  # of a unit of currency
