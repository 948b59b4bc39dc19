from lineproof import joblog, store
from lineproof.formation_summary import describe_sorts
from lineproof.gathering import gather_estimates
from lineproof.periods import periods_of
from lineproof.sampling import describe_sample

with joblog.job(snakemake):
    panel = store.read_table(snakemake.input.panel, ["security", "date", "total_return"])
    days = store.read_table(snakemake.input.market, ["date"])["date"].to_numpy()
    estimated = [store.read_table(file, ["date"]) for file in snakemake.input.betas]
    formed = [store.read_table(file) for file in snakemake.input.formed]
    index, intake = (store.read_json(snakemake.input[name]) for name in ("index", "intake"))
    periods = periods_of(snakemake.params.options["frequency"], days)
    sample = describe_sample(panel, (estimated or [None])[0], index, intake, periods)
    groups = describe_sorts(snakemake.params.options["hold"], formed, panel["date"].max())
    store.write_table(gather_estimates([sample, *groups]), snakemake.output.estimates, "estimates")
