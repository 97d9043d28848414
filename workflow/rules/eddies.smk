rule detect_eddies:
    input:
        maps=rules.map_sea_level.output,
        topography=rules.add_mean_topography.output,
        currents=rules.compute_currents.output,
    output:
        f"{WORK}/eddies/{{block}}.json",
    log:
        f"{WORK}/logs/detect_eddies/{{block}}.log",
    benchmark:
        f"{WORK}/benchmarks/detect_eddies/{{block}}.tsv"
    params:
        settings=settings_digest(CONFIGURATION, "eddies"),
    message:
        "detecting eddies, block {wildcards.block}"
    shell:
        "{JOB} detect_eddies {CONFIG:q} --block {wildcards.block} --log {log:q}"


rule link_trajectories:
    input:
        PLAN.receipts("eddies"),
    output:
        f"{WORK}/trajectories/links.json",
    log:
        f"{WORK}/logs/link_trajectories.log",
    benchmark:
        f"{WORK}/benchmarks/link_trajectories.tsv"
    params:
        settings=settings_digest(CONFIGURATION, "trajectories"),
    message:
        "linking eddies into trajectories"
    shell:
        "{JOB} link_trajectories {CONFIG:q} --log {log:q}"
