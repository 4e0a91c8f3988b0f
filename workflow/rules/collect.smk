rule publish:
    input:
        plan=ancient(RUN.plan_file),
        batches=ancient(RUN.batch_outputs),
    output:
        marker=RUN.marker,
    log:
        RUN.publish_log,
    conda:
        "../envs/fitlib.yaml"
    threads: 1
    params:
        python=this_python,
    shell:
        "{params.python:q} -P -m fitlib _publish {input.plan:q} {output.marker:q} > {log:q} 2>&1"
