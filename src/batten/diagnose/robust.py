"""Scores of tested columns under an uneven spread, row by row or cluster by cluster."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from batten.engine.rows import Array, Ints

__all__ = ["Scores", "scores_of_last"]

#: from this many clusters on CR1 does; below, CR3 is safer (Bell and McCaffrey 2002)
MANY_CLUSTERS = 40
#: a block whose leverage in some direction is this near 1 fits that direction alone
OWNED = 1e-9


@dataclass(frozen=True, eq=False)
class Scores:
    """values (G, q): their cross-product is the covariance of the tested effects. errors: which kind."""

    values: Array
    errors: str


def scores_of_last(Q: Array, left: Array, *, tested: int, cluster: Ints | None = None) -> Scores | None:
    """Scores of the last `tested` columns of the orthonormal design Q (n, p) with residuals `left` (n,).

    Rows: HC3, q_i e_i / (1 - h_i). Clusters: (I - Q_c'Q_c)^-1 Q_c'e_c times sqrt((G - 1) / G), which are the changes
    when cluster c is left out (CR3), or with many clusters Q_c'e_c times sqrt(G / (G - 1) (n - 1) / (n - p)) (CR1). A
    row or cluster that alone settles an untested column is fitted exactly and says nothing about the tested ones; one
    that alone settles a tested column makes them unknowable: None.
    """
    n, p = Q.shape
    if cluster is None:
        free = 1 - np.einsum("ij,ij->i", Q, Q)
        own = free <= OWNED
        if np.any(np.abs(Q[own, p - tested :]) > np.sqrt(OWNED)):
            return None
        return Scores(Q[:, p - tested :] * np.where(own, 0.0, left / np.where(own, 1.0, free))[:, None], "HC3")
    codes = np.unique(cluster, return_inverse=True)[1]
    count = int(codes.max()) + 1
    plain = np.zeros((count, p))
    np.add.at(plain, codes, Q * left[:, None])
    if count >= MANY_CLUSTERS:
        return Scores(np.sqrt(count / (count - 1) * (n - 1) / (n - p)) * plain[:, p - tested :], "CR1")
    block = np.zeros((count, p, p))
    for c in range(count):
        rows = Q[codes == c]
        block[c] = rows.T @ rows
    share, direction = np.linalg.eigh(block)
    own = share >= 1 - OWNED
    tested_part = np.linalg.norm(direction[:, p - tested :, :], axis=1)
    if np.any(tested_part[own] > np.sqrt(OWNED)):
        return None
    grow = np.where(own, 0.0, 1 / np.where(own, 1.0, 1 - share))
    turned = np.einsum("cij,ci->cj", direction, plain) * grow
    scores = np.einsum("cij,cj->ci", direction, turned)
    return Scores(np.sqrt((count - 1) / count) * scores[:, p - tested :], "CR3")
