"""A figure as its source prints it, beside what we compute and why the two may differ."""

from dataclasses import dataclass


@dataclass(frozen=True)
class Figure:
    """One published figure.

    Attributes
    ----------
    printed : str
        As printed; half of its last digit is the tolerance.
    computed : float
        The same without rounding, by an independent route named in `reason`.
    reason : str
        Where the printed figure and ours part, or why they agree.
    """

    printed: str
    computed: float
    reason: str

    @property
    def tolerance(self) -> float:
        """Half of the last printed digit."""
        mantissa, _, exponent = self.printed.partition("e")
        decimals = len(mantissa.partition(".")[2])
        return 0.5 * 10.0 ** (int(exponent or 0) - decimals) * (1 + 1e-9)

    def agrees_with(self, value: float) -> bool:
        """Whether a value rounds to what is printed and equals what is computed."""
        near_print = abs(value - float(self.printed)) <= self.tolerance
        return near_print and abs(value - self.computed) <= 1e-6 * abs(self.computed)
