"""What is on the shelf: sizes and quantities, as data. No files, no physics."""

from collections.abc import Iterable, Iterator
from dataclasses import dataclass, replace

from optimiser.faults import BadInput
from optimiser.stack import Group, Shim, Stack

#: A shim fits a post when its bore is at most this much wider, mm.
BORE_PLAY_MM = 0.3
#: Diameters and thicknesses closer than this are one size, mm.
SAME_DIAMETER_MM = 0.005
SAME_THICKNESS_MM = 0.0005


@dataclass(frozen=True)
class StockItem:
    """One size in the drawer.

    ``inner_mm`` is the bore; a ring shim's bore is much wider than the post. ``measured_mm`` is the
    measured thickness where somebody took the micrometer to it, ``price`` that of one shim in the
    shop's own money, ``bin`` where it lies. Raises BadInput with every fault.
    """

    outer_mm: float
    inner_mm: float
    thickness_mm: float
    quantity: int
    measured_mm: float | None = None
    price: float | None = None
    bin: str | None = None

    def __post_init__(self) -> None:
        faults = _faults_of(self)
        if faults:
            raise BadInput(faults)

    def __str__(self) -> str:
        return f"{self.outer_mm:g} x {self.thickness_mm:g} mm, bore {self.inner_mm:g} mm"

    @property
    def real_mm(self) -> float:
        """Thickness to compute with, mm: measured where known, else nominal."""
        return self.thickness_mm if self.measured_mm is None else self.measured_mm

    def fits(self, post_mm: float) -> bool:
        """True when the bore slides over a post of this diameter (mm) without rattling."""
        return post_mm - SAME_DIAMETER_MM <= self.inner_mm <= post_mm + BORE_PLAY_MM + 1e-9


@dataclass(frozen=True)
class Stock:
    """Everything on the shelf, in the order of the list; never changed, only replaced."""

    items: tuple[StockItem, ...]

    def __init__(self, items: Iterable[StockItem] = ()) -> None:
        object.__setattr__(self, "items", tuple(items))

    def __iter__(self) -> Iterator[StockItem]:
        return iter(self.items)

    def __len__(self) -> int:
        return len(self.items)

    @property
    def pieces(self) -> int:
        """Number of shims on the shelf."""
        return sum(item.quantity for item in self.items)

    def for_post(self, post_mm: float) -> "Stock":
        """The items whose bore fits a post of this diameter, mm."""
        return Stock(item for item in self.items if item.fits(post_mm))

    def ring_shims(self, post_mm: float) -> "Stock":
        """The items whose bore is too wide to be held by a post of this diameter, mm."""
        return Stock(i for i in self.items if i.inner_mm > post_mm + BORE_PLAY_MM + 1e-9)

    def take(self, stack: Stack, post_mm: float | None = None) -> "Stock":
        """The stock after building ``stack``.

        A shim's thickness names a size by its measured or its nominal value. ``post_mm`` must be
        given when the same size lies in the drawer with several bores. Raises BadInput with one
        sentence a size that runs short.
        """
        left, missing = self._draw(stack, post_mm)
        if missing:
            raise BadInput(
                f"the stock lacks {group.quantity} of {group.shim} mm" for group in missing
            )
        return Stock(
            replace(item, quantity=quantity)
            for item, quantity in zip(self.items, left, strict=True)
        )

    def put_back(self, stack: Stack, post_mm: float | None = None) -> "Stock":
        """The stock after taking ``stack`` apart; sizes new to the drawer are added at its end.

        Raises BadInput when ``post_mm`` is needed to know a shim's bore and is not given.
        """
        items = list(self.items)
        for shim, number in _sizes(stack).items():
            where = self._places(shim, stack.clamp_mm, post_mm)
            if where:
                item = items[where[0]]
                items[where[0]] = replace(item, quantity=item.quantity + number)
                continue
            bore = shim.inner_mm if shim.inner_mm is not None else post_mm
            if bore is None:
                raise BadInput(f"{shim} mm is not in the stock list: name its post (bore)")
            items.append(StockItem(shim.outer_mm, bore, shim.thickness_mm, number))
        return Stock(items)

    def shortage(self, stack: Stack, post_mm: float | None = None) -> tuple[Group, ...]:
        """What is missing to build ``stack``, one group a size, empty when nothing is."""
        return tuple(self._draw(stack, post_mm)[1])

    def price_of(self, stack: Stack, post_mm: float | None = None) -> float | None:
        """Price of a stack's shims, or None when one of them has no price."""
        total = 0.0
        for shim, number in _sizes(stack).items():
            prices = [self.items[k].price for k in self._places(shim, stack.clamp_mm, post_mm)]
            known = [price for price in prices if price is not None]
            if not known:
                return None
            total += number * known[0]
        return total

    def _draw(self, stack: Stack, post_mm: float | None) -> tuple[list[int], list[Group]]:
        """Quantities left and groups missing; sizes named exactly are served first."""
        left = [item.quantity for item in self.items]
        wanted = _sizes(stack)
        for exact in (True, False):
            for shim in wanted:
                for k in self._places(shim, stack.clamp_mm, post_mm):
                    if exact and not _same_thickness(self.items[k].real_mm, shim):
                        continue
                    drawn = min(left[k], wanted[shim])
                    left[k] -= drawn
                    wanted[shim] -= drawn
        return left, [Group(number, shim) for shim, number in wanted.items() if number]

    def _places(self, shim: Shim, clamp_mm: float, post_mm: float | None) -> list[int]:
        """Indices of the items that are this size, those of the very thickness first."""
        found = [k for k, item in enumerate(self.items) if _is_size(item, shim, clamp_mm, post_mm)]
        named = shim.inner_mm is not None or post_mm is not None
        bores = [] if named else sorted({round(self.items[k].inner_mm, 2) for k in found})
        if bores and bores[-1] - bores[0] > BORE_PLAY_MM:
            listed = " and ".join(f"{bore:g}" for bore in bores)
            raise BadInput(f"{shim} mm is in stock with bores of {listed} mm: name the post")
        return sorted(found, key=lambda k: not _same_thickness(self.items[k].real_mm, shim))


def _sizes(stack: Stack) -> dict[Shim, int]:
    """How many of each size a stack holds, face first."""
    sizes: dict[Shim, int] = {}
    for group in stack.groups:
        sizes[group.shim] = sizes.get(group.shim, 0) + group.quantity
    return sizes


def _same_thickness(thickness_mm: float, shim: Shim) -> bool:
    return abs(thickness_mm - shim.thickness_mm) <= SAME_THICKNESS_MM


def _is_size(item: StockItem, shim: Shim, clamp_mm: float, post_mm: float | None) -> bool:
    if abs(item.outer_mm - shim.outer_mm) > SAME_DIAMETER_MM:
        return False
    if not (_same_thickness(item.thickness_mm, shim) or _same_thickness(item.real_mm, shim)):
        return False
    if shim.inner_mm is not None:
        return abs(item.inner_mm - shim.inner_mm) <= SAME_DIAMETER_MM
    return item.inner_mm < clamp_mm if post_mm is None else item.fits(post_mm)


def _faults_of(item: StockItem) -> list[str]:
    faults = []
    if not 2.0 <= item.outer_mm <= 200.0:
        faults.append(f"outer_mm {item.outer_mm:g}: allowed: 2 to 200")
    if not 1.0 <= item.inner_mm < item.outer_mm:
        faults.append(
            f"inner_mm {item.inner_mm:g}: allowed: 1 to less than outer_mm {item.outer_mm:g}"
        )
    if not 0.02 <= item.thickness_mm <= 5.0:
        faults.append(f"thickness_mm {item.thickness_mm:g}: allowed: 0.02 to 5")
    elif item.measured_mm is not None:
        play = max(0.02, 0.15 * item.thickness_mm)
        if not abs(item.measured_mm - item.thickness_mm) <= play + 1e-9:
            faults.append(
                f"measured_mm {item.measured_mm:g}: allowed: within {play:g} mm of thickness_mm "
                f"{item.thickness_mm:g} (further off it is another size)"
            )
    if not 0 <= item.quantity <= 100_000:
        faults.append(f"quantity {item.quantity}: allowed: a whole number from 0 to 100000")
    if item.price is not None and not 0.0 <= item.price < 1e6:
        faults.append(f"price {item.price:g}: allowed: 0 or more")
    return faults
