"""The store: the DuckDB file, the queries, the reading of exports and the derivation."""
