"""Members of a block: spacecraft that fly the same way and are marched side by side.

Members share geometry, timeline and the list of nodes; what they are made of, how
thick, how large, in which plasmas and with which emission law may differ. A member
alone gives the same numbers as in any company, bit for bit.
"""

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import TypeAlias

import numpy as np

from charging.array_strings import array_strings, irradiated, string_materials
from charging.barriers import barriers
from charging.case import LoadedCase, Mode
from charging.case_tables import Case
from charging.currents.ensemble import EscapeCurves, Question, ensemble_currents, fits_ensemble
from charging.currents.lookup import NetCurrents, net_currents
from charging.currents.surface import SurfaceModel, surface_models
from charging.network.charge_balance import ChargeBalance, safe_state_V
from charging.network.emitters import Emitters
from charging.network.nodes import Network, block_network
from charging.network.strings import Strings
from charging.schedule import plasma_names
from charging.spacecraft import spacecraft_network, surface_materials
from charging.surroundings import Surroundings
from environments.plasma import Plasma
from environments.spectrum import SolarSpectrum
from materials.record import Material
from materials.secondary import YieldLaw


@dataclass(frozen=True, slots=True)
class Member:
    """What one member of a block is.

    Attributes
    ----------
    case : Case
        Checked. The same surfaces by name and attachment, the same emitters, orbit, attitude,
        modes, timeline and surface temperatures as the case of the block; areas, thicknesses,
        capacitances, resistances, emitter currents, radius, emission options and solar
        activity may differ.
    materials : mapping of str to Material
        By the name that the case gives.
    plasmas : mapping of str to Plasma
        By the name that the case gives.
    law : YieldLaw
        Secondary-emission law.
    collection : str or None
        Collecting geometry; None: as the case says.
    """

    case: Case
    materials: Mapping[str, Material]
    plasmas: Mapping[str, Plasma]
    law: YieldLaw
    collection: str | None = None

    def plasmas_of(
        self, mode: Mode | None = None, basis: tuple[Plasma, ...] = ()
    ) -> tuple[Plasma, ...]:
        """Plasmas in the order of the shares along the run: base, events, interval modes.

        A base that changes along the orbit is its `basis`.
        """
        names = plasma_names(self.case, mode)
        return (*basis, *(self.plasmas[name] for name in names[bool(basis) :]))


def member_of(loaded: LoadedCase, law: YieldLaw, collection: str | None = None) -> Member:
    """Member that is the case as it stands."""
    return Member(loaded.case, loaded.materials, loaded.plasmas, law, collection)


def block_balance(
    members: Sequence[Member],
    spectra: Sequence[SolarSpectrum],
    mode: Mode | None,
    around: Surroundings,
    *,
    curves: EscapeCurves | None = None,
) -> ChargeBalance:
    """Charge balance of a block.

    Parameters
    ----------
    members : sequence of Member
    spectra : sequence of SolarSpectrum
        One per member.
    mode : Mode or None
        An alternative mode.
    around : Surroundings
        Of all members.
    curves : EscapeCurves, optional
        Escape curves kept from block to block. Where given, the tables are coarse, for many
        members with materials of their own, if they know everything that is asked; the balance
        then has no `models`.

    Raises
    ------
    ValueError
        Members have not the same nodes or as many plasmas.
    """
    if len({len(member.plasmas_of(mode, around.basis)) for member in members}) > 1:
        raise ValueError("members of a block must have as many plasmas")
    net = block_network(_networks(members))
    emitters = _emitters([m.case for m in members])
    walls = barriers([m.case for m in members], net.surface_node, len(net.node_names))
    models, table = _tables(members, spectra, mode, around, surface_materials, curves)
    wired: Strings | None = None
    if members[0].case.string:
        own = _tables(members, spectra, mode, around, string_materials, curves)
        wired = array_strings([m.case for m in members], own[1], own[0])
    return ChargeBalance(
        models,
        table,
        net,
        around,
        net.mass,
        emitters,
        safe_state_V(net),
        walls,
        wired,
        irradiated=irradiated(members[0].case) and bool(net.film_radiation_S_m.any()),
    )


MaterialsOf: TypeAlias = Callable[[Case, Mapping[str, Material]], Sequence[Material]]


def _tables(
    members: Sequence[Member],
    spectra: Sequence[SolarSpectrum],
    mode: Mode | None,
    around: Surroundings,
    materials_of: MaterialsOf,
    curves: EscapeCurves | None,
) -> tuple[tuple[SurfaceModel, ...], NetCurrents]:
    """Surface models and their tables; coarse tables, if they fit, have no models."""
    if curves is not None and around.along is None:
        questions = [
            _question(m, s, mode, around, materials_of)
            for m, s in zip(members, spectra, strict=True)
        ]
        if fits_ensemble(questions):
            return (), ensemble_currents(questions, curves)
    models = _models(members, spectra, mode, around, materials_of)
    return models, net_currents(models)


def _question(
    member: Member,
    spectrum: SolarSpectrum,
    mode: Mode | None,
    around: Surroundings,
    materials_of: MaterialsOf,
) -> Question:
    body = member.case.body
    return Question(
        materials=materials_of(member.case, member.materials),
        plasmas=member.plasmas_of(mode, around.basis),
        spectrum=spectrum,
        law=member.law,
        radius_m=body.radius_m,
        collection=body.collection if member.collection is None else member.collection,
        photo_geometry=member.case.emission.photo_escape,
    )


def _models(
    members: Sequence[Member],
    spectra: Sequence[SolarSpectrum],
    mode: Mode | None,
    around: Surroundings,
    materials_of: MaterialsOf,
) -> tuple[SurfaceModel, ...]:
    """Surface model of each member; equal questions are answered once."""
    # laws of one question share tables of ions and photoelectrons
    questions: dict[object, list[int]] = {}
    asked = []
    for i, (member, spectrum) in enumerate(zip(members, spectra, strict=True)):
        body, emission = member.case.body, member.case.emission
        materials = materials_of(member.case, member.materials)
        plasmas = member.plasmas_of(mode, around.basis)
        collection = body.collection if member.collection is None else member.collection
        asked.append((materials, plasmas, spectrum, body, collection, emission.photo_escape))
        key = (
            tuple(map(id, materials)),
            tuple(map(id, plasmas)),
            id(spectrum),
            body.radius_m,
            collection,
            emission.photo_escape,
        )
        questions.setdefault(key, []).append(i)
    found: dict[int, SurfaceModel] = {}
    for same in questions.values():
        materials, plasmas, spectrum, body, collection, escape = asked[same[0]]
        laws = list(dict.fromkeys(members[i].law for i in same))
        models = surface_models(
            materials,
            plasmas,
            spectrum,
            laws=laws,
            radius_m=body.radius_m,
            collection=collection,
            photo_geometry=escape,
            parts=len(around.basis),
            streams=None if around.along is None else around.along.streams,
        )
        found |= {i: models[laws.index(members[i].law)] for i in same}
    return tuple(found[i] for i in range(len(members)))


def _networks(members: Sequence[Member]) -> list[Network]:
    """Network of each member; a link that only others have has no conductance in it."""
    ends: dict[tuple[str, str, int], None] = {}
    own = []
    for member in members:
        links: dict[tuple[str, str, int], float] = {}
        for link in member.case.link:
            a, b = link.between
            number = sum(key[:2] == (a, b) for key in links)
            links[a, b, number] = link.resistance_ohm
        own.append(links)
        ends |= dict.fromkeys(links)
    return [
        spacecraft_network(
            member.case,
            member.materials,
            [(a, b, links.get((a, b, number), np.inf)) for a, b, number in ends],
        )
        for member, links in zip(members, own, strict=True)
    ]


def _emitters(cases: Sequence[Case]) -> Emitters:
    names = tuple(one.name for one in cases[0].emitter)
    if any(tuple(one.name for one in case.emitter) != names for case in cases):
        raise ValueError("members of a block must have the same emitters")
    current = np.array([[one.current_A for one in case.emitter] for case in cases])
    energy = np.array([[one.energy_eV for one in case.emitter] for case in cases])
    on_demand = [[np.inf if e.below_V is None else e.below_V for e in c.emitter] for c in cases]
    held = [[np.nan if e.hold_V is None else e.hold_V for e in c.emitter] for c in cases]
    below, hold = np.array(on_demand), np.array(held)
    return Emitters(
        names,
        current,
        energy,
        None if np.isinf(below).all() else below,
        None if np.isnan(hold).all() else hold,
    )
