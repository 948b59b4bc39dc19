# Estimates each security's beta at each month, one table an entry under `betas`.


rule estimate_betas:
    input:
        unpack(beta_inputs),
        options=wiring.options_file("estimate_betas-{estimate}"),
        pins=wiring.pins,
        code=wiring.code("estimate_betas"),
    output:
        betas=wiring.path("betas/{estimate}.parquet"),
    log:
        wiring.path("logs/estimate_betas-{estimate}.log"),
    benchmark:
        wiring.path("benchmarks/estimate_betas-{estimate}.tsv")
    params:
        options=lambda wildcards: wiring.options(f"estimate_betas-{wildcards.estimate}"),
    script:
        "../scripts/estimate_betas.py"
