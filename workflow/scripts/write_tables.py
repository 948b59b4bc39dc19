from pathlib import Path

from lineproof import joblog, store
from lineproof.paper.opening import open_context
from lineproof.paper.tables import make_tables

with joblog.job(snakemake):
    context = open_context(snakemake.input, snakemake.params.options)
    store.write_files(make_tables(context), Path(snakemake.output.tables[0]).parent)
