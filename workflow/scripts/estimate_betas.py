from lineproof import joblog, store
from lineproof.estimation import estimate_betas

with joblog.job(snakemake):
    panel = store.read_table(snakemake.input.panel, ["security", "date", "excess_return"])
    market = store.read_table(snakemake.input.market)
    betas = estimate_betas(panel, market, **snakemake.params.options)
    store.write_table(betas, snakemake.output.betas, "betas")
