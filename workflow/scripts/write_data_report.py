from lineproof import joblog, store
from lineproof.paper.data_report import make_data_report

with joblog.job(snakemake):
    intake = store.read_json(snakemake.input.intake)
    report = make_data_report(intake, snakemake.params.options["facts"])
    store.write_text(report, snakemake.output.report)
