from lineproof import joblog, store
from lineproof.sampling import describe_sample

with joblog.job(snakemake):
    panel = store.read_table(snakemake.input.panel, ["security", "date", "total_return"])
    estimated = [store.read_table(file, ["security", "date"]) for file in snakemake.input.betas]
    index, intake = (store.read_json(snakemake.input[name]) for name in ("index", "intake"))
    estimates = describe_sample(panel, estimated[0] if estimated else None, index, intake)
    store.write_table(estimates, snakemake.output.estimates, "estimates")
