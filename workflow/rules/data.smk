# Takes the raw files in: a clean panel, the market, what was set aside, and the counts.


checkpoint validate_returns:
    input:
        made=made(study.returns, study.market, study.riskless),
        digests=wiring.raw_digests("data.returns", "data.market", "data.riskless"),
        options=wiring.options_file("validate_returns"),
        pins=wiring.pins,
        code=wiring.code("validate_returns"),
    output:
        panel=wiring.path("data/panel.parquet"),
        market=wiring.path("data/market.parquet"),
        set_aside=wiring.path("data/set_aside.parquet"),
        set_aside_csv=wiring.path("data/set_aside.csv"),
        intake=wiring.path("data/intake.json"),
    log:
        wiring.path("logs/validate_returns.log"),
    benchmark:
        wiring.path("benchmarks/validate_returns.tsv")
    params:
        files={name: raw_files(getattr(study, name)) for name in ("returns", "market", "riskless")},
        options=wiring.options("validate_returns"),
    script:
        "../scripts/validate_returns.py"
