"""From damage to accounts: capacity, signs, scenarios, posterior, attribution, next tests."""
