"""The three parts of an error at a place: offset, bound and random; whole arrays at a time."""

from dataclasses import dataclass

import numpy as np

from flowplan.engine.sources import N_BASIS, FloatArray, IntArray, ModeTable, Source, deviation

#: Rows times points handled at once, so that memory stays bounded.
CHUNK = 2_000_000


@dataclass(frozen=True, slots=True)
class Kernel:
    """What one axis's modes mean for the arithmetic.

    Attributes
    ----------
    table : ModeTable
        The modes.
    sigma : ndarray, shape (n_modes,)
        Standard deviation per amount; 0 for bounds and offsets.
    bound, offset : ndarray of bool, shape (n_modes,)
        Which modes are bounds and which are offsets.
    """

    table: ModeTable
    sigma: FloatArray
    bound: FloatArray
    offset: FloatArray

    @classmethod
    def of(cls, table: ModeTable, sources: tuple[Source, ...], sigma: float) -> "Kernel":
        """Return the kernel of a mode table; `sigma` is the flow's."""
        kinds = [sources[i].kind for i in table.source]
        return cls(
            table,
            np.array([deviation(kind, sigma) for kind in kinds], dtype=np.float64),
            np.array([kind == "bound" for kind in kinds], dtype=np.float64),
            np.array([kind == "offset" for kind in kinds], dtype=np.float64),
        )

    def narrowed(self, modes: IntArray) -> "Kernel":
        """Return the kernel of some of the modes, in rising order; the others must not occur."""
        source = self.table.source[modes]
        active, starts = np.unique(source, return_index=True)
        table = ModeTable(source, self.table.basis[modes], starts.astype(np.int64), active)
        return Kernel(table, self.sigma[modes], self.bound[modes], self.offset[modes])

    def by_source(self, amounts: FloatArray) -> FloatArray:
        """Sum modes that belong to one source, shape (n_rows, n_active)."""
        if not len(self.table.starts):
            return np.zeros((len(amounts), 0))
        if len(self.table.starts) == self.table.size:
            return amounts
        return np.asarray(np.add.reduceat(amounts, self.table.starts, axis=1))

    def sigma_by_source(self) -> FloatArray:
        """Return the standard deviation per amount of each active source, shape (n_active,)."""
        return self.sigma[self.table.starts]

    def at_points(self, amounts: FloatArray, basis: FloatArray) -> FloatArray:
        """Return each source's amount with every row at a point of its own.

        Parameters
        ----------
        amounts : ndarray, shape (n_rows, n_modes)
            Amounts over modes [nm, or nm per mm].
        basis : ndarray, shape (n_basis, n_rows)
            Basis functions at each row's point.

        Returns
        -------
        ndarray, shape (n_rows, n_active)
            Amounts [nm], summed within each source before anything is squared.
        """
        return self.by_source(amounts * basis[self.table.basis].T)

    def gram(self, amounts: FloatArray) -> FloatArray:
        """Return the variance as a quadratic form of the basis functions.

        Returns
        -------
        ndarray, shape (n_rows, n_basis, n_basis)
            V with variance = phi V phi; the cost of a point no longer depends on the sources.
        """
        scaled = amounts * self.sigma
        form = np.zeros((len(amounts), N_BASIS, N_BASIS))
        for i, j, left, right in self._mode_pairs():
            form[:, i, j] += np.einsum("rm,rm->r", scaled[:, left], scaled[:, right])
        return form

    def _mode_pairs(self) -> list[tuple[int, int, IntArray, IntArray]]:
        """Return for each two basis functions the modes of common sources that meet there."""
        width = np.diff(np.append(self.table.starts, self.table.size))
        pairs = []
        for gap in range(-int(width.max(initial=1)) + 1, int(width.max(initial=1))):
            left = np.arange(max(0, -gap), self.table.size - max(0, gap))
            left = left[self.table.source[left] == self.table.source[left + gap]]
            i, j = self.table.basis[left], self.table.basis[left + gap]
            for code in np.unique(i * N_BASIS + j):
                at = left[i * N_BASIS + j == code]
                pairs.append((int(code) // N_BASIS, int(code) % N_BASIS, at, at + gap))
        return pairs

    def offset_form(self, amounts: FloatArray) -> FloatArray:
        """Return the offset as a linear form of the basis functions, shape (n_rows, n_basis)."""
        form = np.zeros((len(amounts), N_BASIS))
        chosen = np.flatnonzero(self.offset)
        for mode in chosen:
            form[:, self.table.basis[mode]] += amounts[:, mode]
        return form

    def absolute_sum(self, amounts: FloatArray, weight: FloatArray, basis: FloatArray) -> FloatArray:
        """Return the sum over sources of |amount| times weight at every point.

        Parameters
        ----------
        amounts : ndarray, shape (n_rows, n_modes)
            Amounts over modes.
        weight : ndarray, shape (n_modes,)
            Weight of each mode's source; 0 leaves it out.
        basis : ndarray, shape (n_basis, n_points)
            Basis functions.

        Returns
        -------
        ndarray, shape (n_rows, n_points)
            The sum [nm].
        """
        total = np.zeros((len(amounts), basis.shape[1]))
        ends = np.append(self.table.starts, self.table.size)[1:]
        shaped = np.zeros(self.table.size, dtype=bool)
        for start, end in zip(self.table.starts, ends, strict=True):
            if weight[start] and self.table.basis[start:end].any():
                shaped[start:end] = True
                part = amounts[:, start:end]
                rows = np.flatnonzero(part.any(axis=1))
                at_points = np.abs(part[rows] @ basis[self.table.basis[start:end]])
                total[rows] += weight[start] * at_points
        constant = np.where(shaped, 0.0, weight)
        total += (np.abs(amounts) @ constant)[:, None]
        return total


def quadratic(form: FloatArray, basis: FloatArray) -> FloatArray:
    """Return phi V phi at every point, shape (n_rows, n_points); never below 0."""
    products = (basis[:, None] * basis[None]).reshape(N_BASIS * N_BASIS, -1)
    return np.maximum(form.reshape(len(form), N_BASIS * N_BASIS) @ products, 0.0)
