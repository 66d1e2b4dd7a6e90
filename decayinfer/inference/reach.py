"""Whether an index lies within what a channel can give."""

from decayinfer.inference.measurement import total_error

__all__ = ["REACH", "out_of_reach"]

REACH = 5.0  #: total standard deviations beyond which an index is out of a channel's reach


def out_of_reach(
    index: tuple[float, float, float, float], low: float, high: float, scatter_sd: float, *, where: str = ""
) -> str:
    """Say why a channel that gives indices from low to high cannot give this one, or nothing when it can.

    Parameters
    ----------
    index : tuple of float
        Observed n or its limit, error below, error above, and 1 for a limit.
    low, high : float
        Range of the channel.
    scatter_sd : float
        Scale of the excess scatter.
    where : str
        On what the upper end depends, for the message.
    """
    observed, minus, plus, limit = index
    margin = REACH * total_error(minus, plus, scatter_sd)
    if observed < low - margin:
        what = "limit" if limit else "index"
        return (
            f"{what} {observed:g} lies more than {REACH:g} total errors below {low:g}, "
            "the least this channel gives"
        )
    if observed > high + margin and not limit:
        return (
            f"index {observed:g} lies more than {REACH:g} total errors above {high:.4g}, "
            f"the most this channel gives{where}"
        )
    return ""
