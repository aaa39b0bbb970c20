"""An entry of the table of arithmetic recipes, and the sources that entries share.

In: what a recipe is and can do.  Out: `Way`.  The entries themselves are in
`additions.py` and `ways.py`.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

from placer.program.signature import Signature
from placer.recipes.circuit import Recipe, Workspace
from placer.recipes.makers import Maker

CUCCARO = "Cuccaro et al. 2004, quant-ph/0410184"
TAKAHASHI = "Takahashi, Tani and Kunihiro 2009, arXiv 0910.2530"
DRAPER = "Draper 2000, quant-ph/0008033"
DKRS = "Draper, Kutin, Rains and Svore 2004, quant-ph/0406142"
GIDNEY = "Gidney 2018, arXiv 1709.06648"
CONTROLLED = "controlled after Munoz-Coreas and Thapliyal 2017, arXiv 1706.05113"
HANER = "Haener, Roetteler and Svore 2016, arXiv 1611.07995"
KHATTAR = "after Khattar and Gidney 2024, arXiv 2407.17966; blocks derived here"
LADDER = "common practice for 1, derived here for other constants"
LARGEST_FOURIER = 64
"""Beyond this the smallest phases are below the precision of any device."""

Fits = Callable[[Signature], bool]


@dataclass(frozen=True, slots=True)
class Way:
    """A recipe with its maker and with what it can do.

    `controls` is the most controls that the maker knows itself (`None`: any number).
    Recipes on clean wires take more: their product is held in further clean wires.
    """

    recipe: Recipe
    make: Maker
    fits: Fits
    controls: int | None

    def exists(self, signature: Signature) -> bool:
        """Whether the recipe builds this call."""
        recipe = self.recipe
        if signature.kind not in recipe.kinds or signature.width < recipe.smallest:
            return False
        if recipe.largest is not None and signature.width > recipe.largest:
            return False
        if self.controls is not None and signature.controls > self.controls:
            if recipe.workspace != "clean" or self.controls == 0:
                return False
            signature = replace(signature, controls=1)
        return self.fits(signature)


def always(_: Signature) -> bool:
    """Whether nothing but the kind and the width matters: yes."""
    return True


def way(
    name: str,
    title: str,
    workspace: Workspace,
    kinds: tuple[str, ...],
    make: Maker,
    source: str,
    *,
    fits: Fits = always,
    controls: int | None = 1,
    sizes: tuple[int, int | None] = (1, None),
    measured: bool = False,
) -> Way:
    """Return an entry of the table."""
    recipe = Recipe(name, title, kinds, workspace, *sizes, measured, source)
    return Way(recipe, make, fits, controls)
