# Prices each subperiod, describes the sample and the groups, and gathers every number into one table.


rule price_subperiod:
    input:
        cut=after_cutting("subperiods/{subperiod}.parquet"),
        options=wiring.options_file("price_subperiod"),
        pins=wiring.pins,
        code=wiring.code("price_subperiod"),
    output:
        estimates=wiring.path("pricing/{subperiod}.parquet"),
    log:
        wiring.path("logs/price_subperiod-{subperiod}.log"),
    benchmark:
        wiring.path("benchmarks/price_subperiod-{subperiod}.tsv")
    params:
        options=wiring.options("price_subperiod"),
    script:
        "../scripts/price_subperiod.py"


rule describe_sample:
    input:
        panel=after_cutting("data/panel.parquet"),
        market=after_cutting("data/market.parquet"),
        intake=after_cutting("data/intake.json"),
        index=after_cutting("subperiods/index.json"),
        betas=after_cutting([f"betas/{name}.parquet" for name in wiring.main_betas]),
        formed=after_cutting(wiring.formed),
        options=wiring.options_file("describe_sample"),
        pins=wiring.pins,
        code=wiring.code("describe_sample"),
    output:
        estimates=wiring.path("sample.parquet"),
    log:
        wiring.path("logs/describe_sample.log"),
    benchmark:
        wiring.path("benchmarks/describe_sample.tsv")
    params:
        options=wiring.options("describe_sample"),
    script:
        "../scripts/describe_sample.py"


rule gather_estimates:
    input:
        sample=after_cutting("sample.parquet"),
        subperiods=priced,
        pins=wiring.pins,
        code=wiring.code("gather_estimates"),
    output:
        estimates=wiring.path("estimates.parquet"),
        csv=wiring.path("estimates.csv"),
    log:
        wiring.path("logs/gather_estimates.log"),
    benchmark:
        wiring.path("benchmarks/gather_estimates.tsv")
    script:
        "../scripts/gather_estimates.py"
