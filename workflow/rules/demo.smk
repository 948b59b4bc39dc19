# Invents the raw files of the Kestrel Sound Exchange, for a study that asks for them.

if study.demo is not None:

    rule make_demo:
        input:
            options=wiring.options_file("make_demo"),
            pins=wiring.pins,
            code=wiring.code("make_demo"),
        output:
            raw=[
                f"{study.raw}/{name}.csv"
                for name in ("returns", "market", "riskless", "sector_indices")
            ],
            truth=[f"{study.raw}/truth_{name}.parquet" for name in ("eras", "betas", "faults")],
        log:
            wiring.path("logs/make_demo.log"),
        benchmark:
            wiring.path("benchmarks/make_demo.tsv")
        params:
            options=wiring.options("make_demo"),
        script:
            "../scripts/make_demo.py"
