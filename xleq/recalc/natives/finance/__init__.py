"""Finance: annuities, cash flows, depreciation, securities."""
