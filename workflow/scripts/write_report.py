from lineproof import joblog, store
from lineproof.paper.opening import open_context
from lineproof.paper.report import write_report

with joblog.job(snakemake):
    context = open_context(snakemake.input, snakemake.params.options)
    figures = store.read_files(snakemake.input.figures)
    store.write_text(write_report(context, figures), snakemake.output.report)
