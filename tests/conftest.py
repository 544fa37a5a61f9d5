"""Settings of the whole test suite."""

import os

from hypothesis import settings

# Where a change is judged the same examples are tried every time; at a desk new ones are.
settings.register_profile("judged", derandomize=True)
if os.environ.get("CI"):
    settings.load_profile("judged")
