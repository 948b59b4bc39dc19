from pathlib import Path

from lineproof import joblog, store
from lineproof.paper.figures import draw_figures
from lineproof.paper.opening import open_context

with joblog.job(snakemake):
    context = open_context(snakemake.input, snakemake.params.options)
    store.write_files(draw_figures(context), Path(snakemake.output.figures[0]).parent)
