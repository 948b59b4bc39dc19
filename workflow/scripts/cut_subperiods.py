from dataclasses import asdict
from pathlib import Path

from lineproof import joblog, store
from lineproof.subperiods import cut_subperiods

with joblog.job(snakemake):
    sorts = {Path(file).parent.name: store.read_table(file) for file in snakemake.input.sorts}
    market = store.read_table(snakemake.input.market)
    subperiods, cuts = cut_subperiods(sorts, market, **snakemake.params.options)
    folder = Path(snakemake.output.index).parent
    for name, cut in cuts.items():
        store.write_table(cut, folder / f"{name}.parquet", "subperiod")
    store.keep_only(cuts, folder)
    store.write_json(
        [asdict(s) | {"n_periods": s.n_periods} for s in subperiods], folder / "index.json"
    )
