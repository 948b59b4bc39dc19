from pathlib import Path

from lineproof import joblog, store
from lineproof.subperiods import cut_subperiods, listed

with joblog.job(snakemake):
    sorts = {Path(file).parent.name: store.read_table(file) for file in snakemake.input.sorts}
    market = store.read_table(snakemake.input.market)
    options = dict(snakemake.params.options)
    frequency = options.pop("frequency")
    subperiods, cuts = cut_subperiods(sorts, market, **options)
    folder = Path(snakemake.output.index).parent
    for name, cut in cuts.items():
        store.write_table(cut, folder / f"{name}.parquet", "subperiod", frequency)
    store.keep_only(cuts, folder)
    store.write_json(listed(subperiods, market, frequency), folder / "index.json")
