"""The heat problem put together from its terms and solved."""
