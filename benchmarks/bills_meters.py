"""Very many meters in one ESPI file: does the time grow with them, and not with their square?

``python -m benchmarks.bills_meters [most meters]`` prints a table for docs/evidence-bills.md.
Seconds are those of work (CPU).  Invented: each meter with its own kind of readings, two months in
two blocks, and a bill.
"""

from __future__ import annotations

import sys
import tempfile
import time
from pathlib import Path

from normalize.bills.accounts import read_accounts
from normalize.bills.espi import open_espi

HEAD = (
    '<feed xmlns="http://www.w3.org/2005/Atom"><entry><content><LocalTimeParameters '
    'xmlns="http://naesb.org/espi"><dstEndRule>B40E2000</dstEndRule><dstOffset>3600</dstOffset>'
    "<dstStartRule>360E2000</dstStartRule><tzOffset>-18000</tzOffset></LocalTimeParameters>"
    "</content></entry>"
)
BEGIN, MONTH = 1_672_894_800, 30 * 86_400  # 2023-01-05 in New York


def _entry(own: str, related: tuple[str, ...], content: str) -> str:
    links = f'<link rel="self" href="{own}"/><link rel="up" href="{own.rpartition("/")[0]}"/>'
    links += "".join(f'<link rel="related" href="{r}"/>' for r in related)
    tag, _, body = content.partition(">")
    inner = f'<{tag} xmlns="http://naesb.org/espi">{body}</{tag}>'
    return f"<entry>{links}<content>{inner}</content></entry>"


def write_meters(file: Path, meters: int) -> None:
    """An invented file of that many electricity meters."""
    parts = [HEAD]
    for n in range(1, meters + 1):
        point, kind = f"espi/1_1/resource/U/1/UsagePoint/{n}", f"espi/1_1/resource/ReadingType/{n}"
        meter = f"{point}/MeterReading/1"
        parts += [
            _entry(point, (f"{point}/MeterReading",),
                   "UsagePoint><ServiceCategory><kind>0</kind></ServiceCategory>"),
            _entry(meter, (f"{meter}/IntervalBlock", kind), "MeterReading>"),
            _entry(kind, (), "ReadingType><uom>72</uom><commodity>1</commodity>"),
            _entry(f"{point}/UsageSummary/1", (),
                   f"UsageSummary><billingPeriod><duration>{MONTH}</duration><start>{BEGIN}</start>"
                   "</billingPeriod><billLastPeriod>100000</billLastPeriod>"),
        ]  # fmt: skip
        for k in (0, 1):
            reading = (
                f"<IntervalReading><timePeriod><duration>{MONTH}</duration><start>"
                f"{BEGIN + k * MONTH}</start></timePeriod><value>{100_000 * n}</value>"
                "</IntervalReading>"
            )
            parts.append(_entry(f"{meter}/IntervalBlock/{k}", (), f"IntervalBlock>{reading}"))
    file.write_text("".join([*parts, "</feed>"]))


def main(most: int) -> None:
    """Print the table."""
    print("| meters | MB | joined, s | ms a meter | every account read, s | ms a meter |")
    print("| --: | --: | --: | --: | --: | --: |")
    with tempfile.TemporaryDirectory() as folder:
        file = Path(folder) / "usage.xml"
        write_meters(file, 2)
        read_accounts(file)  # kernels loaded
        for meters in (most // 8, most // 4, most // 2, most):
            write_meters(file, meters)
            data = file.read_bytes()
            began = time.process_time()
            open_espi(data, file.name)
            joined = time.process_time() - began
            began = time.process_time()
            found = read_accounts(file)
            took = time.process_time() - began
            right = [round(100.0 * n, 6) for n in range(1, meters + 1)]
            if [round(float(b.periods.use[0]), 6) for b in found.bills] != right:
                raise SystemExit("a reading is at the wrong meter")
            each = [f"{s:.2f} | {1000 * s / meters:.2f}" for s in (joined, took)]
            print(f"| {meters:,} | {len(data) / 1e6:.1f} | {' | '.join(each)} |", flush=True)


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 2_000)
