"""What was packed for someone else, and what came of a bundle from someone else."""

from __future__ import annotations

import shlex
from typing import TYPE_CHECKING

from beforehand.screen.digits import count
from beforehand.screen.layout import INDENT, Section, labelled, page, shown, wrapped
from beforehand.screen.replay import replay_text

if TYPE_CHECKING:
    from beforehand.handing import Handover, Received

_LABELS = {
    "hashed": "row labels are keyed hashes",
    "shown": "row labels are shown",
    "none": "its rows have no labels",
}


def handover_text(done: Handover, *, width: int = 100, colour: bool = False) -> str:
    """A handover as text: what went along, what did not, and how to check it.

    Parameters
    ----------
    done : Handover
    width : int
        Cells of a line; 60 to 140 look right.
    colour : bool
        Whether headings are set off by terminal colours.
    """
    members = [(name, f"{member.size:,} bytes") for name, member in done.members.items()]
    if done.data is None:
        data = "No table went along; dictionary.yaml says which columns are needed."
    else:
        rows = count(done.rows or 0, "row")
        data = f"{shown(done.data.file)} went along: {rows}, the columns that the plan names; "
        data += f"{_LABELS[done.data.labels]}."
    sections = [
        Section(
            title=f"Packed: {shown(str(done.bundle))}, {count(len(done.members) + 1, 'file')}",
            lines=labelled(members, width),
            tone="good",
        ),
        Section(title="Data", lines=wrapped(data, width)),
    ]
    if done.cautions:
        lines = [line for said in done.cautions for line in wrapped(said, width, rest=INDENT * 2)]
        sections.append(Section(title="Before it is sent", lines=tuple(lines), tone="careful"))
    follow = [*wrapped("Tell the recipient by another way:", width), f"{INDENT}SHA-256 {done.sha256}"]
    follow.append(f"{INDENT}beforehand receive {shlex.quote(shown(done.bundle.name))} -d FOLDER")
    sections.append(Section(title="For the recipient", lines=tuple(follow)))
    return page(sections, colour=colour)


def received_text(done: Received, *, width: int = 100, colour: bool = False) -> str:
    """A received bundle as text: what was checked, and whether the record came out again.

    Parameters
    ----------
    done : Received
    width : int
        Cells of a line; 60 to 140 look right.
    colour : bool
        Whether headings are set off by terminal colours.
    """
    told = [
        f"Packed by {shown(done.program)}. Each of {count(len(done.members), 'file')} has the size and the "
        "checksum of the manifest.",
        f"{shown(done.plan)} can be read and has no fault.",
    ]
    if done.chains:
        told.append(f"Every link holds: {', '.join(map(shown, done.chains))}.")
    else:
        told.append("The plan is not sealed, so the bundle cannot show that it came first.")
    if done.safe is not None:
        told.append(f"{shown(done.safe)} is a copy of the record without what could give a row away.")
    lines = [line for said in told for line in wrapped(said, width, rest=INDENT * 2)]
    text = page(
        [Section(title=f"Received: {shown(str(done.folder))}", lines=tuple(lines), tone="good")],
        colour=colour,
    )
    if done.replay is None:
        reason = wrapped(f"{(done.not_replayed or '').capitalize()}.", width)
        return f"{text}\n{page([Section(title='Not computed again', lines=reason)], colour=colour)}"
    text += "\n" + replay_text(done.replay, done.lock or "", width=width, colour=colour)
    if done.own_lock is not None:
        own = f"{done.own_lock} is the record of the table given, with the names of its columns."
        text += "".join(f"{line}\n" for line in wrapped(own, width))
    if done.aside:
        text += "".join(f"{line}\n" for line in wrapped(f"Not compared: {'; '.join(done.aside)}.", width))
    return text
