import sys

from fitlib.engine import prepare_workflow

# A fault in the study ends here, with the same plain message as `fitlib check`.
RUN = prepare_workflow(config, workflow.configfiles)


def this_python(wildcards):
    """The interpreter of this process; a function, since braces in a path are no wildcards."""
    return sys.executable
