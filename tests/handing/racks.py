"""An invented plan with its table and its lock, and how tests look into bundles and make them."""

from __future__ import annotations

import io
import json
import random
import zipfile
from collections.abc import Mapping
from pathlib import Path

import beforehand
from beforehand.handing import MANIFEST
from beforehand.handing.bundle import member_of

PLAN = """\
language: 1
title: Drying of clay in a rack (invented)
question: Which conditions of a rack go with the water that is left after a night?
data: {file: racks.csv, row_label: rack}
outcome: {column: water, unit: g}
predictors:
  - {column: warmth, unit: °C, range: [0, 60]}
  - {column: draught, unit: m/s}
  - {column: tray, kind: category, levels: [reed, wire]}
alternatives:
  robust: {errors: hc3}
"""

# Stands once in the table, and is neither the smallest nor the largest, nor the middle.
UNIQUE = "263.47"

Files = dict[str, bytes]


def table_text(seed: int = 20261201) -> str:
    """Sixty racks, drawn with a seed, one of them far from the others; a column that no plan reads."""
    draw = random.Random(seed)
    lines = ["rack,warmth,draught,tray,secret,water"]
    for place in range(60):
        warmth, draught = draw.uniform(8, 24), draw.uniform(0, 3)
        tray = draw.choice(["reed", "wire"])
        water = 400 - 9.5 * warmth - 21 * draught - 14 * (tray == "wire") + draw.gauss(0, 18)
        shown = UNIQUE if place == 17 else f"{water:.2f}"
        if place == 41:
            warmth, shown = 58.125, "391.75"
        lines.append(f"k{place:03d},{warmth:.3f},{draught:.3f},{tray},hidden{place},{shown}")
    return "\n".join(lines) + "\n"


def made_in(folder: Path, plan: str = PLAN, table: str | None = None) -> Path:
    """A plan, its table and its lock in a folder."""
    folder.mkdir(parents=True, exist_ok=True)
    path = folder / "racks.plan.yaml"
    path.write_text(plan, encoding="utf-8")
    (folder / "racks.csv").write_text(table_text() if table is None else table, encoding="utf-8")
    beforehand.write_lock(beforehand.run(path, register=False).lock, folder / "racks.lock.yaml")
    return path


def files_in(bundle: Path) -> Files:
    """Members of a bundle, read by the standard library alone."""
    with zipfile.ZipFile(bundle) as opened:
        return {name: opened.read(name) for name in opened.namelist()}


def zipped(files: Mapping[str, bytes], *, kind: int = zipfile.ZIP_DEFLATED) -> bytes:
    """Files as a zip, made by the standard library alone."""
    written = io.BytesIO()
    with zipfile.ZipFile(written, "w", kind) as made:
        for name, content in files.items():
            made.writestr(zipfile.ZipInfo(name), content, kind)
    return written.getvalue()


def listed(files: Mapping[str, bytes]) -> Files:
    """The same files with a manifest that lists them all as they are."""
    manifest = json.loads(files[MANIFEST])
    rest = {name: content for name, content in files.items() if name != MANIFEST}
    manifest["members"] = {name: member_of(content).model_dump() for name, content in rest.items()}
    return rest | {MANIFEST: json.dumps(manifest).encode()}


def everything_below(folder: Path) -> list[str]:
    """Every file and folder below one, by name."""
    return sorted(str(path.relative_to(folder)) for path in folder.rglob("*"))
