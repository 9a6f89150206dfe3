"""
The report: a statement as one self-contained page.

The page carries the statement's own JSON and the components of :mod:`backveer.io.browser` that draw
it, so that it shows the very numbers of ``--json``. The printed statement stands in it as well, for
a reader without scripts. A content security policy allows nothing but what the page carries; every
text from a file is data in the JSON or escaped.
"""

from __future__ import annotations

import base64
import hashlib
import html
import json
from collections.abc import Mapping, Sequence
from typing import Any

from backveer.io.atomic import replacing
from backveer.io.browser import asset
from backveer.io.readers.reading import Reading
from backveer.io.words.cautions import GENERAL
from backveer.io.words.page import name_of, time_of
from backveer.io.words.record import failure_record, profile_records, version
from backveer.io.words.text import statement_text
from backveer.profiles.flags import FLAGS
from backveer.profiles.statement import Statement

PRINTED = 20  # statements printed for a reader without scripts; the JSON holds them all


def write_report(
    path: str,
    reading: Reading,
    said: Statement,
    *,
    units: str = "si",
    options: str = "",
    more: Mapping[str, Any] | None = None,
    keys: Mapping[str, Sequence[Any]] | None = None,
    cautions: Sequence[str] = (),
) -> None:
    """
    Write the page, beside its place and renamed.

    Parameters
    ----------
    path
        Where to.
    reading, said
        What was read, and the statement of ``reading.stack``.
    units
        Units it opens with; the reader can switch.
    options
        The options of the run, as they would be written again.
    more
        Further sections: key to ``{"title", "tables": [{"caption", "head", "rows"}], "notes"}`` of
        plain words and numbers already formatted.
    keys
        Further keys of each profile's JSON, as :func:`backveer.io.words.record.write_json` takes.
    cautions
        Cautions besides the general one.

    Raises
    ------
    backveer.io.atomic.WriteError
        If the place cannot be written.
    """
    text = page(
        reading, said, units=units, options=options, more=more, keys=keys, cautions=cautions
    )
    with replacing(path) as temporary:
        temporary.write_text(text, encoding="utf-8")


def page(
    reading: Reading,
    said: Statement,
    *,
    units: str = "si",
    options: str = "",
    more: Mapping[str, Any] | None = None,
    keys: Mapping[str, Sequence[Any]] | None = None,
    cautions: Sequence[str] = (),
) -> str:
    """Build the page that :func:`write_report` writes."""
    profiles = list(profile_records(reading, said))
    for name, values in (keys or {}).items():
        for record, value in zip(profiles, values, strict=True):
            record[name] = value
    data = {
        "backveer": version(),
        "units": units,
        "options": options,
        "flags": {str(flag.bit): flag.name for flag in FLAGS},
        "cautions": [GENERAL, *cautions],
        "inputs": [
            {"source": file.source, "sha256": file.digest or None} for file in reading.files
        ],
        "failures": [failure_record(failure) for failure in reading.failures],
        "more": more or {},
        "profiles": profiles,
    }
    scripts = [asset("d3.min.js"), asset("statement.js"), asset("report.js")]
    hashes = " ".join(f"'sha256-{_digest(script)}'" for script in scripts)
    style = asset("statement.css")
    policy = f"default-src 'none'; style-src 'sha256-{_digest(style)}'; script-src {hashes}"
    printed = "\n\n\n".join(
        statement_text(said, index, reading=reading, units=units)
        for index in range(min(said.stack.profile_count, PRINTED))
    )
    body = "\n".join(f"<script>{script}</script>" for script in scripts)
    return f"""<!doctype html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta http-equiv="Content-Security-Policy" content="{policy}">
<meta name="viewport" content="width=device-width, initial-scale=1">
<meta name="referrer" content="no-referrer">
<title>{html.escape(_title(said))}</title>
<style>{style}</style>
</head>
<body>
<a class="skip" href="#main">To the statement</a>
<div class="page" id="report"><main><h1>{html.escape(_title(said))}</h1>
<pre>{html.escape(printed)}</pre></main></div>
<script type="application/json" id="data">{_embedded(data)}</script>
{body}
</body>
</html>
"""


def _title(said: Statement) -> str:
    stack = said.stack
    if stack.profile_count == 0:
        return "No profile"
    import numpy as np

    time = "" if np.isnat(stack.time[0]) else f", {time_of(stack.time[0])}"
    more = "" if stack.profile_count == 1 else f" and {stack.profile_count - 1} more"
    return f"{name_of(stack, 0)}{time}{more}"


def _embedded(data: Any) -> str:
    """Write JSON so that nothing in it can end the script element that holds it."""
    text = json.dumps(data, ensure_ascii=False, allow_nan=False, separators=(",", ":"))
    for character in "<>&\u2028\u2029":
        text = text.replace(character, f"\\u{ord(character):04x}")
    return text


def _digest(text: str) -> str:
    return base64.b64encode(hashlib.sha256(text.encode("utf-8")).digest()).decode("ascii")
