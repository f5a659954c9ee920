"""The physics of cant: pure functions of arrays, knowing nothing of files, limits or plans.

The array contract, once for all of them: numbers, lists or arrays are accepted and broadcast against each
other; computed in float64; a scalar in gives a scalar out; nan passes through; an infinite radius is straight
track. Units are the canonical ones and part of each argument's name: mm, m, km/h, m/s2, mm/m, mm/s. Nothing
warns: what has no answer is nan, what has no end is infinite.
"""
