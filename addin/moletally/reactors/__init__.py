"""The balances and the questions asked of them."""
