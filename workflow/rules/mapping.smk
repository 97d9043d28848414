rule prepare_fixed_fields:
    input:
        f"{MANIFESTS}/fixed.json",
    output:
        f"{WORK}/fixed/fields.json",
    log:
        f"{WORK}/logs/prepare_fixed_fields.log",
    benchmark:
        f"{WORK}/benchmarks/prepare_fixed_fields.tsv"
    params:
        settings=settings_digest(CONFIGURATION, "fixed"),
    message:
        "putting the mean dynamic topography and land on the grid"
    shell:
        "{JOB} prepare_fixed_fields {CONFIG:q} --log {log:q}"


rule map_sea_level:
    input:
        observations=lambda wildcards: PLAN.observation_receipts(wildcards.block),
        fixed=rules.prepare_fixed_fields.output,
    output:
        f"{WORK}/maps/{{block}}.json",
    log:
        f"{WORK}/logs/map_sea_level/{{block}}.log",
    benchmark:
        f"{WORK}/benchmarks/map_sea_level/{{block}}.tsv"
    params:
        settings=settings_digest(CONFIGURATION, "maps"),
        days=lambda wildcards: PLAN.span(wildcards.block),
    message:
        "mapping sea level, block {wildcards.block}"
    shell:
        "{JOB} map_sea_level {CONFIG:q} --block {wildcards.block} --log {log:q}"


rule add_mean_topography:
    input:
        maps=rules.map_sea_level.output,
        fixed=rules.prepare_fixed_fields.output,
    output:
        f"{WORK}/dynamic_topography/{{block}}.json",
    log:
        f"{WORK}/logs/add_mean_topography/{{block}}.log",
    benchmark:
        f"{WORK}/benchmarks/add_mean_topography/{{block}}.tsv"
    params:
        settings=settings_digest(CONFIGURATION, "dynamic_topography"),
    message:
        "adding the mean dynamic topography, block {wildcards.block}"
    shell:
        "{JOB} add_mean_topography {CONFIG:q} --block {wildcards.block} --log {log:q}"
