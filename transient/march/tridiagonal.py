"""The fluid's tridiagonal system in the lanes of a batch: arrays ``[node, lane]``, inner loops over lanes.

The matrix is ``storage - scaled A`` with ``scaled`` the step times its implicit share; ``pivot`` and ``lower`` are its
factors.
"""

from __future__ import annotations

from transient.compiled import part


@part
def solve_rates(storage, conductance, volume, end_conductance, scaled, pivot, lower, base, inputs, out):
    """Rates at a stage: (storage - scaled A) f = A base + inputs, into ``out``."""
    n, lanes = storage.shape
    for l in range(lanes):
        here = base[0, l]
        flux = end_conductance[0, l] * (inputs[0, l] - here)
        if n > 1:
            flux += conductance[0, l] * (base[1, l] - here)
        else:
            flux += end_conductance[1, l] * (inputs[1, l] - here)
        out[0, l] = flux + volume[0, l] * inputs[2, l]
    for i in range(1, n - 1):
        for l in range(lanes):
            here = base[i, l]
            source = (
                conductance[i, l] * (base[i + 1, l] - here)
                - conductance[i - 1, l] * (here - base[i - 1, l])
                + volume[i, l] * inputs[2, l]
            )
            out[i, l] = source + lower[i, l] * out[i - 1, l]
    if n > 1:
        i = n - 1
        for l in range(lanes):
            here = base[i, l]
            source = (
                end_conductance[1, l] * (inputs[1, l] - here)
                - conductance[i - 1, l] * (here - base[i - 1, l])
                + volume[i, l] * inputs[2, l]
            )
            out[i, l] = source + lower[i, l] * out[i - 1, l]
    for l in range(lanes):
        out[n - 1, l] *= pivot[n - 1, l]
    for i in range(n - 2, -1, -1):
        for l in range(lanes):
            out[i, l] = (out[i, l] + scaled[l] * conductance[i, l] * out[i + 1, l]) * pivot[i, l]


@part
def substitute(conductance, scaled, pivot, lower, out):
    """Forward and back substitution of ``out`` with the step's factors."""
    n, lanes = out.shape
    for i in range(1, n):
        for l in range(lanes):
            out[i, l] += lower[i, l] * out[i - 1, l]
    for l in range(lanes):
        out[n - 1, l] *= pivot[n - 1, l]
    for i in range(n - 2, -1, -1):
        for l in range(lanes):
            out[i, l] = (out[i, l] + scaled[l] * conductance[i, l] * out[i + 1, l]) * pivot[i, l]


@part
def unit_responses(conductance, volume, end_conductance, mean_weight, scaled, pivot, lower, units, response):
    """Rates that a unit of either wall's speed or of the pressure drop makes, with the step's factors."""
    n, lanes = volume.shape
    for i in range(n):
        for l in range(lanes):
            units[0, i, l] = end_conductance[0, l] if i == 0 else 0.0
            units[1, i, l] = end_conductance[1, l] if i == n - 1 else 0.0
            units[2, i, l] = volume[i, l]
    for k in range(3):
        for i in range(1, n):
            for l in range(lanes):
                units[k, i, l] += lower[i, l] * units[k, i - 1, l]
        for l in range(lanes):
            units[k, n - 1, l] *= pivot[n - 1, l]
        for i in range(n - 2, -1, -1):
            for l in range(lanes):
                units[k, i, l] = (units[k, i, l] + scaled[l] * conductance[i, l] * units[k, i + 1, l]) * pivot[i, l]
        for l in range(lanes):
            response[0, k, l] = units[k, 0, l]
            response[1, k, l] = units[k, n - 1, l]
            total = 0.0
            for i in range(n):
                total += mean_weight[i, l] * units[k, i, l]
            response[2, k, l] = total
