"""What became of the rows of a table, in words."""

from __future__ import annotations

from kingpost.core.graph import Account
from kingpost.core.text import count, listed, visible


def account_pairs(account: Account) -> list[tuple[str, str]]:
    """Every entry of an account as a short name and a phrase, safe to show."""
    pairs = [("read", f"{account.rows_read:,}"), ("kept", f"{account.rows_kept:,}")]
    for reason in account.skipped:
        pairs.append(("skipped", _skipped(account, reason)))
    pairs.append(("merged", f"{account.merged:,} into an earlier edge between the same nodes"))
    if account.loops_dropped:
        pairs.append(("dropped", f"{account.loops_dropped:,} self-loops"))
    if account.zero_weight:
        pairs.append(("left out", count(account.zero_weight, "edge") + " of weight zero"))
    if account.filtered:
        pairs.append(("filtered", _filtered(account)))
    if account.nodes_filtered:
        pairs.append(("nodes left out", _outside(account)))
    if account.nodes_rows:
        pairs.append(("node table", _joined(account)))
    return pairs


def losses(account: Account) -> list[str]:
    """Only what a user should hear unasked: rows that were skipped, node rows that met nobody."""
    found = [f"skipped {_skipped(account, reason)}" for reason in account.skipped]
    if account.filtered:
        found.append(f"filtered {_filtered(account)}")
    if account.nodes_filtered:
        found.append(f"left out {_outside(account)}")
    if account.zero_weight:
        found.append(f"left out {count(account.zero_weight, 'edge')} of weight zero")
    if account.nodes_unknown or account.nodes_repeated or account.nodes_missing:
        found.append(f"node table: {_joined(account)}")
    return found


def _filtered(account: Account) -> str:
    words = f"{count(account.filtered, 'row')} for which where is not true"
    if account.filtered_null:
        words += f", {account.filtered_null:,} of them because it is neither true nor false"
    return words


def _outside(account: Account) -> str:
    words = f"{count(account.nodes_filtered, 'node')} for which node-where is not true"
    if account.nodes_filtered_null:
        words += f" ({account.nodes_filtered_null:,} neither true nor false)"
    return f"{words}, and {count(account.outside, 'row')} that lead to or from one"


def _skipped(account: Account, reason: str) -> str:
    examples = [visible(text, 60) for text in account.examples.get(reason, ())]
    shown = f" (such as {listed(examples)})" if examples else ""
    return f"{count(account.skipped[reason], 'row')}: {visible(reason)}{shown}"


def _joined(account: Account) -> str:
    parts = [f"{account.nodes_joined:,} of {count(account.nodes_rows, 'row')} joined"]
    if account.nodes_unknown:
        parts.append(f"{account.nodes_unknown:,} of nodes that no edge names")
    if account.nodes_repeated:
        parts.append(f"{account.nodes_repeated:,} repeated (the first counts)")
    if account.nodes_missing:
        parts.append(f"{count(account.nodes_missing, 'node')} without a row")
    return "; ".join(parts)
