"""How the answers to small questions look: text for people, documents for JSON."""

from __future__ import annotations

from typing import TYPE_CHECKING

from charging.cli.output import one_line, print_table
from charging.clock import iso_time

if TYPE_CHECKING:
    from charging.orbit_view import OrbitReport
    from charging.point import PointResult


def number(value: float | None, form: str) -> str:
    """Return a number in a format, or a dash for None.

    Examples
    --------
    >>> number(1.234, ".1f"), number(None, ".1f")
    ('1.2', '-')
    """
    return "-" if value is None else f"{value:{form}}"


def _fine_volts(value: float) -> str:
    return "0" if value == 0.0 else f"{value:+.5g}" if abs(value) < 1e4 else f"{value:+.0f}"


def point_document(found: PointResult) -> dict[str, object]:
    """Return the answer of `floating_point` as JSON."""
    return {
        "material": found.material,
        "plasma": found.plasma,
        "law": found.law,
        "light": found.light,
        "roots": [{"potential_V": r.potential_V, "stable": r.stable} for r in found.roots],
        "reached_V": found.reached_V,
        "current_density_A_m2": dict(found.current_density_A_m2),
        "electron_debye_length_m": found.electron_debye_length_m,
        "sheath": {
            "length_m": found.sheath.length_m,
            "weight": found.sheath.weight,
            "collection": found.sheath.collection,
        },
        "photoelectron_sheath": None
        if found.photoelectrons is None
        else {
            "debye_length_m": found.photoelectrons.debye_length_m,
            "density_m3": found.photoelectrons.density_m3,
            "mean_energy_eV": found.photoelectrons.mean_energy_eV,
            "point_source_share": found.photoelectrons.point_source_share,
            "photo_escape": found.photoelectrons.photo_escape,
        },
        "other_laws_reached_V": dict(found.other_laws_reached_V),
        "notes": list(found.notes),
    }


def print_point(found: PointResult) -> None:
    """Print the answer of `floating_point`."""
    from charging.curve_plots import MECHANISM_WORDS

    light = "dark" if found.light == 0.0 else f"sunlit at incidence cosine {found.light:g}"
    print(f"{found.material} in {found.plasma}, {light}; body radius {found.radius_m:g} m")
    print(f"secondary emission by {found.law}\n")
    print_table(
        [
            (
                _fine_volts(root.potential_V),
                "stable" if root.stable else "unstable",
                "<- reached from 0 V" if root.potential_V == found.reached_V else "",
            )
            for root in found.roots
        ],
        ("floating potential\nV", "", ""),
        "rll",
    )
    print()
    print_table(
        [
            (MECHANISM_WORDS[name], f"{1e6 * value:+.4g}" if value else "0")
            for name, value in found.current_density_A_m2.items()
        ],
        (f"current at {_fine_volts(found.reached_V)} V", "density\nuA m-2"),
        "lr",
    )
    sheath = found.sheath
    print(
        f"\nelectron Debye length {found.electron_debye_length_m:.4g} m, sheath "
        f"{sheath.length_m:.4g} m; collection {sheath.collection}: "
        f"thick-sheath share {sheath.weight:.3f} (0 plane, 1 sphere or cylinder)"
    )
    photo = found.photoelectrons
    if photo is not None:
        print(
            f"photoelectrons: mean energy {photo.mean_energy_eV:.3g} eV, Debye length "
            f"{photo.debye_length_m:.3g} m; escape {photo.photo_escape}: point-source share "
            f"{photo.point_source_share:.3f} (0 plane)"
        )
    for law, volts in found.other_laws_reached_V.items():
        what = "no floating potential" if volts is None else f"{_fine_volts(volts)} V"
        print(f"the other law, {law}, gives {what}: far above the peak energy neither is certain")
    for note in found.notes:
        print(f"note: {note}")


def orbit_document(found: OrbitReport) -> dict[str, object]:
    """Return the answer of `orbit_report` as JSON, times in UTC, null where a contact is absent."""
    from charging.orbit_view import eclipse_rows

    return {
        "title": found.title,
        "kind": found.kind,
        "start": iso_time(found.epoch, 0.0),
        "end": iso_time(found.epoch, found.duration_s),
        "source": found.source,
        "period_s": found.period_s,
        "eclipses": eclipse_rows(found.epoch, found.eclipses),
        "beta_angle_deg": found.beta_angle_deg,
        "beta_angle_end_deg": found.beta_angle_end_deg,
        "regions": [
            {
                "region": stay.region,
                "start": iso_time(found.epoch, stay.start_s),
                "end": iso_time(found.epoch, stay.end_s),
            }
            for stay in found.regions
        ],
    }


def print_orbit(found: OrbitReport, document: dict[str, object]) -> None:
    """Print the answer of `orbit_report`."""
    print(one_line(found.title))
    print(f"{document['start']} to {document['end']}: {found.source}")
    if found.period_s is None or found.beta_angle_deg is None:
        print("fixed case: the same light for the whole run, no orbit, no eclipses")
        return
    print(
        f"period {found.period_s / 60.0:.2f} min, beta angle {found.beta_angle_deg:+.2f} deg "
        f"at the start, {number(found.beta_angle_end_deg, '+.2f')} deg at the end\n"
    )
    eclipses = document["eclipses"]
    assert isinstance(eclipses, list)
    if eclipses:
        keys = ("penumbra_start", "umbra_start", "umbra_end", "penumbra_end")
        print_table(
            [
                (
                    eclipse["body"],
                    *(eclipse[key] or "-" for key in keys),
                    f"{eclipse['umbra_s'] / 60.0:.2f}",
                )
                for eclipse in eclipses
            ],
            (
                "body",
                "penumbra from\nUTC",
                "umbra from\nUTC",
                "umbra to\nUTC",
                "penumbra to\nUTC",
                "umbra\nmin",
            ),
            "lllllr",
        )
    else:
        print("no eclipse")
    if found.regions:
        _print_regions(found)
    print(
        "Flattened Earth, Sun within 0.001 deg; eclipses by the Moon "
        + ("within some 15 s." if found.moon else "are not looked for ([sun] moon = true).")
    )


MOST_STAYS_SHOWN = 40


def _print_regions(found: OrbitReport) -> None:
    """Stays in regions, or where there are many, the share of each region."""
    print()
    if len(found.regions) <= MOST_STAYS_SHOWN:
        print_table(
            [
                (
                    stay.region,
                    iso_time(found.epoch, stay.start_s),
                    iso_time(found.epoch, stay.end_s),
                    f"{(stay.end_s - stay.start_s) / 60.0:.1f}",
                )
                for stay in found.regions
            ],
            ("region with the\nlargest share", "from\nUTC", "to\nUTC", "\nmin"),
            "lllr",
        )
        return
    total: dict[str, list[float]] = {}
    for stay in found.regions:
        total.setdefault(stay.region, []).append(stay.end_s - stay.start_s)
    print_table(
        [
            (name, str(len(own)), f"{sum(own) / found.duration_s:.1%}")
            for name, own in sorted(total.items(), key=lambda item: -sum(item[1]))
        ],
        ("region with the\nlargest share", "\nstays", "of the\ntime"),
        "lrr",
    )
