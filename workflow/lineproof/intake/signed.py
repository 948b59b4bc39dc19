"""What an intake was made from: the size and the SHA-256 of each raw file, and a digest of its options.

It is kept beside the record of the intake: other bytes that hold the same rows then leave that as it is, and nothing
that rests on it is made again.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from lineproof import store
from lineproof.intake.record import FileRecord


def signed(
    files: Sequence[FileRecord],
    paths: Mapping[str, list[str]],
    digests: Sequence[str],
    options: Mapping[str, Any],
) -> dict[str, Any]:
    """`made_with`, and of each of the `files` of a record, in its order, place, label, size and sum.

    `paths` are the raw files by what they are ("returns"), in the order of `files`; `digests` are files that hold
    the sums of a place each, such as "data.returns.json". A member of an archive has neither size nor sum, as it is no
    file; nor has a file a sum that a rule of ours made.
    """
    sums = {Path(file).stem: store.read_json(file) for file in digests}
    found: list[dict[str, Any]] = []
    for name, held in paths.items():
        place = f"data.{name}"
        group = [file for file in files if file["place"] == place]
        for at, file in enumerate(group):
            signs: dict[str, Any] = {"place": place, "label": file["label"]}
            if len(group) == len(held):
                signs["n_bytes"] = Path(held[at]).stat().st_size
                signs |= {"sha256": sums[place][at]} if place in sums else {}
            found.append(signs)
    return {"made_with": made_with(options), "files": found}


def made_with(options: Mapping[str, Any]) -> str:
    """SHA-256 of the options of an intake, in hexadecimal: so that an old record is known from a new one."""
    text = json.dumps(options, sort_keys=True, ensure_ascii=False)
    return hashlib.sha256(text.encode("utf-8")).hexdigest()
