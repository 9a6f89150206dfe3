"""What a run was: version, options and digests of the inputs, to stand in every output."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from backveer.io.readers.reading import FileReading, Reading
from backveer.profiles.labels import labels


@dataclass(frozen=True)
class Run:
    """
    A run of a command.

    Attributes
    ----------
    command
        Its name.
    version
        Of the package.
    options
        What was said, defaults included; values as JSON has them.
    inputs
        Each input with the SHA-256 of its bytes, or, where these cannot be read again (standard
        input, a member of an archive), of the values that were read from it.
    """

    command: str
    version: str
    options: Mapping[str, Any]
    inputs: tuple[Mapping[str, str], ...]

    def record(self) -> dict[str, Any]:
        """Return it as JSON has it."""
        return {
            "command": self.command,
            "backveer": self.version,
            "options": dict(self.options),
            "inputs": [dict(each) for each in self.inputs],
        }

    def line(self) -> str:
        """Return it as one line of JSON."""
        return json.dumps(self.record(), ensure_ascii=True)

    def short(self) -> str:
        """Return version and a digest of all inputs, for people."""
        whole = hashlib.sha256("".join(sorted(each["sha256"] for each in self.inputs)).encode())
        return f"backveer {self.version}, inputs {whole.hexdigest()[:12]}"


def run_of(command: str, reading: Reading, options: Mapping[str, Any]) -> Run:
    """
    Describe a run.

    Parameters
    ----------
    command
        Its name.
    reading
        What was read.
    options
        What was said.
    """
    from backveer.io.words.record import version

    return Run(command, version(), options, tuple(_input(file) for file in reading.files))


def _input(file: FileReading) -> dict[str, str]:
    path = Path(file.source)
    if file.source != "-" and path.is_file():
        with path.open("rb") as opened:
            digest = hashlib.file_digest(opened, "sha256")
        return {"source": file.source, "sha256": digest.hexdigest(), "of": "bytes"}
    values = hashlib.sha256()
    for name, label in labels(file.stack).items():
        if label.unit or name == "time":
            values.update(np.ascontiguousarray(getattr(file.stack, name)).tobytes())
    return {"source": file.source, "sha256": values.hexdigest(), "of": "values"}
