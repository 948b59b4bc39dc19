from lineproof import joblog, store
from lineproof.estimation import estimate_in_pieces, shrink_betas

with joblog.job(snakemake):
    given, options = dict(snakemake.input.items()), dict(snakemake.params.options)
    dated, out = options["dated"], snakemake.output.betas
    if "shrink" in options:
        del options["dated"]
        store.write_table(
            shrink_betas(store.read_table(given["betas"]), **options), out, "betas", dated
        )
    else:
        panels = store.read_securities(given["panel"], ["security", "date", "excess_return"])
        tables = [store.read_table(given[t]) for t in ("market", "factors") if t in given]
        pieces = estimate_in_pieces(panels, *tables, **options)
        store.write_together(pieces, {"betas": out}, dated)
