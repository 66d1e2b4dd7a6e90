"""Tables in: formats, units, validation, and what follows from the spin before any fit."""

from decayinfer.catalog.catalog import Catalog
from decayinfer.catalog.problem import FLAGS, Problem
from decayinfer.catalog.pulsar import Pulsar
from decayinfer.catalog.read import read_table
from decayinfer.catalog.summary import summary_table

__all__ = ["FLAGS", "Catalog", "Problem", "Pulsar", "read_table", "summary_table"]
