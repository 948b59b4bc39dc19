from lineproof import joblog, store
from lineproof.periods import periods_of
from lineproof.sampling import describe_sample

with joblog.job(snakemake):
    panel = store.read_table(snakemake.input.panel, ["security", "date", "total_return"])
    days = store.read_table(snakemake.input.market, ["date"])["date"].to_numpy()
    estimated = [store.read_table(file, ["date"]) for file in snakemake.input.betas]
    index, intake = (store.read_json(snakemake.input[name]) for name in ("index", "intake"))
    periods = periods_of(snakemake.params.options["frequency"], days)
    estimates = describe_sample(panel, (estimated or [None])[0], index, intake, periods)
    store.write_table(estimates, snakemake.output.estimates, "estimates")
