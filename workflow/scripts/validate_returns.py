from lineproof import joblog, store
from lineproof.validation import validate_returns

with joblog.job(snakemake):
    files, out = snakemake.input, snakemake.output
    found = validate_returns(
        files.returns, files.market, files.riskless, **snakemake.params.options
    )
    store.write_table(found.panel, out.panel, "panel")
    store.write_table(found.market, out.market, "market")
    store.write_table(found.set_aside, out.set_aside, "set_aside")
    store.write_csv(found.set_aside, out.set_aside_csv)
    store.write_json(found.intake, out.intake)
