rule gather_observations:
    input:
        manifest=f"{MANIFESTS}/{{block}}.json",
        fixed=f"{MANIFESTS}/fixed.json",
    output:
        f"{WORK}/observations/{{block}}.json",
    log:
        f"{WORK}/logs/gather_observations/{{block}}.log",
    benchmark:
        f"{WORK}/benchmarks/gather_observations/{{block}}.tsv"
    params:
        settings=settings_digest(CONFIGURATION, "observations"),
        days=lambda wildcards: PLAN.span(wildcards.block, WINDOW),
    message:
        "reading and editing observations, block {wildcards.block}"
    shell:
        "{JOB} gather_observations {CONFIG:q} --block {wildcards.block} --log {log:q}"
