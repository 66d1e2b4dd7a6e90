"""Seeds from names: neither order, nor the number of workers, nor a resume changes a number."""

import hashlib

import numpy as np

__all__ = ["named_seeds"]


def named_seeds(seed: int, *names: str) -> np.random.SeedSequence:
    """Return the seed sequence of a run seed and the names of what it is for."""
    digest = hashlib.sha256("\x1f".join(names).encode()).digest()
    return np.random.SeedSequence([seed, *np.frombuffer(digest, dtype=np.uint32).tolist()])
