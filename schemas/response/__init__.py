"""What the machine does: steady response to harmonic excitation, and response over time."""

from schemas.response.harmonic import HarmonicAnswer, HarmonicQuestion
from schemas.response.transient import TransientAnswer, TransientQuestion

__all__ = ["HarmonicAnswer", "HarmonicQuestion", "TransientAnswer", "TransientQuestion"]
