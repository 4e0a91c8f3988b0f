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
    params:
        python=this_python,
    threads: 1
    shell:
        "{params.python:q} -P -m fitlib _publish {input.plan:q} {output.marker:q} 2> {log:q}"
