rule publish_daily:
    input:
        PLAN.receipts("maps"),
        PLAN.receipts("dynamic_topography"),
        PLAN.receipts("currents"),
        rules.prepare_fixed_fields.output,
    output:
        f"{WORK}/published/daily.json",
    log:
        f"{WORK}/logs/publish_daily.log",
    benchmark:
        f"{WORK}/benchmarks/publish_daily.tsv"
    params:
        settings=settings_digest(CONFIGURATION, "daily"),
    message:
        "publishing maps and currents"
    shell:
        "{JOB} publish_daily {CONFIG:q} --log {log:q}"


rule publish_eddies:
    input:
        PLAN.receipts("eddies"),
        rules.link_trajectories.output,
    output:
        f"{WORK}/published/eddies.json",
    log:
        f"{WORK}/logs/publish_eddies.log",
    benchmark:
        f"{WORK}/benchmarks/publish_eddies.tsv"
    params:
        settings=settings_digest(CONFIGURATION, "eddy_product"),
    message:
        "publishing eddies and trajectories"
    shell:
        "{JOB} publish_eddies {CONFIG:q} --log {log:q}"


rule draw_bulletin:
    input:
        rules.publish_daily.output,
        rules.publish_eddies.output,
    output:
        f"{WORK}/published/bulletin.json",
    log:
        f"{WORK}/logs/draw_bulletin.log",
    benchmark:
        f"{WORK}/benchmarks/draw_bulletin.tsv"
    params:
        settings=settings_digest(CONFIGURATION, "bulletin"),
    message:
        "drawing the newest day's bulletin"
    shell:
        "{JOB} draw_bulletin {CONFIG:q} --log {log:q}"
