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
        portfolio_returns=wiring.path("portfolios/{sort}/returns.parquet"),
        formations=wiring.path("portfolios/{sort}/formations.parquet"),
        transitions=wiring.path("portfolios/{sort}/transitions.parquet"),
        assigned=wiring.path("portfolios/{sort}/assigned.parquet"),
    log:
        wiring.path("logs/form_portfolios-{sort}.log"),
    benchmark:
        wiring.path("benchmarks/form_portfolios-{sort}.tsv")
    params:
        sources=sort_sources,
        options=lambda wildcards: wiring.options(f"form_portfolios-{wildcards.sort}"),
    script:
        "../scripts/form_portfolios.py"
