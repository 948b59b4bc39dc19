from pathlib import Path

from lineproof import joblog, store
from lineproof.gathering import gather_estimates

with joblog.job(snakemake):
    parts = [
        store.read_table(file) for file in (snakemake.input.sample, *snakemake.input.subperiods)
    ]
    estimates = gather_estimates(parts)
    store.write_table(estimates, snakemake.output.estimates, "estimates")
    store.write_csv(estimates, snakemake.output.csv)
    names = {Path(file).stem for file in snakemake.input.subperiods}
    store.keep_only(names, Path(snakemake.input.subperiods[0]).parent)
