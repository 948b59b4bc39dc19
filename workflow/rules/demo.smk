# Invents the raw files of the Kestrel Sound Exchange, for a study that asks for them.

if study.demo is not None:

    rule make_demo:
        input:
            options=wiring.options_file("make_demo"),
            pins=wiring.pins,
            code=wiring.code("make_demo"),
        output:
            raw=[f"{study.raw}/{name}" for name in demo_files.RAW],
            truth=[f"{study.raw}/{name}" for name in demo_files.TRUTH],
        log:
            wiring.path("logs/make_demo.log"),
        benchmark:
            wiring.path("benchmarks/make_demo.tsv")
        params:
            options=wiring.options("make_demo"),
        script:
            "../scripts/make_demo.py"
