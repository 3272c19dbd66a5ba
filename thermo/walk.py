"""One node led along given temperatures, and what it has formed on the way.

Model
-----
`thermo.kinetics.advance_node` from moment to moment; nothing is added here.

Source
------
`thermo.kinetics`.

Holds for
---------
As `thermo.kinetics`: cooling and holding.
"""

from midradius.thermo.arrays import Array
from midradius.thermo.compiled import kernel
from midradius.thermo.kinetics import Tables, advance_node


@kernel
def walk(
    state: Array, temps: Array, spans: Array, scale: Array, tables: Tables, grown: Array
) -> None:
    """Lead a node along ``temps``; ``state`` and ``grown`` are written.

    Parameters
    ----------
    state
        Of the node at ``temps[0]``, shape (N_STATE,).
    temps, spans
        Temperatures [K], shape (n,), and the time from each to the next [s], (n - 1,).
    scale
        Factors on the rates, as `advance_node` takes them.
    tables
        The steel.
    grown
        Gets the first columns of the state at every temperature, (n, n_product).
    """
    n_product = grown.shape[1]
    for k in range(n_product):
        grown[0, k] = state[k]
    for i in range(len(spans)):
        advance_node(state, temps[i], temps[i + 1], spans[i], scale, tables)
        for k in range(n_product):
            grown[i + 1, k] = state[k]
