"""Runs the command line in this process or in one of its own."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from dataclasses import dataclass
from pathlib import Path

from lbwork.cli import main

ROOT = Path(__file__).resolve().parent.parent.parent


@dataclass(frozen=True)
class Outcome:
    """Exit status and what was printed."""

    status: int
    out: str
    err: str

    @property
    def document(self):
        """The JSON document on stdout."""
        return json.loads(self.out)


def lbwork(capsys, *words):
    """Run ``lbwork WORDS`` in this process."""
    capsys.readouterr()
    status = main([str(word) for word in words])
    captured = capsys.readouterr()
    return Outcome(status, captured.out, captured.err)


def start(*words, cwd):
    """Start ``lbwork WORDS`` as a process of its own."""
    code = "import sys; from lbwork.cli import main; sys.exit(main())"
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    return subprocess.Popen(
        [sys.executable, "-c", code, *map(str, words)],
        cwd=cwd,
        env=environment,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )
