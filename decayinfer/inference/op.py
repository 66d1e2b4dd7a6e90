"""The field history as one PyTensor Op over the compiled kernel, with the Jacobian as its second output."""

import hashlib
import inspect
from typing import Any

import numpy as np
import pytensor.tensor as pt
from pytensor.gradient import DisconnectedType, disconnected_type
from pytensor.graph.basic import Apply
from pytensor.graph.op import Op
from pytensor.link.numba.dispatch.basic import register_funcify_default_op_cache_key

from decayinfer.cooling import kernel as cooling_kernel
from decayinfer.inference import kernel

__all__ = ["FieldHistory", "field_history"]

_VECTOR, _MATRIX, _CUBE = (pt.TensorType("float64", shape=(None,) * n) for n in (1, 2, 3))


class FieldHistory(Op):
    """History summary (6,) and its Jacobian (6, 7) from inputs (7,), flags, freeze-out and cooling data.

    The gradient is a product with the Jacobian that the forward pass already returned, so it costs nothing
    more. Flags and coefficients are data and have no gradient.
    """

    __props__ = ()

    def make_node(self, *inputs: Any) -> Apply:
        """Check the five inputs and declare the two outputs."""
        variables = [pt.as_tensor_variable(value) for value in inputs]
        for variable, ndim in zip(variables, (1, 1, 1, 3, 1), strict=True):
            if variable.ndim != ndim or variable.dtype != "float64":
                raise TypeError(f"FieldHistory needs float64 of rank {ndim}, got {variable.type}")
        return Apply(self, variables, [_VECTOR(), _MATRIX()])

    def perform(self, node: Apply, inputs: Any, outputs: Any) -> None:
        """Run the kernel outside the Numba backend."""
        values, jacobian = kernel.history(*(np.ascontiguousarray(value) for value in inputs))
        outputs[0][0], outputs[1][0] = values, jacobian

    def connection_pattern(self, node: Apply) -> list[list[bool]]:
        """Only the values depend differentiably on the inputs, and only on the first."""
        return [[True, False]] + [[False, False]] * 4

    def pullback(self, inputs: Any, outputs: Any, cotangents: Any) -> list[Any]:
        """Pull the cotangent of the values back through the Jacobian."""
        if isinstance(cotangents[0].type, DisconnectedType):
            return [disconnected_type()] * 5
        return [pt.dot(cotangents[0], outputs[1])] + [disconnected_type()] * 4


@register_funcify_default_op_cache_key(FieldHistory)
def _compiled(op: FieldHistory, node: Apply | None = None, **_: Any) -> tuple[Any, int]:
    # the key is a digest of the kernel sources: a changed kernel never meets a stale cache
    source = inspect.getsource(kernel) + inspect.getsource(cooling_kernel)
    return kernel.history, int(hashlib.sha256(source.encode()).hexdigest()[:12], 16)


field_history = FieldHistory()
