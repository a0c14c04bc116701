"""Methods out of the shelves: loaded, compared with others of the same slug, and not yet proved."""

from __future__ import annotations

from typing import TYPE_CHECKING

from newel.catalogue.offers import family_arguments, load_method, usual_names
from newel.catalogue.plugins import Offer
from newel.catalogue.proofs import listed_proofs
from newel.catalogue.shelves import PYTHON, Shelves
from newel.catalogue.suggestions import unknown_method
from newel.errors import BadRequest, BadTableau, NewelError, SlugTaken, UnknownMethod

if TYPE_CHECKING:
    from newel.methods.tableau import Tableau

__all__ = ["Methods"]

_DEEPEST = 2
_LONGEST_SLUG = 200


class Methods:
    """The methods on the shelves of one registry; what is loaded is kept."""

    def __init__(self, shelves: Shelves) -> None:
        self._shelves = shelves
        self._loaded: dict[str, Tableau] = {}
        self._nested: dict[str, int] = {}
        self._trusted: set[str] = set()

    def load(self, slug: str, depth: int = 0) -> Tableau:
        """Return the method of a slug, a member of a family included; see `Registry.load`."""
        # What is remembered must not let a member in that stands too deep when it is asked for first.
        if slug in self._loaded and depth + self._nested.get(slug, 0) <= _DEEPEST:
            return self._loaded[slug]
        offers = self._shelves.offers("tableau", slug)
        loaded = self._choose(offers, slug, ()) if offers else self._load_member(slug, depth)
        self._loaded[slug] = loaded
        return loaded

    def _load_member(self, slug: str, depth: int) -> Tableau:
        """Return the member of a family that a slug names."""
        for family, offers in self._shelves.families.items() if len(slug) <= _LONGEST_SLUG else ():
            words = family_arguments(family, slug)
            if words is None:
                continue
            bases = [word for word in words if isinstance(word, str)]
            if bases and depth >= _DEEPEST:
                raise BadRequest(
                    f"{slug}: families stand {depth + 1} deep in one another; {_DEEPEST} is the limit",
                    argument="method",
                )
            arguments = tuple(self.load(word, depth + 1) if isinstance(word, str) else word for word in words)
            made = self._choose(tuple(offers), slug, arguments)
            self._nested[slug] = 1 + max((self._nested.get(base, 0) for base in bases), default=-1)
            if any(self.is_trusted(each) for each in arguments if not isinstance(each, int)):
                self.trust(made)
            return made
        raise self._unknown(slug)

    def _choose(self, offers: tuple[Offer, ...], slug: str, arguments: tuple[Tableau | int, ...]) -> Tableau:
        """Load every offer of a slug, and return the one in force; equal numbers are no clash."""
        standing: list[tuple[Offer, Tableau]] = []
        failed: list[tuple[Offer, BadTableau]] = []
        for offer in offers:
            try:
                standing.append((offer, load_method(offer, slug, arguments)))
            except BadTableau as error:
                failed.append((offer, error))
        if not standing or (failed and failed[0][0].origin.kind == "built-in"):
            raise failed[0][1]
        first, chosen = standing[0]
        others = [offer for offer, made in standing[1:] if made.digest != chosen.digest]
        if others and first.origin.kind != "built-in":
            raise _taken(slug, (first, *others))
        for offer, reason in failed:
            self._shelves.leave_out(offer, reason)
        for other in others:
            self._shelves.clash(first, other)
        return chosen

    def _unknown(self, slug: str) -> UnknownMethod:
        names = self._shelves.names("tableau")
        usual = {entry["slug"]: (entry["name"], *entry["also_called"]) for entry in listed_proofs().values()}
        for name in names:
            if name in self._loaded:
                usual[name] = (self._loaded[name].name, *self._loaded[name].also_called)
            elif name not in usual:
                usual[name] = usual_names(self._shelves.offers("tableau", name)[0])
        return unknown_method(slug, (*names, *self._shelves.families), {name: usual[name] for name in names})

    def add(self, tableau: Tableau, trust: bool) -> None:
        """Put a tableau made in Python on the shelf, if its slug is free."""
        if self._shelves.offers("tableau", tableau.slug):
            return
        if trust:
            self.trust(tableau)
        self._shelves.add(Offer("tableau", tableau.slug, lambda: tableau, PYTHON, ""))
        self._loaded[tableau.slug] = tableau

    def refuse_taken(self, tableau: Tableau) -> None:
        """Raise SlugTaken if the slug already names other numbers; nothing is said if it names the same."""
        try:
            taken = self.load(tableau.slug)
        except UnknownMethod:
            return
        except NewelError:
            offers = self._shelves.offers("tableau", tableau.slug)
            origins = tuple(offer.from_text for offer in offers) or ("a family",)
        else:
            if taken.digest == tableau.digest:
                return
            origins = (taken.origin,)
        raise SlugTaken(
            f"slug {tableau.slug!r} is taken: it names another method, from {' and from '.join(origins)}\n"
            "  Nothing was registered. Give this one another slug: attrs.evolve(tableau, slug=...).",
            slug=tableau.slug,
            origins=origins,
        )

    def trust(self, tableau: Tableau) -> None:
        """Take these numbers and claims on trust from now on."""
        from newel.methods.order_conditions import proof_key

        self._trusted.add(proof_key(tableau))

    def is_trusted(self, tableau: Tableau) -> bool:
        """Whether these numbers and claims are taken on trust."""
        from newel.methods.order_conditions import proof_key

        return bool(self._trusted) and proof_key(tableau) in self._trusted


def _taken(slug: str, offers: tuple[Offer, ...]) -> SlugTaken:
    origins = tuple(offer.from_text for offer in offers)
    return SlugTaken(
        f"slug {slug!r} names different methods: from {' and from '.join(origins)}\n"
        "  Neither is used. Give the path of a file or a Tableau, or rename one.",
        slug=slug,
        origins=origins,
    )
