# One set of commands for contributors and CI. Another interpreter: make check PYTHON=python3
PYTHON ?= .venv/bin/python

.PHONY: help venv check test slow bench format

help:
	@echo "make venv    an environment in .venv with all that the tests need"
	@echo "make check   lint, format, types, walls between floors, fast tests (the README's command)"
	@echo "make slow    the tests that take longer than ten seconds each"
	@echo "make test    check and slow"
	@echo "make bench   the measurements of time"
	@echo "make format  let ruff put files in order"

venv:
	test -x .venv/bin/python || python3 -m venv .venv
	.venv/bin/pip install -e '.[test]'

# tests/test_house.py runs the linter, the formatter, mypy and the import contracts
check:
	$(PYTHON) -m pytest

# pytest leaves with 5 where no test carries the mark
slow:
	$(PYTHON) -m pytest -m slow || [ $$? -eq 5 ]

test: slow check

bench:
	$(PYTHON) -m pytest -m bench || [ $$? -eq 5 ]

format:
	$(PYTHON) -m ruff check --fix .
	$(PYTHON) -m ruff format .
