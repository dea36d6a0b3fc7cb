"""Independent judges: exact answers written without the product's numerics, from the contract's own words."""
