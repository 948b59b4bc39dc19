from pathlib import Path

from lineproof import joblog, store
from lineproof.intake.signed import signed
from lineproof.validation import validate_returns

with joblog.job(snakemake), store.Scratch(Path(snakemake.output.panel).parent) as scratch:
    out, options = dict(snakemake.output.items()), snakemake.params.options
    found = validate_returns(snakemake.params.files, scratch, **options)
    panels = {name: out[name] for name in ("panel", "daily") if name in out}
    store.write_together(found.tables(), panels, options["frequency"])
    for name, market in found.markets().items():
        store.write_table(market, out[name], name, options["frequency"])
    store.write_together(found.set_aside(), {"set_aside": out["set_aside"]})
    store.copy_as_csv(out["set_aside"], out["set_aside_csv"])
    counts = signed(found.counts(), snakemake.params.files, snakemake.input.digests, options)
    store.write_json(counts, out["intake"])
