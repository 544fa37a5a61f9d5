"""Names that are different ids and yet look alike: told to the user, and left as they are."""

from __future__ import annotations

import pyarrow as pa
import pyarrow.compute as pc

from kingpost.core.text import count, visible


def alike(labels: pa.Array) -> str | None:
    """A sentence about names that differ only by white space at the ends or Unicode normal form.

    Normal form is NFC (Unicode Standard Annex 15).  None where there are none, or no text.
    """
    if not (pa.types.is_string(labels.type) or pa.types.is_large_string(labels.type)):
        return None
    # A name that is its own tidy form can only be met by one that is not.
    tidy = pc.utf8_normalize(pc.utf8_trim_whitespace(labels), form="NFC")
    untidy = pc.not_equal(tidy, labels)
    if not pc.any(untidy).as_py():
        return None
    names, forms = labels.filter(untidy), tidy.filter(untidy)
    met = pc.is_in(forms, value_set=labels)
    counts = pc.value_counts(forms)
    twice = counts.field("values").filter(pc.greater(counts.field("counts"), 1))
    again = pc.or_(met, pc.is_in(forms, value_set=twice))
    found = pc.sum(again).as_py() or 0
    if not found:
        return None
    at = pc.index(again, True).as_py()
    name, form = names[at].as_py(), forms[at].as_py()
    if not met[at].as_py():
        same = names.filter(pc.equal(forms, form)).to_pylist()
        form = next(other for other in same if other != name)
    return (
        f"{count(found, 'name differs', 'names differ')} from another only by white space at the "
        f"ends or Unicode normal form, for example {_quoted(name)} and {_quoted(form)}; they are "
        "different nodes"
    )


def _quoted(name: str) -> str:
    # Marks that combine with the letter before would hide just the difference.
    shown = visible(name, 40)
    return f'"{shown}"' if name.isascii() else f'"{shown}" ({ascii(name[:40])[1:-1]})'
