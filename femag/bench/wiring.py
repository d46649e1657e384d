"""Which way round the channels are: swapped columns, and a sense winding of the other sign.

Flux rises with current, so the voltage of the sense winding leads the current by up to a quarter
period, and the core takes power up. Exchanging the two makes the voltage lag; turning the sense
winding round makes it lag and the power negative. So the sign of the power tells the two apart.
The shape of the loop does not: without loss a swapped record is a single-valued, saturating curve
as well.
"""

from __future__ import annotations

import numpy as np

from femag.bench.capture import Array
from femag.errors import InputError

LOSSLESS = 0.01
"""Share of the apparent power under which the sign of the power is not trusted."""


def inverted_sense_winding(current: Array, voltage: Array, name: str) -> bool:
    """Return whether the sign of the voltage has to be changed.

    Parameters
    ----------
    current, voltage : array, shape (phases,)
        One period, means zero.
    name : str
        The capture, for the message.

    Raises
    ------
    InputError
        If the two look exchanged, or their phase fits no core.
    """
    product = np.fft.rfft(voltage)[1] * np.conj(np.fft.rfft(current)[1])
    active, reactive = product.real / abs(product), product.imag / abs(product)
    if reactive > 0.0 and active > -LOSSLESS:
        return False
    if reactive < 0.0 and active < -LOSSLESS:
        return True
    if reactive > 0.0:
        problem = "the core seems to give out power: swapped and one sign wrong, or shifted in time"
    elif active > LOSSLESS:
        problem = "current and voltage look swapped: the voltage lags behind the current"
    else:
        problem = "the voltage lags: current and voltage swapped, or the sense winding turned"
    raise InputError(
        problem, file=name,
        accepted="--current-column and --voltage-column the other way round, or a negative "
        "--voltage-scale",
    )  # fmt: skip
