# The commands; each sets up the environment it needs first.
PYTHON ?= python3
STUDY ?= config/kestrel.yaml
CORES ?=
run = $(PYTHON) workflow/run.py

.PHONY: help study check test lint bench docs

help: ## show this list
	@grep -E '^[a-z]+:.*## ' $(MAKEFILE_LIST) | sed -E 's/^([a-z]+):.*## /  make \1\t/'
	@echo '  STUDY=path/to/own.yaml chooses the study, CORES=n the processor cores.'

study: ## run the study, or what of it is out of date
	@$(run) study "$(STUDY)" $(if $(CORES),--cores $(CORES))

check: ## check a study file and its data only
	@$(run) check "$(STUDY)" $(if $(CORES),--cores $(CORES))

test: ## run the tests
	@$(run) test

lint: ## check style, of the Snakemake files too
	@$(run) lint

bench: ## measure speed, as ratios to other work in the same run
	@$(run) bench

docs: ## write config/README.md anew from the schema
	@$(run) docs
