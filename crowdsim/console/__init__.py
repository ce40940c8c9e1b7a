"""What a person at a terminal sees, a screen a file; JSON for programs.

Depends on every room below, and on rich. Each screen is a function(console, what it shows).
"""
