from pathlib import Path

from lineproof import joblog, store
from lineproof.demo import make_demo

with joblog.job(snakemake):
    folder = Path(snakemake.output.raw[0]).parent
    for name, content in make_demo(**snakemake.params.options).items():
        if isinstance(content, str):
            store.write_text(content, folder / name)
        else:
            store.write_table(content, folder / f"{name}.parquet", None)
