"""The same numbers in canonical clothes: names, units, dims, kinds of temperature and salinity, pressure, mask, density."""

from gridcarb.harmonise.decisions import Decision, Understanding
from gridcarb.harmonise.extent import weigh
from gridcarb.harmonise.measures import weights
from gridcarb.harmonise.stage import clothe, understand

__all__ = ["Decision", "Understanding", "clothe", "understand", "weigh", "weights"]
