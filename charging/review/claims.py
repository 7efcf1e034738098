"""What a review does not model, never claims, and takes for granted."""

NOT_MODELLED = (
    "internal charging",
    "discharge transients and what they couple into",
    "plumes and outgassing",
    "electron exchange between surfaces",
    "conduction along surfaces",
    "ageing of secondary emission and radiation-induced conductivity without a dose rate",
    "thermal, optical and mechanical consequences of a fix",
)

CLAIM_LIMITS = (
    "Nothing is called within while one of its limits is not assessable.",
    "A fix is called verified only when every mode and plasma of the case was run again with it.",
    "No probability of zero: none of N draws gives at most 3/N. Every probability is conditional "
    "on assumed spreads.",
    "A resistivity is no purchase value without temperature, field and method of measurement.",
    "A stored energy does not say that there is no discharge.",
    "Nothing here is for crew outside the vehicle.",
    "An array above 70 V gets no unqualified pass: specialist review.",
)
"""Limits of the claims, for every report."""

CAUTIONS = (
    "This is an estimate. Program requirements, applicable standards and qualified specialists "
    "decide.",
    "Crewed use needs its own safety process.",
)

ASSUMPTIONS = (
    (
        "Plasma is the same on all sides of the spacecraft and along the orbit, unless the case "
        "follows regions.",
        "Fails inside wakes, in auroral beams and where the orbit crosses boundaries.",
    ),
    (
        "A surface has one potential and one temperature.",
        "Fails on large surfaces with shaded parts or hot spots.",
    ),
    (
        "The blend between thin and thick sheath, w = s²/(s²+R²), is this project's own (assumed).",
        "Fails where the sheath is about as large as the body; there both limits are run.",
    ),
    (
        "At the end of life every surface has the photoyield of aged surfaces; secondary emission "
        "stays as recorded.",
        "Fails where contamination or erosion changes secondary emission.",
    ),
    (
        "Properties of different materials vary independently within their spreads.",
        "Fails where one cause moves several, such as one contaminant on all surfaces.",
    ),
    (
        "Without shapes, barriers are those of round caps on a sphere; sun-tracking wings have "
        "none.",
        "Fails for booms, wings and boxes with large overhanging parts.",
    ),
    (
        "Capacitance between outer faces through space is left out unless a shape is given.",
        "Fails within the first milliseconds of a jump of structure.",
    ),
)
"""What is assumed, and where it fails."""


def probability(exceeding: int, draws: int) -> str:
    """Say a share of draws; never 0, and always conditional.

    Examples
    --------
    >>> probability(0, 600)
    'at most 0.005 (0 of 600 draws, 95 %), conditional on assumed spreads'
    >>> probability(30, 600)
    '0.05 (30 of 600 draws), conditional on assumed spreads'
    >>> probability(0, 0)
    'not known: no draws'
    """
    if draws == 0:
        return "not known: no draws"
    if exceeding == 0:  # rule of three: (1-p)^N = 0.05 at p = 3/N
        size = f"at most {min(1.0, 3.0 / draws):.2g} (0 of {draws} draws, 95 %)"
    else:
        size = f"{exceeding / draws:.2g} ({exceeding} of {draws} draws)"
    return f"{size}, conditional on assumed spreads"
