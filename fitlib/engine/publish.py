"""The last job of the workflow: all results of the plan become tables, functions, figures, a report, one revision."""

from __future__ import annotations

import getpass
import platform
import socket
import subprocess
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from fitlib.engine.batch import read_batch_output
from fitlib.engine.compute import Account, dataset_figures, dataset_result
from fitlib.engine.files import WorkFolder, remove, write_json
from fitlib.engine.locks import take_lock
from fitlib.engine.planfile import Assignment, read_plan_file
from fitlib.engine.store import Store
from fitlib.engine.summary import SummaryRow
from fitlib.errors import FitlibError
from fitlib.plan import Plan
