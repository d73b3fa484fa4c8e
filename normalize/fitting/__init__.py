"""How use answers to weather: the change-point fit, its uncertainty and its checks."""
