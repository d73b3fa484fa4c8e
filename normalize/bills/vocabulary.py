"""The words by which columns of a bill file are known, in one table.

What belongs here: words and how strongly each speaks for a role.  To teach the reader a new
heading, add a line to WORDS.  How headings are taken apart and scored is in columns.py.

All entries are general usage of the trade (common practice, no source); none is copied from
any one company's file.
"""

from __future__ import annotations

# Role → what the column holds, in the words shown to the user.
ROLES = {
    "start": "start of the bill",
    "end": "end of the bill",
    "read": "date of the reading",
    "range": "both dates of the bill",
    "delivery": "date of the delivery",
    "bill date": "date of the bill itself",
    "days": "days of the bill",
    "year": "year",
    "month": "month",
    "day": "day of the month",
    "time": "time of day",
    "time end": "time of day at which it ends",
    "usage": "usage",
    "register": "reading of the meter",
    "unit": "unit",
    "cost": "cost",
    "estimated": "mark of an estimated reading",
    "fill": "mark of a full fill",
    "notes": "notes",
    "temperature": "mean outdoor temperature",
    "account": "account or meter",
    "private": "name or address",
    "fuel": "fuel",
    "ignore": "not used",
}

# (role, heading, weight).  A heading that is all of the cell counts its weight and more for
# every word; one that is part of the cell loses a point for every word beside it.
WORDS: tuple[tuple[str, str, float], ...] = (
    ("start", "start", 9), ("start", "start date", 10), ("start", "from", 8),
    ("start", "from date", 10), ("start", "date from", 10), ("start", "begin", 9),
    ("start", "begin date", 10), ("start", "beginning", 8), ("start", "service from", 10),
    ("start", "service start", 10), ("start", "period start", 10), ("start", "bill start", 10),
    ("start", "prior read", 9), ("start", "previous read", 9), ("start", "previous reading", 6),
    ("start", "previous read date", 11), ("start", "prior read date", 11),
    ("start", "last read date", 9), ("start", "previous reading date", 11),
    ("start", "first day", 9),
    ("end", "end", 9), ("end", "end date", 10), ("end", "ending", 8), ("end", "to", 8),
    ("end", "to date", 8), ("end", "date to", 10), ("end", "thru", 9), ("end", "through", 9),
    ("end", "service to", 10), ("end", "service end", 10), ("end", "period end", 10),
    ("end", "billing period end", 11), ("start", "billing period start", 11),
    ("end", "bill end", 10), ("end", "until", 9), ("end", "stop", 8), ("end", "last day", 9),
    ("end", "current read date", 10), ("end", "finish", 7),
    ("read", "read date", 10), ("read", "reading date", 10), ("read", "meter read date", 11),
    ("read", "meter reading date", 11), ("read", "date read", 10), ("read", "date of reading", 11),
    ("read", "read on", 9), ("read", "date", 5), ("read", "meter read", 6),
    ("range", "service period", 10), ("range", "billing period", 10), ("range", "bill period", 10),
    ("range", "period", 7), ("range", "service dates", 10), ("range", "dates", 8),
    ("range", "billing cycle", 8), ("range", "date range", 10),
    ("delivery", "delivery date", 12), ("delivery", "date delivered", 12),
    ("delivery", "delivered on", 11), ("delivery", "date of delivery", 12),
    ("delivery", "fill date", 11), ("delivery", "fill up date", 11), ("delivery", "delivery", 6),
    ("bill date", "bill date", 9), ("bill date", "billing date", 9),
    ("bill date", "statement date", 10), ("bill date", "invoice date", 10),
    ("bill date", "date billed", 9), ("bill date", "posting date", 9),
    ("bill date", "invoice", 5), ("bill date", "billed", 4),
    ("ignore", "due date", 12), ("ignore", "date due", 12), ("ignore", "payment date", 12),
    ("ignore", "date paid", 12), ("ignore", "next read date", 12),
    ("read", "timestamp", 10), ("read", "time stamp", 10), ("read", "date time", 10),
    ("read", "datetime", 10), ("read", "date and time", 11), ("read", "usage date", 9),
    ("start", "interval start", 11), ("start", "interval begin", 11),
    ("start", "start date time", 12), ("end", "end date time", 12),
    ("start", "start datetime", 12), ("end", "end datetime", 12),
    ("end", "interval end", 11), ("end", "interval ending", 11),
    ("time", "time", 7), ("time", "start time", 11), ("time", "time start", 11),
    ("time", "interval time", 10), ("time", "hour", 7), ("time", "hour ending", 9),
    ("time", "he", 6), ("time end", "end time", 11), ("time end", "time end", 11),
    ("days", "days", 10), ("days", "billing days", 11), ("days", "number of days", 11),
    ("days", "no of days", 11), ("days", "num days", 11), ("days", "bill days", 11),
    ("days", "days in period", 11), ("days", "days of service", 11), ("days", "service days", 11),
    ("days", "day count", 10), ("days", "days billed", 11), ("days", "days in billing period", 12),
    ("year", "year", 9), ("year", "yr", 8), ("month", "month", 9), ("month", "mo", 7),
    ("month", "bill month", 9), ("month", "billing month", 9), ("day", "day", 9),
    ("day", "day of month", 10),
    ("usage", "usage", 10), ("usage", "use", 8), ("usage", "used", 6), ("usage", "consumption", 10),
    ("usage", "energy", 6), ("usage", "quantity", 6), ("usage", "qty", 6), ("usage", "volume", 6),
    ("usage", "amount used", 11), ("usage", "total usage", 11), ("usage", "total use", 11),
    ("usage", "billed usage", 11), ("usage", "net usage", 11), ("usage", "delivered", 6),
    ("usage", "quantity delivered", 11), ("usage", "amount delivered", 11),
    ("usage", "total consumption", 11), ("usage", "units used", 9), ("usage", "units", 4),
    ("usage", "electricity", 5), ("usage", "gas", 4), ("usage", "oil", 4), ("usage", "propane", 5),
    ("unit", "unit", 9), ("unit", "uom", 10), ("unit", "unit of measure", 11),
    ("unit", "usage unit", 11), ("unit", "usage units", 11), ("unit", "units", 5),
    ("unit", "consumption unit", 11), ("unit", "measure", 6),
    ("cost", "cost", 10), ("cost", "charge", 8), ("cost", "charges", 9), ("cost", "price", 5),
    ("cost", "amount", 6), ("cost", "total", 4), ("cost", "total cost", 11), ("cost", "bill", 5),
    ("cost", "total bill", 9), ("cost", "bill amount", 10), ("cost", "current charges", 11),
    ("cost", "total charges", 11), ("cost", "total charge", 11), ("cost", "total amount", 9),
    ("cost", "amount billed", 10), ("cost", "billed amount", 10), ("cost", "gas bill", 10),
    ("cost", "elec bill", 10), ("cost", "electric bill", 10), ("cost", "electricity bill", 10),
    ("cost", "gas cost", 10), ("cost", "electric cost", 10), ("cost", "gas charges", 10),
    ("cost", "electric charges", 10), ("cost", "dollars", 7), ("cost", "$", 6),
    ("ignore", "price per", 10), ("ignore", "cost per", 10), ("ignore", "unit price", 11),
    ("ignore", "rate", 7), ("ignore", "rate code", 10), ("ignore", "tariff", 8),
    ("ignore", "amount due", 12), ("ignore", "total amount due", 13), ("ignore", "balance", 10),
    ("ignore", "previous balance", 11), ("ignore", "payment", 10), ("ignore", "payments", 10),
    ("ignore", "late fee", 11), ("ignore", "tax", 8), ("ignore", "taxes", 8),
    ("ignore", "amount paid", 12), ("ignore", "paid", 8), ("ignore", "deposit", 8),
    ("estimated", "estimated", 10), ("estimated", "est", 8), ("estimated", "estimate", 9),
    ("estimated", "read type", 11), ("estimated", "reading type", 11),
    ("estimated", "actual estimated", 11), ("estimated", "actual or estimated", 12),
    ("estimated", "est act", 10), ("estimated", "act est", 10), ("estimated", "a e", 8),
    ("estimated", "actual est", 10), ("estimated", "reading status", 11),
    ("estimated", "read status", 11), ("estimated", "status", 6), ("estimated", "quality", 6),
    ("estimated", "read code", 9), ("estimated", "actual", 5), ("estimated", "type of reading", 11),
    ("fill", "fill", 8), ("fill", "full", 8), ("fill", "full fill", 10), ("fill", "filled", 8),
    ("fill", "tank filled", 10), ("fill", "fill type", 11), ("fill", "partial", 9),
    ("fill", "full partial", 11), ("fill", "full or partial", 12), ("fill", "full tank", 10),
    ("notes", "notes", 9), ("notes", "note", 9), ("notes", "comment", 9), ("notes", "comments", 9),
    ("notes", "remarks", 9), ("notes", "remark", 9),
    ("temperature", "temp", 9), ("temperature", "temperature", 10),
    ("temperature", "mean temp", 11), ("temperature", "avg temp", 11),
    ("temperature", "average temp", 11), ("temperature", "mean temperature", 11),
    ("temperature", "average temperature", 11), ("temperature", "avg temperature", 11),
    ("temperature", "mean outdoor temperature", 12),
    ("temperature", "average daily temperature", 12),
    ("ignore", "max temp", 12), ("ignore", "min temp", 12), ("ignore", "high temp", 12),
    ("ignore", "low temp", 12), ("ignore", "hdd", 10), ("ignore", "cdd", 10),
    ("ignore", "heating degree days", 13), ("ignore", "cooling degree days", 13),
    ("ignore", "degree days", 12),
    ("account", "account", 9), ("account", "acct", 9), ("account", "account number", 11),
    ("account", "account no", 11), ("account", "account id", 11), ("account", "meter", 8),
    ("account", "meter number", 11), ("account", "meter no", 11), ("account", "meter id", 11),
    ("account", "service id", 11), ("account", "premise", 9), ("account", "premise id", 11),
    ("account", "service point", 10), ("account", "customer number", 11),
    ("account", "customer id", 11), ("account", "tank", 8), ("account", "tank number", 11),
    ("private", "address", 9), ("private", "service address", 11), ("private", "name", 8),
    ("private", "customer name", 11), ("private", "customer", 6), ("private", "account name", 11),
    ("private", "email", 9), ("private", "phone", 9),
    ("fuel", "fuel", 9), ("fuel", "fuel type", 11), ("fuel", "commodity", 10),
    ("fuel", "service type", 10), ("fuel", "energy type", 10), ("fuel", "utility type", 10),
    ("fuel", "service", 6), ("fuel", "type", 4), ("fuel", "product", 6),
    ("register", "reading", 7), ("register", "meter reading", 9),
    ("register", "current reading", 11),
    ("register", "present reading", 11), ("register", "current read", 8),
    ("register", "register", 9), ("register", "end reading", 11), ("register", "index", 6),
    ("register", "start reading", 11), ("register", "previous meter reading", 12),
    ("register", "current meter reading", 12),
    ("ignore", "multiplier", 10), ("ignore", "constant", 8), ("ignore", "factor", 8),
    ("ignore", "therm factor", 12), ("ignore", "demand", 11), ("ignore", "peak", 9),
    ("ignore", "on peak", 12), ("ignore", "off peak", 12), ("ignore", "mid peak", 12),
    ("ignore", "on peak usage", 13), ("ignore", "off peak usage", 13), ("ignore", "tier", 10),
    ("ignore", "export", 11), ("ignore", "exported", 11), ("ignore", "generation", 11),
    ("ignore", "last year", 12), ("ignore", "tank percent", 11), ("ignore", "tank %", 11),
    ("ignore", "k factor", 11),
    ("ignore", "bill number", 11), ("ignore", "invoice number", 11), ("ignore", "invoice no", 11),
    ("ignore", "row", 8), ("ignore", "rownames", 9), ("ignore", "id", 6), ("ignore", "index no", 9),
)  # fmt: skip

# Joined words that people write as one.
COMPOUNDS = {
    "totalbill": "total bill", "gasbill": "gas bill", "elecbill": "elec bill",
    "electricbill": "electric bill", "startdate": "start date", "enddate": "end date",
    "readdate": "read date", "billdate": "bill date", "fromdate": "from date", "todate": "to date",
    "totalcost": "total cost", "billingdays": "billing days", "numdays": "num days",
    "thermsperday": "therms per day", "kwhperday": "kwh per day", "avgtemp": "avg temp",
    "readtype": "read type", "accountnumber": "account number", "meternumber": "meter number",
    "deliverydate": "delivery date", "periodstart": "period start", "periodend": "period end",
    "usagekwh": "usage kwh", "totalkwh": "total kwh", "billamount": "bill amount",
}  # fmt: skip

ESTIMATED_YES = {
    "e", "est", "estimate", "estimated", "calculated", "calc", "estimated read",
    "estimated reading", "prorated", "projected", "c",
}  # fmt: skip
ESTIMATED_NO = {
    "a", "act", "actual", "actual read", "actual reading", "read", "r", "real", "ok", "regular",
    "normal", "customer", "customer read", "cust", "verified", "valid", "measured", "remote",
}  # fmt: skip
YES = {"y", "yes", "true", "1", "x", "t"}
NO = {"n", "no", "false", "0", "f"}
FULL = {"full", "f", "full fill", "filled", "topped off", "fill", "complete", "100", "100%"}
PARTIAL = {"partial", "p", "part", "part fill", "partial fill", "not full", "half"}

TOTALS = {
    "total", "totals", "sum", "average", "avg", "mean", "grand total", "sub total", "subtotal",
    "minimum", "maximum", "min", "max", "annual total", "yearly total", "year total",
}  # fmt: skip

CELSIUS = {"c", "°c", "degc", "deg c", "degrees c", "celsius", "degrees celsius", "centigrade"}
FAHRENHEIT = {"f", "°f", "degf", "deg f", "degrees f", "fahrenheit", "degrees fahrenheit"}
