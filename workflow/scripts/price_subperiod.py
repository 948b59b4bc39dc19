from lineproof import joblog, store
from lineproof.pricing import price_subperiod

with joblog.job(snakemake):
    cut = store.read_table(snakemake.input.cut)
    subperiod = snakemake.wildcards.subperiod
    estimates = price_subperiod(cut, subperiod=subperiod, **snakemake.params.options)
    store.write_table(estimates, snakemake.output.estimates, "estimates")
