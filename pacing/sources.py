"""Published sources, cited by key from the docstrings and in the README."""

from __future__ import annotations

from typing import NamedTuple


class Source(NamedTuple):
    """One published source."""

    authors: str
    year: int
    title: str
    where: str


SOURCES: dict[str, Source] = {
    "martin-1998": Source(
        "Martin, Milliken, Cobb, McFadden, Coggan",
        1998,
        "Validation of a mathematical model for road cycling power",
        "J Appl Biomech 14(3):276-291",
    ),
    "fritsch-butland-1984": Source(
        "Fritsch, Butland",
        1984,
        "A method for constructing local monotone piecewise cubic interpolants",
        "SIAM J Sci Stat Comput 5(2):300-304",
    ),
    "iso-2533": Source(
        "ISO",
        1975,
        "Standard atmosphere",
        "ISO 2533:1975",
    ),
    "cipm-2007": Source(
        "Picard, Davis, Gläser, Fujii",
        2008,
        "Revised formula for the density of moist air (CIPM-2007)",
        "Metrologia 45:149-155",
    ),
    "wieringa-1992": Source(
        "Wieringa",
        1992,
        "Updating the Davenport roughness classification",
        "J Wind Eng Ind Aerodyn 41:357-368",
    ),
    "van-druenen-2021": Source(
        "van Druenen, Blocken",
        2021,
        "Aerodynamic analysis of uphill drafting in cycling",
        "Sports Eng 24:10",
    ),
    "padilla-2000": Source(
        "Padilla, Mujika, Angulo, Goiriena",
        2000,
        "Scientific approach to the 1-h cycling world record: a case study",
        "J Appl Physiol 89:1522-1527",
    ),
    "wilson-bicycling-science": Source(
        "Wilson, Papadopoulos",
        2004,
        "Bicycling Science",
        "MIT Press, third edition",
    ),
    "morton-1996": Source(
        "Morton",
        1996,
        "A 3-parameter critical power model",
        "Ergonomics 39(4):611-619",
    ),
    "puchowicz-2020": Source(
        "Puchowicz, Baker, Clarke",
        2020,
        "Development and field validation of an omni-domain power-duration model",
        "J Sports Sci 38(7):801-813",
    ),
    "simpson-2017": Source(
        "Simpson, Kordi",
        2017,
        "Comparison of critical power and W′ derived from 2 or 3 maximal tests",
        "Int J Sports Physiol Perform 12:825-830",
    ),
    "mattioni-2018": Source(
        "Mattioni Maturana, Fontana, Pogliaghi and others",
        2018,
        "Critical power: how different protocols and models affect its determination",
        "J Sci Med Sport 21:742-747",
    ),
    "skiba-2012": Source(
        "Skiba, Chidnok, Vanhatalo, Jones",
        2012,
        "Modeling the expenditure and reconstitution of work capacity above critical power",
        "Med Sci Sports Exerc 44(8):1526-1532",
    ),
    "skiba-2015": Source(
        "Skiba, Fulford, Clarke, Vanhatalo, Jones",
        2015,
        "Intramuscular determinants of the ability to recover work capacity above critical power",
        "Eur J Appl Physiol 115:703-713",
    ),
    "bartram-2018": Source(
        "Bartram, Thewlis, Martin, Norton",
        2018,
        "Accuracy of W′ recovery kinetics in high performance cyclists",
        "Int J Sports Physiol Perform 13(6):724-728",
    ),
    "weigend-2022": Source(
        "Weigend, Clarke, Obst",
        2022,
        "A hydraulic model outperforms work-balance models for predicting recovery kinetics "
        "from intermittent exercise",
        "Ann Oper Res",
    ),
    "ferguson-2010": Source(
        "Ferguson, Rossiter, Whipp and others",
        2010,
        "Effect of recovery duration from prior exhaustive exercise on the parameters of the "
        "power-duration relationship",
        "J Appl Physiol 108:866-874",
    ),
    "caen-2019": Source(
        "Caen, Bourgois, Bourgois and others",
        2019,
        "The reconstitution of W′ depends on both work and recovery characteristics",
        "Med Sci Sports Exerc 51(8):1745-1751",
    ),
    "caen-2021": Source(
        "Caen, Bourgois, Dauwe and others",
        2021,
        "W′ recovery kinetics after exhaustion: a two-phase exponential process influenced "
        "by aerobic fitness",
        "Med Sci Sports Exerc 53(9):1911-1921",
    ),
    "chidnok-2012": Source(
        "Chidnok, Dimenna, Bailey and others",
        2012,
        "Exercise tolerance in intermittent cycling: application of the critical power concept",
        "Med Sci Sports Exerc 44(5):966-976",
    ),
    "clark-2018": Source(
        "Clark, Vanhatalo, Bailey and others",
        2018,
        "Effects of two hours of heavy-intensity exercise on the power-duration relationship",
        "Med Sci Sports Exerc 50(8):1658-1668",
    ),
    "clark-2019": Source(
        "Clark, Vanhatalo, Thompson and others",
        2019,
        "Dynamics of the power-duration relationship during prolonged endurance exercise and "
        "influence of carbohydrate ingestion",
        "Am J Physiol Regul 317:R59-R67",
    ),
    "bassett-1999": Source(
        "Bassett, Kyle, Passfield, Broker, Burke",
        1999,
        "Comparing cycling world hour records, 1967-1996: modeling with empirical data",
        "Med Sci Sports Exerc 31(11):1665-1676",
    ),
    "wgs84": Source(
        "National Imagery and Mapping Agency",
        2000,
        "Department of Defense World Geodetic System 1984, its definition and relationships",
        "NIMA TR8350.2, 3rd edition, chapter 3",
    ),
    "wahba-1985": Source(
        "Wahba",
        1985,
        "A comparison of GCV and GML for choosing the smoothing parameter in the generalized "
        "spline smoothing problem",
        "Ann Stat 13(4):1378-1402",
    ),
    "nocedal-wright-2006": Source(
        "Nocedal, Wright",
        2006,
        "Numerical Optimization",
        "Springer, second edition",
    ),
    "patterson-thompson-1971": Source(
        "Patterson, Thompson",
        1971,
        "Recovery of inter-block information when block sizes are unequal",
        "Biometrika 58(3):545-554",
    ),
    "gilmour-1995": Source(
        "Gilmour, Thompson, Cullis",
        1995,
        "Average information REML: an efficient algorithm for variance parameter estimation in "
        "linear mixed models",
        "Biometrics 51(4):1440-1450",
    ),
    "takahashi-1973": Source(
        "Takahashi, Fagan, Chin",
        1973,
        "Formation of a sparse bus impedance matrix and its application to short circuit study",
        "8th PICA Conference, 63-69",
    ),
    "welch-1947": Source(
        "Welch",
        1947,
        "The generalization of Student's problem when several different population variances "
        "are involved",
        "Biometrika 34:28-35",
    ),
    "martin-2006": Source(
        "Martin, Gardner, Barras, Martin",
        2006,
        "Modeling sprint cycling using field-derived parameters and forward integration",
        "Med Sci Sports Exerc 38(3):592-597",
    ),
}
