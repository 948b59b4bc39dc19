from pathlib import Path

from lineproof import joblog, store
from lineproof.validation import validate_returns

with joblog.job(snakemake), store.Scratch(Path(snakemake.output.panel).parent) as scratch:
    out = snakemake.output
    found = validate_returns(snakemake.params.files, scratch, **snakemake.params.options)
    store.write_together(found.tables(), {"panel": out.panel})
    store.write_table(found.market(), out.market, "market")
    store.write_together(found.set_aside(), {"set_aside": out.set_aside})
    store.copy_as_csv(out.set_aside, out.set_aside_csv)
    store.write_json(found.counts(), out.intake)
