# Writes what a reader sees; every number in it is looked up in the gathered estimates.


rule write_tables:
    input:
        estimates=after_cutting("estimates.parquet"),
        index=after_cutting("subperiods/index.json"),
        intake=after_cutting("data/intake.json"),
        options=wiring.options_file("write_paper"),
        pins=wiring.pins,
        code=wiring.code("write_tables"),
    output:
        tables=[wiring.path(name) for name in wiring.tables],
    log:
        wiring.path("logs/write_tables.log"),
    benchmark:
        wiring.path("benchmarks/write_tables.tsv")
    params:
        options=wiring.options("write_paper"),
    script:
        "../scripts/write_tables.py"


rule draw_figures:
    input:
        estimates=after_cutting("estimates.parquet"),
        index=after_cutting("subperiods/index.json"),
        intake=after_cutting("data/intake.json"),
        options=wiring.options_file("write_paper"),
        pins=wiring.pins,
        code=wiring.code("draw_figures"),
    output:
        figures=[wiring.path(name) for name in wiring.figures],
    log:
        wiring.path("logs/draw_figures.log"),
    benchmark:
        wiring.path("benchmarks/draw_figures.tsv")
    params:
        options=wiring.options("write_paper"),
    script:
        "../scripts/draw_figures.py"


rule write_report:
    input:
        estimates=after_cutting("estimates.parquet"),
        index=after_cutting("subperiods/index.json"),
        intake=after_cutting("data/intake.json"),
        figures=after_cutting(wiring.figures),
        options=wiring.options_file("write_paper"),
        pins=wiring.pins,
        code=wiring.code("write_report"),
    output:
        report=wiring.path("report.html"),
    log:
        wiring.path("logs/write_report.log"),
    benchmark:
        wiring.path("benchmarks/write_report.tsv")
    params:
        options=wiring.options("write_paper"),
    script:
        "../scripts/write_report.py"
