from lineproof import joblog, store
from lineproof.factors import read_factors

with joblog.job(snakemake):
    options = snakemake.params.options
    factors = read_factors(snakemake.params.files, **options)
    store.write_table(factors, snakemake.output.factors, "factors", options["frequency"])
