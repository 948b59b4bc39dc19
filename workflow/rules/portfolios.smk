# Forms the test assets, one folder an entry under `portfolios`.


rule form_portfolios:
    input:
        sources=sort_inputs,
        digests=sort_digests,
        market=after_validation("data/market.parquet"),
        options=wiring.options_file("form_portfolios-{sort}"),
        pins=wiring.pins,
        code=wiring.code("form_portfolios"),
    output:
        members=wiring.path("portfolios/{sort}/members.parquet"),
        returns=wiring.path("portfolios/{sort}/returns.parquet"),
    log:
        wiring.path("logs/form_portfolios-{sort}.log"),
    benchmark:
        wiring.path("benchmarks/form_portfolios-{sort}.tsv")
    params:
        options=lambda wildcards: wiring.options(f"form_portfolios-{wildcards.sort}"),
    script:
        "../scripts/form_portfolios.py"
