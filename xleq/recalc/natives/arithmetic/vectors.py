"""numpy's functions by name, so that numpy is loaded only where an array is computed."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray


def elementwise(name: str, limit: float | None = None) -> Callable[..., NDArray[np.float64]]:
    """The numpy function of that name, silent, for `Native.vector`.

    Parameters
    ----------
    name : str
    limit : float, optional
        Arguments of this size or larger give nan.
    """

    def call(*arrays: NDArray[np.float64]) -> Any:
        import numpy as np

        with np.errstate(all="ignore"):
            result = getattr(np, name)(*arrays)
            return result if limit is None else np.where(np.abs(arrays[0]) < limit, result, np.nan)

    return call
