"""Sweeps: designs by parameters, one row each, stopped and resumed, on one machine or many.

`ranges` and `axes` read what is swept, `plan` numbers the designs, `making` makes their stacks,
`choosing` settles metrics and line, `work` turns a chunk into rows wherever it runs, `running`
hands chunks to an executor, `record` and `fingerprint` keep the results file, `rows` the table.
"""

from .sweeping import sweep as sweep
