"""Progress: what is read from Snakemake's log, and what a person sees of it."""

import io

import pytest

from fitlib.engine.progress import Progress, seconds_in_words

LOG = """\
Job stats:
job          count
---------  -------
all              1
fit_batch        2
publish          1
total            4

[Tue Dec  1 06:44:30 2026]
rule fit_batch:
    input: plans/304ca84ed8b39a61.json
    output: batches/07-20cb44e2ee5fa852.json
    log: logs/batches/07-20cb44e2ee5fa852.log
    jobid: 2
    reason: Missing output files: batches/07-20cb44e2ee5fa852.json
    wildcards: batch=07, digest=20cb44e2ee5fa852
    resources: tmpdir=/tmp
rule fit_batch:
    jobid: 5
    wildcards: batch=11, digest=a51cf2a84059a9ee
[Tue Dec  1 06:44:33 2026]
Finished jobid: 5 (Rule: fit_batch)
1 of 4 steps (25%) done
Finished jobid: 2 (Rule: fit_batch)
localrule publish:
    jobid: 1
Finished jobid: 1 (Rule: publish)
localrule all:
    jobid: 0
Finished jobid: 0 (Rule: all)
"""
SIZES = {"07": 3, "11": 1}


class Clock:
    """Ten seconds pass between two looks."""

    def __init__(self):
        self.now = -10.0

    def __call__(self):
        self.now += 10.0
        return self.now


class Terminal(io.StringIO):
    def isatty(self):
        return True


def shown(stream, sizes=SIZES):
    progress = Progress(sizes, stream, Clock())
    for line in LOG.splitlines(keepends=True):
        progress.line(line)
    progress.close()
    return stream.getvalue(), progress


def test_plain_lines_tell_stage_done_of_total_and_time_left():
    text, progress = shown(io.StringIO())
    assert text.splitlines() == [
        "  fitting and validating: 0 of 2 batches done (0 of 4 datasets)",
        "  fitting and validating: 1 of 2 batches done (1 of 4 datasets), about 30 s left",
        "  fitting and validating: 2 of 2 batches done (4 of 4 datasets)",
        "  publishing tables, functions, figures and report",
    ]
    assert progress.events.stage == "published"
    assert progress.events.finished == ["11", "07"]


def test_a_terminal_gets_one_line_that_is_written_again():
    text, _ = shown(Terminal())
    assert text.count("\n") == 1
    assert text.endswith("\r\x1b[K  published\n")


def test_only_batches_that_run_count():
    text, _ = shown(io.StringIO(), {**SIZES, "03": 6, "04": 2})
    assert "(0 of 4 datasets)" not in text.splitlines()[0]  # two of four batches: not known yet which
    assert "2 of 2 batches done (4 of 4 datasets)" in text


def test_many_batches_give_few_lines():
    stream = io.StringIO()
    progress = Progress({f"{number:03d}": 1 for number in range(200)}, stream, Clock())
    progress.line("fit_batch      200")
    for number in range(200):
        job = ("rule fit_batch:", f"    jobid: {number}", f"    wildcards: batch={number:03d}, digest=0123456789abcdef")
        for line in (*job, f"Finished jobid: {number} (Rule: fit_batch)"):
            progress.line(line)
    assert len(stream.getvalue().splitlines()) <= 12


def test_unknown_lines_say_nothing():
    stream = io.StringIO()
    progress = Progress(SIZES, stream)
    for line in ("", "Building DAG of jobs...", "Finished jobid: 9 (Rule: fit_batch)", "rule all:"):
        progress.line(line)
    assert stream.getvalue() == ""


@pytest.mark.parametrize(
    ("seconds", "words"), [(0.2, "1 s"), (42.4, "42 s"), (89, "89 s"), (300, "5 min"), (7800, "2 h 10 min")]
)
def test_durations_in_words(seconds, words):
    assert seconds_in_words(seconds) == words
