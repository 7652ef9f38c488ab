# Two commands do everything: `make demo` (set-up and the main job) and `make test` (set-up and all tests).
PYTHON ?= python3
VENV := .venv
BIN := $(VENV)/bin

.PHONY: demo test lint types bench clean

demo: $(VENV)/.runtime
	$(BIN)/linetest demo

test: $(VENV)/.dev lint types
	$(BIN)/pytest -n 2

lint: $(VENV)/.dev
	$(BIN)/ruff format --check .
	$(BIN)/ruff check .

types: $(VENV)/.dev
	$(BIN)/mypy

bench: $(VENV)/.dev
	$(BIN)/python -m benchmarks

$(BIN)/python:
	$(PYTHON) -c 'import sys; sys.exit(sys.version_info < (3, 11))' || (echo "linetest needs Python 3.11 or newer"; exit 1)
	$(PYTHON) -m venv $(VENV)

$(VENV)/.runtime: pyproject.toml | $(BIN)/python
	$(BIN)/python -m pip install --quiet --disable-pip-version-check --editable .
	touch $@

$(VENV)/.dev: pyproject.toml | $(BIN)/python
	$(BIN)/python -m pip install --quiet --disable-pip-version-check --editable '.[dev]'
	touch $@ $(VENV)/.runtime

clean:
	rm -rf $(VENV) build dist demo-output .mypy_cache .ruff_cache .hypothesis
