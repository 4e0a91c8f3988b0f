rule fit_batch:
    input:
        plan=ancient(RUN.plan_file),
    output:
        batch="batches/{batch}-{digest}.json",
    wildcard_constraints:
        batch=r"\d+",
        digest="[0-9a-f]{16}",
    log:
        "logs/batches/{batch}-{digest}.log",
    conda:
        "../envs/fitlib.yaml"
    params:
        python=this_python,
    threads: 1
    shell:
        "{params.python:q} -P -m fitlib _batch {input.plan:q} {wildcards.batch:q} {output.batch:q} 2> {log:q}"
