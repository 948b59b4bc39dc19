# Cuts the returns of all test assets into one small file a subperiod, so that each is priced only when it changed.


checkpoint cut_subperiods:
    input:
        sorts=after_validation([f"portfolios/{name}/returns.parquet" for name in study.sorts]),
        market=after_validation("data/market.parquet"),
        options=wiring.options_file("cut_subperiods"),
        pins=wiring.pins,
        code=wiring.code("cut_subperiods"),
    output:
        index=wiring.path("subperiods/index.json"),
    log:
        wiring.path("logs/cut_subperiods.log"),
    benchmark:
        wiring.path("benchmarks/cut_subperiods.tsv")
    params:
        options=wiring.options("cut_subperiods"),
    script:
        "../scripts/cut_subperiods.py"
