"""Time correlation functions C_ab(t) = ⟨a(t0) b(t0+t)⟩ of vectors of many bodies.

Model   t of both signs; C_ab(−t) of stationary data is C_ba(t). All origins are used, through
        fast transforms (Wiener–Khinchin) padded so that nothing wraps around; or a fixed origin
        t0, for what a pulse does. Bodies come in blocks, so that the data may be larger than
        memory; sums are in float64.
Means   are subtracted afterwards, exactly: Σ(a−A)(b−B) = Σab − AΣb − BΣa + nAB with the sums of
        the very origins that each lag has.
Arrays  a (frames, bodies, p), b (frames, bodies, q); results (..., lags, p, q), lags −m … m.
"""

from dataclasses import dataclass

import numpy as np
from scipy import fft

AT_ONCE = 1 << 20  # numbers transformed at once
TILE = 8192  # frequencies, or frames, worked on at once: what a cache holds


@dataclass(frozen=True)
class LaggedSums:
    """Sums over bodies and origins, kept apart for consecutive pieces of the time axis.

    lags : (2m + 1,) frames; products : (pieces, lags, p, q) Σ a(t0) b(t0+t), origins t0 of the
        piece; edges : (pieces + 1,) frames where pieces begin and end.
    first, second : (frames, p), (frames, q) Σ over bodies of a, b;
    first_squares, second_squares : (pieces, p), (pieces, q) Σ over bodies and origins of a², b².
    bodies : how many.
    """

    lags: np.ndarray
    products: np.ndarray
    edges: np.ndarray
    first: np.ndarray
    second: np.ndarray
    first_squares: np.ndarray
    second_squares: np.ndarray
    bodies: int

    @property
    def origins(self):
        """(pieces, lags) origins t0 of each piece for which t0 + lag was recorded."""
        low, high = self._windows()
        return high - low

    def _windows(self):
        """First and one past the last origin of each piece and lag."""
        frames = len(self.first)
        last = frames - self.lags
        low = np.minimum(np.maximum(self.edges[:-1, None], -self.lags), last)
        return low, np.maximum(low, np.minimum(self.edges[1:, None], last))

    def correlation(self, first_mean=None, second_mean=None):
        """(pieces, lags, p, q) ⟨a b⟩, or ⟨(a − A)(b − B)⟩ with means of shape (1, 1, p), (1, 1, q).

        NaN where a piece has no origin for a lag.
        """
        count = (self.origins * self.bodies)[..., None, None]
        total = self.products
        if first_mean is not None:
            low, high = self._windows()
            a = _running(self.first, high) - _running(self.first, low)
            b = _running(self.second, high + self.lags) - _running(self.second, low + self.lags)
            first_mean, second_mean = first_mean[..., :, None], second_mean[..., None, :]
            total = (total - first_mean * b[..., None, :] - a[..., :, None] * second_mean
                     + count * first_mean * second_mean)
        return np.where(count > 0, total / np.maximum(count, 1), np.nan)

    def joined(self):
        """The same with all pieces as one."""
        return LaggedSums(self.lags, self.products.sum(axis=0, keepdims=True),
                          self.edges[[0, -1]], self.first, self.second,
                          self.first_squares.sum(axis=0, keepdims=True),
                          self.second_squares.sum(axis=0, keepdims=True), self.bodies)

    def moments(self):
        """Means of a, b, a², b² in each piece: (pieces, 1, p), (pieces, 1, q) and again."""
        length = np.diff(self.edges)[:, None, None] * self.bodies
        first, second = (np.add.reduceat(sums, self.edges[:-1], axis=0)
                         for sums in (self.first, self.second))
        return tuple(sums[:, None] / length for sums in
                     (first, second, self.first_squares, self.second_squares))


def _running(series, ends):
    """Sum of all frames before `ends`."""
    return np.concatenate([np.zeros((1, series.shape[1])), np.cumsum(series, axis=0)])[ends]


def lagged_sums(blocks, longest, pieces=1):
    """`LaggedSums` of blocks of bodies.

    blocks : iterable of pairs (a, b), (frames, bodies, p) and (frames, bodies, q); b may be the
        object a itself, which saves its transform.
    longest : longest lag [frames], less than the number of frames.
    pieces : into how many pieces the origins are parted; their partners t0 + lag may lie
        anywhere.
    Raises ValueError when there is no block, or a lag is as long as the record.
    """
    total = None
    for a, b in blocks:
        if total is None:
            total = _Accumulator(a, b, longest, pieces)
        total.add(a, b)
    if total is None:
        raise ValueError("no block of bodies to correlate")
    return total.sums()


class _Accumulator:
    """Cross spectra of the pieces and sums by frame, added up block by block."""

    def __init__(self, a, b, longest, pieces):
        frames, _, p = a.shape
        q = b.shape[2]
        if not 0 <= longest < frames:
            raise ValueError(f"a lag of {longest} frames in a record of {frames}")
        self.longest, self.own = longest, b is a
        self.shared = self.own and pieces == 1  # one transform for both
        self.edges = np.linspace(0, frames, pieces + 1).astype(int)
        # Origins of each piece, and where their partners lie.
        self.cuts = [(slice(s, e), slice(max(0, s - longest), min(frames, e + longest)))
                     for s, e in zip(self.edges, self.edges[1:], strict=False)]
        reach = max(max(there.stop - here.start, here.stop - there.start)
                    for here, there in self.cuts)
        # An index difference of `reach` must not wrap around into the wanted lags.
        self.size = fft.next_fast_len(reach + longest, real=True)
        self.length = frames
        if pieces == 1:  # its rows are padded as they are made
            self.cuts, self.length = [(slice(0, None), slice(0, None))], self.size
        self.spectra = np.zeros((pieces, p, q, self.size // 2 + 1), complex)
        self.some = max(1, AT_ONCE // (self.size * p))  # bodies transformed at once
        self.work = np.empty((2, TILE), complex)
        self.frame_sums = [np.zeros((frames, n)) for n in (p, q)]
        self.squares = [np.zeros((pieces, n)) for n in (p, q)]
        self.rows = [np.zeros((0, n, self.length)) for n in (p, q)]
        self.bodies = 0

    def add(self, a, b):
        self.bodies += a.shape[1]
        first = self._as_rows(0, a)
        second = first if b is a else self._as_rows(1, b)
        self._add_sums(0, first)
        if b is not a:
            self._add_sums(1, second)
        for start in range(0, a.shape[1], self.some):
            part = slice(start, start + self.some)
            for k, (here, there) in enumerate(self.cuts):
                self._add_spectra(k, first[part, :, here], second[part, :, there])

    def _add_sums(self, which, rows):
        self.frame_sums[which] += rows[..., : len(self.frame_sums[which])].sum(axis=0).T
        if not self.own:
            for k, (s, e) in enumerate(zip(self.edges, self.edges[1:], strict=False)):
                self.squares[which][k] += np.einsum("npt,npt->p", rows[..., s:e], rows[..., s:e])

    def _as_rows(self, which, values):
        """(bodies, components, length) float64, each row contiguous and zero after the frames."""
        frames, bodies, components = values.shape
        if len(self.rows[which]) < bodies:  # kept, as fresh memory is slow
            self.rows[which] = np.zeros((bodies, components, self.length))
        rows = self.rows[which][:bodies]
        for start in range(0, frames, TILE):
            stop = min(start + TILE, frames)
            rows[..., start:stop] = np.moveaxis(values[start:stop], 0, -1)
        return rows

    def _add_spectra(self, k, first, second):
        """first, second : (bodies, components, times)."""
        a = fft.rfft(first, self.size, workers=-1)  # row by row: the bits do not depend on it
        b = a if self.shared else fft.rfft(second, self.size, workers=-1)
        for start in range(0, a.shape[-1], TILE):
            tile = slice(start, start + TILE)
            into = self.spectra[k, ..., tile]
            conjugate, product = self.work[:, : into.shape[-1]]
            for one, other in zip(a[..., tile], b[..., tile], strict=True):
                for i in range(len(one)):
                    np.conjugate(one[i], out=conjugate)
                    # The spectrum of a with itself is Hermitian: the other half follows.
                    for j in range(i if self.shared else 0, len(other)):
                        into[i, j] += np.multiply(conjugate, other[j], out=product)

    def sums(self):
        lags = np.arange(-self.longest, self.longest + 1)
        pieces, p, q, _ = self.spectra.shape
        if self.shared:
            for i in range(p):
                for j in range(i):
                    np.conjugate(self.spectra[0, j, i], out=self.spectra[0, i, j])
        products = np.empty((pieces, len(lags), p, q))
        for k, (here, there) in enumerate(self.cuts):
            wrapped = fft.irfft(self.spectra[k], self.size)
            products[k] = np.moveaxis(wrapped[..., lags + here.start - there.start], -1, 0)
        if self.own:  # Σa² is the product at lag 0
            self.frame_sums[1] = self.frame_sums[0]
            self.squares = 2 * [products[:, self.longest].diagonal(axis1=1, axis2=2)]
        return LaggedSums(lags, products, self.edges, *self.frame_sums, *self.squares, self.bodies)


@dataclass(frozen=True)
class LockedSums:
    """Sums over bodies for fixed origins; no average over time.

    origins : (o,) frames; products : (o, frames, p, q) Σ a(t0) b(t).
    first, second, first_squares, second_squares : (frames, p), (frames, q) Σ over bodies of
        a, b, a², b². bodies : how many.
    """

    origins: np.ndarray
    products: np.ndarray
    first: np.ndarray
    second: np.ndarray
    first_squares: np.ndarray
    second_squares: np.ndarray
    bodies: int

    def moments(self):
        """Means over bodies of a, b, a², b²: (o, 1, p), (1, frames, q) and again."""
        first, second = self.first[self.origins, None], self.second[None]
        squares = self.first_squares[self.origins, None], self.second_squares[None]
        return tuple(m / self.bodies for m in (first, second, *squares))

    def correlation(self, first_mean=None, second_mean=None):
        """(o, frames, p, q) ⟨a(t0) b(t)⟩, or with means of each time, shaped as `moments`."""
        total = self.products / self.bodies
        if first_mean is None:
            return total
        a, b, _, _ = self.moments()
        return (total - first_mean[..., :, None] * b[..., None, :]
                - (a - first_mean)[..., :, None] * second_mean[..., None, :])


def locked_sums(blocks, origins):
    """`LockedSums` of blocks of bodies as in `lagged_sums`, for origins (o,) [frames]."""
    origins, total = np.asarray(origins, int), None
    for a, b in blocks:
        a, b = np.asarray(a, float), np.asarray(b, float)
        products = np.tensordot(a[origins], b, axes=(1, 1))  # o, p, frames, q
        found = [products.swapaxes(1, 2), a.sum(axis=1), b.sum(axis=1),
                 (a * a).sum(axis=1), (b * b).sum(axis=1), a.shape[1]]
        total = found if total is None else [x + y for x, y in zip(total, found, strict=True)]
    if total is None:
        raise ValueError("no block of bodies to correlate")
    return LockedSums(origins, *total)


def by_lag(values, origins):
    """C(t0, lag) from values (o, frames, ...) at times t: row o begins at its own origin.

    Returns (lags (2·frames − 1,), (o, lags, ...)); NaN where t0 + lag was not recorded.
    """
    frames = values.shape[1]
    lags = np.arange(1 - frames, frames)
    found = np.full((len(origins), len(lags), *values.shape[2:]), np.nan)
    for row, origin in enumerate(origins):
        found[row, frames - 1 - origin : 2 * frames - 1 - origin] = values[row]
    return lags, found
