"""The blade-element momentum solution: compiled kernels under a plain-Python face."""
