"""Papers: what is printed for audits and for the shift. Everything on them comes from `assess`."""
