"""How the bodies move: free rotor, thermostats, and the step that composes them."""
