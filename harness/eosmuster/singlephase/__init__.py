"""Single-phase states of cubic equations at temperature and pressure: roots, departures, heat capacities."""
