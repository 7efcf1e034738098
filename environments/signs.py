"""Whether a plasma holds charges of both signs, as a floating potential needs."""

from environments.errors import EnvironmentDataError
from environments.plasma import ELECTRON, Plasma


def refuse_one_sided(plasma: Plasma) -> None:
    """Refuse a plasma without electrons or without positive ions, or with negative ions.

    The first has no sheath, the second no balance; the third would be taken for electrons.

    Raises
    ------
    EnvironmentDataError
        Says what is lacking, or names the negative ions.

    Examples
    --------
    >>> from environments.catalogue import load_plasma
    >>> refuse_one_sided(load_plasma("quiet geostationary"))
    """
    present = {p.species for p in plasma.populations if p.density_m3 > 0.0}
    kinds = {p.species for p in plasma.populations}
    negative = sorted(s.name for s in kinds if s.charge_number < 0 and s != ELECTRON)
    problems = []
    if ELECTRON not in present:
        problems.append("holds no electrons")
    if not any(s.charge_number > 0 for s in present):
        problems.append("holds no positive ions")
    if negative:
        problems.append(f"holds {'; '.join(negative)}: negative ions are not modelled")
    if problems:
        raise EnvironmentDataError(
            " and ".join(problems),
            key=("population",),
            value=", ".join(sorted(s.name for s in kinds)),
            allowed="a plasma with electrons and positive ions",
        )
