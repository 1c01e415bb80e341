"""phaseid: from a backscattered-electron image to a ranked, defensible list of candidate phases."""

__version__ = "0.1.0"
