from lineproof import joblog, store
from lineproof.estimation import estimate_betas

with joblog.job(snakemake):
    panel = store.read_table(snakemake.input.panel, ["security", "date", "excess_return"])
    market = store.read_table(snakemake.input.market)
    options = snakemake.params.options
    betas = estimate_betas(panel, market, **options)
    store.write_table(betas, snakemake.output.betas, "betas", options["dated"])
