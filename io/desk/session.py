"""What one browser has open: uploads in a private temporary place, gone when the desk closes."""

from __future__ import annotations

import secrets
import shutil
import tempfile
import threading
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

UPLOADS = 20  # files that one session may hold; the oldest goes
SESSIONS = 20  # browsers at once; the longest unused goes


@dataclass
class Upload:
    """
    One file that was dropped or pasted.

    Attributes
    ----------
    key
        What the page calls it; random, never a name from outside.
    name
        The file's own name, for people only.
    place
        Where its bytes are.
    said
        What the user said about it: hints and settings, as the page sent them.
    """

    key: str
    name: str
    place: Path
    said: dict[str, Any] = field(default_factory=dict)


@dataclass
class Session:
    """The uploads of one browser, in the order in which they came."""

    folder: Path
    uploads: dict[str, Upload] = field(default_factory=dict)
    lock: threading.Lock = field(default_factory=threading.Lock)

    def add(self, name: str, data: bytes) -> Upload:
        """Keep the bytes of a file under a random name."""
        key = secrets.token_hex(8)
        place = self.folder / key
        place.write_bytes(data)
        upload = Upload(key, name, place)
        with self.lock:
            self.uploads[key] = upload
            while len(self.uploads) > UPLOADS:
                oldest = next(iter(self.uploads))
                self.uploads.pop(oldest).place.unlink(missing_ok=True)
        return upload

    def remove(self, key: str) -> None:
        """Forget an upload."""
        with self.lock:
            upload = self.uploads.pop(key, None)
        if upload is not None:
            upload.place.unlink(missing_ok=True)


class Sessions:
    """All sessions of a desk, in one folder that only this user can enter."""

    def __init__(self) -> None:
        self.folder = Path(tempfile.mkdtemp(prefix="backveer-desk-"))
        self.open: dict[str, Session] = {}
        self.lock = threading.Lock()

    def new(self) -> str:
        """Open a session and return its secret name."""
        secret = secrets.token_urlsafe(32)
        folder = Path(tempfile.mkdtemp(dir=self.folder))
        with self.lock:
            self.open[secret] = Session(folder)
            while len(self.open) > SESSIONS:
                oldest = next(iter(self.open))
                shutil.rmtree(self.open.pop(oldest).folder, ignore_errors=True)
        return secret

    def get(self, secret: str | None) -> Session | None:
        """Return the session of a secret name, and count it as used."""
        with self.lock:
            session = self.open.pop(secret, None) if secret else None
            if session is not None and secret is not None:
                self.open[secret] = session
        return session

    def close(self) -> None:
        """Remove everything that was kept."""
        shutil.rmtree(self.folder, ignore_errors=True)
