"""Handing a plan and its record to someone else: packed so that they can be checked, opened with care."""

from beforehand.handing.bundle import Handover, hand_over
from beforehand.handing.limits import HIGHEST_RATIO, LARGEST_MEMBER, LARGEST_TOTAL, MOST_MEMBERS
from beforehand.handing.manifest import MANIFEST, Manifest, Member, Rows
from beforehand.handing.receiving import Received, receive_bundle
from beforehand.handing.safe import FEWEST, safe_text, share_safe

__all__ = [
    "FEWEST",
    "HIGHEST_RATIO",
    "LARGEST_MEMBER",
    "LARGEST_TOTAL",
    "MANIFEST",
    "MOST_MEMBERS",
    "Handover",
    "Manifest",
    "Member",
    "Received",
    "Rows",
    "hand_over",
    "receive_bundle",
    "safe_text",
    "share_safe",
]
