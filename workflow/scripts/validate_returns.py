from pathlib import Path

from lineproof import joblog, store
from lineproof.intake.signed import signed
from lineproof.validation import validate_returns

with joblog.job(snakemake), store.Scratch(Path(snakemake.output.panel).parent) as scratch:
    out, options = dict(snakemake.output.items()), snakemake.params.options
    found = validate_returns(snakemake.params.files, scratch, **options)
    store.write_together(found.tables(), {p: out[p] for p in found.panels}, options["frequency"])
    for name, market in found.markets().items():
        store.write_table(market, out[name], name, options["frequency"])
    store.write_together(found.set_aside(), {"set_aside": out["set_aside"]})
    store.copy_as_csv(out["set_aside"], out["set_aside_csv"])
    store.write_json(found.counts(), out["intake"])
    raw = signed(found.files(), snakemake.params.files, snakemake.input.digests, options)
    store.write_json(raw, out["raw_files"])
