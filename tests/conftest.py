"""Settings of the whole test run. In CI property tests take the same examples every time, so that a landing does not hang on luck."""

import os

from hypothesis import settings

settings.register_profile("ci", derandomize=True)
if os.environ.get("CI"):
    settings.load_profile("ci")
