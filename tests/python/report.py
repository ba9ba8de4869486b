"""Comparisons in the form that the other suites print."""

import numpy as np


def check(name, source, published, computed, relative=0.0, absolute=0.0):
    """Prints one line for the worst entry, and fails where it is off by more than allowed."""
    published, computed = np.atleast_1d(published).astype(float), np.atleast_1d(computed).astype(float)
    assert published.shape == computed.shape, f"{name}: {computed.shape} numbers instead of {published.shape}"
    allowed = np.maximum(absolute, relative * np.abs(published))
    deviation = computed - published
    used = np.nan_to_num(np.abs(deviation) / np.maximum(allowed, np.finfo(float).tiny), nan=np.inf)
    worst = np.unravel_index(np.argmax(used), used.shape)
    passes = bool(abs(deviation[worst]) <= allowed[worst])
    which = f", worst of {published.size}" if published.size > 1 else ""
    print(
        f"case: {name}{which} | {source} | {published[worst]!s} | {computed[worst]!s} | {deviation[worst]:.1e} | "
        f"{allowed[worst]:.1e} | {'pass' if passes else 'FAIL'}"
    )
    assert passes, f"{name}: {computed[worst]} instead of {published[worst]}"
