"""Locks: one holder, who is named, and who never leaves a lock behind."""

import getpass
import os
import signal
import socket
import subprocess
import sys

import pytest

from fitlib.engine.locks import LockedError, take_lock

HOLD = """
import sys, time
from pathlib import Path
from fitlib.engine.locks import take_lock
lock = take_lock(Path(sys.argv[1]), "another run")
print("held", flush=True)
time.sleep(60)
"""


@pytest.fixture
def path(tmp_path):
    return tmp_path / "work" / "run.lock"


def test_a_second_holder_is_told_who_has_it_and_since_when(path):
    with take_lock(path, "another run of this study"), pytest.raises(LockedError) as refused:
        take_lock(path, "another run of this study")
    message = str(refused.value)
    assert message.startswith(f"another run of this study is active ({getpass.getuser()} on {socket.gethostname()}, ")
    assert f"process {os.getpid()}, since 20" in message
    assert message.endswith("UTC): wait for it, or stop it")
    assert refused.value.exit_status == 1


def test_a_released_lock_is_free(path):
    take_lock(path, "another run").release()
    take_lock(path, "another run").release()


def test_a_holder_without_a_name_is_told_too(path):
    with take_lock(path, "another run"):
        path.write_text("")
        with pytest.raises(LockedError, match="it has not written its name yet"):
            take_lock(path, "another run")


def test_a_killed_holder_leaves_no_lock(path):
    holder = subprocess.Popen([sys.executable, "-c", HOLD, str(path)], stdout=subprocess.PIPE, text=True)
    try:
        assert holder.stdout.readline() == "held\n"
        with pytest.raises(LockedError, match=f"process {holder.pid}"):
            take_lock(path, "another run")
        holder.send_signal(signal.SIGKILL)
        holder.wait()
    finally:
        holder.kill()
        holder.stdout.close()
    take_lock(path, "another run").release()


def test_waiting_for_a_lock_ends_when_it_is_free(path):
    holder = subprocess.Popen([sys.executable, "-c", HOLD, str(path)], stdout=subprocess.PIPE, text=True)
    try:
        assert holder.stdout.readline() == "held\n"
        waiting = subprocess.Popen([sys.executable, "-c", HOLD.replace('run")', 'run", wait=True)'), str(path)],
                                   stdout=subprocess.PIPE, text=True)  # fmt: skip
        holder.kill()
        assert waiting.stdout.readline() == "held\n"
    finally:
        for process in (holder, waiting):
            process.kill()
            process.wait()
            process.stdout.close()
