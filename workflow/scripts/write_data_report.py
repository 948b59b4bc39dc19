from lineproof import joblog, store
from lineproof.paper.data_report import write_data_report

with joblog.job(snakemake):
    intake = store.read_json(snakemake.input.intake)
    raw = store.read_json(snakemake.input.raw_files)
    report = write_data_report(intake, snakemake.params.options["facts"], raw)
    store.write_text(report, snakemake.output.report)
