from lineproof import joblog, store
from lineproof.forming import form_portfolios

with joblog.job(snakemake):
    market = store.read_table(snakemake.input.market)
    options = snakemake.params.options
    found = form_portfolios(snakemake.input.sources, market, **options)
    store.write_table(found.members, snakemake.output.members, "members", options["frequency"])
    store.write_table(
        found.returns, snakemake.output.returns, "portfolio_returns", options["frequency"]
    )
