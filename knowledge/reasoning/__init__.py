"""From damage to accounts: capacity, signs, scenarios, posterior, attribution, next tests.

In flow a graph, damage draws as arrays and findings; out flows a frozen :class:`Explanation`. Nothing here reads files,
knows geometry or draws anything; cases and widgets read its results.
"""
