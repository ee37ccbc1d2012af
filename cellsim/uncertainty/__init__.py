"""What is uncertain: the side-car, distributions, dependence and sampling."""
