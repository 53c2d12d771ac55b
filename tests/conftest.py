"""Settings shared by all tests."""

import hypothesis

hypothesis.settings.register_profile(
    "kplate", derandomize=True, deadline=None, max_examples=50
)
hypothesis.settings.load_profile("kplate")
