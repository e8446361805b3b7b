# make demo: sets everything up and runs the main job.   make test: sets everything up and passes the tests.
PYTHON ?= python3
VENV := .venv
BIN := $(VENV)/bin
READY := $(VENV)/.ready

.PHONY: help demo test lint format setup coverage bench bench-detect clean
.DEFAULT_GOAL := help

help:
	@echo "make demo   set up and replay the Ostrel demo world (first run: a few minutes, most of it installing)"
	@echo "make test   set up and run the tests"
	@echo "make lint   format check, lint, types, import layers"
	@echo "make bench-detect   the detector against planted truth (ARGS=--short for the short form)"

$(READY): pyproject.toml config/constraints.txt
	@echo "== setting up $(VENV) (pinned packages; once, about two minutes)"
	@test -x $(BIN)/python || $(PYTHON) -m venv $(VENV)
	@$(BIN)/python -m pip install -qq --disable-pip-version-check --upgrade pip
	@$(BIN)/python -m pip install -qq --disable-pip-version-check -c config/constraints.txt -e ".[pipeline,desk,notebook,test]"
	@touch $(READY)

setup: $(READY)

lint: $(READY)
	$(BIN)/ruff format --check .
	$(BIN)/ruff check .
	$(BIN)/mypy
	$(BIN)/lint-imports

format: $(READY)
	$(BIN)/ruff format .
	$(BIN)/ruff check --fix .

demo: $(READY)
	@$(BIN)/swaygauge demo ostrel

test: $(READY)
	$(BIN)/python -m pytest -q -n 2 --dist loadfile

clean:
	rm -rf $(VENV) workspace

coverage: $(READY)
	$(BIN)/python -m pytest -q -n 2 --dist loadfile --cov --cov-report=term

# speed and memory of the scoring core beside other libraries: minutes; exits 1 when a ratio that must hold does not
bench: $(READY)
	@$(BIN)/python -m pip install -qq --disable-pip-version-check -c config/constraints.txt -e ".[bench]"
	$(BIN)/python tests/bench/run.py --out build/bench-scores.md $(ARGS)

bench-detect: $(READY)
	PYTHONPATH=tests $(BIN)/python -m bench.detect $(ARGS)
