rule compute_currents:
    input:
        maps=rules.map_sea_level.output,
        topography=rules.add_mean_topography.output,
    output:
        f"{WORK}/currents/{{block}}.json",
    log:
        f"{WORK}/logs/compute_currents/{{block}}.log",
    benchmark:
        f"{WORK}/benchmarks/compute_currents/{{block}}.tsv"
    params:
        settings=settings_digest(CONFIGURATION, "currents"),
    message:
        "computing currents, block {wildcards.block}"
    shell:
        "{JOB} compute_currents {CONFIG:q} --block {wildcards.block} --log {log:q}"
