# The verbs of this project.  The README gives the same steps without make.
#
#   make demo     install, assess the sample sites, write reports/
#   make install  the .venv alone
#   make test     install what the tests need, run all of them
#   make lint     ruff and mypy
#   make bench    time it, against other ways of doing the same
#   make prove    checks too long for CI; writes docs/evidence.md
#   make calibration  does 90 % mean 90 %; writes docs/calibration.md (an hour or so)

.PHONY: demo install test lint bench prove calibration docs clean
.DEFAULT_GOAL := demo

RUN := .venv/bin/python

demo:
	@sh .ci/venv base
	@sh .ci/demo

install:
	@sh .ci/venv base

test:
	@sh .ci/venv dev
	@sh .ci/system-packages
	@sh .ci/tests

lint:
	@sh .ci/venv dev
	$(RUN) -m ruff check .
	$(RUN) -m ruff format --check .
	$(RUN) -m mypy

bench:
	@sh .ci/venv dev
	$(RUN) -m benchmarks.run

prove:
	@sh .ci/venv dev
	$(RUN) -m tests.prove

# Kept cell by cell, so that a run that was stopped is taken up again.  For a quick look:
#   .venv/bin/python -m tests.prove.calibration --homes 100 --out /tmp/calibration
calibration:
	@sh .ci/venv dev
	$(RUN) -m tests.prove.calibration

# Pages that are generated: the commands' reference, and the answer shown in the README.
docs:
	@sh .ci/venv base
	$(RUN) docs/generate.py

clean:
	rm -rf .venv .pytest_cache .mypy_cache .ruff_cache .hypothesis build dist
	find normalize tests benchmarks sample_data -name __pycache__ -type d -prune -exec rm -rf {} +
