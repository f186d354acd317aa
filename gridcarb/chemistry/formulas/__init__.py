"""Published equations, one topic a file, one equation a function; no equation is written anywhere else.

Arguments name columns of a tile: tk (K), ln_tk, t (degC), s (practical salinity), sqrt_s, ionic (mol/kg), sqrt_ionic,
water_fraction (1 - 0.001005 s) and its logarithm.
"""
