"""The fuzzing of bills_fuzz.py guided by coverage, with atheris, where that is installed.

``python -m tests.prove.bills_fuzz_guided -max_total_time=120`` (arguments of libFuzzer).  What it
follows must be instrumented as it is loaded, so the reader is imported here; compiled kernels
cannot be.
"""

from __future__ import annotations

import importlib
import sys
import tempfile
from pathlib import Path

FOLLOWED = (
    "amounts answers columns dates deliveries espi espi_links espi_numbers espi_xml found "
    "fuel_and_unit headings layout_choice layouts read records registers select table table_bills"
)


def guided(arguments: list[str]) -> None:
    """Run until libFuzzer stops; an exception that is not the program's own stops it."""
    atheris = importlib.import_module("atheris")
    for kernels in ("repair", "flags", "interval_kernel", "local_days"):
        importlib.import_module(f"normalize.bills.{kernels}")
    modules = [f"normalize.bills.{name}" for name in FOLLOWED.split()]
    with atheris.instrument_imports(include=modules):
        for module in modules:
            importlib.import_module(module)
    read_bills = importlib.import_module("normalize.bills.read").read_bills
    error = importlib.import_module("normalize.errors").NormalizeError
    fuzz = importlib.import_module("tests.prove.bills_fuzz")
    with tempfile.TemporaryDirectory() as folder:
        corpus = Path(folder) / "corpus"
        corpus.mkdir()
        for k, data in enumerate(fuzz.seeds()):
            (corpus / f"{k}").write_bytes(b"\0" + data)
        file = Path(folder) / "bills.csv"

        def one_input(data: bytes) -> None:
            file.write_bytes(data[1:])
            options = dict(fuzz.OPTIONS[data[0] % len(fuzz.OPTIONS)]) if data else {}
            try:
                read_bills(file, **options)
            except error:
                return

        prefix = f"-artifact_prefix={tempfile.gettempdir()}/"
        atheris.Setup([sys.argv[0], prefix, *arguments, str(corpus)], one_input)
        atheris.Fuzz()


if __name__ == "__main__":
    guided(sys.argv[1:])
