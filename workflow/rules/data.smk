# Takes the raw files in: a clean panel, the market, what was set aside, and the counts; and shows what was found.


checkpoint validate_returns:
    input:
        made=made(study.returns, study.market, study.riskless),
        digests=wiring.raw_digests("data.returns", "data.market", "data.riskless"),
        options=wiring.options_file("validate_returns"),
        pins=wiring.pins,
        code=wiring.code("validate_returns"),
    output:
        **wiring.panels,
        **wiring.markets,
        set_aside=wiring.path("data/set_aside.parquet"),
        set_aside_csv=wiring.path("data/set_aside.csv"),
        intake=wiring.path("data/intake.json"),
        raw_files=wiring.path("data/raw_files.json"),
    log:
        wiring.path("logs/validate_returns.log"),
    benchmark:
        wiring.path("benchmarks/validate_returns.tsv")
    params:
        files=wiring.raw_files,
        options=wiring.options("validate_returns"),
    script:
        "../scripts/validate_returns.py"


if study.factors is not None:

    rule read_factors:
        input:
            digests=wiring.raw_digests("data.factors"),
            options=wiring.options_file("read_factors"),
            pins=wiring.pins,
            code=wiring.code("read_factors"),
        output:
            factors=wiring.path("data/factors.parquet"),
        log:
            wiring.path("logs/read_factors.log"),
        benchmark:
            wiring.path("benchmarks/read_factors.tsv")
        params:
            files=list(study.factors.files),
            options=wiring.options("read_factors"),
        script:
            "../scripts/read_factors.py"


rule write_data_report:
    input:
        intake=after_validation("data/intake.json"),
        raw_files=after_validation("data/raw_files.json"),
        options=wiring.options_file("write_paper"),
        pins=wiring.pins,
        code=wiring.code("write_data_report"),
    output:
        report=wiring.path("data_report.html"),
    log:
        wiring.path("logs/write_data_report.log"),
    benchmark:
        wiring.path("benchmarks/write_data_report.tsv")
    params:
        options=wiring.options("write_paper"),
    script:
        "../scripts/write_data_report.py"
