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
    wildcard_constraints:
        estimate=wiring.estimated,
    params:
        options=lambda wildcards: wiring.options(f"estimate_betas-{wildcards.estimate}"),
    script:
        "../scripts/estimate_betas.py"


rule shrink_betas:
    input:
        unpack(beta_inputs),
        options=wiring.options_file("shrink_betas-{estimate}"),
        pins=wiring.pins,
        code=wiring.code("shrink_betas"),
    output:
        betas=wiring.path("betas/{estimate}.parquet"),
    log:
        wiring.path("logs/shrink_betas-{estimate}.log"),
    benchmark:
        wiring.path("benchmarks/shrink_betas-{estimate}.tsv")
    wildcard_constraints:
        estimate=wiring.shrunk,
    params:
        options=lambda wildcards: wiring.options(f"shrink_betas-{wildcards.estimate}"),
    script:
        "../scripts/shrink_betas.py"
