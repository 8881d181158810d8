"""headledger: says which gauges on a liquid piping system can be believed, and why."""

__version__ = "0.1.0"
