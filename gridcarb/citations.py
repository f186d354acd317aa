"""Who says so: every published source gridcarb rests on, under an author-year key."""

from __future__ import annotations

from dataclasses import dataclass

from gridcarb.shelf import Shelf


@dataclass(frozen=True)
class Citation:
    """One published source: key, full reference, DOI where it has one."""

    key: str
    text: str
    doi: str = ""


CITATIONS: Shelf[Citation] = Shelf("citation")


def _cite(key: str, text: str, doi: str = "") -> None:
    CITATIONS.put(key, Citation(key, text, doi))


_cite("weiss1974", "Weiss, R. F. (1974). Carbon dioxide in water and seawater: the solubility of a non-ideal gas. "
      "Marine Chemistry 2, 203-215.", "10.1016/0304-4203(74)90015-2")
_cite("lueker2000", "Lueker, T. J., Dickson, A. G. & Keeling, C. D. (2000). Ocean pCO2 calculated from dissolved "
      "inorganic carbon, alkalinity, and equations for K1 and K2. Marine Chemistry 70, 105-119.",
      "10.1016/S0304-4203(00)00022-0")
_cite("dickson1990b", "Dickson, A. G. (1990). Thermodynamics of the dissociation of boric acid in synthetic seawater "
      "from 273.15 to 318.15 K. Deep-Sea Research 37, 755-766.", "10.1016/0198-0149(90)90004-F")
_cite("dickson1990s", "Dickson, A. G. (1990). Standard potential of the reaction AgCl(s) + 1/2 H2(g) = Ag(s) + HCl(aq), "
      "and the standard acidity constant of the ion HSO4- in synthetic sea water from 273.15 to 318.15 K. "
      "Journal of Chemical Thermodynamics 22, 113-127.", "10.1016/0021-9614(90)90074-Z")
_cite("millero1995", "Millero, F. J. (1995). Thermodynamics of the carbon dioxide system in the oceans. "
      "Geochimica et Cosmochimica Acta 59, 661-677.", "10.1016/0016-7037(94)00354-O")
_cite("perez1987", "Perez, F. F. & Fraga, F. (1987). Association constant of fluoride and hydrogen ions in seawater. "
      "Marine Chemistry 21, 161-168.", "10.1016/0304-4203(87)90036-3")
_cite("mucci1983", "Mucci, A. (1983). The solubility of calcite and aragonite in seawater at various salinities, "
      "temperatures, and one atmosphere total pressure. American Journal of Science 283, 780-799.",
      "10.2475/ajs.283.7.780")
_cite("uppstrom1974", "Uppstrom, L. R. (1974). The boron/chlorinity ratio of deep-sea water from the Pacific Ocean. "
      "Deep-Sea Research 21, 161-162.", "10.1016/0011-7471(74)90074-6")
_cite("lee2010", "Lee, K. et al. (2010). The universal ratio of boron to chlorinity for the North Pacific and North "
      "Atlantic oceans. Geochimica et Cosmochimica Acta 74, 1801-1811.", "10.1016/j.gca.2009.12.027")
_cite("morris1966", "Morris, A. W. & Riley, J. P. (1966). The bromide/chlorinity and sulphate/chlorinity ratio in sea "
      "water. Deep-Sea Research 13, 699-705.", "10.1016/0011-7471(66)90601-2")
_cite("riley1965", "Riley, J. P. (1965). The occurrence of anomalously high fluoride concentrations in the North "
      "Atlantic. Deep-Sea Research 12, 219-220.", "10.1016/0011-7471(65)90027-6")
_cite("riley1967", "Riley, J. P. & Tongudai, M. (1967). The major cation/chlorinity ratios in sea water. "
      "Chemical Geology 2, 263-269.", "10.1016/0009-2541(67)90026-5")
_cite("guide2007", "Dickson, A. G., Sabine, C. L. & Christian, J. R. (eds) (2007). Guide to best practices for ocean "
      "CO2 measurements. PICES Special Publication 3, 191 pp.", "")
_cite("dickson1981", "Dickson, A. G. (1981). An exact definition of total alkalinity and a procedure for the estimation "
      "of alkalinity and total inorganic carbon from titration data. Deep-Sea Research 28, 609-623.",
      "10.1016/0198-0149(81)90121-7")
_cite("orr2015", "Orr, J. C., Epitalon, J.-M. & Gattuso, J.-P. (2015). Comparison of ten packages that compute ocean "
      "carbonate chemistry. Biogeosciences 12, 1483-1510.", "10.5194/bg-12-1483-2015")
_cite("egleston2010", "Egleston, E. S., Sabine, C. L. & Morel, F. M. M. (2010). Revelle revisited: buffer factors that "
      "quantify the response of ocean chemistry to changes in DIC and alkalinity. Global Biogeochemical Cycles 24, GB1002.",
      "10.1029/2008GB003407")
_cite("munhoven2013", "Munhoven, G. (2013). Mathematics of the total alkalinity-pH equation: pathway to robust and "
      "universal solution algorithms. Geoscientific Model Development 6, 1367-1388.", "10.5194/gmd-6-1367-2013")
_cite("teos10", "IOC, SCOR & IAPSO (2010). The international thermodynamic equation of seawater 2010: calculation and use "
      "of thermodynamic properties. Intergovernmental Oceanographic Commission, Manuals and Guides 56, 196 pp.", "")
_cite("orr2017", "Orr, J. C. et al. (2017). Biogeochemical protocols and diagnostics for the CMIP6 Ocean Model "
      "Intercomparison Project (OMIP). Geoscientific Model Development 10, 2169-2199.", "10.5194/gmd-10-2169-2017")
_cite("cf2023", "Eaton, B. et al. (2023). NetCDF Climate and Forecast (CF) Metadata Conventions, version 1.11.", "")
