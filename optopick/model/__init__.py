"""The mixed-integer model of one coupler: candidates, rows, ranges, cuts, solver, search.

candidates  every stock value's contribution to every check, at every corner, computed beforehand from the physics
rows        checks as linear rows a[i] + b[j] + c[m] >= 0 over LED branch i, load resistor j, base resistor m
ranges      throws out values that no partner can save, before the solver sees them
staircase   cuts for limits on sums of logarithms, monotone in the light and in what the base resistor takes
solver      the one module that knows Pyomo and HiGHS
search      least edge time, delay, distortion or power, with its proof
"""
