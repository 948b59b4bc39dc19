from pathlib import Path

from lineproof import joblog, store
from lineproof.paper.opening import open_context
from lineproof.paper.tables import write_tables

with joblog.job(snakemake):
    context = open_context(snakemake.input, snakemake.params.options)
    store.write_files(write_tables(context), Path(snakemake.output.tables[0]).parent)
