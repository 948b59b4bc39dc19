from lineproof import joblog, store
from lineproof.forming import form_portfolios

with joblog.job(snakemake):
    market = store.read_table(snakemake.input.market)
    found = form_portfolios(snakemake.params.sources, market, **snakemake.params.options)
    store.write_table(found.members, snakemake.output.members, "members")
    store.write_table(found.returns, snakemake.output.returns, "portfolio_returns")
