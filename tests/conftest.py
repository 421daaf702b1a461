"""One deterministic Hypothesis profile, so that a run says the same thing twice."""

from hypothesis import HealthCheck, settings

settings.register_profile(
    "repeatable",
    derandomize=True,
    deadline=None,  # two busy cores make single examples slow; no test measures time
    database=None,
    max_examples=60,
    suppress_health_check=[HealthCheck.too_slow],
)
settings.load_profile("repeatable")
