"""What a run was: digests of bytes, or of values where the bytes cannot be read again."""

from __future__ import annotations

import hashlib
import json

from backveer.io.readers import read
from backveer.io.readers.door import read_bytes
from backveer.io.run import run_of

TEXT = (
    "time_utc,ws_40m (m/s),wd_40m (deg),ws_80m (m/s),wd_80m (deg)\n2031-05-14 00:00,7,250,8,255\n"
)


def test_the_digest_of_a_file_is_that_of_its_bytes(tmp_path) -> None:
    path = tmp_path / "a.csv"
    path.write_text(TEXT)
    run = run_of("rotor", read(str(path)), {"hub_height": 119.0})
    (told,) = run.inputs
    assert told["sha256"] == hashlib.sha256(TEXT.encode()).hexdigest()
    assert told["of"] == "bytes"
    assert json.loads(run.line())["options"] == {"hub_height": 119.0}
    assert run.short().startswith(f"backveer {run.version}, inputs ")


def test_without_bytes_it_is_that_of_the_values() -> None:
    one, same, other = (
        run_of("rotor", read_bytes("-", text.encode()), {}).inputs[0]
        for text in (TEXT, TEXT, TEXT.replace("255", "256"))
    )
    assert one["of"] == "values"
    assert one["sha256"] == same["sha256"] != other["sha256"]
