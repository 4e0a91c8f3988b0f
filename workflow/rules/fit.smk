rule fit_batch:
    input:
        plan=ancient(RUN.plan_file),
    output:
        batch="batches/{batch}-{digest}.json",
    log:
        "logs/batches/{batch}-{digest}.log",
    wildcard_constraints:
        batch=r"\d+",
        digest="[0-9a-f]{16}",
    conda:
        "../envs/fitlib.yaml"
    threads: 1
    params:
        python=this_python,
    shell:
        "{params.python:q} -P -m fitlib _batch {input.plan:q} {wildcards.batch:q} {output.batch:q} > {log:q} 2>&1"
