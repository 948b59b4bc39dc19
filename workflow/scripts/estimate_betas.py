from lineproof import joblog, store
from lineproof.estimation import estimate_betas

with joblog.job(snakemake):
    given, options = dict(snakemake.input.items()), snakemake.params.options
    panels = store.read_securities(given["panel"], ["security", "date", "excess_return"])
    tables = [store.read_table(given[name]) for name in ("market", "factors") if name in given]
    pieces = estimate_betas(panels, *tables, **options)
    store.write_together(pieces, {"betas": snakemake.output.betas}, options["dated"])
