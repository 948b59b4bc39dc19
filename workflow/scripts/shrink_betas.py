from lineproof import joblog, store
from lineproof.estimation import shrink_betas

with joblog.job(snakemake):
    options = dict(snakemake.params.options)
    dated = options.pop("dated")
    betas = shrink_betas(store.read_table(snakemake.input.betas), **options)
    store.write_table(betas, snakemake.output.betas, "betas", dated)
