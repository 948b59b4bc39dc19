from lineproof import joblog, store
from lineproof.forming import form_portfolios

with joblog.job(snakemake):
    market = store.read_table(snakemake.input.market)
    options = snakemake.params.options
    found = form_portfolios(snakemake.params.sources, market, **options)
    for name, table in found.tables().items():
        store.write_table(table, snakemake.output[name], name, options["frequency"])
