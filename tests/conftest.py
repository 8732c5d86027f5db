"""Shared machines are slow now and then: no generated test may fail for that."""

from hypothesis import HealthCheck, settings

settings.register_profile("shared machine", deadline=None, suppress_health_check=[HealthCheck.too_slow])
settings.load_profile("shared machine")
