"""The catalog: which recipes exist for a call, and each made concrete.

In: kind, number of controls, angle, direction.  Out: names in a fixed order, and
`Built` circuits at both gate levels.  What a recipe costs on a device is not asked.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache

from placer.recipes import borrowed, clean, conditional, level2, noworkspace, toffoli
from placer.recipes.circuit import Built, Circuit, Op, Recipe, Workspace
from placer.recipes.draft import Job, Made, tidy

_X = ("mcx", "mcz", "and")
_ALL = ("mcx", "mcz", "mcp", "and")
_KINDS = ("mcx", "mcz", "mcp", "and")


@dataclass(frozen=True, slots=True)
class _Entry:
    recipe: Recipe
    make: Callable[[Job], Made]
    only_inverse: bool = False

    def exists(self, kind: str, controls: int, *, inverse: bool) -> bool:
        recipe = self.recipe
        if kind not in recipe.kinds or controls < recipe.smallest:
            return False
        if recipe.largest is not None and controls > recipe.largest:
            return False
        return inverse or not self.only_inverse


def _entry(
    name: str,
    title: str,
    workspace: Workspace,
    kinds: tuple[str, ...],
    sizes: tuple[int, int | None],
    make: Callable[[Job], Made],
    source: str,
    *,
    measured: bool = False,
    only_inverse: bool = False,
) -> _Entry:
    smallest, largest = sizes
    recipe = Recipe(name, title, kinds, workspace, smallest, largest, measured, source)
    return _Entry(recipe, make, only_inverse)


_BARENCO = "Barenco et al. 1995, quant-ph/9503016"
_GIDNEY = "Gidney 2018, arXiv 1709.06648"
_RELATIVE = "relative phases after Maslov 2016, arXiv 1508.03273"
_KHATTAR = "Khattar and Gidney 2024, arXiv 2407.17966"

_ENTRIES: tuple[_Entry, ...] = (
    _entry(
        "toffoli",
        "textbook Toffoli",
        "none",
        ("mcx", "mcz", "mcp"),
        (2, 2),
        toffoli.textbook,
        "Nielsen and Chuang 2000, fig. 4.9",
    ),
    _entry(
        "and-mirror",
        "temporary AND and its mirror image",
        "none",
        ("and",),
        (2, 2),
        toffoli.and_mirror,
        f"{_GIDNEY}; {_RELATIVE}",
    ),
    _entry(
        "and-three",
        "temporary AND of three and its mirror image",
        "none",
        ("and",),
        (3, 3),
        toffoli.and_three,
        f"{_RELATIVE}; phases mended independently",
    ),
    _entry(
        "and-measured",
        "product taken away by measurement",
        "none",
        ("and",),
        (2, 2),
        toffoli.and_measured,
        _GIDNEY,
        measured=True,
        only_inverse=True,
    ),
    _entry(
        "clean-ladder",
        "ladder on clean wires",
        "clean",
        _ALL,
        (3, None),
        clean.ladder,
        f"{_BARENCO}; {_RELATIVE}",
    ),
    _entry(
        "clean-tree",
        "balanced tree on clean wires",
        "clean",
        _ALL,
        (4, None),
        clean.tree,
        f"common practice; {_RELATIVE}",
    ),
    _entry(
        "clean-half",
        "products of three on half as many clean wires",
        "clean",
        _ALL,
        (4, None),
        clean.half,
        "Maslov 2016, arXiv 1508.03273",
    ),
    _entry(
        "clean-ladder-held",
        "ladder that stores the whole product",
        "clean",
        ("mcp",),
        (2, None),
        clean.ladder_held,
        f"Nielsen and Chuang 2000, fig. 4.10; {_RELATIVE}",
    ),
    _entry(
        "clean-tree-held",
        "tree that stores the whole product",
        "clean",
        ("mcp",),
        (4, None),
        clean.tree_held,
        f"common practice; {_RELATIVE}",
    ),
    _entry(
        "clean-measured",
        "ladder on clean wires, cleaned by measurement",
        "clean",
        _ALL,
        (3, None),
        clean.ladder_measured,
        _GIDNEY,
        measured=True,
    ),
    _entry(
        "clean-measured-tree",
        "balanced tree on clean wires, cleaned by measurement",
        "clean",
        _ALL,
        (4, None),
        clean.tree_measured,
        _GIDNEY,
        measured=True,
    ),
    _entry(
        "clean-measured-held",
        "stored product, cleaned by measurement",
        "clean",
        ("mcx", "mcz", "mcp"),
        (2, None),
        clean.held_measured,
        _GIDNEY,
        measured=True,
    ),
    _entry(
        "clean-one",
        "conditionally clean ladder on one clean wire",
        "clean",
        _ALL,
        (4, None),
        conditional.one,
        f"{_KHATTAR}; {_RELATIVE}",
    ),
    _entry(
        "clean-one-log",
        "conditionally clean trees on one clean wire",
        "clean",
        _X,
        (9, None),
        conditional.one_log,
        f"variant of {_KHATTAR}, rebuilt independently; {_RELATIVE}",
    ),
    _entry(
        "clean-two-log",
        "conditionally clean trees on two clean wires",
        "clean",
        _ALL,
        (7, None),
        conditional.two_log,
        f"{_KHATTAR}; {_RELATIVE}",
    ),
    _entry(
        "borrowed-v-chain",
        "V-chain on borrowed wires",
        "borrowed",
        _X,
        (3, None),
        borrowed.v_chain,
        f"{_BARENCO}, Lemma 7.2; Iten et al. 2016, arXiv 1501.06911; {_RELATIVE}",
    ),
    _entry(
        "borrowed-one-halves",
        "two halves around one borrowed wire",
        "borrowed",
        _X,
        (4, None),
        borrowed.halves,
        f"{_BARENCO}, Lemma 7.3; {_RELATIVE}",
    ),
    _entry(
        "borrowed-one",
        "toggle-detected ladder on one borrowed wire",
        "borrowed",
        _X,
        (4, None),
        conditional.one_toggled,
        f"{_KHATTAR}; {_RELATIVE}",
    ),
    _entry(
        "borrowed-one-log",
        "toggle-detected trees on one borrowed wire",
        "borrowed",
        _X,
        (8, None),
        conditional.one_log_toggled,
        f"variant of {_KHATTAR}, rebuilt independently; {_RELATIVE}",
    ),
    _entry(
        "borrowed-roots",
        "controlled roots around V-chains on borrowed wires",
        "borrowed",
        ("mcp",),
        (5, 64),
        noworkspace.lent,
        f"{_BARENCO}, Lemmas 7.2 and 7.5; {_RELATIVE}",
    ),
    _entry(
        "none-gray",
        "phases of all parities in Gray order",
        "none",
        _ALL,
        (3, 6),
        noworkspace.gray,
        f"{_BARENCO}, Lemma 7.1",
    ),
    _entry(
        "none-quadratic",
        "controlled roots around products of the lower controls",
        "none",
        _ALL,
        (3, 64),
        noworkspace.quadratic,
        f"{_BARENCO}, Lemma 7.5; {_RELATIVE}",
    ),
    _entry(
        "none-linear",
        "controlled roots in linear depth",
        "none",
        _ALL,
        (3, 64),
        noworkspace.linear,
        "Saeedi and Pedram 2013, arXiv 1303.3557; "
        "da Silva and Park 2022, arXiv 2203.11882",
    ),
    _entry(
        "level2-chain",
        "chain on level 2",
        "level2",
        _ALL,
        (2, None),
        level2.chain,
        "Ralph, Resch and Gilchrist 2007, arXiv 0806.0654; "
        "Nikolaeva et al. 2022, arXiv 2112.14535",
    ),
    _entry(
        "level2-tree",
        "balanced tree on level 2",
        "level2",
        _ALL,
        (3, None),
        level2.tree,
        "Gokhale et al. 2019, arXiv 1905.10481; node rebuilt independently",
    ),
    _entry(
        "level2-mixed",
        "tree of least depth on level 2",
        "level2",
        _ALL,
        (8, None),
        level2.mixed,
        "after Gokhale et al. 2019, arXiv 1905.10481; shape rebuilt independently",
    ),
)

_BY_NAME = {entry.recipe.name: entry for entry in _ENTRIES}


def recipe_names(kind: str, controls: int, inverse: bool = False) -> tuple[str, ...]:
    """Return every recipe for a call, in the order of the catalog.

    Examples
    --------
    >>> recipe_names("mcx", 2)
    ('toffoli', 'clean-measured-held', 'level2-chain')
    """
    return tuple(
        entry.recipe.name
        for entry in _ENTRIES
        if entry.exists(kind, controls, inverse=inverse)
    )


def describe(name: str) -> Recipe:
    """Return what the catalog says about a recipe.

    Raises
    ------
    ValueError
        If there is no such recipe.
    """
    if name not in _BY_NAME:
        raise ValueError(f"there is no recipe {name!r}")
    return _BY_NAME[name].recipe


@lru_cache(maxsize=1024)
def build(
    name: str, kind: str, controls: int, angle: float = 0.0, inverse: bool = False
) -> Built:
    """Return a recipe made concrete for one call.

    Parameters
    ----------
    name : str
        One of `recipe_names(kind, controls, inverse)`.
    kind : str
        mcx, mcz, mcp or and.
    controls : int
        Number of controls, at least 2.
    angle : float
        Phase of an mcp in radians; other kinds ignore it.
    inverse : bool
        Take a product away (and), or turn the phase back (mcp).

    Raises
    ------
    ValueError
        If the recipe does not exist for this call.
    """
    recipe = describe(name)
    entry = _BY_NAME[name]
    if not entry.exists(kind, controls, inverse=inverse):
        way = " inverse" if inverse else ""
        raise ValueError(
            f"recipe {name} does not build{way} {kind} with {controls} controls"
        )
    turned = -angle if inverse else angle
    job = Job(kind, controls, turned if kind == "mcp" else 0.0, inverse)
    made = entry.make(job)
    operands = controls + 1
    coarse = _as_one(job) if made.as_one else made.draft.coarse
    return Built(
        recipe=name,
        kind=kind,
        controls=controls,
        workspace=recipe.workspace,
        needs_measurement=recipe.needs_measurement,
        coarse=Circuit(operands, made.slots, tidy(coarse), made.bits),
        fine=Circuit(operands, made.slots, tidy(made.draft.fine), made.bits),
        level2_wires=made.level2_wires,
    )


def _as_one(job: Job) -> tuple[Op, ...]:
    """Return the whole call as one operation on its operands."""
    wires = tuple(range(job.controls + 1))
    if job.kind == "mcp":
        return (Op("mcp", wires, (job.angle,)),)
    return (Op("mcz" if job.kind == "mcz" else "mcx", wires),)
