"""What a program may choose before the first kernel is loaded; imports nothing."""

from __future__ import annotations

# With the first kernel of a process numba looks for BLAS by importing scipy.linalg, which takes
# as long as all the rest.  No kernel multiplies matrices; but code that others compile in the
# same process may, so only programs switch this off.
look_for_blas = True
