"""Contacts and vias on their pads: how much of the area lands, by integration over exact covariances."""

from flowplan.engine.landing.judge import LandingView, landing_entries
from flowplan.engine.landing.results import QUANTILES, LandingEntry, Resistances

__all__ = ["QUANTILES", "LandingEntry", "LandingView", "Resistances", "landing_entries"]
